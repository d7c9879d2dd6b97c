"""Heat capacities of ideal gases by hyperbolic functions: F. A. Aly and L. L. Lee, Fluid Phase Equilib. 6 (1981)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, ClassVar, Self

import numpy as np

from propdb.cp._base import PiecewiseEquation, set_field
from propdb.cp._blocks import Kernel
from propdb.cp._formula import FormulaKernel
from propdb.cp._params import check_range, number, numbers, only
from propdb.errors import EquationError

__all__ = ["AlyLee"]


class _AlyLeeKernel(FormulaKernel):
    """Written with exp(-2 C/T), which neither overflows nor cancels; h and s are 0 at 0 K but for A."""

    __slots__ = ("_a", "_b", "_c", "_d", "_e")

    def __init__(self, coefficients: Sequence[float]) -> None:
        super().__init__()
        self._a, self._b, c, self._d, e = coefficients
        self._c, self._e = abs(c), abs(e)  # both terms are even

    def cp_of(self, x: Any) -> Any:
        total = self._a * np.ones_like(x)
        if self._b:
            z = self._c / x
            w = z * np.exp(-z) / -np.expm1(-2.0 * z)
            total = total + 4.0 * self._b * (w * w)
        if self._d:
            z = self._e / x
            w = z * np.exp(-z) / (1.0 + np.exp(-2.0 * z))
            total = total + 4.0 * self._d * (w * w)
        return total

    def h_of(self, x: Any) -> Any:
        total = self._a * x
        if self._b:
            z = 2.0 * self._c / x
            total = total + 2.0 * self._b * self._c * (np.exp(-z) / -np.expm1(-z))
        if self._d:
            w = np.exp(-2.0 * self._e / x)
            total = total + 2.0 * self._d * self._e * (w / (1.0 + w))
        return total

    def s_of(self, x: Any) -> Any:
        total = self._a * np.log(x)
        if self._b:
            z = 2.0 * self._c / x
            gap = -np.expm1(-z)
            total = total + self._b * (z * (np.exp(-z) / gap) - np.log(gap))
        if self._d:
            z = 2.0 * self._e / x
            w = np.exp(-z)
            total = total + self._d * (z * (w / (1.0 + w)) + np.log1p(w))
        return total


@dataclass(frozen=True, slots=True)
class AlyLee(PiecewiseEquation):
    """cp = A + B [(C/T)/sinh(C/T)]^2 + D [(E/T)/cosh(E/T)]^2, an ideal gas.

    Parameters
    ----------
    coefficients : sequence of float
        A, B, C, D, E: A, B, D [J/mol/K], C, E [K].
    tmin, tmax : float
        Range [K].

    Raises
    ------
    EquationError
        If there are not five coefficients, a number is not finite, C is 0 with B, E with D, or the range is not one.
    """

    coefficients: tuple[float, ...]
    tmin: float
    tmax: float
    kernels: tuple[Kernel, ...] = field(init=False, repr=False, compare=False)
    joints: tuple[float, ...] = field(init=False, repr=False, compare=False)

    name: ClassVar[str] = "aly-lee"

    def __post_init__(self) -> None:
        coefficients = numbers(self.coefficients, "coefficients", count=5)
        tmin, tmax = number(self.tmin, "tmin"), number(self.tmax, "tmax")
        check_range(tmin, tmax)
        _, b, c, d, e = coefficients
        for factor, temperature, which in ((b, c, "C"), (d, e, "E")):
            if factor and not temperature:
                raise EquationError(f"{which} must not be 0", hint="it divides the temperature; add its term to A")
        kernel = _AlyLeeKernel(coefficients)
        set_field(self, coefficients=coefficients, tmin=tmin, tmax=tmax, kernels=(kernel,), joints=())

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"coefficients", "tmin", "tmax"}`."""
        only(params, ("coefficients", "tmin", "tmax"))
        return cls(**params)

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        return {"coefficients": list(self.coefficients), "tmin": self.tmin, "tmax": self.tmax}
