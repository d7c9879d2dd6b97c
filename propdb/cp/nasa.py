"""The seven- and nine-coefficient polynomials of NASA, with the integration constants of their records.

S. Gordon and B. J. McBride, NASA SP-273 (1971) for seven coefficients; B. J. McBride, M. J. Zehe and S. Gordon,
NASA/TP-2002-211556 (2002) for nine. h is the enthalpy on the datum of the record (elements at 298.15 K), s the
standard entropy.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, ClassVar, Self

from propdb.cp._base import PiecewiseEquation, set_field
from propdb.cp._blocks import Kernel
from propdb.cp._folded import FoldedKernel
from propdb.cp._params import check_range, check_touching, number, numbers, only, rows
from propdb.errors import EquationError

__all__ = ["GAS_CONSTANT", "Nasa7", "Nasa9", "NasaInterval"]

# The value with which both collections were computed (CODATA 1986) [J/mol/K]. Folding a record with today's value
# instead would move a formation enthalpy of -400 kJ/mol by 2 J/mol.
GAS_CONSTANT = 8.314510


@dataclass(frozen=True, slots=True)
class NasaInterval:
    """One temperature interval of a record.

    Parameters
    ----------
    tmin, tmax : float
        Range [K].
    a : sequence of float
        Coefficients of cp/R, in the order of the record.
    b : sequence of float
        Integration constants: of H/R [K], of S/R [1].

    Raises
    ------
    EquationError
        If a number is not finite or the range is not one.
    """

    tmin: float
    tmax: float
    a: tuple[float, ...]
    b: tuple[float, float]

    def __post_init__(self) -> None:
        tmin, tmax = number(self.tmin, "tmin"), number(self.tmax, "tmax")
        check_range(tmin, tmax)
        set_field(self, tmin=tmin, tmax=tmax, a=numbers(self.a, "a"), b=numbers(self.b, "b", count=2))


class _NasaRecord(PiecewiseEquation):
    """What the two polynomials share."""

    __slots__ = ()

    first_exponent: ClassVar[int]
    count: ClassVar[int]
    intervals: tuple[NasaInterval, ...]
    gas_constant: float

    def _fold(self, intervals: Sequence[NasaInterval]) -> None:
        intervals = tuple(intervals)
        if not intervals:
            raise EquationError("a record needs at least one interval")
        joints = check_touching([(i.tmin, i.tmax) for i in intervals])
        r = number(self.gas_constant, "gas_constant")
        kernels = []
        for interval in intervals:
            if len(interval.a) != self.count:
                raise EquationError(f"a must have {self.count} numbers, not {len(interval.a)}")
            powers = {self.first_exponent + n: a * r for n, a in enumerate(interval.a)}
            b_h, b_s = interval.b
            kernels.append(FoldedKernel.from_powers(powers, h0=b_h * r, s0=b_s * r))
        tmin, tmax = intervals[0].tmin, intervals[-1].tmax
        set_field(self, intervals=intervals, gas_constant=r, tmin=tmin, tmax=tmax)
        set_field(self, kernels=tuple(kernels), joints=joints)

    @property
    def absolute(self) -> bool:
        """Whether h and s carry constants of the record, rather than an arbitrary zero."""
        return True

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"intervals": [{"tmin", "tmax", "a", "b"}, ...]}`, `"gas_constant"` if it differs."""
        only(params, ("intervals",), ("gas_constant",))
        intervals = []
        for row in rows(params["intervals"], "intervals"):
            only(row, ("tmin", "tmax", "a", "b"))
            intervals.append(NasaInterval(**row))
        return cls(tuple(intervals), params.get("gas_constant", GAS_CONSTANT))  # type: ignore[call-arg]

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        intervals = [{"tmin": i.tmin, "tmax": i.tmax, "a": list(i.a), "b": list(i.b)} for i in self.intervals]
        stored: dict[str, Any] = {"intervals": intervals}
        if self.gas_constant != GAS_CONSTANT:
            stored["gas_constant"] = self.gas_constant
        return stored


@dataclass(frozen=True, slots=True)
class Nasa7(_NasaRecord):
    """cp/R = a1 + a2 T + a3 T^2 + a4 T^3 + a5 T^4; b holds a6 (of H/R) and a7 (of S/R). Gordon and McBride (1971).

    Parameters
    ----------
    intervals : sequence of NasaInterval
        Going up in temperature, five coefficients each.
    gas_constant : float
        R with which the record was computed [J/mol/K].

    Raises
    ------
    EquationError
        If a number of coefficients is wrong, or intervals leave a gap or overlap.
    """

    intervals: tuple[NasaInterval, ...]
    gas_constant: float = GAS_CONSTANT
    tmin: float = field(init=False, compare=False)
    tmax: float = field(init=False, compare=False)
    kernels: tuple[Kernel, ...] = field(init=False, repr=False, compare=False)
    joints: tuple[float, ...] = field(init=False, repr=False, compare=False)

    name: ClassVar[str] = "nasa7"
    first_exponent: ClassVar[int] = 0
    count: ClassVar[int] = 5

    def __post_init__(self) -> None:
        self._fold(self.intervals)


@dataclass(frozen=True, slots=True)
class Nasa9(_NasaRecord):
    """cp/R = a1 T^-2 + a2 T^-1 + a3 + a4 T + ... + a7 T^4, with b1 of H/R and b2 of S/R. McBride et al. (2002).

    Parameters
    ----------
    intervals : sequence of NasaInterval
        Going up in temperature, seven coefficients each.
    gas_constant : float
        R with which the record was computed [J/mol/K].

    Raises
    ------
    EquationError
        If a number of coefficients is wrong, or intervals leave a gap or overlap.
    """

    intervals: tuple[NasaInterval, ...]
    gas_constant: float = GAS_CONSTANT
    tmin: float = field(init=False, compare=False)
    tmax: float = field(init=False, compare=False)
    kernels: tuple[Kernel, ...] = field(init=False, repr=False, compare=False)
    joints: tuple[float, ...] = field(init=False, repr=False, compare=False)

    name: ClassVar[str] = "nasa9"
    first_exponent: ClassVar[int] = -2
    count: ClassVar[int] = 7

    def __post_init__(self) -> None:
        self._fold(self.intervals)
