"""Ideal gases: increments above 298.15 K, formation at the same temperature."""

from __future__ import annotations

import dataclasses

import pytest

from propdb.api import Store
from propdb.cp.registry import build

#: Chase (1998), NIST-JANAF Thermochemical Tables, 4th ed.: H(T) - H(298.15 K) at 1000 and 2000 K [kJ/mol].
JANAF = [
    ("nitrogen", 21.463, 56.137),
    ("oxygen", 22.703, 59.175),
    ("hydrogen", 20.680, 52.951),
    ("carbon monoxide", 21.690, 56.744),
    ("carbon dioxide", 33.397, 91.439),
]
NASA = "nasa-tp-2002-211556"


@pytest.mark.parametrize(("species", "at_1000", "at_2000"), JANAF)
def test_increments_against_janaf(store: Store, species: str, at_1000: float, at_2000: float) -> None:
    for temperature, expected in ((1000.0, at_1000), (2000.0, at_2000)):
        answer = store.enthalpy(species, phase="g", temperature=temperature, datum="gas-25C", source=NASA)
        assert answer.value == pytest.approx(expected, rel=1.5e-3)


@pytest.mark.parametrize(
    ("species", "temperature", "expected"),
    [
        # McBride, Zehe, Gordon (2002), NASA/TP-2002-211556: where it departs from JANAF it is held to its own tables
        ("water", 2000.0, 73.043),
        ("methane", 1000.0, 38.685),
    ],
)
def test_increments_of_nasa_itself(store: Store, species: str, temperature: float, expected: float) -> None:
    answer = store.enthalpy(species, phase="g", temperature=temperature, datum="gas-25C", source=NASA)
    assert answer.value == pytest.approx(expected, rel=5e-4)


@pytest.mark.parametrize(("species", "at_1000", "at_2000"), JANAF)
def test_a_perturbed_coefficient_fails_the_check(store: Store, species: str, at_1000: float, at_2000: float) -> None:
    """Half a percent on the constant term of the low range moves the increment out of tolerance."""
    entry = next(e for e in store.show(species, quantity="Cp", phase="g").entries if e.source == NASA)
    params = {**entry.params, "intervals": [dict(i) for i in entry.params["intervals"]]}
    first = params["intervals"][0]
    first["a"] = [a * 1.005 if i == 2 else a for i, a in enumerate(first["a"])]
    wrong = build(dataclasses.replace(entry, params=params).equation, params)
    assert abs(wrong.dh(298.15, 1000.0) / 1e3 / at_1000 - 1.0) > 1.5e-3


def test_nitrogen_from_25_to_600_celsius(store: Store) -> None:
    # Common practice, no source: 17.39 kJ/mol.
    answer = store.enthalpy("nitrogen", phase="g", temperature="600C", datum="gas-25C", unit="kJ/mol")
    assert answer.value == pytest.approx(17.39, rel=2e-3)


@pytest.mark.parametrize(
    ("species", "expected"),
    [
        # Chase (1998), NIST-JANAF: enthalpy of formation at 1000 K [kJ/mol]
        ("water", -247.857),
        ("carbon dioxide", -394.623),
        ("carbon monoxide", -111.983),
    ],
)
def test_formation_at_the_same_temperature(store: Store, species: str, expected: float) -> None:
    answer = store.enthalpy(species, phase="g", temperature=1000.0, datum="elements-same-T")
    assert answer.value == pytest.approx(expected, abs=0.3)
    assert "1000 K" in answer.may_sum.why


@pytest.mark.parametrize(
    ("species", "expected"),
    [
        # Cox, Wagman, Medvedev (1989), CODATA: H(298.15 K) - H(0 K) [kJ/mol]
        ("nitrogen", 8.670),
        ("oxygen", 8.680),
        ("hydrogen", 8.467),
        ("carbon dioxide", 9.365),
        ("water", 9.905),
    ],
)
def test_increments_from_zero_kelvin(store: Store, species: str, expected: float) -> None:
    answer = store.enthalpy(species, phase="g", temperature=298.15, datum="gas-0K", source="codata-1989")
    assert answer.value == pytest.approx(expected, abs=0.0005)


def test_formation_at_zero_kelvin(store: Store) -> None:
    # Chase (1998), NIST-JANAF, enthalpy of formation at 0 K [kJ/mol]: CO2 -393.151, CO -113.805, H2O(g) -238.921
    for species, expected in (("carbon dioxide", -393.151), ("carbon monoxide", -113.805), ("water", -238.921)):
        answer = store.convert(
            str(store.enthalpy(species, phase="g", temperature=298.15, datum="elements-298K").value),
            "kJ/mol",
            species=species,
            from_="elements-298K",
            to="elements-298K",
        )
        at_0 = store.enthalpy(species, phase="g", temperature=298.15, datum="elements-0K")
        increment = store.enthalpy(species, phase="g", temperature=298.15, datum="gas-0K")
        assert at_0.value - increment.value == pytest.approx(expected, abs=0.1)
        assert answer.value == pytest.approx(answer.si / 1e3)


def test_one_atmosphere_is_no_shift_and_said_to_be_none(store: Store) -> None:
    answer = store.convert("-74.6 kJ/mol", species="methane", from_="elements-298K-1atm", to="elements-298K")
    assert answer.value == pytest.approx(-74.6, abs=1e-12)
    assert any("1 atm" in w for w in answer.warnings)


def test_electron_conventions(store: Store) -> None:
    """Hf(Boltzmann) = Hf(stationary) + 6.197 q kJ/mol (5/2 R x 298.15 K): Chase (1998), Ruscic (2004)."""
    for ion, q in (("proton", 1), ("chloride ion", -1)):
        shift = store.convert("0 kJ/mol", species=ion, from_="elements-298K-electron-stationary", to="elements-298K")
        assert shift.value == pytest.approx(6.197 * q, abs=0.001)


def test_red_phosphorus_and_sulfur_gas(store: Store) -> None:
    # Wagman et al. (1982): red phosphorus -17.6 kJ/mol P against white; PH3 moves by one P.
    red = store.convert("0 kJ/mol", species="phosphine", from_="elements-298K-red-P", to="elements-298K")
    assert red.value == pytest.approx(-17.6, abs=0.2)
    # Cox, Wagman, Medvedev (1989), CODATA: Hf(S2, g) = 128.60 kJ/mol; H2S moves by half of it.
    gas = store.convert("0 kJ/mol", species="hydrogen sulfide", from_="elements-298K-S2gas", to="elements-298K")
    assert gas.value == pytest.approx(64.30, abs=0.01)


def test_elements_that_are_liquid_at_298_are_crystals_at_zero_kelvin(store: Store) -> None:
    # Cox, Wagman, Medvedev (1989), CODATA: H(298.15 K) - H(0) of Br2(l) 24.52, Hg(l) 9.342, HBr(g) 8.648, H2(g) 8.467
    # kJ/mol; HBr(g) at 298.15 K -36.29. From these, Hf(HBr, g, 0 K) = -36.29 - 8.648 + 24.52 / 2 + 8.467 / 2.
    at_298 = store.enthalpy(
        "hydrogen bromide", phase="g", temperature=298.15, datum="elements-0K", source="codata-1989"
    )
    assert at_298.value == pytest.approx(-36.29 + 24.52 / 2 + 8.467 / 2, abs=0.001)
    mercury = store.enthalpy("mercury", phase="l", temperature=298.15, datum="elements-0K")
    assert mercury.value == pytest.approx(9.342, abs=0.001)
