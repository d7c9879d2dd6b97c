"""Tabulations: every row as the scalar answer, both sides of transitions, all formats."""

from __future__ import annotations

import csv
import json
from collections.abc import Iterator
from pathlib import Path

import pytest

import propdb
from propdb.errors import InvalidInput, NoData, PropdbError, TemperatureError


@pytest.fixture(scope="module")
def store() -> Iterator[propdb.Store]:
    with propdb.open() as opened:
        yield opened


def test_rows_are_the_scalar_answers(store: propdb.Store) -> None:
    table = store.tabulate(
        ["nitrogen", "CO2"], datum="gas-25C", low="25C", high="600C", step="115K", phase="g", unit="kJ/kg"
    )
    assert [line.shown for line in table.lines] == [25.0, 140.0, 255.0, 370.0, 485.0, 600.0] * 2
    for line in table.lines:
        answer = store.enthalpy(
            line.species, phase=line.phase, temperature=line.temperature, datum="gas-25C", unit="kJ/kg"
        )
        assert line.h == answer.value
        assert line.uncertainty == answer.uncertainty
        assert {step.entry for step in answer.steps if step.entry} <= set(line.entries)
    # nitrogen at 600 °C: 621 kJ/kg above 25 °C; common practice, no source
    assert table.lines[5].h == pytest.approx(621.0, rel=2e-3)
    assert table.cp_unit == "kJ/kg/K"


def test_heat_capacity_is_the_slope(store: propdb.Store) -> None:
    table = store.tabulate(["methane", "water"], datum="elements-298K", low=310.0, high=360.0, step=0.5, unit="J/mol")
    for a, b, c in zip(table.lines, table.lines[1:], table.lines[2:], strict=False):
        if a.species != c.species:
            continue
        assert a.h is not None
        assert c.h is not None
        assert b.cp == pytest.approx((c.h - a.h) / (c.temperature - a.temperature), rel=2e-5)


def test_transitions_have_both_sides(store: propdb.Store) -> None:
    table = store.tabulate("water", datum="elements-298K", low="-10C", high="120C", step="10K")
    marked = [(line.phase, line.mark) for line in table.lines if line.mark]
    assert marked == [("cr", "melting"), ("l", "melting"), ("l", "boiling"), ("g", "boiling")]
    melting = [line for line in table.lines if line.mark == "melting"]
    assert melting[0].temperature == melting[1].temperature
    assert melting[0].h is not None
    assert melting[1].h is not None
    # enthalpy of fusion of ice: 6.01 kJ/mol (CRC Handbook, 95th edition)
    assert melting[1].h - melting[0].h == pytest.approx(6.01, abs=0.01)
    temperatures = [line.temperature for line in table.lines]
    assert temperatures == sorted(temperatures)
    sulfur = store.tabulate("sulfur", datum="elements-298K", low="360K", high="380K", step="10K")
    assert [(line.form, line.mark) for line in sulfur.lines][1:3] == [
        ("rhombic", "transition"),
        ("monoclinic", "transition"),
    ]


def test_rows_without_data_say_why(store: propdb.Store) -> None:
    table = store.tabulate("nitrogen", datum="gas-25C", phase="g", low="19000K", high="21000K", step="1000K")
    assert [line.flag for line in table.lines] == ["ok", "ok", "no data"]
    assert "20000 K" in table.lines[2].reason
    far = store.tabulate(
        "nitrogen", datum="gas-25C", phase="g", low="19000K", high="21000K", step="1000K", extrapolate=True
    )
    assert far.lines[2].flag == "extrapolated"


def test_scales(store: propdb.Store) -> None:
    table = store.tabulate("oxygen", datum="gas-60F", low="60F", high="160F", step="50F", phase="g", unit="BTU/lb")
    assert [line.shown for line in table.lines] == [60.0, 110.0, 160.0]
    assert table.lines[0].h == pytest.approx(0.0, abs=1e-9)
    assert table.cp_unit == "BTU/lb/F"
    assert table.headers[3] == "T [°F]"


@pytest.mark.parametrize("ending", ["csv", "tsv", "json"])
def test_text_files(store: propdb.Store, tmp_path: Path, ending: str) -> None:
    place = tmp_path / f"t.{ending}"
    table = store.tabulate("water", datum="elements-298K", low="80C", high="120C", step="20K", out=place)
    if ending == "json":
        assert json.loads(place.read_text(encoding="utf-8")) == json.loads(json.dumps(table.as_dict()))
        return
    with place.open(encoding="utf-8", newline="") as file:
        rows = list(csv.reader(file, delimiter="," if ending == "csv" else "\t"))
    assert rows[0] == list(table.headers)
    assert len(rows) == 1 + len(table.lines)
    for row, line in zip(rows[1:], table.lines, strict=True):
        assert float(row[4]) == pytest.approx(line.h, rel=1e-11)
        assert row[10].split() == list(line.entries)


@pytest.mark.extras
def test_parquet_and_excel(store: propdb.Store, tmp_path: Path) -> None:
    pq = pytest.importorskip("pyarrow.parquet")
    openpyxl = pytest.importorskip("openpyxl")
    options = {"datum": "elements-298K", "low": "80C", "high": "120C", "step": "20K"}
    table = store.tabulate("water", **options, out=tmp_path / "t.parquet")
    store.tabulate("water", **options, out=tmp_path / "t.xlsx")
    read = pq.read_table(tmp_path / "t.parquet")
    assert read.schema.names == list(table.headers)
    assert read.column(4).to_pylist() == [line.h for line in table.lines]
    assert read.schema.metadata[b"propdb:datum"] == b"elements-298K"
    page = openpyxl.load_workbook(tmp_path / "t.xlsx").worksheets[0]
    cells = list(page.iter_rows(values_only=True))
    assert cells[0] == table.headers
    assert [row[4] for row in cells[1:]] == pytest.approx([line.h for line in table.lines], rel=1e-14)


@pytest.mark.parametrize(
    "options, error, words",
    [
        ({"low": "600C", "high": "25C"}, InvalidInput, "empty"),
        ({"step": "0K"}, InvalidInput, "step"),
        ({"step": "25"}, TemperatureError, "did you mean 25K"),
        ({"step": "1e-9K"}, InvalidInput, "at most"),
        ({"low": "25"}, TemperatureError, "25K"),
        ({"out": "x.doc"}, InvalidInput, ".doc"),
        ({"out": "no/where.csv"}, PropdbError, "no such directory"),
        ({"phase": "cr", "low": "3000K", "high": "4000K"}, NoData, "no enthalpy of nitrogen"),
    ],
)
def test_refused(
    store: propdb.Store, options: dict[str, str], error: type[PropdbError], words: str, tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
) -> None:  # fmt: skip
    monkeypatch.chdir(tmp_path)
    with pytest.raises(error, match=words):
        store.tabulate("nitrogen", **({"datum": "gas-25C"} | options))  # type: ignore[arg-type]
    assert list(tmp_path.iterdir()) == []


def test_a_file_that_exists_stays(store: propdb.Store, tmp_path: Path) -> None:
    place = tmp_path / "t.csv"
    place.write_text("mine", encoding="utf-8")
    with pytest.raises(InvalidInput, match="--overwrite"):
        store.tabulate("nitrogen", datum="gas-25C", out=place)
    assert place.read_text(encoding="utf-8") == "mine"
    store.tabulate("nitrogen", datum="gas-25C", out=place, overwrite=True)
    assert "nitrogen" in place.read_text(encoding="utf-8")


def test_the_source_of_a_heat_capacity_is_named_where_nothing_is_heated(store: propdb.Store) -> None:
    table = store.tabulate("ethanol", datum="liquid-25C", phase="l", low="25C", high="50C", step="25K")
    assert table.lines[0].h == 0.0
    assert table.lines[0].entries == table.lines[1].entries
    assert table.lines[0].sources == table.lines[1].sources != ()
