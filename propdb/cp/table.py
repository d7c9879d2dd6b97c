"""Tabulated heat capacities."""

from __future__ import annotations

import math
from bisect import bisect_left
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, ClassVar, Self

import numpy as np

from propdb.cp._base import PiecewiseEquation, set_field
from propdb.cp._blocks import (
    CP,
    FloatArray,
    Kernel,
    Kind,
    Temperatures,
    not_a_temperature,
    refuse,
    temperatures,
)
from propdb.cp._params import number, numbers, only, rows
from propdb.cp._spline import SplineKernel, monotone_cubics
from propdb.errors import EquationError, SplitError

__all__ = ["Table"]


@dataclass(frozen=True, slots=True)
class Table(PiecewiseEquation):
    """A heat capacity given at temperatures, a monotone cubic between neighbours.

    The curve is the piecewise cubic Hermite interpolant of F. N. Fritsch and J. Butland, SIAM J. Sci. Stat. Comput. 5
    (1984) 300-304. Between two printed values it never leaves their span, so it stays positive and h stays invertible,
    and a wrong value disturbs its neighbours only. The price is small: for nitrogen, printed to 0.001 J/mol/K every
    100 K, its h differs from the exact one by 0.3 J/mol over 2800 K, a spline of continuous curvature by 0.2.

    A temperature that stands twice splits the table: two phases or two sides of an anomaly. cp at a split is that of
    the side below. h and s count from `tmin` and refuse to cross a split until `with_transition` states its enthalpy.

    Parameters
    ----------
    temperatures : sequence of float
        Going up, each at most twice [K].
    values : sequence of float
        cp [J/mol/K].
    transitions : sequence of (float, float)
        Splits [K] with their enthalpy, going up in temperature [J/mol]; 0 is a statement.

    Raises
    ------
    EquationError
        If lists do not match, temperatures do not go up, a part has fewer than two temperatures, or a transition is
        not at a split.
    """

    temperatures: tuple[float, ...]
    values: tuple[float, ...]
    transitions: tuple[tuple[float, float], ...] = ()
    tmin: float = field(init=False, compare=False)
    tmax: float = field(init=False, compare=False)
    splits: tuple[float, ...] = field(init=False, compare=False)
    unstated: tuple[float, ...] = field(init=False, repr=False, compare=False)
    kernels: tuple[Kernel, ...] = field(init=False, repr=False, compare=False)
    joints: tuple[float, ...] = field(init=False, repr=False, compare=False)

    name: ClassVar[str] = "table"

    def __post_init__(self) -> None:
        nodes, values = numbers(self.temperatures, "T"), numbers(self.values, "cp")
        if len(nodes) != len(values):
            raise EquationError(f"{len(nodes)} temperatures do not match {len(values)} heat capacities")
        starts = _part_starts(nodes)
        splits = tuple(nodes[start] for start in starts[1:])
        stated: dict[float, float] = {}
        for position, pair in enumerate(self.transitions):
            t, dh = numbers(pair, f"transitions[{position}]", count=2)
            if t not in splits:
                raise EquationError(f"no split at {t!r} K", hint=f"splits are {splits or 'none'}")
            if t in stated:
                raise EquationError(f"two enthalpies for the split at {t!r} K")
            stated[t] = dh
        set_field(
            self,
            temperatures=nodes,
            values=values,
            transitions=tuple(sorted(stated.items())),
            tmin=nodes[0],
            tmax=nodes[-1],
            splits=splits,
            unstated=tuple(t for t in splits if t not in stated),
            kernels=(_kernel(nodes, values, starts, stated),),
            joints=(),
        )

    def with_transition(self, T: float, dh: float) -> Table:
        """The table with the enthalpy of one more transition.

        Parameters
        ----------
        T : float
            One of `splits` [K].
        dh : float
            Enthalpy of the upper side less that of the lower [J/mol]; 0 states that there is none (an anomaly that the
            heat capacity already holds, a glass step).

        Raises
        ------
        EquationError
            If `T` is not a split, already has an enthalpy, or `dh` is not finite.
        """
        return Table(self.temperatures, self.values, (*self.transitions, (T, dh)))

    def parts(self) -> tuple[Table, ...]:
        """The table cut at its splits: one `Table` without splits per side, going up."""
        starts = [*_part_starts(self.temperatures), len(self.temperatures)]
        return tuple(
            Table(self.temperatures[a:b], self.values[a:b]) for a, b in zip(starts[:-1], starts[1:], strict=True)
        )

    def _evaluate(self, kind: Kind, T: float | Temperatures, out: FloatArray | None) -> float | FloatArray:
        if kind != CP and self.unstated:
            self._refuse_crossing(self.tmin, T)
        return PiecewiseEquation._evaluate(self, kind, T, out)

    def _difference(self, kind: Kind, T1: float | Temperatures, T2: float | Temperatures) -> float | FloatArray:
        self._refuse_crossing(T1, T2)
        # Within one side the unstated enthalpies, counted as nothing, drop out.
        upper = PiecewiseEquation._evaluate(self, kind, T2, None)
        return upper - PiecewiseEquation._evaluate(self, kind, T1, None)

    def _refuse_crossing(self, T1: float | Temperatures, T2: float | Temperatures) -> None:
        if not self.unstated:
            return
        if isinstance(T1, (int, float)) and isinstance(T2, (int, float)):
            for t in (T1, T2):
                if not 0.0 < t < math.inf:
                    raise not_a_temperature(float(t))
            first, second = (bisect_left(self.unstated, t) for t in (T1, T2))
            crossed = [] if first == second else [self.unstated[min(first, second)]]
        else:
            x1, x2 = temperatures(T1), temperatures(T2)
            for x in (x1, x2):
                if not np.all((x > 0.0) & (x < math.inf)):
                    refuse(x)
            first_side, second_side = (np.searchsorted(self.unstated, x, side="left") for x in (x1, x2))
            lower = np.minimum(first_side, second_side)[first_side != second_side]
            crossed = [self.unstated[int(lower.min())]] if lower.size else []
        if crossed:
            raise SplitError(
                f"the table is split at {crossed[0]:g} K and the enthalpy of the transition is not stated",
                hint="state it (0 if there is none), or stay on one side",
                T=crossed[0],
            )

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"T", "cp"}`, with `"transitions": [{"T", "dh"}, ...]` if any is stated."""
        only(params, ("T", "cp"), ("transitions",))
        stated = []
        for row in rows(params["transitions"], "transitions") if params.get("transitions") else ():
            only(row, ("T", "dh"))
            stated.append((number(row["T"], "T"), number(row["dh"], "dh")))
        return cls(params["T"], params["cp"], tuple(stated))

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        stored: dict[str, Any] = {"T": list(self.temperatures), "cp": list(self.values)}
        if self.transitions:
            stored["transitions"] = [{"T": t, "dh": dh} for t, dh in self.transitions]
        return stored


def _part_starts(nodes: tuple[float, ...]) -> list[int]:
    """Positions where a side of the table begins."""
    if len(nodes) < 2 or not nodes[0] > 0.0:
        raise EquationError("a table needs at least two temperatures, all above 0 K")
    starts = [0]
    for position in range(1, len(nodes)):
        if nodes[position] < nodes[position - 1]:
            raise EquationError(f"temperatures must go up: {nodes[position]!r} follows {nodes[position - 1]!r}")
        if nodes[position] == nodes[position - 1]:
            starts.append(position)
    for start, stop in zip(starts, [*starts[1:], len(nodes)], strict=True):
        if stop - start < 2:
            raise EquationError(f"the side of the table at {nodes[start]!r} K has fewer than two temperatures")
    return starts


def _kernel(
    nodes: tuple[float, ...], values: tuple[float, ...], starts: list[int], stated: Mapping[float, float]
) -> SplineKernel:
    edges = [np.array(nodes[:1])]
    cubics, steps, breaks = [], {}, set()
    count = 0
    for start, stop in zip(starts, [*starts[1:], len(nodes)], strict=True):
        if start:
            breaks.add(count)
            steps[count] = stated.get(nodes[start], 0.0)
        x, y = np.array(nodes[start:stop]), np.array(values[start:stop])
        cubics.append(monotone_cubics(x, y))
        edges.append(x[1:])
        count += len(x) - 1
    coefficients = np.concatenate(cubics)
    if not math.isfinite(float(np.abs(coefficients).max())):
        raise EquationError("neighbouring temperatures lie too close together for a curve through their values")
    return SplineKernel(np.concatenate(edges), np.ascontiguousarray(coefficients), steps, frozenset(breaks))
