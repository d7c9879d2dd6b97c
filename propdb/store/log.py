"""The log: append-only events, each carrying the hash of the one before."""

# ruff: noqa: S608 - what is put into SQL texts here are constants of this package; every value is bound
from __future__ import annotations

import json
import sqlite3
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from hashlib import sha256
from types import MappingProxyType
from typing import Any, Final

from propdb.errors import IntegrityError, InvalidInput, NotFound
from propdb.model.records import STATUSES
from propdb.store.content import canonical
from propdb.store.open import mapped, path_of

__all__ = ["KINDS", "STORE_KINDS", "Event", "append", "events", "head", "last_base", "seq_at", "setting"]

#: Kind of event to the status that it gives its entry; "" changes nothing.
KINDS: Final[Mapping[str, str]] = MappingProxyType(
    {
        "created": "",  # an own entry is a draft until another event; added again after it was withdrawn, once more
        "checked": "checked",
        "approved": "approved",
        "rejected": "withdrawn",
        "disputed": "disputed",
        "quarantined": "quarantined",
        "superseded": "superseded",
        "withdrawn": "withdrawn",
        "waived": "",  # a finding is waived, not the entry, unless a status is given
        "base": "",
        "defined": "",  # own species, sources, datums or policy were added or replaced
        "setting": "",
    }
)
#: Kinds of events about the store; every other kind is about one entry.
STORE_KINDS: Final = frozenset({"base", "defined", "setting"})
_COLUMNS: Final = "seq, utc, kind, entry, who, comment, payload, status, prev, hash"


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


def _event(row: tuple[Any, ...]) -> Event:
    seq, utc, kind, entry, who, comment, payload, status, prev, own = row
    return Event(seq, utc, kind, entry or "", who, comment, _facts(seq, payload), status, prev, own)


def _facts(seq: int, payload: str) -> Mapping[str, Any]:
    try:
        return MappingProxyType(dict(json.loads(payload)))
    except (TypeError, ValueError) as error:
        raise IntegrityError(
            "its facts cannot be read: it was edited by hand",
            where=f"event {seq}",
            hint="propdb store log --verify lists all that was",
        ) from error


def event_hash(
    prev: str, seq: int, utc: str, kind: str, entry: str, who: str, comment: str, payload: str, status: str
) -> str:
    """SHA-256 that chains an event to the one before."""
    text = f"{prev}\n{canonical([seq, utc, kind, entry, who, comment, payload, status])}"
    return sha256(text.encode(errors="surrogateescape")).hexdigest()  # an edited row may hold any bytes


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
        Entry id; "" for the kinds of :data:`STORE_KINDS` and only for these.
    who : str
        Who says so.
    comment : str
    payload : mapping, optional
        Further facts, as JSON could hold them.
    status : str
        With ``waived`` and ``created``: the status that the entry has from now on. Other kinds give their own.

    Raises
    ------
    InvalidInput, NotFound, StoreError
    """
    from propdb.store.migrate import immediate, utc_now

    if kind not in KINDS:
        raise InvalidInput(f"unknown kind of event {kind!r}", hint=f"one of {' '.join(KINDS)}")
    if not who.strip():
        raise InvalidInput("an event needs a name behind it", where=f"event {kind}", hint="say who decides")
    if (kind in STORE_KINDS) != (not entry):
        raise InvalidInput("one about an entry names it, one about the store has no entry", where=f"event {kind}")
    if status and (kind not in ("waived", "created") or status not in STATUSES):
        raise InvalidInput(f"the status {status!r} cannot be given by an event {kind!r}", where=f"event {kind}")
    status = status or KINDS[kind]
    text = canonical(payload or {})
    with mapped(path_of(conn)), immediate(conn):
        if entry and conn.execute("SELECT 1 FROM entry WHERE id = ?", (entry,)).fetchone() is None:
            raise NotFound(f"no entry {entry!r}", where=f"event {kind}", hint="give the whole id")
        last = conn.execute("SELECT seq, utc, hash FROM event ORDER BY seq DESC LIMIT 1").fetchone()
        seq, prev = (last[0] + 1, last[2]) if last else (1, "")
        utc = max(utc_now(), last[1]) if last else utc_now()  # a clock set back does not turn the order of events
        own = event_hash(prev, seq, utc, kind, entry, who, comment, text, status)
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


def setting(conn: sqlite3.Connection, name: str, limit: int | None = None) -> str:
    """The value that the last ``setting`` event of this name gave (up to a seq); "" where there is none."""
    sql = "SELECT seq, payload FROM event WHERE kind = 'setting' AND seq <= ? ORDER BY seq DESC"
    for seq, payload in conn.execute(sql, (limit if limit is not None else 2**62,)):
        facts = _facts(seq, payload)
        if facts.get("name") == name:
            return str(facts.get("value", ""))
    return ""


_NEVER: Final = "9999-12-31T23:59:59.999999Z"
#: A day has begun somewhere on earth when it is this much older than its midnight in UTC.
_EAST: Final = timedelta(hours=-14)


def _utc_text(value: datetime) -> str:
    return f"{value:%Y-%m-%dT%H:%M:%S.%fZ}".rjust(27, "0")


def _moment(as_of: str | date | datetime) -> tuple[str, str]:
    """The first instant that no longer counts, and one that must have come, as the log writes them.

    A date counts to its end and must have begun somewhere on earth; a datetime is in, and must be over.
    """
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
            come = value.replace(tzinfo=UTC) if value.tzinfo is None else value.astimezone(UTC)
            return _utc_text(come + timedelta(microseconds=1)), _utc_text(come)
        midnight = datetime(value.year, value.month, value.day, tzinfo=UTC)
        come = midnight + _EAST if value.year > 1 else midnight
        return _utc_text(midnight + timedelta(days=1)), _utc_text(come)
    except OverflowError:
        return _NEVER, _NEVER


def seq_at(conn: sqlite3.Connection, as_of: str | date | datetime) -> int:
    """Seq of the last event up to a date (to the end of that day, UTC) or datetime (included; UTC unless it says
    otherwise).

    Raises
    ------
    InvalidInput
        Not a date, or one in the future.
    NotFound
        The store has no base that old.
    """
    from propdb.store.migrate import utc_now

    until, come = _moment(as_of)
    last = conn.execute("SELECT utc FROM event ORDER BY seq DESC LIMIT 1").fetchone()
    now = max(utc_now(), last[0] if last else "")  # the log may be ahead of a clock that was set back
    if come > now:
        raise InvalidInput(f"{as_of} lies in the future", hint="leave --as-of out for the store as it is")
    row = conn.execute("SELECT max(seq) FROM event WHERE utc < ?", (until,)).fetchone()
    if row[0] is None or last_base(conn, row[0]) is None:
        first = conn.execute("SELECT utc FROM event WHERE kind = 'base' ORDER BY seq LIMIT 1").fetchone()
        hint = f"its first base is of {first[0]}" if first else "it has none yet"
        raise NotFound(f"the store has no base as of {as_of}", hint=hint)
    return int(row[0])
