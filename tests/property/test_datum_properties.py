"""What must hold for any datum text and any composition."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from propdb.datum import dump_toml, parse_datums, parse_inline, same_meaning, solve, zero
from propdb.errors import DatumError, PropdbError
from propdb.model.records import Datum, Species, ZeroState

BASIS: Mapping[str, tuple[Mapping[str, int], int]] = {
    "carbon dioxide": ({"C": 1, "O": 2}, 0),
    "water": ({"H": 2, "O": 1}, 0),
    "sulfur dioxide": ({"S": 1, "O": 2}, 0),
    "nitrogen": ({"N": 2}, 0),
    "oxygen": ({"O": 2}, 0),
    "electron": ({}, -1),
}

counts = st.dictionaries(
    st.sampled_from("CHSNO"), st.integers(1, 60) | st.fractions(0, 20, max_denominator=12), min_size=1
)


@given(counts=counts, charge=st.integers(-4, 4), order=st.permutations(sorted(BASIS)))
def test_what_makes_up_a_species_has_its_atoms_and_charge(
    counts: dict[str, Fraction | int], charge: int, order: list[str]
) -> None:
    nu = solve(counts, charge, basis=order, composition=BASIS.__getitem__, what="x", datum="d")
    for element in "CHSNO":
        made = sum(n * BASIS[name][0].get(element, 0) for n, name in zip(nu, order, strict=True))
        assert made == counts.get(element, 0)
    assert sum(n * BASIS[name][1] for n, name in zip(nu, order, strict=True)) == charge


@given(counts=counts, extra=st.sampled_from(["F", "Cl", "Ar"]))
def test_an_element_outside_the_basis_is_named(counts: dict[str, Fraction | int], extra: str) -> None:
    with pytest.raises(DatumError) as error:
        solve({**counts, extra: 1}, 0, basis=list(BASIS), composition=BASIS.__getitem__, what="x", datum="d")
    assert error.value.fields["elements"] == (extra,)


@given(first=counts, second=counts)
def test_a_zero_is_linear_in_the_composition(
    first: dict[str, Fraction | int], second: dict[str, Fraction | int]
) -> None:
    """What a reaction conserves cancels: the zero of a sum is the sum of the zeros."""
    together = {e: first.get(e, 0) + second.get(e, 0) for e in {*first, *second}}

    def nu(atoms: Mapping[str, Fraction | int]) -> tuple[Fraction, ...]:
        return solve(atoms, 0, basis=list(BASIS), composition=BASIS.__getitem__, what="x", datum="d")

    assert nu(together) == tuple(a + b for a, b in zip(nu(first), nu(second), strict=True))


temperatures = st.sampled_from(["25C", "0C", "60F", "-40F", "298.15K", "0K", "0.25K", "1571.67R", "boiling"])
inline = st.builds(
    lambda phase, extra, t, h0: f"own:{phase}{extra}@{t}{h0}",
    st.sampled_from(["l", "fluid", "g", "cr", "cr:graphite", "am", "stable", "aq"]),
    st.sampled_from(["", ",saturated", ",saturated liquid", ",saturated vapour", ",40bar", ",1atm"]),
    temperatures,
    st.sampled_from(["", "=200kJ/kg", "=-10.5kJ/mol", "=0kJ/kg", "=1e3 BTU/lb"]),
)


def _read(text: str) -> Datum | None:
    """The datum, or None where it is refused: with an error of ours and in one line."""
    problem = ""
    try:
        return parse_inline(text)
    except PropdbError as error:
        problem = str(error)
    assert problem
    assert "\n" not in problem
    return None


@given(text=inline)
def test_inline_texts_read_back_or_are_refused_in_one_line(text: str) -> None:
    datum = _read(text)
    if datum is None:
        return
    (found,) = parse_datums(tomllib.loads(dump_toml(datum)), where="dump").values()
    assert same_meaning(found, datum)


@given(text=st.text(max_size=40))
def test_any_text_is_read_or_refused(text: str) -> None:
    for candidate in (text, f"own:{text}", f"own:l@{text}", f"own:{text}@25C", f"own:l@25C={text}"):
        _read(candidate)


words = st.text("abcdefgh αβ\"\\'\n\t#=[]", min_size=1, max_size=20).filter(str.strip).map(str.strip)
states = st.builds(
    ZeroState,
    phase=st.sampled_from(["g", "l", "cr"]),
    temperature=st.floats(1e-3, 5000.0) | st.just(0.0),
    pressure=st.none() | st.floats(1e-3, 1e9),
)


@given(name=st.from_regex(r"[A-Za-z0-9][A-Za-z0-9.+-]{0,15}", fullmatch=True), sentence=words, note=words, state=states)
def test_any_own_state_datum_reads_back(name: str, sentence: str, note: str, state: ZeroState) -> None:
    datum = Datum(name, "own", sentence, "common-practice", state.temperature, zero=state, note=note)
    assert parse_datums(tomllib.loads(dump_toml(datum)), where="dump") == {name: datum}


@given(counts=st.dictionaries(st.sampled_from("CHO"), st.integers(1, 9), min_size=1))
def test_own_state_terms_do_not_depend_on_the_composition(counts: dict[str, int]) -> None:
    species = Species("x", "", 0, tuple(counts.items()), 0.1)
    (term,) = zero(parse_inline("own:g@25C"), species, phase="l", composition=BASIS.__getitem__).terms
    assert (term.coefficient, term.species) == (1, "x")
