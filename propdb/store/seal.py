"""Hashes that events carry of the rows that they leave behind, so that a row changed by hand shows.

An entry is covered by its id and an event by the chain. The rest, species with their names, sources, datums, policy and
carriers, is covered in parts (of the base, no longer of the base, own): the last event that wrote any of it carries the
hash of every part. The members of a base are covered by its event, an own member by the event that created it.
"""

# ruff: noqa: S608 - what is put into SQL texts here are constants of this package; every value is bound
from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterable, Mapping
from hashlib import sha256
from typing import Any, Final

from propdb.store.content import canonical_lines, joined

__all__ = ["BASE_PARTS", "Seal", "carried", "member_hash", "members_hash", "state"]

_SPECIES: Final = (
    "s.id, s.own, s.active, s.identity, s.name, s.formula, s.charge, s.composition, s.molar_mass, s.cas, s.inchikey,"
    " s.synonyms, s.vapour, s.kind, s.note"
)
_SOURCE: Final = (
    "s.key, s.own, s.active, s.title, s.authors, s.year, s.kind, s.class, s.terms, s.fields, s.carrier,"
    " s.standard_pressure, s.note"
)
_LISTS: Final[Mapping[str, str]] = {
    "species": f"SELECT {_SPECIES} FROM species s",
    "names": "SELECT n.species, n.kind, n.folded, n.text FROM name n JOIN species s ON s.id = n.species",
    "sources": f"SELECT {_SOURCE} FROM source s",
    "lineage": "SELECT l.source, l.position, l.copies, l.evidence FROM lineage l"
    " JOIN source s ON s.key = l.source AND s.own = l.own",
    "datums": "SELECT s.name, s.own, s.active, s.body FROM datum s",
    "policy": "SELECT s.key, s.own, s.active, s.value FROM policy s",
}
_WHOSE: Final[Mapping[str, str]] = {
    "base": "s.own = 0 AND s.active = 1",
    "former": "s.own = 0 AND s.active = 0",
    "own": "s.own <> 0",
}
_CARRIERS: Final = (
    "SELECT e.id, c.package, c.version, c.file, c.row, c.how FROM carrier c JOIN entry e ON e.num = c.entry"
)
#: Part -> the rows that it covers. To cover another column, or to leave one out, is to give the part another name.
PARTS: Final[Mapping[str, str]] = {
    **{f"{whose} {what}": f"{sql} WHERE {test}" for what, sql in _LISTS.items() for whose, test in _WHOSE.items()},
    "carriers": _CARRIERS,
}
#: Parts that a build writes anew from its content, whatever was there. Names it leaves where the species is as it was.
BASE_PARTS: Final = frozenset(f"base {what}" for what in _LISTS if what != "names")


def rows_hash(rows: Iterable[tuple[Any, ...]]) -> str:
    """SHA-256 over rows, whatever their order."""
    digest = sha256(b"propdb rows 1\n")
    digest.update(joined(canonical_lines(rows)))
    return digest.hexdigest()


def state(conn: sqlite3.Connection) -> dict[str, str]:
    """The hash of every part as it is now."""
    return {part: rows_hash(conn.execute(sql)) for part, sql in PARTS.items()}


def carried(conn: sqlite3.Connection) -> tuple[int, dict[str, str]] | None:
    """The last event that carries hashes of the parts, and these; None in a store of an older propdb."""
    kinds = "kind IN ('base', 'defined', 'created')"
    for seq, text in conn.execute(f"SELECT seq, payload FROM event WHERE {kinds} ORDER BY seq DESC"):
        try:
            found = json.loads(text).get("rows")
        except (ValueError, AttributeError):  # edited by hand, which the chain says
            continue
        if isinstance(found, dict):
            return seq, found
    return None


class Seal:
    """Taken when a transaction begins to write, it gives the hashes for the event that ends it.

    A part that was not as its last event left it keeps the hash of that event: what was changed by hand is not made
    good by writing beside it.
    """

    def __init__(self, conn: sqlite3.Connection) -> None:
        self.conn = conn
        last = carried(conn)
        self.last = last[1] if last else None
        before = state(conn) if self.last is not None else {}
        self.broken = {part for part, right in (self.last or {}).items() if before.get(part) != right}

    def close(self, *, rewritten: frozenset[str] = frozenset()) -> dict[str, str]:
        """Hashes of the parts for an event, ``rewritten`` ones among them afresh; empty where nothing has changed."""
        after = state(self.conn)
        kept = self.broken - rewritten
        after.update({part: right for part, right in (self.last or {}).items() if part in kept})
        if after == self.last:
            return {}
        self.last = after
        return after


def member_hash(species: int, entry: str, status: str, note: str, printed: int) -> str:
    """The hash of one own member: row of its species, id, status and note as it was added."""
    return rows_hash([(species, entry, status, note, int(printed))])


def members_hash(rows: Iterable[tuple[int, str, str, str, int]]) -> str:
    """The hash of the members of a base: (row of the species, entry id, status, note, printed)."""
    return rows_hash(rows)
