"""Record batches, Parquet, directories, Excel and Dask: the same numbers everywhere, nothing left behind on failure."""

from __future__ import annotations

import copy
import json
import math
import subprocess
import sys
from collections.abc import Iterator
from decimal import Decimal
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import propdb
from propdb.errors import InvalidInput, PropdbError

pytestmark = pytest.mark.extras
pa = pytest.importorskip("pyarrow")
pq = pytest.importorskip("pyarrow.parquet")

SPECIES = ("nitrogen", "water", "methane", "sulfur dioxide", "propane", "unobtainium")
DATUMS = ("gas-25C", "elements-298K", "own:g@60F", "elements-same-T")
TO = "elements-298K"


@pytest.fixture(scope="module")
def store() -> Iterator[propdb.Store]:
    with propdb.open() as opened:
        yield opened


def random_table(count: int, seed: int = 1) -> Any:
    draw = np.random.default_rng(seed)
    return pa.table(
        {
            "tag": pa.array([f"S{i}" for i in range(count)]),
            "when": pa.array(range(count), pa.timestamp("ms", tz="UTC")),
            "species": pa.array([SPECIES[i] for i in draw.integers(0, len(SPECIES), count)]),
            "datum": pa.array([DATUMS[i] for i in draw.integers(0, len(DATUMS), count)]),
            "T [°C]": draw.uniform(30.0, 80.0, count),
            "h [kJ/kg]": pa.array([None if i == 7 else v for i, v in enumerate(draw.uniform(-9e3, 3e3, count))]),
        }
    )


def ulps(value: float, expected: float) -> float:
    return abs(value - expected) / math.ulp(max(abs(expected), 1e-300))


@pytest.fixture(scope="module")
def plan(store: propdb.Store) -> Iterator[Any]:
    from propdb.api.tables import open_basis
    from propdb.tables.columns import bind
    from propdb.tables.core import Plan, Settings
    from propdb.tables.oracle import Oracle
    from propdb.units import parse_unit

    oracle = Oracle(partial(open_basis, str(store.store_path()), None, None, False))
    names = random_table(1).schema.names
    yield Plan(oracle, Settings(to=TO, unit=parse_unit("kJ/kg")), bind(names))
    oracle.close()


def test_rows_equal_the_scalar_conversion(store: propdb.Store, plan: Any) -> None:
    from propdb.tables.core import convert_batch

    batch = random_table(400).to_batches()[0]
    out = convert_batch(batch, plan)
    assert out.schema.names[: batch.num_columns] == batch.schema.names
    assert out.select(batch.schema.names).equals(batch)
    rows = out.to_pylist()
    assert {row["flag"] for row in rows} == {"ok", "bad row"}
    for row in rows:
        if row["flag"] == "bad row":
            assert row["species"] == "unobtainium" or row["h [kJ/kg]"] is None
            assert row[f"h on {TO} [kJ/kg]"] is None
            continue
        assert row["reason"] is None
        answer = store.convert(
            row["h [kJ/kg]"], "kJ/kg", species=row["species"], from_=row["datum"], to=TO, phase="g",
            temperature=row["T [°C]"] + 273.15,
        )  # fmt: skip
        value = row[f"h on {TO} [kJ/kg]"]
        if row["datum"] == "elements-same-T":  # two near-equal integrals: compare with what was added
            assert abs(value - answer.value) <= 4 * math.ulp(max(abs(row["shift [kJ/kg]"]), abs(row["h [kJ/kg]"])))
        else:
            assert ulps(value, answer.value) <= 4
        if answer.uncertainty is None:
            assert row["uncertainty [kJ/kg]"] is None
        else:
            assert row["uncertainty [kJ/kg]"] == pytest.approx(answer.uncertainty, rel=1e-6, abs=1e-12)


def test_a_batch_may_be_cut_anywhere(plan: Any) -> None:
    from propdb.tables.core import convert_batch

    table = random_table(300, seed=5)
    whole = convert_batch(table.to_batches()[0], plan)
    for size in (1, 7, 64):
        parts = [convert_batch(batch, plan) for batch in table.to_batches(max_chunksize=size)]
        rows = [row for part in parts for row in part.to_pylist()]
        assert rows == whole.to_pylist()
    sliced = convert_batch(table.to_batches()[0].slice(13, 50), plan)
    assert sliced.to_pylist() == whole.to_pylist()[13:63]


def test_a_plan_travels(plan: Any) -> None:
    from propdb.tables.core import convert_batch

    batch = random_table(50, seed=6).to_batches()[0]
    other = copy.deepcopy(plan)  # by what it is pickled by
    try:
        assert convert_batch(batch, other).equals(convert_batch(batch, plan))
    finally:
        other.oracle.close()


@pytest.mark.parametrize("kind", ["dictionary", "large_string", "float32", "int32", "decimal"])
def test_other_types_of_columns(plan: Any, kind: str) -> None:
    from propdb.tables.core import convert_batch

    table = random_table(60, seed=8)
    if kind in ("dictionary", "large_string"):
        text = pa.dictionary(pa.int8(), pa.string()) if kind == "dictionary" else pa.large_string()
        changed = table.set_column(2, "species", table.column("species").cast(text))
    else:
        types = {"float32": pa.float32(), "int32": pa.int32(), "decimal": pa.decimal128(12, 3)}
        numbers = pa.chunked_array([table.column(5).cast(types[kind], safe=False)])
        changed = table.set_column(5, "h [kJ/kg]", numbers)
    out = convert_batch(changed.combine_chunks().to_batches()[0], plan).to_pylist()
    base = convert_batch(table.to_batches()[0], plan).to_pylist()
    name = f"h on {TO} [kJ/kg]"
    for row, other in zip(out, base, strict=True):
        assert row["flag"] == other["flag"]
        if other[name] is not None:
            size = {"float32": 1e-3, "int32": 1.0, "decimal": 1.01e-3}.get(kind, 0.0)
            assert float(row[name]) == pytest.approx(other[name], abs=size)
    if kind == "decimal":
        row = next(r for r in out if r["flag"] == "ok")
        assert abs(row[name].as_tuple().exponent) == 3


def test_parquet_keeps_types_and_metadata(store: propdb.Store, tmp_path: Path) -> None:
    table = random_table(5000).replace_schema_metadata({"plant": "fictional"})
    pq.write_table(table, tmp_path / "in.parquet", row_group_size=700, compression="zstd")
    report = store.convert_table(tmp_path / "in.parquet", tmp_path / "out.parquet", to=TO)
    out = pq.read_table(tmp_path / "out.parquet")
    assert out.select(table.schema.names).equals(table)
    assert out.select(table.schema.names).schema.equals(table.schema)
    assert out.schema.metadata[b"plant"] == b"fictional"
    assert pq.ParquetFile(tmp_path / "out.parquet").metadata.row_group(0).column(0).compression == "ZSTD"
    assert sum(report.flags.values()) == 5000
    side = json.loads((tmp_path / "out.parquet.propdb.json").read_text(encoding="utf-8"))
    assert side["rows"]["flags"] == report.flags
    assert side["first_rows_not_ok"][0]["row"] == 1 + next(
        i for i, flag in enumerate(out.column("flag").to_pylist()) if flag != "ok"
    )


def test_an_empty_parquet_file(store: propdb.Store, tmp_path: Path) -> None:
    pq.write_table(random_table(0), tmp_path / "in.parquet")
    report = store.convert_table(tmp_path / "in.parquet", tmp_path / "out.parquet", to=TO)
    assert sum(report.flags.values()) == 0
    assert pq.read_table(tmp_path / "out.parquet").num_rows == 0


def test_a_parquet_file_that_ends_early(store: propdb.Store, tmp_path: Path) -> None:
    pq.write_table(random_table(5000), tmp_path / "whole.parquet")
    whole = (tmp_path / "whole.parquet").read_bytes()
    (tmp_path / "whole.parquet").unlink()
    for part in (whole[: len(whole) // 2], whole[:-1], b"", b"PAR1", whole[:100] + whole[5000:]):
        (tmp_path / "in.parquet").write_bytes(part)
        with pytest.raises(InvalidInput, match="cannot be read as Parquet") as caught:
            store.convert_table(tmp_path / "in.parquet", tmp_path / "out.parquet", to=TO)
        assert "\n" not in str(caught.value)
        assert [p.name for p in tmp_path.iterdir()] == ["in.parquet"]


def test_a_column_of_the_wrong_type(store: propdb.Store, tmp_path: Path) -> None:
    table = random_table(5)
    pq.write_table(table.set_column(5, "h [kJ/kg]", table.column("tag")), tmp_path / "in.parquet")
    with pytest.raises(InvalidInput, match=r"the enthalpy is string, not a number"):
        store.convert_table(tmp_path / "in.parquet", tmp_path / "out.parquet", to=TO)
    assert [p.name for p in tmp_path.iterdir()] == ["in.parquet"]


def test_a_directory(store: propdb.Store, tmp_path: Path) -> None:
    source = tmp_path / "year"
    (source / "2001").mkdir(parents=True)
    tables = [random_table(200, seed) for seed in (1, 2, 3)]
    places = ["a.parquet", "b.parquet", "2001/c.parquet"]
    for table, place in zip(tables, places, strict=True):
        pq.write_table(table, source / place)
    report = store.convert_table(source, tmp_path / "out", to=TO)
    assert sum(report.flags.values()) == 600
    for table, place in zip(tables, places, strict=True):
        out = pq.read_table(tmp_path / "out" / place)
        assert out.select(table.schema.names).equals(table)
    assert report.data["first_rows_not_ok"][0]["file"] == "2001/c.parquet"
    pq.write_table(tables[0].drop_columns(["tag"]), source / "odd.parquet")
    with pytest.raises(InvalidInput, match=r"odd\.parquet"):
        store.convert_table(source, tmp_path / "again", to=TO)
    assert sorted(p.name for p in tmp_path.iterdir()) == ["out", "out.propdb.json", "year"]
    with pytest.raises(InvalidInput, match="lies in the input"):
        store.convert_table(source, source / "out", to=TO)
    (tmp_path / "none").mkdir()
    with pytest.raises(InvalidInput, match=r"no \*\.parquet"):
        store.convert_table(tmp_path / "none", tmp_path / "again", to=TO)


def test_several_processes_give_the_same_bits(store: propdb.Store, tmp_path: Path) -> None:
    pytest.importorskip("distributed")
    source = tmp_path / "year"
    source.mkdir()
    for seed in (1, 2):
        pq.write_table(random_table(500, seed), source / f"{seed}.parquet")
    one = store.convert_table(source, tmp_path / "one", to=TO)
    two = store.convert_table(source, tmp_path / "two", to=TO, workers=1)
    assert one.flags == two.flags
    for seed in (1, 2):
        first, second = (pq.read_table(tmp_path / name / f"{seed}.parquet") for name in ("one", "two"))
        assert first.equals(second)
    with pytest.raises(PropdbError, match="no scheduler answers"):
        store.convert_table(source, tmp_path / "three", to=TO, scheduler="tcp://127.0.0.1:1")


@pytest.mark.parametrize("mixture", [False, True])
def test_workers_report_what_their_rows_stand_on(store: propdb.Store, tmp_path: Path, mixture: bool) -> None:
    pytest.importorskip("distributed")
    source = tmp_path / "year"
    source.mkdir()
    what = {"x[nitrogen]": [0.5, 1.0], "x[methane]": [0.5, 0.0]} if mixture else {"species": ["nitrogen", "methane"]}
    pq.write_table(pa.table({**what, "phase": ["g", "g"], "T [K]": [400.0, 700.0]}), source / "a.parquet")
    one = store.convert_table(source, tmp_path / "one", to=TO).data
    two = store.convert_table(source, tmp_path / "two", to=TO, workers=1).data
    assert len(two["kinds"]) == 2
    assert all(kind["entries"] for kind in two["kinds"])
    for part in ("kinds", "sources", "rows", "reasons", "datums", "columns", "input"):
        assert one[part] == two[part], part


def test_workers_for_one_file_are_refused(store: propdb.Store, tmp_path: Path) -> None:
    pq.write_table(random_table(5), tmp_path / "in.parquet")
    with pytest.raises(InvalidInput, match="directory of Parquet"):
        store.convert_table(tmp_path / "in.parquet", tmp_path / "out.parquet", to=TO, workers=2)


def test_pandas_is_not_loaded(store: propdb.Store, tmp_path: Path) -> None:
    pq.write_table(random_table(100), tmp_path / "in.parquet")
    (tmp_path / "in.csv").write_text("species,h [kJ/kg]\nmethane,1.5\n", encoding="utf-8")
    code = (
        "import sys, propdb\n"
        "with propdb.open() as store:\n"
        f"    store.convert_table({str(tmp_path / 'in.parquet')!r}, {str(tmp_path / 'o.parquet')!r}, to='gas-0C')\n"
        f"    store.convert_table({str(tmp_path / 'in.csv')!r}, {str(tmp_path / 'o.csv')!r}, to='gas-0C',"
        " from_='gas-25C')\n"
        "print('pandas' in sys.modules)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == "False\n"


def test_a_missing_package_is_one_line(store: propdb.Store, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "in.csv").write_text("species,h [kJ/kg]\nmethane,1.5\n", encoding="utf-8")
    monkeypatch.setitem(sys.modules, "pyarrow", None)
    with pytest.raises(PropdbError, match=r"pip install 'propdb\[tables\]'"):
        store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to="gas-0C", from_="gas-25C")
    assert [p.name for p in tmp_path.iterdir()] == ["in.csv"]


# -- Excel -------------------------------------------------------------------------------------------------------------


def write_book(path: Path, rows: list[list[Any]], sheets: tuple[str, ...] = ("streams",)) -> None:
    openpyxl = pytest.importorskip("openpyxl")
    book = openpyxl.Workbook()
    book.remove(book.active)
    for title in sheets:
        page = book.create_sheet(title)
        for row in rows:
            page.append(row)
    book.save(path)


def read_book(path: Path) -> list[list[Any]]:
    openpyxl = pytest.importorskip("openpyxl")
    return [[(cell.value, cell.data_type) for cell in row] for row in openpyxl.load_workbook(path).worksheets[0].rows]


def test_excel(store: propdb.Store, tmp_path: Path) -> None:
    openpyxl = pytest.importorskip("openpyxl")
    rows: list[list[Any]] = [
        ["tag", "species", "datum", "T [°C]", "h [kJ/kg]"],
        ["S1", "methane", "gas-25C", 100, 12.5],
        ["S2", "water", "steam-triple-point", 250.0, 2800.8],
        ["S3", "methan", "gas-25C", 100, 1.0],
        ["S4", "methane", "gas-25C", 100, "=A1*2"],
        ["S5", "methane", "gas-25C", 100, "12.5"],
        ["S6", "methane", "gas-25C", 100, None],
        ["S7", "nitrogen", "elements-same-T", 100, 7],
    ]
    write_book(tmp_path / "in.xlsx", rows)
    book = openpyxl.load_workbook(tmp_path / "in.xlsx")
    for i, text in enumerate(("=1+1", "+1", "-1", "@x")):
        cell = book.active.cell(row=2 + i, column=1)
        cell.value = text
        cell.data_type = "s"
    book.save(tmp_path / "in.xlsx")
    report = store.convert_table(tmp_path / "in.xlsx", tmp_path / "out.xlsx", to=TO)
    out = read_book(tmp_path / "out.xlsx")
    assert [row[:5] for row in out] == read_book(tmp_path / "in.xlsx")
    assert [row[0] for row in out[1:5]] == [("=1+1", "s"), ("+1", "s"), ("-1", "s"), ("@x", "s")]
    assert report.flags == {"ok": 3, "extrapolated": 0, "no data": 0, "bad row": 4}
    answer = store.convert(12.5, "kJ/kg", species="methane", from_="gas-25C", to=TO)
    assert out[1][5][0] == pytest.approx(answer.value, rel=1e-15)
    assert "did you mean methane" in out[3][9][0]
    assert "formula" in out[4][9][0]
    assert "is text" in out[5][9][0]
    assert out[6][9][0] == "no enthalpy"
    assert (tmp_path / "out.xlsx.propdb.json").exists()


def test_excel_refusals(store: propdb.Store, tmp_path: Path) -> None:
    import zipfile

    rows: list[list[Any]] = [["species", "datum", "h [kJ/kg]"], ["methane", "gas-25C", 1.0]]
    source, target = tmp_path / "in.xlsx", tmp_path / "out.xlsx"
    write_book(source, rows, ("one", "two"))
    for options, words in (({}, "--sheet"), ({"sheet": "three"}, "no sheet 'three'")):
        with pytest.raises(InvalidInput, match=words):
            store.convert_table(source, target, to=TO, **options)  # type: ignore[arg-type]
    assert store.convert_table(source, target, to=TO, sheet="two").clean
    target.unlink()
    for content in (b"", b"PK no workbook", source.read_bytes()[:3000]):
        source.write_bytes(content)
        with pytest.raises(InvalidInput, match="workbook"):
            store.convert_table(source, target, to=TO)
    with zipfile.ZipFile(source, "w", zipfile.ZIP_DEFLATED) as bomb:
        bomb.writestr("xl/workbook.xml", b"<workbook/>")
        bomb.writestr("xl/worksheets/sheet1.xml", b"0" * (60 << 20))
    with pytest.raises(InvalidInput, match="unpacks from"):
        store.convert_table(source, target, to=TO)
    write_book(source, [[]])
    with pytest.raises(InvalidInput, match="empty"):
        store.convert_table(source, target, to=TO)
    assert not target.exists()
    assert not list(tmp_path.glob(".*"))


def test_excel_keeps_values_and_formats(store: propdb.Store, tmp_path: Path) -> None:
    import datetime as dt

    openpyxl = pytest.importorskip("openpyxl")
    from openpyxl.styles import Font, PatternFill
    from openpyxl.worksheet.formula import ArrayFormula

    book = openpyxl.Workbook()
    page = book.active
    page.append(["species", "h [kJ/kg]", "when", "n", "calc", "wrong"])
    page.append(["nitrogen", 1.5, dt.datetime(2026, 1, 2, 3, 4, 5), 0.25, "=B2*2", "#N/A"])
    page.append(["nitrogen", 2.5, dt.time(1, 2, 3), True, ArrayFormula("E3:E3", "=B2:B2*2"), "#DIV/0!"])
    page["F2"].data_type = page["F3"].data_type = "e"
    page["A1"].font = Font(bold=True)
    page["A2"].fill = PatternFill("solid", fgColor="FFFF00")
    page["B2"].number_format = "0.000"
    page["D2"].number_format = "0.0%"
    page["G3"].fill = PatternFill("solid", fgColor="FF0000")  # a format without a value, beside the table
    book.save(tmp_path / "in.xlsx")
    report = store.convert_table(tmp_path / "in.xlsx", tmp_path / "out.xlsx", to=TO, from_="gas-25C")
    assert report.flags["ok"] == 2
    assert "column widths" in str(report)
    out = openpyxl.load_workbook(tmp_path / "out.xlsx").active
    for row in page["A1:F3"]:
        for cell in row:
            new = out[cell.coordinate]
            if cell.coordinate == "E3":
                assert (new.value.text, new.value.ref) == ("=B2:B2*2", "E3:E3")
            else:
                assert (new.value, new.data_type) == (cell.value, cell.data_type), cell.coordinate
            assert new.number_format == cell.number_format
            assert (new.font.b, new.fill.fgColor.rgb) == (cell.font.b, cell.fill.fgColor.rgb)


def test_excel_keeps_all_digits(store: propdb.Store, tmp_path: Path) -> None:
    """Excel stores seventeen digits where a number needs them; so do the cells that are added."""
    import zipfile

    openpyxl = pytest.importorskip("openpyxl")
    write_book(tmp_path / "some.xlsx", [["species", "datum", "h [kJ/kg]", "n"], ["methane", "gas-25C", 12.625, 123.75]])
    with zipfile.ZipFile(tmp_path / "some.xlsx") as old, zipfile.ZipFile(tmp_path / "in.xlsx", "w") as new:
        for name in old.namelist():
            data = old.read(name).replace(b"<v>12.625</v>", b"<v>0.30000000000000004</v>")
            new.writestr(name, data.replace(b"<v>123.75</v>", b"<v>2.0000000000000004</v>"))
    store.convert_table(tmp_path / "in.xlsx", tmp_path / "out.xlsx", to=TO)
    row = [cell.value for cell in openpyxl.load_workbook(tmp_path / "out.xlsx").active[2]]
    assert row[2:4] == [0.30000000000000004, 2.0000000000000004]
    table = pa.table({"species": ["methane"], "datum": ["gas-25C"], "h [kJ/kg]": [0.30000000000000004]})
    pq.write_table(table, tmp_path / "in.parquet")
    store.convert_table(tmp_path / "in.parquet", tmp_path / "out.parquet", to=TO)
    assert row[4] == pq.read_table(tmp_path / "out.parquet").column(3)[0].as_py()


def test_excel_empty_rows_are_none_of_the_table(store: propdb.Store, tmp_path: Path) -> None:
    openpyxl = pytest.importorskip("openpyxl")
    rows = [["species", "h [kJ/kg]"], ["methane", 1.0], [None, None], ["methan", 2.0], ["methane", "1,234.5"], [None]]
    write_book(tmp_path / "in.xlsx", rows)
    report = store.convert_table(tmp_path / "in.xlsx", tmp_path / "out.xlsx", to=TO, from_="gas-25C")
    assert report.data["rows"]["total"] == 3
    assert [sample["row"] for sample in report.data["first_rows_not_ok"]] == [3, 4]
    assert "is text, not a number" in report.data["first_rows_not_ok"][1]["reason"]
    out = openpyxl.load_workbook(tmp_path / "out.xlsx").active
    assert [cell.value for cell in out[3]] == [None] * 7
    assert out["F4"].value == "bad row"


def test_excel_sheets_and_headers(store: propdb.Store, tmp_path: Path) -> None:
    openpyxl = pytest.importorskip("openpyxl")
    good: list[list[Any]] = [["species", "datum", "h [kJ/kg]"], ["methane", "gas-25C", 1.0]]
    write_book(tmp_path / "in.xlsx", good, ("cover", "data"))
    book = openpyxl.load_workbook(tmp_path / "in.xlsx")
    book["cover"].sheet_state = "hidden"
    book.active = 1
    book.save(tmp_path / "in.xlsx")
    report = store.convert_table(tmp_path / "in.xlsx", tmp_path / "out.xlsx", to=TO)
    assert report.clean
    assert "nor are other sheets (cover)" in report.data["notes"][-1]
    assert openpyxl.load_workbook(tmp_path / "out.xlsx").sheetnames == ["data"]
    for above in ([["Data sheet 12"]], [[None]], [["Data sheet 12"], [None]]):
        write_book(tmp_path / "in.xlsx", above + good)
        with pytest.raises(InvalidInput, match=f"row {len(above) + 1} does; delete the rows above"):
            store.convert_table(tmp_path / "in.xlsx", tmp_path / "out.xlsx", to=TO, overwrite=True)
    with pytest.raises(InvalidInput, match="macros"):
        store.convert_table(tmp_path / "in.xlsx", tmp_path / "out.xlsm", to=TO)
    (tmp_path / "old.xlsx").write_bytes(bytes.fromhex("d0cf11e0a1b11ae1") + b"\0" * 512)
    with pytest.raises(InvalidInput, match=r"\.xls workbook or has a password"):
        store.convert_table(tmp_path / "old.xlsx", tmp_path / "new.xlsx", to=TO)


def test_a_damaged_sheet_is_one_line(store: propdb.Store, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """And nothing else is printed, when the half-written output is thrown away."""
    import gc
    import sys
    import zipfile

    pytest.importorskip("openpyxl")
    write_book(tmp_path / "some.xlsx", [["species", "datum", "h [kJ/kg]"], *[["methane", "gas-25C", 1.0]] * 100])
    with zipfile.ZipFile(tmp_path / "some.xlsx") as old, zipfile.ZipFile(tmp_path / "in.xlsx", "w") as new:
        for name in old.namelist():
            data = old.read(name)
            new.writestr(name, data[: len(data) // 2] if name.endswith("sheet1.xml") else data)
    heard: list[Any] = []
    monkeypatch.setattr(sys, "unraisablehook", heard.append)
    with pytest.raises(InvalidInput, match="cannot be read as a workbook"):
        store.convert_table(tmp_path / "in.xlsx", tmp_path / "out.xlsx", to=TO)
    gc.collect()
    assert not heard
    assert sorted(path.name for path in tmp_path.iterdir()) == ["in.xlsx", "some.xlsx"]


HUGE = {
    "infinite": (pa.array([1.0, math.inf]), "no enthalpy"),
    "float": (pa.array([1.0, 1e308]), "the enthalpy is too large"),
    "integer": (pa.array([1, 2**62]), "the enthalpy is too large"),
    "unsigned": (pa.array([1, 2**64 - 1], pa.uint64()), "the enthalpy is too large"),
    "decimal": (pa.array([Decimal("1.25"), Decimal("9" * 36 + ".25")], pa.decimal128(38, 2)), "too large"),
}


@pytest.mark.filterwarnings("error")
@pytest.mark.parametrize("kind", HUGE)
def test_a_number_that_is_too_large_is_a_bad_row(store: propdb.Store, tmp_path: Path, kind: str) -> None:
    column, words = HUGE[kind]
    table = pa.table({"species": ["methane"] * 2, "h [kJ/kg]": column})
    pq.write_table(table, tmp_path / "in.parquet")
    report = store.convert_table(tmp_path / "in.parquet", tmp_path / "out.parquet", to=TO, from_="gas-25C")
    out = pq.read_table(tmp_path / "out.parquet")
    assert out.select(table.schema.names).equals(table)
    assert out.column("flag").to_pylist() == ["ok", "bad row"]
    assert words in out.column("reason")[1].as_py()
    assert out.column(2)[1].as_py() is None
    assert report.flags["bad row"] == 1


@pytest.mark.filterwarnings("error")
def test_numbers_that_are_none_in_any_column(store: propdb.Store, tmp_path: Path) -> None:
    odd = [1.0, math.inf, -math.inf, math.nan, None, 1e308]
    table = pa.table(
        {
            "species": ["water"] * 6, "phase": ["fluid"] * 6, "T [K]": [500.0] * 6, "p [bar]": odd,
            "flow [kg/h]": odd[::-1], "side": ["in", "out"] * 3,
        }
    )  # fmt: skip
    pq.write_table(table, tmp_path / "in.parquet")
    report = store.convert_table(tmp_path / "in.parquet", tmp_path / "out.parquet", to=TO, across=True)
    assert report.flags == {"ok": 1, "extrapolated": 0, "no data": 0, "bad row": 5}
    assert sum(stream["rows_left_out"] for stream in report.data["streams"]["streams"]) == 6
    pq.write_table(table.drop_columns(["p [bar]", "side"]), tmp_path / "in.parquet")
    options: dict[str, Any] = {"to": TO, "phase": None, "pressure": "1bar", "overwrite": True}
    report = store.convert_table(tmp_path / "in.parquet", tmp_path / "out.parquet", **options)
    assert report.data["streams"]["streams"][0]["rows_left_out"] == 5


@pytest.mark.parametrize("hot", [1e308, 1e-300])
def test_an_extreme_temperature_spoils_no_other_row(store: propdb.Store, tmp_path: Path, hot: float) -> None:
    table = pa.table({"species": ["nitrogen", "methane"] * 2, "phase": ["g"] * 4, "T [K]": [500.0, hot, hot, 700.0]})
    pq.write_table(table, tmp_path / "in.parquet")
    report = store.convert_table(tmp_path / "in.parquet", tmp_path / "out.parquet", to=TO, extrapolate=True)
    out = pq.read_table(tmp_path / "out.parquet").to_pylist()
    assert [row["flag"] for row in out][::3] == ["ok", "ok"]
    assert report.flags["ok"] == 2
    for row in (out[0], out[3]):
        one = store.enthalpy(row["species"], phase="g", temperature=row["T [K]"], datum=TO)
        assert row[f"h on {TO} [kJ/mol]"] == pytest.approx(one.value, rel=1e-12)
    assert not any(" K to " in (row["reason"] or "") for row in out)


def test_the_type_of_text_does_not_matter(store: propdb.Store, tmp_path: Path) -> None:
    for kind in (pa.string(), pa.large_string(), pa.string_view()):
        table = pa.table({"species": pa.array(["methane", None], kind), "h [kJ/kg]": [1.0, 2.0]})
        pq.write_table(table, tmp_path / "in.parquet")
        options: dict[str, Any] = {"to": TO, "from_": "gas-25C", "overwrite": True}
        report = store.convert_table(tmp_path / "in.parquet", tmp_path / "out.parquet", **options)
        assert report.flags["ok"] == 1
        assert pq.read_table(tmp_path / "out.parquet").schema.field("species").type == kind


def test_a_directory_is_replaced_whole_or_not_at_all(
    store: propdb.Store, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    import os

    from propdb.tables import output

    (tmp_path / "year").mkdir()
    pq.write_table(random_table(5), tmp_path / "year" / "a.parquet")
    (tmp_path / "out").mkdir()
    (tmp_path / "out" / "old").write_text("old", encoding="utf-8")
    replace = os.replace

    def full(source: Any, target: Any) -> None:
        if str(source).endswith(".part") and Path(target).name == "out":
            raise OSError(28, "No space left on device")
        replace(source, target)

    monkeypatch.setattr(output.os, "replace", full)
    with pytest.raises(PropdbError, match="No space left"):
        store.convert_table(tmp_path / "year", tmp_path / "out", to=TO, overwrite=True)
    assert sorted(p.name for p in tmp_path.iterdir()) == ["out", "year"]
    assert [p.name for p in (tmp_path / "out").iterdir()] == ["old"]
    monkeypatch.undo()
    store.convert_table(tmp_path / "year", tmp_path / "out", to=TO, overwrite=True)
    assert sorted(p.name for p in tmp_path.iterdir()) == ["out", "out.propdb.json", "year"]
    assert [p.name for p in (tmp_path / "out").iterdir()] == ["a.parquet"]


@pytest.mark.skipif(sys.platform == "win32", reason="has no named pipes in directories")
def test_a_pipe_is_refused(store: propdb.Store, tmp_path: Path) -> None:
    import os

    os.mkfifo(tmp_path / "in.csv")
    with pytest.raises(InvalidInput, match="neither a file nor a directory"):
        store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to=TO)
