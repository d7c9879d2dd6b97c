"""Every equation that propdb knows, by the name under which it is stored."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from propdb.cp._base import Equation
from propdb.cp.alylee import AlyLee
from propdb.cp.latent import ConstantLatent, LatentHeat, Watson
from propdb.cp.liquids import PerryLiquid, ZabranskyCubic, ZabranskyQuasi
from propdb.cp.nasa import Nasa7, Nasa9
from propdb.cp.polynomial import Constant, Polynomial
from propdb.cp.shomate import Shomate
from propdb.cp.table import Table
from propdb.cp.trc import TrcGas
from propdb.cp.union import Union
from propdb.cp.vaporisation import PerryVaporisation, VdiVaporisation
from propdb.errors import EquationError

__all__ = ["EQUATIONS", "EquationSpec", "build", "build_heat_capacity", "build_latent_heat"]

HEAT_CAPACITY = "heat capacity"
LATENT_HEAT = "latent heat"


@dataclass(frozen=True, slots=True)
class EquationSpec:
    """One line of the table.

    Attributes
    ----------
    quantity : str
        What the equation gives: heat capacity or latent heat.
    form : str
        The formula in one line, as users see it.
    from_params : callable
        Makes the equation from its stored form.
    """

    quantity: str
    form: str
    from_params: Callable[[Mapping[str, Any]], Any]


EQUATIONS: dict[str, EquationSpec] = {
    "constant": EquationSpec(HEAT_CAPACITY, "cp = value", Constant.from_params),
    "polynomial": EquationSpec(HEAT_CAPACITY, "cp = sum(c_i T^n_i), integer n_i", Polynomial.from_params),
    "nasa7": EquationSpec(HEAT_CAPACITY, "cp/R = a1 + a2 T + ... + a5 T^4", Nasa7.from_params),
    "nasa9": EquationSpec(HEAT_CAPACITY, "cp/R = a1/T^2 + a2/T + a3 + a4 T + ... + a7 T^4", Nasa9.from_params),
    "shomate": EquationSpec(HEAT_CAPACITY, "cp = A + B t + C t^2 + D t^3 + E/t^2, t = T/1000", Shomate.from_params),
    "aly-lee": EquationSpec(
        HEAT_CAPACITY, "cp = A + B [(C/T)/sinh(C/T)]^2 + D [(E/T)/cosh(E/T)]^2", AlyLee.from_params
    ),
    "trc-gas": EquationSpec(
        HEAT_CAPACITY,
        "cp/R = a0 + (a1/T^2) exp(-a2/T) + a3 y^2 + (a4 - a5/(T - a7)^2) y^8, y = (T - a7)/(T + a6)",
        TrcGas.from_params,
    ),
    "zabransky-cubic": EquationSpec(
        HEAT_CAPACITY, "c/R = A1 + A2 (T/100) + A3 (T/100)^2 + A4 (T/100)^3", ZabranskyCubic.from_params
    ),
    "zabransky-quasi": EquationSpec(
        HEAT_CAPACITY, "c/R = A1 ln(1 - Tr) + A2/(1 - Tr) + A3 + A4 Tr + A5 Tr^2 + A6 Tr^3", ZabranskyQuasi.from_params
    ),
    "perry-liquid": EquationSpec(
        HEAT_CAPACITY,
        "cp = A^2/t + B - 2AC t - AD t^2 - C^2 t^3/3 - CD t^4/2 - D^2 t^5/5, t = 1 - T/Tc",
        PerryLiquid.from_params,
    ),
    "table": EquationSpec(HEAT_CAPACITY, "monotone cubics between tabulated values", Table.from_params),
    "union": EquationSpec(HEAT_CAPACITY, "pieces, each on its own range", Union.from_params),
    "constant-latent": EquationSpec(LATENT_HEAT, "dh at one T", ConstantLatent.from_params),
    "watson": EquationSpec(LATENT_HEAT, "dh = dh1 ((Tc - T)/(Tc - T1))^n", Watson.from_params),
    "perry-vaporisation": EquationSpec(
        LATENT_HEAT, "dh = A (1 - Tr)^(B + C Tr + D Tr^2)", PerryVaporisation.from_params
    ),
    "vdi-vaporisation": EquationSpec(
        LATENT_HEAT,
        "dh = R Tc (A t^(1/3) + B t^(2/3) + C t + D t^2 + E t^6), t = 1 - T/Tc",
        VdiVaporisation.from_params,
    ),
}


def build(name: str, params: Mapping[str, Any]) -> Equation | LatentHeat:
    """An equation from its stored form.

    Parameters
    ----------
    name : str
        A key of `EQUATIONS`.
    params : mapping
        The stored form; see the `from_params` of each class.

    Raises
    ------
    EquationError
        If the name is unknown or the parameters do not make an equation.
    """
    spec = EQUATIONS.get(name) if isinstance(name, str) else None
    if spec is None:
        raise EquationError(f"no equation is called {name!r}", hint=f"there are {', '.join(sorted(EQUATIONS))}")
    if not isinstance(params, Mapping):
        raise EquationError(f"the parameters of {name} must be a table of fields", where=name)
    try:
        equation: Equation | LatentHeat = spec.from_params(params)
    except EquationError as error:
        if error.where:
            raise
        raise EquationError(error.problem, hint=error.hint, where=name, **error.fields) from error
    return equation


def build_heat_capacity(name: str, params: Mapping[str, Any]) -> Equation:
    """As `build`, refusing latent heats."""
    equation: Equation = build(name, params)  # type: ignore[assignment]
    if EQUATIONS[name].quantity == LATENT_HEAT:
        raise EquationError(f"{name} is a latent heat, not a heat capacity")
    return equation


def build_latent_heat(name: str, params: Mapping[str, Any]) -> LatentHeat:
    """As `build`, refusing heat capacities."""
    equation: LatentHeat = build(name, params)  # type: ignore[assignment]
    if EQUATIONS[name].quantity != LATENT_HEAT:
        raise EquationError(f"{name} is a heat capacity, not a latent heat")
    return equation
