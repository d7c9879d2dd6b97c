"""Enthalpies of vaporisation over the liquid range, as powers of the distance from the critical temperature.

Perry's Chemical Engineers' Handbook, 8th ed. (2007), table 2-150; VDI Heat Atlas, 2nd ed. (2010).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, ClassVar, Self

import numpy as np

from propdb.cp._base import set_field
from propdb.cp._params import check_range, number, numbers, only
from propdb.cp.latent import ToCritical
from propdb.errors import EquationError
from propdb.model.records import R_GAS

__all__ = ["PerryVaporisation", "VdiVaporisation"]


def _range(tmin: Any, tmax: Any, tc: float) -> tuple[float, float]:
    low, high = number(tmin, "tmin"), tc if tmax is None else number(tmax, "tmax")
    if not tc > 0.0:
        raise EquationError(f"Tc must be above 0 K, not {tc!r}")
    check_range(low, high, point=True)
    if high > tc:
        raise EquationError(f"tmax = {high!r} K must not exceed the critical temperature {tc!r} K")
    return low, high


@dataclass(frozen=True, slots=True)
class PerryVaporisation(ToCritical):
    """dh = A (1 - Tr)^(B + C Tr + D Tr^2), Tr = T/Tc.

    Parameters
    ----------
    coefficients : sequence of float
        A [J/mol], B, C, D [1].
    Tc : float
        Critical temperature [K].
    tmin, tmax : float
        Range [K]; up to Tc if tmax is not given.

    Raises
    ------
    EquationError
        If there are not four coefficients, a number is not finite, the range is not one or exceeds Tc, or the exponent
        is not positive at Tc, so that the enthalpy would not vanish there.
    """

    coefficients: tuple[float, ...]
    Tc: float
    tmin: float = 0.0
    tmax: float = None  # type: ignore[assignment]  # Tc

    name: ClassVar[str] = "perry-vaporisation"

    def __post_init__(self) -> None:
        coefficients, tc = numbers(self.coefficients, "coefficients", count=4), number(self.Tc, "Tc")
        tmin, tmax = _range(self.tmin, self.tmax, tc)
        if not sum(coefficients[1:]) > 0.0:
            raise EquationError(f"the exponent at Tc, B + C + D, must be positive, not {sum(coefficients[1:])!r}")
        set_field(self, coefficients=coefficients, Tc=tc, tmin=tmin, tmax=tmax)

    def _exponent(self, t: Any) -> Any:
        _, b, c, d = self.coefficients
        tr = 1.0 - t
        return b + tr * (c + tr * d)

    def _dh(self, t: Any) -> Any:
        return self.coefficients[0] * np.power(t, self._exponent(t))

    def _slope(self, t: Any) -> Any:
        _, _, c, d = self.coefficients
        return self._dh(t) * (self._exponent(t) / t - (c + 2.0 * d * (1.0 - t)) * np.log(t))

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"coefficients", "Tc", "tmin", "tmax"}`; the range may be absent."""
        only(params, ("coefficients", "Tc"), ("tmin", "tmax"))
        return cls(**params)

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        return {"coefficients": list(self.coefficients), "Tc": self.Tc, "tmin": self.tmin, "tmax": self.tmax}


@dataclass(frozen=True, slots=True)
class VdiVaporisation(ToCritical):
    """dh = R Tc (A t^(1/3) + B t^(2/3) + C t + D t^2 + E t^6), t = 1 - T/Tc.

    Parameters
    ----------
    coefficients : sequence of float
        A to E [1].
    Tc : float
        Critical temperature [K].
    tmin, tmax : float
        Range [K]; up to Tc if tmax is not given. The source states none.
    gas_constant : float
        R [J/mol/K].

    Raises
    ------
    EquationError
        If there are not five coefficients, a number is not finite, the range is not one or exceeds Tc.
    """

    coefficients: tuple[float, ...]
    Tc: float
    tmin: float = 0.0
    tmax: float = None  # type: ignore[assignment]  # Tc
    gas_constant: float = R_GAS

    name: ClassVar[str] = "vdi-vaporisation"

    def __post_init__(self) -> None:
        coefficients, tc = numbers(self.coefficients, "coefficients", count=5), number(self.Tc, "Tc")
        tmin, tmax = _range(self.tmin, self.tmax, tc)
        r = number(self.gas_constant, "gas_constant")
        set_field(self, coefficients=coefficients, Tc=tc, tmin=tmin, tmax=tmax, gas_constant=r)

    def _dh(self, t: Any) -> Any:
        a, b, c, d, e = self.coefficients
        root, t2 = np.cbrt(t), t * t
        return self.gas_constant * self.Tc * (root * (a + root * (b + root * c)) + t2 * (d + e * (t2 * t2)))

    def _slope(self, t: Any) -> Any:
        a, b, c, d, e = self.coefficients
        root, t2 = np.cbrt(t), t * t
        powers = (a / root + 2.0 * b) / (3.0 * root) + c + t * (2.0 * d + 6.0 * e * (t2 * t2))
        return self.gas_constant * self.Tc * powers

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"coefficients", "Tc"}`, `"tmin"`, `"tmax"` and `"gas_constant"` if there are any."""
        only(params, ("coefficients", "Tc"), ("tmin", "tmax", "gas_constant"))
        return cls(**params)

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        stored: dict[str, Any] = {"coefficients": list(self.coefficients), "Tc": self.Tc}
        stored |= {"tmin": self.tmin, "tmax": self.tmax}
        if self.gas_constant != R_GAS:
            stored["gas_constant"] = self.gas_constant
        return stored
