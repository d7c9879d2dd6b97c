"""Tables of enthalpies from a template. The numbers are invented."""

from __future__ import annotations

from pathlib import Path

import pytest

import propdb
from propdb.api import Store
from propdb.cli.equationtext import equation_lines
from propdb.errors import InvalidInput

HEAD = "species,quantity,phase,temperature,value,unit,datum,conditions,source,locator,source_title,source_year"
HEAD += ",source_kind,source_class,source_authors"
FIRST = ",test loop sheet,2024,report,compilation,Invented Works"
LATER = ",,,,,"


def sheet(tmp_path: Path, *rows: str) -> Path:
    lines = [f"{row}{FIRST if i == 0 else LATER}" for i, row in enumerate(rows)]
    path = tmp_path / "sheet.csv"
    path.write_text("\n".join([HEAD, *lines]) + "\n", encoding="utf-8")
    return path


def row(temperature: str, value: str, **changes: str) -> str:
    cells = {
        "species": "water", "quantity": "H", "phase": "fluid", "temperature": temperature, "value": value,
        "unit": "kJ/kg", "datum": "steam-triple-point", "conditions": "40bar", "source": "loop", "locator": "table 1",
    } | changes  # fmt: skip
    return ",".join(cells.values())


@pytest.fixture
def own(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Store:
    monkeypatch.setenv("PROPDB_USER", "A. Tester")
    path = tmp_path / "own.db"
    with propdb.open() as store:
        store.store_backup(path)
    return propdb.open(path)


def test_rows_become_one_table_whatever_their_order(own: Store, tmp_path: Path) -> None:
    own.import_file(sheet(tmp_path, row("400C", "3214.5"), row("300C", "2961.7"), row("500C", "3446.0")))
    (entry,) = own.show("water", quantity="H").entries
    assert entry.status == "draft"
    assert entry.params["T"] == (573.15, 673.15, 773.15)
    assert entry.params["h"] == pytest.approx([h * 18.015268 for h in (2961.7, 3214.5, 3446.0)])
    assert entry.params["pressure"] == 4e6
    assert entry.datum == "steam-triple-point"
    assert "3 points" in equation_lines(entry.equation, entry.params)[0]
    assert entry.carried == "573.15 2961.7 | 673.15 3214.5 | 773.15 3446.0"


def test_other_pressures_and_saturation_are_other_tables(own: Store, tmp_path: Path) -> None:
    rows = [row("300C", "2961.7"), row("400C", "3214.5")]
    rows += [row(t, h, conditions="saturated vapour") for t, h in (("100C", "2675.6"), ("200C", "2792.0"))]
    own.import_file(sheet(tmp_path, *rows))
    found = {e.conditions: e.params for e in own.show("water", quantity="H").entries}
    assert set(found) == {"40bar", "saturated vapour"}
    assert found["saturated vapour"]["saturated"] == "vapour"


@pytest.mark.parametrize(
    ("rows", "column", "said"),
    [
        ([row("300C", "2961.7")], "temperature", "two rows"),
        ([row("300C", "2961.7"), row("300C", "3214.5")], "temperature", "go up"),
        ([row("300C", "2961.7", conditions=""), row("400C", "3214.5", conditions="")], "conditions", "no pressure"),
        ([row("300C", "2961.7", datum=""), row("400C", "3214.5")], "datum", "blank"),
        ([row("", "2961.7"), row("400C", "3214.5")], "temperature", "blank"),
        ([row("300C", "2961.7", datum="steam"), row("400C", "3214.5")], "datum", "no datum named"),
        ([row("300C", "2961.7"), row("400C", "3214.5", unit="kJ/mol")], "unit", "differs"),
        ([row("300C", "2961.7", unit="bar"), row("400C", "3214.5", unit="bar")], "unit", "pressure"),
        ([row("300C", "high"), row("400C", "3214.5")], "value", "not a number"),
    ],
)
def test_wrong_rows(own: Store, tmp_path: Path, rows: list[str], column: str, said: str) -> None:
    head = own.store_info()["head"]
    with pytest.raises(InvalidInput) as caught:
        own.import_file(sheet(tmp_path, *rows))
    assert said in str(caught.value)
    assert f"column {column}" in str(caught.value)
    assert own.store_info()["head"] == head
