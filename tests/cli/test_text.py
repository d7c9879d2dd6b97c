"""Small writers: columns, equations, citations, JSON, plain characters."""

from __future__ import annotations

import json
from dataclasses import replace
from fractions import Fraction
from types import MappingProxyType

import pytest

import propdb
from propdb.cli.equationtext import equation_lines
from propdb.cli.jsontext import dumps
from propdb.cli.plain import like
from propdb.errors import InvalidInput
from propdb.model.cite import bibtex, cite, csl, text
from propdb.model.records import Closure, MaySum, Source
from propdb.model.text import columns, kelvin, pairs


def test_columns_align_and_drop_what_is_empty() -> None:
    lines = columns([("name", "nothing", "n"), ("a", "", "1"), ("long name", "", "22")], right=(2,), indent=1)
    assert lines == [" name        n", " a           1", " long name  22"]
    assert columns([]) == []


def test_pairs_wrap_under_their_name() -> None:
    lines = pairs([("one", "x " * 20), ("empty", ""), ("three", "y\nz")], indent=2, width=30)
    assert lines[0].startswith("  one    x x")
    assert all(len(line) <= 30 for line in lines)
    assert lines[-2:] == ["  three  y", "         z"]
    assert lines[1].startswith("         x")
    assert pairs([]) == []


def test_kelvin() -> None:
    assert [kelvin(t) for t in (298.15, 1000.0, 373.124, 0.0)] == ["298.15", "1000", "373.124", "0"]


def test_a_polynomial_is_written_as_a_sum() -> None:
    params = {"exponents": [0, 1, -2], "coefficients": [28.5, -0.012, 1e5], "tmin": 298.0, "tmax": 2000.0}
    assert equation_lines("polynomial", params) == ["cp = 28.5 - 0.012 T + 100000 T^-2   [J/mol/K]"]


def test_every_coefficient_of_a_record_is_written() -> None:
    low = {"tmin": 200.0, "tmax": 1000.0, "a": [1.5, 2.5, 3.5, 4.5, 5.5, 6.5, 7.5], "b": [8.5, 9.5]}
    high = {"tmin": 1000.0, "tmax": 6000.0, "a": [11.5, 12.5, 13.5, 14.5, 15.5, 16.5, 17.5], "b": [18.5, 19.5]}
    lines = equation_lines("nasa9", {"intervals": [low, high]})
    assert lines[1].split() == "200 to 1000 K 1000 to 6000 K".split()
    for number, line in enumerate(lines[2:]):
        assert line.split()[1:] == [f"{number + 1}.5", f"{number + 11}.5"]
    assert [line.split()[0] for line in lines[2:]] == "a1 a2 a3 a4 a5 a6 a7 b1 b2".split()


def test_a_table_is_shortened_unless_asked_for() -> None:
    params = {"T": [100.0 + 10 * i for i in range(20)], "cp": [30.0 + i for i in range(20)]}
    params |= {"transitions": [{"T": 150.0, "dh": 1234.5}]}  # type: ignore[dict-item]
    short, full = (equation_lines("table", params, full=full) for full in (False, True))
    assert "20 points" in short[0]
    assert "..." in short[1]
    assert len(full) == 1 + 1 + 20 + 1
    assert short[-1] == full[-1] == "transition at 150 K: 1234.5 J/mol"


def test_pieces_keep_their_ranges() -> None:
    pieces = [
        {"equation": "polynomial", "exponents": [0], "coefficients": [30.0], "tmin": 200.0, "tmax": 400.0},
        {"equation": "constant", "value": 33.0, "tmin": 400.0, "tmax": 500.0},
    ]
    assert equation_lines("union", {"pieces": pieces}) == [
        "200 to 400 K: cp = 30   [J/mol/K]",
        "400 to 500 K: cp = 33 J/mol/K",
    ]


ARTICLE = Source(
    "made-up-2001",
    "Heats & tables: 100% of C_p",
    ("Doe, J.", "Institute of Nothing"),
    2001,
    "article",
    "evaluated",
    "invented for this test",
    MappingProxyType(
        {"journal": "J. Nowhere", "volume": "7", "issue": "2", "pages": "10-19", "doi": "10.0000/a_b", "isbn": ""}
    ),
)


def test_citation_as_text() -> None:
    assert text(ARTICLE) == (
        "Doe, J.; Institute of Nothing (2001). Heats & tables: 100% of C_p. J. Nowhere 7(2), 10-19. doi:10.0000/a_b."
    )


def test_citation_as_bibtex() -> None:
    assert bibtex(ARTICLE).splitlines() == [
        "@article{made-up-2001,",
        "  author = {Doe, J. and {Institute of Nothing}},",
        r"  title = {{Heats \& tables: 100\% of C\_p}},",
        "  year = {2001},",
        "  journal = {J. Nowhere},",
        "  volume = {7},",
        "  number = {2},",
        "  pages = {10--19},",
        "  doi = {10.0000/a_b},",
        "}",
    ]


def test_citation_as_csl() -> None:
    assert csl(ARTICLE) == {
        "id": "made-up-2001",
        "type": "article-journal",
        "title": "Heats & tables: 100% of C_p",
        "author": [{"family": "Doe", "given": "J."}, {"literal": "Institute of Nothing"}],
        "issued": {"date-parts": [[2001]]},
        "container-title": "J. Nowhere",
        "volume": "7",
        "issue": "2",
        "page": "10-19",
        "DOI": "10.0000/a_b",
    }
    assert json.loads(cite(ARTICLE, "csl-json")) == [csl(ARTICLE)]


def test_citation_in_another_format() -> None:
    with pytest.raises(InvalidInput, match="bibtex"):
        cite(ARTICLE, "ris")


def test_json_has_finite_numbers_or_null() -> None:
    data = {
        "a": float("nan"),
        "b": [float("inf"), 1.5, -0.0],
        "c": Fraction(1, 2),
        "d": MaySum(streams=True, reaction=False, why="°"),
        "e": MappingProxyType({"f": None}),
    }
    assert json.loads(dumps(data)) == {
        "a": None,
        "b": [None, 1.5, 0.0],
        "c": "1/2",
        "d": {"streams": True, "reaction": False, "why": "°"},
        "e": {"f": None},
    }


@pytest.mark.parametrize(
    "character, plain", [("−", "-"), ("±", "+/-"), ("é", "e"), ("²", "2"), ("→", "->"), ("漢", "?")]
)
def test_characters_that_a_terminal_lacks(character: str, plain: str) -> None:
    assert like(character) == plain


def test_closures_are_few_and_say_what_is_left_out() -> None:
    """Ten lines at most, the largest first; what one source says twice is one line; the others are counted."""
    with propdb.open() as store:
        answer = store.enthalpy("nitrogen", phase="g", temperature="600C", datum="gas-25C")
    many = [Closure(f"path {n}", 0.1 * n, None, f"{n:08d}aa", "book-2001") for n in range(1, 15)]
    many += [Closure("path 14", 1.4, None, "99999999aa", "book-2001"), Closure("path 0", 1e-5, None, "", "book-2001")]
    text = replace(answer, closures=tuple(many)).explain()
    lines = [line.strip() for line in text[text.index("Closures") :].split("\n\n")[0].splitlines()[1:]]
    assert lines[0].split("  ")[-1].strip() == "[00000014] [99999999]"
    assert [line.split()[1] for line in lines[:10]] == [str(n) for n in range(14, 4, -1)]
    assert lines[10:] == ["4 more differ by 0.400 or less; --json lists them", "1 more agrees to the last digit shown"]
    text = replace(answer, closures=tuple(many[:11])).explain()  # one more would take a line to say so
    assert text.count("\n  path ") == 11
    assert "or less" not in text
