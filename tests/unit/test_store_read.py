"""A reader sees what is there now, fast, and always in the same order."""

from __future__ import annotations

import os
from contextlib import closing
from dataclasses import replace
from pathlib import Path
from types import MappingProxyType

import pytest
from store_samples import BOOK, ETHANOL, REPORT, SEED, SODIUM, WATER, content, curve, entry

from propdb.errors import Ambiguous, NotFound
from propdb.store import log
from propdb.store.open import SCHEMA, open_store
from propdb.store.own import add_own, put_own
from propdb.store.read import Reader
from propdb.store.write import build


@pytest.fixture
def store(tmp_path: Path) -> Path:
    path = tmp_path / "store.db"
    build(path, content(), versions={"propdb": "0"})
    return path


def test_missing_things_are_named(store: Path) -> None:
    with Reader(store) as reader:
        for call, name in (
            (reader.species, "unobtainium"),
            (reader.entries, "unobtainium"),
            (reader.species, "Water"),
            (reader.source, "nowhere"),
            (reader.policy, "nothing"),
            (reader.entry, "ffff"),
            (reader.entry, ""),
            (reader.entry, "'; DROP TABLE entry; --"),
        ):
            with pytest.raises(NotFound) as caught:
                call(name)
            assert repr(name) in str(caught.value)


def test_entry_by_the_beginning_of_its_id(tmp_path: Path) -> None:
    many = tuple(entry(WATER, value=float(i)) for i in range(300))
    build(tmp_path / "s.db", content(entries=many), versions={})
    with Reader(tmp_path / "s.db") as reader:
        for one in many:
            assert reader.entry(one.id).value == one.value
        assert reader.entry(f" {many[0].id[:12].upper()} ").id == many[0].id
        first = [one.id for one in many if one.id[0] == many[0].id[0]]
        with pytest.raises(Ambiguous, match="several entries begin with") as caught:
            reader.entry(many[0].id[0])
        assert set(caught.value.fields["candidates"]) == set(first)
        assert "\n" not in str(caught.value)


def test_order_does_not_depend_on_the_build(tmp_path: Path) -> None:
    entries = content().entries
    build(tmp_path / "a.db", content(), versions={})
    build(tmp_path / "b.db", content(entries=entries[:2]), versions={})
    build(tmp_path / "b.db", content(entries=tuple(reversed(entries))), versions={})
    with Reader(tmp_path / "a.db") as one, Reader(tmp_path / "b.db") as other:
        assert one.entries("water") == other.entries("water")
        assert [e.quantity for e in one.entries("water")] == ["Cp", "Hf", "Hf"]
        assert list(one.every_entry()) == list(other.every_entry())


def test_params_are_read_only_all_the_way_down(tmp_path: Path) -> None:
    nested = curve(WATER, params={"pieces": [{"tmin": 200.0, "c": [1, 2.5]}], "name": "x"})
    build(tmp_path / "s.db", content(entries=(nested,)), versions={})
    with Reader(tmp_path / "s.db") as reader:
        (found,) = reader.entries("water")
        assert found.params == {"pieces": (MappingProxyType({"tmin": 200.0, "c": (1, 2.5)}),), "name": "x"}
        assert isinstance(found.params, MappingProxyType)
        assert isinstance(found.params["pieces"][0], MappingProxyType)


def test_decoded_once(store: Path) -> None:
    with Reader(store) as reader:
        first = reader.entries("water")
        assert reader.entries("water") is first
        with closing(open_store(store, write=True)) as conn:
            log.append(conn, "approved", entry=first[0].id, who="me")
        second = reader.entries("water")
        assert [new is old for new, old in zip(second, first, strict=True)] == [False, True, True]
        assert second[0] == replace(first[0], status="approved", decided=True)
        assert second[0].params is first[0].params


def test_fresh_after_every_kind_of_write(store: Path) -> None:
    with Reader(store) as reader:
        assert reader.source("book-2001").title == BOOK.title
        assert reader.species("water") == WATER
        assert len(reader.entries("water")) == 3
        head = reader.head
        number = add_own(store, entry(WATER, value=7.0), SEED, "me")
        assert len(reader.entries("water")) == 4
        assert reader.head != head
        with closing(open_store(store, write=True)) as conn:
            log.append(conn, "withdrawn", entry=number, who="me")
        assert reader.entry(number).status == "withdrawn"
        put_own(store, sources=(replace(BOOK, title="Mine"),), policy={"x": 1}, datums={"d": {}})
        assert (reader.source("book-2001").title, reader.policy("x"), "d" in reader.datum_rows()) == ("Mine", 1, True)
        before = reader.content_hash
        dry = (replace(WATER, note="dry"), *content().species[1:])
        build(store, content(species=dry, entries=(entry(WATER, note="new"),)), versions={})
        assert reader.species("water").note == "dry"
        assert [e.note for e in reader.entries("water")] == ["new", ""]
        assert reader.content_hash != before


def test_fresh_after_a_write_through_its_own_connection(store: Path) -> None:
    with closing(open_store(store, write=True)) as conn:
        reader = Reader(conn)
        assert len(reader.entries("water")) == 3
        add_own(conn, entry(WATER, value=7.0), SEED, "me")
        assert len(reader.entries("water")) == 4
        reader.close()
        assert len(reader.entries("water")) == 4  # the connection is the caller's


def test_every_entry(store: Path) -> None:
    with Reader(store) as reader:
        found = {species.name: entries for species, entries in reader.every_entry()}
        assert list(found) == ["ethanol", "water"]
        assert found["water"] == reader.entries("water")
        assert reader.entries_of_source(REPORT.key) == tuple(
            e for e in reader.entries("water") if e.source == REPORT.key
        )
        assert reader.entries_of_source("nowhere") == ()


def test_info(store: Path) -> None:
    add_own(store, entry(WATER, value=7.0), SEED, "me")
    build(
        store,
        content(entries=content().entries[:3], statuses={content().entries[0].id: "estimate"}),
        versions={"a": "1"},
    )
    with Reader(store) as reader:
        info = reader.info()
        assert info == {
            "path": str(store),
            "bytes": os.stat(store).st_size,
            "schema": SCHEMA,
            "sqlite": info["sqlite"],
            "content_hash": reader.content_hash,
            "head": reader.head,
            "base": {"seq": 3, "utc": reader.base.utc, "versions": {"a": "1"}},
            "species": 5,
            "sources": 2,
            "datums": 1,
            "events": 3,
            "entries": {"active": 4, "inactive": 2, "own": 1},
            "statuses": {"base": 2, "draft": 1, "estimate": 1},
        }


def test_coverage(tmp_path: Path) -> None:
    path = tmp_path / "s.db"
    through = (
        curve(ETHANOL),
        curve(ETHANOL, phase="l"),
        curve(ETHANOL, phase="cr"),
        entry(ETHANOL, "Hvap", 42.0, phase="l"),
    )
    implied = (curve(WATER), curve(WATER, phase="l"), entry(WATER), entry(WATER, value=-1200.0, phase="l"))
    apart = (curve(SODIUM), curve(SODIUM, phase="l"), entry(SODIUM), entry(SODIUM, phase="l", temperature=400.0))
    base = content(entries=(*through, *implied, *apart, entry(WATER, source=REPORT.key)))
    build(path, base, versions={})
    with Reader(path) as reader:
        found = reader.coverage()
        assert found["species"] == 3
        assert found["paths"] == {"liquid_to_gas": 2, "solid_to_gas": 0}
        row = {"quantity": "Hf", "phase": "g", "source": BOOK.key, "species": 2, "entries": 2}
        assert row in found["coverage"]
        assert sum(row["entries"] for row in found["coverage"]) == len(base.entries)
        assert found["coverage"] == sorted(
            found["coverage"], key=lambda row: (row["quantity"], row["phase"], row["source"])
        )
    fused = (*base.entries, entry(ETHANOL, "Hfus", 5.0, phase="cr", temperature=159.0))
    build(path, content(entries=fused, statuses={implied[0].id: "quarantined"}), versions={})
    with Reader(path) as reader:
        assert reader.coverage()["paths"] == {"liquid_to_gas": 1, "solid_to_gas": 1}
        rows = [reader.coverage(usable=usable)["coverage"] for usable in (True, False)]
        assert [sum(row["entries"] for row in part) for part in rows] == [len(fused) - 1, len(fused)]
