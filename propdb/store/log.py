"""The log: append-only events, each carrying the hash of the one before."""

# ruff: noqa: S608 - what is put into SQL texts here are constants of this package; every value is bound
from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from hashlib import sha256
from types import MappingProxyType
from typing import Any, Final

from propdb.errors import InvalidInput, NotFound
from propdb.model.records import STATUSES
from propdb.store.content import HASHED, canonical, parts_hash, row_id, source_body, species_body
from propdb.store.open import mapped, path_of

__all__ = [
    "KINDS",
    "Event",
    "Problem",
    "append",
    "events",
    "head",
    "last_base",
    "seq_at",
    "stored_content_hash",
    "verify",
]

#: Kind of event to the status that it gives its entry; "" changes nothing.
KINDS: Final[Mapping[str, str]] = MappingProxyType(
    {
        "created": "",  # an own entry is a draft until another event
        "checked": "checked",
        "approved": "approved",
        "disputed": "disputed",
        "quarantined": "quarantined",
        "superseded": "superseded",
        "withdrawn": "withdrawn",
        "waived": "",  # a finding is waived, not the entry, unless a status is given
        "base": "",
    }
)
_COLUMNS: Final = "seq, utc, kind, entry, who, comment, payload, status, prev, hash"
_TRIGGERS: Final = frozenset(
    "entry_fixed entry_kept entry_once event_fixed event_kept event_next"
    " base_entry_fixed base_entry_kept base_entry_once".split()
)


@dataclass(frozen=True, slots=True)
class Event:
    """One line of the log. ``hash`` covers every other field; ``prev`` is that of the one before, "" for the first."""

    seq: int
    utc: str  # ISO 8601, UTC, microseconds
    kind: str
    entry: str  # entry id; "" for a base
    who: str
    comment: str
    payload: Mapping[str, Any]
    status: str  # what the event makes of the entry; "" where it changes nothing
    prev: str
    hash: str


@dataclass(frozen=True, slots=True)
class Problem:
    """Something in a store that is not as it was written."""

    where: str
    what: str

    def __str__(self) -> str:
        return f"{self.where}: {self.what}"


def _event(row: tuple[Any, ...]) -> Event:
    seq, utc, kind, entry, who, comment, payload, status, prev, own = row
    return Event(seq, utc, kind, entry or "", who, comment, MappingProxyType(json.loads(payload)), status, prev, own)


def _event_hash(
    prev: str, seq: int, utc: str, kind: str, entry: str, who: str, comment: str, payload: str, status: str
) -> str:
    return sha256(f"{prev}\n{canonical([seq, utc, kind, entry, who, comment, payload, status])}".encode()).hexdigest()


def append(
    conn: sqlite3.Connection,
    kind: str,
    *,
    entry: str = "",
    who: str,
    comment: str = "",
    payload: Mapping[str, Any] | None = None,
    status: str = "",
) -> Event:
    """Append one event, in the open transaction or in one of its own.

    Parameters
    ----------
    conn : sqlite3.Connection
        Opened for writing.
    kind : str
        One of :data:`KINDS`.
    entry : str
        Entry id; "" for a base and only for it.
    who : str
        Who says so.
    comment : str
    payload : mapping, optional
        Further facts, as JSON could hold them.
    status : str
        With ``waived``: the status that the entry has from now on. Other kinds give their own.

    Raises
    ------
    InvalidInput, NotFound, StoreError
    """
    from propdb.store.migrate import immediate, utc_now

    if kind not in KINDS:
        raise InvalidInput(f"unknown kind of event {kind!r}", hint=f"one of {' '.join(KINDS)}")
    if not who.strip():
        raise InvalidInput("an event needs a name behind it", where=f"event {kind}", hint="say who decides")
    if (kind == "base") != (not entry):
        raise InvalidInput("a base event has no entry, every other event has one", where=f"event {kind}")
    if status and (kind != "waived" or status not in STATUSES):
        raise InvalidInput(f"the status {status!r} cannot be given by an event {kind!r}", where=f"event {kind}")
    status = status or KINDS[kind]
    text = canonical(payload or {})
    with mapped(path_of(conn)), immediate(conn):
        if entry and conn.execute("SELECT 1 FROM entry WHERE id = ?", (entry,)).fetchone() is None:
            raise NotFound(f"no entry {entry!r}", where=f"event {kind}", hint="give the whole id")
        last = conn.execute("SELECT seq, utc, hash FROM event ORDER BY seq DESC LIMIT 1").fetchone()
        seq, prev = (last[0] + 1, last[2]) if last else (1, "")
        utc = max(utc_now(), last[1]) if last else utc_now()  # a clock set back does not turn the order of events
        own = _event_hash(prev, seq, utc, kind, entry, who, comment, text, status)
        row = (seq, utc, kind, entry or None, who, comment, text, status, prev, own)
        conn.execute(f"INSERT INTO event ({_COLUMNS}) VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)", row)
    return _event(row)


def events(conn: sqlite3.Connection, entry: str | None = None, *, limit: int | None = None) -> tuple[Event, ...]:
    """The events in order, of one entry (whole id) or all; with ``limit`` those up to that seq."""
    sql = f"SELECT {_COLUMNS} FROM event WHERE seq <= ?"
    values: tuple[Any, ...] = (limit if limit is not None else 2**62,)
    if entry is not None:
        sql, values = f"{sql} AND entry = ?", (*values, entry)
    with mapped(path_of(conn)):
        return tuple(_event(row) for row in conn.execute(f"{sql} ORDER BY seq", values))


def head(conn: sqlite3.Connection) -> str:
    """Hash of the last event; "" where there is none."""
    with mapped(path_of(conn)):
        row = conn.execute("SELECT hash FROM event ORDER BY seq DESC LIMIT 1").fetchone()
    return row[0] if row else ""


def last_base(conn: sqlite3.Connection, limit: int | None = None) -> Event | None:
    """The last base event (up to a seq); its payload holds ``content_hash`` and ``versions``."""
    row = conn.execute(
        f"SELECT {_COLUMNS} FROM event WHERE kind = 'base' AND seq <= ? ORDER BY seq DESC LIMIT 1",
        (limit if limit is not None else 2**62,),
    ).fetchone()
    return _event(row) if row else None


def _until(as_of: str | date | datetime) -> str:
    """The first instant that no longer counts, as the log writes it. A date counts to its end, a datetime is in."""
    value: date | datetime
    if isinstance(as_of, str):
        try:
            value = date.fromisoformat(as_of) if len(as_of.strip()) <= 10 else datetime.fromisoformat(as_of.strip())
        except ValueError:
            raise InvalidInput(
                f"{as_of!r} is not a date",
                hint="write an ISO date or time in UTC, e.g. 2025-03-31 or 2025-03-31T12:00:00Z",
            ) from None
    else:
        value = as_of
    try:
        if isinstance(value, datetime):
            aware = value.replace(tzinfo=UTC) if value.tzinfo is None else value.astimezone(UTC)
            last = aware + timedelta(microseconds=1)
        else:
            last = datetime(value.year, value.month, value.day, tzinfo=UTC) + timedelta(days=1)
    except OverflowError:
        return "9999-12-31T23:59:59.999999Z"
    return f"{last:%Y-%m-%dT%H:%M:%S.%fZ}".rjust(27, "0")


def seq_at(conn: sqlite3.Connection, as_of: str | date | datetime) -> int:
    """Seq of the last event up to a date (to the end of that day, UTC) or datetime (included; UTC unless it says
    otherwise).

    Raises
    ------
    InvalidInput
        Not a date.
    NotFound
        The store has no base that old.
    """
    until = _until(as_of)
    row = conn.execute("SELECT max(seq) FROM event WHERE utc < ?", (until,)).fetchone()
    if row[0] is None or last_base(conn, row[0]) is None:
        first = conn.execute("SELECT utc FROM event WHERE kind = 'base' ORDER BY seq LIMIT 1").fetchone()
        hint = f"its first base is of {first[0]}" if first else "it has none yet"
        raise NotFound(f"the store has no base as of {as_of}", hint=hint)
    return int(row[0])


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

    Events edited, missing or out of order; entries whose id no longer matches their fields; a base whose rows do not
    give its content hash; guards that were taken away. The order of the log is what it proves: compare :func:`head`
    with one noted elsewhere to know that the whole log was not written anew.
    """
    with mapped(path_of(conn)):
        return [*_verify_log(conn), *_verify_entries(conn), *_verify_base(conn), *_verify_guards(conn)]


def _verify_log(conn: sqlite3.Connection) -> Iterator[Problem]:
    prev, expected = "", 1
    for seq, utc, kind, entry, who, comment, payload, status, stated_prev, stated in conn.execute(
        f"SELECT {_COLUMNS} FROM event ORDER BY seq"
    ):
        where = f"event {seq}"
        if seq != expected:
            missing = f"{expected}" if seq == expected + 1 else f"{expected} to {seq - 1}"
            yield Problem(where, f"the event before it is missing ({missing})")
        elif stated_prev != prev:
            yield Problem(where, "does not carry the hash of the event before it")
        if _event_hash(stated_prev, seq, utc, kind, entry or "", who, comment, payload, status) != stated:
            yield Problem(where, "was edited: its hash does not match")
        prev, expected = stated, seq + 1
    row = conn.execute("SELECT seq FROM sqlite_sequence WHERE name = 'event'").fetchone()
    if row and row[0] >= expected:
        yield Problem("log", f"events {expected} to {row[0]} are missing at the end")


def _verify_entries(conn: sqlite3.Connection) -> Iterator[Problem]:
    columns = ", ".join(f'"{name}"' for name in HASHED)
    for number, identity, *row in conn.execute(f"SELECT id, identity, {columns} FROM entry"):
        try:
            same = row_id(identity, row) == number
        except (InvalidInput, ValueError):
            same = False
        if not same:
            yield Problem(f"entry {number}", "was edited: its id does not match its fields")
    for (number,) in conn.execute(
        "SELECT e.id FROM entry e WHERE NOT EXISTS (SELECT 1 FROM base_entry b WHERE b.entry = e.num)"
    ):
        yield Problem(f"entry {number}", "no base holds it and no one created it")


def _verify_base(conn: sqlite3.Connection) -> Iterator[Problem]:
    base = last_base(conn)
    if base is None:
        return
    try:
        right = stored_content_hash(conn, base.seq) == base.payload.get("content_hash")
    except (InvalidInput, ValueError, KeyError, TypeError):
        right = False
    if not right:
        yield Problem(f"base of event {base.seq}", "what the store holds does not give its content hash")


def _verify_guards(conn: sqlite3.Connection) -> Iterator[Problem]:
    present = {row[0] for row in conn.execute("SELECT name FROM sqlite_master WHERE type = 'trigger'")}
    for name in sorted(_TRIGGERS - present):
        yield Problem(f"trigger {name}", "was taken away")
