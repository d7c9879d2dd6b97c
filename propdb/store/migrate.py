"""Numbered SQL migrations, each in one transaction together with its own record."""

from __future__ import annotations

import contextlib
import os
import sqlite3
import time
from collections.abc import Iterator
from datetime import UTC, datetime
from hashlib import sha256
from importlib.resources import files

from propdb.store.open import APPLICATION_ID, SCHEMA, check_schema

__all__ = ["immediate", "migrate", "migrations", "use_wal"]


@contextlib.contextmanager
def immediate(conn: sqlite3.Connection) -> Iterator[None]:
    """One IMMEDIATE transaction: the write lock is taken at the start, not at the first write. Joins an open one."""
    joined = conn.in_transaction
    if joined:
        yield
        return
    conn.execute("BEGIN IMMEDIATE")
    try:
        yield
        conn.execute("COMMIT")
    except BaseException:
        if conn.in_transaction:
            conn.execute("ROLLBACK")
        raise


def migrations() -> list[tuple[int, str, str]]:
    """(number, name, SQL) of each migration, ascending."""
    found = []
    for file in files("propdb.store").joinpath("schema").iterdir():
        number, _, name = file.name.removesuffix(".sql").partition("_")
        if file.name.endswith(".sql") and number.isdigit():
            found.append((int(number), name, file.read_text(encoding="utf-8")))
    return sorted(found)


def statements(sql: str) -> Iterator[str]:
    """The statements of a script, each ending its line: ``executescript`` would commit the transaction they share."""
    buffer = ""
    for line in sql.splitlines(keepends=True):
        buffer += line
        if sqlite3.complete_statement(buffer):
            yield buffer
            buffer = ""
    if buffer.strip() and not all(not part.strip() or part.lstrip().startswith("--") for part in buffer.splitlines()):
        yield buffer


def utc_now() -> str:
    """Now, as text of fixed width, so that texts compare like times."""
    return datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%S.%fZ")


def migrate(conn: sqlite3.Connection, path: str | os.PathLike[str]) -> int:
    """Bring a store up to :data:`SCHEMA`; the number it had. Safe when another process does the same."""
    start: int | None = None
    for number, name, sql in migrations():
        if number > SCHEMA:
            break
        with immediate(conn):
            current = check_schema(conn, path, write=True)  # again, now that no one else can change it
            start = current if start is None else start
            if number <= current:
                continue
            for statement in statements(sql):
                conn.execute(statement)
            conn.execute(
                "INSERT INTO migration (number, name, sha256, applied) VALUES (?, ?, ?, ?)",
                (number, name, sha256(sql.encode()).hexdigest(), utc_now()),
            )
            conn.execute(f"PRAGMA application_id = {APPLICATION_ID:d}")
            conn.execute(f"PRAGMA user_version = {number:d}")
    return start or 0


def use_wal(conn: sqlite3.Connection, timeout: float) -> None:
    """Switch to WAL, which a kill at any point cannot harm and readers do not wait for.

    The switch needs the file alone and SQLite does not wait for it, so waiting is done here. Where the file system has
    no shared memory SQLite keeps its rollback journal, which is as safe.
    """
    if conn.execute("PRAGMA journal_mode").fetchone()[0] == "wal":
        return
    deadline = time.monotonic() + timeout
    while True:
        try:
            conn.execute("PRAGMA journal_mode = WAL")
            return
        except sqlite3.OperationalError as error:
            code: int = error.sqlite_errorcode & 0xFF
            if code not in (sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED) or time.monotonic() > deadline:
                raise
            time.sleep(0.02)
