"""Shifts and enthalpies as functions of temperature, for many rows at once.

The temperature axis is cut into cells, in each of which every member (an element at the temperature of the state, the
state itself) moves along one equation. At one temperature of a cell the levels give the value; from there the
equations' own integrals lead to each row, so a row costs two evaluations per member and agrees with the scalar answer
to rounding. Cells where a state does not move along an equation (water's formulation, a liquid above its boiling
point, a pinned table) ask the levels for each distinct temperature.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Mapping, Sequence
from contextlib import suppress
from dataclasses import dataclass, field
from functools import partial
from typing import Any

import numpy as np
from numpy.typing import NDArray

from propdb.errors import PropdbError
from propdb.levels.curves import Curve
from propdb.model.records import SAME_T, T_STANDARD, Datum, Part, Source, Species, State
from propdb.tables.cells import GRID, Cell, cells_of
from propdb.tables.kinds import EXTRAPOLATED, NO_DATA, OK, Point, enthalpy_at, out_of_range, shift_at
from propdb.tables.oracle import Basis

__all__ = ["Shared", "Used", "Varying", "vary_enthalpy", "vary_shift"]

FloatArray = NDArray[np.float64]

_MEMORY = 50_000
_SPAN = re.compile(r" \S+, \S+ K to \S+, \S+ K(?= is extrapolated)")
_MIDDLE = -1  # the node of a cell that is its middle


class Shared:
    """Integrals of equations over the temperatures of one batch: an element serves many species.

    Parameters
    ----------
    temperatures : ndarray
        Of the whole batch, each a temperature [K].
    users : mapping
        How many kinds of rows use an equation, by its id; the few that fewer than three use are evaluated for the
        rows that need them only. Decides the speed and nothing else.
    """

    def __init__(self, temperatures: FloatArray, users: Mapping[int, int]) -> None:
        self.temperatures = temperatures
        self.users = users
        self._found: dict[int, FloatArray] = {}

    def h(self, equation: Any, rows: NDArray[np.intp], mine: FloatArray) -> FloatArray:
        """Antiderivative of cp [J/mol] at ``rows``, whose temperatures are ``mine`` [K]."""
        key = id(equation)
        if self.users.get(key, 0) < 3 or len(rows) == len(self.temperatures):
            found: FloatArray = equation.h(mine)
            return found
        if key not in self._found:
            self._found[key] = equation.h(self.temperatures)
        return self._found[key][rows]


@dataclass
class Used:
    """What answers stood on."""

    entries: dict[str, None] = field(default_factory=dict)
    sources: dict[str, Source] = field(default_factory=dict)
    origins: dict[str, str] = field(default_factory=dict)  # source of each entry

    def add(self, other: Used | Point) -> None:
        """Add what others stood on."""
        self.entries.update(dict.fromkeys(other.entries))
        self.sources.update(other.sources)
        self.origins.update(other.origins)


class Varying:
    """A function of T for one kind of row.

    Parameters
    ----------
    ask : callable
        ``ask(temperature [K] or None, pressure [Pa] or None) -> Point``; must be called in the oracle's thread.
    cells : sequence
        Going up in temperature, without gaps.
    """

    def __init__(self, ask: Callable[[float | None, float | None], Point], cells: Sequence[Cell]) -> None:
        self._ask = ask
        self.cells = list(cells)
        self._ends = [cell.high for cell in self.cells]
        self._memory: dict[tuple[float, float], tuple[float, float, str, str, tuple[Part, ...]]] = {}
        self.used = Used()

    def equations(self) -> set[int]:
        """Ids of the equations it uses."""
        return {id(equation) for cell in self.cells for _, equation in cell.members or ()}

    def at(
        self,
        rows: NDArray[np.intp],
        temperatures: FloatArray,
        pressures: FloatArray | None,
        shared: Shared,
        run: Callable[[Callable[[], Any]], Any],
        verdict: Callable[[str, str], int],
    ) -> tuple[FloatArray, FloatArray, NDArray[np.int32]]:
        """Values and standard uncertainties [J/mol] and verdicts of some rows.

        Parameters
        ----------
        rows : ndarray
            Places in the batch.
        temperatures : ndarray
            Of those rows [K]; NaN where the pressure decides.
        pressures : ndarray, optional
            Of those rows [Pa].
        shared : Shared
            Integrals over the whole batch.
        run : callable
            Runs a function in the oracle's thread.
        verdict : callable
            ``verdict(flag, reason) -> number``.
        """
        size = len(rows)
        value, standard = np.full(size, np.nan), np.full(size, np.nan)
        verdicts = np.zeros(size, np.int32)
        cells = np.searchsorted(np.asarray(self._ends[:-1]), temperatures, side="left") if len(self.cells) > 1 else None
        first, last = (0, 0) if cells is None or not size else (int(cells.min()), int(cells.max()))
        for number in range(first, last + 1):
            cell = self.cells[number]
            whole = first == last
            mine = slice(None) if whole else np.flatnonzero(cells == number)
            t = temperatures[mine]
            if not len(t):
                continue
            p = None if pressures is None else pressures[mine]
            if cell.only is not None:
                if not cell.ready:
                    run(partial(self._prepare, cell))
                if cell.flag == NO_DATA and (other := ~np.isin(t, cell.only)).any():
                    verdicts[np.arange(size)[mine][other]] = verdict(NO_DATA, cell.reason)
                    mine = np.arange(size)[mine][~other]
                    t, p = temperatures[mine], None if pressures is None else pressures[mine]
            if cell.members is None:
                value[mine], standard[mine], verdicts[mine] = self._each(t, p, run, verdict)
                continue
            if not cell.ready:
                run(partial(self._prepare, cell))
            verdicts[mine] = verdict(cell.flag, cell.reason)
            if cell.flag == NO_DATA:
                continue
            here = rows[mine]
            try:
                total = _total(cell, here, t, shared)
            except PropdbError:  # an equation overflows at a temperature of the batch
                total = _one_by_one(cell, here, t)
                verdicts[np.arange(size)[mine][np.isnan(total)]] = verdict(NO_DATA, "too extreme a temperature")
            value[mine] = total
            standard[mine] = self._standard(cell, t, run)
            if cell.middle() == T_STANDARD and (unheated := t == T_STANDARD).any():  # nothing is heated there
                standard[mine] = np.where(unheated, cell.standard, standard[mine])
        standard[np.isnan(value)] = np.nan
        return value, standard, verdicts

    def _prepare(self, cell: Cell) -> None:
        t = cell.middle()
        try:
            point = self._ask(t, None)
        except PropdbError as error:
            cell.flag, cell.reason = NO_DATA, out_of_range(error)
        else:
            self.used.add(point)
            if t == T_STANDARD:  # nothing is heated there; elsewhere in the cell something is, by its entries
                with suppress(PropdbError):
                    self.used.add(self._ask(0.5 * (t + min(cell.high, 2.0 * t)), None))
            if point.extrapolated:
                cell.flag = EXTRAPOLATED
                reason = next((w for w in point.warnings if "extrapolated" in w), "extrapolated")
                cell.reason = _SPAN.sub("", reason)  # rows have other temperatures than the middle
            cell.base = point.value - sum(c * float(e.h(t)) for c, e in cell.members or ())
            cell.standard = point.standard
            cell.parts[_MIDDLE] = point.parts
        cell.ready = True

    def _standard(self, cell: Cell, t: FloatArray, run: Callable[[Callable[[], Any]], Any]) -> FloatArray | float:
        if math.isnan(cell.standard):
            return math.nan
        low, high = int(t.min() // GRID), int(t.max() // GRID) + 1
        missing = [k for k in range(low, high + 1) if k not in cell.grid]
        if missing:
            run(lambda: self._fill(cell, missing))
        known = [cell.grid[k] for k in range(low, high + 1)]
        if all(map(math.isnan, known)):
            return math.nan
        return np.interp(t, [cell.node(k) for k in range(low, high + 1)], known)

    def _fill(self, cell: Cell, nodes: Sequence[int]) -> None:
        for k in nodes:
            try:
                point = self._ask(cell.node(k), None)
            except PropdbError:
                cell.grid[k], cell.parts[k] = math.nan, ()
            else:
                cell.grid[k], cell.parts[k] = point.standard, point.parts

    def _each(
        self,
        t: FloatArray,
        p: FloatArray | None,
        run: Callable[[Callable[[], Any]], Any],
        verdict: Callable[[str, str], int],
    ) -> tuple[FloatArray, FloatArray, NDArray[np.int32]]:
        pairs = self._remember(t, p, run)
        found = [self._memory[pair] for pair in pairs]
        return (
            np.array([f[0] for f in found]),
            np.array([f[1] for f in found]),
            np.array([verdict(f[2], f[3]) for f in found], np.int32),
        )

    def _remember(
        self, t: FloatArray, p: FloatArray | None, run: Callable[[Callable[[], Any]], Any]
    ) -> list[tuple[float, float]]:
        """The temperature and pressure of each row, all of which are in memory now."""
        pairs = list(map(_hashable, zip(t.tolist(), [math.nan] * len(t) if p is None else p.tolist(), strict=True)))
        distinct = dict.fromkeys(pairs)
        wanted = [pair for pair in distinct if pair not in self._memory]
        if len(self._memory) + len(wanted) > _MEMORY:
            self._memory.clear()
            wanted = list(distinct)
        if wanted:
            run(lambda: self._look(wanted))
        return pairs

    def sensitivities(
        self, temperatures: FloatArray, pressures: FloatArray | None, run: Callable[[Callable[[], Any]], Any]
    ) -> dict[str, tuple[Part, FloatArray]]:
        """By entry: a part that says its standard error, and its coefficient in each row [J/mol].

        What rows share is fully correlated, so whoever adds rows up adds coefficients first. Along an equation they
        are interpolated between the nodes of the grid, as the uncertainties are. Parameters as in :meth:`at`; all
        rows must have a value there.
        """
        found: dict[str, tuple[Part, FloatArray]] = {}

        def add(part: Part, rows: Any, coefficients: Any) -> None:
            if part.entry not in found:
                found[part.entry] = (part, np.zeros(len(temperatures)))
            found[part.entry][1][rows] += coefficients

        cells = np.searchsorted(np.asarray(self._ends[:-1]), temperatures, side="left")
        for number in np.unique(cells).tolist():
            cell, mine = self.cells[number], np.flatnonzero(cells == number)
            t = temperatures[mine]
            if cell.members is None:
                places: dict[tuple[float, float], list[int]] = {}
                pairs = self._remember(t, None if pressures is None else pressures[mine], run)
                for row, pair in zip(mine.tolist(), pairs, strict=True):
                    places.setdefault(pair, []).append(row)
                for pair, rows in places.items():
                    for part in self._memory[pair][4]:
                        add(part, rows, part.coefficient)
                continue
            if not cell.ready:
                run(partial(self._prepare, cell))
            unheated = (t == T_STANDARD) if cell.middle() == T_STANDARD else np.zeros(len(t), np.bool_)
            for part in cell.parts.get(_MIDDLE, ()) if unheated.any() else ():
                add(part, mine[unheated], part.coefficient)
            mine, t = mine[~unheated], t[~unheated]
            if not len(t):
                continue
            nodes = range(int(t.min() // GRID), int(t.max() // GRID) + 2)
            if missing := [k for k in nodes if k not in cell.parts]:
                run(partial(self._fill, cell, missing))
            kelvin = [cell.node(k) for k in nodes]
            for part in {p.entry: p for k in nodes for p in cell.parts[k]}.values():
                known = [sum(p.coefficient for p in cell.parts[k] if p.entry == part.entry) for k in nodes]
                add(part, mine, np.interp(t, kelvin, known))
        return found

    def _look(self, wanted: Sequence[tuple[float, float]]) -> None:
        for t, p in wanted:
            try:
                point = self._ask(None if t < 0 else t, None if p < 0 else p)
            except PropdbError as error:
                self._memory[(t, p)] = (math.nan, math.nan, NO_DATA, out_of_range(error), ())
                continue
            self.used.add(point)
            flag = EXTRAPOLATED if point.extrapolated else OK
            reason = next((w for w in point.warnings if "extrapolated" in w), "") if point.extrapolated else ""
            self._memory[(t, p)] = (point.value, point.standard, flag, reason, point.parts)


def _total(cell: Cell, rows: NDArray[np.intp], t: FloatArray, shared: Shared) -> FloatArray:
    """Values [J/mol] of rows of one cell."""
    total = np.full(len(t), cell.base)
    for coefficient, equation in cell.members or ():
        h = shared.h(equation, rows, t)
        if coefficient == 1.0:
            total += h
        elif coefficient == -1.0:
            total -= h
        else:
            total += coefficient * h
    return total


def _one_by_one(cell: Cell, rows: NDArray[np.intp], t: FloatArray) -> FloatArray:
    """The same, NaN where an equation overflows."""
    total = np.full(len(t), math.nan)
    for i in range(len(t)):
        with suppress(PropdbError):
            total[i] = _total(cell, rows[i : i + 1], t[i : i + 1], Shared(t[i : i + 1], {}))[0]
    return total


def _hashable(pair: tuple[float, float]) -> tuple[float, float]:
    """NaN is not equal to itself, so a missing number is -1 as a key."""
    t, p = pair
    return (-1.0 if t != t else t, -1.0 if p != p else p)


def vary_shift(basis: Basis, species: Species, source: Datum, target: Datum, *, phase: str) -> Varying:
    """The shift between two datums of which one, or both, has its zero at the temperature of the state."""
    levels = basis.levels

    def ask(t: float | None, _: float | None) -> Point:
        return shift_at(levels, species, source, target, phase=phase, temperature=t)

    signed = [(sign, d) for sign, d in ((1.0, source), (-1.0, target)) if d.temperature == SAME_T]
    return Varying(ask, cells_of(levels, species, signed, phase=phase, own=None))


def vary_enthalpy(
    basis: Basis, species: Species, target: Datum, *, phase: str, form: str = "", saturated: str = ""
) -> Varying:
    """The enthalpy of a species in one phase on a datum.

    Raises NotFound or Ambiguous where the phase or form is none of the store.
    """
    levels = basis.levels
    state = levels.check(species.name, State(phase, None, form))

    def ask(t: float | None, p: float | None) -> Point:
        return enthalpy_at(levels, species, State(phase, t, state.form, p, saturated), target)  # type: ignore[arg-type]

    tree = levels.tree(species.name)
    track = tree.tracks.get((phase, state.form))
    if (
        saturated
        or phase == "fluid"
        or (track is not None and not isinstance(track, Curve))
        or levels._tables.get(species.name)
    ):
        return Varying(ask, [Cell(0.0, math.inf, None)])
    signed = [(-1.0, target)] if target.temperature == SAME_T else []
    return Varying(ask, cells_of(levels, species, signed, phase=phase, own=state))
