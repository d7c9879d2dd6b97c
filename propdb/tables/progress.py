"""How far a long run is: share, rows, rate, time left."""

from __future__ import annotations

import time
from collections.abc import Callable

__all__ = ["Progress"]


class Progress:
    """Tells a line now and then.

    Parameters
    ----------
    tell : callable, optional
        Gets each line.
    every : float
        Seconds between lines [s].
    """

    def __init__(self, tell: Callable[[str], None] | None, *, every: float = 0.5) -> None:
        self._tell = tell
        self._every = every
        self._begin = time.monotonic()
        self._last = self._begin
        self.rows = 0

    def step(self, rows: int, share: float) -> None:
        """``rows`` more are done, ``share`` of all (0 to 1)."""
        self.rows += rows
        if self._tell is None:
            return
        now = time.monotonic()
        if now - self._last < self._every:
            return
        self._last = now
        spent = now - self._begin
        rate = self.rows / spent
        left = spent * (1.0 - share) / share if share > 0.0 else 0.0
        self._tell(f"{share:4.0%}  {self.rows:,} rows  {rate:,.0f} rows/s  {_clock(left)} left")

    def seconds(self) -> float:
        """Time since the start [s]."""
        return time.monotonic() - self._begin


def _clock(seconds: float) -> str:
    whole = round(seconds)
    if whole < 60:
        return f"{whole} s"
    if whole < 3600:
        return f"{whole // 60} min {whole % 60} s"
    return f"{whole // 3600} h {whole % 3600 // 60} min"
