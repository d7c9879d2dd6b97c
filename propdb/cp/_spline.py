"""The formula of a tabulated heat capacity: a cubic between neighbouring temperatures, integrated in closed form.

Finding the interval of an unsorted temperature by bisection costs more than all the arithmetic. The range is
therefore also cut into equal cells, each holding its own cubic and quartic; the few cells that a node cuts in two are
marked with NaN and their temperatures go through bisection.
"""

from __future__ import annotations

import math
from bisect import bisect_left
from typing import Any

import numpy as np
from numpy.typing import NDArray

from propdb.cp._blocks import CP, FloatArray, H, Kind, S, Scratch

__all__ = ["SplineKernel", "monotone_cubics"]

_MAX_CELLS = 512
# Below this relative width the integral of cp/T is summed as a series: the closed form with its logarithm would lose
# (width)^-3 to cancellation. 20 terms reach 1e-17 at the limit.
_SERIES_WIDTH = 1.0 / 16.0
_SERIES_TERMS = 20


def monotone_cubics(x: NDArray[np.float64], y: NDArray[np.float64]) -> NDArray[np.float64]:
    """Cubics through points, without maxima and minima between them.

    Slopes by F. N. Fritsch and J. Butland, SIAM J. Sci. Stat. Comput. 1984, 5, 300: the weighted harmonic mean of both
    sides, 0 at an extremum; at the ends that of the parabola through three points, kept from turning round. SciPy has
    the same, and takes longer to import than a whole command may.

    Parameters
    ----------
    x, y : ndarray, shape (n,)
        Two points or more, x increasing.

    Returns
    -------
    ndarray, shape (n - 1, 4)
        y = sum(c_k (x - lower x)^k).
    """
    with np.errstate(all="ignore"):  # points too close together give what is not finite
        h = np.diff(x)
        rise = np.diff(y) / h
        slope = np.empty(len(x))
        if len(x) == 2:
            slope[:] = rise[0]
        else:
            left, right = rise[:-1], rise[1:]
            before, after = 2.0 * h[1:] + h[:-1], h[1:] + 2.0 * h[:-1]
            mean = (before + after) / (before / left + after / right)
            slope[1:-1] = np.where(np.sign(left) * np.sign(right) > 0.0, mean, 0.0)
            slope[0] = _end_slope(*h[:2].tolist(), *rise[:2].tolist())
            slope[-1] = _end_slope(*h[:-3:-1].tolist(), *rise[:-3:-1].tolist())
        bend = (slope[:-1] + slope[1:] - 2.0 * rise) / h
        return np.stack([y[:-1], slope[:-1], (rise - slope[:-1]) / h - bend, bend / h], axis=1)


def _end_slope(h0: float, h1: float, rise0: float, rise1: float) -> float:
    slope = ((2.0 * h0 + h1) * rise0 - h0 * rise1) / (h0 + h1)
    if slope * rise0 <= 0.0:
        return 0.0
    if rise0 * rise1 <= 0.0 and abs(slope) > 3.0 * abs(rise0):
        return 3.0 * rise0
    return slope


class SplineKernel:
    """Piecewise cubic cp with its integrals; see `Kernel` for the methods.

    Parameters
    ----------
    edges : ndarray, shape (n + 1,)
        Ends of the intervals, increasing [K].
    cubics : ndarray, shape (n, 4)
        cp = sum(c_k (T - lower edge)^k) [J/mol/K].
    steps : mapping of edge number to float
        Enthalpy added at an edge, going up [J/mol].
    breaks : set of edge numbers
        Edges where cp or h is discontinuous.
    h0, s0 : float
        h [J/mol] and s [J/mol/K] at the first edge.
    """

    __slots__ = (
        "_args",
        "_cell_arrays",
        "_cell_rows",
        "_cells",
        "_edges",
        "_h",
        "_inverse",
        "_last",
        "_nodes",
        "_rows",
        "_s",
    )

    def __init__(
        self,
        edges: NDArray[np.float64],
        cubics: NDArray[np.float64],
        steps: dict[int, float],
        breaks: frozenset[int],
        h0: float = 0.0,
        s0: float = 0.0,
    ) -> None:
        self._args = (edges, cubics, steps, breaks, h0, s0)
        count = len(cubics)
        self._edges = edges
        self._nodes: list[float] = edges.tolist()
        self._h = np.zeros((count, 5))  # quartics of h, constant first
        self._h[:, 1:] = cubics / np.arange(1.0, 5.0)
        quartics: list[list[float]] = self._h.tolist()
        h = h0
        for i, (row, width) in enumerate(zip(quartics, np.diff(edges).tolist(), strict=True)):
            row[0] = h + steps.get(i, 0.0)
            h = _horner(row, width)
        self._h[:, 0] = [row[0] for row in quartics]
        self._rows: tuple[list[list[float]], ...] = (cubics.tolist(), quartics)
        self._s: tuple[FloatArray, FloatArray, list[list[float]]] | None = None
        self._make_cells(breaks)

    def _entropies(self) -> tuple[FloatArray, FloatArray, list[list[float]]]:
        """Anchors and rows of the entropy, the rows as lists too; made when first asked for, as enthalpies need none.

        Two threads that ask at once make the same.
        """
        if self._s is not None:
            return self._s
        edges, cubics, steps, _, _, s = self._args
        nodes = self._nodes
        # One row more at either end, for what lies beyond the table: there a series need not converge.
        beyond = _about(cubics[-1:], edges[-1:] - edges[-2:-1], 1.0)[0].tolist()
        rows = [_entropy_row(nodes[0], cubics[0].tolist(), math.inf)]
        rows[0][0] = s
        for i, cubic in enumerate(cubics.tolist()):
            row = _entropy_row(nodes[i], cubic, nodes[i + 1])
            row[0] = s = s + steps.get(i, 0.0) / nodes[i]
            s = _entropy(row, nodes[i], nodes[i + 1] - nodes[i])
            rows.append(row)
        rows.append(_entropy_row(nodes[-1], beyond, math.inf))
        rows[-1][0] = s
        made = self._s = np.concatenate([edges[:1], edges]), np.array(rows), rows
        return made

    def _make_cells(self, breaks: frozenset[int]) -> None:
        edges, (_, cubics, *_) = self._edges, self._args
        width = _cell_width(edges)
        self._inverse = 1.0 / width
        count = math.ceil(edges[-1] / width) + 1
        self._last = float(count - 1)
        number = np.arange(count)
        left, right = number * width, (number + 1) * width
        slack = 1e-12 * right
        i = np.searchsorted(edges, left + slack, side="right") - 1
        whole = (i >= 0) & (i < len(cubics))
        i[~whole] = 0
        from_edge, to_edge = left - edges[i], edges[i + 1] - right
        whole &= to_edge >= -slack
        # Rounding may put a temperature next to a cell's edge into the neighbouring cell. That is harmless where the
        # curve is continuous, and wrong at a split.
        split = np.isin(np.arange(len(edges)), list(breaks))
        whole &= ~((split[i] & (from_edge <= slack)) | (split[i + 1] & (to_edge <= slack)))
        by_kind = []
        for rows in (cubics, self._h):
            cells = _about(rows[i], from_edge, width)
            cells[~whole] = np.nan
            by_kind.append(cells)
        # Of the hundreds of cells a single temperature needs one: they become lists as they are asked for.
        self._cell_arrays = tuple(by_kind)
        self._cell_rows: tuple[dict[int, list[float]], ...] = ({}, {})
        # Coefficients in pairs: one look-up of 16 bytes costs what one of 8 bytes does.
        cp, h = by_kind
        self._cells = (_pairs(cp), _pairs(h[:, :4])), np.ascontiguousarray(h[:, 4])

    def value(self, kind: Kind, t: float) -> float:
        scaled = t * self._inverse
        if kind != S and scaled < self._last:
            number = int(scaled)
            row = self._cell_rows[kind].get(number)
            if row is None:
                row = self._cell_rows[kind][number] = self._cell_arrays[kind][number].tolist()
            value = _horner(row, scaled - number)
            if value == value:
                return value
        if kind == S:
            i = bisect_left(self._nodes, t)
            anchor = self._nodes[max(i - 1, 0)]
            return _entropy(self._entropies()[2][i], anchor, t - anchor)
        i = bisect_left(self._nodes, t, 1, len(self._nodes) - 1) - 1
        return _horner(self._rows[kind][i], t - self._nodes[i])

    def fill(self, kind: Kind, x: FloatArray, out: FloatArray, scratch: Scratch) -> None:
        if kind == S or x.size == 0:
            out[...] = self._by_bisection(kind, x)
            return
        n = x.size
        number, top, paired = scratch.gather(n)
        u, whole = scratch.a(n), scratch.b(n)
        np.multiply(x, self._inverse, u)
        if float(np.maximum.reduce(u)) > self._last:
            np.minimum(u, self._last, out=u)  # the last cell lies beyond the table and is marked
        np.floor(u, whole)
        np.copyto(number, whole, casting="unsafe")
        np.subtract(u, whole, u)
        ((first, second), quartic) = self._cells[0][kind], self._cells[1]
        np.take(second, number, out=paired, mode="clip")
        total = whole
        if kind == H:
            np.take(quartic, number, out=top, mode="clip")
            np.multiply(top, u, total)
            np.add(total, paired.imag, total)
            np.multiply(total, u, total)
        else:
            np.multiply(paired.imag, u, total)
        np.add(total, paired.real, total)
        np.multiply(total, u, total)
        np.take(first, number, out=paired, mode="clip")
        np.add(total, paired.imag, total)
        np.multiply(total, u, total)
        np.add(total, paired.real, out)
        (cut,) = np.isnan(out).nonzero()
        if cut.size:
            out[cut] = self._by_bisection(kind, x[cut])

    def _by_bisection(self, kind: Kind, x: FloatArray) -> FloatArray:
        if kind == S:
            i = np.searchsorted(self._edges, x, side="left")
            anchors, rows, _ = self._entropies()
            anchor = anchors[i]
            u = x - anchor
            total = rows[i, -1] * u
            for column in range(rows.shape[1] - 2, 1, -1):
                total = (total + rows[i, column]) * u
            return np.asarray(rows[i, 0] + rows[i, 1] * np.log1p(u / anchor) + total)
        i = np.searchsorted(self._edges[1:-1], x, side="left")
        u = x - self._edges[i]
        rows = self._args[1] if kind == CP else self._h
        total = rows[i, -1] * u
        for column in range(rows.shape[1] - 2, 0, -1):
            total = (total + rows[i, column]) * u
        return np.asarray(total + rows[i, 0])

    def divides(self, kind: Kind) -> bool:
        return False

    def shifted(self, dh: float, ds: float) -> SplineKernel:
        edges, cubics, steps, breaks, h0, s0 = self._args
        return SplineKernel(edges, cubics, steps, breaks, h0 + dh, s0 + ds)

    def __reduce__(self) -> tuple[Any, ...]:
        return (SplineKernel, self._args)


def _horner(row: list[float], u: float) -> float:
    total = row[-1]
    for c in row[-2::-1]:
        total = total * u + c
    return total


def _entropy(row: list[float], edge: float, u: float) -> float:
    constant, log_coefficient, *series = row
    total = series[-1] * u
    for c in series[-2::-1]:
        total = (total + c) * u
    return constant + log_coefficient * float(np.log1p(u / edge)) + total


def _entropy_row(edge: float, cubic: list[float], end: float) -> list[float]:
    """The integral of p(u)/(edge + u) up to `end`: constant (0), coefficient of ln(1 + u/edge), those of u, u^2, ..."""
    series = [0.0] * _SERIES_TERMS
    if (end - edge) / edge < _SERIES_WIDTH:
        quotient = 0.0  # power series of p(u)/(edge + u)
        for k in range(_SERIES_TERMS):
            quotient = ((cubic[k] if k < 4 else 0.0) - quotient) / edge
            series[k] = quotient / (k + 1)
        return [0.0, 0.0, *series]
    remainder = 0.0  # p(u) = (u + edge) q(u) + p(-edge)
    for k in (3, 2, 1):
        remainder = cubic[k] - edge * remainder
        series[k - 1] = remainder / k
    return [0.0, cubic[0] - edge * remainder, *series]


def _cell_width(edges: FloatArray) -> float:
    """The width [K] for which nodes cut the smallest share of the cells."""
    spacing = np.diff(edges)
    candidates = {float(edges[-1]) / _MAX_CELLS}
    for base in (float(np.median(spacing)), float(spacing.min()), float(spacing.max())):
        candidates |= {base / parts for parts in (1, 2, 4, 5, 8, 10)}
    inner: list[float] = edges[1:-1].tolist()
    best, best_share = math.inf, math.inf
    for width in sorted(candidates, reverse=True):
        if edges[-1] / width > _MAX_CELLS:
            continue
        places = [node / width for node in inner]
        cut = {math.floor(place) for place in places if abs(place - round(place)) > 1e-9}
        share = len(cut) * width
        if share < best_share:
            best, best_share = width, share
    return best


def _about(rows: FloatArray, shift: FloatArray, width: float) -> FloatArray:
    """Coefficients, a polynomial per row, of the same polynomials in (u - shift)/width."""
    rows = rows.copy()
    last = rows.shape[1] - 1
    for k in range(last):
        for j in range(last - 1, k - 1, -1):
            rows[:, j] += shift * rows[:, j + 1]
    return np.asarray(rows * width ** np.arange(last + 1))


def _pairs(rows: FloatArray) -> tuple[NDArray[np.complex128], NDArray[np.complex128]]:
    """Columns 0 and 1, and 2 and 3, as real and imaginary parts."""
    return rows[:, 0] + 1j * rows[:, 1], rows[:, 2] + 1j * rows[:, 3]
