"""Kernels of equations that are not sums of powers: the formula stands once, for a number and for an array."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any, Self

import numpy as np

from propdb.cp._blocks import CP, FloatArray, H, Kind, Scratch
from propdb.errors import TemperatureOutOfRange

__all__ = ["CriticalKernel", "FormulaKernel", "horner", "log_sums"]


class FormulaKernel:
    """Subclasses give `cp_of`, `h_of` and `s_of`; see `Kernel` for the methods.

    They use numpy's arithmetic and elementary functions only, so that a number and an array take the same operations
    in the same order.
    """

    __slots__ = ("dh", "ds")

    def __init__(self) -> None:
        self.dh = 0.0
        self.ds = 0.0

    def cp_of(self, x: Any) -> Any:
        """Heat capacity [J/mol/K]."""
        raise NotImplementedError

    def h_of(self, x: Any) -> Any:
        """Its integral [J/mol]."""
        raise NotImplementedError

    def s_of(self, x: Any) -> Any:
        """Its integral over T [J/mol/K]."""
        raise NotImplementedError

    def _of(self, kind: Kind, x: Any) -> Any:
        if kind == CP:
            return self.cp_of(x)
        return self.h_of(x) + self.dh if kind == H else self.s_of(x) + self.ds

    def value(self, kind: Kind, t: float) -> float:
        try:
            with np.errstate(divide="raise", over="raise", invalid="raise", under="ignore"):
                return float(self._of(kind, np.float64(t)))
        except FloatingPointError:
            return math.inf

    def fill(self, kind: Kind, x: FloatArray, out: FloatArray, scratch: Scratch) -> None:
        out[...] = self._of(kind, x)

    def divides(self, kind: Kind) -> bool:
        return False

    def shifted(self, dh: float, ds: float) -> Self:
        other = object.__new__(type(self))
        for cls in type(self).__mro__:
            for name in getattr(cls, "__slots__", ()):
                setattr(other, name, getattr(self, name))
        other.dh += dh
        other.ds += ds
        return other


def horner(coefficients: Sequence[float], x: Any) -> Any:
    """sum(c_n x^n), constant first; at least one coefficient."""
    total = coefficients[-1] * np.ones_like(x)
    for c in coefficients[-2::-1]:
        total = total * x + c
    return total


def log_sums(coefficients: Sequence[float]) -> tuple[float, list[float]]:
    """The integral of sum(c_n x^n)/(1 - x) from 0 to x.

    Returns
    -------
    k : float
        The integral is -k ln(1 - x) + sum(d_n x^n).
    d : list of float
        Constant (zero) first, as many as coefficients.
    """
    # x^n/(1 - x) integrates to -ln(1 - x) - sum(x^i/i, i = 1..n).
    above = [sum(coefficients[i:]) for i in range(1, len(coefficients))]
    return sum(coefficients), [0.0, *(-c / i for i, c in enumerate(above, start=1))]


class CriticalKernel(FormulaKernel):
    """cp = inverse/t + logarithm ln(t) + sum(c_n t^n), t = 1 - T/Tc: liquids on their way to the critical point.

    Parameters
    ----------
    tc : float
        Critical temperature [K].
    inverse, logarithm : float
        [J/mol/K]
    powers : sequence of float
        The c_n, constant first [J/mol/K].
    """

    __slots__ = ("_h", "_inverse", "_logarithm", "_of_log", "_powers", "_s", "_tc")

    def __init__(self, *, tc: float, inverse: float, logarithm: float, powers: Sequence[float]) -> None:
        super().__init__()
        self._tc = tc
        self._inverse, self._logarithm = inverse, logarithm
        self._powers = tuple(powers)
        self._h = (0.0, *(c / n for n, c in enumerate(powers, start=1)))
        # dT/T = -dt/(1 - t); 1/(t (1 - t)) = 1/t + 1/(1 - t)
        k, sums = log_sums(self._powers)
        self._of_log = k + inverse
        self._s = tuple(sums)

    def _t(self, x: Any) -> Any:
        t = (self._tc - x) / self._tc
        if not np.all(t > 0.0):
            raise TemperatureOutOfRange(
                f"{float(np.max(x)):.7g} K is at or above the critical temperature {self._tc:.7g} K",
                hint="a liquid ends there",
                ranges=[(0.0, self._tc)],
            )
        return t

    def cp_of(self, x: Any) -> Any:
        t = self._t(x)
        return self._inverse / t + self._logarithm * np.log(t) + horner(self._powers, t)

    def h_of(self, x: Any) -> Any:
        t = self._t(x)
        logs = np.log(t)
        return -self._tc * (self._inverse * logs + self._logarithm * (t * logs - t) + horner(self._h, t))

    def s_of(self, x: Any) -> Any:
        t = self._t(x)
        total = self._of_log * np.log(x / self._tc) - self._inverse * np.log(t) - horner(self._s, t)
        if self._logarithm:
            # ln(t)/(1 - t) integrates to the dilogarithm of 1 - t, which scipy calls spence(t).
            from scipy.special import spence

            total = total - self._logarithm * spence(t)
        return total
