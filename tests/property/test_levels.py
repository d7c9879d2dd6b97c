"""One level for each state: conversions compose, go there and back, and do not depend on the way."""

from __future__ import annotations

import random
from collections.abc import Iterator

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import propdb
from propdb.api import Store
from propdb.errors import PropdbError
from propdb.model.records import State

SPECIES = ["water", "nitrogen", "methane", "ethanol", "benzene", "carbon dioxide", "ammonia", "sodium ion", "carbon"]


@pytest.fixture(scope="module")
def store() -> Iterator[Store]:
    with propdb.open() as opened:
        yield opened


def shift(store: Store, species: str, start: str, end: str) -> float:
    """J/mol to add when going from one datum to another at 1000 K."""
    value = store.convert("0 J/mol", species=species, from_=start, to=end, temperature="1000K").si
    return float(value)


def defined(store: Store, species: str) -> list[str]:
    """Datums that a species has, beside those that its data do not reach."""
    names = [d.name for d in store.datum_list()] + ["own:g@65C", "own:l@30C", "own:g@60F=10kJ/mol"]
    found = []
    for name in names:
        try:
            store.convert("0 J/mol", species=species, from_=name, to=name, temperature="1000K")
            shift(store, species, name, "elements-298K")
        except PropdbError:
            continue
        found.append(name)
    return found


@pytest.mark.parametrize("species", SPECIES)
def test_conversions_compose(store: Store, species: str) -> None:
    """A to B to C equals A to C, and there and back is nothing, for every pair of datums of the species."""
    names = defined(store, species)
    assert len(names) >= 5, names
    rng = random.Random(species)
    for a in names:
        for b in names:
            c = rng.choice(names)
            ab, bc, ac = (shift(store, species, *pair) for pair in ((a, b), (b, c), (a, c)))
            allowed = 1e-9 + 1e-12 * max(abs(ab), abs(bc), abs(ac), 1e6)
            assert abs(ab + bc - ac) <= allowed, (a, b, c)
            assert abs(ab + shift(store, species, b, a)) <= allowed, (a, b)


@pytest.mark.full
def test_conversions_compose_for_every_species(store: Store) -> None:
    rng = random.Random(7)
    for record in store._reader.all_species():
        try:
            names = defined(store, record.name)
        except PropdbError:
            continue
        for _ in range(40 if names else 0):
            a, b, c = (rng.choice(names) for _ in range(3))
            ab, bc, ac = (shift(store, record.name, *pair) for pair in ((a, b), (b, c), (a, c)))
            assert abs(ab + bc - ac) <= 1e-9 + 1e-12 * max(abs(ab), abs(bc), abs(ac), 1e6), (record.name, a, b, c)


@settings(max_examples=60, deadline=None)
@given(t1=st.floats(220.0, 3000.0), t2=st.floats(220.0, 3000.0), name=st.sampled_from(["nitrogen", "water", "methane"]))
def test_enthalpy_differences_do_not_depend_on_the_datum(t1: float, t2: float, name: str) -> None:
    with propdb.open() as store:
        for datum in ("elements-298K", "elements-0K", "combustion-gross-25C", "gas-60F"):
            a = store.enthalpy(name, phase="g", temperature=t1, datum=datum).si
            b = store.enthalpy(name, phase="g", temperature=t2, datum=datum).si
            c = store.enthalpy(name, phase="g", temperature=t1, datum="gas-25C").si
            d = store.enthalpy(name, phase="g", temperature=t2, datum="gas-25C").si
            assert (a - b) == pytest.approx(c - d, abs=1e-6)


@pytest.mark.parametrize(
    ("species", "state"),
    [
        ("water", State("l", 350.0)),
        ("water", State("fluid", 450.0, saturated="vapour")),
        ("nitrogen", State("g", 900.0)),
        ("ethanol", State("l", 330.0)),
        ("propane", State("fluid", 320.0, pressure=5e5)),
    ],
)
def test_a_level_is_the_sum_of_its_legs_and_steps_add_up(store: Store, species: str, state: State) -> None:
    answer = store.enthalpy(
        species,
        phase=state.phase,
        temperature=state.temperature,
        pressure=state.pressure,
        saturated=state.saturated or None,
        datum="elements-298K",
    )
    assert sum(s.value for s in answer.steps) == pytest.approx(answer.value, abs=1e-9)
    chain = [step for step in answer.steps if step.what != "pressure along saturation"]
    for first, second in zip(chain, chain[1:], strict=False):
        assert first.end == second.start


def test_an_entry_on_both_sides_cancels(store: Store) -> None:
    """Up and down the same curve: only the difference of the two spans carries the uncertainty of its entry."""
    up = store.enthalpy("nitrogen", phase="g", temperature=1000.0, datum="own:g@900K")
    assert [p.entry for p in up.parts] == [s.entry for s in up.steps if s.entry]
    (part,) = up.parts
    assert part.coefficient == pytest.approx(up.si, rel=1e-9)
    # the formation enthalpy of CO2 stands on both sides of its own combustion datum
    zero = store.enthalpy("carbon dioxide", phase="g", temperature=298.15, datum="combustion-net-25C")
    assert zero.value == pytest.approx(0.0, abs=1e-12)
    assert zero.parts == ()
    assert zero.uncertainty == 0.0


def test_uncertainty_of_a_difference_of_two_entries(store: Store) -> None:
    """CODATA 1989: CO2 -393.51 ± 0.13, CO -110.53 ± 0.17 kJ/mol (95 %): CO + 1/2 O2 -> CO2 has sqrt sum of squares."""
    answer = store.reaction("CO(g) + 1/2 O2(g) -> CO2(g)", temperature=298.15, source="codata-1989")
    assert answer.uncertainty == pytest.approx(0.5 * (0.13**2 + 0.17**2) ** 0.5, rel=1e-9)
