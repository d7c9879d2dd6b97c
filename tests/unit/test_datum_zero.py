"""What each kind of datum calls zero, by exact stoichiometry."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from fractions import Fraction
from pathlib import Path

import pytest

from propdb.datum import ELECTRON, check_independent, parse_datums, parse_inline, solve, zero
from propdb.errors import DatumError, NotFound
from propdb.model.formula import parse_formula
from propdb.model.records import Datum, Species, Zero

SEED = Path(__file__).resolve().parents[2] / "seeds_data"

FORMULAS = {
    "hydrogen": "H2",
    "oxygen": "O2",
    "nitrogen": "N2",
    "argon": "Ar",
    "helium": "He",
    "neon": "Ne",
    "krypton": "Kr",
    "xenon": "Xe",
    "carbon": "C",
    "chlorine": "Cl2",
    "sodium": "Na",
    "iron": "Fe",
    "sulfur": "S",
    "disulfur": "S2",
    "phosphorus": "P",
    "mercury": "Hg",
    "bromine": "Br2",
    "carbon dioxide": "CO2",
    "water": "H2O",
    "sulfur dioxide": "SO2",
    "proton": "H+",
    "electron": "e-",
}


def composition(name: str) -> tuple[Mapping[str, Fraction | int], int]:
    if name not in FORMULAS:
        raise NotFound(f"no species {name!r}")
    formula = parse_formula(FORMULAS[name])
    return formula.counts, formula.charge


def species(formula: str, name: str = "") -> Species:
    parsed = parse_formula(formula)
    return Species(name or formula, formula, parsed.charge, tuple(parsed.counts.items()), 0.1)


def coefficients(z: Zero) -> dict[str, Fraction]:
    return {term.species: term.coefficient for term in z.terms}


@pytest.fixture(scope="module")
def datums() -> dict[str, Datum]:
    return parse_datums(tomllib.loads((SEED / "datums.toml").read_text(encoding="utf-8")), where="datums.toml")


def test_a_coefficient_is_per_atom_of_the_reference_form(datums: dict[str, Datum]) -> None:
    z = zero(datums["elements-298K"], species("NH3"), phase="g", composition=composition)
    assert coefficients(z) == {"nitrogen": Fraction(1, 2), "hydrogen": Fraction(3, 2)}
    assert {(t.zero.phase, t.zero.temperature) for t in z.terms} == {("g", 298.15)}
    assert z.h0 == 0


def test_reference_forms_at_298_K(datums: dict[str, Datum]) -> None:
    """C graphite, P white, S rhombic, Sn white, Br2 and Hg liquid (CODATA 1989)."""
    schedule = datums["elements-298K"].schedule
    found = {e: (z.species, z.phase, z.form) for e, ((_, z),) in schedule.items()}
    assert found["C"] == ("carbon", "cr", "graphite")
    assert found["P"] == ("phosphorus", "cr", "white")
    assert found["S"] == ("sulfur", "cr", "rhombic")
    assert found["Sn"] == ("tin", "cr", "white")
    assert found["Br"] == ("bromine", "l", "")
    assert found["Hg"] == ("mercury", "l", "")
    assert found["Ga"] == ("gallium", "cr", "")
    assert found["I"] == ("iodine", "cr", "")
    assert found["D"] == ("deuterium", "g", "")
    assert found[ELECTRON] == ("electron", "g", "")


def test_bromine_and_mercury_are_crystalline_at_0_K(datums: dict[str, Datum]) -> None:
    schedule = datums["elements-0K"].schedule
    for element in ("Br", "Hg"):
        ((_, state),) = schedule[element]
        assert (state.phase, state.temperature) == ("cr", 0.0)


@pytest.mark.parametrize(
    "temperature, phase, form",
    [
        (300.0, "cr", "rhombic"),
        (368.3, "cr", "rhombic"),
        (368.31, "cr", "monoclinic"),
        (400.0, "l", ""),
        (882.117, "l", ""),
        (900.0, "g", ""),
    ],
)
def test_sulfur_follows_its_schedule(datums: dict[str, Datum], temperature: float, phase: str, form: str) -> None:
    z = zero(datums["elements-same-T"], species("SO2"), phase="g", composition=composition, temperature=temperature)
    (sulfur,) = [t for t in z.terms if t.species != "oxygen"]
    assert (sulfur.zero.phase, sulfur.zero.form) == (phase, form)
    assert sulfur.coefficient == (Fraction(1, 2) if phase == "g" else 1)
    assert sulfur.zero.temperature == "same"


@pytest.mark.parametrize(
    "formula, temperature, name, phase",
    [("HgO", 629.8, "mercury", "l"), ("HgO", 629.9, "mercury", "g"), ("HBr", 265.8, "bromine", "cr")],
)
def test_other_schedules(datums: dict[str, Datum], formula: str, temperature: float, name: str, phase: str) -> None:
    z = zero(datums["elements-same-T"], species(formula), phase="g", composition=composition, temperature=temperature)
    assert {t.zero.phase for t in z.terms if t.species == name} == {phase}


def test_same_temperature_needs_a_temperature(datums: dict[str, Datum]) -> None:
    with pytest.raises(DatumError, match="no temperature was given"):
        zero(datums["elements-same-T"], species("SO2"), phase="g", composition=composition)


def test_a_schedule_that_ends_refuses(datums: dict[str, Datum]) -> None:
    with pytest.raises(DatumError, match=r"no reference form of Ag above 1234\.93 K"):
        zero(datums["elements-same-T"], species("AgCl"), phase="l", composition=composition, temperature=1300.0)


# -- charge ------------------------------------------------------------------------------------------------------------

#: H(T) - H(0 K) of the electron gas at 298.15 K by Boltzmann statistics, 5/2 R T [kJ/mol].
ELECTRON_GAS = 2.5 * 8.31446261815324 * 298.15 / 1000


def formation(datum: Datum, ion: Species, level: float, **levels: float) -> float:
    """Enthalpy of a gaseous ion on a datum; the elements are 0 at 298.15 K, and electrons cool to 0 K as a gas does."""
    total = level
    for term in zero(datum, ion, phase="g", composition=composition).terms:
        cold = term.species == "electron" and term.zero.temperature == 0
        total -= float(term.coefficient) * (-ELECTRON_GAS if cold else levels.get(term.species, 0.0))
    return total


@pytest.mark.parametrize(
    "formula, boltzmann, stationary",
    [
        # H+: NASA/TP-2002-211556 lists 1536.246 kJ/mol; Lias et al. (1988) 365.7 kcal/mol with the electron at rest
        ("H+", 1536.246, 365.7 * 4.184),
        # Na+: ionisation energy of sodium 495.846 kJ/mol at 0 K (CODATA-type value), Hf(Na, g) 107.5 (CODATA 1989)
        ("Na+", 107.5 + 495.846 + ELECTRON_GAS, 107.5 + 495.846),
    ],
)
def test_stationary_electrons_put_cations_lower(
    datums: dict[str, Datum], formula: str, boltzmann: float, stationary: float
) -> None:
    ion = species(formula)
    assert formation(datums["elements-298K"], ion, boltzmann) == pytest.approx(boltzmann)
    found = formation(datums["elements-298K-electron-stationary"], ion, boltzmann)
    assert found == pytest.approx(boltzmann - ELECTRON_GAS, abs=1e-9)
    assert found == pytest.approx(stationary, abs=0.15)  # the kcal value is printed to 0.1 kcal/mol


def test_stationary_electrons_put_anions_higher(datums: dict[str, Datum]) -> None:
    ion = species("Cl-")
    found = formation(datums["elements-298K-electron-stationary"], ion, -233.958)
    assert found == pytest.approx(-233.958 + 6.197, abs=5e-4)


def test_the_electron_counts_minus_the_charge(datums: dict[str, Datum]) -> None:
    assert coefficients(zero(datums["elements-298K"], species("Na+"), phase="g", composition=composition)) == {
        "sodium": 1,
        "electron": -1,
    }
    assert coefficients(zero(datums["elements-298K"], species("Fe++"), phase="g", composition=composition)) == {
        "iron": 1,
        "electron": -2,
    }
    assert coefficients(zero(datums["elements-298K"], species("e-"), phase="g", composition=composition)) == {
        "electron": 1
    }


def test_aqueous_ions_are_balanced_with_the_proton(datums: dict[str, Datum]) -> None:
    def of(formula: str) -> dict[str, Fraction]:
        return coefficients(zero(datums["elements-298K"], species(formula), phase="aq", composition=composition))

    assert of("Na+") == {"sodium": 1, "proton": 1, "hydrogen": Fraction(-1, 2)}
    assert of("Cl-") == {"chlorine": Fraction(1, 2), "proton": -1, "hydrogen": Fraction(1, 2)}
    assert of("OH-") == {"oxygen": Fraction(1, 2), "hydrogen": 1, "proton": -1}
    assert of("H+") == {"proton": 1}
    assert of("NaCl") == {"sodium": 1, "chlorine": Fraction(1, 2)}


def test_no_aqueous_ion_at_0_K(datums: dict[str, Datum]) -> None:
    with pytest.raises(DatumError, match="no solution at 0 K"):
        zero(datums["elements-0K"], species("Na+"), phase="aq", composition=composition)


# -- other forms -------------------------------------------------------------------------------------------------------


def test_red_phosphorus_and_gaseous_sulfur(datums: dict[str, Datum]) -> None:
    (term,) = zero(datums["elements-298K-red-P"], species("P4"), phase="g", composition=composition).terms
    assert (term.coefficient, term.zero.form) == (4, "red")
    terms = zero(datums["elements-298K-S2gas"], species("H2S"), phase="g", composition=composition).terms
    assert coefficients(Zero(terms)) == {"hydrogen": 1, "disulfur": Fraction(1, 2)}


# -- basis -------------------------------------------------------------------------------------------------------------


def test_combustion_products(datums: dict[str, Datum]) -> None:
    def of(formula: str, name: str = "combustion-gross-25C") -> dict[str, Fraction]:
        return coefficients(zero(datums[name], species(formula), phase="g", composition=composition))

    assert of("CH4") == {"carbon dioxide": 1, "water": 2, "oxygen": -2}
    assert of("H2S") == {"sulfur dioxide": 1, "water": 1, "oxygen": Fraction(-3, 2)}
    assert of("NH3") == {"nitrogen": Fraction(1, 2), "water": Fraction(3, 2), "oxygen": Fraction(-3, 4)}
    assert of("CO2") == {"carbon dioxide": 1}
    assert of("Ar", "combustion-net-60F") == {"argon": 1}


def test_methane_carries_its_calorific_value(datums: dict[str, Datum]) -> None:
    """ISO 6976:2016 lists 890.58 (gross) and 802.56 kJ/mol (net) for methane at 25 °C; formation enthalpies of CODATA
    1989, and of methane -74.6 kJ/mol (NASA/TP-2002-211556)."""
    levels = {("carbon dioxide", "g"): -393.51, ("water", "l"): -285.83, ("water", "g"): -241.826, ("oxygen", "g"): 0.0}
    for name, expected in (("combustion-gross-25C", 890.58), ("combustion-net-25C", 802.56)):
        z = zero(datums[name], species("CH4"), phase="g", composition=composition)
        value = -74.6 - sum(float(t.coefficient) * levels[t.species, t.zero.phase] for t in z.terms)
        assert value == pytest.approx(expected, abs=0.1)


def test_an_element_that_the_basis_lacks_is_named(datums: dict[str, Datum]) -> None:
    with pytest.raises(DatumError, match=r"CHCl3 has no zero on combustion-net-25C: Cl is not among"):
        zero(datums["combustion-net-25C"], species("CHCl3"), phase="g", composition=composition)
    with pytest.raises(DatumError, match="charge is not among"):
        zero(datums["combustion-net-25C"], species("NO+"), phase="g", composition=composition)


def test_a_species_that_the_basis_cannot_make() -> None:
    with pytest.raises(DatumError, match="do not add up"):
        solve({"C": 1}, 0, basis=["carbon dioxide"], composition=composition, what="carbon", datum="x")


@pytest.mark.parametrize(
    "basis, problem",
    [
        (("carbon", "oxygen", "carbon dioxide"), "'carbon dioxide' can be made of carbon, oxygen"),
        (("oxygen", "oxygen"), "'oxygen' is listed twice"),
        (("hydrogen", "proton", "electron"), "'electron' can be made of hydrogen, proton"),
    ],
)
def test_a_dependent_basis_is_refused(basis: tuple[str, ...], problem: str) -> None:
    with pytest.raises(DatumError, match=problem):
        check_independent(basis, composition=composition)


def test_a_basis_with_both_carriers_of_charge() -> None:
    data = {
        "datum": {
            "x": {
                "kind": "basis",
                "sentence": "Water, oxygen and charge.",
                "source": "common-practice",
                "temperature": "25C",
                "basis": [
                    {"species": "water", "phase": "l"},
                    {"species": "oxygen", "phase": "g"},
                    {"species": "electron", "phase": "g"},
                    {"species": "proton", "phase": "aq"},
                ],
            }
        }
    }
    datum = parse_datums(data, where="x.toml", composition=composition)["x"]
    gas = coefficients(zero(datum, species("OH-"), phase="g", composition=composition))
    assert gas == {"water": Fraction(1, 2), "oxygen": Fraction(1, 4), "electron": 1}
    aqueous = coefficients(zero(datum, species("OH-"), phase="aq", composition=composition))
    assert aqueous == {"water": 1, "proton": -1}


# -- own state ---------------------------------------------------------------------------------------------------------


def test_own_state_names_the_species_itself(datums: dict[str, Datum]) -> None:
    z = zero(
        datums["liquid-0C-200kJ"], species("C2H2F4", "1,1,1,2-tetrafluoroethane"), phase="g", composition=composition
    )
    (term,) = z.terms
    assert (term.coefficient, term.species) == (1, "1,1,1,2-tetrafluoroethane")
    assert (term.zero.phase, term.zero.temperature, term.zero.saturated) == ("l", 273.15, "liquid")
    assert (z.h0, z.h0_unit) == (200000.0, "J/kg")


def test_steam_tables_are_of_water_only_and_fix_the_internal_energy(datums: dict[str, Datum]) -> None:
    z = zero(datums["steam-triple-point"], species("H2O", "water"), phase="g", composition=composition)
    assert z.internal_energy
    assert (z.terms[0].zero.phase, z.terms[0].zero.temperature) == ("fluid", 273.16)
    with pytest.raises(DatumError, match="a datum of water only, and says nothing about ethanol"):
        zero(datums["steam-triple-point"], species("C2H6O", "ethanol"), phase="g", composition=composition)


def test_humid_air_gives_each_its_own_state(datums: dict[str, Datum]) -> None:
    datum = datums["humid-air-0F-32F"]
    air = zero(datum, species("N2", "dry air"), phase="g", composition=composition).terms[0].zero
    water = zero(datum, species("H2O", "water"), phase="g", composition=composition).terms[0].zero
    assert (air.phase, air.temperature) == ("g", pytest.approx(459.67 / 1.8, rel=1e-15))
    assert (water.phase, water.temperature) == ("l", 273.15)


def test_an_inline_datum_has_a_zero_too() -> None:
    (term,) = zero(parse_inline("own:cr:graphite@0K"), species("C", "carbon"), phase="g", composition=composition).terms
    assert (term.zero.form, term.zero.temperature, term.zero.species) == ("graphite", 0.0, "carbon")
