"""What users call: ``propdb.open()`` and the methods of :class:`Store`. Verb ``a-b`` is method ``a_b``.

This is the only place that triggers a build, and the only one that ties reading to computing. Each family of verbs is
one module with one class; :class:`Store` puts them together.
"""

from __future__ import annotations

import os
from pathlib import Path
from typing import TYPE_CHECKING

from propdb.api.care import Care
from propdb.api.enthalpies import Enthalpies
from propdb.api.fuels import Fuels
from propdb.api.intake import Intake
from propdb.api.opening import build_seed, to_stderr
from propdb.api.review import Review
from propdb.api.tables import Tables
from propdb.errors import StoreError
from propdb.store.open import default_path
from propdb.store.read import Reader

if TYPE_CHECKING:
    from datetime import date

__all__ = ["Store", "open"]


class Store(Enthalpies, Tables, Care, Review, Fuels, Intake):
    """One store file. Reading is lazy; every method opens what it needs. One per thread.

    Parameters
    ----------
    path : path
        The store file. It is opened when first needed, and only :meth:`store_rebuild` makes one.
    as_of : date or str, optional
        See :func:`open`.
    """


def _empty(place: Path) -> bool:
    """Was a first build killed, so that there is a file without data? Building again repairs it."""
    try:
        Reader(place).close()
    except StoreError as error:
        return error.fields.get("reason") == "empty"
    return False


def open(path: str | os.PathLike[str] | None = None, *, as_of: str | date | None = None) -> Store:
    """Open a store; the default one is built when it does not exist yet.

    Parameters
    ----------
    path : path, optional
        A store file, which must exist. Without it ``PROPDB_STORE``, else the user-data directory; a missing one is
        built, with progress on standard error.
    as_of : date or str, optional
        The store as it stood at the end of that day (UTC), or at that moment.

    Raises
    ------
    StoreError
        No such file, not a store, damaged, of a newer schema, or not writable where it must be built.
    """
    if path is None:
        place = default_path()
        if not place.exists() or _empty(place):
            build_seed(place, to_stderr)
    else:
        place = Path(path)
    store = Store(place, as_of=as_of)
    store._reader.head  # noqa: B018  (a file that is none must be refused here)
    return store
