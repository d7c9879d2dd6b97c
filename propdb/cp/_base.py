"""The protocol of heat-capacity equations, and the methods they share."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, ClassVar, Protocol, overload, runtime_checkable

import numpy as np
from numpy.typing import NDArray

from propdb.cp._blocks import (
    CP,
    FloatArray,
    H,
    Kernel,
    Kind,
    S,
    Temperatures,
    evaluate,
    not_a_temperature,
    piece_of,
    temperatures,
    too_extreme,
)

__all__ = ["Equation", "Jump", "PiecewiseEquation"]


@runtime_checkable
class Equation(Protocol):
    """A heat capacity as a function of temperature, with its two integrals, all in closed form.

    Temperatures are in K and are not compared with the range: ask `covers`. A number in gives a `float` out, an array
    or list gives a float64 array of the same shape.
    """

    @property
    def name(self) -> str:
        """The name under which the equation is registered."""

    @property
    def tmin(self) -> float:
        """Lower end of the range [K]."""

    @property
    def tmax(self) -> float:
        """Upper end of the range [K]."""

    @property
    def absolute(self) -> bool:
        """Whether h and s carry constants of the record, rather than an arbitrary zero."""

    @property
    def kernels(self) -> tuple[Kernel, ...]:
        """The formula of each interval."""

    @property
    def joints(self) -> tuple[float, ...]:
        """Temperatures where one interval hands over to the next [K]; a joint belongs to the interval below."""

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""

    def covers(self, T: Any) -> Any:
        """Whether `T` [K] lies in the range, ends included."""

    def cp(self, T: Any, out: FloatArray | None = None) -> Any:
        """Heat capacity [J/mol/K]."""

    def h(self, T: Any, out: FloatArray | None = None) -> Any:
        """An antiderivative of cp over T [J/mol]."""

    def s(self, T: Any, out: FloatArray | None = None) -> Any:
        """An antiderivative of cp/T over T [J/mol/K]."""

    def dh(self, T1: Any, T2: Any) -> Any:
        """Enthalpy from `T1` to `T2` [J/mol]."""

    def ds(self, T1: Any, T2: Any) -> Any:
        """Entropy from `T1` to `T2` [J/mol/K]."""

    def jumps(self) -> tuple[Jump, ...]:
        """What each joint adds going up."""


@dataclass(frozen=True, slots=True)
class Jump:
    """Upper interval minus lower interval at a joint.

    Attributes
    ----------
    T : float
        The joint [K].
    cp : float
        Jump of the heat capacity [J/mol/K].
    h : float
        Jump of the enthalpy [J/mol].
    s : float
        Jump of the entropy [J/mol/K].
    """

    T: float
    cp: float
    h: float
    s: float


class PiecewiseEquation:
    """Methods of an equation with a kernel per interval; subclasses are frozen dataclasses that set the fields."""

    __slots__ = ()

    name: ClassVar[str]
    tmin: float
    tmax: float
    kernels: tuple[Kernel, ...]
    joints: tuple[float, ...]

    @property
    def absolute(self) -> bool:
        """Whether h and s carry constants of the record, rather than an arbitrary zero."""
        return False

    @overload
    def covers(self, T: float) -> bool: ...
    @overload
    def covers(self, T: Temperatures) -> NDArray[np.bool_]: ...
    def covers(self, T: float | Temperatures) -> bool | NDArray[np.bool_]:
        """Whether `T` [K] lies in the range, ends included; shape of `T`.

        Raises
        ------
        TemperatureError
            If `T` does not hold real numbers.
        """
        if isinstance(T, (int, float)):
            return self.tmin <= T <= self.tmax
        given = temperatures(T)
        return (given >= self.tmin) & (given <= self.tmax)

    @overload
    def cp(self, T: float, out: None = None) -> float: ...
    @overload
    def cp(self, T: Temperatures, out: FloatArray | None = None) -> FloatArray: ...
    def cp(self, T: float | Temperatures, out: FloatArray | None = None) -> float | FloatArray:
        """Heat capacity [J/mol/K].

        Parameters
        ----------
        T : float or array_like
            Temperatures [K], any shape; not compared with the range.
        out : ndarray of float64, optional
            Where the result goes, same shape as `T`.

        Raises
        ------
        TemperatureError
            If a temperature is not a finite number above 0 K.
        """
        return self._evaluate(CP, T, out)

    @overload
    def h(self, T: float, out: None = None) -> float: ...
    @overload
    def h(self, T: Temperatures, out: FloatArray | None = None) -> FloatArray: ...
    def h(self, T: float | Temperatures, out: FloatArray | None = None) -> float | FloatArray:
        """An antiderivative of cp over T [J/mol], with the equation's own constant; parameters as for `cp`."""
        return self._evaluate(H, T, out)

    @overload
    def s(self, T: float, out: None = None) -> float: ...
    @overload
    def s(self, T: Temperatures, out: FloatArray | None = None) -> FloatArray: ...
    def s(self, T: float | Temperatures, out: FloatArray | None = None) -> float | FloatArray:
        """An antiderivative of cp/T over T [J/mol/K], with the equation's own constant; parameters as for `cp`."""
        return self._evaluate(S, T, out)

    @overload
    def dh(self, T1: float, T2: float) -> float: ...
    @overload
    def dh(self, T1: float | Temperatures, T2: float | Temperatures) -> float | FloatArray: ...
    def dh(self, T1: float | Temperatures, T2: float | Temperatures) -> float | FloatArray:
        """Enthalpy from `T1` to `T2` [J/mol]; both [K], shapes that broadcast.

        Raises
        ------
        TemperatureError
            If a temperature is not a finite number above 0 K.
        """
        return self._difference(H, T1, T2)

    @overload
    def ds(self, T1: float, T2: float) -> float: ...
    @overload
    def ds(self, T1: float | Temperatures, T2: float | Temperatures) -> float | FloatArray: ...
    def ds(self, T1: float | Temperatures, T2: float | Temperatures) -> float | FloatArray:
        """Entropy from `T1` to `T2` [J/mol/K]; both [K], shapes that broadcast.

        Raises
        ------
        TemperatureError
            If a temperature is not a finite number above 0 K.
        """
        return self._difference(S, T1, T2)

    def jumps(self) -> tuple[Jump, ...]:
        """What each joint adds going up: one `Jump` per joint."""
        found = []
        for lower, upper, joint in zip(self.kernels[:-1], self.kernels[1:], self.joints, strict=True):
            cp, h, s = (upper.value(kind, joint) - lower.value(kind, joint) for kind in (CP, H, S))
            found.append(Jump(T=joint, cp=cp, h=h, s=s))
        return tuple(found)

    def _difference(self, kind: Kind, T1: float | Temperatures, T2: float | Temperatures) -> float | FloatArray:
        return self._evaluate(kind, T2, None) - self._evaluate(kind, T1, None)

    def _evaluate(self, kind: Kind, T: float | Temperatures, out: FloatArray | None) -> float | FloatArray:
        if out is not None or not isinstance(T, (float, int, np.floating, np.integer)):
            return evaluate(self.kernels, self.joints, kind, T, out)
        t = float(T)
        if not 0.0 < t < math.inf:
            raise not_a_temperature(t)
        kernels = self.kernels
        kernel = kernels[0] if len(kernels) == 1 else kernels[piece_of(self.joints, t)]
        try:
            value = kernel.value(kind, t)
        except ZeroDivisionError:
            value = math.inf
        if not math.isfinite(value):
            raise too_extreme(t)
        return value


def set_field(instance: object, **fields: Any) -> None:
    """Set fields of a frozen dataclass while it is being made."""
    for name, value in fields.items():
        object.__setattr__(instance, name, value)


Params = Mapping[str, Any]
