"""What a store holds, in numbers."""

# ruff: noqa: S608 - what is put into SQL texts here are constants of this package; every value is bound
from __future__ import annotations

import os
import sqlite3
from contextlib import suppress
from typing import TYPE_CHECKING, Any, Final

from propdb.model.records import USABLE_STATUSES
from propdb.store.open import SCHEMA
from propdb.store.view import LOGGED, MEMBER

if TYPE_CHECKING:
    from propdb.store.read import Reader

__all__ = ["coverage", "info", "path_species"]

#: Active entries with their present status, each once (a base's word goes before the user's).
_ACTIVE: Final = f"""
    SELECT e.num, s.canon AS species, e.quantity, e.phase, e.equation, e.temperature, e.source,
           coalesce({LOGGED}, b.status) AS status, min(b.own) AS own
    FROM base_entry b JOIN entry e ON e.num = b.entry JOIN species s ON s.id = b.species
    WHERE {MEMBER} GROUP BY e.num
"""
_USABLE: Final = ", ".join(f"'{status}'" for status in USABLE_STATUSES)
_TOTAL_KEYS: Final = ("quantity", "phase", "stored", "without_estimates", "usable", "over_temperature")
_TOTALS: Final = f"""
    SELECT quantity, phase, count(DISTINCT species),
           count(DISTINCT CASE WHEN status <> 'estimate' THEN species END),
           count(DISTINCT CASE WHEN status IN ({_USABLE}) THEN species END),
           count(DISTINCT CASE WHEN equation <> '' AND status IN ({_USABLE}) THEN species END)
    FROM active_entry GROUP BY quantity, phase ORDER BY quantity, phase
"""


def info(reader: Reader) -> dict[str, Any]:
    """Counts and identities of a store.

    Returns
    -------
    dict
        ``path, bytes, schema, sqlite, content_hash, head, base{seq, utc, versions}, species, sources, datums, events,
        entries{active, inactive, own}, statuses{status: entries}``; ``bytes`` is the size of the file [bytes], None in
        memory.
    """
    conn = reader.conn
    base, content, head = reader.base, reader.content_hash, reader.head
    size: int | None = None
    with suppress(OSError):
        size = os.stat(reader.path).st_size
    with reader._snapshot():
        view = reader._view
        statuses = dict(conn.execute(f"SELECT status, count(*) FROM ({_ACTIVE}) GROUP BY status ORDER BY status", view))
        own = conn.execute(f"SELECT count(*) FROM ({_ACTIVE}) WHERE own = 1", view).fetchone()[0]
        total = conn.execute("SELECT count(*) FROM entry").fetchone()[0]
        count = {
            "species": conn.execute("SELECT count(*) FROM species WHERE canon = id AND (own OR active)").fetchone()[0],
            "sources": conn.execute("SELECT count(DISTINCT key) FROM source WHERE own OR active").fetchone()[0],
            "datums": conn.execute("SELECT count(DISTINCT name) FROM datum WHERE own OR active").fetchone()[0],
            "events": conn.execute("SELECT count(*) FROM event WHERE seq <= :limit", view).fetchone()[0],
        }
    active = sum(statuses.values())
    return {
        "path": str(reader.path),
        "bytes": size,
        "schema": SCHEMA,
        "sqlite": sqlite3.sqlite_version,
        "content_hash": content,
        "head": head,
        "base": {"seq": base.seq, "utc": base.utc, "versions": dict(base.payload.get("versions", {}))},
        **count,
        "entries": {"active": active, "inactive": total - active, "own": own},
        "statuses": statuses,
    }


def coverage(reader: Reader, *, usable: bool = True) -> dict[str, Any]:
    """Species and entries by quantity, phase and source.

    Parameters
    ----------
    reader : Reader
    usable : bool
        Count only entries whose status lets them enter a computation; otherwise all active ones. The paths always
        count the usable ones.

    Returns
    -------
    dict
        ``species`` (with at least one such entry), ``coverage[{quantity, phase, source, species, entries}]``,
        ``totals[{quantity, phase, stored, without_estimates, usable, over_temperature}]``: the species with such an
        entry whatever its status, with one that is no estimate, one that may enter a computation, and an equation;
        ``paths{liquid_to_gas, solid_to_gas}``: the species with a heat-capacity equation in each phase and links
        that join them (latent heats, or formation enthalpies of two phases at one temperature; from liquid to gas also
        by way of the crystal). It counts what is there; whether the ranges meet, an evaluation says.
    """
    conn = reader.conn
    counted = f"status IN ({_USABLE})" if usable else "1"
    with reader._snapshot():
        view = reader._view
        conn.execute("DROP TABLE IF EXISTS temp.active_entry")
        conn.execute(f"CREATE TEMP TABLE active_entry AS {_ACTIVE}", view)
        try:
            species = conn.execute(f"SELECT count(DISTINCT species) FROM active_entry WHERE {counted}").fetchone()[0]
            rows = conn.execute(
                "SELECT quantity, phase, source, count(DISTINCT species), count(*) FROM active_entry"
                f" WHERE {counted} GROUP BY quantity, phase, source ORDER BY quantity, phase, source"
            ).fetchall()
            totals = conn.execute(_TOTALS).fetchall()
            paths = {name: len(found) for name, found in _paths(conn).items()}
        finally:
            conn.execute("DROP TABLE temp.active_entry")
    keys = ("quantity", "phase", "source", "species", "entries")
    return {
        "species": species,
        "coverage": [dict(zip(keys, row, strict=True)) for row in rows],
        "totals": [dict(zip(_TOTAL_KEYS, row, strict=True)) for row in totals],
        "paths": paths,
    }


def path_species(reader: Reader) -> dict[str, list[str]]:
    """Names of the species that :func:`coverage` counts under ``paths``."""
    conn = reader.conn
    with reader._snapshot():
        conn.execute("DROP TABLE IF EXISTS temp.active_entry")
        conn.execute(f"CREATE TEMP TABLE active_entry AS {_ACTIVE}", reader._view)
        try:
            paths = _paths(conn)
        finally:
            conn.execute("DROP TABLE temp.active_entry")
        names = dict(conn.execute("SELECT id, name FROM species"))
    return {name: sorted(names[number] for number in found) for name, found in paths.items()}


def _paths(conn: sqlite3.Connection) -> dict[str, set[int]]:
    def having(condition: str) -> set[int]:
        sql = f"SELECT DISTINCT species FROM active_entry WHERE status IN ({_USABLE}) AND {condition}"
        return {row[0] for row in conn.execute(sql)}

    def linked(one: str, other: str) -> set[int]:
        """Formation enthalpies of two phases at one temperature: an implied latent heat."""
        sql = (
            "SELECT DISTINCT a.species FROM active_entry a JOIN active_entry z ON z.species = a.species"
            " WHERE a.quantity = 'Hf' AND z.quantity = 'Hf' AND a.phase = ? AND z.phase = ?"
            " AND a.temperature = z.temperature"
            f" AND a.status IN ({_USABLE}) AND z.status IN ({_USABLE})"
        )
        return {row[0] for row in conn.execute(sql, (one, other))}

    curve = {phase: having(f"quantity = 'Cp' AND equation <> '' AND phase = '{phase}'") for phase in ("cr", "l", "g")}
    vaporising = having("quantity = 'Hvap'") | linked("l", "g")
    melting = having("quantity = 'Hfus'") | linked("cr", "l")
    subliming = having("quantity = 'Hsub'") | linked("cr", "g")
    around = melting & subliming & curve["cr"]
    liquid_to_gas = curve["l"] & curve["g"] & (vaporising | around)
    return {"liquid_to_gas": liquid_to_gas, "solid_to_gas": liquid_to_gas & curve["cr"] & (melting | subliming)}
