"""Inserting many rows: several in one statement, and without triggers that look at each of them."""

# ruff: noqa: S608 - what is put into SQL texts here are constants of this package; every value is bound
from __future__ import annotations

import sqlite3
from collections.abc import Iterable, Iterator, Sequence
from contextlib import contextmanager
from itertools import chain, islice
from typing import Any, Final

__all__ = ["insert_rows", "without"]

#: Values bound in one statement; SQLite before 3.32 takes 999 at most, and more gains nothing.
_VALUES: Final = 900


def insert_rows(
    conn: sqlite3.Connection, table: str, columns: Sequence[str], rows: Iterable[Sequence[Any]], *, ignore: bool = False
) -> None:
    """Insert rows in their order. ``ignore``: leave out those that are there.

    Several in one statement, because a statement sets its checks up anew each time.
    """
    head = f"INSERT {'OR IGNORE ' if ignore else ''}INTO {table} ({', '.join(columns)}) VALUES "
    marks = f"({', '.join('?' * len(columns))})"
    size = max(1, _VALUES // len(columns))
    several = head + ", ".join([marks] * size)
    todo = iter(rows)
    while len(block := list(islice(todo, size))) == size:
        conn.execute(several, list(chain.from_iterable(block)))
    conn.executemany(head + marks, block)


@contextmanager
def without(conn: sqlite3.Connection, *triggers: str) -> Iterator[None]:
    """Set triggers aside within the transaction that is open: nobody else ever sees the store without them.

    For statements of this package that keep to what the triggers ask for.
    """
    sql = "SELECT sql FROM sqlite_master WHERE type = 'trigger' AND name = ?"
    made = [conn.execute(sql, (name,)).fetchone()[0] for name in triggers]
    if not conn.in_transaction:
        raise RuntimeError("triggers are set aside within a transaction only")
    for name in triggers:
        conn.execute(f"DROP TRIGGER {name}")
    yield
    for text in made:
        conn.execute(text)
