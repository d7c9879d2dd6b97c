"""What a benchmark gives back: ratios of medians, measured side by side in one run.

A file ``*_speed.py`` in this directory has a function ``run()`` that yields :class:`Ratio`; ``scripts/bench`` prints
them. Seconds are never a target: they tell more about the machine than about propdb.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass
from statistics import median


@dataclass(frozen=True, slots=True)
class Ratio:
    """One measured ratio and its target."""

    what: str
    measured: float
    target: float
    at_least: bool = False  # the target is a floor; else a ceiling
    detail: str = ""  # the two medians, say

    @property
    def met(self) -> bool:
        return self.measured >= self.target if self.at_least else self.measured <= self.target


def seconds(action: Callable[[], object]) -> float:
    """Time of one call [s]."""
    begin = time.perf_counter()
    action()
    return time.perf_counter() - begin


def medians(*actions: Callable[[], object], rounds: int = 21) -> list[float]:
    """Median times [s] of actions that take turns, so that a slow spell of the machine hits all of them alike."""
    for action in actions:
        action()
    times: list[list[float]] = [[] for _ in actions]
    for _ in range(rounds):
        for action, taken in zip(actions, times, strict=True):
            taken.append(seconds(action))
    return [median(taken) for taken in times]
