"""Calorific values by ISO 6976:2016, Natural gas - Calculation of calorific values ... from composition."""

from __future__ import annotations

import pytest

from propdb.api import Store

PINNED = "codata-1989,nasa-tp-2002-211556"

#: ISO 6976:2016, gross molar calorific value at 25 C [kJ/mol], tolerance
GROSS = [
    ("methane", 890.58, 0.1),
    ("hydrogen", 285.83, 0.1),
    ("carbon monoxide", 282.98, 0.1),
    ("ethane", 1560.69, 1560.69 * 5e-4),
    ("propane", 2219.17, 2219.17 * 5e-4),
]


@pytest.mark.parametrize(("species", "expected", "tolerance"), GROSS)
def test_gross_at_25(store: Store, species: str, expected: float, tolerance: float) -> None:
    answer = store.enthalpy(species, phase="g", temperature="25C", datum="combustion-gross-25C", source=PINNED)
    assert answer.value == pytest.approx(expected, abs=tolerance)
    # converting the formation enthalpy is the same thing
    formation = store.enthalpy(species, phase="g", temperature="25C", datum="elements-298K", source=PINNED)
    other = store.convert(
        formation.value, "kJ/mol", species=species, from_="elements-298K", to="combustion-gross-25C", source=PINNED
    )
    assert other.value == pytest.approx(answer.value, abs=1e-9)


@pytest.mark.parametrize(
    ("species", "expected"),
    # ISO 6976:2016, gross molar calorific value at 15 C less that at 25 C [kJ/mol]
    [("methane", 0.93), ("hydrogen", 0.32), ("carbon monoxide", -0.07)],
)
def test_gross_at_15_less_25(store: Store, species: str, expected: float) -> None:
    values = [
        store.enthalpy(species, phase="g", temperature=t, datum=f"combustion-gross-{t}", source=PINNED).value
        for t in ("15C", "25C")
    ]
    assert values[0] - values[1] == pytest.approx(expected, abs=0.01)


@pytest.mark.parametrize(
    ("species", "expected"),
    # ISO 6976:2016, net molar calorific value at 25 C [kJ/mol]
    [("methane", 802.55), ("hydrogen", 241.82)],
)
def test_net_at_25(store: Store, species: str, expected: float) -> None:
    answer = store.enthalpy(species, phase="g", temperature="25C", datum="combustion-net-25C", source=PINNED)
    assert answer.value == pytest.approx(expected, abs=0.1)


def test_products_of_combustion_have_zero(store: Store) -> None:
    answer = store.convert("-393.51 kJ/mol", species="carbon dioxide", from_="elements-298K", to="combustion-net-25C")
    # Cox, Wagman, Medvedev (1989), CODATA: Hf(CO2, g) = -393.51 kJ/mol
    assert answer.value == pytest.approx(0.0, abs=1e-9)


def test_methane_burns_by_both_routes(store: Store) -> None:
    answer = store.reaction("CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)", temperature="25C", source=PINNED)
    assert answer.value == pytest.approx(-890.58, abs=0.1)  # ISO 6976:2016
    assert answer.sensible_route == pytest.approx(answer.formation_route, abs=1e-9)


@pytest.mark.parametrize(
    ("equation", "temperature", "expected", "tolerance"),
    [
        # Chase (1998), NIST-JANAF, from the formation enthalpies at 1000 K
        ("CO(g) + H2O(g) -> CO2(g) + H2(g)", "1000K", -34.8, 0.3),
        # Cox, Wagman, Medvedev (1989), CODATA
        ("H2(g) + 1/2 O2(g) -> H2O(l)", "298.15K", -285.830, 0.001),
        ("1/2 N2(g) + 3/2 H2(g) -> NH3(g)", "298.15K", -45.94, 0.35),
    ],
)
def test_reactions(store: Store, equation: str, temperature: str, expected: float, tolerance: float) -> None:
    answer = store.reaction(equation, temperature=temperature)
    assert answer.value == pytest.approx(expected, abs=tolerance)
    assert abs(answer.disagreement) < 1e-9
