"""CSV and TSV through ``convert_table``: every row as the scalar conversion, originals byte for byte, odd files."""

from __future__ import annotations

import csv
import io
import json
import random
from collections.abc import Callable, Iterator
from decimal import Decimal
from pathlib import Path
from typing import Any

import pytest

import propdb
from propdb.errors import InvalidInput, NotFound, PressureError, PropdbError, UnitError

pytestmark = pytest.mark.extras
pytest.importorskip("pyarrow")

SPECIES = ("nitrogen", "water", "methane", "7446-09-5", "CO2", "propane")
DATUMS = ("gas-25C", "elements-298K", "own:g@60F", "gas-0C", "elements-0K")


@pytest.fixture(scope="module")
def store() -> Iterator[propdb.Store]:
    with propdb.open() as opened:
        yield opened


Convert = Callable[..., tuple[Any, list[dict[str, str]], bytes]]


@pytest.fixture
def convert(store: propdb.Store, tmp_path: Path) -> Convert:
    """Convert a text; gives the report, the rows of the output and its bytes."""

    def run(text: str | bytes, name: str = "in.csv", delimiter: str = ",", **options: Any) -> Any:
        source, target = tmp_path / name, tmp_path / f"out-{name}"
        source.write_bytes(text if isinstance(text, bytes) else text.encode())
        options = {"to": "elements-298K", **options}
        report = store.convert_table(source, target, overwrite=True, **options)
        raw = target.read_bytes()
        rows = list(csv.DictReader(io.StringIO(raw.decode("utf-8-sig"), newline=""), delimiter=delimiter))
        return report, rows, raw

    return run


def random_table(count: int, seed: int = 1) -> str:
    draw = random.Random(seed)
    lines = ["tag,species,datum,T [K],h [kJ/kg]"]
    for i in range(count):
        h = f"{draw.uniform(-9000, 4000):.4f}"
        lines.append(f"S{i},{draw.choice(SPECIES)},{draw.choice(DATUMS)},{draw.uniform(300, 900):.2f},{h}")
    return "\n".join(lines) + "\n"


H = "h on elements-298K [kJ/kg]"
SHIFT = "shift [kJ/kg]"


def test_each_row_equals_the_scalar_conversion(store: propdb.Store, convert: Convert) -> None:
    report, rows, _ = convert(random_table(300))
    assert report.clean
    for row in rows:
        answer = store.convert(
            row["h [kJ/kg]"], "kJ/kg", species=row["species"], from_=row["datum"], to="elements-298K"
        )
        assert float(row[H]) == pytest.approx(answer.value, abs=0.5001e-4)
        assert Decimal(row[H]) == Decimal(row["h [kJ/kg]"]) + Decimal(row[SHIFT])
        if answer.uncertainty is None:
            assert row["uncertainty [kJ/kg]"] == ""
        else:
            assert float(row["uncertainty [kJ/kg]"]) == pytest.approx(answer.uncertainty, rel=0.05, abs=1e-9)


def test_a_shift_that_depends_on_temperature(store: propdb.Store, convert: Convert) -> None:
    report, rows, _ = convert(random_table(200), to="elements-same-T")
    assert {row["flag"] for row in rows} <= {"ok", "no data"}
    good = [row for row in rows if row["flag"] == "ok"]
    assert len(good) > 100
    for row in good:
        answer = store.convert(
            row["h [kJ/kg]"], "kJ/kg", species=row["species"], from_=row["datum"], to="elements-same-T",
            temperature=float(row["T [K]"]), phase="g",
        )  # fmt: skip
        assert float(row["h on elements-same-T [kJ/kg]"]) == pytest.approx(answer.value, abs=0.5001e-4)
    for row in rows:
        if row["flag"] == "no data":
            assert "outside the data" in row["reason"]
            with pytest.raises(PropdbError):
                store.convert("0", "kJ/kg", species=row["species"], from_=row["datum"], to="elements-same-T",
                              temperature=float(row["T [K]"]), phase="g")  # fmt: skip


def test_there_and_back_is_the_same_text(convert: Convert) -> None:
    lines = ["species,h [kJ/kg]"]
    draw = random.Random(3)
    lines += [f"{draw.choice(SPECIES)},{draw.uniform(-9000, 4000):.6f}" for _ in range(500)]
    _, there, raw = convert("\n".join(lines) + "\n", from_="gas-25C")
    _, back, _ = convert(raw, "back.csv", from_="elements-298K", to="gas-25C", column=[f"enthalpy={H}"])
    for row, again in zip(there, back, strict=True):
        assert again["h on gas-25C [kJ/kg]"] == row["h [kJ/kg]"]
    assert "12.345600000000001" not in raw.decode()


def test_decimals_follow_the_column(convert: Convert) -> None:
    _, rows, _ = convert("species,h [kJ/kg]\nmethane,12.345600\nmethane,-7.000000\n", from_="gas-25C")
    assert all(len(row[H].partition(".")[2]) == 6 for row in rows)
    _, rows, _ = convert("species,h [kJ/kg]\nmethane,12.345600\n", from_="gas-25C", digits=2)
    assert len(rows[0][H].partition(".")[2]) == 2
    _, rows, _ = convert("species,h [kJ/kg]\nmethane,100\nmethane,12.34\n", from_="gas-25C")
    assert rows[0][H] == str(Decimal(100) + Decimal(rows[0][SHIFT]))  # nothing lost where the cells differ
    report, _, _ = convert("species,h [kJ/kg]\nmethane,100\n", from_="gas-25C")
    assert any("0 decimals" in note for note in report.data["notes"])


def test_original_bytes_stay(convert: Convert) -> None:
    text = (
        "\ufefftag,species,note,h [kJ/kg]\r\n"
        'a,methane," quoted, ""twice"" ",1.50\r\n'
        "b , methane,caf\u00e9 = +1,-2.25\r\n"
        'c,methane,"over\r\ntwo lines",3.00\r\n'
        'd,methane,5" pipe,4.00\r\n'
        "\r\n"
        "e,methane,last,5.00"
    ).encode()
    report, rows, raw = convert(text, from_="gas-25C")
    assert report.clean
    assert [row["note"] for row in rows] == [' quoted, "twice" ', "café = +1", "over\r\ntwo lines", '5" pipe', "last"]
    assert raw.startswith("\ufefftag,species,note,h [kJ/kg],".encode())
    for line in ('a,methane," quoted, ""twice"" ",1.50', "b , methane,café = +1,-2.25", 'd,methane,5" pipe,4.00'):
        assert f"\r\n{line},".encode() in raw
    assert b'c,methane,"over\r\ntwo lines",3.00,' in raw
    assert raw.count(b"\n") == raw.count(b"\r\n") == text.count(b"\n") + 1


def test_fast_and_careful_agree(convert: Convert, monkeypatch: pytest.MonkeyPatch) -> None:
    from propdb.tables import swift

    def refuse(*_: object) -> None:
        raise swift.Refused

    tables = [random_table(400, seed=9), random_table(100, 4).replace(".", ",").replace(",", ";")]
    for to in ("elements-298K", "elements-same-T", "gas-60F"):
        with monkeypatch.context() as patch:
            _, _, fast = convert(tables[0], to=to)
            patch.setattr(swift, "convert_block", refuse)
            _, _, careful = convert(tables[0], to=to)
        assert fast == careful


@pytest.mark.parametrize("ragged", ["100", "1.5", "-0.25", "1e3", "0.000001", "12.3456789012"])
def test_fast_and_careful_agree_on_ragged_columns(
    convert: Convert, monkeypatch: pytest.MonkeyPatch, ragged: str
) -> None:
    from propdb.tables import swift

    text = f"species,h [kJ/kg]\nmethane,{ragged}\nwater,7.25\nnitrogen,{ragged}\nargon,\n"
    _, rows, fast = convert(text, from_="gas-25C")
    monkeypatch.setattr(swift, "convert_block", lambda *_: (_ for _ in ()).throw(swift.Refused()))
    _, _, careful = convert(text, from_="gas-25C")
    assert fast == careful
    assert Decimal(rows[2][H]) == Decimal(ragged)  # nitrogen has the same zero on both


def test_clean_tables_take_the_fast_way(convert: Convert, monkeypatch: pytest.MonkeyPatch) -> None:
    from propdb.tables import careful

    def refuse(*_: object) -> None:
        raise AssertionError("field by field")

    monkeypatch.setattr(careful, "convert_rows", refuse)
    for to in ("elements-298K", "elements-same-T"):
        assert convert(random_table(100), to=to)[0].flags["bad row"] == 0
    quoted = '"species","h [kJ/kg]"\r\n"methane","1.50"\r\n"water","-2.25"\r\n"water",\r\n'
    assert convert(quoted, from_="gas-25C")[0].flags["ok"] == 2
    assert convert("species;h [kJ/kg]\nmethane;1,5\n", from_="gas-25C", delimiter=";", decimal="comma")[0].clean


def test_a_vapour_fraction(convert: Convert) -> None:
    report, rows, _ = convert("species,vapour fraction,h [kJ/kg]\nwater,0.5,1.5\n", from_="steam-triple-point")
    assert any("vapour fraction" in note for note in report.data["notes"])
    with pytest.raises(InvalidInput, match="vapour fraction"):
        convert("species,vapour fraction,T [K]\nwater,0.5,400\n", phase="fluid")


def test_bad_rows_are_flagged_and_kept(convert: Convert) -> None:
    cells = ["1.5", "abc", '"1,234.5"', '"12,5"', "", "n/a", "=A1*2", "1 234.5", "inf", "nan", "1e999", "-2.5"]
    text = "species,h [kJ/kg]\n" + "".join(f"methane,{cell}\n" for cell in cells) + "methan,1.0\n,1.0\nmethane\n"
    report, rows, raw = convert(text, from_="gas-25C")
    assert len(rows) == len(cells) + 3
    assert [row["flag"] for row in rows].count("ok") == 2
    assert report.flags == {"ok": 2, "extrapolated": 0, "no data": 0, "bad row": 13}
    reasons = [row["reason"] for row in rows]
    assert "'abc' is not a number" in reasons[1]
    assert "thousands" in reasons[2]
    assert "--decimal comma" in reasons[3]
    assert reasons[4] == reasons[5] == reasons[9] == "no enthalpy"
    assert "formula" in reasons[6]
    assert "thousands" in reasons[7]
    assert "did you mean methane" in reasons[12]
    assert reasons[13] == "no species"
    assert "1 field where the header has 2" in reasons[14]
    assert raw.splitlines()[3].startswith(b'methane,"1,234.5",')
    assert not report.clean
    assert report.data["first_rows_not_ok"][0]["row"] == 2
    assert "did you mean methane" in str(report)


def test_decimal_commas_are_offered_and_taken(store: propdb.Store, convert: Convert) -> None:
    text = "species;h [kJ/kg]\nmethane;12,50\nwater;-7,25\n"
    report, rows, _ = convert(text, delimiter=";", from_="gas-25C")
    assert all("--decimal comma" in row["reason"] for row in rows)
    report, rows, raw = convert(text, delimiter=";", from_="gas-25C", decimal="comma")
    assert report.clean
    answer = store.convert("12.50", "kJ/kg", species="methane", from_="gas-25C", to="elements-298K")
    assert float(rows[0][H].replace(",", ".")) == pytest.approx(answer.value, abs=0.00501)
    quoted = 'species,h [kJ/kg]\nmethane,"12,50"\n'
    report, rows, raw = convert(quoted, from_="gas-25C", decimal="comma")
    assert report.clean
    assert float(rows[0][H].replace(",", ".")) == pytest.approx(answer.value, abs=0.00501)


def test_evaluate(store: propdb.Store, convert: Convert) -> None:
    text = (
        "species,phase,T [°C],p [bar]\nnitrogen,g,600,1\nwater,fluid,400,40\nwater,l,25,\nmethane,g,-500,1\n"
        "iron,cr,25,\ncarbon,cr,25,\nmethane,g,90000,1\nwater,x,25,1\noctane,l,60,\nwater,l,400,\n"
    )
    report, rows, _ = convert(text, unit="kJ/kg")
    assert "shift [kJ/kg]" not in rows[0]
    for i, state in enumerate(
        [{"species": "nitrogen", "phase": "g", "temperature": "600C"},
         {"species": "water", "phase": "fluid", "temperature": "400C", "pressure": "40bar"},
         {"species": "water", "phase": "l", "temperature": "25C"}]
    ):  # fmt: skip
        answer = store.enthalpy(**state, datum="elements-298K", unit="kJ/kg")  # type: ignore[arg-type]
        assert float(rows[i][H]) == pytest.approx(answer.value, abs=0.501e-3)
        assert rows[i]["flag"] == "ok"
    assert (rows[3]["flag"], rows[3]["reason"]) == ("bad row", "a temperature that is not above 0 K")
    assert rows[4]["flag"] in ("ok", "no data")
    assert "forms" in rows[5]["reason"]
    assert "20000 K" in rows[6]["reason"] or "6000 K" in rows[6]["reason"]
    assert "no phase 'x'" in rows[7]["reason"]
    assert rows[8]["flag"] == "ok"
    assert rows[9]["flag"] == "no data"


def test_evaluate_many_temperatures_equals_the_scalar_answer(store: propdb.Store, convert: Convert) -> None:
    draw = random.Random(5)
    names = [("nitrogen", "g"), ("benzene", "l"), ("sulfur dioxide", "g"), ("benzene", "g")]
    lines = ["species,phase,T [K]"]
    lines += ["{},{},{:.2f}".format(*draw.choice(names), draw.uniform(285, 600)) for _ in range(150)]
    for datum in ("elements-298K", "gas-0C", "elements-same-T"):
        _, rows, _ = convert("\n".join(lines), to=datum, unit="J/mol", digits=6)
        good = 0
        for row in rows:
            state = {"phase": row["phase"], "temperature": float(row["T [K]"])}
            try:
                answer = store.enthalpy(row["species"], **state, datum=datum, unit="J/mol")  # type: ignore[arg-type]
            except PropdbError:
                assert row["flag"] == "no data"
                continue
            assert float(row[f"h on {datum} [J/mol]"]) == pytest.approx(answer.value, abs=2e-6)
            assert row["flag"] == "ok"
            good += 1
        assert good > 50


def test_extrapolated_rows_are_marked(convert: Convert) -> None:
    text = "species,phase,T [K]\nnitrogen,g,400\nnitrogen,g,25000\n"
    _, rows, _ = convert(text)
    assert [row["flag"] for row in rows] == ["ok", "no data"]
    _, rows, _ = convert(text, extrapolate=True)
    assert [row["flag"] for row in rows] == ["ok", "extrapolated"]
    assert "extrapolated" in rows[1]["reason"]


STATES = "T [C],p [bar]\n100,\n,1\n100,1\n-300,1\n-300,\n,-1\n,0\n,\n"


def test_rows_that_do_not_say_a_saturated_state(store: propdb.Store, convert: Convert) -> None:
    """A number below zero is not one that is missing: the other column must not take its place."""
    report, rows, _ = convert(STATES, species="water", phase="fluid", saturated="vapour")
    assert [row["flag"] for row in rows] == ["ok", "ok", *["bad row"] * 6]
    for row, state in zip(rows, ({"temperature": "100C"}, {"pressure": "1bar"}), strict=False):
        one = store.enthalpy("water", phase="fluid", saturated="vapour", datum="elements-298K", **state)
        assert float(row["h on elements-298K [kJ/mol]"]) == pytest.approx(one.value, abs=0.501e-3)
    assert [row["reason"] for row in rows[2:]] == [
        "a saturated state has a temperature or a pressure, not both",
        "a temperature that is not above 0 K",
        "a temperature that is not above 0 K",
        "a pressure that is not above 0",
        "a pressure that is not above 0",
        "neither a temperature nor a pressure",
    ]
    assert {r["reason"]: (r["rows"], r["first_row"]) for r in report.data["reasons"]} == {
        rows[2]["reason"]: (1, 3), rows[3]["reason"]: (2, 4), rows[5]["reason"]: (2, 6), rows[7]["reason"]: (1, 8),
    }  # fmt: skip
    assert "(first in row 4)" in str(report)
    assert all(len(line) <= 100 for line in str(report).splitlines())


def test_rows_of_the_real_fluid_need_a_pressure(convert: Convert) -> None:
    _, rows, _ = convert("T [C],p [bar]\n250,10\n250,\n250,-1\n250,0\n", species="water", phase="fluid")
    assert [row["flag"] for row in rows] == ["ok", "bad row", "bad row", "bad row"]
    assert rows[1]["reason"] == "no pressure, which the real fluid needs"
    assert rows[2]["reason"] == rows[3]["reason"] == "a pressure that is not above 0"


def test_liquid_water_under_pressure_is_liquid(store: propdb.Store, convert: Convert) -> None:
    """Saturated water at 100 °C has 419.1 kJ/kg, steam at 150 °C and 1 bar 2776.6 kJ/kg: steam tables on IAPWS-95."""
    text = "T [C],p [bar]\n100,1\n100,1.01325\n100,100\n150,1\n150,5\n25,-1\n25,0\n25,\n"
    options = {"species": "water", "phase": "l", "to": "steam-triple-point", "unit": "kJ/kg"}
    _, rows, _ = convert(text, **options)
    assert [row["flag"] for row in rows] == ["ok", "ok", "ok", "no data", "ok", "bad row", "bad row", "ok"]
    h = [float(row["h on steam-triple-point [kJ/kg]"] or "nan") for row in rows]
    assert h[0] == pytest.approx(419.1, abs=0.1)
    assert h[1] == pytest.approx(419.1, abs=0.1)
    assert 5.0 < h[2] - h[1] < 10.0  # v dp, 0.00104 m3/kg x 99 bar, less its thermal part
    assert "it has boiled at this pressure" in rows[3]["reason"]
    with pytest.raises(PropdbError, match=r"no liquid at 423\.15 K and 1 bar: it boils at 372\.7"):
        store.enthalpy("water", phase="l", temperature="150C", pressure="1bar", datum="steam-triple-point")


def test_the_reason_of_a_row_is_its_own(convert: Convert) -> None:
    """What is known at one temperature only says so, whichever rows stand beside it."""
    one = "species,phase,T [C]\nammonia,aq,60\n"
    reasons = {convert(text)[1][0]["reason"] for text in (one, one + "ammonia,aq,25\n", one + "ammonia,aq,70\n")}
    assert reasons == {"outside the data; known at 298.15 K only"}
    assert [row["flag"] for row in convert(one + "ammonia,aq,25\n")[1]] == ["no data", "ok"]


def test_gauge_pressure_with_its_atmosphere(store: propdb.Store, convert: Convert) -> None:
    text = "T [C],p [bar(g)]\n250,39\n"
    _, rows, _ = convert(text, species="water", phase="fluid", units=["pressure=bar(g)+1bar"])
    one = store.enthalpy("water", phase="fluid", temperature="250C", pressure="40bar", datum="elements-298K")
    assert float(rows[0]["h on elements-298K [kJ/mol]"]) == pytest.approx(one.value, abs=0.501e-3)


@pytest.mark.parametrize("bad", ["", "x"])
def test_a_temperature_that_no_row_needs_spoils_none(convert: Convert, bad: str) -> None:
    """Whether a block is read field by field or not: a constant shift does not look at the temperature."""
    text = f"species,datum,T [K],h [kJ/kg]\nmethane,gas-25C,abc,1.5\nmethane,gas-25C,300,1.5{bad}\n"
    _, rows, _ = convert(text)
    assert rows[0]["flag"] == "ok"
    _, rows, _ = convert(text, to="elements-same-T")
    assert (rows[0]["flag"], rows[0]["reason"]) == ("bad row", "T [K]: 'abc' is not a number")


@pytest.mark.parametrize("bad", ["2", "x"])
def test_an_empty_line_of_one_column_is_an_empty_cell(convert: Convert, bad: str) -> None:
    report, _, raw = convert(f"h [kJ/kg]\n1\n\n{bad}\n", from_="gas-25C", species="nitrogen")
    assert raw.splitlines()[2] == b",,,,bad row,no enthalpy"
    assert sum(report.flags.values()) == 3


def test_dry_compositions(store: propdb.Store, convert: Convert) -> None:
    text = "x[nitrogen],x[7732-18-5],h [kJ/mol]\n1,0.25,0.000\n0,1,0\n1,1.1,0\n0.9,0.1,0\n"
    _, rows, _ = convert(text, from_="gas-25C", composition="dry")
    assert [row["flag"] for row in rows] == ["ok", "ok", "bad row", "bad row"]
    one = store.convert("0 kJ/mol", species="water", from_="gas-25C", to="elements-298K").value
    assert float(rows[0]["h on elements-298K [kJ/mol]"]) == pytest.approx(0.25 * one, abs=0.501e-3)
    assert float(rows[1]["h on elements-298K [kJ/mol]"]) == pytest.approx(one, abs=0.501e-3)
    assert rows[2]["reason"] == "more water than the whole"
    assert rows[3]["reason"] == "the fractions sum to 0.9, not to 1"


def test_mixtures(store: propdb.Store, convert: Convert) -> None:
    text = "tag,x[nitrogen],x[methane] [%],h [kJ/kmol]\na,0.25,75,100.0\nb,0.5,60,100.0\nc,1.2,-20,1\nd,1,,0.0\n"
    report, rows, _ = convert(text, from_="gas-25C")
    one = store.convert("0 kJ/kmol", species="methane", from_="gas-25C", to="elements-298K").value
    assert float(rows[0]["h on elements-298K [kJ/kmol]"]) == pytest.approx(100.0 + 0.75 * one, abs=0.051)
    assert "sum to 1.1" in rows[1]["reason"]
    assert "negative" in rows[2]["reason"]
    assert float(rows[3]["shift [kJ/kmol]"]) == 0.0
    assert report.flags["bad row"] == 2
    assert any("mixing" in note for note in report.data["notes"])
    mass = "tag,w[water],w[methane],h [kJ/kg]\na,0.5,0.5,100.0\n"
    _, rows, _ = convert(mass, from_="gas-25C")
    each = [
        store.convert("0 kJ/kg", species=name, from_="gas-25C", to="elements-298K").value
        for name in ("water", "methane")
    ]
    assert float(rows[0][H]) == pytest.approx(100.0 + sum(each) / 2, abs=0.051)
    dry = "tag,x[nitrogen],x[oxygen],x[water],h [kJ/kmol]\na,0.79,0.21,0.1,0.0\n"
    _, rows, _ = convert(dry, from_="gas-25C", composition="dry")
    water = store.convert("0 kJ/kmol", species="water", from_="gas-25C", to="elements-298K").value
    assert float(rows[0]["shift [kJ/kmol]"]) == pytest.approx(0.1 * water, abs=0.051)


def test_sidecar(convert: Convert, tmp_path: Path, store: propdb.Store) -> None:
    import hashlib

    report, _, raw = convert(random_table(50))
    side = json.loads((tmp_path / "out-in.csv.propdb.json").read_text(encoding="utf-8"))
    assert side == json.loads(json.dumps(report.as_dict()))
    assert side["output"]["sha256"] == hashlib.sha256(raw).hexdigest()
    assert side["input"]["sha256"] == hashlib.sha256((tmp_path / "in.csv").read_bytes()).hexdigest()
    assert side["store"].startswith("content ")
    assert set(side["datums"]) == {*DATUMS}
    used = {entry for kind in side["kinds"] for entry in kind["entries"] if not entry.startswith("model:")}
    assert used
    for entry in used:
        assert store.entry_show(entry).source in side["sources"]
    assert sum(kind["rows"] for kind in side["kinds"]) == 50


# -- refusals ----------------------------------------------------------------------------------------------------------

GOOD = "species,datum,T [K],h [kJ/kg]\nmethane,gas-25C,300,1.5\n"

REFUSED: list[tuple[str | bytes, dict[str, Any], type[PropdbError], tuple[str, ...]]] = [
    ("", {}, InvalidInput, ("empty",)),
    ("\ufeff\n", {}, InvalidInput, ("empty",)),
    ("species,datum\nmethane,gas-25C\n", {}, InvalidInput, ("no column of enthalpies", "--column", "'species'")),
    ("datum,h [kJ/kg]\ngas-25C,1\n", {}, InvalidInput, ("no species", "--species")),
    ("species,h [kJ/kg]\nmethane,1\n", {}, InvalidInput, ("no datum", "--from")),
    ("species,datum,h\nmethane,gas-25C,1\n", {}, InvalidInput, ("no unit", "--unit")),
    ("species,datum,h [bar]\nmethane,gas-25C,1\n", {}, UnitError, ("bar",)),
    ("species,datum,h [kcal/kg]\nmethane,gas-25C,1\n", {}, UnitError, ("kcal_th",)),
    ("species,datum,T,h [kJ/kg]\nmethane,gas-25C,300,1\n", {}, UnitError, ("'T'", "--units temperature=C")),
    (
        "species,datum,T [K],h [kJ/kg],H [kJ/kg]\nm,g,3,1,1\n",
        {},
        InvalidInput,
        ("2 columns for the enthalpy", "--column"),
    ),
    ("species,datum,h [kJ/kg],h [kJ/kg]\nm,g,1,1\n", {}, InvalidInput, ("column 3", "column 4")),
    (GOOD, {"unit": "kJ/mol"}, InvalidInput, ("two units", "'kJ/kg'", "'kJ/mol'")),
    (GOOD, {"units": ["temperature=C"]}, InvalidInput, ("two units", "'K'")),
    (GOOD, {"units": ["pressure=bar"]}, InvalidInput, ("no such column",)),
    (GOOD, {"species": "water"}, InvalidInput, ("--species", "'species'")),
    (GOOD, {"column": ["enthalpy=hh"]}, NotFound, ("hh", "h [kJ/kg]")),
    (GOOD, {"column": ["enthalpie=h"]}, InvalidInput, ("did you mean enthalpy",)),
    (GOOD, {"column": ["h"]}, InvalidInput, ("ROLE=TEXT",)),
    (GOOD, {"to": "elements-298"}, NotFound, ("elements-298K",)),
    (GOOD, {"decimal": "semicolon"}, InvalidInput, ("point or comma",)),
    (GOOD, {"digits": 40}, InvalidInput, ("0 to 15",)),
    ("species,h [kJ/kg]\nmethane,1\n", {"from_": "gas-25C", "to": "elements-same-T"}, InvalidInput, ("temperature",)),
    (GOOD.encode("utf-16"), {}, InvalidInput, ("UTF-16", "UTF-8")),
    (GOOD.encode("utf-16-le"), {}, InvalidInput, ("UTF-16",)),
    (GOOD.replace("\n", "\r").encode(), {}, InvalidInput, ("CR alone",)),
    (b"\x00\x01\x02\x03\x00", {}, InvalidInput, ("no text",)),
    (GOOD + 'methane,"gas-25C,300,1.5\nmethane,gas-25C,300,1.5\n', {}, InvalidInput, ("row 3", "never closed")),
    ('species,"datum,h [kJ/kg]\nmethane,gas-25C,1\n', {}, InvalidInput, ("header", "never closed")),
    ("x[methane],w[water],h [kJ/kg]\n0.5,0.5,1\n", {"from_": "gas-25C"}, InvalidInput, ("one kind",)),
    ("x[methane],x[methane],h [kJ/kg]\n0.5,0.5,1\n", {"from_": "gas-25C"}, InvalidInput, ("two composition",)),
    ("x[nitrogen],x[N2],h [kJ/kg]\n0.5,0.5,1\n", {"from_": "gas-25C"}, InvalidInput, ("two composition", "x[N2]")),
    ("species,x[methane],h [kJ/kg]\nwater,1,1\n", {"from_": "gas-25C"}, InvalidInput, ("'species'", "'x[methane]'")),
    (
        "x[methane],h [kJ/kg]\n1,1\n",
        {"from_": "gas-25C", "species": "water"},
        InvalidInput,
        ("--species", "'x[methane]'"),
    ),
    (
        "x[methane],h [kJ/kg]\n1,1\n",
        {"from_": "gas-25C", "composition": "dry"},
        InvalidInput,
        ("no column of water", "--composition"),
    ),
    (GOOD, {"composition": "dry"}, InvalidInput, ("--composition",)),
    ("Stream report\n\n" + GOOD, {}, InvalidInput, ("row 3 does", "delete the rows above")),
    ("species,datum,h [kJ/kg] [kJ/mol]\nmethane,gas-25C,1\n", {}, InvalidInput, ("two units", "[kJ/mol]")),
    (
        "species,phase,T [C],p [barg]\nwater,fluid,250,9\n",
        {},
        PressureError,
        ("gauge", "--units pressure=barg+1.01325bar"),
    ),
    (
        "species,datum,h [kJ/kg],flow [m3/h]\nmethane,gas-25C,1,1\n",
        {},
        UnitError,
        ("'m3/h'", "temperature and pressure"),
    ),
]


@pytest.mark.parametrize("text, options, error, words", REFUSED)
def test_refused(
    convert: Convert, tmp_path: Path, text: str | bytes, options: dict[str, Any], error: type[PropdbError],
    words: tuple[str, ...],
) -> None:  # fmt: skip
    with pytest.raises(error) as caught:
        convert(text, **options)
    for word in words:
        assert word in str(caught.value)
    assert "\n" not in str(caught.value)
    assert [p.name for p in tmp_path.iterdir()] == ["in.csv"]


def test_paths_are_refused(store: propdb.Store, tmp_path: Path) -> None:
    source = tmp_path / "in.csv"
    source.write_text(GOOD, encoding="utf-8")
    (tmp_path / "there.csv").write_text("mine", encoding="utf-8")
    (tmp_path / "link.csv").symlink_to(source)
    for target, words in (
        ("in.csv", "the output is the input"),
        ("link.csv", "the output is the input"),
        ("there.csv", "--overwrite"),
        ("no/where.csv", "no such directory"),
        ("out.parquet", "keeps its format"),
        ("out.xyz", ".xyz"),
    ):
        with pytest.raises(PropdbError, match=words):
            store.convert_table(source, tmp_path / target, to="elements-298K")
    with pytest.raises(PropdbError, match="no such file"):
        store.convert_table(tmp_path / "nowhere.csv", tmp_path / "out.csv", to="elements-298K")
    assert (tmp_path / "there.csv").read_text(encoding="utf-8") == "mine"
    assert sorted(p.name for p in tmp_path.iterdir()) == ["in.csv", "link.csv", "there.csv"]


@pytest.mark.parametrize("cell", ["1.5", "x"])
def test_a_very_long_cell(convert: Convert, cell: str) -> None:
    long = "a" * 200_000
    report, _, raw = convert(f"h [kJ/kg],{long}\n{cell},{long}\n2.5,b\n", from_="gas-25C", species="nitrogen")
    assert report.flags["ok"] == (2 if cell == "1.5" else 1)
    assert raw.splitlines()[1].startswith(f"{cell},{long},".encode())


def test_names_from_a_file_do_not_reach_the_terminal_raw(convert: Convert) -> None:
    text = (
        'stream,species,datum,h [kJ/mol],flow [mol/s]\n"\x1b[31mred\n",nitrogen,gas-25C,1.0,1\n,\x1b[0m,gas-25C,1.0,1\n'
    )
    report, _, _ = convert(text, to="gas-25C")
    assert "\x1b" not in str(report)
    assert "\\x1b[31mred" in str(report)


def test_an_interrupt_leaves_nothing(store: propdb.Store, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from propdb.tables.progress import Progress

    def interrupt(*_: object) -> None:
        raise KeyboardInterrupt

    source = tmp_path / "in.csv"
    source.write_text(GOOD, encoding="utf-8")
    monkeypatch.setattr(Progress, "step", interrupt)
    with pytest.raises(KeyboardInterrupt):
        store.convert_table(source, tmp_path / "out.csv", to="elements-298K")
    assert [p.name for p in tmp_path.iterdir()] == ["in.csv"]


def test_a_full_disk_leaves_nothing(store: propdb.Store, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    import errno

    from propdb.tables.output import HashedWriter

    def full(*_: object) -> int:
        raise OSError(errno.ENOSPC, "No space left on device")

    source = tmp_path / "in.csv"
    source.write_text(GOOD, encoding="utf-8")
    monkeypatch.setattr(HashedWriter, "write", full)
    with pytest.raises(PropdbError, match="No space left") as caught:
        store.convert_table(source, tmp_path / "out.csv", to="elements-298K")
    assert "out.csv" in str(caught.value)
    assert [p.name for p in tmp_path.iterdir()] == ["in.csv"]


def test_blocks_of_every_size_give_the_same(
    store: propdb.Store, convert: Convert, monkeypatch: pytest.MonkeyPatch
) -> None:
    from propdb.tables import lines

    text = random_table(200).replace("S7,", 'S"7,').replace("S11,", '"S\n11",').replace("S50,", '"S""50",')
    _, _, whole = convert(text)
    for size in (64, 257, 1000, 5000):
        monkeypatch.setattr(lines, "BLOCK", size)
        monkeypatch.setattr(lines.blocks, "__kwdefaults__", {"size": size})
        _, rows, pieces = convert(text)
        assert pieces == whole
        assert len(rows) == 200


def test_an_inconsistent_line_end_is_kept(convert: Convert) -> None:
    _, rows, raw = convert(b"species,h [kJ/kg]\nmethane,1.5\r\nmethane,2.5\nmethane,3.5\r\n", from_="gas-25C")
    assert len(rows) == 3
    assert raw.count(b"\r\n") == 2
    assert raw.count(b"\n") == 4
