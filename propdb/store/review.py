"""Review: who may decide what about an entry, in one table, and what waits for a decision."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

from propdb.errors import InvalidInput, NotFound
from propdb.model.records import STATUSES, Entry
from propdb.store import log
from propdb.store.own import Target, writing
from propdb.store.read import Reader
from propdb.store.rows import fold

__all__ = [
    "DECISIONS",
    "SETTINGS",
    "Decision",
    "Waiting",
    "check_setting",
    "decide",
    "set_setting",
    "settings_of",
    "waiting",
]


@dataclass(frozen=True, slots=True)
class Decision:
    """What a verb of review does, and when it may."""

    kind: str  # of its event, which gives the status (:data:`propdb.store.log.KINDS`)
    on: tuple[str, ...]  # the statuses that an entry may have before
    reason: bool  # a comment is needed
    second: bool  # not by who made the entry


_LIVE: Final = tuple(status for status in STATUSES if status not in ("superseded", "withdrawn"))

#: The verbs of review. An own entry goes draft -> checked -> approved; a base entry can be checked and approved too.
DECISIONS: Final[Mapping[str, Decision]] = MappingProxyType(
    {
        # verb: event, from which status, needs a reason, needs a second person
        "check": Decision("checked", ("draft", "base", "estimate"), False, True),
        "approve": Decision("approved", ("checked",), False, True),
        "reject": Decision("rejected", ("draft", "checked"), True, False),
        "dispute": Decision("disputed", ("approved", "checked", "base", "estimate"), True, False),
        "waive": Decision("waived", ("disputed", "quarantined"), True, True),  # back to the status before
        "withdraw": Decision("withdrawn", _LIVE, True, False),
    }
)
#: What may be decided next, by status: what waits.
NEXT: Final[Mapping[str, tuple[str, ...]]] = MappingProxyType(
    {
        "draft": ("check", "reject"),
        "checked": ("approve", "reject"),
        "disputed": ("waive", "withdraw"),
        "quarantined": ("waive", "withdraw"),
    }
)
#: Settings of a store: values (the first is the default), and what they mean.
SETTINGS: Final[Mapping[str, tuple[tuple[str, ...], str]]] = MappingProxyType(
    {"self-review": (("off", "on"), "may people check, approve and waive what they made themselves")}
)
_LONGEST: Final = 4000


@dataclass(frozen=True, slots=True)
class Waiting:
    """An entry that waits for a decision."""

    entry: Entry
    author: str  # who made it; "" for an entry of a base
    event: log.Event  # the last about it
    next: tuple[str, ...]  # what may be decided


def decide(
    target: Target, verb: str, ids: Iterable[str], *, who: str, comment: str = "", finding: str = ""
) -> tuple[log.Event, ...]:
    """Decide about entries, all or none, in one transaction.

    Parameters
    ----------
    target : connection or path
    verb : str
        One of :data:`DECISIONS`.
    ids : iterable of str
        Entry ids, or their first characters.
    who : str
        Who decides.
    comment : str
        Why; needed for most verbs.
    finding : str
        With ``waive``: waive this finding, and leave the status as it is.

    Returns
    -------
    tuple of Event

    Raises
    ------
    NotFound, Ambiguous
        An id that no active entry has, or several.
    InvalidInput
        The status does not allow it, a reason is missing, or the entry is of who decides.
    StoreError, StoreBusy, StoreReadOnly
    """
    decision = DECISIONS[verb]
    reason = comment.strip()
    if decision.reason and not reason:
        raise InvalidInput(f"to {verb} needs a reason", hint='say it with --comment "..."')
    if len(reason) > _LONGEST:
        raise InvalidInput(f"a comment of {len(reason)} characters", hint=f"use up to {_LONGEST}")
    with writing(target) as conn:
        with Reader(conn) as reader:
            entries = list({entry.id: entry for entry in map(reader.entry, ids)}.values())
        if not entries:
            raise InvalidInput(f"nothing to {verb}", hint="`propdb review list` lists what waits")
        alone = log.setting(conn, "self-review") == "on"
        planned: list[tuple[Entry, dict[str, object], str]] = []
        for entry in entries:
            named = f"entry {entry.id} ({entry.species} {entry.quantity} {entry.phase})"
            on = _LIVE if finding else decision.on
            if entry.status not in on:
                raise _refused(conn, verb, entry, named, on)
            payload: dict[str, object] = {"finding": finding} if finding else {}
            if decision.second and fold(who) in map(fold, authors(conn, entry.id)):
                if not alone:
                    raise InvalidInput(
                        f"{who} made it and cannot {verb} it",
                        where=named,
                        hint="somebody else must; `propdb store setting self-review on` is for a store of one person",
                    )
                payload["self"] = True
            planned.append((entry, payload, _before(conn, entry) if verb == "waive" and not finding else ""))
        return tuple(
            log.append(conn, decision.kind, entry=entry.id, who=who, comment=reason, payload=payload, status=status)
            for entry, payload, status in planned
        )


def _refused(conn: sqlite3.Connection, verb: str, entry: Entry, named: str, on: tuple[str, ...]) -> InvalidInput:
    """Say why this cannot be done to an entry of this status."""
    events = [event for event in log.events(conn, entry.id) if event.status]
    by = ""
    if events and events[-1].status == entry.status:
        last = events[-1]
        by = f" ({last.kind} by {last.who} on {last.utc[:10]})"
    if entry.status == log.KINDS[DECISIONS[verb].kind]:
        return InvalidInput(f"it is {entry.status} already{by}", where=named)
    if entry.status == "draft":
        return InvalidInput(
            f"a draft that nobody has checked cannot be {_PAST[verb]}",
            where=named,
            hint=f"type propdb review check {entry.id[:8]} first" if verb == "approve" else "withdraw or reject it",
        )
    if verb == "approve" and entry.status in DECISIONS["check"].on:
        hint = f"type propdb review check {entry.id[:8]} first"
    elif entry.status == "withdrawn":
        hint = "add it anew as a draft"
    elif entry.status in ("disputed", "quarantined") and verb in ("check", "approve"):
        hint = "waive that first, with the reason"
    else:
        hint = f"{verb} takes what is {' or '.join(on)}" if len(on) < len(_LIVE) else "nothing more can be decided"
    return InvalidInput(f"it is {entry.status}{by} and cannot be {_PAST[verb]}", where=named, hint=hint)


_PAST: Final = {
    "check": "checked",
    "approve": "approved",
    "reject": "rejected",
    "dispute": "disputed",
    "waive": "waived",
    "withdraw": "withdrawn",
}


def authors(conn: sqlite3.Connection, entry: str) -> list[str]:
    """Who made an own entry; nobody made one of a base."""
    sql = "SELECT DISTINCT who FROM event WHERE entry = ? AND kind = 'created'"
    return [row[0] for row in conn.execute(sql, (entry,))]


def _before(conn: sqlite3.Connection, entry: Entry) -> str:
    """The status that an entry had before it was disputed or quarantined; ``base`` where its base says so."""
    doubted = DECISIONS["waive"].on
    for event in reversed(log.events(conn, entry.id)):
        if event.status and event.status not in doubted:
            return event.status
    base = log.last_base(conn)
    row = conn.execute(
        "SELECT b.status FROM base_entry b JOIN entry e ON e.num = b.entry WHERE e.id = ? AND (b.base = ? OR b.own = 1)"
        " ORDER BY b.own LIMIT 1",
        (entry.id, base.seq if base else 0),
    ).fetchone()
    status = str(row[0]) if row else "base"
    return "base" if status in doubted else status


def waiting(reader: Reader) -> tuple[Waiting, ...]:
    """What somebody has begun and nobody has settled: drafts, checked entries, and doubts that people or a check of
    the store raised; the oldest first."""
    with reader._snapshot():
        events: dict[str, list[log.Event]] = {}
        for event in log.events(reader.conn, limit=reader._view["limit"]):
            if event.entry:
                events.setdefault(event.entry, []).append(event)
        found = []
        for id, about in events.items():
            try:
                entry = reader.entry(id)
            except NotFound:  # its base is gone
                continue
            if entry.status in NEXT:
                made = [event.who for event in about if event.kind == "created"]
                found.append(Waiting(entry, ", ".join(dict.fromkeys(made)), about[-1], NEXT[entry.status]))
    return tuple(sorted(found, key=lambda one: one.event.seq))


def settings(conn: sqlite3.Connection, limit: int | None = None) -> dict[str, str]:
    """Every setting with its value (up to a seq)."""
    return {name: log.setting(conn, name, limit) or values[0] for name, (values, _) in SETTINGS.items()}


def settings_of(reader: Reader) -> dict[str, str]:
    """Every setting as the reader sees it."""
    with reader._snapshot():
        return settings(reader.conn, reader._view["limit"])


def check_setting(name: str, value: str | None = None) -> None:
    """Refuse a setting, or a value, that there is not.

    Raises
    ------
    NotFound, InvalidInput
    """
    if name not in SETTINGS:
        raise NotFound(f"no setting {name!r}", hint=f"settings are {', '.join(SETTINGS)}")
    values = SETTINGS[name][0]
    if value is not None and value not in values:
        raise InvalidInput(f"{name} cannot be {value!r}", hint=f"it is {' or '.join(values)}")


def set_setting(target: Target, name: str, value: str, *, who: str) -> None:
    """Change a setting, with an event that says so; nothing happens where it has this value.

    Raises
    ------
    NotFound, InvalidInput, StoreError, StoreBusy, StoreReadOnly
    """
    check_setting(name, value)
    with writing(target) as conn:
        if settings(conn)[name] != value:
            log.append(conn, "setting", who=who, payload={"name": name, "value": value})
