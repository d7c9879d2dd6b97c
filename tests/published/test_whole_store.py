"""Published values in the store that people get, open data and all, with no source pinned.

Values that thousands of imported ones must not draw away from what was published.
"""

from __future__ import annotations

import pytest

from propdb.api import Store
from propdb.errors import Ambiguous

#: species, phase, temperature, datum, unit, published, tolerance, where
STATES = [
    # International Association for the Properties of Water and Steam, R6-95(2018), by table 8 and steam tables on it
    ("water", "l", "25C", "steam-triple-point", "kJ/kg", 104.92, 0.1),
    # Cox, Wagman, Medvedev (1989), CODATA Key Values for Thermodynamics: table of formation enthalpies
    ("water", "l", "298.15K", "elements-298K", "kJ/mol", -285.830, 0.001),
    ("water", "g", "298.15K", "elements-298K", "kJ/mol", -241.826, 0.040),
    ("carbon dioxide", "g", "298.15K", "elements-298K", "kJ/mol", -393.51, 0.13),
    ("ammonia", "g", "298.15K", "elements-298K", "kJ/mol", -45.94, 0.35),
    ("sulfur dioxide", "g", "298.15K", "elements-298K", "kJ/mol", -296.81, 0.20),
    # ISO 6976:2016, gross molar calorific value at 25 C
    ("methane", "g", "25C", "combustion-gross-25C", "kJ/mol", 890.58, 0.38),
    ("hydrogen", "g", "25C", "combustion-gross-25C", "kJ/mol", 285.83, 0.1),
    ("carbon monoxide", "g", "25C", "combustion-gross-25C", "kJ/mol", 282.98, 0.12),
    ("ethane", "g", "25C", "combustion-gross-25C", "kJ/mol", 1560.69, 1.0),
    ("propane", "g", "25C", "combustion-gross-25C", "kJ/mol", 2219.17, 1.1),
    # Chase (1998), NIST-JANAF Thermochemical Tables: H - H(298.15 K) at 1000 K
    ("nitrogen", "g", "1000K", "gas-25C", "kJ/mol", 21.463, 0.02),
    ("oxygen", "g", "1000K", "gas-25C", "kJ/mol", 22.703, 0.02),
    ("carbon dioxide", "g", "1000K", "gas-25C", "kJ/mol", 33.397, 0.03),
    ("water", "g", "1000K", "gas-25C", "kJ/mol", 26.000, 0.02),
]


@pytest.mark.parametrize(("species", "phase", "temperature", "datum", "unit", "published", "tolerance"), STATES)
def test_states(
    full_store: Store,
    species: str,
    phase: str,
    temperature: str,
    datum: str,
    unit: str,
    published: float,
    tolerance: float,
) -> None:
    answer = full_store.enthalpy(species, phase=phase, temperature=temperature, datum=datum, unit=unit)
    assert answer.value == pytest.approx(published, abs=tolerance)


def test_steam_on_the_elements(full_store: Store) -> None:
    """2800.8 kJ/kg, saturated at 40 bar by the steam table, with CODATA's formation enthalpy of the liquid."""
    answer = full_store.convert(
        2800.8, "kJ/kg", species="water", from_="steam-triple-point", to="elements-298K", to_unit="kJ/mol"
    )
    assert answer.value == pytest.approx(-237.263, abs=0.002)
    assert [step.source for step in answer.steps if step.entry] == ["codata-1989", "iapws-r6-95"]


def test_a_reaction_written_with_formulas(full_store: Store) -> None:
    """ISO 6976:2016. The formulas mean the substances that everybody means by them."""
    answer = full_store.reaction("CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)", temperature="25C")
    assert answer.value == pytest.approx(-890.58, abs=0.38)
    for formula, name in (
        ("C2H4", "ethylene"),
        ("HCN", "hydrogen cyanide"),
        ("N2O", "nitrous oxide"),
        ("C6H6", "benzene"),
    ):
        assert full_store.show(formula).species.name == name
    with pytest.raises(Ambiguous):
        full_store.show("C6H14")
