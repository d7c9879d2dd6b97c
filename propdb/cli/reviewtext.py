"""What waits for review, what was decided, and the log, as text and as data."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any, Final

from propdb.model.text import columns, visible

if TYPE_CHECKING:
    from propdb.api.review import LogLine, StoreLog
    from propdb.model.records import Entry
    from propdb.store.history import Happening
    from propdb.store.log import Event
    from propdb.store.review import Waiting

#: Facts of an event that are hashes for the check of the store.
_HASHES: Final = ("content_hash", "rows", "member", "members")


def _time(utc: str) -> str:
    return utc[:19].replace("T", " ")


def _value(entry: Entry) -> tuple[str, str]:
    from propdb.cli.sheets import comparable

    return comparable(entry) if not entry.equation else (entry.equation, "")


def _what(entry: Entry) -> str:
    from propdb.cli.sheets import phase_text

    return f"{entry.species} {entry.quantity} {phase_text(entry)}"


def waiting_dict(one: Waiting) -> dict[str, Any]:
    """An entry that waits, as data."""
    entry = one.entry
    return {
        "entry": entry.id,
        "species": entry.species,
        "quantity": entry.quantity,
        "phase": entry.phase,
        "form": entry.form,
        "source": entry.source,
        "status": entry.status,
        "author": one.author or None,
        "next": list(one.next),
        "last": event_dict(one.event),
    }


def waiting_text(found: Sequence[Waiting]) -> str:
    """What waits, the oldest first."""
    if not found:
        return "nothing waits"
    rows = [("entry", "what", "value", "", "source", "made by", "status", "by", "since", "next", "comment")]
    for one in found:
        value, unit = _value(one.entry)
        event = one.event
        rows.append(
            (
                one.entry.id[:8],
                _what(one.entry),
                value,
                unit,
                one.entry.source,
                visible(one.author) or "base",
                one.entry.status,
                visible(event.who) if event.kind != "created" else "",
                event.utc[:10],
                " or ".join(one.next),
                visible(event.comment),
            )
        )
    return "\n".join(columns(rows, right=(2,)))


def decided_text(decided: Sequence[tuple[Event, Entry]]) -> str:
    """One line for each decision."""
    rows = []
    for event, entry in decided:
        value, unit = _value(entry)
        notes = [visible(event.payload["finding"])] if event.payload.get("finding") else []
        notes += ["on an entry of one's own"] if event.payload.get("self") else []
        status = "" if event.status == event.kind else f"now {entry.status}"
        rows.append(
            (event.kind, entry.id[:8], f"{_what(entry)} {value} {unit}".rstrip(), entry.source, status, *_one(notes))
        )
    return "\n".join(f"{line} by {visible(decided[0][0].who)}" for line in columns([("",) * 6, *rows])[1:])


def _one(notes: Sequence[str]) -> tuple[str]:
    return (", ".join(notes),)


def event_dict(event: Event, line: LogLine | None = None) -> dict[str, Any]:
    """An event as data; everything that its hash covers is in it."""
    about = {"species": line.species, "quantity": line.quantity, "phase": line.phase} if line and line.species else {}
    return {
        "seq": event.seq,
        "utc": event.utc,
        "kind": event.kind,
        "entry": event.entry or None,
        **about,
        "who": event.who,
        "comment": event.comment,
        "payload": event.payload,
        "status": event.status or None,
        "prev": event.prev or None,
        "hash": event.hash,
    }


def log_text(found: StoreLog) -> str:
    """Events, one a line, and the head of the log."""
    rows = [("", "UTC", "event", "by", "entry", "what", "facts", "comment")]
    for line in found.lines:
        event = line.event
        rows.append(
            (
                str(event.seq),
                _time(event.utc),
                event.kind,
                visible(event.who),
                event.entry[:8],
                f"{line.species} {line.quantity} {line.phase}".strip(),
                _facts(event.kind, event.payload),
                visible(event.comment),
            )
        )
    return "\n".join([*columns(rows, right=(0,)), head_text(found)])


def head_text(found: StoreLog) -> str:
    """The head of the log: note it elsewhere, and it proves that no event before it was changed."""
    return f"head {found.head} after {found.events} event{'s' if found.events != 1 else ''}"


def _facts(kind: str, payload: Mapping[str, Any]) -> str:
    """The facts of an event in a few words."""
    if kind == "base":
        versions = payload.get("versions", {})
        version = f"propdb {versions['propdb']}, " if isinstance(versions, Mapping) and "propdb" in versions else ""
        content = str(payload.get("content_hash", ""))[:16]
        return visible(f"{version}{payload.get('entries', '?')} entries, content {content}")
    if kind == "setting":
        return visible(f"{payload.get('name')} {payload.get('value')}")
    parts = []
    for key, value in payload.items():
        if key in _HASHES:
            continue
        if key == "self":
            parts.append("of one's own")
            continue
        words = value if isinstance(value, (list, tuple)) else [value]
        shown = ", ".join(str(word) for word in words[:3]) + (f" and {len(words) - 3} more" if len(words) > 3 else "")
        parts.append(f"{key} {shown}")
    return visible("; ".join(parts))


def happening_dict(one: Happening) -> dict[str, Any]:
    """One event in the life of an entry, as data."""
    return {
        "seq": one.seq,
        "utc": one.utc,
        "kind": one.kind,
        "entry": one.entry,
        "who": one.who,
        "comment": one.comment,
        "payload": one.payload,
        "status": one.status or None,
    }


def history_text(found: Sequence[Happening]) -> str:
    """The life of an entry, one event a line, with its status from then on."""
    rows = [("", "UTC", "event", "by", "status", "facts", "comment")]
    rows += [
        (
            str(one.seq),
            _time(one.utc),
            one.kind,
            visible(one.who),
            one.status or "not active",
            _facts(one.kind, one.payload),
            visible(one.comment),
        )
        for one in found
    ]
    return "\n".join([f"entry {found[0].entry}", *columns(rows, right=(0,))])
