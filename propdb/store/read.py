"""Reading a store: plain ``sqlite3``, records out."""

# ruff: noqa: S608 - what is put into SQL texts here are constants of this package; every value is bound
from __future__ import annotations

import json
import os
import sqlite3
from collections.abc import Iterator, Mapping
from contextlib import suppress
from datetime import date, datetime
from types import MappingProxyType, TracebackType
from typing import Any, Final, Self

from propdb.errors import Ambiguous, NotFound, PropdbError, StoreError
from propdb.model.records import Carrier, Entry, Source, Species
from propdb.store import log
from propdb.store.open import mapped, open_store, path_of, translate
from propdb.store.rows import ENTRY_COLUMNS, carrier_from, entry_from, frozen, sources_of, species_of

__all__ = ["Reader"]

#: The status that the log gives an entry, as of seq :limit.
_LOGGED: Final = "(SELECT v.status FROM event v WHERE v.entry = e.id AND v.status <> '' AND v.seq <= :limit ORDER BY v.seq DESC LIMIT 1)"
#: What is a member at present: of the base, or own. A base's word on status and note goes before the user's draft.
_MEMBER: Final = "(b.base = :base OR (b.own = 1 AND b.base <= :limit))"
_SELECT: Final = (
    f"SELECT e.num, e.id, b.species, b.status, b.note, b.printed, {_LOGGED}, {ENTRY_COLUMNS}"
    " FROM base_entry b CROSS JOIN entry e ON e.num = b.entry"
)
_AHEAD: Final = 7  # columns of _SELECT before those of the entry
_CARRIERS: Final = (
    "SELECT c.entry, c.package, c.version, c.file, c.row, c.how"
    " FROM base_entry b CROSS JOIN carrier c ON c.entry = b.entry"
)


class Reader:
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
    NotFound
        No base that old.

    Notes
    -----
    Entries are immutable, so each is decoded once per reader. A look-up is repeated from memory only while SQLite says
    that nothing has been written (``PRAGMA data_version``); so status and notes are always those of now.
    """

    def __init__(
        self, store: str | os.PathLike[str] | sqlite3.Connection, *, as_of: str | date | datetime | None = None
    ) -> None:
        if isinstance(store, sqlite3.Connection):
            self.conn, self.path, self._mine = store, path_of(store), False
        else:
            self.path, self._mine = os.fspath(store), True
            self.conn = open_store(store)
        self._decoded: dict[int, Entry] = {}
        self._species: dict[str, Species] = {}
        self._entries: dict[str, tuple[Entry, ...]] = {}
        self._sources: dict[str, Source] = {}
        self._token: tuple[int, int] | None = None
        try:
            with mapped(self.path):
                self._fixed = None if as_of is None else log.seq_at(self.conn, as_of)
                self._fresh()
        except BaseException:
            self.close()
            raise

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def close(self) -> None:
        """Close the connection, if it was opened here."""
        if self._mine:
            with suppress(sqlite3.Error):
                self.conn.close()

    # -- what is current
    # ------------------------------------------------------------------------------------------------

    def _fresh(self) -> None:
        """Forget what was read before the last write, of this connection or of another."""
        try:
            token = (self.conn.execute("PRAGMA data_version").fetchone()[0], self.conn.total_changes)
            if token == self._token:
                return
            self._species.clear()
            self._entries.clear()
            self._sources.clear()
            limit = self._fixed
            if limit is None:
                limit = self.conn.execute("SELECT max(seq) FROM event").fetchone()[0] or 0
            base = log.last_base(self.conn, limit)
        except sqlite3.Error as error:
            raise self._translated(error) from error
        if base is None:
            raise StoreError(
                "it holds no data yet",
                where=f"store {self.path}",
                reason="empty",
                hint=f"type `propdb store rebuild --store {self.path}`",
            )
        self._base = base
        self._view = {"base": base.seq, "limit": limit}
        self._token = token

    def _translated(self, error: BaseException) -> PropdbError:
        return translate(error, self.path) or StoreError(str(error), where=f"store {self.path}")

    def _snapshot(self) -> _Snapshot:
        """Context in which all reads see one state of the store."""
        return _Snapshot(self)

    @property
    def base(self) -> log.Event:
        """The base event that holds; ``payload`` has ``content_hash`` and ``versions``."""
        self._fresh()
        return self._base

    @property
    def content_hash(self) -> str:
        """Content hash of the base, SHA-256 in hex."""
        return str(self.base.payload["content_hash"])

    @property
    def head(self) -> str:
        """Hash of the last event (as of the date asked for)."""
        with self._snapshot():
            row = self.conn.execute("SELECT hash FROM event WHERE seq = :limit", self._view).fetchone()
        return str(row[0])

    def events(self, entry: str | None = None) -> tuple[log.Event, ...]:
        """The log (as of the date asked for), of one entry by its whole id, or all of it."""
        self._fresh()
        return log.events(self.conn, entry, limit=self._view["limit"])

    # -- species
    # --------------------------------------------------------------------------------------------------------

    _SEEN: Final = (
        f"(active = 1 OR own = 1 OR EXISTS (SELECT 1 FROM base_entry b WHERE b.species = species.id AND {_MEMBER}))"
    )

    def species(self, name: str) -> Species:
        """The species with this primary name, exactly as written.

        Raises
        ------
        NotFound
        """
        self._fresh()
        found = self._species.get(name)
        if found is None:
            with self._snapshot():
                row = next(
                    species_of(self.conn, "canon = id AND name = :name AND " + self._SEEN, self._view | {"name": name}),
                    None,
                )
            if row is None:
                raise NotFound(f"no species {name!r}", hint="`propdb find` looks for names, formulas and CAS RNs")
            found = self._species[name] = row[1]
        return found

    def all_species(self) -> tuple[Species, ...]:
        """Every species, by name."""
        with self._snapshot():
            return tuple(one for _, one in species_of(self.conn, "canon = id AND " + self._SEEN, self._view))

    # -- entries
    # --------------------------------------------------------------------------------------------------------

    def entries(self, species: str) -> tuple[Entry, ...]:
        """The active entries of a species by its primary name, whatever their status; by quantity, phase, form,
        source, id.

        Raises
        ------
        NotFound
            No such species. A species without entries gives an empty tuple.
        """
        self._fresh()
        found = self._entries.get(species)
        if found is None:
            with self._snapshot():
                view = self._view | {"name": species}
                rows = [
                    number
                    for (number,) in self.conn.execute(
                        "SELECT s.id FROM species c JOIN species s ON s.canon = c.id"
                        " WHERE c.name = :name AND c.canon = c.id",
                        view,
                    )
                ]
                found = self._entries_where("b.species = :row", [view | {"row": number} for number in rows], species)
            if not found:
                self.species(species)
            self._entries[species] = found
        return found

    def _entries_where(self, where: str, views: list[dict[str, Any]], species: str | None = None) -> tuple[Entry, ...]:
        """Entries, of one species or of all, that ``where`` selects, which is SQL of this module."""
        execute = self.conn.execute
        names: dict[int, str] = {}
        if species is None:
            names = dict(execute("SELECT s.id, c.name FROM species s JOIN species c ON c.id = s.canon"))
        carriers: dict[int, list[Carrier]] = {}
        rows: dict[int, tuple[Any, ...]] = {}
        for view in views:
            for number, *rest in execute(f"{_CARRIERS} WHERE {where} AND {_MEMBER}", view):
                carriers.setdefault(number, []).append(carrier_from(tuple(rest)))
            for row in execute(f"{_SELECT} WHERE {where} AND {_MEMBER} ORDER BY b.own", view):
                rows.setdefault(row[0], row)
        found = [
            self._entry(
                row, species if species is not None else names[row[2]], tuple(dict.fromkeys(carriers.get(number, ())))
            )
            for number, row in rows.items()
        ]
        found.sort(key=_order)
        return tuple(found)

    def _entry(self, row: tuple[Any, ...], species: str, carriers: tuple[Carrier, ...]) -> Entry:
        """The record of a row of ``_SELECT``; the one made before where nothing about it has changed."""
        num, number, _, status, note, printed, logged = row[:_AHEAD]
        status = logged or status
        known = self._decoded.get(num)
        if known is not None:
            if (known.status, known.note, known.species, known.carriers) == (status, note, species, carriers):
                return known
            params: Mapping[str, Any] | None = known.params
        else:
            params = None
        entry = entry_from(
            number,
            species,
            row[_AHEAD:],
            printed=bool(printed),
            status=status,
            note=note,
            carriers=carriers,
            params=params,
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
        with self._snapshot():
            found = (
                self.conn.execute(
                    "SELECT num, id FROM entry WHERE id >= ? AND id < ? ORDER BY id LIMIT 6", (wanted, wanted + "g")
                ).fetchall()
                if wanted
                else []
            )
            entries = [
                entry
                for num, _ in found
                for entry in self._entries_where("b.entry = :num", [self._view | {"num": num}])
            ]
        if len(entries) == 1:
            return entries[0]
        if entries:
            ids = [entry.id for entry in entries]
            raise Ambiguous(
                f"several entries begin with {prefix!r}: {', '.join(ids[:5])}", hint="type more of it", candidates=ids
            )
        if len(found) == 1:
            raise NotFound(f"the entry {found[0][1]} is not active: the present base no longer holds it")
        raise NotFound(f"no entry {prefix!r}", hint="`propdb show SPECIES` lists ids")

    def every_entry(self) -> Iterator[tuple[Species, tuple[Entry, ...]]]:
        """Every species that has active entries, by name, with them; read in a few large selects."""
        with self._snapshot():
            by_name = {one.name: one for _, one in species_of(self.conn, "canon = id", ())}
            found = self._entries_where("1", [dict(self._view)])
        by_species: dict[str, list[Entry]] = {}
        for entry in found:
            by_species.setdefault(entry.species, []).append(entry)
        for name in sorted(by_species):
            yield by_name[name], tuple(by_species[name])

    def entries_of_source(self, key: str) -> tuple[Entry, ...]:
        """The active entries of a source, by species."""
        with self._snapshot():
            return self._entries_where("e.source = :key", [self._view | {"key": key}])

    # -- sources, datums, policy
    # ----------------------------------------------------------------------------------------

    def source(self, key: str) -> Source:
        """A source by its key.

        Raises
        ------
        NotFound
        """
        self._fresh()
        found = self._sources.get(key)
        if found is None:
            with self._snapshot():
                # One that the base no longer holds is still cited by older entries: it comes last.
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

    def datum_rows(self) -> dict[str, Mapping[str, Any]]:
        """Datum name to its definition as it was given, lists as tuples; the user's goes before the base's."""
        with self._snapshot():
            rows = self.conn.execute(
                "SELECT name, body FROM datum WHERE own = 1 OR active = 1 ORDER BY own, name"
            ).fetchall()
        return {name: frozen(json.loads(body)) for name, body in rows}

    def policy(self, key: str) -> Any:
        """A value of the policy (lists as tuples, tables read-only); the user's before the base's.

        Raises
        ------
        NotFound
        """
        with self._snapshot():
            row = self.conn.execute(
                "SELECT value FROM policy WHERE key = ? AND (own = 1 OR active = 1) ORDER BY own DESC LIMIT 1", (key,)
            ).fetchone()
        if row is None:
            raise NotFound(f"the policy has no {key!r}")
        return frozen(json.loads(row[0]))

    def policies(self) -> Mapping[str, Any]:
        """The whole policy."""
        with self._snapshot():
            rows = self.conn.execute(
                "SELECT key, value FROM policy WHERE own = 1 OR active = 1 ORDER BY own, key"
            ).fetchall()
        return MappingProxyType({key: frozen(json.loads(value)) for key, value in rows})

    # -- counts
    # ---------------------------------------------------------------------------------------------------------

    def info(self) -> dict[str, Any]:
        """Path, schema, base, log head and counts of a store; see :func:`propdb.store.counts.info`."""
        from propdb.store import counts

        return counts.info(self)

    def coverage(self, *, usable: bool = True) -> dict[str, Any]:
        """What the store covers; see :func:`propdb.store.counts.coverage`."""
        from propdb.store import counts

        return counts.coverage(self, usable=usable)


class _Snapshot:
    """A read transaction, unless one is open already; ``sqlite3`` errors are translated on the way out."""

    __slots__ = ("began", "reader")

    def __init__(self, reader: Reader) -> None:
        self.reader = reader
        self.began = False

    def __enter__(self) -> None:
        reader = self.reader
        if not reader.conn.in_transaction:
            try:
                reader.conn.execute("BEGIN")
            except sqlite3.Error as error:
                raise reader._translated(error) from error
            self.began = True
        try:
            reader._fresh()
        except BaseException:
            self._end()
            raise

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._end()
        if isinstance(error, sqlite3.Error):
            raise self.reader._translated(error) from error

    def _end(self) -> None:
        if self.began:
            with suppress(sqlite3.Error):
                self.reader.conn.execute("COMMIT")


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
