"""The equation for ideal gases of the Thermodynamics Research Center.

M. Frenkel, G. J. Kabo, K. N. Marsh, G. N. Roganov and R. C. Wilhoit, Thermodynamics of Organic Compounds in the Gas
State (1994); its last two terms are those of R. C. Wilhoit (1975). With the constants I and J of its tables h is
H(T) - H(0 K) and s the standard entropy.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, ClassVar, Self

import numpy as np

from propdb.cp._base import PiecewiseEquation, set_field
from propdb.cp._blocks import Kernel
from propdb.cp._formula import FormulaKernel, horner, log_sums
from propdb.cp._params import check_range, number, numbers, only
from propdb.errors import EquationError
from propdb.model.records import R_GAS

__all__ = ["TrcGas"]

# Above this ratio a7/a6 the closed form of s loses (a7/a6)^8 to cancellation, and its power series, which converges
# as (a6/a7)^n, is taken instead.
_SERIES_RATIO = 2.0
_SERIES_TERMS = 56


class _TrcKernel(FormulaKernel):
    """In y = (T - a7)/(T + a6), with w = a6 + a7 and q = 1/(1 - y) = (T + a6)/w; below a7 only two terms are left.

    y^8/(T - a7)^2 is y^6/(T + a6)^2, so nothing divides by zero at a7.
    """

    __slots__ = ("_a", "_gas_constant", "_h_log", "_h_powers", "_r", "_s_inner_log", "_s_log", "_s_powers", "_w")

    def __init__(self, a: Sequence[float], *, gas_constant: float, i: float, j: float) -> None:
        super().__init__()
        self._a = tuple(a)
        self._gas_constant = gas_constant
        self.dh, self.ds = gas_constant * i, gas_constant * j
        _, _, _, a3, a4, a5, a6, a7 = self._a
        self._h_log = self._s_log = self._s_inner_log = 0.0
        self._h_powers, self._s_powers = [0.0], [0.0]
        self._r = a7 / a6 if a6 > 0.0 else np.inf
        w = self._w = a6 + a7 if a3 or a4 or a5 else 0.0  # 0: the terms in y are not there
        if not w:
            return
        # y^n/(1 - y)^2 integrates to y^n q - n ln q + n sum(y^i/i, i < n).
        self._h_log = -w * (2.0 * a3 + 8.0 * a4)
        self._h_powers = [0.0, w * (2.0 * a3 + 8.0 * a4), *(8.0 * w * a4 / n for n in range(2, 8))]
        self._h_powers[7] -= a5 / (7.0 * w)
        # dT/T = [1/(1 - y) + a6/(a7 + a6 y)] dy
        self._s_log, powers = log_sums([0.0, 0.0, a3, 0.0, 0.0, 0.0, 0.0, 0.0, a4])
        if self._r > _SERIES_RATIO:
            self._s_powers = _sum(powers, _series(a3, a4, a5, a6, a7))
        else:
            self._s_inner_log, inner = _closed(a3, a4, a5, a6, a7)
            self._s_powers = _sum(powers, inner)

    def cp_of(self, x: Any) -> Any:
        a0, a1, a2, a3, a4, a5, a6, a7 = self._a
        total = a0 * np.ones_like(x)
        if a1:
            total = total + a1 / x / x * np.exp(-a2 / x)
        if self._w:
            above = np.maximum(x, a7)
            y = (above - a7) / (above + a6)
            y2 = y * y
            b = y2 / (above + a6)
            total = total + y2 * (a3 + a4 * (y2 * y2 * y2)) - a5 * (y2 * (b * b))
        return self._gas_constant * total

    def h_of(self, x: Any) -> Any:
        a0, a1, a2, a3, a4, _, a6, a7 = self._a
        total = a0 * x
        if a1:
            total = total + (a1 / a2 * np.exp(-a2 / x) if a2 else -a1 / x)
        if self._w:
            d = np.maximum(x, a7) + a6
            y = (np.maximum(x, a7) - a7) / d
            y2 = y * y
            total = total + d * (y2 * (a3 + a4 * (y2 * y2 * y2)))
            total = total + self._h_log * np.log(d / self._w) + horner(self._h_powers, y)
        return self._gas_constant * total

    def s_of(self, x: Any) -> Any:
        a0, a1, a2, _, _, _, a6, a7 = self._a
        total = a0 * np.log(x)
        if a1:
            z = a2 / x
            total = total + (a1 / a2 / a2 * ((1.0 + z) * np.exp(-z)) if a2 else -0.5 * a1 / x / x)
        if self._w:
            d = np.maximum(x, a7) + a6
            y = (np.maximum(x, a7) - a7) / d
            total = total + self._s_log * np.log(d / self._w) + horner(self._s_powers, y)
            if self._s_inner_log:
                total = total + self._s_inner_log * np.log1p(y / self._r)
        return self._gas_constant * total


def _closed(a3: float, a4: float, a5: float, a6: float, a7: float) -> tuple[float, list[float]]:
    """(a3 y^2 + a4 y^8)/(r + y) - a5 y^6 (1 - y)/(w a6 (r + y)) from 0 to y: factor of ln(1 + y/r), and powers."""
    r, b = a7 / a6, a5 / ((a6 + a7) * a6)
    factor, powers = 0.0, [0.0] * 9
    # y^n/(r + y) integrates to (-r)^n ln(1 + y/r) + sum((-r)^(n - i) y^i/i, i = 1..n).
    for n, c in ((2, a3), (8, a4), (6, -b), (7, b)):
        factor += c * (-r) ** n
        for i in range(1, n + 1):
            powers[i] += c * (-r) ** (n - i) / i
    return factor, powers


def _series(a3: float, a4: float, a5: float, a6: float, a7: float) -> list[float]:
    """As `_closed` for a small a6/a7, by 1/(a7 + a6 y) = sum((-a6/a7)^k y^k)/a7."""
    ratio, b = a6 / a7, a5 / (a6 + a7)
    powers = [0.0] * (10 + _SERIES_TERMS)
    for n, c in ((2, a3 * a6), (8, a4 * a6), (6, -b), (7, b)):
        for k in range(_SERIES_TERMS):
            powers[n + 1 + k] += c / a7 * (-ratio) ** k / (n + 1 + k)
    while len(powers) > 1 and powers[-1] == 0.0:
        powers.pop()
    return powers


def _sum(a: Sequence[float], b: Sequence[float]) -> list[float]:
    size = max(len(a), len(b))
    return [(a[n] if n < len(a) else 0.0) + (b[n] if n < len(b) else 0.0) for n in range(size)]


@dataclass(frozen=True, slots=True)
class TrcGas(PiecewiseEquation):
    """cp/R = a0 + (a1/T^2) exp(-a2/T) + a3 y^2 + (a4 - a5/(T - a7)^2) y^8, y = (T - a7)/(T + a6), 0 below a7.

    Parameters
    ----------
    a : sequence of float
        a0 to a7: a0, a3, a4 [1], a1, a5 [K^2], a2, a6, a7 [K].
    tmin, tmax : float
        Range [K].
    I, J : float, optional
        Constants of h [K] and s [1], over R. With I, h is H(T) - H(0 K); with J, s is the standard entropy at the
        pressure of the source. Without them both have an arbitrary zero.
    gas_constant : float
        R [J/mol/K].

    Raises
    ------
    EquationError
        If there are not eight coefficients, a number is not finite, a6 or a7 is negative, both are 0 with a3, a4 or
        a5, or the range is not one.
    """

    a: tuple[float, ...]
    tmin: float
    tmax: float
    I: float | None = None  # noqa: E741 - the name in the tables
    J: float | None = None
    gas_constant: float = R_GAS
    kernels: tuple[Kernel, ...] = field(init=False, repr=False, compare=False)
    joints: tuple[float, ...] = field(init=False, repr=False, compare=False)

    name: ClassVar[str] = "trc-gas"

    def __post_init__(self) -> None:
        a = numbers(self.a, "a", count=8)
        tmin, tmax = number(self.tmin, "tmin"), number(self.tmax, "tmax")
        check_range(tmin, tmax)
        r = number(self.gas_constant, "gas_constant")
        constants = {"I": self.I, "J": self.J}
        read = {key: None if value is None else number(value, key) for key, value in constants.items()}
        if min(a[6:]) < 0.0:
            raise EquationError(f"a6 = {a[6]!r} and a7 = {a[7]!r} must not be negative")
        if any(a[3:6]) and not any(a[6:]):
            raise EquationError("a6 and a7 are both 0", hint="that goes with a3 = a4 = a5 = 0 only, a monatomic gas")
        kernel = _TrcKernel(a, gas_constant=r, i=read["I"] or 0.0, j=read["J"] or 0.0)
        set_field(self, a=a, tmin=tmin, tmax=tmax, gas_constant=r, kernels=(kernel,), joints=(), **read)

    @property
    def increment(self) -> float | None:
        """H(298.15 K) - H(0 K) [J/mol], from I; None without it."""
        return None if self.I is None else float(self.h(298.15))

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"a", "tmin", "tmax"}`, with `"I"`, `"J"` and `"gas_constant"` if there are any."""
        only(params, ("a", "tmin", "tmax"), ("I", "J", "gas_constant"))
        return cls(**params)

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        stored: dict[str, Any] = {"a": list(self.a), "tmin": self.tmin, "tmax": self.tmax}
        stored |= {key: value for key, value in (("I", self.I), ("J", self.J)) if value is not None}
        if self.gas_constant != R_GAS:
            stored["gas_constant"] = self.gas_constant
        return stored
