"""Whatever a store is given, it gives back."""

from __future__ import annotations

import re
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import replace
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, assume, example, given, settings
from hypothesis import strategies as st
from store_samples import BOOK, REPORT, SEED, WATER, content, entry

from propdb.errors import Ambiguous, InvalidInput, NotFound
from propdb.model.records import KIND_TO_STANDARD, PHASES, QUANTITIES, STATUSES, Carrier, Entry, Source, Species
from propdb.store.backup import check
from propdb.store.content import Content, canonical, canonical_lines, content_hash, hashed_row, identity, with_id
from propdb.store.read import Reader
from propdb.store.rows import fold
from propdb.store.search import find, resolve
from propdb.store.write import build

PROFILE = settings(
    max_examples=40, deadline=None, suppress_health_check=[HealthCheck.too_slow, HealthCheck.data_too_large]
)

QUOTES = st.sampled_from(
    ["'", '"', "''; DROP TABLE entry; --", "α-β′", "100%_*", "名前", "e\u0301", "😀", "\\", "NULL", " x "]
)
PLAIN = st.text(st.characters(exclude_categories=["Cs", "Cc"]), max_size=12)
TEXT = st.one_of(PLAIN, QUOTES)
ANY_TEXT = st.one_of(st.text(st.characters(exclude_categories=["Cs"]), max_size=12), QUOTES)
NAME = st.builds("".join, st.tuples(TEXT, TEXT)).filter(bool)
NUMBER = st.floats(-1e300, 1e300, allow_nan=False, exclude_min=True, exclude_max=True)
POSITIVE = st.floats(0, 1e299, allow_nan=False)
JSON = st.recursive(
    st.one_of(
        st.none(),
        st.booleans(),
        st.integers(-(2**70), 2**70),
        st.floats(allow_nan=False, allow_infinity=False),
        ANY_TEXT,
    ),
    lambda inner: st.one_of(st.lists(inner, max_size=3), st.dictionaries(ANY_TEXT, inner, max_size=3)),
    max_leaves=6,
)
COUNT = st.one_of(st.integers(1, 99), st.fractions(Fraction(1, 99), 99))
CARRIER = st.builds(Carrier, TEXT, TEXT, TEXT, st.one_of(st.none(), st.integers(0, 10**6)), TEXT)


@st.composite
def species(draw: st.DrawFn) -> Species:
    counts = draw(st.dictionaries(st.sampled_from(["C", "H", "O", "D", "Na"]), COUNT, max_size=3))
    return Species(
        name=draw(NAME),
        formula="".join(f"{element}{count}" for element, count in counts.items()),
        charge=draw(st.integers(-3, 3)),
        composition=tuple(
            (e, c.numerator if isinstance(c, Fraction) and c.denominator == 1 else c) for e, c in counts.items()
        ),
        molar_mass=draw(st.floats(1e-9, 1e9)),
        cas=draw(st.sampled_from(["", "7732-18-5", "64-17-5", "115-10-6"])),
        inchikey=draw(st.sampled_from(["", "XLYOFNOQVPJJNP-UHFFFAOYSA-N"])),
        synonyms=tuple(draw(st.lists(TEXT, max_size=3))),
        vapour=draw(st.sampled_from(["", "associating"])),
        kind=draw(st.sampled_from(["species", "pseudo"])),
        note=draw(ANY_TEXT),
    )


@st.composite
def sources(draw: st.DrawFn) -> Source:
    return Source(
        key=draw(NAME),
        title=draw(NAME),
        authors=tuple(draw(st.lists(ANY_TEXT, max_size=2))),
        year=draw(st.one_of(st.none(), st.integers(1700, 2100))),
        kind=draw(TEXT),
        cls=draw(TEXT),
        terms=draw(ANY_TEXT),
        fields=draw(st.dictionaries(TEXT, ANY_TEXT, max_size=2)),
        carrier=draw(ANY_TEXT),
        standard_pressure=draw(st.sampled_from([1e5, 101325.0, 1])),
        note=draw(ANY_TEXT),
        lineage=tuple(draw(st.lists(st.tuples(TEXT, ANY_TEXT), max_size=2))),
    )


@st.composite
def entries(draw: st.DrawFn, of: Species, source: str) -> Entry:
    low, high = sorted((draw(POSITIVE), draw(POSITIVE)))
    equation = draw(st.sampled_from(["", "polynomial"]))
    return with_id(
        Entry(
            id="",
            species=of.name,
            quantity=draw(st.sampled_from(QUANTITIES)),
            phase=draw(st.sampled_from(PHASES)),
            form=draw(ANY_TEXT),
            to=draw(ANY_TEXT),
            equation=equation,
            temperature=draw(st.one_of(st.none(), POSITIVE)),
            value=draw(NUMBER if not equation else st.none()),
            unit=draw(TEXT),
            carried=draw(ANY_TEXT),
            carried_unit=draw(TEXT),
            params=draw(st.dictionaries(ANY_TEXT, JSON, max_size=3)),
            tmin=draw(st.sampled_from([None, low, 0])),
            tmax=draw(st.sampled_from([None, high])),
            uncertainty=draw(st.one_of(st.none(), POSITIVE, st.just(-0.0), st.just(3))),
            uncertainty_unit=draw(st.sampled_from(["", "%"])),
            uncertainty_kind=draw(st.sampled_from(list(KIND_TO_STANDARD))),
            datum=draw(TEXT),
            conditions=draw(ANY_TEXT),
            source=source,
            locator=draw(ANY_TEXT),
            printed=draw(st.booleans()),
            status=draw(st.sampled_from(STATUSES)),
            note=draw(ANY_TEXT),
            carriers=tuple(draw(st.lists(CARRIER, max_size=2, unique=True))),
        ),
        of,
    )


@st.composite
def contents(draw: st.DrawFn) -> Content:
    held = draw(st.lists(species(), min_size=1, max_size=3, unique_by=(lambda one: one.name, identity)))
    books = draw(st.lists(sources(), min_size=1, max_size=2, unique_by=lambda one: one.key))
    found = [
        draw(entries(draw(st.sampled_from(held)), draw(st.sampled_from(books)).key))
        for _ in range(draw(st.integers(0, 4)))
    ]
    return Content(
        species=held,
        sources=books,
        datums=draw(st.dictionaries(NAME, st.dictionaries(ANY_TEXT, JSON, max_size=2), max_size=2)),
        policy=draw(st.dictionaries(NAME, JSON, max_size=2)),
        entries=list({e.id: e for e in found}.values()),
    )


@contextmanager
def store(*bases: Content) -> Iterator[Path]:
    with tempfile.TemporaryDirectory() as directory:
        path = Path(directory) / "store.db"
        for base in bases:
            build(path, base, versions={})
        yield path


def plain(value: Any) -> Any:
    """As JSON would have it."""
    if isinstance(value, (list, tuple)):
        return [plain(inner) for inner in value]
    if hasattr(value, "items"):
        return {key: plain(inner) for key, inner in value.items()}
    return value


def fields(e: Entry) -> tuple[Any, ...]:
    return (e.id, e.species, hashed_row(e), e.printed, e.status, e.note)


def assert_held(reader: Reader, base: Content) -> None:
    assert {one.name: one for one in reader.all_species()} == {one.name: one for one in base.species}
    assert {one.key: one for one in reader.sources()} == {one.key: one for one in base.sources}
    assert plain(reader.datum_rows()) == plain(base.datums)
    assert plain(reader.policies()) == plain(base.policy)
    for one in base.species:
        mine = [e for e in base.entries if e.species == one.name]
        assert {fields(e) for e in reader.entries(one.name)} == {fields(e) for e in mine}
    for e in base.entries:
        assert fields(reader.entry(e.id)) == fields(e)
        assert plain(reader.entry(e.id).params) == plain(e.params)


@PROFILE
@given(contents())
def test_what_is_stored_comes_back(base: Content) -> None:
    with store(base) as path, Reader(path) as reader:
        assert_held(reader, base)
        assert all(set(reader.entry(e.id).carriers) == set(e.carriers) for e in base.entries)
        assert reader.content_hash == content_hash(base)
        assert check(path) == []


@PROFILE
@given(contents(), contents())
def test_a_second_base_replaces_the_first(first: Content, second: Content) -> None:
    with store(first, second, second) as path, Reader(path) as reader:
        assert reader.content_hash == content_hash(second)
        assert_held(reader, second)
        total = len({e.id for e in (*first.entries, *second.entries)})
        assert sum(reader.info()["entries"][kind] for kind in ("active", "inactive")) == total
        same = content_hash(first) == content_hash(second)
        assert len(reader.events()) == (1 if same else 2)
        for e in () if same else second.entries:
            assert set(reader.entry(e.id).carriers) >= set(e.carriers)  # those of an earlier base stay true
        assert check(path) == []


@PROFILE
@given(contents(), st.randoms(use_true_random=False))
def test_the_hash_does_not_depend_on_the_order(base: Content, shuffle: Any) -> None:
    mixed = replace(
        base,
        species=shuffle.sample(list(base.species), len(base.species)),
        sources=shuffle.sample(list(base.sources), len(base.sources)),
        entries=shuffle.sample(list(base.entries), len(base.entries)),
        datums=dict(reversed(base.datums.items())),
        policy=dict(reversed(base.policy.items())),
    )
    assert content_hash(mixed) == content_hash(base)


@PROFILE
@given(species())
@example(replace(WATER, name="Robert'); DROP TABLE species; --", cas="", inchikey="", synonyms=("\u212b", "ﬁ")))
def test_a_species_is_found_by_all_that_it_is_called(one: Species) -> None:
    assume(fold(one.name))
    with store(Content(species=[one])) as path, Reader(path) as reader:
        for text in (one.name, *one.synonyms, one.cas, one.inchikey):
            if fold(text):
                assert resolve(reader, text) == one
                assert find(reader, text)[0].name == one.name
        for part in (fold(one.name)[1:], fold(one.name)[:-1]):
            if len(part.strip()) >= 3:
                assert [match.name for match in find(reader, part)] == [one.name]


@PROFILE
@given(ANY_TEXT)
def test_looking_for_anything_is_harmless(text: str) -> None:
    with store(content()) as path, Reader(path) as reader:
        find(reader, text)
        for call in (lambda: resolve(reader, text), lambda: reader.entry(text), lambda: reader.species(text)):
            with suppress(NotFound, Ambiguous):
                call()


@PROFILE
@given(
    st.sampled_from(["temperature", "value", "tmin", "tmax", "uncertainty"]), st.sampled_from(["nan", "inf", "-inf"])
)
def test_no_number_that_is_none_gets_in(name: str, number: str) -> None:
    bad = replace(entry(WATER), **{name: float(number)})
    with tempfile.TemporaryDirectory() as directory:
        with pytest.raises(InvalidInput):
            build(Path(directory) / "store.db", content(entries=(bad,)), versions={})
        assert not list(Path(directory).iterdir())


def test_the_samples_are_sound() -> None:
    assert {BOOK.key, REPORT.key} == {source.key for source in content().sources}
    assert SEED in content().entries[0].carriers


@pytest.mark.parametrize(
    "rows",
    [
        [],
        [(1, 'a],\n["b', None, True), ("\u00e9", -0.5, 1e-20, "],\\n[")],
        [([1], [2]), ("lists", ["within"])],
        [("x", float("inf"))],
    ],
)
def test_many_rows_are_encoded_as_each_would_be(rows: list[tuple[object, ...]]) -> None:
    try:
        each = [canonical(row) for row in rows]
    except InvalidInput as error:
        with pytest.raises(InvalidInput, match=re.escape(error.problem)):
            list(canonical_lines(rows))
    else:
        assert list(canonical_lines(rows)) == each
