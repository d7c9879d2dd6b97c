"""What people add: own entries, species, sources, datums and policy."""

# ruff: noqa: S608 - what is put into SQL texts here are constants of this package; every value is bound
from __future__ import annotations

import os
import sqlite3
from collections.abc import Iterator, Mapping, Sequence
from contextlib import closing, contextmanager
from dataclasses import replace
from typing import Any, Final, NamedTuple

from propdb.errors import NotFound
from propdb.model.records import Carrier, Entry, Source, Species
from propdb.store import log, seal
from propdb.store.content import Member, canonical, entry_id, validate_entry
from propdb.store.crosschecks import Checker, put_crosschecks
from propdb.store.migrate import immediate
from propdb.store.open import mapped, open_store, path_of
from propdb.store.rows import species_of, species_row
from propdb.store.write import insert_species, put_bodies, put_entries, put_sources, set_names, settle_species

__all__ = ["add_own", "add_own_all", "put_own"]

Target = sqlite3.Connection | str | os.PathLike[str]
#: Behind a definition where nobody is named.
UNNAMED: Final = "unnamed"


@contextmanager
def writing(target: Target) -> Iterator[sqlite3.Connection]:
    """One IMMEDIATE transaction on an open connection or on the store at a path."""
    if isinstance(target, sqlite3.Connection):
        with mapped(path_of(target)), immediate(target):
            yield target
    else:
        with closing(open_store(target, write=True)) as conn, mapped(target), immediate(conn):
            yield conn


def add_own(
    target: Target,
    entry: Entry,
    carrier: Carrier,
    who: str,
    *,
    comment: str = "",
    checker: Checker | None = None,
) -> str:
    """Add one own entry, with a ``created`` event; its status is draft until another event. Its id.

    As :func:`add_own_all`.
    """
    return add_own_all(target, [(entry, carrier)], who, comment=comment, checker=checker)[0]


def add_own_all(
    target: Target,
    entries: Sequence[tuple[Entry, Carrier]],
    who: str,
    *,
    species: Sequence[Species] = (),
    sources: Sequence[Source] = (),
    comment: str = "",
    checker: Checker | None = None,
) -> tuple[str, ...]:
    """Add own entries, and the species and sources that they need: all or nothing.

    Parameters
    ----------
    target : connection or path
        A connection opened for writing; its open transaction is joined.
    entries : sequence of (Entry, Carrier)
        ``entry.id`` may be "" (it is set here); ``species`` a primary name; ``status`` is ignored.
    who : str
        Who adds them.
    species, sources : sequences
        Own ones, added or replaced first.
    comment : str
        For the ``created`` events.
    checker : callable, optional
        Compares the entries with other compilations; what it says is stored beside them.

    Returns
    -------
    tuple of str
        Entry ids. An entry that is there already as own is left as it is, without a further event; one that was
        withdrawn or rejected becomes a draft again.

    Raises
    ------
    NotFound
        No such species or source.
    InvalidInput
        As :func:`propdb.store.content.validate_entry`.
    StoreError, StoreBusy, StoreReadOnly
    """
    with writing(target) as conn:
        sealing = seal.Seal(conn)
        _put(conn, species, sources, {}, {})
        _define(
            conn, sealing, who, comment, {"species": [s.name for s in species], "sources": [s.key for s in sources]}
        )
        added: list[_Added] = []
        ids: dict[str, None] = {}  # in order, each once
        given: list[str] = []
        for entry, carrier in entries:
            number, one = _species_row(conn, entry.species)
            entry = replace(entry, status="draft", id=entry.id or entry_id(entry, one))
            validate_entry(entry, one)
            if (
                conn.execute("SELECT 1 FROM source WHERE key = ? AND (own OR active)", (entry.source,)).fetchone()
                is None
            ):
                hint = "add the source first"
                raise NotFound(f"no source {entry.source!r}", where=f"entry of {entry.species}", hint=hint)
            member = Member(entry, "draft", entry.note, entry.printed, (*entry.carriers, carrier))
            row = put_entries(conn, [member], {one.name: one})[entry.id]
            if checker is not None:
                put_crosschecks(conn, [(row, checker(entry, one))])
            if entry.id not in ids and _is_new(conn, row, entry.id):
                added.append(_Added(number, row, entry))
            ids[entry.id] = None
            given.append(entry.id)
        parts = sealing.close()
        for one_added in added:
            last = one_added is added[-1]
            _create(conn, one_added, who, comment, parts if last else {})
        if parts and not added:
            log.append(conn, "defined", who=who, comment=comment, payload={"carriers": list(ids), "rows": parts})
    return tuple(given)


class _Added(NamedTuple):
    species: int  # row
    row: int
    entry: Entry


def _is_new(conn: sqlite3.Connection, row: int, entry: str) -> bool:
    """Is the entry not an own one yet, or one that was withdrawn or refused?"""
    if conn.execute("SELECT 1 FROM base_entry WHERE entry = ? AND own = 1", (row,)).fetchone() is None:
        return True
    last = conn.execute(
        "SELECT status FROM event WHERE entry = ? AND status <> '' ORDER BY seq DESC LIMIT 1", (entry,)
    ).fetchone()
    return last is not None and last[0] == "withdrawn"


def _create(conn: sqlite3.Connection, added: _Added, who: str, comment: str, parts: Mapping[str, str]) -> None:
    entry = added.entry
    again = conn.execute("SELECT 1 FROM event WHERE entry = ? AND status = 'withdrawn'", (entry.id,)).fetchone()
    member = seal.member_hash(added.species, entry.id, "draft", entry.note, int(entry.printed))
    payload = {"member": member, **({"rows": parts} if parts else {})}
    status = "draft" if again else ""
    event = log.append(conn, "created", entry=entry.id, who=who, comment=comment, payload=payload, status=status)
    conn.execute(
        "INSERT INTO base_entry (species, base, entry, own, status, note, printed) VALUES (?, ?, ?, 1, 'draft', ?, ?)",
        (added.species, event.seq, added.row, entry.note, int(entry.printed)),
    )


def _define(
    conn: sqlite3.Connection, sealing: seal.Seal, who: str, comment: str, what: Mapping[str, Sequence[str]]
) -> None:
    """Say in the log that own species, sources, datums or policy were added or replaced, if any were."""
    named = {kind: list(names) for kind, names in what.items() if names}
    parts = sealing.close() if named else {}
    if parts:
        log.append(conn, "defined", who=who, comment=comment, payload={**named, "rows": parts})


def _species_row(conn: sqlite3.Connection, name: str) -> tuple[int, Species]:
    found = next(species_of(conn, "name = ? AND (own = 1 OR active = 1)", (name,)), None)
    if found is None:
        raise NotFound(f"no species {name!r}", hint="give the primary name, or add the species first")
    return found


def put_own(
    target: Target,
    *,
    species: Sequence[Species] = (),
    sources: Sequence[Source] = (),
    datums: Mapping[str, Mapping[str, Any]] | None = None,
    policy: Mapping[str, Any] | None = None,
    who: str = UNNAMED,
    comment: str = "",
) -> None:
    """Add or replace own species, sources, datums and policy, with a ``defined`` event where anything changes.

    They stand before the base's of the same name or key.

    Raises
    ------
    InvalidInput, StoreError, StoreBusy, StoreReadOnly
    """
    with writing(target) as conn:
        sealing = seal.Seal(conn)
        _put(conn, species, sources, datums or {}, policy or {})
        names: dict[str, Sequence[str]] = {"species": [s.name for s in species], "sources": [s.key for s in sources]}
        _define(conn, sealing, who, comment, names | {"datums": list(datums or ()), "policy": list(policy or ())})


def _put(
    conn: sqlite3.Connection,
    species: Sequence[Species],
    sources: Sequence[Source],
    datums: Mapping[str, Mapping[str, Any]],
    policy: Mapping[str, Any],
) -> None:
    if not (species or sources or datums or policy):
        return
    put_sources(conn, sources, own=1)
    put_bodies(conn, "datum", "name", "body", {name: canonical(body) for name, body in datums.items()}, own=1)
    put_bodies(conn, "policy", "key", "value", {key: canonical(value) for key, value in policy.items()}, own=1)
    for one in species:
        row = species_row(one)
        old = conn.execute(
            "SELECT id FROM species WHERE own = 1 AND (identity = ? OR name = ?)", (row["identity"], one.name)
        ).fetchone()
        if old is None:
            insert_species(conn, [(one, row)], own=1)
        else:
            sets = ", ".join(f"{column} = :{column}" for column in row)
            conn.execute(f"UPDATE species SET {sets} WHERE id = :id", {**row, "id": old[0]})
            set_names(conn, [(old[0], one)])
    if species:
        settle_species(conn)
