"""Cross-checks in a store: written with the entry, in the same transaction, outside every hash, and made anew."""

from __future__ import annotations

import re
from contextlib import closing
from dataclasses import replace
from pathlib import Path

import pytest
from store_samples import ETHANOL, SEED, WATER, content, entry

from propdb.errors import PropdbError, SeedError
from propdb.intake.lineage import read_lineage
from propdb.model.crosscheck import Crosscheck
from propdb.model.records import Entry, Species
from propdb.store import log
from propdb.store.backup import check
from propdb.store.open import open_store
from propdb.store.own import add_own
from propdb.store.read import Reader
from propdb.store.write import build


class Fake:
    """Says of every entry what is not so."""

    def __init__(self, package: str = "invented 1", value: float = 7.0) -> None:
        self.package = package
        self.value = value
        self.asked: list[str] = []

    def __call__(self, one: Entry, species: Species) -> tuple[Crosscheck, ...]:
        self.asked.append(one.id)
        assert species.name == one.species
        return (
            Crosscheck("near", 298.15, self.value, 1.5, None, True, self.package),
            Crosscheck("kin", None, self.value, -2.5, 2.0, False, self.package),
        )


def rows(path: Path) -> int:
    with closing(open_store(path)) as conn:
        return int(conn.execute("SELECT count(*) FROM crosscheck").fetchone()[0])


def test_they_come_back_with_the_entry(tmp_path: Path) -> None:
    path, fake = tmp_path / "new.db", Fake()
    build(path, content(), versions={}, checker=fake)
    with Reader(path) as reader:
        one = reader.entries("water")[0]
        assert one.crosschecks == fake(one, reader.species("water"))  # 298.15 K and no temperature at all
        assert [c.relation("kin") for c in one.crosschecks] == ["independent", "same publication"]
        assert [c.beyond for c in one.crosschecks] == [False, True]
        assert {e.id: e.crosschecks for _, entries in reader.every_entry() for e in entries}[one.id] == one.crosschecks
    assert check(path) == []


def test_they_are_no_part_of_any_hash(tmp_path: Path) -> None:
    plain = build(tmp_path / "plain.db", content(), versions={})
    checked = build(tmp_path / "checked.db", content(), versions={}, checker=Fake())
    assert plain.content_hash == checked.content_hash
    with Reader(tmp_path / "plain.db") as one, Reader(tmp_path / "checked.db") as other:
        ids = {e.id for _, entries in one.every_entry() for e in entries}
        assert ids == {e.id for _, entries in other.every_entry() for e in entries}


def test_another_version_makes_them_anew_and_nothing_else(tmp_path: Path) -> None:
    path = tmp_path / "new.db"
    build(path, content(), versions={}, checker=Fake())
    own = add_own(path, entry(WATER, value=12.0), SEED, "me", checker=Fake())
    before = rows(path)
    with Reader(path) as reader:
        head = reader.head
    idle = Fake(value=9.0)
    assert not build(path, content(), versions={}, checker=idle).changed
    with Reader(path) as reader:
        assert reader.entry(own).crosschecks[0].value == 7.0  # of the same version: left alone
    newer = Fake("invented 2", 9.0)
    assert not build(path, content(), versions={}, checker=newer).changed
    with Reader(path) as reader:
        assert reader.head == head
        for _, entries in reader.every_entry():
            assert {(c.package, c.value) for e in entries for c in e.crosschecks} == {("invented 2", 9.0)}
        assert reader.entry(own).crosschecks  # own entries too
    assert rows(path) == before


def test_a_store_built_without_them_gets_them(tmp_path: Path) -> None:
    path = tmp_path / "new.db"
    build(path, content(), versions={})
    assert rows(path) == 0
    build(path, content(), versions={}, checker=Fake())
    assert rows(path) > 0


def test_one_transaction_with_the_entry(tmp_path: Path) -> None:
    """What the store refuses of a check takes the entry with it."""
    path = tmp_path / "new.db"
    build(path, content(), versions={})

    class Endless(Fake):
        def __call__(self, one: Entry, species: Species) -> tuple[Crosscheck, ...]:
            return (Crosscheck("near", 298.15, float("inf"), 0.0, None, True, self.package),)

    with pytest.raises(PropdbError):
        add_own(path, entry(ETHANOL, value=12.0), SEED, "me", checker=Endless())
    with pytest.raises(PropdbError):
        build(path, content(policy={"x": 1}), versions={}, checker=Endless())
    with Reader(path) as reader:
        assert all(e.value != 12.0 for e in reader.entries("ethanol"))
        assert "x" not in reader.policies()
    assert rows(path) == 0


def test_a_persons_word_is_told_from_the_bases(tmp_path: Path) -> None:
    path = tmp_path / "new.db"
    first = entry(WATER)
    build(path, content(statuses={first.id: "disputed"}), versions={})
    with Reader(path) as reader:
        one = reader.entry(first.id)
        assert (one.status, one.decided) == ("disputed", False)
        with closing(open_store(path, write=True)) as conn:
            log.append(conn, "disputed", entry=first.id, who="me")
        said = reader.entry(first.id)
        assert (said.status, said.decided) == ("disputed", True)
        assert said == replace(one, decided=True)


GOOD = """\
[[compilation]]
key = "gases"
title = "Gases"
decides = true
reason = "measured"
copies = [{ of = "book-1990", evidence = "equal" }]
[[copies]]
source = "book-1990"
of = "gases"
evidence = "and back"
[[limit]]
quantities = ["Hf"]
standard = 2000.0
reason = "2 kJ/mol"
[[form]]
species = "water"
form = "ice II"
cas = ""
"""


def test_lineage_file(tmp_path: Path) -> None:
    assert read_lineage(tmp_path / "none.toml", sources=(), species=()) == {}
    file = tmp_path / "lineage.toml"
    file.write_text(GOOD, encoding="utf-8")
    data = read_lineage(file, sources={"book-1990"}, species={"water"})
    assert [row["key"] for row in data["compilation"]] == ["gases"]


@pytest.mark.parametrize(
    "old, new, complaint",
    [
        ('title = "Gases"\n', "", r"lineage.toml: compilation 1: title is missing"),
        ("[[limit]]", "[[limits]]", r"unknown table 'limits'.*limit"),
        ("decides = true", "decides = true\ndecide = true", r"unknown key 'decide'.*decides"),
        ('"Hf"', '"HF"', r"limit 1: unknown quantity 'HF'"),
        ("standard = 2000.0\n", "", r"limit 1: give standard or percent"),
        ('of = "gases"', 'of = "gasses"', r"copies of book-1990: 'gasses' is neither a compilation nor a source"),
        (', evidence = "equal"', "", r"compilation gases: evidence is missing"),
        ('species = "water"', 'species = "watr"', r"form 1: unknown species 'watr'"),
        ("[[copies]]", GOOD.split("[[copies]]")[0] + "[[copies]]", r"two compilations have one key"),
    ],
)
def test_a_wrong_lineage_file_is_refused_with_its_place(tmp_path: Path, old: str, new: str, complaint: str) -> None:
    assert old in GOOD
    file = tmp_path / "lineage.toml"
    file.write_text(GOOD.replace(old, new, 1), encoding="utf-8")
    with pytest.raises(SeedError) as caught:
        read_lineage(file, sources={"book-1990"}, species={"water"})

    assert re.search(complaint, str(caught.value), re.DOTALL), str(caught.value)
