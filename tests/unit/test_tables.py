"""Tabulated enthalpies of a group's own, on a stated datum. Their numbers are made from the store's own answers."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

import propdb
from propdb.api import Store
from propdb.cp.tabulated import EnthalpyTable
from propdb.errors import EquationError, TemperatureOutOfRange
from propdb.model.records import Carrier, Entry, Source
from propdb.store import log
from propdb.store.content import with_id
from propdb.store.migrate import immediate
from propdb.store.open import open_store
from propdb.store.own import add_own_all

SHEET = Source("own-sheet", "Data sheet of the test loop", (), 2026, "report", "handbook", "own data")
MINE = Carrier("own", "", "sheet.csv", 2, "typed by hand")


def table(store: Store, species: str, *, datum: str, temperatures: list[float], shift: float, **state: object) -> Entry:
    """A table with the store's own enthalpies plus a shift [J/mol]."""
    phase = str(state.get("phase", "g"))
    pressure = state.get("pressure")
    saturated = str(state.get("saturated", ""))
    h = [
        store.enthalpy(
            species,
            phase=phase,
            temperature=t,
            datum=datum,
            pressure=pressure,  # type: ignore[arg-type]
            saturated=saturated or None,
        ).si
        + shift
        for t in temperatures
    ]
    params: dict[str, object] = {"T": temperatures, "h": h}
    if pressure is not None:
        params["pressure"] = pressure
    if saturated:
        params["saturated"] = saturated
    return Entry(
        id="",
        species=species,
        quantity="H",
        phase=phase,
        form="",
        to="",
        equation="tabulated",
        temperature=None,
        value=None,
        unit="J/mol",
        carried=" ".join(f"{x:.3f}" for x in h),
        carried_unit="J/mol",
        params=params,
        tmin=temperatures[0],
        tmax=temperatures[-1],
        uncertainty=50.0,
        uncertainty_unit="",
        uncertainty_kind="standard",
        datum=datum,
        conditions=f"saturated {saturated}" if saturated else "",
        source="own-sheet",
        locator="sheet 1",
    )


@pytest.fixture
def own(tmp_path: Path) -> Store:
    path = tmp_path / "own.db"
    Store(path).store_rebuild(open_data=False)
    return propdb.open(path)


def approve(store: Store, entry: Entry) -> str:
    path = store.store_path()
    record = store.show(entry.species).species
    made = with_id(entry, record)
    (number,) = add_own_all(path, [(made, MINE)], "ann", sources=[SHEET])
    conn = open_store(path, write=True)
    with immediate(conn):
        log.append(conn, "approved", entry=number, who="ben")
    conn.close()
    return number


GRID = [300.0, 400.0, 500.0, 600.0, 700.0]


@pytest.mark.parametrize("datum", ["gas-25C", "gas-60F", "elements-298K", "combustion-gross-25C", "own:g@65C"])
def test_a_pinned_table_is_the_source_of_levels(own: Store, datum: str) -> None:
    """A table 500 J/mol high makes every state along it 500 J/mol higher, whatever datum the answer is wanted on."""
    approve(own, table(own, "methane", datum=datum, temperatures=GRID, shift=500.0))
    for wanted in ("elements-298K", "gas-25C", "combustion-net-25C"):
        ours = own.enthalpy("methane", phase="g", temperature=500.0, datum=wanted)
        pinned = own.enthalpy("methane", phase="g", temperature=500.0, datum=wanted, source="own-sheet")
        assert pinned.si - ours.si == pytest.approx(500.0, abs=1e-6)
        assert any(s.source == "own-sheet" for s in pinned.steps)
        between = own.enthalpy("methane", phase="g", temperature=551.0, datum=wanted, source="own-sheet")
        plain = own.enthalpy("methane", phase="g", temperature=551.0, datum=wanted)
        assert between.si - plain.si == pytest.approx(500.0, abs=15.0)  # interpolation over 100 K
        (closure,) = [c for c in ours.closures if c.source == "own-sheet"]
        assert closure.difference == pytest.approx(0.5, abs=1e-6)  # kJ/mol


def test_a_steam_table_of_ones_own(own: Store) -> None:
    """Superheated steam at 40 bar, on the datum of steam tables: used at that pressure only."""
    entry = table(
        own,
        "water",
        phase="fluid",
        pressure=4e6,
        datum="steam-triple-point",
        temperatures=[550.0, 600.0, 700.0, 800.0],
        shift=-180.0,
    )
    approve(own, entry)
    ask = {"phase": "fluid", "temperature": 600.0, "datum": "elements-298K", "source": "own-sheet"}
    pinned = own.enthalpy("water", pressure=4e6, **ask)  # type: ignore[arg-type]
    ours = own.enthalpy("water", pressure=4e6, **{**ask, "source": None})  # type: ignore[arg-type]
    assert pinned.si - ours.si == pytest.approx(-180.0, abs=1e-6)
    elsewhere = own.enthalpy("water", pressure=3e6, **ask)  # type: ignore[arg-type]
    assert all(s.source != "own-sheet" for s in elsewhere.steps)
    assert any("not from the pinned source" in w for w in elsewhere.warnings)


def test_a_draft_is_not_used(own: Store) -> None:
    entry = with_id(table(own, "methane", datum="gas-25C", temperatures=GRID, shift=500.0), own.show("methane").species)
    add_own_all(own.store_path(), [(entry, MINE)], "ann", sources=[SHEET])
    answer = own.enthalpy("methane", phase="g", temperature=500.0, datum="gas-25C", source="own-sheet")
    assert all(s.source != "own-sheet" for s in answer.steps)
    assert all(c.source != "own-sheet" for c in answer.closures)


def test_show_lists_the_table(own: Store) -> None:
    approve(own, table(own, "methane", datum="gas-25C", temperatures=GRID, shift=0.0))
    (entry,) = own.show("methane", quantity="H").entries
    assert entry.datum == "gas-25C"
    assert entry.params["T"] == tuple(GRID)


def test_the_interpolant_keeps_its_rows_and_refuses_beyond() -> None:
    made = EnthalpyTable([300.0, 400.0, 500.0], [0.0, 3000.0, 6100.0])
    assert [made.h(t) for t in made.temperatures] == [0.0, 3000.0, 6100.0]
    assert 0.0 < made.h(350.0) < 3000.0
    with pytest.raises(TemperatureOutOfRange, match="never extrapolated"):
        made.h(299.9)


@pytest.mark.parametrize(
    ("temperatures", "enthalpies", "problem"),
    [
        ([300.0], [0.0], "two rows"),
        ([300.0, 400.0], [0.0], "do not match"),
        ([300.0, 300.0], [0.0, 1.0], "go up"),
        ([300.0, float("nan")], [0.0, 1.0], "finite"),
    ],
)
def test_bad_tables(temperatures: list[float], enthalpies: list[float], problem: str) -> None:
    with pytest.raises(EquationError, match=problem):
        EnthalpyTable(temperatures, enthalpies)


def test_an_entry_copy_is_another_entry(own: Store) -> None:
    entry = table(own, "methane", datum="gas-25C", temperatures=GRID, shift=0.0)
    record = own.show("methane").species
    assert with_id(entry, record).id != with_id(replace(entry, datum="gas-0C"), record).id
