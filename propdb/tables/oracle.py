"""The one thread that asks the store: connections and levels belong to the thread that made them."""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from threading import get_ident
from typing import TypeVar

from propdb.levels.engine import Levels
from propdb.model.records import Datum, Species

__all__ = ["Basis", "Oracle"]

T = TypeVar("T")


@dataclass(frozen=True)
class Basis:
    """What a table needs of a store: look-ups, levels, and the stamp that says which store it was."""

    species: Callable[[str], Species]
    datum: Callable[[str], Datum]
    levels: Levels
    stamp: str
    datums: Callable[[], list[Datum]]
    close: Callable[[], None]


class Oracle:
    """Answers questions about a store from any thread, one after the other.

    Parameters
    ----------
    opener : callable
        Opens the store and gives its :class:`Basis`; called once, in the thread of the oracle. A picklable opener
        makes a picklable oracle, which opens the store anew where it arrives.
    """

    def __init__(self, opener: Callable[[], Basis]) -> None:
        self._opener = opener
        self._pool: ThreadPoolExecutor | None = None
        self._basis: Basis | None = None
        self._thread = 0

    def __reduce__(self) -> tuple[type[Oracle], tuple[Callable[[], Basis]]]:
        return (Oracle, (self._opener,))

    def ask(self, question: Callable[[Basis], T]) -> T:
        """Run ``question`` on the basis; what it raises is raised here."""
        if get_ident() == self._thread and self._basis is not None:
            return question(self._basis)
        if self._pool is None:
            self._pool = ThreadPoolExecutor(1, "propdb-oracle")
        return self._pool.submit(self._answer, question).result()

    def _answer(self, question: Callable[[Basis], T]) -> T:
        if self._basis is None:
            self._basis = self._opener()
            self._thread = get_ident()
        return question(self._basis)

    def close(self) -> None:
        """Close the store and end the thread."""
        if self._pool is not None:
            basis = self._basis
            if basis is not None:
                self._pool.submit(basis.close).result()
            self._pool.shutdown()
            self._pool = self._basis = None
            self._thread = 0
