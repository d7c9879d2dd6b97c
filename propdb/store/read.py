"""Reading a store: plain ``sqlite3``, records out."""

# ruff: noqa: S608 - what is put into SQL texts here are constants of this package; every value is bound
from __future__ import annotations

import json
import os
import sqlite3
from collections.abc import Iterator, Mapping
from datetime import date, datetime
from types import MappingProxyType
from typing import Any, Final

from propdb.errors import Ambiguous, NotFound
from propdb.model.crosscheck import Crosscheck
from propdb.model.records import Carrier, Entry, Source, Species
from propdb.store.crosschecks import CROSSCHECK_COLUMNS, crosscheck_from
from propdb.store.rows import ENTRY_COLUMNS, carrier_from, entry_from, frozen, sources_of, species_of
from propdb.store.view import LOGGED, MEMBER, View

__all__ = ["Reader"]

#: Memberships with the rows of ``species`` that list them (s) and that stand for these (t), from either end.
_BY_SPECIES: Final = "species t CROSS JOIN species s ON s.canon = t.id CROSS JOIN base_entry b ON b.species = s.id"
_BY_ENTRY: Final = "base_entry b CROSS JOIN species s ON s.id = b.species CROSS JOIN species t ON t.id = s.canon"
_COLUMNS: Final = f"e.num, e.id, t.name, b.own, b.status, b.note, b.printed, {LOGGED}, {ENTRY_COLUMNS}"
_AHEAD: Final = 8  # columns before those of the entry
_NONE: Final = object()
#: A species that the base or the user holds, or that has entries.
SEEN: Final = (
    "(active = 1 OR own = 1 OR EXISTS"
    f" (SELECT 1 FROM species s CROSS JOIN base_entry b ON b.species = s.id WHERE s.canon = species.id AND {MEMBER}))"
)


class Reader(View):
    """A store as its readers see it: what is active, with its present status.

    Parameters
    ----------
    store : path or connection
        A path is opened read-only and closed by :meth:`close`; a connection (of
        :func:`~propdb.store.open.open_store`) stays the caller's.
    as_of : str, date or datetime, optional
        The last base and the events up to then; a date counts to its end (UTC). Species, sources, datums and policy are
        those of today.

    Raises
    ------
    StoreError, StoreBusy
        As :func:`~propdb.store.open.open_store`; ``reason`` is ``empty`` for a store without a base.
    InvalidInput, NotFound
        Not a date; no base that old.

    Notes
    -----
    Entries are immutable, so each is decoded once per reader. A look-up is repeated from memory only while SQLite says
    that nothing has been written (``PRAGMA data_version``), so status and notes are always those of now.
    """

    def __init__(
        self, store: str | os.PathLike[str] | sqlite3.Connection, *, as_of: str | date | datetime | None = None
    ) -> None:
        self._decoded: dict[int, Entry] = {}
        self._carriers: dict[tuple[Any, ...], Carrier] = {}
        self._checks: dict[tuple[Any, ...], Crosscheck] = {}
        self._species: dict[str, Species] = {}
        self._entries: dict[str, tuple[Entry, ...]] = {}
        self._sources: dict[str, Source] = {}
        super().__init__(store, as_of=as_of)

    def _forget(self) -> None:
        self._species.clear()
        self._entries.clear()
        self._sources.clear()

    def species(self, name: str) -> Species:
        """The species with this primary name, exactly as written.

        Raises
        ------
        NotFound
        """
        self._fresh()
        found = self._species.get(name)
        if found is None:
            with self._snapshot(fresh=False):
                values = self._view | {"name": name}
                row = next(species_of(self.conn, f"canon = id AND name = :name AND {SEEN}", values), None)
            if row is None:
                raise NotFound(f"no species {name!r}", hint="`propdb find` looks for names, formulas and CAS RNs")
            found = self._species[name] = row[1]
        return found

    def all_species(self) -> tuple[Species, ...]:
        """Every species, by name."""
        with self._snapshot():
            return tuple(one for _, one in species_of(self.conn, f"canon = id AND {SEEN}", self._view))

    def entries(self, species: str) -> tuple[Entry, ...]:
        """The active entries of a species by its primary name, whatever their status; by quantity, phase, form, source.

        Raises
        ------
        NotFound
            No such species. A species without entries gives an empty tuple.
        """
        self._fresh()
        found = self._entries.get(species)
        if found is None:
            with self._snapshot(fresh=False):
                found = self._read(_BY_SPECIES, "t.name = :name AND t.canon = t.id", self._view | {"name": species})
            if not found:
                self.species(species)
            self._entries[species] = found
        return found

    def entries_before(self, species: str) -> tuple[Entry, ...]:
        """As :meth:`entries`, had the base before the present one stayed: with the status of now, in no order.

        Empty where there was none before, or where it held nothing of the species.
        """
        with self._snapshot():
            before = self.base_before
            if before is None:
                return ()
            values = self._view | {"base": before, "name": species}
            return self._read(_BY_SPECIES, "t.name = :name AND t.canon = t.id", values)

    def _read(self, start: str, where: str, values: Mapping[str, Any]) -> tuple[Entry, ...]:
        """The active entries that ``where`` selects, starting from ``start``: SQL of this module."""
        execute = self.conn.execute
        rows: dict[int, tuple[Any, ...]] = {}
        for row in execute(
            f"SELECT {_COLUMNS} FROM {start} CROSS JOIN entry e ON e.num = b.entry WHERE {where} AND {MEMBER}",
            values,
        ):
            if row[0] in rows and row[3]:
                continue  # a base's word on status and note goes before the user's draft of the same entry
            rows[row[0]] = row
        carriers: dict[int, list[Carrier]] = {number: [] for number in rows}
        known = self._carriers
        for row in execute(
            "SELECT c.entry, c.package, c.version, c.file, c.row, c.how"
            f" FROM {start} CROSS JOIN carrier c ON c.entry = b.entry WHERE {where} AND {MEMBER}",
            values,
        ):
            key = row[1:]
            carrier = known.get(key)
            if carrier is None:
                carrier = known[key] = carrier_from(key)
            held = carriers[row[0]]
            if carrier not in held:  # an entry both own and of the base comes twice
                held.append(carrier)
        checks = self._crosschecks(start, where, values)
        found = [self._entry(row, tuple(carriers[number]), checks.get(number, ())) for number, row in rows.items()]
        found.sort(key=_order)
        return tuple(found)

    def _crosschecks(self, start: str, where: str, values: Mapping[str, Any]) -> dict[int, tuple[Crosscheck, ...]]:
        """Row number of an entry to what other compilations say: independent ones first, those shown only last."""
        found: dict[int, dict[tuple[Any, ...], Crosscheck]] = {}  # an entry both own and of the base comes twice
        known = self._checks
        for row in self.conn.execute(
            f"SELECT x.entry, {CROSSCHECK_COLUMNS} FROM {start} CROSS JOIN crosscheck x ON x.entry = b.entry"
            f" WHERE {where} AND {MEMBER} ORDER BY x.independent DESC, x.allowed IS NULL, x.compilation, x.temperature",
            values,
        ):
            key = row[1:]
            check = known.get(key)
            if check is None:
                check = known[key] = crosscheck_from(key)
            found.setdefault(row[0], {})[key] = check
        return {number: tuple(checks.values()) for number, checks in found.items()}

    def _entry(self, row: tuple[Any, ...], carriers: tuple[Carrier, ...], checks: tuple[Crosscheck, ...]) -> Entry:
        """The record of a row of ``_COLUMNS``; the one made before where nothing about it has changed."""
        num, number, species, _, status, note, printed, logged = row[:_AHEAD]
        decided, status = logged is not None, logged or status
        known = self._decoded.get(num)
        beside = (status, note, species, carriers, decided, checks)
        if known is not None and beside == (
            known.status,
            known.note,
            known.species,
            known.carriers,
            known.decided,
            known.crosschecks,
        ):
            return known
        entry = entry_from(
            number,
            species,
            row[_AHEAD:],
            printed=bool(printed),
            status=status,
            note=note,
            carriers=carriers,
            decided=decided,
            crosschecks=checks,
            params=known.params if known is not None else None,
        )
        self._decoded[num] = entry
        return entry

    def entry(self, prefix: str) -> Entry:
        """One active entry by its id or the beginning of it.

        Raises
        ------
        NotFound
            None, or one that is no longer active.
        Ambiguous
            Several ids begin like that.
        """
        wanted = prefix.strip().lower()
        gone: list[tuple[str]] = []
        entries: tuple[Entry, ...] = ()
        if wanted:
            span = {"low": wanted, "high": wanted + "g"}  # the digits of an id end with f
            with self._snapshot():
                numbers = "b.entry IN (SELECT num FROM entry WHERE id >= :low AND id < :high ORDER BY id LIMIT 50)"
                entries = self._read(_BY_ENTRY, numbers, self._view | span)
                if not entries:
                    sql = "SELECT id FROM entry WHERE id >= :low AND id < :high LIMIT 2"
                    gone = self.conn.execute(sql, span).fetchall()
        if len(entries) == 1:
            return entries[0]
        if entries:
            ids = sorted(entry.id for entry in entries)
            shown = ", ".join(ids[:5])
            raise Ambiguous(f"several entries begin with {prefix!r}: {shown}", hint="type more of it", candidates=ids)
        if len(gone) == 1:
            if self._fixed is not None:
                raise NotFound(f"the entry {gone[0][0]} was not in the store then", hint="leave --as-of out")
            raise NotFound(f"the entry {gone[0][0]} is not active: the present base no longer holds it")
        raise NotFound(f"no entry {prefix!r}", hint="`propdb show SPECIES` lists ids")

    def every_entry(self) -> Iterator[tuple[Species, tuple[Entry, ...]]]:
        """Every species that has active entries, by name, with them; read in a few large selects."""
        with self._snapshot():
            by_name = {one.name: one for _, one in species_of(self.conn, "canon = id")}
            found = self._read(_BY_ENTRY, "1", self._view)
        by_species: dict[str, list[Entry]] = {}
        for entry in found:
            by_species.setdefault(entry.species, []).append(entry)
        for name, entries in by_species.items():
            yield by_name[name], tuple(entries)

    def own_entries(self) -> tuple[tuple[Species, Entry], ...]:
        """The entries that people added, with their species."""
        with self._snapshot():
            # Mostly there are none, and looking at the members alone says so ten times sooner.
            if self.conn.execute("SELECT 1 FROM base_entry WHERE own = 1 LIMIT 1").fetchone() is None:
                return ()
            found = self._read(_BY_ENTRY, "b.own = 1", self._view)
            return tuple((self.species(entry.species), entry) for entry in found)

    def entries_of_source(self, key: str) -> tuple[Entry, ...]:
        """The active entries of a source, by species."""
        with self._snapshot():
            numbers = "b.entry IN (SELECT num FROM entry WHERE source = :key)"
            return self._read(_BY_ENTRY, numbers, self._view | {"key": key})

    def source(self, key: str) -> Source:
        """A source by its key.

        Raises
        ------
        NotFound
        """
        self._fresh()
        found = self._sources.get(key)
        if found is None:
            with self._snapshot(fresh=False):
                # Also one that the base no longer holds: older entries cite it.
                found = next(sources_of(self.conn, "key = ?", (key,)), None)
            if found is None:
                raise NotFound(f"no source {key!r}", hint="`propdb source list` lists them")
            self._sources[key] = found
        return found

    def sources(self) -> tuple[Source, ...]:
        """Every source that the base or the user holds, by key."""
        with self._snapshot():
            found: dict[str, Source] = {}
            for source in sources_of(self.conn, "own = 1 OR active = 1"):
                found.setdefault(source.key, source)
        return tuple(found.values())

    def _bodies(self, table: str, key: str, body: str) -> dict[str, Any]:
        sql = f"SELECT {key}, {body} FROM {table} WHERE own = 1 OR active = 1 ORDER BY own, {key}"
        with self._snapshot():
            rows = self.conn.execute(sql).fetchall()
        return {name: frozen(json.loads(text)) for name, text in rows}  # the user's come later and win

    def datum_rows(self) -> dict[str, Mapping[str, Any]]:
        """Datum name to its definition as it was given, lists as tuples; the user's goes before the base's."""
        return self._bodies("datum", "name", "body")

    def policies(self) -> Mapping[str, Any]:
        """The whole policy, lists as tuples, tables read-only; the user's goes before the base's."""
        return MappingProxyType(self._bodies("policy", "key", "value"))

    def policy(self, key: str, default: Any = _NONE) -> Any:
        """One value of :meth:`policies`, without reading the others; ``default`` where there is none, if given.

        Raises
        ------
        NotFound
        """
        sql = "SELECT value FROM policy WHERE key = ? AND (own = 1 OR active = 1) ORDER BY own DESC LIMIT 1"
        with self._snapshot():
            row = self.conn.execute(sql, (key,)).fetchone()
        if row is not None:
            return frozen(json.loads(row[0]))
        if default is not _NONE:
            return default
        found = self.policies()
        raise NotFound(f"the policy has no {key!r}", hint=f"it has {', '.join(found)}" if found else "")

    def info(self) -> dict[str, Any]:
        """Path, schema, base, log head and counts; see :func:`propdb.store.counts.info`."""
        from propdb.store import counts

        return counts.info(self)

    def coverage(self, *, usable: bool = True) -> dict[str, Any]:
        """Species and entries by quantity, phase and source; see :func:`propdb.store.counts.coverage`."""
        from propdb.store import counts

        return counts.coverage(self, usable=usable)

    def path_species(self) -> dict[str, list[str]]:
        """Species with a complete path; see :func:`propdb.store.counts.path_species`."""
        from propdb.store import counts

        return counts.path_species(self)


def _order(entry: Entry) -> tuple[Any, ...]:
    return (
        entry.species,
        entry.quantity,
        entry.phase,
        entry.form,
        entry.to,
        entry.source,
        entry.equation,
        -1.0 if entry.temperature is None else entry.temperature,
        -1.0 if entry.tmin is None else entry.tmin,
        entry.id,
    )
