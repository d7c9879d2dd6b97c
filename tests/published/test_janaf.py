"""JANAF tables as the chemicals library carries them, against the enthalpies printed in the same tables.

M. W. Chase, NIST-JANAF Thermochemical Tables, 4th ed., J. Phys. Chem. Ref. Data, Monograph 9 (1998): H - H(298.15 K)
and the enthalpy of formation at the temperature.
"""

from __future__ import annotations

import pytest

from propdb.api import Store
from propdb.errors import SplitError
from propdb.levels.curves import build_curve
from propdb.levels.policy import Policy
from propdb.model.records import Entry

PINNED = "chase-1998"


@pytest.mark.parametrize(
    ("species", "temperature", "expected"),
    [
        ("water", "1000K", 26.000),
        ("water", "2000K", 72.790),
        ("methane", "1000K", 38.179),
        ("methane", "2000K", 123.592),
    ],
)
def test_increments(full_store: Store, species: str, temperature: str, expected: float) -> None:
    found = full_store.enthalpy(species, temperature=temperature, phase="g", datum="gas-25C", source=PINNED)
    assert found.value == pytest.approx(expected, rel=5e-4)
    assert {step.source for step in found.steps} == {PINNED}


def test_formation_of_methane_at_1000_kelvin(full_store: Store) -> None:
    found = full_store.enthalpy("methane", temperature="1000K", phase="g", datum="elements-same-T", source=PINNED)
    assert found.value == pytest.approx(-89.849, rel=5e-4)


# invented: a table with one doubled temperature, to see what crosses it
NODES, VALUES = [300.0, 400.0, 500.0, 500.0, 600.0, 700.0], [20.0, 20.0, 20.0, 30.0, 30.0, 30.0]


def _entry(**fields: object) -> Entry:
    common: dict[str, object] = dict.fromkeys(Entry.__dataclass_fields__, "")
    common |= dict.fromkeys(("temperature", "value", "tmin", "tmax", "uncertainty"), None)
    common |= {"params": {}, "carriers": (), "printed": False, "status": "base", "species": "x", "source": "made up"}
    return Entry(**{**common, **fields})  # type: ignore[arg-type]


TABLE = _entry(
    id="t", quantity="Cp", phase="cr", equation="table", params={"T": NODES, "cp": VALUES}, tmin=300.0, tmax=700.0
)
STATED = _entry(id="h", quantity="Htr", phase="cr", form="a", to="cr:b", temperature=500.4, value=1000.0)
FAR = _entry(id="f", quantity="Htr", phase="cr", form="b", to="cr:c", temperature=640.0, value=5000.0)


def _curve(*transitions: Entry) -> object:
    return build_curve("x", "cr", "", [TABLE], Policy({}, lambda key: "evaluated"), transitions=transitions)


@pytest.mark.parametrize("transitions", [(), (FAR,)])
def test_a_split_is_not_crossed_unless_its_enthalpy_is_stated(transitions: tuple[Entry, ...]) -> None:
    curve = _curve(*transitions)
    assert curve.covers(300.0, 450.0)  # type: ignore[attr-defined]
    assert curve.covers(550.0, 700.0)  # type: ignore[attr-defined]
    assert not curve.covers(450.0, 550.0)  # type: ignore[attr-defined]
    with pytest.raises(SplitError, match="split at 500 K and the enthalpy of the transition is not stated"):
        curve.legs(450.0, 550.0)  # type: ignore[attr-defined]
    assert sum(leg.value for leg in curve.legs(300.0, 500.0)) == pytest.approx(4000.0)  # type: ignore[attr-defined]


def test_a_stated_transition_is_a_leg_of_its_own() -> None:
    legs = _curve(FAR, STATED).legs(400.0, 600.0)  # type: ignore[attr-defined]
    assert [(leg.what, leg.entry) for leg in legs] == [("heating", "t"), ("transition", "h"), ("heating", "t")]
    assert [leg.value for leg in legs] == pytest.approx([2000.0, 1000.0, 3000.0])
    back = _curve(STATED).legs(600.0, 400.0)  # type: ignore[attr-defined]
    assert sum(leg.value for leg in back) == pytest.approx(-6000.0)
