"""Shomate's equation (C. H. Shomate, J. Phys. Chem., 1954), in the form with five terms."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, ClassVar, Self

from propdb.cp._base import PiecewiseEquation, set_field
from propdb.cp._blocks import H, Kernel, S
from propdb.cp._folded import FoldedKernel
from propdb.cp._params import check_range, check_touching, number, numbers, only, rows
from propdb.errors import EquationError

__all__ = ["Shomate", "ShomateInterval"]


@dataclass(frozen=True, slots=True)
class ShomateInterval:
    """One temperature interval.

    Parameters
    ----------
    tmin, tmax : float
        Range [K].
    coefficients : sequence of float
        A, B, C, D, E of cp [J/mol/K, t = T/1000 K]; with or without F, G, H: the constant of h [kJ/mol], the constant
        of s [J/mol/K] and the enthalpy of formation that the source subtracts [kJ/mol].

    Raises
    ------
    EquationError
        If there are not five or eight coefficients, a number is not finite or the range is not one.
    """

    tmin: float
    tmax: float
    coefficients: tuple[float, ...]

    def __post_init__(self) -> None:
        tmin, tmax = number(self.tmin, "tmin"), number(self.tmax, "tmax")
        check_range(tmin, tmax)
        coefficients = numbers(self.coefficients, "coefficients")
        if len(coefficients) not in (5, 8):
            raise EquationError(f"coefficients must be A to E or A to H, not {len(coefficients)} numbers")
        set_field(self, tmin=tmin, tmax=tmax, coefficients=coefficients)

    def kernel(self) -> FoldedKernel:
        """The folded formula; with F and G its h is the enthalpy on the elements' datum and its s the entropy."""
        a, b, c, d, e, *constants = self.coefficients
        powers = {0: a, 1: b * 1e-3, 2: c * 1e-6, 3: d * 1e-9, -2: e * 1e6}
        if not constants:
            return FoldedKernel.from_powers(powers)
        f, g, _ = constants
        return FoldedKernel.from_powers(powers, h0=f * 1e3, s0=g - a * math.log(1e3))


@dataclass(frozen=True, slots=True)
class Shomate(PiecewiseEquation):
    """cp = A + B t + C t^2 + D t^3 + E/t^2 with t = T/1000.

    With F, G and H in every interval h is H(T) - H(298.15 K) + Hf(298.15 K), that is A t + ... + F in the source's
    terms, and s the standard entropy. Without them h and s are continuous at the joints, with an arbitrary zero.

    Parameters
    ----------
    intervals : sequence of ShomateInterval
        Going up in temperature; all with F, G, H or none.

    Raises
    ------
    EquationError
        If intervals leave a gap, overlap, or only some have F, G, H.
    """

    intervals: tuple[ShomateInterval, ...]
    tmin: float = field(init=False, compare=False)
    tmax: float = field(init=False, compare=False)
    kernels: tuple[Kernel, ...] = field(init=False, repr=False, compare=False)
    joints: tuple[float, ...] = field(init=False, repr=False, compare=False)

    name: ClassVar[str] = "shomate"

    def __post_init__(self) -> None:
        intervals = tuple(self.intervals)
        if not intervals:
            raise EquationError("at least one interval is needed")
        joints = check_touching([(i.tmin, i.tmax) for i in intervals])
        if len({len(i.coefficients) for i in intervals}) > 1:
            raise EquationError("either every interval has F, G and H or none has")
        kernels = [interval.kernel() for interval in intervals]
        if len(intervals[0].coefficients) == 5:
            for number_, joint in enumerate(joints, start=1):
                lower, upper = kernels[number_ - 1], kernels[number_]
                dh, ds = (lower.value(kind, joint) - upper.value(kind, joint) for kind in (H, S))
                kernels[number_] = upper.shifted(dh, ds)
        tmin, tmax = intervals[0].tmin, intervals[-1].tmax
        set_field(self, intervals=intervals, tmin=tmin, tmax=tmax, kernels=tuple(kernels), joints=joints)

    @property
    def absolute(self) -> bool:
        """Whether h and s carry constants of the record, rather than an arbitrary zero."""
        return len(self.intervals[0].coefficients) == 8

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"intervals": [{"tmin", "tmax", "coefficients"}, ...]}`."""
        only(params, ("intervals",))
        intervals = []
        for row in rows(params["intervals"], "intervals"):
            only(row, ("tmin", "tmax", "coefficients"))
            intervals.append(ShomateInterval(**row))
        return cls(tuple(intervals))

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        return {
            "intervals": [
                {"tmin": i.tmin, "tmax": i.tmax, "coefficients": list(i.coefficients)} for i in self.intervals
            ]
        }
