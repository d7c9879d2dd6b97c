"""Cross-checks beside the entries: derived rows, written when an entry is, replaced when their origin changes."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable, Mapping, Sequence
from typing import Any, Final, Protocol

from propdb.model.crosscheck import Crosscheck
from propdb.model.records import Entry, Species

__all__ = ["CROSSCHECK_COLUMNS", "Checker", "crosscheck_from", "put_crosschecks", "stale"]

#: Behind the alias ``x``, as :func:`crosscheck_from` reads them.
CROSSCHECK_COLUMNS: Final = "x.compilation, x.temperature, x.value, x.difference, x.allowed, x.independent, x.package"


class Checker(Protocol):
    """What compares an entry with other compilations; see :mod:`propdb.vetting.crosscheck`."""

    @property
    def package(self) -> str:
        """What it reads the numbers from, with its version."""
        ...

    def __call__(self, entry: Entry, species: Species) -> Sequence[Crosscheck]: ...


def crosscheck_from(row: tuple[Any, ...]) -> Crosscheck:
    """A record from :data:`CROSSCHECK_COLUMNS`."""
    compilation, temperature, value, difference, allowed, independent, package = row
    at = None if temperature < 0 else temperature
    return Crosscheck(compilation, at, value, difference, allowed, bool(independent), package)


def put_crosschecks(conn: sqlite3.Connection, found: Iterable[tuple[int, Sequence[Crosscheck]]]) -> None:
    """Replace the cross-checks of entries, given by row number."""
    made = list(found)
    conn.executemany("DELETE FROM crosscheck WHERE entry = ?", _having(conn, [number for number, _ in made]))
    conn.executemany(
        "INSERT INTO crosscheck (entry, compilation, temperature, value, difference, allowed, independent, package)"
        " VALUES (?, ?, ?, ?, ?, ?, ?, ?)",
        (
            (
                number,
                c.compilation,
                -1.0 if c.temperature is None else c.temperature,
                c.value,
                c.difference,
                c.allowed,
                int(c.independent),
                c.package,
            )
            for number, checks in made
            for c in checks
        ),
    )


def _having(conn: sqlite3.Connection, numbers: list[int]) -> list[tuple[int]]:
    """Those of the entries that have cross-checks; few of many do."""
    if len(numbers) < 100:
        return [(number,) for number in numbers]
    having = {number for (number,) in conn.execute("SELECT DISTINCT entry FROM crosscheck")}
    return [(number,) for number in numbers if number in having]


def stale(conn: sqlite3.Connection, package: str) -> bool:
    """Were the cross-checks read from another package or version, or never made?"""
    other = conn.execute("SELECT 1 FROM crosscheck WHERE package <> ? LIMIT 1", (package,)).fetchone()
    return other is not None or conn.execute("SELECT 1 FROM crosscheck LIMIT 1").fetchone() is None


def put_all(conn: sqlite3.Connection, found: Mapping[str, Sequence[Crosscheck]], checker: Checker) -> None:
    """Replace the cross-checks of the entries of a base, ``found`` by entry id, and of all own entries."""
    from propdb.store.read import Reader

    every = dict(found)
    for species, entry in Reader(conn).own_entries():
        if entry.id not in every:
            every[entry.id] = checker(entry, species)
    numbers = dict(conn.execute("SELECT id, num FROM entry"))
    put_crosschecks(conn, ((numbers[key], every[key]) for key in sorted(every)))
