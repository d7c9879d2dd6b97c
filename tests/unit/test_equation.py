"""Reaction equations as text: terms, phases, arrows, and what is refused where."""

from __future__ import annotations

import pickle
from fractions import Fraction

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from propdb.errors import FormulaError, PropdbError
from propdb.model.equation import ReactionEquation, ReactionTerm, imbalance, parse_equation
from propdb.model.formula import parse_formula
from propdb.model.records import PHASES


def term(coefficient: str, name: str, phase: str = "", form: str = "") -> ReactionTerm:
    return ReactionTerm(Fraction(coefficient), name, phase, form)


def test_combustion_of_methane() -> None:
    equation = parse_equation("CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)")
    assert equation.reactants == (term("1", "CH4", "g"), term("2", "O2", "g"))
    assert equation.products == (term("1", "CO2", "g"), term("2", "H2O", "l"))
    assert [number for number, _ in equation.signed] == [-1, -2, 1, 2]
    assert [t.position for _, t in equation.signed] == [1, 10, 21, 30]
    assert str(equation) == "CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)"
    assert pickle.loads(pickle.dumps(equation)) == equation  # noqa: S301
    assert hash(equation) == hash(parse_equation(str(equation)))


@pytest.mark.parametrize("arrow", [" -> ", " => ", " = ", " → ", "->", "=>", "=", "→"])
def test_arrows(arrow: str) -> None:
    assert parse_equation(f"2 H2{arrow}X") == ReactionEquation((term("2", "H2"),), (term("1", "X"),))


@pytest.mark.parametrize(
    "text, expected",
    [
        ("carbon dioxide(g)", term("1", "carbon dioxide", "g")),
        ("2 carbon dioxide (g)", term("2", "carbon dioxide", "g")),
        ("C(cr,graphite)", term("1", "C", "cr", "graphite")),
        ("C (cr, graphite)", term("1", "C", "cr", "graphite")),
        ("SiO2(s,quartz)", term("1", "SiO2", "cr", "quartz")),
        ("NaCl(s)", term("1", "NaCl", "cr")),
        ("Na+(aq)", term("1", "Na+", "aq")),
        ("Cl-(aq)", term("1", "Cl-", "aq")),
        ("SO4-2(aq)", term("1", "SO4-2", "aq")),
        ("SO4(2-)(aq)", term("1", "SO4(2-)", "aq")),
        ("SO4(2-)", term("1", "SO4(2-)")),
        ("e-", term("1", "e-")),
        ("Ca(OH)2(cr)", term("1", "Ca(OH)2", "cr")),
        ("Fe(OH)", term("1", "Fe(OH)")),
        ("iron(III) oxide(cr)", term("1", "iron(III) oxide", "cr")),
        ("vanadium(V)", term("1", "vanadium(V)")),
        ("D-(+)-glucose(cr)", term("1", "D-(+)-glucose", "cr")),
        ("1/2 O2", term("1/2", "O2")),
        ("1 / 2 O2", term("1/2", "O2")),
        ("½O2", term("1/2", "O2")),
        ("0.5 O2", term("1/2", "O2")),
        (".5O2", term("1/2", "O2")),
        ("12.5O2(g)", term("25/2", "O2", "g")),
        ("2H2O(l)", term("2", "H2O", "l")),
        ("2(CH3)2O", term("2", "(CH3)2O")),
        ("2-butanol(l)", term("1", "2-butanol", "l")),
        ("2 2-butanol(l)", term("2", "2-butanol", "l")),
        ("1,3-butadiene", term("1", "1,3-butadiene")),
        ("7732-18-5(l)", term("1", "7732-18-5", "l")),
        ("3 7732-18-5(l)", term("3", "7732-18-5", "l")),
        ("H2O(fluid)", term("1", "H2O", "fluid")),
    ],
)
def test_terms(text: str, expected: ReactionTerm) -> None:
    equation = parse_equation(f"{text} + H+ -> {text}")
    assert equation.reactants == (expected, term("1", "H+"))
    assert equation.products == (expected,)
    assert parse_equation(str(equation)) == equation


def test_a_charge_is_not_a_plus_between_terms() -> None:
    equation = parse_equation("Ag+ + Fe+2 -> Ag + Fe+3")
    assert [t.name for _, t in equation.signed] == ["Ag+", "Fe+2", "Ag", "Fe+3"]
    assert [t.name for _, t in parse_equation("Na+->Na+ + e-").signed] == ["Na+", "Na+", "e-"]


@pytest.mark.parametrize(
    "text, says",
    [
        ("", "'' has no arrow"),
        ("CH4 + 2 O2", "has no arrow; write -> as in"),
        ("A ⇌ B", "has no arrow"),
        ("A -> B -> C", "a second arrow at position 8"),
        ("A --> B", "'-->' is not an arrow at position 3"),
        ("Cl--> Cl-", "'-->' is not an arrow at position 3 of equation 'Cl--> Cl-'; write -> with blanks around it"),
        ("A <=> B", "'<=>' is not an arrow at position 3"),
        ("-> B", "one side is empty at position 1"),
        ("A ->", "one side is empty at position 5"),
        ("A + -> B", "a term is missing at position 5"),
        ("A + + B -> C", "a term is missing at position 5"),
        ("+ A -> C", "a term is missing at position 1"),
        ("H2+O2 -> H2O", "a plus without blanks at position 3"),
        ("H2 +O2 -> H2O", "a plus without blanks at position 4"),
        ("H2(g)+ 2 O2 -> H2O", "a plus without blanks at position 6"),
        ("0 H2 -> H2", "a coefficient is zero at position 1"),
        ("H2 -> 1/0 H2", "a coefficient is zero at position 7"),
        ("-2 H2 -> H2", "a coefficient is negative at position 1"),
        ("1234567890123 O2 -> O", "a coefficient is too long"),
        ("2 -> H2", "a species is missing at position 1"),
        ("(g) -> H2", "a species is missing at position 1"),
        ("2 (g) -> H2", "a species is missing at position 1"),
        (
            "C(graphite) -> C",
            "'graphite' is not a phase at position 2 of equation 'C(graphite) -> C'; did you mean C(cr,graphite)?",
        ),
        ("2 C(graphite) -> C", "did you mean C(cr,graphite)?"),
        ("H2O(gas) -> X", "'gas' is not a phase at position 4 of equation 'H2O(gas) -> X'; did you mean (g)?"),
        ("H2O(G) -> X", "did you mean (g)?"),
        ("water(liq) -> X", "did you mean (l)?"),
        ("C(cr,) -> C", "a form is missing at position 2"),
        ("O2(g,x) -> O2", "'g' has no forms at position 3"),
        ("O2(x,y) -> O2", "'x' is not a phase at position 3"),
        ("A" * 2001, "too long"),
    ],
)
def test_refused_with_the_place(text: str, says: str) -> None:
    with pytest.raises(FormulaError) as caught:
        parse_equation(text)
    assert says in str(caught.value)
    assert "\n" not in str(caught.value)


def excess(text: str) -> dict[str, Fraction]:
    formulas = [(number, parse_formula(t.name)) for number, t in parse_equation(text).signed]
    return imbalance((number, formula.counts, formula.charge) for number, formula in formulas)


@pytest.mark.parametrize(
    "text",
    [
        "CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)",
        "H2 + 1/2 O2 = H2O",
        "MnO4- + 5 Fe+2 + 8 H+ -> Mn+2 + 5 Fe+3 + 4 H2O",
        "Na -> Na+ + e-",
        "CuSO4.5H2O -> CuSO4 + 5 H2O",
        "0.947 Fe + 0.5 O2 -> Fe0.947O",
        "D2 + 0.5 O2 -> D2O",
    ],
)
def test_balanced(text: str) -> None:
    assert excess(text) == {}


def test_what_does_not_balance_is_named_with_its_sign() -> None:
    assert excess("CH4 + O2 -> CO2 + 2 H2O") == {"O": 2}
    assert excess("CO2 + 2 H2O -> CH4 + O2") == {"O": -2}
    assert excess("H2 + O2 -> H2O") == {"O": -1}
    assert excess("H2 + 0.25 O2 -> H2O") == {"O": Fraction(1, 2)}
    assert excess("Fe+2 -> Fe+3") == {"charge": 1}
    assert excess("D2 -> H2") == {"D": -2, "H": 2}
    assert imbalance([]) == {}


names = st.sampled_from(["H2O", "carbon dioxide", "2-butanol", "Na+", "SO4-2", "Ca(OH)2", "iron(III) oxide", "50-00-0"])
terms = st.builds(
    ReactionTerm,
    coefficient=st.fractions(Fraction(1, 999), 999, max_denominator=999),
    name=names,
    phase=st.sampled_from(["", *PHASES]),
) | st.builds(
    ReactionTerm,
    coefficient=st.just(Fraction(1)),
    name=names,
    phase=st.just("cr"),
    form=st.sampled_from(["graphite", "quartz"]),
)
sides = st.lists(terms, min_size=1, max_size=4).map(tuple)


@given(reactants=sides, products=sides)
def test_written_and_read_back(reactants: tuple[ReactionTerm, ...], products: tuple[ReactionTerm, ...]) -> None:
    equation = ReactionEquation(reactants, products)
    assert parse_equation(str(equation)) == equation
    for _, each in parse_equation(str(equation)).signed:
        assert str(equation)[each.position - 1 :].startswith(str(each))


MARKS = (
    " + ",
    " -> ",
    "=",
    "->",
    "+",
    "-",
    " ",
    "(",
    ")",
    "(g)",
    "(cr,graphite)",
    "(aq)",
    "(,)",
    ",",
    "/",
    ".",
    "\n",
    "→",
)
WORDS = ("H2O", "Na+", "Cl-", "2", "1/2", "½", "0", "0.5", "e-", "carbon dioxide", "999999999999", "٣", "²", "g")
PIECES = st.sampled_from([*MARKS, *WORDS])


@settings(max_examples=1000)
@given(text=st.text() | st.lists(PIECES, max_size=14).map("".join))
@example(text="A + \u3000 -> B")
@example(text="=")
@example(text="(cr,=)")
@example(text="0.000000000000 H -> H")
def test_no_text_escapes_the_tree_of_errors(text: str) -> None:
    try:
        equation = parse_equation(text)
    except PropdbError as error:
        one_clear_line(error, text)
    else:
        assert all(number and t.name.strip() for number, t in equation.signed)


def one_clear_line(error: PropdbError, text: str) -> None:
    assert type(error) is FormulaError
    assert str(error).isprintable()
    assert 1 <= error.fields.get("position", 1) <= len(text) + 1
