"""What happened to an entry: the bases that took it up, changed their mind or let it go, and what people decided."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any

from propdb.errors import Ambiguous, NotFound
from propdb.store import log
from propdb.store.read import Reader

__all__ = ["Happening", "about", "history"]


@dataclass(frozen=True, slots=True)
class Happening:
    """One event in the life of an entry."""

    seq: int
    utc: str
    kind: str
    who: str
    comment: str
    payload: Mapping[str, Any]
    status: str  # of the entry from then on; "" where no base holds it
    entry: str


def history(reader: Reader, prefix: str) -> tuple[Happening, ...]:
    """Everything that happened to an entry, also to one that is no longer active.

    Parameters
    ----------
    reader : Reader
        What it was opened ``as_of`` bounds the events.
    prefix : str
        Id of the entry, or its first characters.

    Raises
    ------
    NotFound, Ambiguous
    """
    with reader._snapshot():
        number, id = _entry(reader, prefix)
        conn, limit = reader.conn, reader._view["limit"]
        held = dict(conn.execute("SELECT base, status FROM base_entry WHERE entry = ? AND own = 0", (number,)))
        found: list[Happening] = []
        base = own = said = ""  # what the base says, the own draft, and people, who have the last word
        for event in log.events(conn, limit=limit) if held else log.events(conn, id, limit=limit):
            comment = event.comment
            if event.kind == "base":
                before, base = base, held.get(event.seq, "")
                if before == base:
                    continue
                comment = "enters the base" if not before else "the base has another status" if base else _GONE
            elif event.entry != id:
                continue
            elif event.kind == "created":
                own = "draft"
            said = event.status or said
            status = (said or base or own) if base or own else ""
            facts = MappingProxyType({key: value for key, value in event.payload.items() if key not in HIDDEN})
            found.append(Happening(event.seq, event.utc, event.kind, event.who, comment, facts, status, id))
    if not found:
        raise NotFound(f"the entry {id} was not in the store then", hint="leave --as-of out")
    return tuple(found)


_GONE = "the base no longer holds it"
#: Facts of an event that are for the check of the store, not for reading.
HIDDEN = frozenset({"rows", "member", "members"})


def _entry(reader: Reader, prefix: str) -> tuple[int, str]:
    wanted = prefix.strip().lower()
    sql = "SELECT num, id FROM entry WHERE id >= ? AND id < ? ORDER BY id LIMIT 50"
    rows = reader.conn.execute(sql, (wanted, wanted + "g")).fetchall() if wanted else []
    if not rows:
        raise NotFound(f"no entry {prefix!r}", hint="`propdb show SPECIES` lists ids")
    if len(rows) > 1:
        ids = [row[1] for row in rows]
        shown = ", ".join(ids[:5])
        raise Ambiguous(f"several entries begin with {prefix!r}: {shown}", hint="type more of it", candidates=ids)
    return int(rows[0][0]), str(rows[0][1])


def about(reader: Reader, ids: Iterable[str]) -> dict[str, tuple[str, str, str]]:
    """Species, quantity and phase of entries by id, active or not."""
    wanted = set(ids)
    sql = (
        "SELECT t.name, e.quantity, e.phase FROM entry e JOIN base_entry b ON b.entry = e.num"
        " JOIN species s ON s.id = b.species JOIN species t ON t.id = s.canon WHERE e.id = ? LIMIT 1"
    )
    with reader._snapshot():
        rows = {id: reader.conn.execute(sql, (id,)).fetchone() for id in wanted}
    return {id: (row[0], row[1], row[2]) for id, row in rows.items() if row is not None}
