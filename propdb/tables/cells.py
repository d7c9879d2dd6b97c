"""The temperature axis of a kind of row, cut where its value changes the equation it moves along."""

from __future__ import annotations

import math
from bisect import bisect_left
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

from propdb.errors import PropdbError
from propdb.levels.curves import BOILING_SLACK, PRINTED_SLACK, Curve
from propdb.levels.engine import Levels
from propdb.levels.states import MELTING_SLACK
from propdb.model.records import SAME_T, T_STANDARD, Datum, Part, Species, State
from propdb.tables.kinds import OK

__all__ = ["GRID", "Cell", "cells_of", "equation_at"]

#: Uncertainties are computed every so many kelvin and interpolated between [K].
GRID = 50.0


@dataclass
class Cell:
    """A stretch of temperature [K] in which each member moves along one equation, and what is known of it so far."""

    low: float
    high: float
    members: tuple[tuple[float, Any], ...] | None  # (coefficient, equation); None: ask for each temperature
    ready: bool = False
    flag: str = OK
    reason: str = ""
    base: float = math.nan  # value less the members' own antiderivatives [J/mol]
    standard: float = math.nan  # standard uncertainty at the middle [J/mol]
    grid: dict[int, float] = field(default_factory=dict)
    parts: dict[int, tuple[Part, ...]] = field(default_factory=dict)  # sensitivities at the nodes of the grid
    only: tuple[float, ...] | None = None  # the few temperatures that are known, where there is no heat capacity [K]

    def node(self, k: int) -> float:
        """Temperature of a node of the grid, inside the cell [K]."""
        return min(max(k * GRID, self.low + 1e-6), self.high - 1e-6)

    def middle(self) -> float:
        """The temperature at which the levels are asked [K]: the same whichever row comes first."""
        if self.only is not None:  # what the others get
            return max(self.only, default=T_STANDARD) + 1.0
        if self.low < T_STANDARD < self.high:
            return T_STANDARD
        if math.isinf(self.high):
            return self.low + 1.0
        return 0.5 * (self.low + self.high) if self.low > 0.0 else 0.9 * self.high


def cells_of(
    levels: Levels, species: Species, signed: Sequence[tuple[float, Datum]], *, phase: str, own: State | None
) -> list[Cell]:
    """Cut the axis wherever a member changes its equation, its form, or whether it can be at all."""
    schedule = sorted(
        {
            upper
            for _, datum in signed
            for element, _ in species.composition
            for upper, _ in datum.schedule.get(element, ())
            if math.isfinite(upper)
        }
    )
    cells: list[Cell] = []
    for low, high in zip([0.0, *schedule], [*schedule, math.inf], strict=True):
        inside = Cell(low, high, None).middle()
        members: list[tuple[float, str, str, str]] = []
        if own is not None:
            members.append((1.0, species.name, own.phase, own.form))
        try:
            for sign, datum in signed:
                for term in levels.zero_of(datum, species, phase=phase, temperature=inside).terms:
                    if term.zero.temperature == SAME_T:
                        state = State(term.zero.phase, None, term.zero.form)
                        state = levels.check(term.species, state)
                        members.append((sign * float(term.coefficient), term.species, state.phase, state.form))
        except PropdbError:
            cells.append(Cell(low, high, None))
            continue
        cells += _pieces(levels, low, high, members)
    return cells


def _pieces(levels: Levels, low: float, high: float, members: Sequence[tuple[float, str, str, str]]) -> list[Cell]:
    tracks = []
    marks: set[float] = set()
    for coefficient, name, phase, form in members:
        tree = levels.tree(name)
        track = tree.tracks.get((phase, form))
        if track is None and not levels._tables.get(name):
            known = tuple(n.temperature for n in tree.nodes if (n.phase, n.form) == (phase, form))
            return [Cell(low, high, None, only=known)]
        if not isinstance(track, Curve) or levels._tables.get(name):
            return [Cell(low, high, None)]
        tracks.append((coefficient, track))
        for i, piece in enumerate(track.pieces):
            marks |= {piece.tmin - PRINTED_SLACK, piece.tmax + PRINTED_SLACK}
            if i + 1 < len(track.pieces):
                marks.add(track._border(i))
        if phase == "l":
            for quantity, slack in (("Tm", -MELTING_SLACK), ("Tc", 0.0)):
                point = levels.value(name, quantity)
                if point is not None:
                    marks.add(point + slack)
            if track.boiling is not None:
                marks.add(track.boiling + BOILING_SLACK)
    ends = [low, *sorted(t for t in marks if low < t < high), high]
    cells = []
    for a, b in zip(ends, ends[1:], strict=False):
        inside = Cell(a, b, None).middle()
        chosen = [(coefficient, equation_at(track, inside)) for coefficient, track in tracks]
        complete = all(equation is not None for _, equation in chosen)
        cells.append(Cell(a, b, _merged(chosen) if complete else None))
    return cells


def equation_at(track: Curve, t: float) -> Any:
    """The equation that serves a temperature [K]; None where a heat capacity alone does not say the enthalpy."""
    if track.phase == "l" and track.boiling is not None and t > track.boiling + BOILING_SLACK:
        return None
    borders = [track._border(i) for i in range(len(track.pieces) - 1)]
    equation = track.pieces[bisect_left(borders, t)].equation
    return None if getattr(equation, "unstated", ()) else equation


def _merged(members: Sequence[tuple[float, Any]]) -> tuple[tuple[float, Any], ...]:
    """Members that move along one equation are one; those that cancel are none."""
    found: dict[int, tuple[float, Any]] = {}
    for coefficient, equation in members:
        old = found.get(id(equation), (0.0, equation))
        found[id(equation)] = (old[0] + coefficient, equation)
    return tuple((c, e) for c, e in found.values() if c)
