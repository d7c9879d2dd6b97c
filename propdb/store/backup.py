"""Copies of a store, and a look at its health."""

from __future__ import annotations

import os
import sqlite3
import uuid
from contextlib import closing, suppress
from pathlib import Path

from propdb.errors import InvalidInput, StoreError
from propdb.store.open import mapped, open_store
from propdb.store.verify import Problem, verify

__all__ = ["backup", "check"]


def backup(path: str | os.PathLike[str], dest: str | os.PathLike[str]) -> None:
    """Copy everything in a store to a new file, also while others write; the file appears whole or not at all.

    The copy is one file without WAL; it becomes a live store when it is first written.

    Raises
    ------
    StoreError
        ``dest`` exists (``reason`` is ``exists``), or as :func:`~propdb.store.open.open_store`.
    InvalidInput
        ``dest`` cannot be a path.
    StoreBusy, StoreReadOnly
    """
    target = Path(dest)
    if "\0" in str(target):
        raise InvalidInput(f"{str(target)!r} cannot be a path", hint="leave the null character out")
    _refuse_existing(target)
    part = target.with_name(f".{target.name}.{uuid.uuid4().hex[:8]}.part")
    try:
        with closing(open_store(path)) as source, mapped(target):
            with closing(sqlite3.connect(part, isolation_level=None)) as copy:
                source.backup(copy)
                copy.execute("PRAGMA journal_mode = DELETE")
            with part.open("rb+") as file:
                os.fsync(file.fileno())
            _refuse_existing(target)
            os.replace(part, target)
    finally:
        for leftover in (part, Path(f"{part}-journal"), Path(f"{part}-wal"), Path(f"{part}-shm")):
            with suppress(OSError):
                leftover.unlink(missing_ok=True)


def _refuse_existing(target: Path) -> None:
    if os.path.lexists(target):
        raise StoreError(
            "there is a file of that name already", where=f"backup {target}", reason="exists", hint="name a new one"
        )


def check(path: str | os.PathLike[str]) -> list[Problem]:
    """Everything wrong with a store: its pages, its references between rows, its log, its entries; empty when all is
    well.

    Raises
    ------
    StoreError
        It cannot be opened at all.
    """
    found: list[Problem] = []
    with closing(open_store(path)) as conn, mapped(path):
        try:
            found += [Problem("file", row[0]) for row in conn.execute("PRAGMA integrity_check") if row[0] != "ok"]
            for table, row, parent, _ in conn.execute("PRAGMA foreign_key_check"):
                found.append(Problem(f"table {table}", f"row {row} refers to a row of {parent} that is not there"))
            found += verify(conn)
        except sqlite3.DatabaseError as error:
            code: int = getattr(error, "sqlite_errorcode", sqlite3.SQLITE_CORRUPT)
            if code & 0xFF not in (sqlite3.SQLITE_CORRUPT, sqlite3.SQLITE_NOTADB):
                raise
            found.append(Problem("file", f"it is damaged: {error}"))
        except StoreError as error:
            found.append(Problem("file", error.problem))
    return found
