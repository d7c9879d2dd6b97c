"""Elements that are liquid at 298.15 K are counted from their crystal at 0 K."""

from __future__ import annotations

import pytest

from propdb.api import Store

# Enthalpies of formation at 0 K: Active Thermochemical Tables 1.112. H(298.15 K) - H(0 K) of the gas: Cox, Wagman and
# Medvedev (1989), CODATA Key Values for Thermodynamics. Their sum is the enthalpy at 298.15 K on elements-0K.
CASES = [
    ("bromine atom", 117.914, 6.197, 0.06),
    ("bromine", 45.680, 9.725, 0.06),
]


@pytest.mark.parametrize("species, at_0, increment, within", CASES, ids=[case[0] for case in CASES])
def test_bromine_is_crystalline_at_0_K(
    store: Store, species: str, at_0: float, increment: float, within: float
) -> None:
    answer = store.enthalpy(species, phase="g", temperature="298.15K", datum="elements-0K")
    assert answer.value == pytest.approx(at_0 + increment, abs=within)
    assert [step.start for step in answer.steps if step.species == "bromine" and step.what.startswith("incr")] == [
        "cr, 0 K"
    ]


def test_mercury_is_crystalline_at_0_K(store: Store) -> None:
    # CODATA: Hg(g) 61.38 above the liquid at 298.15 K, whose H(298.15 K) - H(0 K) is 9.342
    answer = store.enthalpy("mercury", phase="g", temperature="298.15K", datum="elements-0K")
    assert answer.value == pytest.approx(61.38 + 9.342, abs=0.05)
