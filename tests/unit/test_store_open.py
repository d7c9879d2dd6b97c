"""Files that are no store, or not one that can be used, give one clear error."""

from __future__ import annotations

import os
import shutil
import sqlite3
import subprocess
import sys
from contextlib import closing
from pathlib import Path

import pytest
from store_samples import SEED, WATER, content, entry

from propdb.errors import IntegrityError, InvalidInput, StoreBusy, StoreError, StoreReadOnly
from propdb.store import log, migrate
from propdb.store.backup import check
from propdb.store.open import APPLICATION_ID, SCHEMA, default_path, mapped, open_store
from propdb.store.own import add_own
from propdb.store.read import Reader
from propdb.store.write import build


@pytest.fixture
def store(tmp_path: Path) -> Path:
    path = tmp_path / "a store.db"
    build(path, content(), versions={"propdb": "0"})
    return path


def refused(path: Path, *, write: bool = False) -> StoreError:
    with pytest.raises(StoreError) as caught:
        open_store(path, write=write).close()
    text = str(caught.value)
    assert str(path) in text
    assert "\n" not in text
    return caught.value


def test_the_number_of_the_schema_is_that_of_the_last_migration() -> None:
    numbers = [number for number, _, _ in migrate.migrations()]
    assert numbers == list(range(1, SCHEMA + 1))


def test_header_of_a_store(store: Path) -> None:
    with closing(open_store(store)) as conn:
        assert conn.execute("PRAGMA application_id").fetchone() == (APPLICATION_ID,)
        assert conn.execute("PRAGMA user_version").fetchone() == (SCHEMA,)
        assert conn.execute("PRAGMA journal_mode").fetchone() == ("wal",)
        assert conn.execute("PRAGMA foreign_keys").fetchone() == (1,)
        assert conn.execute("SELECT number, name FROM migration").fetchall() == [
            (number, name) for number, name, _ in migrate.migrations()
        ]
        tables = conn.execute(
            "SELECT name FROM pragma_table_list WHERE type = 'table' AND strict = 0 AND schema = 'main'"
        )
        assert {name for (name,) in tables} <= {"sqlite_schema", "sqlite_sequence", "sqlite_stat1", "sqlite_stat4"}


@pytest.mark.parametrize("write", [False, True])
def test_missing(tmp_path: Path, write: bool) -> None:
    error = refused(tmp_path / "none.db", write=write)
    assert error.fields["reason"] == "missing"
    assert "propdb store rebuild --store" in str(error)
    assert not list(tmp_path.iterdir())


def test_below_a_file(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("text")
    assert refused(tmp_path / "file" / "x.db").fields["reason"] == "missing"
    with pytest.raises(StoreError, match="file"):
        build(tmp_path / "file" / "x.db", content(), versions={})


def test_directory(tmp_path: Path) -> None:
    assert "is a directory" in str(refused(tmp_path))


@pytest.mark.parametrize("text", ["x", "not a database at all\n" * 200, "SQLite format 2" * 100])
@pytest.mark.parametrize("write", [False, True])
def test_not_sqlite(tmp_path: Path, text: str, write: bool) -> None:
    path = tmp_path / "notes.txt"
    path.write_text(text)
    assert refused(path, write=write).fields["reason"] == "not-sqlite"
    with pytest.raises(StoreError, match="not an SQLite file"):
        build(path, content(), versions={})
    assert path.read_text() == text


def test_empty_file_is_not_read_but_may_be_built(tmp_path: Path) -> None:
    path = tmp_path / "empty.db"
    path.touch()
    assert refused(path).fields["reason"] == "empty"
    assert build(path, content(), versions={}).changed


def test_a_store_without_a_base_holds_nothing_to_read(tmp_path: Path) -> None:
    path = tmp_path / "unbuilt.db"
    open_store(path, write=True, create=True).close()
    with pytest.raises(StoreError, match=r"holds no data yet.*propdb store rebuild") as caught:
        Reader(path)
    assert caught.value.fields["reason"] == "empty"


@pytest.mark.parametrize("write", [False, True])
def test_file_of_another_program(tmp_path: Path, write: bool) -> None:
    path = tmp_path / "other.db"
    with closing(sqlite3.connect(path)) as conn:
        conn.execute("CREATE TABLE place (name TEXT)")
        conn.commit()
    assert refused(path, write=write).fields["reason"] == "other-application"
    with pytest.raises(StoreError, match="another program"):
        build(path, content(), versions={})
    with closing(sqlite3.connect(path)) as conn:
        assert conn.execute("SELECT name FROM sqlite_master").fetchall() == [("place",)]


@pytest.mark.parametrize("write", [False, True])
def test_newer_schema(store: Path, write: bool) -> None:
    with closing(sqlite3.connect(store)) as conn:
        conn.execute(f"PRAGMA user_version = {SCHEMA + 1}")
    error = refused(store, write=write)
    assert error.fields["reason"] == "newer-schema"
    assert f"number {SCHEMA + 1}" in str(error)
    assert "newer propdb" in str(error)


@pytest.mark.parametrize("keep", [100, 600, 4096, 0.5, -1])
def test_truncated(store: Path, keep: float) -> None:
    whole = store.read_bytes()
    cut = int(len(whole) * keep) if isinstance(keep, float) else keep if keep > 0 else len(whole) + keep
    store.write_bytes(whole[:cut])
    error = refused(store)
    assert error.fields["reason"] == "damaged"
    assert "backup" in str(error)


def test_damaged_inside(store: Path) -> None:
    whole = bytearray(store.read_bytes())
    for at in range(4096, len(whole), 4096):
        whole[at : at + 64] = b"\xff" * 64
    store.write_bytes(whole)
    with pytest.raises(StoreError, match="damaged"), Reader(store) as reader:
        reader.entries("water")


def test_every_name_of_a_file_can_be_opened(tmp_path: Path) -> None:
    for name in ("a b.db", "50%.db", "q?mode=ro.db", "h#ash.db", "ümlaut.db"):
        path = tmp_path / name
        build(path, content(), versions={})
        with Reader(path) as reader:
            assert reader.species("water") == WATER
    assert {p.name for p in tmp_path.iterdir() if p.suffix == ".db"} == {
        "a b.db",
        "50%.db",
        "q?mode=ro.db",
        "h#ash.db",
        "ümlaut.db",
    }


NEXT = (SCHEMA + 1, "more", "CREATE TABLE more (x INTEGER); -- a comment\nINSERT INTO more VALUES (1);\n")
BAD = (
    SCHEMA + 1,
    "bad",
    "CREATE TABLE bad (x INTEGER);\nINSERT INTO bad VALUES (1);\nINSERT INTO nowhere VALUES (1);\n",
)


@pytest.fixture
def next_schema(monkeypatch: pytest.MonkeyPatch) -> list[tuple[int, str, str]]:
    """propdb as it will be with one more migration, which is put into the list."""
    found = migrate.migrations()
    monkeypatch.setattr(migrate, "migrations", lambda: found)
    for module in ("open", "migrate"):
        monkeypatch.setattr(f"propdb.store.{module}.SCHEMA", SCHEMA + 1)
    return found


def test_an_older_schema_is_brought_up_when_written(store: Path, next_schema: list[tuple[int, str, str]]) -> None:
    next_schema.append(NEXT)
    error = refused(store)
    assert error.fields["reason"] == "older-schema"
    assert "own data and the log are kept" in str(error)
    for _ in range(2):
        with closing(open_store(store, write=True)) as conn:
            assert conn.execute("PRAGMA user_version").fetchone() == (SCHEMA + 1,)
            assert conn.execute("SELECT x FROM more").fetchall() == [(1,)]
            assert conn.execute("SELECT number, name FROM migration").fetchall()[-1] == NEXT[:2]
    with Reader(store) as reader:
        assert len(reader.entries("water")) == 3


def test_a_migration_that_fails_leaves_nothing(store: Path, next_schema: list[tuple[int, str, str]]) -> None:
    next_schema.append(BAD)
    with pytest.raises(StoreError, match="nowhere"):
        open_store(store, write=True)
    with closing(sqlite3.connect(store)) as conn:
        assert conn.execute("PRAGMA user_version").fetchone() == (SCHEMA,)
        assert conn.execute("SELECT name FROM sqlite_master WHERE name = 'bad'").fetchall() == []
        assert conn.execute("SELECT number FROM migration").fetchall() == [(number,) for number in range(1, SCHEMA + 1)]


def test_a_first_migration_that_fails_leaves_an_empty_file(
    tmp_path: Path, next_schema: list[tuple[int, str, str]]
) -> None:
    next_schema[:] = [(1, "bad", BAD[2])]
    with pytest.raises(StoreError, match="nowhere"):
        open_store(tmp_path / "new.db", write=True, create=True)
    assert refused(tmp_path / "new.db").fields["reason"] == "empty"


def test_a_store_of_the_first_schema_keeps_everything(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "first.db"
    with monkeypatch.context() as patch:
        for module in ("open", "migrate"):
            patch.setattr(f"propdb.store.{module}.SCHEMA", 1)
        patch.setattr(Reader, "_crosschecks", lambda *_: {})  # a table of the third schema
        build(path, content(), versions={"propdb": "0"})
        own = entry(WATER, value=1.0)
        add_own(path, own, entry(WATER).carriers[0], "me")
        with closing(open_store(path, write=True)) as conn:
            log.append(conn, "checked", entry=own.id, who="someone else")
        with Reader(path) as reader:
            events, entries, head = reader.events(), list(reader.every_entry()), reader.head
    assert refused(path).fields["reason"] == "older-schema"
    open_store(path, write=True).close()
    assert check(path) == []
    with Reader(path) as reader:
        assert (reader.events(), list(reader.every_entry()), reader.head) == (events, entries, head)
    with closing(open_store(path, write=True)) as conn:
        for sql in ("UPDATE entry SET value = 0", "DELETE FROM event", "INSERT INTO event SELECT * FROM event"):
            with pytest.raises(IntegrityError), mapped(path):
                conn.execute(sql)
        with pytest.raises(InvalidInput, match="FOREIGN KEY"), mapped(path):
            conn.execute("INSERT INTO carrier VALUES (999, '', '', '', 0, '')")
        log.append(conn, "rejected", entry=own.id, who="someone else", comment="a slip of the pen")
    add_own(path, entry(WATER, "H", value=None, equation="table", params={"T": [300.0]}), SEED, "me")
    assert check(path) == []


def test_a_path_that_cannot_be_one() -> None:
    with pytest.raises(InvalidInput):
        open_store("nul\0.db")


def test_reading_does_not_write(store: Path) -> None:
    with closing(open_store(store)) as conn, pytest.raises(StoreReadOnly), mapped(store):
        conn.execute("DELETE FROM carrier")
    with Reader(store) as reader, pytest.raises(StoreReadOnly):
        add_own(reader.conn, entry(WATER, value=1.0), entry(WATER).carriers[0], "me")


def test_busy_writer(store: Path) -> None:
    with (
        closing(open_store(store, write=True)) as first,
        closing(open_store(store, write=True, timeout=0.05)) as second,
    ):
        first.execute("BEGIN IMMEDIATE")
        with pytest.raises(StoreBusy, match="another process is writing"):
            add_own(second, entry(WATER, value=1.0), entry(WATER).carriers[0], "me")
        with pytest.raises(StoreBusy):
            build(store, content(policy={}), versions={}, timeout=0.05)
        with Reader(store) as reader:  # readers do not wait
            assert len(reader.entries("water")) == 3
        first.execute("ROLLBACK")


def test_full_disk(store: Path) -> None:
    with closing(open_store(store, write=True)) as conn:
        pages = conn.execute("PRAGMA page_count").fetchone()[0]
        conn.execute(f"PRAGMA max_page_count = {pages}")
        conn.execute("CREATE TEMP TABLE big AS SELECT zeroblob(1000000) AS x")
        with pytest.raises(StoreError, match="disk is full") as caught, mapped(store):
            conn.execute("INSERT INTO policy SELECT hex(x), 1, 1, '1' FROM big")
        assert caught.value.fields["reason"] == "full"


def test_closed_connection(store: Path) -> None:
    reader = Reader(store)
    reader.close()
    with pytest.raises(StoreError):
        reader.entries("water")


def test_guards_are_translated(store: Path) -> None:
    with closing(open_store(store, write=True)) as conn:
        for sql in (
            "UPDATE entry SET value = 0",
            "DELETE FROM entry",
            "UPDATE event SET who = 'x'",
            "DELETE FROM event",
        ):
            with pytest.raises(IntegrityError, match="never"), mapped(store):
                conn.execute(sql)
        with pytest.raises(InvalidInput, match="a species needs a name"), mapped(store):
            conn.execute("UPDATE species SET name = ''")


def test_default_path(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.setenv("PROPDB_STORE", str(tmp_path / "mine.db"))
    assert default_path() == tmp_path / "mine.db"
    monkeypatch.delenv("PROPDB_STORE")
    assert default_path().name == "propdb.db"
    assert default_path().is_absolute()


def test_reading_imports_nothing_heavy(store: Path) -> None:
    code = (
        "import sys; from propdb.store.read import Reader; from propdb.store.search import find, resolve\n"
        f"with Reader({str(store)!r}) as r: r.entries(resolve(r, 'steam').name); find(r, 'eth')\n"
        "heavy = {'numpy', 'pandas', 'sqlite_utils', 'scipy', 'rapidfuzz', 'click', 'platformdirs', 'chemicals'}\n"
        "print(sorted(heavy & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def as_someone(code: str, *arguments: str) -> str:
    """Run code as a user whom permissions bind: the superuser becomes another one, once everything is imported."""
    first = (
        "import os, sys, uuid, sqlite3, importlib.resources\n"
        "import propdb.store.migrate, propdb.store.log, propdb.store.rows, propdb.store.read\n"
        "from propdb.store.read import Reader\n"
        "propdb.store.migrate.migrations()\n"
        "from pathlib import Path; Path('x').absolute().as_uri()\n"
        "if os.geteuid() == 0: os.setgid(65534); os.setuid(65534)\n"
    )
    done = subprocess.run([sys.executable, "-c", first + code, *arguments], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    return done.stdout.strip()


READ = """
with Reader(sys.argv[1]) as reader:
    print(len(reader.entries("water")))
"""
WRITE = """
from propdb.errors import PropdbError
from propdb.store.log import append
from propdb.store.open import open_store
try:
    append(open_store(sys.argv[1], write=True), "checked", entry=sys.argv[2], who="me")
except PropdbError as error:
    print(type(error).__name__, error)
"""
CREATE = """
from propdb.errors import PropdbError
from propdb.store.open import open_store
try:
    open_store(sys.argv[1], write=True, create=True)
except PropdbError as error:
    print(type(error).__name__, error)
"""


@pytest.mark.skipif(not hasattr(os, "geteuid"), reason="permissions are those of POSIX")
def test_read_only_directory() -> None:
    import tempfile

    directory = Path(tempfile.mkdtemp())
    try:
        path = directory / "store.db"
        build(path, content(), versions={})
        path.chmod(0o444)
        directory.chmod(0o555)
        assert as_someone(READ, str(path)) == "3"
        with Reader(path) as reader:
            number = reader.entries("water")[0].id
        for name in ("store.db-wal", "store.db-shm"):
            (directory / name).unlink(missing_ok=True)
        assert as_someone(WRITE, str(path), number).startswith("StoreReadOnly store")
        assert as_someone(CREATE, str(directory / "new.db")).startswith("StoreReadOnly store")
        (directory / "store.db-wal").write_bytes(b"x" * 100)
        (directory / "store.db-wal").chmod(0o444)
        with pytest.raises(AssertionError, match="copy it together with"):
            as_someone(READ, str(path))
    finally:
        directory.chmod(0o755)
        shutil.rmtree(directory)
