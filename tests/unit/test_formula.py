"""Formulas, CAS RN and InChIKey: read, refused with the place, and back."""

from __future__ import annotations

import copy
import pickle
from collections.abc import Mapping
from fractions import Fraction
from types import MappingProxyType

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from propdb.errors import FormulaError, PropdbError
from propdb.model.formula import (
    ELEMENTS,
    Count,
    Formula,
    check_cas,
    hill,
    is_cas,
    is_inchikey,
    molar_mass,
    normal,
    parse_formula,
)


@pytest.mark.parametrize(
    "text, counts, charge",
    [
        ("H2O", {"H": 2, "O": 1}, 0),
        ("Ca(OH)2", {"Ca": 1, "O": 2, "H": 2}, 0),
        ("C2H5OH", {"C": 2, "H": 6, "O": 1}, 0),
        ("CuSO4.5H2O", {"Cu": 1, "S": 1, "O": 9, "H": 10}, 0),
        ("CuSO4·5H2O", {"Cu": 1, "S": 1, "O": 9, "H": 10}, 0),
        ("CuSO4*5H2O", {"Cu": 1, "S": 1, "O": 9, "H": 10}, 0),
        ("KAl(SO4)2.12H2O", {"K": 1, "Al": 1, "S": 2, "O": 20, "H": 24}, 0),
        ("CaSO4.0.5H2O", {"Ca": 1, "S": 1, "O": Fraction(9, 2), "H": 1}, 0),
        ("CaSO4.1/2H2O", {"Ca": 1, "S": 1, "O": Fraction(9, 2), "H": 1}, 0),
        ("CaCl2.8NH3", {"Ca": 1, "Cl": 2, "N": 8, "H": 24}, 0),
        ("3Al2O3·2SiO2", {"Al": 6, "Si": 2, "O": 13}, 0),
        ("[Co(NH3)6]Cl3", {"Co": 1, "N": 6, "H": 18, "Cl": 3}, 0),
        ("Fe0.947O", {"Fe": Fraction(947, 1000), "O": 1}, 0),
        ("UO2.12", {"U": 1, "O": Fraction(53, 25)}, 0),
        ("D2O", {"D": 2, "O": 1}, 0),
        ("HDO", {"D": 1, "H": 1, "O": 1}, 0),
        ("CO", {"C": 1, "O": 1}, 0),
        ("Co", {"Co": 1}, 0),
        ("CO₂", {"C": 1, "O": 2}, 0),
        ("  NaCl ", {"Na": 1, "Cl": 1}, 0),
        ("Na+", {"Na": 1}, 1),
        ("NH4+", {"N": 1, "H": 4}, 1),
        ("OH-", {"O": 1, "H": 1}, -1),
        ("Cl\u2212", {"Cl": 1}, -1),
        ("SO4-2", {"S": 1, "O": 4}, -2),
        ("SO4(2-)", {"S": 1, "O": 4}, -2),
        ("SO4^2-", {"S": 1, "O": 4}, -2),
        ("SO4^-2", {"S": 1, "O": 4}, -2),
        ("SO4--", {"S": 1, "O": 4}, -2),
        ("[SO4]2-", {"S": 1, "O": 4}, -2),
        ("SO₄²⁻", {"S": 1, "O": 4}, -2),
        ("[Fe(CN)6]4-", {"Fe": 1, "C": 6, "N": 6}, -4),
        ("Ca+2", {"Ca": 1}, 2),
        ("Ca²⁺", {"Ca": 1}, 2),
        ("Ca2+", {"Ca": 2}, 1),
        ("Hg2+2", {"Hg": 2}, 2),
        ("H+", {"H": 1}, 1),
        ("Na(+)", {"Na": 1}, 1),
        ("e-", {}, -1),
        ("e^-", {}, -1),
    ],
)
def test_read(text: str, counts: dict[str, Count], charge: int) -> None:
    formula = parse_formula(text)
    assert dict(formula.counts) == counts
    assert formula.charge == charge
    assert all(type(count) is int or count.denominator > 1 for count in formula.counts.values())


@pytest.mark.parametrize(
    "text, says",
    [
        ("Xx2", "'Xx' is not an element at position 1 of formula 'Xx2'"),
        ("NaXyO", "'Xy' is not an element at position 3"),
        ("  NaXyO", "'Xy' is not an element at position 5"),
        ("T2", "tritium is not among the elements here"),
        ("h2o", "'h' is not expected at position 1 of formula 'h2o'; element symbols begin with a capital"),
        ("H2o", "'o' is not expected at position 3"),
        ("water", "'w' is not expected at position 1"),
        ("H2O (l)", "' ' is not expected at position 4"),
        ("CH3-CH3", "'-' is not expected at position 4"),
        ("H2[18O]", "'1' is not expected at position 4 of formula 'H2[18O]'; isotopes are not told apart, except D"),
        ("Ca(OH", "'(' is not closed at position 3"),
        ("CaOH)2", "')' closes nothing at position 5"),
        ("Ca(OH]2", "']' closes nothing at position 6"),
        ("Ca()2", "empty brackets at position 4"),
        ("C0", "a count is zero at position 2"),
        ("C0.0", "a count is zero at position 2"),
        ("C1/0", "a count is zero at position 2"),
        ("C1234567890", "a count is too long at position 2"),
        ("((C999999)999999)999", "the count of C is not positive or too large"),
        ("Na+0", "a charge of zero"),
        ("Na+1234567890", "a charge is too large"),
        (
            "Al2O3.3SiO2",
            "a point may be a decimal point or a dot at position 6 of formula 'Al2O3.3SiO2'; write Al2O3·3SiO2",
        ),
        ("H2SO4.", "an element is missing at position 7"),
        ("", "an element is missing at position 1"),
        ("+", "an element is missing at position 1"),
        ("C" * 401, "too long"),
    ],
)
def test_refused_with_the_place(text: str, says: str) -> None:
    with pytest.raises(FormulaError) as caught:
        parse_formula(text)
    assert says in str(caught.value)
    assert "\n" not in str(caught.value)


def test_what_is_offered_for_an_ambiguous_point_is_taken() -> None:
    assert parse_formula("Al2O3·3SiO2").counts == {"Al": 2, "O": 9, "Si": 3}


@pytest.mark.parametrize(
    "text, key",
    # Hill's order: carbon, hydrogen, then the alphabet; without carbon the alphabet alone
    [
        ("H6C2O", "C2H6O"),
        ("C2H5OH", "C2H6O"),
        ("BrCH3", "CH3Br"),
        ("CDCl3", "CCl3D"),
        ("HCl", "ClH"),
        ("H2SO4", "H2O4S"),
        ("NaOH", "HNaO"),
        ("SO4(2-)", "O4S^2-"),
        ("NH4+", "H4N^+"),
        ("e-", "e^-"),
        ("OFe0.947", "Fe0.947O"),
    ],
)
def test_hill_order(text: str, key: str) -> None:
    assert normal(text) == key
    assert normal(key) == key


def test_charge_is_part_of_the_key_and_not_of_the_plain_formula() -> None:
    assert normal("NO2") != normal("NO2-") != normal("NO2+")
    assert hill(parse_formula("NO2-").counts) == "NO2"
    assert hill({}, 0) == ""


def test_a_formula_is_a_value() -> None:
    formula = parse_formula("CaSO4.1/2H2O")
    assert formula == Formula({"H": 1, "O": Fraction(9, 2), "S": 1, "Ca": 1})
    assert hash(formula) == hash(Formula({"H": 1, "O": Fraction(9, 2), "S": 1, "Ca": 1}))
    assert pickle.loads(pickle.dumps(formula)) == formula == copy.deepcopy(formula)  # noqa: S301
    assert list(parse_formula("OHC").counts) == ["C", "H", "O"]
    with pytest.raises(AttributeError):
        formula.charge = 1  # type: ignore[misc]
    with pytest.raises(TypeError):
        formula.counts["C"] = 1  # type: ignore[index]
    mutable = {"H": 2}
    kept = Formula(mutable)
    mutable["H"] = 3
    assert kept.counts == {"H": 2}


@pytest.mark.parametrize(
    "counts, charge", [({}, 0), ({"Xx": 1}, 0), ({"H": 0}, 0), ({"H": -1}, 0), ({"H": 10**9}, 0), ({"h": 1}, 0)]
)
def test_a_formula_that_is_none_cannot_be_made(counts: Mapping[str, Count], charge: int) -> None:
    with pytest.raises(FormulaError):
        Formula(counts, charge)


def test_the_periodic_table() -> None:
    """118 elements (IUPAC), and deuterium."""
    assert len(ELEMENTS) == len(set(ELEMENTS)) == 119
    places = {1: "H", 6: "C", 26: "Fe", 54: "Xe", 57: "La", 71: "Lu", 80: "Hg", 92: "U", 103: "Lr", 118: "Og"}
    assert {number: ELEMENTS[number - 1] for number in places} == places


# Standard atomic weights, abridged to five digits: Prohaska et al., Pure Appl. Chem. 94 (2022) 573
WEIGHTS = {"H": 1.0080, "O": 15.999, "C": 12.011, "Fe": 55.845, "Ca": 40.078, "S": 32.06}


def test_molar_mass() -> None:
    assert molar_mass({"H": 2, "O": 1}, WEIGHTS) == pytest.approx(0.018015, rel=1e-12)
    assert molar_mass(parse_formula("Fe0.947O").counts, WEIGHTS) == pytest.approx(0.068884215, rel=1e-12)
    assert molar_mass({}, WEIGHTS) == 0.0
    with pytest.raises(FormulaError, match="no atomic weight for Na, Cl"):
        molar_mass({"Na": 1, "Cl": 1}, WEIGHTS)


CAS = ["7732-18-5", "74-82-8", "64-17-5", "7440-44-0", "71-43-2", "50-00-0", "124-38-9", "630-08-0", "7782-42-5"]


@pytest.mark.parametrize("cas", CAS)
def test_cas_numbers_in_use(cas: str) -> None:
    assert is_cas(cas)
    assert check_cas(f" {cas} ") == cas


@pytest.mark.parametrize("cas", CAS)
def test_a_wrong_check_digit_is_named_with_the_right_one(cas: str) -> None:
    for wrong in range(10):
        if wrong == int(cas[-1]):
            continue
        with pytest.raises(FormulaError, match=f"check digit {wrong}, and its other digits give {cas[-1]}") as caught:
            check_cas(f"{cas[:-1]}{wrong}")
        assert cas in str(caught.value)


@pytest.mark.parametrize(
    "text", ["", "water", "7732-18", "7732185", "7732-18-55", "1-18-5", "12345678-18-5", "7732–18–5"]
)
def test_not_written_like_a_cas_number(text: str) -> None:
    assert not is_cas(text)
    with pytest.raises(FormulaError, match="is not a CAS RN"):
        check_cas(text)


def test_inchikeys() -> None:
    assert is_inchikey("XLYOFNOQVPJJNP-UHFFFAOYSA-N")
    for text in (
        "",
        "XLYOFNOQVPJJNP-UHFFFAOYSA",
        "xlyofnoqvpjjnp-uhfffaoysa-n",
        "XLYOFNOQVPJJNP-UHFFFAOYXA-N",
        "7732-18-5",
    ):
        assert not is_inchikey(text)


counts_of = st.one_of(
    st.integers(1, 999_999_999),
    st.fractions(Fraction(1, 1000), 1000, max_denominator=10_000),
    st.integers(1, 999_999).map(lambda n: Fraction(n, 10_000)),
)
compositions = st.dictionaries(st.sampled_from(ELEMENTS), counts_of, max_size=7)


@given(counts=compositions, charge=st.integers(-9, 9))
def test_written_and_read_back(counts: dict[str, Count], charge: int) -> None:
    if not counts and charge in (0, *range(1, 10), *range(-9, -1)):
        return
    formula = Formula(counts, charge)
    assert parse_formula(str(formula)) == formula
    assert normal(str(formula)) == str(formula)


@given(pairs=st.lists(st.tuples(st.sampled_from(ELEMENTS), st.integers(1, 20)), min_size=1), data=st.data())
def test_the_order_of_atoms_does_not_matter(pairs: list[tuple[str, int]], data: st.DataObject) -> None:
    shuffled = data.draw(st.permutations(pairs))
    first, second = ("".join(f"{element}{count}" for element, count in order) for order in (pairs, shuffled))
    assert normal(first) == normal(second)


@st.composite
def nested(draw: st.DrawFn, depth: int = 4) -> tuple[str, dict[str, int]]:
    """A formula with brackets, and the atoms it has, counted while it is written."""
    if depth == 0 or draw(st.booleans()):
        element, count = draw(st.sampled_from(ELEMENTS)), draw(st.integers(1, 12))
        return f"{element}{count if count > 1 else ''}", {element: count}
    parts = draw(st.lists(nested(depth - 1), min_size=1, max_size=2))
    times = draw(st.integers(1, 4))
    total: dict[str, int] = {}
    for _, atoms in parts:
        for element, count in atoms.items():
            total[element] = total.get(element, 0) + count * times
    opening, closing = draw(st.sampled_from(["()", "[]"]))
    return f"{opening}{''.join(text for text, _ in parts)}{closing}{times if times > 1 else ''}", total


@given(drawn=nested())
def test_brackets_multiply(drawn: tuple[str, dict[str, int]]) -> None:
    text, atoms = drawn
    assert parse_formula(text).counts == MappingProxyType(atoms)


PIECES = st.sampled_from(
    [*ELEMENTS[:20], *"()[]{}.·*^+-−/0123456789₂²⁺⁻½ eTxh\n", "H2O", ".5H2O", "(2-)", "1/0", "999999999"]
)


@settings(max_examples=1000)
@given(text=st.text() | st.lists(PIECES, max_size=14).map("".join))
@example(text="(" * 400)
@example(text="(" * 100 + "H" + ")999999999" * 29)
@example(text="٣H")
@example(text="H٣")
@example(text="H²")
def test_no_text_escapes_the_tree_of_errors(text: str) -> None:
    try:
        formula = parse_formula(text)
    except PropdbError as error:
        one_clear_line(error)
    else:
        assert parse_formula(hill(formula.counts, formula.charge)) == formula
        assert molar_mass(formula.counts, dict.fromkeys(ELEMENTS, 1.0)) >= 0
    is_cas(text)
    is_inchikey(text)
    try:
        check_cas(text)
    except PropdbError as error:
        one_clear_line(error)


def one_clear_line(error: PropdbError) -> None:
    assert type(error) is FormulaError
    assert str(error).isprintable()
