"""Closures: what two publications say of one thing, e.g. formation enthalpies of two phases and a latent heat."""

from __future__ import annotations

import pytest

from propdb.api import Store
from propdb.levels.residual import enthalpy as residual

#: Liquids whose formation enthalpies (Pedley, Naylor, Kirby 1986) and enthalpies of vaporisation at 298.15 K (Majer,
#: Svoboda 1985) are independent measurements.
LIQUIDS = [
    "methanol",
    "ethanol",
    "1-propanol",
    "2-propanol",
    "benzene",
    "toluene",
    "ethylbenzene",
    "cyclohexane",
    "n-pentane",
    "n-hexane",
    "n-heptane",
    "n-octane",
    "acetone",
]


def value(store: Store, species: str, quantity: str, phase: str, source: str) -> float:
    found = [
        e
        for e in store.show(species, quantity=quantity, phase=phase).entries
        if e.source == source and e.temperature == 298.15
    ]
    assert len(found) == 1
    assert found[0].value is not None
    return found[0].value


@pytest.mark.parametrize("species", LIQUIDS)
def test_formation_against_vaporisation(store: Store, species: str) -> None:
    """Within 0.5 kJ/mol, with the residual enthalpy of the saturated vapour between real vapour and ideal gas."""
    gas = value(store, species, "Hf", "g", "pedley-1986")
    liquid = value(store, species, "Hf", "l", "pedley-1986")
    latent = value(store, species, "Hvap", "l", "majer-svoboda-1985")
    constants = {
        key: store.show(species, quantity=quantity).entries[0].value
        for key, quantity in (("tc", "Tc"), ("pc", "Pc"), ("omega", "omega"))
    }
    gap = residual(temperature=298.15, **constants)[0]  # type: ignore[arg-type]
    assert gap < 0.0
    assert gas - liquid == pytest.approx(latent - gap, abs=500.0)


@pytest.mark.parametrize("species", ["benzene", "ethanol", "n-hexane", "acetone"])
def test_the_answer_reports_the_closure(store: Store, species: str) -> None:
    answer = store.enthalpy(species, phase="g", temperature="25C", datum="liquid-25C")
    found = [c for c in answer.closures if c.source == "pedley-1986"]
    assert found
    assert all(abs(c.difference) < 1.0 for c in found)


def test_latent_heats_of_textbooks(store: Store) -> None:
    # Majer, Svoboda (1985): ethanol 42.32, benzene 33.83; IAPWS R6-95: water 43.99 kJ/mol at 25 C, to the real vapour
    for species, expected in (("ethanol", 42.32), ("benzene", 33.83)):
        answer = store.enthalpy(
            species,
            phase="fluid",
            temperature="25C",
            saturated="vapour",
            datum="liquid-25C",
            source="majer-svoboda-1985",
        )
        assert answer.value == pytest.approx(expected, abs=0.02)
    water = store.enthalpy("water", phase="fluid", temperature="25C", saturated="vapour", datum="liquid-25C")
    assert water.value == pytest.approx(43.99, abs=0.01)


def test_the_real_vapour_of_water_at_its_boiling_point(store: Store) -> None:
    """Gap between real vapour and ideal gas, IAPWS R6-95: 0.02, 0.24, 4.5 kJ/mol at 298 K, the boiling point, 550 K."""
    for t, gap, tolerance in ((298.15, 0.0266, 0.001), (373.124, 0.236, 0.001), (550.0, 4.46, 0.01)):
        gas = store.enthalpy("water", phase="g", temperature=t, datum="elements-298K")
        real = store.enthalpy("water", phase="fluid", temperature=t, saturated="vapour", datum="elements-298K")
        # the ideal gas is heated along NASA's curve, the real vapour by the formulation: up to 0.02 kJ/mol apart
        assert gas.value - real.value == pytest.approx(gap, abs=tolerance + 0.02)


def test_transition_of_sulfur(store: Store) -> None:
    # Chase (1998), NIST-JANAF: rhombic to monoclinic 0.401 kJ/mol at 368.3 K, fusion 1.721 kJ/mol at 388.36 K
    entries = {(e.quantity, e.form): e.value for e in store.show("sulfur").entries if e.source == "chase-1998"}
    assert entries[("Htr", "rhombic")] == pytest.approx(401.0, abs=2.0)
    assert entries[("Hfus", "monoclinic")] == pytest.approx(1721.0, abs=10.0)


def test_quartz_passes_into_its_high_temperature_form(store: Store) -> None:
    """Equal Gibbs energies at the transition: its enthalpy is T times the entropy step, 410.0 J/mol by NASA/TP-2002."""
    low = store.enthalpy("silicon dioxide", phase="cr", form="quartz", temperature=848.0, datum="elements-298K")
    high = store.enthalpy("silicon dioxide", phase="cr", form="beta-quartz", temperature=848.0, datum="elements-298K")
    assert high.si - low.si == pytest.approx(410.0, abs=1.0)
    above = store.enthalpy("silicon dioxide", phase="cr", form="beta-quartz", temperature=1000.0, datum="elements-298K")
    assert above.si > high.si
