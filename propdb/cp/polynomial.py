"""Heat capacities that are sums of integer powers of temperature."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, ClassVar, Self

from propdb.cp._base import PiecewiseEquation, set_field
from propdb.cp._blocks import Kernel
from propdb.cp._folded import FoldedKernel
from propdb.cp._params import check_range, number, numbers, only
from propdb.errors import EquationError

__all__ = ["Constant", "Polynomial"]


@dataclass(frozen=True, slots=True)
class Polynomial(PiecewiseEquation):
    """cp = sum(c_i T^n_i), any integer exponents.

    Most handbook fits: those of Maier and Kelley (1932) for solids, the cubic and quartic polynomials for
    ideal gases. Integrated term by term; T^-1 gives logarithms.

    Parameters
    ----------
    exponents : sequence of int
        The n_i, each at most once.
    coefficients : sequence of float
        The c_i, with the source's scales and unit multiplied in [J/mol/K, T in K].
    tmin, tmax : float
        Range [K].

    Raises
    ------
    EquationError
        If the lists do not match, an exponent repeats, a number is not finite or the range is not one.
    """

    exponents: tuple[int, ...]
    coefficients: tuple[float, ...]
    tmin: float
    tmax: float
    kernels: tuple[Kernel, ...] = field(init=False, repr=False, compare=False)
    joints: tuple[float, ...] = field(init=False, repr=False, compare=False)

    name: ClassVar[str] = "polynomial"

    def __post_init__(self) -> None:
        exponents = numbers(self.exponents, "exponents")
        coefficients = numbers(self.coefficients, "coefficients")
        tmin, tmax = number(self.tmin, "tmin"), number(self.tmax, "tmax")
        check_range(tmin, tmax)
        if not exponents or len(exponents) != len(coefficients):
            raise EquationError(f"{len(exponents)} exponents do not match {len(coefficients)} coefficients")
        if any(n != int(n) for n in exponents) or len(set(exponents)) != len(exponents):
            raise EquationError("exponents must be different integers")
        powers = dict(zip(map(int, exponents), coefficients, strict=True))
        set_field(
            self,
            exponents=tuple(powers),
            coefficients=coefficients,
            tmin=tmin,
            tmax=tmax,
            kernels=(FoldedKernel.from_powers(powers),),
            joints=(),
        )

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"exponents", "coefficients", "tmin", "tmax"}`."""
        only(params, ("exponents", "coefficients", "tmin", "tmax"))
        return cls(**params)

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        return {
            "exponents": list(self.exponents),
            "coefficients": list(self.coefficients),
            "tmin": self.tmin,
            "tmax": self.tmax,
        }


@dataclass(frozen=True, slots=True)
class Constant(PiecewiseEquation):
    """A heat capacity that does not change over its range.

    Parameters
    ----------
    value : float
        cp [J/mol/K].
    tmin, tmax : float
        Range [K]; equal for a value measured at one temperature.

    Raises
    ------
    EquationError
        If a number is not finite or the range is not one.
    """

    value: float
    tmin: float
    tmax: float
    kernels: tuple[Kernel, ...] = field(init=False, repr=False, compare=False)
    joints: tuple[float, ...] = field(init=False, repr=False, compare=False)

    name: ClassVar[str] = "constant"

    def __post_init__(self) -> None:
        value, tmin, tmax = number(self.value, "value"), number(self.tmin, "tmin"), number(self.tmax, "tmax")
        check_range(tmin, tmax, point=True)
        kernel = FoldedKernel.from_powers({0: value})
        set_field(self, value=value, tmin=tmin, tmax=tmax, kernels=(kernel,), joints=())

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"value", "tmin", "tmax"}`."""
        only(params, ("value", "tmin", "tmax"))
        return cls(**params)

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        return {"value": self.value, "tmin": self.tmin, "tmax": self.tmax}
