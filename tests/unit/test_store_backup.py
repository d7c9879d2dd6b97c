"""A backup holds everything, and appears whole or not at all."""

from __future__ import annotations

from contextlib import closing
from pathlib import Path

import pytest
from store_samples import SEED, WATER, content, entry

from propdb.errors import StoreError
from propdb.store import backup as module
from propdb.store import log
from propdb.store.backup import backup, check
from propdb.store.open import open_store
from propdb.store.own import add_own
from propdb.store.read import Reader
from propdb.store.write import build


@pytest.fixture
def store(tmp_path: Path) -> Path:
    path = tmp_path / "store.db"
    build(path, content(), versions={})
    return path


def test_everything_is_in_it(store: Path, tmp_path: Path) -> None:
    dest = tmp_path / "copy.db"
    with closing(open_store(store, write=True)) as conn:  # also what still lies in the WAL of another process
        number = add_own(conn, entry(WATER, value=7.0), SEED, "me")
        log.append(conn, "approved", entry=number, who="me")
        backup(store, dest)
        assert {p.name for p in tmp_path.iterdir() if p.name.startswith((".", "copy"))} == {"copy.db"}
    with Reader(store) as one, Reader(dest) as other:
        assert list(one.every_entry()) == list(other.every_entry())
        assert one.events() == other.events()
        assert other.entry(number).status == "approved"
    assert check(dest) == []
    add_own(dest, entry(WATER, value=8.0), SEED, "me")
    assert build(dest, content(policy={}), versions={}).changed
    assert check(dest) == []


def test_nothing_is_overwritten(store: Path, tmp_path: Path) -> None:
    dest = tmp_path / "notes.txt"
    dest.write_text("mine")
    with pytest.raises(StoreError, match="a file of that name already") as caught:
        backup(store, dest)
    assert caught.value.fields["reason"] == "exists"
    assert dest.read_text() == "mine"
    with pytest.raises(StoreError, match="already"):
        backup(store, store)


def test_nothing_half_written(store: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    before = sorted(tmp_path.iterdir())
    with pytest.raises(StoreError, match="no such file"):
        backup(tmp_path / "none.db", tmp_path / "copy.db")
    with pytest.raises(StoreError):
        backup(store, tmp_path / "nowhere" / "copy.db")

    def fails(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(module.os, "replace", fails)
    with pytest.raises(StoreError, match="No space left"):
        backup(store, tmp_path / "copy.db")
    assert sorted(p for p in tmp_path.iterdir() if not p.name.endswith(("-wal", "-shm"))) == before


def test_check_finds_damaged_pages_and_lost_rows(store: Path) -> None:
    assert check(store) == []
    with closing(open_store(store, write=True)) as conn:
        conn.execute("PRAGMA foreign_keys = OFF")
        conn.execute("DELETE FROM source_key")
        page = conn.execute("SELECT rootpage FROM sqlite_master WHERE name = 'sqlite_autoindex_entry_1'").fetchone()[0]
    assert any("refers to a row of source_key" in str(problem) for problem in check(store))
    with store.open("rb+") as file:
        file.seek((page - 1) * 4096)
        file.write(b"\x55" * 4096)
    assert any(problem.where == "file" for problem in check(store))
