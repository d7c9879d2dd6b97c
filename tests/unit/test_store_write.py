"""A base is added in one transaction; nothing that people did is lost."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable
from contextlib import closing
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from store_samples import BOOK, ETHANOL, REPORT, SEED, WATER, content, curve, entry

from propdb.errors import InvalidInput, NotFound, PropdbError
from propdb.model.records import Carrier, Entry, Species
from propdb.store import log
from propdb.store.backup import check
from propdb.store.content import HASHED, content_hash, entry_id, hashed_row, identity, with_id
from propdb.store.open import mapped, open_store
from propdb.store.own import add_own, add_own_all, put_own
from propdb.store.read import Reader
from propdb.store.search import find, resolve
from propdb.store.verify import stored_content_hash
from propdb.store.write import build

MINE = Carrier("own", "", "mine.csv", 7, "typed by hand")


@pytest.fixture
def store(tmp_path: Path) -> Path:
    path = tmp_path / "store.db"
    build(path, content(), versions={"propdb": "0", "chemicals": "1"})
    return path


def dump(path: Path) -> list[str]:
    """Every row of every table, but for the search index."""
    with closing(sqlite3.connect(path)) as conn:
        names = [
            name
            for (name,) in conn.execute("SELECT name FROM sqlite_master WHERE type = 'table' ORDER BY name").fetchall()
            if not name.startswith(("name_trigram", "sqlite_stat"))
        ]
        return [f"{name} {row}" for name in names for row in conn.execute(f"SELECT * FROM {name}").fetchall()]


def test_first_build(store: Path) -> None:
    with Reader(store) as reader:
        assert reader.content_hash == content_hash(content())
        assert dict(reader.base.payload["versions"]) == {"propdb": "0", "chemicals": "1"}
        assert alike(reader.entries("water")) == alike(e for e in content().entries if e.species == "water")
        assert alike(reader.entries("ethanol")) == alike(e for e in content().entries if e.species == "ethanol")
        assert reader.entries("dimethyl ether") == ()
        assert reader.sources() == (BOOK, REPORT)
        assert reader.source("book-2001") == BOOK
        assert list(reader.all_species()) == sorted(content().species, key=lambda one: one.name)
        assert reader.policy("ranks") == {"book-2001": 2, "report-2010": 1}
        assert reader.policy("defaults")["class"] == (1.5, 2)
        assert reader.datum_rows()["elements-298K"]["schedule"] == (("H", "g"), ("O", "g"))
        assert reader.events() == (reader.base,)
    assert check(store) == []


def alike(entries: Iterable[Entry]) -> set[tuple[Any, ...]]:
    """Entries by all their fields, lists and tuples in their params alike."""
    return {(e.id, e.species, *hashed_row(e), e.printed, e.status, e.note, e.carriers) for e in entries}


def test_building_twice_changes_nothing(store: Path) -> None:
    before = dump(store)
    shuffled = content(
        species=tuple(reversed(content().species)),
        sources=tuple(reversed(content().sources)),
        entries=tuple(reversed(content().entries)),
    )
    report = build(store, shuffled, versions={"propdb": "0.1"})
    assert not report.changed
    assert report.base == 1
    assert dump(store) == before


def test_two_fresh_builds_agree(tmp_path: Path) -> None:
    hashes = set()
    for name in "ab":
        build(tmp_path / name, content(), versions={})
        with Reader(tmp_path / name) as reader:
            hashes.add(reader.content_hash)
            assert stored_content_hash(reader.conn, reader.base.seq) == reader.content_hash
    assert hashes == {content_hash(content())}


@pytest.mark.parametrize(
    "other",
    [
        {"policy": {}},
        {"datums": {}},
        {"entries": content().entries[1:]},
        {"statuses": {content().entries[0].id: "quarantined"}},
        {"notes": {content().entries[0].id: "see there"}},
        {"sources": (replace(BOOK, note="more"), REPORT)},
        {"sources": (replace(BOOK, lineage=()), REPORT)},
        {"species": (replace(WATER, synonyms=("steam",)), *content().species[1:])},
        {"entries": (replace(content().entries[0], printed=True), *content().entries[1:])},
    ],
)
def test_whatever_changes_changes_the_hash(store: Path, other: dict[str, Any]) -> None:
    changed = content(**other)
    assert content_hash(changed) != content_hash(content())
    assert build(store, changed, versions={}).changed
    assert check(store) == []
    assert build(store, content(), versions={}).changed  # and back: a third base, with the hash of the first
    with Reader(store) as reader:
        assert reader.base.seq == 3
        assert reader.content_hash == content_hash(content())
    assert check(store) == []


def test_carriers_are_not_content(store: Path) -> None:
    more = content(carriers={content().entries[0].id: (MINE,)})
    assert content_hash(more) == content_hash(content())


def test_two_carriers_of_one_entry(tmp_path: Path) -> None:
    one = entry(WATER, note="a", status="estimate")
    two = replace(one, carriers=(MINE,), note="b", status="base", printed=True)
    build(tmp_path / "s.db", content(entries=(one, two)), versions={})
    with Reader(tmp_path / "s.db") as reader:
        (found,) = reader.entries("water")
        assert set(found.carriers) == {SEED, MINE}
        assert (found.status, found.note, found.printed) == ("estimate", "a; b", True)


def test_rebuild_keeps_what_people_did(store: Path) -> None:
    hf, own = content().entries[0], entry(WATER, value=-5.0, locator="my own sheet")
    put_own(store, sources=(replace(REPORT, key="mine", title="My sheet"),), policy={"ranks": {"mine": 9}})
    own = with_id(replace(own, source="mine"), WATER)
    add_own(store, own, MINE, "me", comment="measured")
    with closing(open_store(store, write=True)) as conn:
        log.append(conn, "approved", entry=hf.id, who="me")
        log.append(conn, "approved", entry=own.id, who="someone else")
        log.append(conn, "waived", entry=own.id, who="me", payload={"check": "bounds"})
        before = log.events(conn)
    other = content(
        entries=(*content().entries[:2], curve(ETHANOL)),
        sources=(replace(BOOK, title="Second edition"), REPORT, replace(REPORT, key="mine", title="Not yours")),
        policy={"ranks": {"book-2001": 1}},
    )
    report = build(store, other, versions={})
    assert (report.entries, report.entries_added, report.entries_inactive) == (3, 1, 3)
    with Reader(store) as reader:
        assert reader.events()[: len(before)] == before
        found = {e.id: e for e in reader.entries("water")}
        assert found.keys() == {own.id, hf.id, content().entries[1].id}
        assert found[own.id].status == found[hf.id].status == "approved"
        assert found[own.id].carriers == (MINE, SEED)
        assert reader.source("mine").title == "My sheet"
        assert reader.source("book-2001").title == "Second edition"
        assert reader.policy("ranks") == {"mine": 9}
        assert [e.quantity for e in reader.entries("ethanol")] == ["Cp"]
        gone = content().entries[4]
        with pytest.raises(NotFound, match="not active"):
            reader.entry(gone.id)
    assert check(store) == []
    build(store, content(), versions={})  # the old base again: its entries are active again
    with Reader(store) as reader:
        assert reader.entry(gone.id).status == "base"
        assert reader.entry(hf.id).status == "approved"
    assert check(store) == []


def test_source_and_species_that_the_base_lost_stay_for_older_entries(store: Path) -> None:
    other = content(species=(WATER,), sources=(BOOK,), entries=(entry(WATER),), datums={}, policy={})
    build(store, other, versions={})
    with Reader(store) as reader:
        assert [one.name for one in reader.all_species()] == ["water"]
        assert [source.key for source in reader.sources()] == ["book-2001"]
        assert reader.source("report-2010") == REPORT
        assert reader.datum_rows() == {}
        assert dict(reader.policies()) == {}
        with pytest.raises(NotFound):
            reader.species("ethanol")
        with pytest.raises(NotFound):
            resolve(reader, "64-17-5")
        assert find(reader, "ethanol") == []
    assert check(store) == []


def test_own_entry_keeps_a_species_that_the_base_lost(store: Path) -> None:
    number = add_own(store, entry(ETHANOL, value=3.0), MINE, "me")
    build(store, content(species=(WATER,), entries=(entry(WATER),)), versions={})
    with Reader(store) as reader:
        assert reader.species("ethanol") == ETHANOL
        assert [e.id for e in reader.entries("ethanol")] == [number]
        assert resolve(reader, "64-17-5") == ETHANOL


@pytest.mark.parametrize(
    "changed",
    [
        replace(ETHANOL, name="ethyl alcohol", synonyms=("ethanol",)),  # another name
        replace(ETHANOL, cas="64-17-50"),  # another CAS RN
        replace(ETHANOL, cas="", inchikey=""),
        replace(ETHANOL, synonyms=(), note="x"),
    ],
)
def test_own_entry_follows_its_species(store: Path, changed: Species) -> None:
    number = add_own(store, entry(ETHANOL, value=3.0), MINE, "me")
    species = tuple(changed if one is ETHANOL else one for one in content().species)
    build(store, content(species=species, entries=(entry(WATER), entry(changed))), versions={})
    with Reader(store) as reader:
        assert reader.species(changed.name) == changed
        assert {e.id for e in reader.entries(changed.name)} == {number, entry(changed).id}
        assert {e.species for e in reader.entries(changed.name)} == {changed.name}
        assert reader.entry(number).species == changed.name
        assert (find(reader, "ethanol")[0].name) == changed.name
        if not changed.synonyms:
            assert [m.name for m in find(reader, "ethyl alcohol") if m.score > 60] == []
    assert check(store) == []


def test_own_entry_follows_its_species_through_one_change_after_another(store: Path) -> None:
    number = add_own(store, entry(ETHANOL, value=3.0), MINE, "me")
    corrected = replace(ETHANOL, cas="64-17-50")
    renamed = replace(corrected, name="ethyl alcohol")
    for one in (corrected, renamed):
        build(store, content(species=(WATER, one), entries=(entry(one),)), versions={})
    with Reader(store) as reader:
        assert {e.id for e in reader.entries("ethyl alcohol")} == {number, entry(renamed).id}
    assert check(store) == []


def test_names_may_change_places(store: Path) -> None:
    ether = content().species[2]
    swapped = (replace(ETHANOL, name=ether.name), replace(ether, name=ETHANOL.name))
    species = (WATER, *swapped, *content().species[3:])
    build(store, content(species=species, entries=(entry(swapped[0]), entry(WATER))), versions={})
    with Reader(store) as reader:
        assert reader.species("ethanol").cas == ether.cas
        assert [e.id for e in reader.entries(ether.name)] == [entry(swapped[0]).id]
        assert entry(swapped[0]).id == entry(ETHANOL, locator="C2H6O").id  # the CAS RN decides, not the name
    assert check(store) == []


def test_own_species_before_and_after_the_base_knows_it(store: Path) -> None:
    mine = Species("my solvent", "C4H10O2", 0, (("C", 4), ("H", 10), ("O", 2)), 0.09, "110-71-4")
    own = entry(mine, value=1.0)
    with pytest.raises(NotFound, match="no species 'my solvent'"):
        add_own(store, own, MINE, "me")
    add_own_all(store, [(own, MINE)], "me", species=(mine,))
    theirs = replace(mine, name="1,2-dimethoxyethane", synonyms=("monoglyme",))
    build(store, content(species=(*content().species, theirs), entries=(entry(theirs, value=2.0),)), versions={})
    with Reader(store) as reader:
        assert {e.value for e in reader.entries("my solvent")} == {1.0, 2.0}
        for text in ("my solvent", "monoglyme", "110-71-4", "1,2-dimethoxyethane", "C4H10O2"):
            assert resolve(reader, text) == mine
        assert [one.name for one in reader.all_species()].count("my solvent") == 1
        with pytest.raises(NotFound):
            reader.species("1,2-dimethoxyethane")
    assert check(store) == []


def test_own_datum_and_source_stand_before_the_base(store: Path) -> None:
    put_own(
        store, sources=(replace(BOOK, title="Mine"),), datums={"elements-298K": {"kind": "own"}, "x": {"kind": "own"}}
    )
    with Reader(store) as reader:
        assert reader.source("book-2001").title == "Mine"
        assert [source.title for source in reader.sources()] == ["Mine", REPORT.title]
        assert reader.datum_rows() == {"elements-298K": {"kind": "own"}, "x": {"kind": "own"}}
        assert reader.content_hash == content_hash(content())
    assert check(store) == []  # what the base supplied is still there


def test_own_entry(store: Path) -> None:
    added = entry(WATER, value=-5.0, note="mine", printed=True)
    number = add_own(store, replace(added, id="", status="approved"), MINE, "me", comment="from the lab")
    assert number == added.id
    assert add_own(store, added, MINE, "me again") == number
    with Reader(store) as reader:
        (created,) = reader.events(number)
        assert (created.kind, created.who, created.comment, created.status) == ("created", "me", "from the lab", "")
        found = reader.entry(number)
        assert (found.status, found.note, found.printed) == ("draft", "mine", True)


def test_own_entry_that_the_base_brings_later(store: Path) -> None:
    late = entry(WATER, value=-5.0, note="of the base")
    add_own(store, replace(late, note="mine"), MINE, "me")
    build(store, content(entries=(*content().entries, late)), versions={})
    with Reader(store) as reader:
        found = reader.entry(late.id)
        assert (found.status, found.note) == ("base", "of the base")
        assert set(found.carriers) == {SEED, MINE}
    build(store, content(), versions={})
    with Reader(store) as reader:
        assert (reader.entry(late.id).status, reader.entry(late.id).note) == ("draft", "mine")


def test_all_own_entries_or_none(store: Path) -> None:
    before = dump(store)
    good, bad = entry(WATER, value=1.0), replace(entry(WATER, value=2.0), source="nowhere", id="")
    with pytest.raises(NotFound, match="no source 'nowhere'"):
        add_own_all(store, [(good, MINE), (bad, MINE)], "me", sources=(replace(REPORT, key="mine"),))
    assert dump(store) == before


BAD: list[tuple[dict[str, Any], str]] = [
    ({"source": ""}, "needs a source"),
    ({"quantity": "Hq"}, "unknown quantity 'Hq'"),
    ({"phase": "s"}, "unknown phase 's'"),
    ({"value": float("nan")}, "value is nan"),
    ({"value": float("inf")}, "value is inf"),
    ({"tmin": float("nan")}, "tmin is nan"),
    ({"uncertainty": float("-inf")}, "uncertainty is -inf"),
    ({"uncertainty": -1.0}, "is negative"),
    ({"uncertainty_kind": "guess"}, "unknown kind of uncertainty"),
    ({"tmin": 300.0, "tmax": 200.0}, "tmin 300 K is above tmax 200 K"),
    ({"value": None}, "a constant needs its value"),
    ({"status": "fine"}, "unknown status"),
    ({"locator": "elsewhere"}, "is not that of its fields"),
    ({"params": {"a": float("nan")}}, "cannot be stored as JSON"),
    ({"params": {"a": object()}}, "cannot be stored as JSON"),
]


@pytest.mark.parametrize("fields, problem", BAD)
def test_bad_entries_are_refused_in_words(tmp_path: Path, store: Path, fields: dict[str, Any], problem: str) -> None:
    bad = replace(entry(WATER), **fields)
    for attempt in (
        lambda: build(tmp_path / "new.db", content(entries=(bad,)), versions={}),
        lambda: (
            add_own(store, bad, MINE, "me")
            if "status" not in fields
            else build(store, content(entries=(bad,)), versions={})
        ),
    ):
        with pytest.raises(InvalidInput, match=problem) as caught:
            attempt()
        assert "\n" not in str(caught.value)
    assert not (tmp_path / "new.db").exists()


def test_the_tables_themselves_refuse_bad_rows(store: Path) -> None:
    columns = ["id", "identity", *HASHED]
    good = dict(zip(columns, ["0" * 20, identity(WATER), *hashed_row(entry(WATER))], strict=True))
    sql = "INSERT INTO entry ({}) VALUES ({})".format(
        ", ".join(f'"{c}"' for c in columns), ", ".join("?" * len(columns))
    )
    changes: list[tuple[dict[str, Any], str]] = [
        ({"source": ""}, "needs a source"),
        ({"source": None}, "NOT NULL"),
        ({"source": "nowhere"}, "FOREIGN KEY"),
        ({"quantity": "Hq"}, "unknown quantity"),
        ({"phase": "s"}, "unknown phase"),
        ({"value": float("nan")}, "a constant needs its value"),
        ({"value": float("inf")}, "finite"),
        ({"value": "high"}, "cannot store TEXT"),
        ({"tmin": 2.0, "tmax": 1.0}, "tmin is above tmax"),
        ({"tmax": float("inf")}, "finite"),
        ({"temperature": -1.0}, "below 0 K"),
        ({"uncertainty": -1.0}, "not negative"),
        ({"uncertainty_kind": "guess"}, "unknown kind of uncertainty"),
        ({"params": "{"}, "params are JSON"),
        ({"id": "short"}, "CHECK"),
    ]
    with closing(open_store(store, write=True)) as conn:
        for change, problem in changes:
            with pytest.raises(InvalidInput, match=problem), mapped(store):
                conn.execute(sql, list((good | change).values()))
        conn.execute(sql, list(good.values()))
        conn.execute(sql.replace("INSERT", "INSERT OR REPLACE"), list((good | {"value": 7.0}).values()))
        assert conn.execute("SELECT value FROM entry WHERE id = ?", ("0" * 20,)).fetchone() == (-1000.5,)


@pytest.mark.parametrize(
    "fields, kind, problem",
    [
        ({"species": (*content().species, WATER)}, InvalidInput, "given to two species"),
        ({"species": (*content().species, replace(WATER, name="ice"))}, InvalidInput, "the same species as 'water'"),
        ({"species": (replace(WATER, name="wa\nter"),)}, InvalidInput, "control character"),
        ({"species": ()}, NotFound, "holds no species 'water'"),
        ({"sources": (BOOK, BOOK)}, InvalidInput, "given to two sources"),
        ({"sources": ()}, NotFound, "holds no source 'book-2001'"),
        ({"statuses": {"x": "fine"}}, InvalidInput, "unknown status 'fine'"),
        ({"policy": {"a": float("nan")}}, InvalidInput, "JSON"),
        ({"species": (replace(WATER, molar_mass=0.0), *content().species[1:])}, InvalidInput, "positive and finite"),
        ({"sources": (replace(BOOK, title=""), REPORT)}, InvalidInput, "needs a title"),
        ({"sources": (replace(BOOK, title="\ud800"), REPORT)}, InvalidInput, "Unicode"),
    ],
)
def test_contents_that_contradict_themselves(
    store: Path, fields: dict[str, Any], kind: type[PropdbError], problem: str
) -> None:
    before = dump(store)
    with pytest.raises(kind, match=problem):
        build(store, content(**fields), versions={})
    assert dump(store) == before


def test_the_id_hashes_what_makes_an_entry_this_one() -> None:
    first = curve(WATER, uncertainty=1.0, uncertainty_kind="standard", temperature=300.0)
    other: dict[str, Any] = {name: "other" for name in HASHED if isinstance(getattr(first, name), str)} | {
        "temperature": 301.0,
        "value": 1.0,
        "tmin": 1.0,
        "tmax": 1e4,
        "uncertainty": 2.0,
        "params": {"a": 1},
    }
    assert other.keys() == set(HASHED)
    ids = {entry_id(replace(first, **{name: value}), WATER) for name, value in other.items()}
    assert len(ids | {first.id}) == len(HASHED) + 1
    assert entry_id(first, replace(WATER, charge=1)) != first.id
    assert entry_id(first, replace(WATER, cas="", inchikey="")) != first.id
    outside = replace(first, id="x", status="draft", note="y", printed=True, carriers=(), species="z")
    assert entry_id(outside, replace(WATER, name="z", synonyms=(), note="w")) == first.id
    assert len(first.id) >= 16
    assert int(first.id, 16) >= 0


def test_progress_is_told(tmp_path: Path) -> None:
    lines: list[str] = []
    build(tmp_path / "s.db", content(), versions={}, progress=lines.append)
    assert lines == ["checking 5 entries", "wrote 5 of 5 entries"]
