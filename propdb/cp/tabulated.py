"""Tabulated enthalpies: h at temperatures, a monotone cubic between neighbours."""

from __future__ import annotations

import math
from bisect import bisect_right
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from propdb.cp._spline import monotone_cubics
from propdb.errors import EquationError, TemperatureOutOfRange

__all__ = ["EnthalpyTable"]


class EnthalpyTable:
    """Enthalpies of one phase at increasing temperatures, on whatever zero their table has.

    Between two rows the piecewise cubic Hermite interpolant of F. N. Fritsch and J. Butland (1984), which never leaves
    their span.

    Parameters
    ----------
    temperatures : sequence of float
        At least two, going up [K].
    enthalpies : sequence of float
        [J/mol]

    Raises
    ------
    EquationError
        If the lists do not match or the temperatures do not go up.
    """

    def __init__(self, temperatures: Sequence[float], enthalpies: Sequence[float]) -> None:
        t, h = [float(x) for x in temperatures], [float(x) for x in enthalpies]
        if len(t) != len(h):
            raise EquationError(f"{len(t)} temperatures do not match {len(h)} enthalpies")
        if len(t) < 2:
            raise EquationError("a table of enthalpies needs two rows or more")
        if not all(map(math.isfinite, (*t, *h))):
            raise EquationError("a table of enthalpies holds finite numbers only")
        low = next((b for a, b in zip(t, t[1:], strict=False) if b <= a), None)
        if low is not None:
            raise EquationError(f"temperatures go up from row to row, and {low:g} K does not")
        self.temperatures = tuple(t)
        self.enthalpies = tuple(h)
        self._cubics: list[list[float]] | None = None

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> EnthalpyTable:
        """From the stored form ``{"T": [...], "h": [...]}``."""
        try:
            return cls(params["T"], params["h"])
        except (KeyError, TypeError, ValueError):
            raise EquationError("a table of enthalpies has the lists T and h") from None

    @property
    def tmin(self) -> float:
        """First temperature [K]."""
        return self.temperatures[0]

    @property
    def tmax(self) -> float:
        """Last temperature [K]."""
        return self.temperatures[-1]

    def h(self, temperature: float) -> float:
        """Enthalpy [J/mol] at a temperature [K].

        Raises TemperatureOutOfRange outside the table: tables are never extrapolated.
        """
        if not self.tmin <= temperature <= self.tmax:
            raise TemperatureOutOfRange(
                f"the table of enthalpies does not reach {temperature:.7g} K",
                hint=f"it holds {self.tmin:.7g} to {self.tmax:.7g} K, and a table is never extrapolated",
                ranges=[(self.tmin, self.tmax)],
            )
        if temperature in self.temperatures:
            return self.enthalpies[self.temperatures.index(temperature)]
        if self._cubics is None:
            self._cubics = monotone_cubics(np.array(self.temperatures), np.array(self.enthalpies)).tolist()
        at = bisect_right(self.temperatures, temperature) - 1
        c0, c1, c2, c3 = self._cubics[at]
        x = temperature - self.temperatures[at]
        return c0 + x * (c1 + x * (c2 + x * c3))
