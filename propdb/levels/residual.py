"""Residual enthalpy of the real fluid by the Peng-Robinson equation of state (Peng, Robinson 1976), through ``thermo``.

A model, and said to be one. Near the boiling point it gives the residual enthalpy of a saturated vapour a third too
small for benzene (second virial coefficients), and at a quarter of its size for water (IAPWS-95) and ethanol (closure
of X
"""

from __future__ import annotations

from typing import Any, Literal

from propdb.errors import NoSuchState
from propdb.model.records import R_GAS

__all__ = [
    "enthalpy",
    "estimate",
    "liquid_pressure_term",
    "note",
    "saturation_pressure",
    "saturation_temperature",
    "standard",
]

#: Standard uncertainty over value, by the kind of vapour (``Species.vapour``). Common practice, no source; see above.
RELATIVE = {"": 0.5, "hydrogen-bonding": 3.0}
FLOOR = 10.0  # [J/mol]


def standard(value: float, *, vapour: str = "") -> float:
    """Standard uncertainty [J/mol] of a residual-enthalpy leg of ``value`` [J/mol]."""
    return max(RELATIVE[vapour] * abs(value), FLOOR)


def note(vapour: str) -> str:
    """The sentence that marks a leg as a model."""
    size = "three times the leg, for it hydrogen-bonds" if vapour else "half the leg"
    return f"Peng-Robinson equation of state, a model: standard uncertainty {size}, at least 10 J/mol"


def estimate(*, temperature: float, tc: float, omega: float) -> float:
    """Quick estimate of a saturated vapour's residual enthalpy [J/mol], for ranking paths only.

    Second virial coefficients by Pitzer and Abbott, vapour pressure through the definition of the acentric factor
    (Smith, Van Ness, Abbott 2005). Temperature and ``tc`` in K.
    """
    tr = temperature / tc
    pr: float = 10.0 ** (7.0 / 3.0 * (1.0 + omega) * (1.0 - 1.0 / tr))
    b0, slope0 = 0.083 - 0.422 / tr**1.6, 0.675 / tr**2.6
    b1, slope1 = 0.139 - 0.172 / tr**4.2, 0.722 / tr**5.2
    reduced: float = pr * (b0 - tr * slope0 + omega * (b1 - tr * slope1))
    return R_GAS * tc * reduced


def _eos(*, temperature: float, pressure: float, tc: float, pc: float, omega: float) -> Any:
    from thermo.eos import PR

    return PR(Tc=tc, Pc=pc, omega=omega, T=temperature, P=pressure)


def saturation_pressure(*, temperature: float, tc: float, pc: float, omega: float) -> float:
    """Saturation pressure [Pa] of the equation of state at a temperature [K] below ``tc`` [K]."""
    if temperature >= tc:
        raise NoSuchState(
            f"there is no saturated vapour at {temperature:.6g} K",
            hint=f"the critical temperature is {tc:.6g} K; use --phase fluid with --pressure",
        )
    return float(_eos(temperature=temperature, pressure=1e5, tc=tc, pc=pc, omega=omega).Psat(temperature))


def saturation_temperature(*, pressure: float, tc: float, pc: float, omega: float) -> float:
    """Saturation temperature [K] of the equation of state at a pressure [Pa] below ``pc`` [Pa]."""
    if pressure >= pc:
        raise NoSuchState(
            f"there is no saturated vapour at {pressure / 1e5:.6g} bar",
            hint=f"the critical pressure is {pc / 1e5:.6g} bar",
        )
    from scipy.optimize import brentq

    eos = _eos(temperature=0.7 * tc, pressure=pressure, tc=tc, pc=pc, omega=omega)
    low = 0.3 * tc
    if eos.Psat(low) > pressure:
        raise NoSuchState(
            f"saturation at {pressure / 1e5:.3g} bar lies below the equation of state's range",
            hint="give --temperature",
        )
    return float(brentq(lambda t: eos.Psat(t) - pressure, low, tc * (1.0 - 1e-9), xtol=1e-9))


def enthalpy(
    *,
    temperature: float,
    tc: float,
    pc: float,
    omega: float,
    pressure: float | None = None,
    root: Literal["vapour", "liquid", "stable"] = "vapour",
) -> tuple[float, float, str]:
    """Residual enthalpy ``(H(T, p) - H_ideal(T) [J/mol], p [Pa], root found)``; saturated where ``pressure`` is None.

    Temperature and ``tc`` in K, ``pressure`` and ``pc`` in Pa.
    """
    p = pressure
    if p is None:
        p = saturation_pressure(temperature=temperature, tc=tc, pc=pc, omega=omega)
    eos = _eos(temperature=temperature, pressure=p, tc=tc, pc=pc, omega=omega)
    vapour, liquid = getattr(eos, "H_dep_g", None), getattr(eos, "H_dep_l", None)
    if vapour is None and liquid is None:  # pragma: no cover - the library always fills one
        raise NoSuchState(f"the equation of state has no root at {temperature:.6g} K and {p / 1e5:.6g} bar")
    if root == "stable" and vapour is not None and liquid is not None:
        root = "vapour" if eos.G_dep_g <= eos.G_dep_l else "liquid"
    elif root == "stable":
        if temperature >= tc:
            root = "vapour"
            vapour = vapour if vapour is not None else liquid
        else:
            root = "vapour" if vapour is not None else "liquid"
    value = vapour if root == "vapour" else liquid
    if value is None:
        raise NoSuchState(
            f"no {root} root of the equation of state at {temperature:.6g} K and {p / 1e5:.6g} bar",
            hint="the other phase is the stable one there",
        )
    return float(value), float(p), root


def liquid_pressure_term(
    *, start: float, end: float, tc: float, pc: float, omega: float, isobaric: bool = True
) -> float:
    """Integral of v(1 - aT) dp along saturation between two temperatures [K], in J/mol; without aT if not ``isobaric``.

    dH(sat)/dT = Cp + v(1 - aT) dp/dT = C(sat) + v dp/dT (Reid, Prausnitz, Poling 1987). Liquid
    volume by Yamada and Gunn (1973), vapour pressure by Lee and Kesler (1975), both through ``chemicals``.
    """
    import numpy as np
    from chemicals.vapor_pressure import Lee_Kesler
    from chemicals.volume import Yamada_Gunn

    nodes, weights = np.polynomial.legendre.leggauss(24)
    half, mid = 0.5 * (end - start), 0.5 * (end + start)
    total = 0.0
    for node, weight in zip(nodes.tolist(), weights.tolist(), strict=True):
        t = mid + half * node
        step = 1e-4 * t
        v = Yamada_Gunn(t, tc, pc, omega)
        slope = (Yamada_Gunn(t + step, tc, pc, omega) - Yamada_Gunn(t - step, tc, pc, omega)) / (2.0 * step)
        dp = (Lee_Kesler(t + step, tc, pc, omega) - Lee_Kesler(t - step, tc, pc, omega)) / (2.0 * step)
        total += weight * (v - t * slope if isobaric else v) * dp
    return float(total * half)
