"""Heat capacities of liquids: the two equations of Zábranský et al., and Perry's in reduced temperature.

M. Zábranský, V. Růžička, V. Majer and E. S. Domalski, Heat Capacity of Liquids (1996). Perry's Chemical Engineers'
Handbook, 8th ed. (2007), table 2-153. Cp, Csat and C along saturation differ: the entry says which its numbers are.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, ClassVar, Self

from propdb.cp._base import PiecewiseEquation, set_field
from propdb.cp._blocks import Kernel
from propdb.cp._folded import FoldedKernel
from propdb.cp._formula import CriticalKernel
from propdb.cp._params import check_range, number, numbers, only
from propdb.errors import EquationError
from propdb.model.records import R_GAS

__all__ = ["PerryLiquid", "ZabranskyCubic", "ZabranskyQuasi"]


def _check_critical(tmax: float, tc: float) -> None:
    if not 0.0 < tmax <= tc:
        raise EquationError(f"tmax = {tmax!r} K must not exceed the critical temperature {tc!r} K")


@dataclass(frozen=True, slots=True)
class ZabranskyCubic(PiecewiseEquation):
    """c/R = A1 + A2 (T/100) + A3 (T/100)^2 + A4 (T/100)^3.

    Parameters
    ----------
    a : sequence of float
        A1 to A4, or fewer [1, T in K].
    tmin, tmax : float
        Range [K].
    gas_constant : float
        R [J/mol/K].

    Raises
    ------
    EquationError
        If there are no coefficients or more than four, a number is not finite or the range is not one.
    """

    a: tuple[float, ...]
    tmin: float
    tmax: float
    gas_constant: float = R_GAS
    kernels: tuple[Kernel, ...] = field(init=False, repr=False, compare=False)
    joints: tuple[float, ...] = field(init=False, repr=False, compare=False)

    name: ClassVar[str] = "zabransky-cubic"

    def __post_init__(self) -> None:
        a = numbers(self.a, "a")
        if not 1 <= len(a) <= 4:
            raise EquationError(f"a must have one to four numbers, not {len(a)}")
        tmin, tmax = number(self.tmin, "tmin"), number(self.tmax, "tmax")
        check_range(tmin, tmax)
        r = number(self.gas_constant, "gas_constant")
        kernel = FoldedKernel.from_powers({n: r * c / 100.0**n for n, c in enumerate(a)})
        set_field(self, a=a, tmin=tmin, tmax=tmax, gas_constant=r, kernels=(kernel,), joints=())

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"a", "tmin", "tmax"}`, `"gas_constant"` if it differs."""
        only(params, ("a", "tmin", "tmax"), ("gas_constant",))
        return cls(**params)

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        stored: dict[str, Any] = {"a": list(self.a), "tmin": self.tmin, "tmax": self.tmax}
        if self.gas_constant != R_GAS:
            stored["gas_constant"] = self.gas_constant
        return stored


@dataclass(frozen=True, slots=True)
class ZabranskyQuasi(PiecewiseEquation):
    """c/R = A1 ln(1 - Tr) + A2/(1 - Tr) + A3 + A4 Tr + A5 Tr^2 + A6 Tr^3, Tr = T/Tc.

    Its integral over T holds a dilogarithm.

    Parameters
    ----------
    a : sequence of float
        A1 to A6 [1].
    Tc : float
        Critical temperature [K].
    tmin, tmax : float
        Range [K].
    gas_constant : float
        R [J/mol/K].

    Raises
    ------
    EquationError
        If there are not six coefficients, a number is not finite, the range is not one or exceeds Tc.
    """

    a: tuple[float, ...]
    Tc: float
    tmin: float
    tmax: float
    gas_constant: float = R_GAS
    kernels: tuple[Kernel, ...] = field(init=False, repr=False, compare=False)
    joints: tuple[float, ...] = field(init=False, repr=False, compare=False)

    name: ClassVar[str] = "zabransky-quasi"

    def __post_init__(self) -> None:
        a = numbers(self.a, "a", count=6)
        tc, tmin, tmax = number(self.Tc, "Tc"), number(self.tmin, "tmin"), number(self.tmax, "tmax")
        check_range(tmin, tmax)
        _check_critical(tmax, tc)
        r = number(self.gas_constant, "gas_constant")
        a1, a2, a3, a4, a5, a6 = (r * c for c in a)
        # The cubic in Tr = 1 - t, in powers of t.
        powers = (a3 + a4 + a5 + a6, -(a4 + 2.0 * a5 + 3.0 * a6), a5 + 3.0 * a6, -a6)
        kernel = CriticalKernel(tc=tc, inverse=a2, logarithm=a1, powers=powers)
        set_field(self, a=a, Tc=tc, tmin=tmin, tmax=tmax, gas_constant=r, kernels=(kernel,), joints=())

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"a", "Tc", "tmin", "tmax"}`, `"gas_constant"` if it differs."""
        only(params, ("a", "Tc", "tmin", "tmax"), ("gas_constant",))
        return cls(**params)

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        stored: dict[str, Any] = {"a": list(self.a), "Tc": self.Tc, "tmin": self.tmin, "tmax": self.tmax}
        if self.gas_constant != R_GAS:
            stored["gas_constant"] = self.gas_constant
        return stored


@dataclass(frozen=True, slots=True)
class PerryLiquid(PiecewiseEquation):
    """cp = scale (A^2/t + B - 2AC t - AD t^2 - C^2 t^3/3 - CD t^4/2 - D^2 t^5/5), t = 1 - T/Tc.

    Parameters
    ----------
    coefficients : sequence of float
        A, B, C, D as printed; squares and products share the unit of B.
    Tc : float
        Critical temperature [K]; the handbook lists it with the heats of vaporisation.
    tmin, tmax : float
        Range [K].
    scale : float
        From the unit of the source to J/mol/K: 0.001 for J/kmol/K.

    Raises
    ------
    EquationError
        If there are not four coefficients, a number is not finite, the range is not one or exceeds Tc.
    """

    coefficients: tuple[float, ...]
    Tc: float
    tmin: float
    tmax: float
    scale: float = 1.0
    kernels: tuple[Kernel, ...] = field(init=False, repr=False, compare=False)
    joints: tuple[float, ...] = field(init=False, repr=False, compare=False)

    name: ClassVar[str] = "perry-liquid"

    def __post_init__(self) -> None:
        coefficients = numbers(self.coefficients, "coefficients", count=4)
        tc, tmin, tmax = number(self.Tc, "Tc"), number(self.tmin, "tmin"), number(self.tmax, "tmax")
        check_range(tmin, tmax)
        _check_critical(tmax, tc)
        scale = number(self.scale, "scale")
        a, b, c, d = coefficients
        powers = (b, -2.0 * a * c, -a * d, -c * c / 3.0, -c * d / 2.0, -d * d / 5.0)
        kernel = CriticalKernel(tc=tc, inverse=scale * a * a, logarithm=0.0, powers=[scale * p for p in powers])
        set_field(self, coefficients=coefficients, Tc=tc, tmin=tmin, tmax=tmax, scale=scale)
        set_field(self, kernels=(kernel,), joints=())

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"coefficients", "Tc", "tmin", "tmax"}`, `"scale"` if it is not 1."""
        only(params, ("coefficients", "Tc", "tmin", "tmax"), ("scale",))
        return cls(**params)

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        stored: dict[str, Any] = {"coefficients": list(self.coefficients), "Tc": self.Tc}
        stored |= {"tmin": self.tmin, "tmax": self.tmax}
        if self.scale != 1.0:
            stored["scale"] = self.scale
        return stored
