"""Whole tables: convert, evaluate and add them up; make them."""

from __future__ import annotations

from typing import TYPE_CHECKING

from propdb.api.core import Core
from propdb.store.search import resolve

if TYPE_CHECKING:
    from propdb.tables.oracle import Basis

__all__ = ["Tables", "open_basis"]


def open_basis(path: str, as_of: str | None, source: str | None, extrapolate: bool) -> Basis:
    """Open a store for table work, in the thread or process that asks."""
    store = Core(path, as_of=as_of)
    return store_basis(store, source, extrapolate)


def store_basis(store: Core, source: str | None, extrapolate: bool) -> Basis:
    """What tables need of a store that is open."""
    from propdb.tables.oracle import Basis

    levels = store._engine(source, extrapolate)
    return Basis(
        species=lambda text: resolve(store._reader, text),
        datum=store.datum_show,
        levels=levels,
        stamp=store._stamp,
        datums=store.datum_list,
        close=store.close,
    )


class Tables(Core):
    """``convert-table``, ``tabulate``."""
