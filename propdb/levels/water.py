"""Water's real fluid by IAPWS-95 (IAPWS R6-95(2018)), through the Helmholtz derivatives of ``chemicals.iapws``.

The saturation curve is taken from ``iapws95_rhol_sat`` and ``iapws95_rhog_sat``: the library's own iteration
(``iapws95_saturation``) does not converge near the triple point. Enthalpies are on the formulation's own zero
(internal energy of the saturated liquid at the triple point is 0), in J/mol with the formulation's molar mass.
"""

from __future__ import annotations

from functools import lru_cache
from typing import Literal

from propdb.errors import NoSuchState, TemperatureOutOfRange

__all__ = ["M_WATER", "T_CRITICAL", "T_MAX", "T_MIN", "T_TRIPLE", "enthalpy", "gas_enthalpy", "saturation", "volume"]

M_WATER = 0.018015268  # [kg/mol], IAPWS R6-95(2018)
R_MASS = 461.51805  # [J/kg/K], IAPWS R6-95(2018)
T_CRITICAL = 647.096
P_CRITICAL = 22.064e6
RHO_CRITICAL = 322.0
T_TRIPLE = 273.16
T_MIN = 273.15  # 10 mK below the triple point: the ice point, where the liquid at 1 atm is still stable
T_MAX = 1273.0
P_MAX = 1e9


def _at(temperature: float, density: float) -> tuple[float, float]:
    """Enthalpy [J/kg] and pressure [Pa] at temperature [K] and density [kg/m^3] (R6-95, table 3)."""
    from chemicals import iapws

    tau, delta = T_CRITICAL / temperature, density / RHO_CRITICAL
    if abs(delta - 1.0) < 1e-9:  # the critical terms divide by (delta - 1)
        delta = 1.0 + 1e-9
    ideal = iapws.iapws95_dA0_dtau(tau, delta)
    residual_tau = iapws.iapws95_dAr_dtau(tau, delta)
    residual_delta = iapws.iapws95_dAr_ddelta(tau, delta)
    h = R_MASS * temperature * (1.0 + tau * (ideal + residual_tau) + delta * residual_delta)
    p = density * R_MASS * temperature * (1.0 + delta * residual_delta)
    return h, p


@lru_cache(maxsize=4096)
def saturation(*, temperature: float) -> tuple[float, float, float, float, float]:
    """Saturation at a temperature [K].

    Returns
    -------
    (p, h_liquid, h_vapour, v_liquid, v_vapour)
        [Pa], [J/mol], [J/mol], [m^3/mol], [m^3/mol]

    Raises
    ------
    NoSuchState
        Above the critical temperature.
    TemperatureOutOfRange
        Below the range of the formulation.
    """
    from chemicals import iapws

    if temperature > T_CRITICAL:
        raise NoSuchState(
            f"water has no saturated liquid or vapour at {temperature:.6g} K",
            hint=f"its critical temperature is {T_CRITICAL} K; use --phase fluid with --pressure",
        )
    if temperature < T_MIN:
        raise TemperatureOutOfRange(
            f"liquid water at {temperature:.6g} K is below the range of IAPWS-95",
            hint=f"the range is {T_MIN} to {T_MAX:.0f} K",
            ranges=[(T_MIN, T_MAX)],
        )
    rho_l, rho_g = _coexistence(temperature, iapws.iapws95_rhol_sat(temperature), iapws.iapws95_rhog_sat(temperature))
    h_l, p_l = _at(temperature, rho_l)
    h_g, p = _at(temperature, rho_g)
    return p, h_l * M_WATER, h_g * M_WATER, M_WATER / rho_l, M_WATER / rho_g


def _coexistence(temperature: float, rho_l: float, rho_g: float) -> tuple[float, float]:
    """Polish the library's saturation densities to equal pressure and Gibbs energy (Maxwell criterion)."""
    from math import log

    from chemicals import iapws

    if temperature > T_CRITICAL - 0.05:  # the two roots merge; the library's fit is as good as a float gets
        return rho_l, rho_g
    tau = T_CRITICAL / temperature
    rt = R_MASS * temperature
    for _ in range(4):
        terms = []
        for rho in (rho_l, rho_g):
            delta = rho / RHO_CRITICAL
            ar = iapws.iapws95_Ar(tau, delta)
            d1 = iapws.iapws95_dAr_ddelta(tau, delta)
            d2 = iapws.iapws95_d2Ar_ddelta2(tau, delta)
            p = rho * rt * (1.0 + delta * d1)
            dp = rt * (1.0 + 2.0 * delta * d1 + delta * delta * d2)
            terms.append((p, dp, ar + delta * d1))
        (p_l, dp_l, g_l), (p_g, dp_g, g_g) = terms
        # residuals: pressure, and Gibbs energy / RT; d(g/RT)/drho = dp/drho / (rho RT)
        r1 = p_l - p_g
        r2 = g_l - g_g + log(rho_l / rho_g)
        a, b = dp_l, -dp_g
        c, d = dp_l / (rho_l * rt), -dp_g / (rho_g * rt)
        det = a * d - b * c
        step_l, step_g = (r1 * d - b * r2) / det, (a * r2 - c * r1) / det
        rho_l -= step_l
        rho_g -= step_g
        if abs(step_l) < 1e-13 * rho_l and abs(step_g) < 1e-13 * rho_g:
            break
    return rho_l, rho_g


@lru_cache(maxsize=1024)
def saturation_temperature(*, pressure: float) -> float:
    """Saturation temperature [K] at a pressure [Pa], by Newton on the equation of state's own saturation pressure.

    Raises NoSuchState above the critical pressure or below the triple point's.
    """
    if not saturation(temperature=T_MIN)[0] <= pressure <= P_CRITICAL:
        raise NoSuchState(
            f"water does not boil at {pressure / 1e5:.6g} bar",
            hint=f"saturation runs from 0.00611 bar to {P_CRITICAL / 1e5:.2f} bar; give --temperature instead",
        )
    if pressure >= saturation(temperature=T_CRITICAL)[0]:
        return T_CRITICAL
    from scipy.optimize import brentq

    return float(brentq(lambda t: saturation(temperature=t)[0] - pressure, T_MIN, T_CRITICAL, xtol=1e-10, rtol=1e-14))


@lru_cache(maxsize=1024)
def density(*, temperature: float, pressure: float, liquid: bool | None = None) -> float:
    """Density [kg/m^3] of the stable fluid at temperature [K] and pressure [Pa] (or of the branch asked for).

    Raises TemperatureOutOfRange or NoSuchState outside the formulation.
    """
    if not T_MIN <= temperature <= T_MAX:
        raise TemperatureOutOfRange(
            f"water at {temperature:.6g} K is outside the range of IAPWS-95",
            hint=f"the range is {T_MIN} to {T_MAX:.0f} K",
            ranges=[(T_MIN, T_MAX)],
        )
    if not 0.0 < pressure <= P_MAX:
        raise NoSuchState(f"water at {pressure / 1e5:.6g} bar is outside IAPWS-95", hint="the range is up to 10000 bar")
    from scipy.optimize import brentq

    def excess(rho: float) -> float:
        return _at(temperature, rho)[1] - pressure

    if temperature < T_CRITICAL:
        p_sat, _, _, v_l, v_g = saturation(temperature=temperature)
        if liquid is None:
            liquid = pressure >= p_sat
        if liquid:
            low = M_WATER / v_l
            if pressure < p_sat:  # metastable by a little: slide down from saturation
                low *= 0.999
            return float(brentq(excess, low * (1.0 - 1e-9), 1500.0, xtol=1e-10, rtol=1e-14))
        return float(brentq(excess, 1e-12, M_WATER / v_g * (1.0 + 1e-9), xtol=1e-14, rtol=1e-14))
    return float(brentq(excess, 1e-12, 1500.0, xtol=1e-12, rtol=1e-14))


def volume(*, temperature: float, saturated: Literal["liquid", "vapour"]) -> float:
    """Molar volume [m^3/mol] on the saturation curve at a temperature [K]."""
    return saturation(temperature=temperature)[3 if saturated == "liquid" else 4]


def gas_enthalpy(*, temperature: float) -> float:
    """Ideal-gas enthalpy [J/mol]: the formulation at zero density. Temperature in K."""
    from chemicals import iapws

    tau = T_CRITICAL / temperature
    return float(R_MASS * temperature * (1.0 + tau * iapws.iapws95_dA0_dtau(tau, 1e-9)) * M_WATER)


def enthalpy(
    *, temperature: float, pressure: float | None = None, saturated: Literal["", "liquid", "vapour"] = ""
) -> float:
    """Enthalpy [J/mol] of the real fluid at temperature [K] and pressure [Pa], or saturated."""
    if saturated:
        return saturation(temperature=temperature)[1 if saturated == "liquid" else 2]
    if pressure is None:
        raise NoSuchState("the real fluid needs a pressure", hint="give --pressure, or --saturated liquid|vapour")
    rho = density(temperature=temperature, pressure=pressure)
    return _at(temperature, rho)[0] * M_WATER


def liquid_enthalpy(*, temperature: float) -> float:
    """Enthalpy [J/mol] of liquid water: at 1 bar below its boiling point there, saturated above. Temperature in K."""
    p_sat, h_sat, *_ = saturation(temperature=temperature)
    if p_sat >= 1e5:
        return h_sat
    rho = density(temperature=temperature, pressure=1e5, liquid=True)
    return _at(temperature, rho)[0] * M_WATER


def pressed_liquid_enthalpy(*, temperature: float, pressure: float, slack: float) -> float:
    """Enthalpy [J/mol] of liquid water at temperature [K] and pressure [Pa].

    A boiling point is often given to a degree, so up to ``slack`` [K] above it the liquid is taken as overheated.
    Raises NoSuchState beyond.
    """
    p_sat = saturation(temperature=temperature)[0]
    if pressure < p_sat:
        boils = saturation_temperature(pressure=pressure)
        if temperature > boils + slack:
            raise NoSuchState(
                f"water is no liquid at {temperature:.6g} K and {pressure / 1e5:.6g} bar: it boils at {boils:.6g} K",
                hint="it has boiled at this pressure; use --phase fluid with --pressure",
            )
    rho = density(temperature=temperature, pressure=pressure, liquid=True)
    return _at(temperature, rho)[0] * M_WATER
