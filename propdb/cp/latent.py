"""Latent heats as functions of temperature."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, ClassVar, Protocol, Self, overload, runtime_checkable

import numpy as np

from propdb.cp._base import set_field
from propdb.cp._blocks import FloatArray, Temperatures, not_a_temperature, refuse, temperatures
from propdb.cp._params import number, only
from propdb.errors import EquationError, TemperatureOutOfRange

__all__ = ["ConstantLatent", "LatentHeat", "RangeTest", "ToCritical", "Watson", "checked"]


@runtime_checkable
class LatentHeat(Protocol):
    """Enthalpy of a transition at the temperatures where both phases are in equilibrium."""

    @property
    def name(self) -> str:
        """The name under which the equation is registered."""

    @property
    def tmin(self) -> float:
        """Lower end of the range [K]."""

    @property
    def tmax(self) -> float:
        """Upper end of the range [K]."""

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""

    def covers(self, T: Any) -> Any:
        """Whether `T` [K] lies in the range, ends included."""

    def dh(self, T: Any) -> Any:
        """Enthalpy of the transition [J/mol]."""

    def ddh_dT(self, T: Any) -> Any:
        """Its slope [J/mol/K]."""


def checked(T: float | Temperatures) -> float | FloatArray:
    """`T` [K] as a float or float64 array, refused where it is no temperature."""
    if isinstance(T, (int, float)):
        t = float(T)
        if not 0.0 < t < math.inf:
            raise not_a_temperature(t)
        return t
    x = temperatures(T)
    if not np.all((x > 0.0) & (x < math.inf)):
        refuse(x)
    return x


class RangeTest:
    """Range test that latent heats share."""

    __slots__ = ()
    tmin: float
    tmax: float

    def covers(self, T: float | Temperatures) -> Any:
        """Whether `T` [K] lies in the range, ends included; a bool, or an array of the shape of `T`.

        Raises
        ------
        TemperatureError
            If `T` does not hold real numbers.
        """
        if isinstance(T, (int, float)):
            return self.tmin <= T <= self.tmax
        x = temperatures(T)
        return (x >= self.tmin) & (x <= self.tmax)


class ToCritical(RangeTest):
    """What falls to zero at the critical temperature, where its slope is infinite."""

    __slots__ = ()

    Tc: float

    @property
    def _span(self) -> float:
        """What the distance from the critical temperature is divided by [K]."""
        return self.Tc

    def _dh(self, t: Any) -> Any:
        """Enthalpy at t = (Tc - T)/span >= 0."""
        raise NotImplementedError

    def _slope(self, t: Any) -> Any:
        """Its derivative with respect to t > 0."""
        raise NotImplementedError

    def _gap(self, T: float | Temperatures, *, below: bool) -> Any:
        x = checked(T)
        t = (self.Tc - x) / self._span
        if not (np.all(t > 0.0) if below else np.all(t >= 0.0)):
            where = f"{'at or ' if below else ''}above the critical temperature {self.Tc:.7g} K"
            raise TemperatureOutOfRange(
                f"{float(np.max(x)):.7g} K is {where}",
                ranges=[(self.tmin, self.tmax)],
            )
        return np.float64(t) if isinstance(t, float) else t

    @overload
    def dh(self, T: float) -> float: ...
    @overload
    def dh(self, T: Temperatures) -> FloatArray: ...
    def dh(self, T: float | Temperatures) -> float | FloatArray:
        """Enthalpy of vaporisation [J/mol] at `T` [K], shape of `T`; 0 at the critical temperature.

        Raises
        ------
        TemperatureError
            If a temperature is not a finite number above 0 K.
        TemperatureOutOfRange
            Above the critical temperature.
        """
        result = self._dh(self._gap(T, below=False))
        return result if isinstance(result, np.ndarray) else float(result)

    @overload
    def ddh_dT(self, T: float) -> float: ...
    @overload
    def ddh_dT(self, T: Temperatures) -> FloatArray: ...
    def ddh_dT(self, T: float | Temperatures) -> float | FloatArray:
        """Its slope [J/mol/K] at `T` [K], shape of `T`.

        Raises
        ------
        TemperatureError
            If a temperature is not a finite number above 0 K.
        TemperatureOutOfRange
            At or above the critical temperature, where the slope is infinite.
        """
        result = self._slope(self._gap(T, below=True)) / -self._span
        return result if isinstance(result, np.ndarray) else float(result)


@dataclass(frozen=True, slots=True)
class ConstantLatent(RangeTest):
    """The enthalpy of a transition known at one temperature only.

    Parameters
    ----------
    value : float
        Enthalpy of the transition [J/mol].
    T : float
        Where it was measured [K]; the range is this temperature alone.

    Raises
    ------
    EquationError
        If a number is not finite or `T` not above 0 K.
    """

    value: float
    T: float

    name: ClassVar[str] = "constant-latent"

    def __post_init__(self) -> None:
        value, t = number(self.value, "dh"), number(self.T, "T")
        if not t > 0.0:
            raise EquationError(f"T must be above 0 K, not {t!r}")
        set_field(self, value=value, T=t)

    @property
    def tmin(self) -> float:  # type: ignore[override]
        """Lower end of the range [K]."""
        return self.T

    @property
    def tmax(self) -> float:  # type: ignore[override]
        """Upper end of the range [K]."""
        return self.T

    @overload
    def dh(self, T: float) -> float: ...
    @overload
    def dh(self, T: Temperatures) -> FloatArray: ...
    def dh(self, T: float | Temperatures) -> float | FloatArray:
        """Enthalpy of the transition [J/mol], the same at every `T` [K].

        Raises
        ------
        TemperatureError
            If a temperature is not a finite number above 0 K.
        """
        t = checked(T)
        return self.value if isinstance(t, float) else np.full(t.shape, self.value)

    @overload
    def ddh_dT(self, T: float) -> float: ...
    @overload
    def ddh_dT(self, T: Temperatures) -> FloatArray: ...
    def ddh_dT(self, T: float | Temperatures) -> float | FloatArray:
        """Its slope: 0 [J/mol/K] at every `T` [K].

        Raises
        ------
        TemperatureError
            If a temperature is not a finite number above 0 K.
        """
        t = checked(T)
        return 0.0 if isinstance(t, float) else np.zeros(t.shape)

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"dh", "T"}`."""
        only(params, ("dh", "T"))
        return cls(params["dh"], params["T"])

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        return {"dh": self.value, "T": self.T}


@dataclass(frozen=True, slots=True)
class Watson(ToCritical):
    """Enthalpy of vaporisation from one known value: dh = dh1 ((Tc - T)/(Tc - T1))^exponent.

    K. M. Watson, Ind. Eng. Chem. 35 (1943).

    Parameters
    ----------
    dh1 : float
        Enthalpy of vaporisation at `T1` [J/mol].
    T1 : float
        Where it is known [K].
    Tc : float
        Critical temperature [K].
    exponent : float
        Watson's 0.38 unless fitted.

    Raises
    ------
    EquationError
        If a number is not finite, 0 < T1 < Tc does not hold, or the exponent is not positive.
    """

    dh1: float
    T1: float
    Tc: float
    exponent: float = 0.38

    name: ClassVar[str] = "watson"

    def __post_init__(self) -> None:
        dh1, t1, tc = number(self.dh1, "dh"), number(self.T1, "T1"), number(self.Tc, "Tc")
        exponent = number(self.exponent, "exponent")
        if not 0.0 < t1 < tc:
            raise EquationError(f"T1 = {t1!r} K must lie between 0 K and Tc = {tc!r} K")
        if not exponent > 0.0:
            raise EquationError(f"the exponent must be positive, not {exponent!r}")
        set_field(self, dh1=dh1, T1=t1, Tc=tc, exponent=exponent)

    @property
    def tmin(self) -> float:  # type: ignore[override]
        """Lower end of the range [K]: none but zero."""
        return 0.0

    @property
    def tmax(self) -> float:  # type: ignore[override]
        """Upper end of the range [K]: the critical temperature."""
        return self.Tc

    @property
    def _span(self) -> float:
        return self.Tc - self.T1

    def _dh(self, t: Any) -> Any:
        return self.dh1 * np.power(t, self.exponent)

    def _slope(self, t: Any) -> Any:
        return self.dh1 * self.exponent * np.power(t, self.exponent - 1.0)

    @classmethod
    def from_params(cls, params: Mapping[str, Any]) -> Self:
        """From the stored form `{"dh", "T1", "Tc"}`, `"exponent"` if not 0.38."""
        only(params, ("dh", "T1", "Tc"), ("exponent",))
        return cls(params["dh"], params["T1"], params["Tc"], params.get("exponent", 0.38))

    def params(self) -> dict[str, Any]:
        """The stored form, ready for JSON."""
        return {"dh": self.dh1, "T1": self.T1, "Tc": self.Tc, "exponent": self.exponent}
