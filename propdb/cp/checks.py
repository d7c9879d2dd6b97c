"""Checksums that a NASA record carries in itself: neighbouring intervals meet, and h(298.15 K) is Hf(298.15 K)."""

from __future__ import annotations

from dataclasses import dataclass

from propdb.cp._base import Equation
from propdb.cp._blocks import CP, H, S
from propdb.errors import TemperatureOutOfRange

__all__ = ["T_STANDARD", "JointError", "h298_error", "joint_errors"]

T_STANDARD = 298.15


@dataclass(frozen=True, slots=True)
class JointError:
    """Relative jumps at a joint, upper less lower interval.

    Attributes
    ----------
    T : float
        The joint [K].
    cp : float
        Jump of cp over cp [1].
    h : float
        Jump of h over the larger of h and cp T [1]; h alone passes through zero and is no scale.
    s : float
        Jump of s over s, the third-law entropy of a record, or over cp where that is larger [1].
    """

    T: float
    cp: float
    h: float
    s: float


def joint_errors(eq: Equation) -> tuple[JointError, ...]:
    """Relative jumps of cp, h and s at each joint of `eq`.

    A sound record stays below about 1e-4; a mistyped digit seldom does.
    """
    found = []
    for jump, kernel in zip(eq.jumps(), eq.kernels[:-1], strict=True):
        cp = abs(kernel.value(CP, jump.T))
        scale = cp if cp > 0.0 else 1.0
        h_scale = max(abs(kernel.value(H, jump.T)), scale * jump.T)
        s_scale = max(abs(kernel.value(S, jump.T)), scale)
        found.append(JointError(T=jump.T, cp=jump.cp / scale, h=jump.h / h_scale, s=jump.s / s_scale))
    return tuple(found)


def h298_error(eq: Equation, hf298: float) -> float:
    """h(298.15 K) of a record less the enthalpy of formation that it states.

    Parameters
    ----------
    eq : Equation
        With constants of its own.
    hf298 : float
        Enthalpy of formation at 298.15 K, as in the record [J/mol].

    Returns
    -------
    float
        Difference [J/mol]; a sound record keeps it below a few J/mol.

    Raises
    ------
    TemperatureOutOfRange
        If the record does not reach 298.15 K.
    """
    if not eq.covers(T_STANDARD):
        raise TemperatureOutOfRange(
            f"the record holds from {eq.tmin:g} to {eq.tmax:g} K and does not reach {T_STANDARD} K",
            ranges=[(eq.tmin, eq.tmax)],
        )
    return float(eq.h(T_STANDARD)) - hf298
