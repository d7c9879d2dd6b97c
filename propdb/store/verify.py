"""Is everything in a store as it was written? Whatever was changed by hand is listed."""

# ruff: noqa: S608 - what is put into SQL texts here are constants of this package; every value is bound
from __future__ import annotations

import json
import re
import sqlite3
from collections.abc import Iterator, Mapping
from contextlib import closing, contextmanager
from dataclasses import dataclass
from typing import Any, Final

from propdb.errors import PropdbError
from propdb.store import log, seal
from propdb.store.content import HASHED, canonical, parts_hash, row_id, source_body, species_body
from propdb.store.open import mapped, path_of

__all__ = ["Problem", "stored_content_hash", "verify"]

#: What a row that was edited by hand may raise when it is read as a record.
_UNREADABLE: Final = (PropdbError, ValueError, KeyError, TypeError, AttributeError, ZeroDivisionError, RecursionError)


@dataclass(frozen=True, slots=True)
class Problem:
    """Something in a store that is not as it was written."""

    where: str
    what: str

    def __str__(self) -> str:
        return f"{self.where}: {self.what}"


def stored_content_hash(conn: sqlite3.Connection, base: int) -> str:
    """The content hash as the rows of the store give it: ``base`` is the seq of the current base event."""
    from propdb.store.rows import sources_of, species_of

    return parts_hash(
        (canonical(species_body(s)) for _, s in species_of(conn, "own = 0 AND active = 1")),
        (canonical(source_body(s)) for s in sources_of(conn, "own = 0 AND active = 1")),
        conn.execute("SELECT name, body FROM datum WHERE own = 0 AND active = 1"),
        conn.execute("SELECT key, value FROM policy WHERE own = 0 AND active = 1"),
        conn.execute(
            "SELECT e.id, b.status, b.note, b.printed FROM base_entry b JOIN entry e ON e.num = b.entry"
            " WHERE b.base = ?",
            (base,),
        ),
    )


def verify(conn: sqlite3.Connection) -> list[Problem]:
    """Everything in the store that is not as it was written; empty when all is well.

    Events edited, missing or out of order; entries whose id no longer matches their fields; species, sources, datums,
    policy and carriers that are not as the last event that wrote any left them; members of a base, and own ones, that
    are not as their event says; a base whose rows do not give its content hash; guards that were taken away or
    changed. What the log proves is its order: compare :func:`~propdb.store.log.head` with one noted elsewhere to know
    that the whole log was not written anew.
    """
    factory = conn.text_factory
    conn.text_factory = _decoded  # texts that are not UTF-8 shall be found, not stumbled over
    try:
        with mapped(path_of(conn)), _one_state(conn):
            found: list[Problem] = []
            for part in (_log, _entries, _parts, _members, _content, _canon, _guards):
                found += part(conn)
            return found
    finally:
        conn.text_factory = factory


@contextmanager
def _one_state(conn: sqlite3.Connection) -> Iterator[None]:
    """Let all that follows see one state of the store, whatever others write meanwhile."""
    if conn.in_transaction:
        yield
        return
    conn.execute("BEGIN")
    try:
        yield
    finally:
        conn.rollback()  # nothing was written


def _decoded(raw: bytes) -> str:
    return raw.decode("utf-8", "surrogateescape")


def _log(conn: sqlite3.Connection) -> Iterator[Problem]:
    prev, expected = "", 1
    for seq, utc, kind, entry, who, comment, payload, status, stated_prev, stated in conn.execute(
        f"SELECT {log._COLUMNS} FROM event ORDER BY seq"
    ):
        where = f"event {seq}"
        if seq != expected:
            missing = f"{expected}" if seq == expected + 1 else f"{expected} to {seq - 1}"
            yield Problem(where, f"the event before it is missing ({missing})")
        elif stated_prev != prev:
            yield Problem(where, "does not carry the hash of the event before it")
        if log.event_hash(stated_prev, seq, utc, kind, entry or "", who, comment, payload, status) != stated:
            yield Problem(where, "was edited: its hash does not match")
        prev, expected = stated, seq + 1
    row = conn.execute("SELECT seq FROM sqlite_sequence WHERE name = 'event'").fetchone()
    last = row[0] if row and isinstance(row[0], int) else 0
    if last >= expected:
        yield Problem("log", f"events {expected} to {last} are missing at the end")
    elif last != expected - 1:
        yield Problem("log", "the number of its last event was changed")


def _entries(conn: sqlite3.Connection) -> Iterator[Problem]:
    columns = ", ".join(f'"{name}"' for name in HASHED)
    for number, identity, *row in conn.execute(f"SELECT id, identity, {columns} FROM entry"):
        try:
            same = row_id(identity, row) == number
        except _UNREADABLE:
            same = False
        if not same:
            yield Problem(f"entry {number}", "was edited: its id does not match its fields")
    for (number,) in conn.execute(
        "SELECT e.id FROM entry e WHERE NOT EXISTS (SELECT 1 FROM base_entry b WHERE b.entry = e.num)"
    ):
        yield Problem(f"entry {number}", "no base holds it and no one created it")


def _parts(conn: sqlite3.Connection) -> Iterator[Problem]:
    last = seal.carried(conn)
    if last is None:  # a store of an older propdb: the next build or own entry will say
        return
    seq, right = last
    now = seal.state(conn)
    for part in sorted(right):
        if part in now and now[part] != right[part]:
            yield Problem(part, f"a row was added, removed or edited: they are not as event {seq} left them")
    for (key,) in conn.execute("SELECT key FROM source_key WHERE key NOT IN (SELECT key FROM source)"):
        yield Problem(f"source {key}", "a key that no source has was added")


def _payloads(conn: sqlite3.Connection, kind: str) -> dict[int, tuple[str, Mapping[str, Any]]]:
    """Seq -> (entry id, facts) of the events of a kind; no facts where they cannot be read."""
    found: dict[int, tuple[str, Mapping[str, Any]]] = {}
    for seq, entry, text in conn.execute("SELECT seq, entry, payload FROM event WHERE kind = ?", (kind,)):
        try:
            facts = json.loads(text)
        except ValueError:
            facts = {}
        found[seq] = (entry or "", facts if isinstance(facts, dict) else {})
    return found


def _members(conn: sqlite3.Connection) -> Iterator[Problem]:
    bases, created = _payloads(conn, "base"), _payloads(conn, "created")
    of_base: dict[int, list[tuple[int, str, str, str, int]]] = {seq: [] for seq in bases}
    of_event: dict[int, list[tuple[int, str, str, str, int]]] = {seq: [] for seq in created}
    for base, own, *row in conn.execute(
        "SELECT b.base, b.own, b.species, coalesce(e.id, ''), b.status, b.note, b.printed"
        " FROM base_entry b LEFT JOIN entry e ON e.num = b.entry"
    ):
        place = (of_base, of_event)[own] if own in (0, 1) else {}
        if base in place:
            place[base].append((row[0], row[1], row[2], row[3], row[4]))
        else:
            yield Problem(f"entry {row[1]}", f"it is a member by event {base}, which made none")
    for seq, (_, facts) in bases.items():
        right = facts.get("members")
        if right is not None and seal.members_hash(of_base[seq]) != right:
            yield Problem(f"base of event {seq}", "its entries, their status, note or species are not as it left them")
    for seq, (entry, facts) in created.items():
        rows = of_event[seq]
        right = facts.get("member")
        if [row[1] for row in rows] != [entry] or (right is not None and seal.member_hash(*rows[0]) != right):
            yield Problem(f"entry {entry}", f"is not as event {seq} created it")


def _content(conn: sqlite3.Connection) -> Iterator[Problem]:
    try:
        base = log.last_base(conn)
        if base is None:
            return
        right = stored_content_hash(conn, base.seq) == base.payload.get("content_hash")
        where = f"base of event {base.seq}"
    except _UNREADABLE:
        right, where = False, "base"
    if not right:
        yield Problem(where, "what the store holds does not give its content hash")


def _canon(conn: sqlite3.Connection) -> Iterator[Problem]:
    """Which row stands for a species follows from the rows."""
    from propdb.store.write import settle_species

    columns = "id, canon, identity, name, own, active"
    rows = conn.execute(f"SELECT {columns} FROM species").fetchall()
    with closing(sqlite3.connect(":memory:", isolation_level=None)) as copy:
        copy.text_factory = _decoded
        copy.execute("CREATE TABLE species (id INTEGER PRIMARY KEY, canon, identity, name, own, active)")
        copy.execute("CREATE INDEX mark ON species (identity)")
        copy.execute("CREATE INDEX named ON species (name)")
        try:
            copy.executemany("INSERT INTO species VALUES (?, ?, ?, ?, ?, ?)", rows)
        except UnicodeEncodeError:  # a text that is not UTF-8, which its part says
            return
        settle_species(copy)
        right = dict(copy.execute("SELECT id, canon FROM species"))
    for number, canon, _, name, *_ in rows:
        if right[number] != canon:
            yield Problem(f"species {name}", "another species stands for it than should")


def _guards(conn: sqlite3.Connection) -> Iterator[Problem]:
    """Triggers as the migrations make them."""
    from propdb.store.migrate import migrations, statements

    made: dict[str, str] = {}
    for _, _, sql in migrations():
        for statement in statements(sql):
            start = re.search(r"^\s*CREATE TRIGGER (\w+)", statement, re.MULTILINE)
            if start:
                made[start[1]] = _words(statement[start.start() :])
    present = dict(conn.execute("SELECT name, sql FROM sqlite_master WHERE type = 'trigger'"))
    for name, text in sorted(made.items()):
        if name not in present:
            yield Problem(f"trigger {name}", "was taken away")
        elif _words(present[name]) != text:
            yield Problem(f"trigger {name}", "was changed")


def _words(sql: str) -> str:
    return " ".join(sql.replace(";", " ; ").split()).rstrip("; ")
