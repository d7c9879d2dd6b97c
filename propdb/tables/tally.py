"""What a run came to: rows by flag and by kind, samples of what went wrong, and what the streams add up to."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from threading import Lock
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from propdb.tables.kinds import BAD_ROW, EXTRAPOLATED, NO_DATA, OK, Key

if TYPE_CHECKING:
    from propdb.tables.core import Given, Plan, Rows
    from propdb.tables.streams import Streams
    from propdb.tables.varying import Used

__all__ = ["Sample", "Tally"]

_SAMPLES = 20


@dataclass(frozen=True, slots=True)
class Sample:
    """One row that is not ``ok``; ``row`` counts from 1 for the first row below the header."""

    row: int
    flag: str
    reason: str
    file: str = ""


@dataclass
class Tally:
    """Counts over all batches of a run. Batches may come from several threads; their order does not matter."""

    plan: Plan
    streams: Streams | None = None
    rows: int = 0
    verdicts: dict[int, int] = field(default_factory=dict)
    kinds: dict[int, int] = field(default_factory=dict)
    samples: list[Sample] = field(default_factory=list)
    firsts: dict[int, tuple[str, int]] = field(default_factory=dict)  # file and row where each verdict first stands
    _lock: Lock = field(default_factory=Lock)

    def add(
        self,
        given: Given,
        rows: Rows,
        verdicts: NDArray[np.int32],
        h: Callable[[], NDArray[np.float64]],
        *,
        first: int = 1,
        numbers: NDArray[np.int64] | None = None,
        file: str = "",
    ) -> None:
        """Add a batch; ``h`` gives its enthalpies, for streams.

        Rows have the ``numbers`` that are given, or go on from ``first``.
        """
        if self.streams is not None:
            self.streams.add(given, rows, h())

        def number_of(row: int) -> int:
            return first + row if numbers is None else int(numbers[row])

        kinds = rows.kinds
        by_verdict = np.bincount(verdicts).tolist() if len(verdicts) else []
        by_kind = [] if kinds is None or not len(kinds) else np.bincount(kinds).tolist()
        bad: list[int] = []
        firsts: list[tuple[int, int]] = []
        if len(by_verdict) > 1:
            places = np.flatnonzero(verdicts)
            bad = places[:_SAMPLES].tolist()
            kinds_of_bad, where = np.unique(verdicts[places], return_index=True)
            firsts = list(zip(kinds_of_bad.tolist(), places[where].tolist(), strict=True))
        with self._lock:
            self.rows += len(verdicts)
            for table, counts in ((self.verdicts, by_verdict), (self.kinds, by_kind)):
                for number, times in enumerate(counts):
                    if times:
                        table[number] = table.get(number, 0) + times
            for row in bad:
                flag, reason = self.plan.verdicts[verdicts[row]]
                self.samples.append(Sample(number_of(row), flag, reason, file))
            for number, row in firsts:
                self._first(number, file, number_of(row))
            if len(self.samples) > 50 * _SAMPLES:
                self._trim()

    def merge(
        self,
        rows: int,
        verdicts: Iterable[tuple[str, str, int, tuple[str, int]]],
        kinds: Iterable[tuple[Key, int]],
        samples: Iterable[Sample],
        used: Iterable[tuple[Key, Used]],
    ) -> None:
        """Add what another plan counted."""
        self.rows += rows
        for flag, reason, times, first in verdicts:
            number = self.plan.verdict(flag, reason)
            self.verdicts[number] = self.verdicts.get(number, 0) + times
            self._first(number, *first)
        pairs = list(kinds)
        numbers = self.plan.kinds_of([key for key, _ in pairs]).tolist() if pairs else []
        for number, (_, times) in zip(numbers, pairs, strict=True):
            self.kinds[number] = self.kinds.get(number, 0) + times
        found = list(used)
        for number, (_, its) in zip(self.plan.kinds_of([key for key, _ in found]).tolist(), found, strict=True):
            if (varying := self.plan.kinds[number].varying) is not None:
                varying.used.add(its)
        self.samples += samples
        self._trim()

    def _first(self, number: int, file: str, row: int) -> None:
        self.firsts[number] = min((file, row), self.firsts.get(number, (file, row)))

    def counts(self) -> list[tuple[str, str, int, tuple[str, int]]]:
        """Flag, reason, rows, and the file and row where each first stands: for another tally to merge."""
        verdicts = self.plan.verdicts
        return [(*verdicts[n], times, self.firsts.get(n, ("", 0))) for n, times in self.verdicts.items()]

    def _trim(self) -> None:
        self.samples.sort(key=lambda s: (s.file, s.row))
        del self.samples[_SAMPLES:]

    def flags(self) -> dict[str, int]:
        """Rows by flag."""
        counts = dict.fromkeys((OK, EXTRAPOLATED, NO_DATA, BAD_ROW), 0)
        for number, times in self.verdicts.items():
            counts[self.plan.verdicts[number][0]] += times
        return counts

    def reasons(self, most: int = 50) -> list[dict[str, Any]]:
        """Reasons with the number of their rows and the first of them, the most frequent first."""
        found = [
            {"flag": flag, "reason": reason, "rows": times, "first_row": row} | ({"first_file": file} if file else {})
            for flag, reason, times, (file, row) in self.counts()
            if flag != OK
        ]
        found.sort(key=lambda r: -int(str(r["rows"])))
        return found[:most]

    def first_samples(self) -> list[Sample]:
        """The first rows that are not ``ok``."""
        self._trim()
        return self.samples
