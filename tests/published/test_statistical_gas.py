"""Gases whose heat capacity follows from a few levels, against what others have for them."""

from __future__ import annotations

from math import exp

import pytest

from propdb.api import Store
from propdb.cp.registry import build_heat_capacity
from propdb.model.records import R_GAS

C2 = 1.438777  # hc/k [cm K], CODATA 2018

#: Electronic levels [cm-1] and their degeneracies: C. E. Moore, Atomic Energy Levels, NBS Circular 467.
LEVELS = {
    "silver": [(0.0, 2), (29552.0, 2), (30242.0, 6), (30473.0, 4)],
    "gold": [(0.0, 2), (9161.2, 6), (21435.2, 4)],
    "cadmium": [(0.0, 1), (30114.0, 1), (30656.0, 3), (31827.0, 5)],
    "bismuth": [(0.0, 4), (11419.0, 4), (15437.5, 6), (21661.0, 2)],
    "antimony": [(0.0, 4), (8512.0, 4), (9854.0, 6)],
    "tin": [(0.0, 1), (1691.8, 3), (3427.7, 5), (8613.0, 5), (17162.5, 1)],
    "selenium": [(0.0, 5), (1989.5, 3), (2534.4, 1), (9576.1, 5), (22446.0, 1)],
}


def atom(levels: list[tuple[float, int]], t: float) -> tuple[float, float]:
    """Heat capacity [J/mol/K] and H(T) - H(0) [J/mol] of an atom, summed over its levels."""
    weights = [(C2 * e / t, g * exp(-C2 * e / t)) for e, g in levels]
    total = sum(w for _, w in weights)
    mean = sum(x * w for x, w in weights) / total
    square = sum(x * x * w for x, w in weights) / total
    return R_GAS * (2.5 + square - mean * mean), R_GAS * t * (2.5 + mean)


@pytest.mark.parametrize("species", sorted(LEVELS))
def test_an_atom_against_the_sum_over_its_levels(store: Store, species: str) -> None:
    (found,) = [e for e in store.show(species).entries if e.source == "statistical-gas"]
    equation = build_heat_capacity(found.equation, found.params)
    assert found.tmin is not None
    assert found.tmax is not None
    low, high = max(found.tmin, 298.15), found.tmax
    assert found.uncertainty_kind == "maximum"
    for a, b in ((low, 0.5 * (low + high)), (low, high), (high - 1.0, high)):
        expected = atom(LEVELS[species], b)[1] - atom(LEVELS[species], a)[1]
        assert float(equation.dh(a, b)) == pytest.approx(expected, rel=found.uncertainty)


def test_tin_has_the_increment_of_the_key_values() -> None:
    """CODATA Key Values (1989): Sn(g), H(298.15 K) - H(0) = 6.215 kJ/mol; the handbook's cp is 21.3 J/mol/K."""
    cp, increment = atom(LEVELS["tin"], 298.15)
    assert increment == pytest.approx(6215.0, abs=1.0)
    assert cp == pytest.approx(21.3, abs=0.05)


#: Vibrations [cm-1] of alkali halides: K. P. Huber, G. Herzberg, Constants of Diatomic Molecules (1979).
HALIDES = {"sodium chloride": 366.0, "potassium chloride": 281.0, "cesium chloride": 214.2}


@pytest.mark.parametrize("species", sorted(HALIDES))
def test_the_formula_of_the_thallium_halides_gives_tabulated_gases(full_store: Store, species: str) -> None:
    """Rigid rotor and harmonic oscillator against JANAF's table: what is left out stays below 2 % to 1500 K."""
    theta = C2 * HALIDES[species]

    def h(t: float) -> float:
        return R_GAS * (3.5 * t + theta / (exp(theta / t) - 1.0))

    for high in (500.0, 1000.0, 1500.0):
        found = full_store.enthalpy(species, phase="g", temperature=f"{high}K", datum="gas-25C", source="chase-1998")
        assert h(high) - h(298.15) == pytest.approx(found.si, rel=0.02)


@pytest.mark.parametrize("species", ["silver", "gold", "cadmium", "bismuth", "antimony", "selenium"])
def test_the_handbook_has_the_same_value_at_room_temperature(full_store: Store, species: str) -> None:
    """CRC Handbook, 95th edition, table of standard thermodynamic properties: 20.8 J/mol/K."""
    printed = [
        e.value
        for e in full_store.show(species).entries
        if (e.quantity, e.phase, e.source) == ("Cp", "g", "crc-95") and not e.equation
    ]
    assert printed
    assert atom(LEVELS[species], 298.15)[0] == pytest.approx(printed[0], abs=0.05)
