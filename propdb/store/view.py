"""What is current in a store: which base, up to which event, and whether anything was written since."""

from __future__ import annotations

import os
import sqlite3
from contextlib import suppress
from datetime import date, datetime
from types import TracebackType
from typing import Any, Final, Self

from propdb.errors import PropdbError, StoreError
from propdb.store import log
from propdb.store.open import mapped, open_store, path_of, translate

__all__ = ["LOGGED", "MEMBER", "View"]

#: SQL: the status that the log gives the entry ``e``, as of seq :limit; NULL where it says nothing.
LOGGED: Final = (
    "(SELECT v.status FROM event v WHERE v.entry = e.id AND v.status <> '' AND v.seq <= :limit"
    " ORDER BY v.seq DESC LIMIT 1)"
)
#: SQL: ``b`` is a member at present, of the base or as own.
MEMBER: Final = "(b.base = :base OR (b.own = 1 AND b.base <= :limit))"


class View:
    """A connection, and what holds in it. See :class:`propdb.store.read.Reader` for the parameters and errors."""

    def __init__(
        self, store: str | os.PathLike[str] | sqlite3.Connection, *, as_of: str | date | datetime | None = None
    ) -> None:
        if isinstance(store, sqlite3.Connection):
            self.conn, self.path, self._mine = store, path_of(store), False
        else:
            self.conn, self.path, self._mine = open_store(store), os.fspath(store), True
        self._token: tuple[int, int] | None = None
        self._base: log.Event
        self._view: dict[str, Any]
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

    def _forget(self) -> None:
        """Something was written: what was read before may no longer hold."""

    def _fresh(self) -> None:
        """Notice what was written since the last look, by this connection or by another."""
        try:
            token = (self.conn.execute("PRAGMA data_version").fetchone()[0], self.conn.total_changes)
            if token == self._token:
                return
            self._forget()
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
        self._base, self._view, self._token = base, {"base": base.seq, "limit": limit}, token

    def _translated(self, error: BaseException) -> PropdbError:
        return translate(error, self.path) or StoreError(str(error), where=f"store {self.path}")

    def _snapshot(self, *, fresh: bool = True) -> _Snapshot:
        """Context in which all reads see one state of the store. ``fresh=False`` right after :meth:`_fresh`."""
        return _Snapshot(self, fresh)

    @property
    def base(self) -> log.Event:
        """The base event that holds; ``payload`` has ``content_hash`` and ``versions``."""
        self._fresh()
        return self._base

    @property
    def base_before(self) -> int | None:
        """Seq of the base before the one that holds; None where that is the first."""
        with self._snapshot():
            sql = "SELECT max(seq) FROM event WHERE kind = 'base' AND seq < :base"
            found: int | None = self.conn.execute(sql, {"base": self._view["base"]}).fetchone()[0]
        return found

    @property
    def content_hash(self) -> str:
        """Content hash of the base, SHA-256 in hex."""
        return str(self.base.payload.get("content_hash", ""))

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


class _Snapshot:
    """A read transaction, unless one is open already; ``sqlite3`` errors are translated on the way out."""

    __slots__ = ("began", "fresh", "view")

    def __init__(self, view: View, fresh: bool) -> None:
        self.view = view
        self.fresh = fresh
        self.began = False

    def __enter__(self) -> None:
        view = self.view
        try:
            if not view.conn.in_transaction:
                view.conn.execute("BEGIN")
                self.began = True
            if self.fresh:
                view._fresh()
        except BaseException as error:
            self._end()
            if isinstance(error, sqlite3.Error):
                raise view._translated(error) from error
            raise

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._end()
        if isinstance(error, sqlite3.Error):
            raise self.view._translated(error) from error

    def _end(self) -> None:
        if self.began:
            with suppress(sqlite3.Error):
                self.view.conn.execute("COMMIT")
