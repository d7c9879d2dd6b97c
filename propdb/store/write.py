"""Building the base of a store: one IMMEDIATE transaction that adds and never takes away."""

# ruff: noqa: S608 - what is put into SQL texts here are constants of this package; every value is bound
from __future__ import annotations

import os
import sqlite3
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from contextlib import closing
from dataclasses import dataclass
from itertools import islice
from typing import Any

from propdb.model.crosscheck import Crosscheck
from propdb.model.records import Carrier, Source, Species
from propdb.store import crosschecks, log, seal
from propdb.store.bulk import insert_rows, without
from propdb.store.content import (
    HASHED,
    Content,
    Member,
    canonical,
    content_hash,
    entry_id,
    hash_of,
    hashed_row,
    identity,
    members,
    validate,
    with_id,
)
from propdb.store.migrate import immediate
from propdb.store.open import mapped, open_store
from propdb.store.rows import name_rows, source_row, species_row

__all__ = ["BuildReport", "Content", "build", "content_hash", "entry_id", "members", "with_id"]

Progress = Callable[[str], None]

_CHUNK = 5000
#: From so many rows on, triggers are set aside and their work is done at once.
_MANY = 200
#: The pages of a whole store in memory while it is built, so that none is written before it is full [KiB].
_CACHE = 131_072


@dataclass(frozen=True, slots=True)
class BuildReport:
    """What a build did."""

    changed: bool  # False: the store held this content already
    content_hash: str
    base: int  # seq of the base event
    entries: int  # in the base
    entries_added: int
    entries_inactive: int  # in the base before, and not in this one
    species: int
    species_added: int
    species_changed: int
    sources_changed: int  # added or changed


def build(
    path: str | os.PathLike[str],
    content: Content,
    *,
    versions: Mapping[str, str],
    progress: Progress | None = None,
    timeout: float = 60.0,
    checker: crosschecks.Checker | None = None,
) -> BuildReport:
    """Make ``content`` the base of the store at ``path``, which is created where there is none.

    Adds missing species, sources and entries, replaces rows of the base that changed, records which entries the base
    holds and appends one ``base`` event. No entry, event or own data is deleted or altered; entries that the base
    lacks become inactive. Nothing at all is changed where the store holds this content already. All in one
    transaction: a kill at any point leaves the store as it was, and two builds at once follow each other.

    Parameters
    ----------
    path : path
    content : Content
    versions : mapping
        Package to version, kept in the base event.
    progress : callable, optional
        Called with one line of text now and then.
    timeout : float
        How long to wait for another writer [s].
    checker : callable, optional
        Compares entries with other compilations; what it says is stored beside those of the base and own ones, anew
        where it was read from another version.

    Raises
    ------
    InvalidInput, NotFound
        A content that contradicts itself; nothing has been written.
    StoreError, StoreBusy, StoreReadOnly
    """
    tell: Progress = progress or (lambda text: None)
    tell(f"checking {len(content.entries)} entries")
    held = validate(content)
    digest = hash_of(content, held)
    species = {one.name: one for one in content.species}
    checks: dict[str, Sequence[Crosscheck]] = {}
    if checker is not None:  # before the store is locked, so that no other writer waits for it
        checks = {number: checker(m.entry, species[m.entry.species]) for number, m in held.items()}
    with closing(open_store(path, write=True, create=True, timeout=timeout)) as conn, mapped(path):
        conn.execute(f"PRAGMA cache_size = -{_CACHE:d}")
        return _build(conn, content, held, digest, versions, tell, checks, checker)


def _build(
    conn: sqlite3.Connection,
    content: Content,
    held: Mapping[str, Member],
    digest: str,
    versions: Mapping[str, str],
    tell: Progress,
    checks: Mapping[str, Sequence[Crosscheck]],
    checker: crosschecks.Checker | None,
) -> BuildReport:
    with immediate(conn):
        before = log.last_base(conn)
        if before is not None and before.payload.get("content_hash") == digest:
            report = BuildReport(False, digest, before.seq, len(held), 0, 0, len(content.species), 0, 0, 0)
        else:
            report = _write(conn, content, held, digest, versions, before, tell)
        if checker is not None and (report.changed or crosschecks.stale(conn, checker.package)):
            crosschecks.put_all(conn, checks, checker)
        return report


def _write(
    conn: sqlite3.Connection,
    content: Content,
    held: Mapping[str, Member],
    digest: str,
    versions: Mapping[str, str],
    before: log.Event | None,
    tell: Progress,
) -> BuildReport:
    sealing = seal.Seal(conn)
    sources_changed = put_sources(conn, content.sources, own=0)
    put_bodies(conn, "datum", "name", "body", {name: canonical(body) for name, body in content.datums.items()}, own=0)
    put_bodies(conn, "policy", "key", "value", {key: canonical(value) for key, value in content.policy.items()}, own=0)
    rows, added, changed = _put_base_species(conn, content.species)
    entries_before = conn.execute("SELECT count(*) FROM entry").fetchone()[0]
    # In the order of their ids, which is that of the index: a third faster than as they come.
    numbers = put_entries(conn, [held[number] for number in sorted(held)], {s.name: s for s in content.species}, tell)
    listed = [(rows[m.entry.species], number, m.status, m.note, int(m.printed)) for number, m in held.items()]
    payload = {
        "content_hash": digest,
        "versions": dict(versions),
        "entries": len(held),
        "species": len(content.species),
        "members": seal.members_hash(listed),
    }
    parts = sealing.close(rewritten=seal.BASE_PARTS)
    event = log.append(conn, "base", who="propdb", payload=payload | ({"rows": parts} if parts else {}))
    members = sorted((row, event.seq, numbers[number], 0, *rest) for row, number, *rest in listed)
    # The primary key and the index of entries refuse an entry that comes twice, as the trigger does.
    with without(conn, "base_entry_once"):
        insert_rows(conn, "base_entry", ("species", "base", "entry", "own", "status", "note", "printed"), members)
    inactive = 0
    if before is not None:
        inactive = conn.execute(
            "SELECT count(*) FROM base_entry b WHERE b.base = ? AND NOT EXISTS"
            " (SELECT 1 FROM base_entry c WHERE c.entry = b.entry AND c.base = ?)",
            (before.seq, event.seq),
        ).fetchone()[0]
    entries_added = conn.execute("SELECT count(*) FROM entry").fetchone()[0] - entries_before
    return BuildReport(
        True,
        digest,
        event.seq,
        len(held),
        entries_added,
        inactive,
        len(content.species),
        added,
        changed,
        sources_changed,
    )


def put_sources(conn: sqlite3.Connection, sources: Sequence[Source], *, own: int) -> int:
    """Insert or replace sources; with ``own=0`` those that are not listed become inactive. How many changed."""
    old = {source.key: source_row(source) | {"lineage": source.lineage} for source in _stored_sources(conn, own)}
    changed = [s for s in sources if old.get(s.key) != source_row(s) | {"lineage": tuple(map(tuple, s.lineage))}]
    conn.executemany("INSERT OR IGNORE INTO source_key (key) VALUES (?)", [(s.key,) for s in sources])
    _upsert(conn, "source", "key", [{**source_row(s), "own": own, "active": 1} for s in changed])
    for source in changed:
        conn.execute("DELETE FROM lineage WHERE source = ? AND own = ?", (source.key, own))
        conn.executemany(
            "INSERT INTO lineage (source, own, position, copies, evidence) VALUES (?, ?, ?, ?, ?)",
            [(source.key, own, i, copies, evidence) for i, (copies, evidence) in enumerate(source.lineage)],
        )
    if not own:
        _deactivate(conn, "source", "key", {s.key for s in sources})
    return len(changed)


def _stored_sources(conn: sqlite3.Connection, own: int) -> Iterator[Source]:
    from propdb.store.rows import sources_of

    return sources_of(conn, "own = ? AND active = 1", (own,))


def _upsert(conn: sqlite3.Connection, table: str, key: str, rows: Sequence[Mapping[str, Any]]) -> None:
    """Insert rows, or replace what those with their key hold; one key for each of what the base and the user have."""
    if rows:
        columns = list(rows[0])
        new = ", ".join(f"{column} = excluded.{column}" for column in columns if column not in (key, "own"))
        conn.executemany(
            f"INSERT INTO {table} ({', '.join(columns)}) VALUES ({', '.join(f':{column}' for column in columns)})"
            f" ON CONFLICT ({key}, own) DO UPDATE SET {new}",
            rows,
        )


def put_bodies(
    conn: sqlite3.Connection, table: str, key: str, body: str, texts: Mapping[str, str], *, own: int
) -> None:
    """Insert or replace datums or policy; with ``own=0`` those that are not listed become inactive."""
    old = dict(conn.execute(f"SELECT {key}, {body} FROM {table} WHERE own = ? AND active = 1", (own,)))
    rows = [{key: k, "own": own, "active": 1, body: text} for k, text in texts.items() if old.get(k) != text]
    _upsert(conn, table, key, rows)
    if not own:
        _deactivate(conn, table, key, set(texts))


def _deactivate(conn: sqlite3.Connection, table: str, key: str, kept: set[str]) -> None:
    present = {row[0] for row in conn.execute(f"SELECT {key} FROM {table} WHERE own = 0 AND active = 1")}
    conn.executemany(
        f"UPDATE {table} SET active = 0 WHERE own = 0 AND {key} = ?", [(k,) for k in sorted(present - kept)]
    )


def _put_base_species(conn: sqlite3.Connection, species: Sequence[Species]) -> tuple[dict[str, int], int, int]:
    """Bring the base's species up to ``species``: (name to row id, how many are new, how many changed).

    A row is the same species by identity; failing that by name, when the identity that it had is gone (a CAS RN was
    added or corrected), so that own entries stay with it.
    """
    columns = [*species_row(species[0]), "active"] if species else ["identity", "name", "active"]
    stored = {
        row[0]: dict(zip(columns, row[1:], strict=True))
        for row in conn.execute(f"SELECT id, {', '.join(columns)} FROM species WHERE own = 0")
    }
    by_identity = {row["identity"]: number for number, row in stored.items()}
    wanted = [(s, species_row(s) | {"active": 1}) for s in species]
    identities = {row["identity"] for _, row in wanted}
    free = {row["name"]: number for number, row in stored.items() if row["identity"] not in identities}

    rows: dict[str, int] = {}
    new: list[tuple[Species, dict[str, Any]]] = []
    changed: list[tuple[int, Species, dict[str, Any]]] = []
    for one, row in wanted:
        number = by_identity.get(row["identity"])
        if number is None:
            number = free.pop(one.name, None)
        if number is None:
            new.append((one, row))
            continue
        rows[one.name] = number
        if stored[number] != row:
            changed.append((number, one, row))
    kept = set(rows.values())
    gone = [number for number, row in stored.items() if row["active"] and number not in kept]
    # Names may move from one species to another: set all aside before any is set anew.
    aside = [(number,) for number in (*gone, *(number for number, _, _ in changed))]
    conn.executemany("UPDATE species SET active = 0 WHERE id = ?", aside)
    if changed:
        sets = ", ".join(f"{column} = :{column}" for column in columns)
        conn.executemany(
            f"UPDATE species SET {sets} WHERE id = :id", [{**row, "id": number} for number, _, row in changed]
        )
    rows |= insert_species(conn, new, own=0)
    set_names(conn, [(number, one) for number, one, _ in changed])
    settle_species(conn)
    return rows, len(new), len(changed)


def insert_species(
    conn: sqlite3.Connection, new: Sequence[tuple[Species, Mapping[str, Any]]], *, own: int
) -> dict[str, int]:
    """Insert species with their names: name to row id."""
    start = conn.execute("SELECT coalesce(max(id), 0) + 1 FROM species").fetchone()[0]
    rows = {one.name: start + i for i, (one, _) in enumerate(new)}
    if new:
        columns = ("id", "canon", "own", "active", *new[0][1])
        values = ((rows[one.name], rows[one.name], own, 1, *row.values()) for one, row in new)
        insert_rows(conn, "species", columns, values)
    insert = _insert_names if len(new) < _MANY else _insert_many_names
    insert(conn, ((rows[one.name], *name) for one, _ in new for name in sorted(name_rows(one))))
    return rows


def _insert_many_names(conn: sqlite3.Connection, rows: Iterable[tuple[int, str, str, str]]) -> None:
    """As :func:`_insert_names`; the trigram index in one statement, ten times faster than by its trigger."""
    last = conn.execute("SELECT coalesce(max(num), 0) FROM name").fetchone()[0]
    with without(conn, "name_indexed"):
        _insert_names(conn, rows)
        sql = "INSERT INTO name_trigram (rowid, folded) SELECT num, folded FROM name_text WHERE num > ?"
        conn.execute(sql, (last,))


def _insert_names(conn: sqlite3.Connection, rows: Iterable[tuple[int, str, str, str]]) -> None:
    insert_rows(conn, "name", ("species", "kind", "folded", "text"), rows)


def set_names(conn: sqlite3.Connection, species: Iterable[tuple[int, Species]]) -> None:
    """Make the names of species what their records say."""
    for number, one in species:
        sql = "SELECT kind, folded, text, num FROM name WHERE species = ?"
        old = {row[:3]: row[3] for row in conn.execute(sql, (number,))}
        new = name_rows(one)
        conn.executemany("DELETE FROM name WHERE num = ?", [(num,) for row, num in old.items() if row not in new])
        _insert_names(conn, ((number, *row) for row in sorted(new - old.keys())))


def settle_species(conn: sqlite3.Connection) -> None:
    """Say for each row of ``species`` which row stands for it.

    The user's row stands for the base's rows with its identity or name; the base's present row stands for one that the
    base no longer holds, where they share the name.
    """
    conn.execute("UPDATE species SET canon = id WHERE canon <> id")
    same = "FROM species t WHERE t.id <> species.id AND (t.identity = species.identity OR t.name = species.name)"
    conn.execute(
        f"UPDATE species SET canon = (SELECT t.id {same} AND t.active = 1 ORDER BY t.id LIMIT 1)"
        f" WHERE own = 0 AND active = 0 AND EXISTS (SELECT 1 {same} AND t.active = 1)"
    )
    for number, mark, name in conn.execute(
        "SELECT id, identity, name FROM species WHERE own = 1 ORDER BY id"
    ).fetchall():
        conn.execute("UPDATE species SET canon = ? WHERE own = 0 AND (identity = ? OR name = ?)", (number, mark, name))


def put_entries(
    conn: sqlite3.Connection, held: Sequence[Member], species: Mapping[str, Species], tell: Progress | None = None
) -> dict[str, int]:
    """Insert entries that are missing, and carriers: entry id to row number."""
    columns = ("id", "identity", *(f'"{name}"' for name in HASHED))
    marks = {name: identity(one) for name, one in species.items()}
    done = 0
    todo = iter(held)
    while chunk := list(islice(todo, _CHUNK)):
        rows = ((m.entry.id, marks[m.entry.species], *(m.row or hashed_row(m.entry))) for m in chunk)
        # What the trigger sees to, that an entry which is there stays as it is, OR IGNORE does as well.
        with without(conn, *(("entry_once",) if len(chunk) >= _MANY else ())):
            insert_rows(conn, "entry", columns, rows, ignore=True)
        done += len(chunk)
        if tell is not None and (done == len(held) or done % (4 * _CHUNK) == 0):
            tell(f"wrote {done} of {len(held)} entries")
    numbers: dict[str, int]
    if len(held) < 100:
        find = "SELECT num FROM entry WHERE id = ?"
        numbers = {m.entry.id: conn.execute(find, (m.entry.id,)).fetchone()[0] for m in held}
    else:
        numbers = dict(conn.execute("SELECT id, num FROM entry"))
    columns = ("entry", "package", "version", "file", "row", "how")
    carriers = (_carrier_row(numbers[m.entry.id], carrier) for m in held for carrier in m.carriers)
    insert_rows(conn, "carrier", columns, carriers, ignore=True)
    return numbers


def _carrier_row(number: int, carrier: Carrier) -> tuple[Any, ...]:
    row = -1 if carrier.row is None else carrier.row
    return (number, carrier.package, carrier.version, carrier.file, row, carrier.how)
