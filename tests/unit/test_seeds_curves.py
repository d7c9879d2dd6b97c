"""Heat-capacity fits and polynomial records of a seed: units, unions, checksums, and what is refused."""

from __future__ import annotations

from pathlib import Path

import pytest
from seed_samples import HEADERS, Seed

from propdb.cp.registry import build_heat_capacity
from propdb.intake.seeds import load_seed
from propdb.model.records import R_GAS, Entry


@pytest.fixture
def seed(tmp_path: Path) -> Seed:
    return Seed(tmp_path)


#: Smith, Van Ness, Abbott, Introduction to Chemical Engineering Thermodynamics, 7th ed. (2005), appendix C: water
#: vapour, Cp/R = 3.470 + 1.450e-3 T + 0.121e5 T^-2.
FIT = "water,g,,polynomial,298.15,2000,R,0 1 -2,1 1e-3 1e5,3.470 1.450 0.121,,,,water,"


def fit(**cells: str) -> str:
    values = FIT.split(",")
    for column, value in cells.items():
        values[HEADERS["curves.csv"].split(",").index(column)] = value
    return ",".join(values)


def only(seed: Seed) -> Entry:
    (entry,) = load_seed(seed.root).entries
    return entry


def test_a_fit_in_R(seed: Seed) -> None:
    seed.rows("curves.csv", fit(uncertainty="1.5", uncertainty_kind="standard"))
    entry = only(seed)
    curve = build_heat_capacity(entry.equation, entry.params)
    assert float(curve.cp(500.0)) == pytest.approx(R_GAS * (3.470 + 1.450e-3 * 500 + 0.121e5 / 500**2), rel=1e-14)
    assert (entry.quantity, entry.unit, entry.tmin, entry.tmax) == ("Cp", "J/mol/K", 298.15, 2000.0)
    assert (entry.carried, entry.carried_unit) == ("3.470 1.450 0.121", "R")
    assert (entry.uncertainty, entry.uncertainty_unit, entry.uncertainty_kind) == (0.015, "%", "standard")


def test_a_fit_per_mass(seed: Seed) -> None:
    seed.rows("curves.csv", fit(equation="constant", unit="kJ/kg/K", exponents="", scales="", coefficients="4.18"))
    entry = only(seed)
    assert entry.params["value"] == pytest.approx(4180 * 0.018015)


def test_rows_that_touch_are_one_union_and_others_stay_apart(seed: Seed) -> None:
    seed.rows(
        "curves.csv",
        fit(tmin="1000", tmax="2000", coefficients="3.6 1.4 0.1", note="upper"),
        fit(tmin="300", tmax="1000"),
        fit(tmin="2500", tmax="3000", coefficients="5.0 0.9 0.1"),
    )
    union, apart = load_seed(seed.root).entries
    assert (union.equation, union.tmin, union.tmax, union.note) == ("union", 300.0, 2000.0, "upper")
    assert [piece["tmin"] for piece in union.params["pieces"]] == [300.0, 1000.0]
    assert union.carried == "3.470 1.450 0.121 | 3.6 1.4 0.1"
    assert [carrier.row for carrier in union.carriers] == [3, 2]
    assert (apart.equation, apart.tmin) == ("polynomial", 2500.0)


def test_conditions_keep_rows_apart(seed: Seed) -> None:
    seed.rows("curves.csv", fit(phase="l", conditions="1 bar"), fit(phase="l", conditions="saturated"))
    assert [e.conditions for e in load_seed(seed.root).entries] == ["1 bar", "saturated"]


def test_shomate(seed: Seed) -> None:
    cells = {"equation": "shomate", "unit": "J/mol/K", "exponents": "", "scales": ""}
    seed.rows(
        "curves.csv",
        fit(**cells, tmin="500", tmax="1700", coefficients="30.092 6.832514 6.793435 -2.534480 0.082139"),
        fit(**cells, tmin="1700", tmax="6000", coefficients="41.96426 8.622053 -1.499780 0.098119 -11.15764"),
    )
    entry = only(seed)
    assert entry.equation == "shomate"
    assert len(entry.params["intervals"]) == 2


def test_the_formulation_of_water_has_no_coefficients(seed: Seed) -> None:
    row = "water,fluid,,iapws95,273.16,1273,J/mol/K,,,,0.1,class,up to 1000 MPa,IAPWS-95,"
    seed.rows("curves.csv", row)
    entry = only(seed)
    assert (entry.equation, entry.phase, dict(entry.params), entry.uncertainty) == ("iapws95", "fluid", {}, 0.001)
    seed.rows("curves.csv", row.replace("K,,,,0.1", "K,,,1.0,0.1"))
    seed.refuse("coefficients of a formulation", "book-1990/curves.csv, row 2, column coefficients")


@pytest.mark.parametrize(
    "cells, problem, column",
    [
        ({"species": "watre"}, "unknown species 'watre'", "species"),
        ({"phase": "gas"}, "unknown phase 'gas'", "phase"),
        ({"form": "x"}, "form 'x' of phase g", "form"),
        ({"equation": "polynom"}, "did you mean 'polynomial'", "equation"),
        ({"tmin": "2100"}, "tmin 2100 K is not below tmax 2000 K", "tmin"),
        ({"tmin": ""}, "tmin is blank", "tmin"),
        ({"tmax": '"2000,5"'}, "has a comma", "tmax"),
        ({"tmin": "-1"}, "is negative", "tmin"),
        ({"unit": "J/mol"}, "not a heat capacity", "unit"),
        ({"unit": "cal/mol/K"}, "cal has two meanings", "unit"),
        ({"coefficients": "3.470 1.450"}, "2 coefficients, 3 exponents, 3 scales", "coefficients"),
        ({"coefficients": "3.470 1.450 x"}, "'x' is not a number", "coefficients"),
        ({"coefficients": ""}, "coefficients is blank", "coefficients"),
        ({"exponents": "0 1 0.5"}, "not an integer", "exponents"),
        ({"exponents": "0 1 1"}, "exponents must be different", "coefficients"),
        ({"coefficients": "-3.470 1.450 0.121"}, "the heat capacity is", "coefficients"),
        ({"scales": "1 1e3 1e5"}, "the heat capacity is", "coefficients"),
        ({"equation": "shomate"}, "exponents with equation shomate", "exponents"),
        ({"equation": "shomate", "exponents": "", "scales": ""}, "shomate with 3 numbers in R", "unit"),
        ({"equation": "constant", "exponents": "", "scales": ""}, "3 numbers for a constant", "coefficients"),
        ({"uncertainty": "1"}, "an uncertainty without its kind", "uncertainty_kind"),
        ({"locator": ""}, "locator is blank", "locator"),
    ],
)
def test_a_bad_fit(seed: Seed, cells: dict[str, str], problem: str, column: str) -> None:
    seed.rows("curves.csv", fit(**cells))
    seed.refuse(problem, f"book-1990/curves.csv, row 2, column {column}")


def test_overlaps_and_unlike_uncertainties(seed: Seed) -> None:
    seed.rows("curves.csv", fit(tmax="1000"), fit(tmin="900"))
    seed.refuse(
        "begins at 900 K, inside that of row 2 which ends at 1000 K", "book-1990/curves.csv, row 3, column tmin"
    )
    seed.rows("curves.csv", fit(tmax="900"), fit(tmin="900", uncertainty="1", uncertainty_kind="standard"))
    seed.refuse("uncertainty differs from that of row 2", "book-1990/curves.csv, row 3, column uncertainty")


# -- polynomial records ------------------------------------------------------------------------------------------------

#: H2O, NASA/TP-2002-211556: 200 to 1000 K and 1000 to 6000 K.
H2O = (
    (
        "water,g,,200.000,1000.000,-3.947960830E+04,5.755731020E+02,9.317826530E-01,7.222712860E-03,-7.342557370E-06,"
        "4.955043490E-09,-1.336933246E-12,-3.303974310E+04,1.724205775E+01,-241826.000,9904.092,H2O,"
    ),
    (
        "water,g,,1000.000,6000.000,1.034972096E+06,-2.412698562E+03,4.646110780E+00,2.291998307E-03,-6.836830480E-07,"
        "9.426468930E-11,-4.822380530E-15,-1.384286509E+04,-7.978148510E+00,-241826.000,9904.092,H2O,"
    ),
)


def test_a_sound_record(seed: Seed) -> None:
    seed.rows("nasa9.csv", *reversed(H2O))
    curve, hf, increment = load_seed(seed.root).entries
    assert (curve.quantity, curve.equation, curve.status, curve.note) == ("Cp", "nasa9", "base", "")
    assert (curve.tmin, curve.tmax) == (200.0, 6000.0)
    assert curve.carried.startswith("-3.947960830E+04 5.755731020E+02")
    assert [carrier.row for carrier in curve.carriers] == [3, 2]
    assert (hf.quantity, hf.value, hf.carried, hf.datum) == ("Hf", -241826.0, "-241826.000", "elements-298K")
    assert (hf.temperature, hf.equation, hf.unit, dict(hf.params)) == (298.15, "", "J/mol", {})
    assert (increment.quantity, increment.value, increment.datum) == ("dH0", 9904.092, "")
    # Chase, NIST-JANAF Thermochemical Tables, 4th ed. (1998): Cp of H2O(g) at 1000 K is 41.268 J/mol/K
    assert float(build_heat_capacity("nasa9", curve.params).cp(1000.0)) == pytest.approx(41.268, rel=2e-3)


@pytest.mark.parametrize(
    "old, new, quarantined, words",
    [
        # a slip in the level of both intervals: the joint still closes, h(298.15 K) does not
        ("-241826.000", "-242826.000", ["Cp", "Hf", "dH0"], "h(298.15 K) is +1000.0 J/mol off"),
        ("-1.384286509E+04", "-1.384386509E+04", ["Cp"], "intervals do not meet: h by"),
        ("-7.978148510E+00", "-7.978188510E+00", ["Cp"], "intervals do not meet: s by"),
        ("4.646110780E+00", "4.646210780E+00", ["Cp"], "intervals do not meet: cp by"),
    ],
)
def test_a_digit_slip_quarantines(seed: Seed, old: str, new: str, quarantined: list[str], words: str) -> None:
    assert any(old in row for row in H2O)
    seed.rows("nasa9.csv", *(row.replace(old, new) for row in H2O))
    entries = load_seed(seed.root).entries
    assert [e.quantity for e in entries if e.status == "quarantined"] == quarantined
    assert words in entries[0].note


def test_an_element_in_its_reference_form_has_no_formation_entry(seed: Seed) -> None:
    """A level of zero at 298.15 K is kept out of the entries only where the datum says that it is a definition."""
    row = "hydrogen,g,,200,1000,0,0,3.5,0,0,0,0,{b1},0,0.000,,H2,"
    seed.rows("nasa9.csv", row.format(b1=-3.5 * 298.15))
    assert [e.quantity for e in load_seed(seed.root).entries] == ["Cp"]
    seed.rows("nasa9.csv", row.format(b1=-3.5 * 298.15).replace("hydrogen", "water"))
    assert [e.quantity for e in load_seed(seed.root).entries] == ["Cp", "Hf"]


def test_seven_coefficients(seed: Seed) -> None:
    b = 3.5 * 298.15
    seed.rows(
        "nasa7.csv",
        f"oxygen,g,,200,1000,3.5,0,0,0,0,{-b},1.0,0,8.683E+03,O2,",
        f"oxygen,g,,1000,6000,3.5,0,0,0,0,{-b},1.0,0,8.683E+03,O2,",
    )
    curve, increment = load_seed(seed.root).entries
    assert (curve.equation, curve.status, increment.value) == ("nasa7", "base", 8683.0)
    assert [len(i["a"]) for i in curve.params["intervals"]] == [5, 5]


@pytest.mark.parametrize(
    "change, problem, where",
    [
        (
            lambda a, b: (a, b.replace("1000.000,6000", "1100.000,6000")),
            "a gap between 1000.0 and 1100.0 K",
            "row 2, column tmin",
        ),
        (lambda a, b: (a, b.replace("1000.000,6000", "900.000,6000")), "an overlap between", "row 2, column tmin"),
        (
            lambda a, b: (a, b.replace("-241826.000", "-241827.000")),
            "hf298 differs from that of row 2",
            "row 3, column hf298",
        ),
        (lambda a, b: (a, b.replace("1.034972096E+06", "")), "a1 is blank", "row 3, column a1"),
        (lambda a, b: (a, b.replace("1.034972096E+06", "1.O34")), "'1.O34' is not a number", "row 3, column a1"),
        (
            lambda a, b: (a.replace("9904.092", "-9904.092"), b.replace("9904.092", "-9904.092")),
            "not positive",
            "row 2, column dh0",
        ),
        (
            lambda a, b: (a.replace("200.000,1000.000", "1000.000,200.000"), b),
            "is not below tmax",
            "row 2, column tmin",
        ),
    ],
)
def test_a_bad_record(seed: Seed, change, problem: str, where: str) -> None:  # type: ignore[no-untyped-def]
    seed.rows("nasa9.csv", *change(*H2O))
    seed.refuse(problem, f"book-1990/nasa9.csv, {where}")
