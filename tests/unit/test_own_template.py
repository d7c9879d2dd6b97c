"""Own entries from templates and from programs. All numbers are invented."""

from __future__ import annotations

import shutil
import sqlite3
from collections.abc import Callable, Iterator
from contextlib import closing
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import pytest

import propdb
from propdb.api import Store
from propdb.errors import InvalidInput, NotFound, PropdbError
from propdb.intake import files, written
from propdb.intake.templates import COLUMN_HELP, template
from propdb.intake.written import ROW_COLUMNS

VALUE = {
    "species": "ethanol",
    "quantity": "Hvap",
    "phase": "l",
    "temperature": "25C",
    "value": "42.34",
    "unit": "kJ/mol",
    "conditions": "to the real vapour",
    "source": "codata-1989",
    "locator": "ethanol",
}
SHEET = {
    "source": "sheet-7",
    "source_title": "Data sheet 7",
    "source_authors": "Invented Works; Nobody, A.",
    "source_year": "2024",
    "source_kind": "report",
    "source_class": "compilation",
}


@pytest.fixture(scope="module")
def shared(tmp_path_factory: pytest.TempPathFactory) -> Path:
    copy = tmp_path_factory.mktemp("own") / "shared.db"
    with propdb.open() as store:
        store.store_backup(copy)
    return copy


@pytest.fixture
def store(shared: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Store]:
    monkeypatch.setenv("PROPDB_USER", "A. Tester")
    path = tmp_path / "own.db"
    shutil.copy(shared, path)
    with propdb.open(path) as opened:
        yield opened


@pytest.fixture
def reading(shared: Path) -> Iterator[Store]:
    """A store that a test only looks at: dry runs and refusals."""
    with propdb.open(shared) as opened:
        yield opened


Refuse = Callable[..., PropdbError]


@pytest.fixture
def refuse(reading: Store, tmp_path: Path) -> Refuse:
    """Import a text or bytes; the error, which is one line and left nothing behind."""

    def refused(text: str | bytes, name: str = "own.csv", kind: type[PropdbError] = InvalidInput) -> PropdbError:
        file = tmp_path / name
        file.write_bytes(text if isinstance(text, bytes) else text.encode())
        before = reading.store_info()
        with pytest.raises(kind) as error:
            reading.import_file(file)
        assert reading.store_info() == before
        assert "\n" not in str(error.value)
        assert str(error.value).startswith(name), str(error.value)
        return error.value

    return refused


def csv_text(*rows: dict[str, str], columns: tuple[str, ...] = ()) -> str:
    """Rows with the columns that they have."""
    header = columns or tuple(dict.fromkeys(key for row in rows for key in row))
    quoted = [",".join(f'"{cell}"' if "," in (cell := row.get(c, "")) else cell for c in header) for row in rows]
    return "\n".join((",".join(header), *quoted)) + "\n"


def count(path: Path, table: str) -> int:
    with closing(sqlite3.connect(path)) as conn:
        return int(conn.execute(f"SELECT count(*) FROM {table}").fetchone()[0])


# -- what goes in -----------------------------------------------------------------------------------------------------


def test_a_value_becomes_a_draft_with_its_digits_and_author(store: Store) -> None:
    report = store.add(VALUE)
    ((place, taken),) = report.taken
    entry = store.entry_show(taken.id)
    assert (entry.value, entry.unit, entry.carried, entry.carried_unit) == (42340.0, "J/mol", "42.34", "kJ/mol")
    assert (entry.temperature, entry.status, entry.source) == (298.15, "draft", "codata-1989")
    assert [carrier.package for carrier in entry.carriers] == ["own"]
    assert taken == entry
    last = store._reader.events(entry.id)[-1]
    assert (last.kind, last.who, last.comment) == ("created", "A. Tester", "add")
    assert (place, report.who, report.dry_run) == ("", "A. Tester", False)


def test_a_draft_enters_no_computation(store: Store) -> None:
    state: dict[str, Any] = {"phase": "g", "temperature": "25C", "datum": "elements-298K"}
    before = store.enthalpy("ethanol", **state).value
    store.add({**VALUE, "value": "1.0"})
    assert store.enthalpy("ethanol", **state).value == before


def test_numbers_and_lists_of_a_program_are_taken(reading: Store) -> None:
    curve = {
        **{key: VALUE[key] for key in ("species", "phase", "source", "locator")},
        "quantity": "Cp",
        "equation": "polynomial",
        "tmin": 280,
        "tmax": 330.5,
        "exponents": [0, 1],
        "coefficients": ["20.0", 0.31],
        "unit": "J/mol/K",
    }
    ((_, entry),) = reading.add(curve, dry_run=True).taken
    assert entry.params["coefficients"] == [20.0, 0.31]
    assert (entry.tmin, entry.tmax, entry.carried) == (280.0, 330.5, "20.0 0.31")


def test_a_dry_run_names_nobody_and_changes_nothing(reading: Store) -> None:
    before = reading.store_info()
    report = reading.add(VALUE, dry_run=True)
    assert (len(report.taken), report.who, report.dry_run) == (1, "", True)
    assert reading.store_info() == before


def test_somebody_must_be_named(reading: Store) -> None:
    with pytest.raises(InvalidInput, match="nobody is named"):
        reading.add(VALUE)


def test_template_comes_back_filled(store: Store, tmp_path: Path) -> None:
    file = tmp_path / "own.csv"
    file.write_text(template("csv").replace("\n# ethanol,", "\nethanol,"), encoding="utf-8")
    report = store.import_file(file)
    constant, fit, table = (entry for _, entry in report.taken)
    assert (constant.quantity, constant.uncertainty, constant.uncertainty_kind) == ("Hvap", 400.0, "expanded-95")
    assert (fit.equation, fit.params["exponents"]) == ("polynomial", [0, 1])
    assert fit.params["coefficients"] == pytest.approx([20.0, 0.31], rel=1e-15)
    assert (fit.uncertainty, fit.uncertainty_unit) == (0.02, "%")
    mass = store.show("ethanol").species.molar_mass
    assert table.params["T"] == [293.15, 313.15]
    assert table.params["cp"] == pytest.approx([2410 * mass, 2570 * mass], rel=1e-12)
    assert store.source_show("data-sheet-7").year == 2024
    assert report.sources == ("data-sheet-7",)


def test_toml_template_comes_back_filled(reading: Store, tmp_path: Path) -> None:
    lines = template("toml").splitlines()
    start = next(i for i, line in enumerate(lines) if line.startswith("# [source"))
    body = [line[2:] for line in lines[start:] if " = " in line or line.startswith("# [")]
    file = tmp_path / "own.toml"
    file.write_text("\n".join(body), encoding="utf-8")
    report = reading.import_file(file, dry_run=True)
    assert [entry.quantity for _, entry in report.taken] == ["Hvap", "Cp"]
    assert report.refused == ()


def test_every_column_is_explained() -> None:
    assert set(COLUMN_HELP) == set(ROW_COLUMNS)
    for kind in ("csv", "toml"):
        for column in ROW_COLUMNS:
            assert f"{column}: " in template(kind)


def test_csv_and_toml_say_the_same(reading: Store, tmp_path: Path) -> None:
    toml = "[[entry]]\n" + "\n".join(f'{key} = "{value}"' for key, value in VALUE.items())
    for name, text in (("a.csv", csv_text(VALUE)), ("a.toml", toml)):
        (tmp_path / name).write_text(text, encoding="utf-8")
    ids = {reading.import_file(tmp_path / name, dry_run=True).taken[0][1].id for name in ("a.csv", "a.toml")}
    assert len(ids) == 1


def test_digits_of_bare_toml_numbers_stay(reading: Store, tmp_path: Path) -> None:
    rows = {**VALUE, "value": ""}
    text = "[[entry]]\nvalue = 42.340\n" + "\n".join(f'{k} = "{v}"' for k, v in rows.items() if v)
    (tmp_path / "a.toml").write_text(text, encoding="utf-8")
    assert reading.import_file(tmp_path / "a.toml", dry_run=True).taken[0][1].carried == "42.340"


def test_byte_order_mark_minus_sign_and_spreadsheet_leftovers_are_taken(reading: Store, tmp_path: Path) -> None:
    row = {**VALUE, "quantity": "Hf", "value": "−277.0", "datum": "elements-298K", "conditions": ""}
    text = csv_text(row).replace("\n", ",,\n") + ",,,,\n# a note\n\n"
    (tmp_path / "a.csv").write_bytes(b"\xef\xbb\xbf" + text.replace("\n", "\r\n").encode())
    ((place, entry),) = reading.import_file(tmp_path / "a.csv", dry_run=True).taken
    assert (place, entry.value, entry.carried) == ("row 2", -277000.0, "-277.0")


def test_new_species_and_source_come_with_their_row(store: Store) -> None:
    row = {**VALUE, **SHEET, "species": "my solvent", "species_formula": "C10H22O2", "species_synonyms": "solvent 7"}
    report = store.add([row, {**row, "quantity": "Tb", "temperature": "", "value": "230", "unit": "C"}])
    assert (report.species, report.sources) == (("my solvent",), ("sheet-7",))
    species = store.show("Solvent 7").species
    assert (species.name, species.formula) == ("my solvent", "C10H22O2")
    assert species.molar_mass == pytest.approx(0.17428, abs=1e-4)
    assert store.source_show("sheet-7").authors == ("Invented Works", "Nobody, A.")
    boiling = next(e for e in store.show("my solvent").entries if e.quantity == "Tb")
    assert boiling.value == pytest.approx(503.15, abs=1e-9)
    again = store.add({**row, "value": "43.0", "temperature": "60C"})
    assert (len(again.taken), again.species, again.sources) == (1, (), ())


def test_rows_of_one_range_are_joined(reading: Store) -> None:
    row = {**VALUE, "quantity": "Cp", "phase": "g", "equation": "polynomial", "conditions": "", "unit": "R"}
    del row["temperature"], row["value"]
    report = reading.add(
        [
            {**row, "tmin": "300", "tmax": "600", "exponents": "0 1", "coefficients": "2.0 0.01"},
            {**row, "tmin": "600", "tmax": "900", "exponents": "0", "coefficients": "8.0"},
        ],
        dry_run=True,
    )
    ((_, entry),) = report.taken
    assert (entry.equation, entry.tmin, entry.tmax, len(entry.carriers)) == ("union", 300.0, 900.0, 2)


# -- what is skipped and said -----------------------------------------------------------------------------------------


def test_a_duplicate_is_reported_and_not_doubled(store: Store, tmp_path: Path) -> None:
    first = store.add(VALUE).taken[0][1]
    entries, events = count(store.store_path(), "entry"), count(store.store_path(), "event")
    for again in (VALUE, {**VALUE, "value": "42340", "unit": "J/mol"}, {**VALUE, "locator": "table 3"}):
        report = store.add(again)
        assert report.taken == ()
        assert first.id in report.skipped[0].why
    assert (count(store.store_path(), "entry"), count(store.store_path(), "event")) == (entries, events)
    assert len(store.add({**VALUE, "uncertainty": "1", "uncertainty_kind": "standard"}).taken) == 1


def test_a_withdrawn_value_may_be_added_anew(store: Store) -> None:
    first = store.add(VALUE).taken[0][1]
    store.review_withdraw([first.id], comment="typed from the wrong column")
    assert store.entry_show(first.id).status == "withdrawn"
    assert [entry.id for _, entry in store.add(VALUE).taken] == [first.id]
    assert store.entry_show(first.id).status == "draft"
    assert store.add(VALUE).taken == ()


def test_a_value_of_the_base_is_not_doubled(reading: Store) -> None:
    known = next(e for e in reading.show("carbon dioxide", quantity="Hf").entries if e.source == "codata-1989")
    row = {
        **{name: getattr(known, name) for name in ("species", "quantity", "phase", "datum", "conditions", "source")},
        "temperature": known.temperature,
        "value": known.carried,
        "unit": known.carried_unit,
        "uncertainty": f"{(known.uncertainty or 0) / 1000:g}",
        "uncertainty_kind": known.uncertainty_kind,
        "locator": "somewhere else",
    }
    report = reading.add(row, dry_run=True)
    assert report.taken == ()
    assert known.id in report.skipped[0].why


def test_rows_without_a_value_are_skipped(reading: Store) -> None:
    report = reading.add([VALUE, {**VALUE, "value": "", "temperature": "60C"}], dry_run=True)
    assert (len(report.taken), report.skipped[0].why) == (1, "no value is given")


def test_a_bare_low_temperature_is_remarked_on(reading: Store) -> None:
    report = reading.add({**VALUE, "temperature": "25"}, dry_run=True)
    assert report.taken[0][1].temperature == 25.0
    assert "25 K" in report.remarks[0][1]
    assert reading.add({**VALUE, "temperature": "298.15"}, dry_run=True).remarks == ()


# -- what is refused --------------------------------------------------------------------------------------------------

NEXT_YEAR = str(datetime.now(UTC).year + 1)
CASES = [
    ({"value": "abc"}, "value", "is not a number"),
    ({"value": "42,34"}, "value", "the decimal point is '.': 42.34"),
    ({"value": "1,234"}, "value", "1.234 or, if the comma parts thousands, 1234"),
    ({"value": "-42.34"}, "value", "is not positive"),
    ({"value": "1e999"}, "value", "too large"),
    ({"value": "nan"}, "value", "is not a number"),
    ({"uncertainty": "0,4"}, "uncertainty", "the decimal point is '.'"),
    ({"uncertainty": "0.4"}, "uncertainty_kind", "without its kind"),
    ({"temperature": "25,5C"}, "temperature", "comma"),
    ({"temperature": "-300C"}, "temperature", "below 0 K"),
    ({"temperature": ""}, "temperature", "without a temperature"),
    ({"unit": "kJ/mole"}, "unit", "did you mean 'kJ/mol'?"),
    ({"unit": "cal/mol"}, "unit", "two meanings"),
    ({"unit": "K"}, "unit", "not an enthalpy"),
    ({"species": "ethanoll"}, "species", "did you mean ethanol"),
    ({"species": "C2H6O"}, "species", "may be"),
    ({"quantity": "hvap"}, "quantity", "did you mean 'Hvap'?"),
    ({"quantity": "Hxy"}, "quantity", "unknown quantity"),
    ({"phase": "g"}, "phase", "it goes under l"),
    ({"form": "red"}, "form", "only cr has forms"),
    ({"conditions": ""}, "conditions", "to which vapour"),
    ({"datum": "elements-298K"}, "datum", "only Hf and Gf"),
    ({"quantity": "Hf", "datum": "elements-299K"}, "datum", "did you mean elements-298K"),
    ({"quantity": "Hf", "datum": "own:l@25C"}, "datum", "datum add"),
    ({"source": "codata-1998"}, "source", "did you mean 'codata-1989'?"),
    ({"source": "sheet-7", "source_title": "x"}, "source_kind", "kind is missing"),
    ({**SHEET, "source": "Data Sheet 7"}, "source", "not kebab-case"),
    ({**SHEET, "source_year": NEXT_YEAR}, "source_year", "in the future"),
    ({**SHEET, "source_year": "last"}, "source_year", "write four digits"),
    ({**SHEET, "source_class": "good"}, "source_class", "one of evaluated"),
    ({**SHEET, "source_doi": "doi:1"}, "source_doi", "write e.g. 10."),
    ({"source_title": "Another title"}, "source_title", "in the store with the title"),
    ({"locator": ""}, "locator", "locator is blank"),
    ({"locator": "a\x1b[31m"}, "locator", "control character"),
    ({"note": "a\u202eb"}, "note", "control character"),
    ({"note": "x" * 3000}, "note", "3000 characters"),
    ({"tmin": "280"}, "tmin", "or name the equation"),
    ({"equation": "polynomial"}, "equation", "only Cp"),
    ({"species": "new", "species_formula": "C2H6Oo"}, "species_formula", "'Oo'"),
    ({"species": "new", "species_formula": "CO2", "species_cas": "64-17-5"}, "species_formula", "contradicts"),
    ({"species": "new", "species_formula": "C2H6O", "species_cas": "64-17-5"}, "species_cas", "is ethanol"),
    ({"species_formula": "C3H8O"}, "species_formula", "contradicts the store"),
]


@pytest.mark.parametrize("change, column, said", CASES, ids=[f"{c}: {s}" for _, c, s in CASES])
def test_a_wrong_cell_is_refused_with_its_place(refuse: Refuse, change: dict[str, str], column: str, said: str) -> None:
    error = refuse(csv_text({**VALUE, "locator": "fine", "value": "40"} | {"note": "first"}, {**VALUE, **change}))
    assert error.where == f"own.csv, row 3, column {column}", str(error)
    assert said in str(error)


EQUATIONS = [
    ({"tmin": "330", "tmax": "280"}, "tmin", "not below"),
    ({"coefficients": "20,0 0,31"}, "coefficients", "comma"),
    ({"coefficients": "20.0"}, "coefficients", "1 coefficients, 2 exponents"),
    ({"coefficients": "-20 0.001"}, "coefficients", "check signs"),
    ({"exponents": "0 0.5"}, "exponents", "not an integer"),
    ({"equation": "polinomial"}, "equation", "did you mean 'polynomial'?"),
    ({"equation": "iapws95"}, "equation", "unknown equation"),
    ({"value": "110"}, "value", "tmin, tmax and coefficients"),
    ({"datum": "elements-298K"}, "datum", "of an equation"),
    ({"equation": "table"}, "tmin", "of one row of a table"),
]


@pytest.mark.parametrize("change, column, said", EQUATIONS, ids=[s for _, _, s in EQUATIONS])
def test_a_wrong_equation_is_refused(refuse: Refuse, change: dict[str, str], column: str, said: str) -> None:
    row = {**VALUE, "quantity": "Cp", "temperature": "", "value": "", "unit": "J/mol/K", "conditions": "1 bar"}
    row |= {"equation": "polynomial", "tmin": "280", "tmax": "330", "exponents": "0 1", "coefficients": "20.0 0.31"}
    error = refuse(csv_text({**row, **change}))
    assert error.where == f"own.csv, row 2, column {column}", str(error)
    assert said in str(error)


@pytest.mark.parametrize(
    "rows, said",
    [
        ([("20C", "2.4")], "one temperature does not make a curve"),
        ([("20C", "2.4"), ("293.15", "2.5")], "stands twice"),
    ],
)
def test_a_table_needs_two_temperatures(refuse: Refuse, rows: list[tuple[str, str]], said: str) -> None:
    row = {**VALUE, "quantity": "Cp", "unit": "kJ/kg/K", "conditions": "", "equation": "table"}
    error = refuse(csv_text(*({**row, "temperature": t, "value": v} for t, v in rows)))
    assert said in str(error)


FILES: list[tuple[str, str | bytes, str, str]] = [
    ("own.csv", csv_text({**VALUE, "colour": "red"}), "own.csv, row 1", "unknown column 'colour'"),
    ("own.csv", csv_text(VALUE).replace("locator", "unit"), "own.csv, row 1", "'unit' stands there twice"),
    ("own.csv", csv_text(VALUE).replace(",", ";"), "own.csv, row 1", "separate the columns with commas"),
    ("own.csv", csv_text(VALUE).replace("42.34", "42,34"), "own.csv, row 2", "decimals with a point"),
    ("own.csv", csv_text(VALUE).replace("42.34", '"42.34'), "own.csv, line 2", "quoting is broken"),
    ("own.csv", csv_text(VALUE, VALUE), "own.csv, row 3, column species", "stands in own.csv, row 2 already"),
    ("own.csv", csv_text(VALUE).encode("utf-16"), "own.csv", "UTF-16"),
    ("own.csv", csv_text(VALUE).encode("utf-16-le"), "own.csv", "UTF-16"),
    ("own.csv", csv_text({**VALUE, "note": "caf\xe9"}).encode("latin-1"), "own.csv, line 2", "not UTF-8"),
    ("own.csv", csv_text(VALUE).encode() + b"\0", "own.csv, line 3", "NUL"),
    ("own.csv", b"PK\x03\x04rest", "own.csv", "save the sheet as CSV"),
    ("own.csv", b"SQLite format 3\0rest", "own.csv", "a database"),
    ("own.csv", b" \n", "own.csv", "empty"),
    ("own.txt", b"hello, world\n", "own.txt", "none of the kinds"),
    ("own.toml", "entry = 3\n", "own.toml", "not a list of tables"),
    ("own.toml", "[[entri]]\n", "own.toml", "did you mean 'entry'?"),
    ("own.toml", '[[entry]]\nunit = "K"\nunit = "C"\n', "own.toml", "is not TOML"),
    ("own.toml", '[[entry]]\nvalue = 1\ncolour = "red"\n', "own.toml, entry 1 (line 1), key colour", "unknown key"),
    ("own.toml", "\n[[entry]]\nvalue = 2024-01-01\n", "own.toml, entry 1 (line 2), key value", "is a date"),
    ("own.toml", "[[entry]]\nvalue = true\n", "own.toml, entry 1 (line 1), key value", "is a bool"),
    ("own.toml", f"[[entry]]\nvalue = {'9' * 5000}\n", "own.toml", ""),
    ("own.toml", "x = " + "[" * 5000, "own.toml", ""),
    ("own.toml", '[source]\nkey = 3\n[[entry]]\nvalue = "1"\n', "own.toml", "not a table of tables"),
]


@pytest.mark.parametrize("name, content, where, said", FILES, ids=[f"{n} {w} {s}" for n, _, w, s in FILES])
def test_a_wrong_file_is_refused(refuse: Refuse, name: str, content: str | bytes, where: str, said: str) -> None:
    error = refuse(content, name)
    assert error.where == where, str(error)
    assert said in str(error)


def test_a_wrong_source_table_is_refused_at_its_key(refuse: Refuse) -> None:
    row = "\n".join(f'{k} = "{v}"' for k, v in {**VALUE, "source": "sheet-7"}.items())
    source = (
        f'[source.sheet-7]\ntitle = "x"\nauthors = ["x"]\nyear = {NEXT_YEAR}\nkind = "report"\nclass = "handbook"\n'
    )
    error = refuse(f"{source}[[entry]]\n{row}\n", "own.toml")
    assert error.where == "own.toml, source 'sheet-7', key year"
    error = refuse(f"{source.replace(NEXT_YEAR, '2-3')}[[entry]]\n{row}\n", "own.toml")
    assert "is not TOML" in str(error)
    error = refuse(f"{source}colour = 1\n[[entry]]\n{row}\n", "own.toml")
    assert error.where == "own.toml, source 'sheet-7', key colour"


def test_too_large_and_too_long_files_are_refused(refuse: Refuse, monkeypatch: pytest.MonkeyPatch) -> None:
    text = csv_text(VALUE, *({**VALUE, "temperature": f"{300 + i}"} for i in range(9)))
    monkeypatch.setattr(written, "MAX_ROWS", 9)
    assert "10 rows, and 9 are taken at once" in str(refuse(text))
    monkeypatch.setattr(files, "MAX_BYTES", 100)
    assert "larger than" in str(refuse(text))


def test_what_is_no_file_is_refused(reading: Store, tmp_path: Path) -> None:
    with pytest.raises(NotFound, match="no such file"):
        reading.import_file(tmp_path / "none.csv")
    with pytest.raises(InvalidInput, match="directory"):
        reading.import_file(tmp_path)
    with pytest.raises(InvalidInput, match="cannot be read"):
        reading.import_file("a\0b")
    for nothing in ([], {}, [3]):
        with pytest.raises(InvalidInput):
            reading.add(nothing)  # type: ignore[arg-type]


def test_an_empty_template_is_refused(refuse: Refuse) -> None:
    assert "fill in the template" in str(refuse(template("csv"), kind=NotFound))
    assert "fill in the template" in str(refuse(template("toml"), "own.toml", kind=NotFound))


def test_one_wrong_row_keeps_all_out_and_a_dry_run_lists_every_one(store: Store, tmp_path: Path) -> None:
    rows = [{**VALUE, "temperature": f"{300 + i}"} for i in range(20)]
    rows[7]["value"] = "x"
    rows[11]["unit"] = "furlong"
    rows[13] |= {**SHEET, "species": "new", "species_formula": "CH4O"}
    (tmp_path / "a.csv").write_text(csv_text(*rows), encoding="utf-8")
    before = store.store_info()
    with pytest.raises(InvalidInput) as error:
        store.import_file(tmp_path / "a.csv")
    assert error.value.where == "a.csv, row 9, column value"
    assert "1 more in a.csv" in error.value.hint
    assert len(error.value.fields["problems"]) == 2
    assert store.store_info() == before
    report = store.import_file(tmp_path / "a.csv", dry_run=True)
    assert [one.place for one in report.refused] == ["row 9, column value", "row 13, column unit"]
    assert len(report.taken) == 18
    assert store.store_info() == before


def test_a_failure_while_writing_leaves_nothing(store: Store, monkeypatch: pytest.MonkeyPatch) -> None:
    from propdb.store import log

    before = store.store_info()
    appended = log.append
    calls: list[str] = []

    def breaking(*args: Any, **kwargs: Any) -> Any:
        calls.append("")
        if len(calls) == 3:
            raise sqlite3.OperationalError("disk I/O error")
        return appended(*args, **kwargs)

    monkeypatch.setattr(log, "append", breaking)
    row = {**VALUE, **SHEET, "species": "new", "species_formula": "C9H20O"}
    with pytest.raises(PropdbError):
        store.add([{**row, "temperature": f"{300 + i}"} for i in range(5)])
    assert len(calls) == 3
    assert store.store_info() == before
    with pytest.raises(NotFound):
        store.show("new")


def test_the_past_is_not_added_to(store: Store) -> None:
    day = datetime.now(UTC).date()
    with propdb.open(store.store_path(), as_of=day) as past, pytest.raises(InvalidInput, match="past"):
        past.add(VALUE)


def test_a_name_that_failed_is_complained_about_once(reading: Store) -> None:
    rows = [{**VALUE, "species": "ethanoll", "temperature": f"{300 + i}"} for i in range(4)]
    assert len(reading.add(rows, dry_run=True).refused) == 1
