"""Enthalpies and heat capacities: an energy per amount, mass or normal volume, and that per degree."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Final, Literal, NamedTuple, NoReturn

from propdb.errors import UnitError
from propdb.units.numbers import exact, format_number, quoted, split_number
from propdb.units.scalar import read_pressure, read_temperature, temperature_step
from propdb.units.table import (
    AMOUNTS,
    CALORIES,
    DEGREES,
    ENERGIES,
    KINDS,
    MASSES,
    NORMAL_VOLUMES,
    R_GAS,
    meant,
    resolve,
)

Basis = Literal["amount", "mass", "normal volume"]
Dimension = Literal["enthalpy", "heat capacity", "temperature", "pressure", "number"]

#: What :func:`read_si` reads a number into.
SI_UNITS: Final[Mapping[Dimension, str]] = {
    "enthalpy": "J/mol",
    "heat capacity": "J/mol/K",
    "temperature": "K",
    "pressure": "Pa",
    "number": "1",
}
DIMENSIONS: Final = tuple(SI_UNITS)

_BASES: Final[Mapping[Basis, Mapping[str, float]]] = {
    "amount": AMOUNTS,
    "mass": MASSES,
    "normal volume": NORMAL_VOLUMES,
}
_WANTED: Final[Mapping[str, tuple[str, str]]] = {
    "enthalpy": ("an energy per amount, mass or normal volume", "kJ/mol, kJ/kg or BTU/lb"),
    "heat capacity": ("an energy per amount, mass or normal volume, and per degree", "J/mol/K, kJ/kg/K or BTU/lb/F"),
}
_SIGNS: Final = str.maketrans(
    {"−": "-", "⁻": "-", "¹": "1", "³": "3", "^": "", "°": "", "º": "", "·": " ", "⋅": " ", "*": " "}
)
_SYMBOL: Final = re.compile(r"[A-Za-z][A-Za-z_]*[23]?")
_POUND_MOLE: Final = re.compile(r"\blb[- ]mol\b", re.IGNORECASE)
_DEGREE: Final = re.compile(r"\bdeg ?(?=[CFRK]\b)")


@dataclass(frozen=True, slots=True)
class _PerBasis:
    """A unit of energy per something.

    text
        The unit as propdb writes it.
    basis
        What the energy is counted per.
    factor
        One of the unit in SI: per mol for ``amount`` and ``normal volume``, per kg for ``mass``.
    """

    text: str
    basis: Basis
    factor: float

    def __str__(self) -> str:
        return self.text

    def scale(self, *, molar_mass: float | None = None) -> float:
        """One of the unit, per mol [J/mol, or J/mol/K].

        Parameters
        ----------
        molar_mass : float, optional
            Needed by units per mass only [kg/mol].

        Raises
        ------
        UnitError
            The unit is per mass and there is no positive, finite molar mass.
        """
        if self.basis != "mass":
            return self.factor
        if molar_mass is None:
            raise UnitError(f"{self.text} is per mass and the molar mass is not known", hint="use a unit per mol")
        if not (math.isfinite(molar_mass) and molar_mass > 0):
            raise UnitError(f"{self.text} needs a positive molar mass, not {molar_mass!r} kg/mol")
        return self.factor * molar_mass

    def to_si(self, value: float, *, molar_mass: float | None = None) -> float:
        """`value` [this unit] per mol [J/mol, or J/mol/K]; `molar_mass` [kg/mol] and errors as in :meth:`scale`."""
        return value * self.scale(molar_mass=molar_mass)

    def from_si(self, value: float, *, molar_mass: float | None = None) -> float:
        """`value` [J/mol, or J/mol/K] in this unit; `molar_mass` [kg/mol] and errors as in :meth:`scale`."""
        return value / self.scale(molar_mass=molar_mass)


@dataclass(frozen=True, slots=True)
class EnthalpyUnit(_PerBasis):
    """A unit of enthalpy; ``factor`` in J/mol, or J/kg for the basis ``mass``."""


@dataclass(frozen=True, slots=True)
class HeatCapacityUnit(_PerBasis):
    """A unit of heat capacity or entropy; ``factor`` in J/mol/K, or J/kg/K for the basis ``mass``."""


class Quantity(NamedTuple):
    """A number as carried, its value [``unit``], and its unit."""

    text: str
    value: float
    unit: EnthalpyUnit


def parse_unit(text: str) -> EnthalpyUnit:
    """Read a unit of enthalpy such as ``kJ/mol``, ``BTU/lb`` or ``kcal_th/Nm3``.

    Raises
    ------
    UnitError
        An unknown unit, another dimension, or a calorie that does not say which.
    """
    energy, basis, degree = _read(text, "enthalpy")
    if degree is not None:
        _refuse(text, [energy], [basis, degree], "enthalpy", f"{energy}/{basis}")
    return EnthalpyUnit(f"{energy}/{basis}", *_per(energy, basis))


def parse_heat_capacity_unit(text: str) -> HeatCapacityUnit:
    """Read a unit of heat capacity or entropy: ``J/mol/K``, ``BTU/lb/F``, ``kJ/(kg K)``, or ``R`` (the gas constant).

    Raises
    ------
    UnitError
        As :func:`parse_unit`.
    """
    if text.strip() == "R":
        return HeatCapacityUnit("R", "amount", R_GAS)
    energy, basis, degree = _read(text, "heat capacity")
    if degree is None:
        _refuse(text, [energy], [basis], "heat capacity", f"{energy}/{basis}/K")
    per, factor = _per(energy, basis)
    return HeatCapacityUnit(f"{energy}/{basis}/{degree}", per, factor / DEGREES[degree])


def parse_quantity(text: str) -> Quantity:
    """Read ``2800.8 kJ/kg`` into the number as carried, its value, and its unit of enthalpy.

    Raises
    ------
    UnitError
        No finite number, no unit, or as :func:`parse_unit`.
    """
    number, unit = split_number(text, "an enthalpy", "'2800.8 kJ/kg'", UnitError)
    if not unit:
        raise UnitError(f"{quoted(text)} has no unit", hint=f"write e.g. '{number} kJ/mol' or '{number} kJ/kg'")
    return Quantity(number, float(number), parse_unit(unit))


def read_si(
    number: str,
    unit: str,
    *,
    dimension: Dimension,
    molar_mass: float | None = None,
    difference: bool = False,
) -> float:
    """Read a number and its unit, both as text, into the unit of :data:`SI_UNITS`: what a row of data holds.

    Parameters
    ----------
    number : str
        The number as carried [unit].
    unit : str
        Its unit; ``1`` for a plain number.
    dimension : str
        One of :data:`DIMENSIONS`; an entropy is a ``heat capacity``.
    molar_mass : float, optional
        Needed by units per mass [kg/mol].
    difference : bool
        The number is a difference or an uncertainty: no zero of a temperature scale is added, and neither a temperature
        nor a pressure need be positive.

    Raises
    ------
    UnitError, TemperatureError, PressureError
        The number is not one, the unit is unknown or of another dimension, or the state cannot be.
    """
    digits, rest = split_number(number, "a number", "393.51", UnitError)
    if rest:
        raise UnitError(f"{quoted(number)} is not a number", hint=f"write {digits}, and the unit apart")
    if dimension == "number":
        if unit.strip() != "1":
            raise UnitError(f"{quoted(unit)} is a unit, and this quantity has none", hint="write 1")
        return float(digits)
    if dimension == "temperature":
        step = temperature_step(unit)
        return float(exact(digits)) * step if difference else read_temperature(digits, unit)
    if dimension == "pressure":
        return read_pressure(digits, unit, positive=not difference)
    parsed = parse_unit(unit) if dimension == "enthalpy" else parse_heat_capacity_unit(unit)
    value = parsed.to_si(float(digits), molar_mass=molar_mass)
    if not math.isfinite(value):
        raise UnitError(f"{quoted(number)} {parsed} is too large to be a number here")
    return value


def enthalpy_decimals(unit: EnthalpyUnit) -> int:
    """Decimals that show about 1 J/mol, or 10 J/kg: 3 in kJ/mol, 2 in kJ/kg and BTU/lb [-]."""
    return max(0, round(math.log10(unit.factor)) - (unit.basis == "mass"))


def format_enthalpy(value: float, unit: EnthalpyUnit) -> str:
    """`value` [unit] with its unit, to :func:`enthalpy_decimals`: ``-393.510 kJ/mol``."""
    return f"{format_number(value, decimals=enthalpy_decimals(unit))} {unit.text}"


def _per(energy: str, basis: str) -> tuple[Basis, float]:
    for per, table in _BASES.items():
        if basis in table:
            return per, ENERGIES[energy] / table[basis]
    raise UnitError(f"{basis!r} is no basis")  # _read lets none through


def _read(text: str, wanted: str) -> tuple[str, str, str | None]:
    """Energy, basis and degree (or None), as the table writes them."""
    symbols = _symbols(text, wanted)
    above, below = [_known(symbol, text) for symbol in symbols[0]], [_known(symbol, text) for symbol in symbols[1]]
    bases = [symbol for symbol in below if any(symbol in table for table in _BASES.values())]
    degrees = [symbol for symbol in below if symbol in DEGREES]
    fits = len(above) == 1 and above[0] in ENERGIES and len(bases) == 1 and len(degrees) <= 1
    if not fits or len(bases) + len(degrees) != len(below):
        _refuse(text, above, below, wanted)
    return above[0], bases[0], degrees[0] if degrees else None


def _symbols(text: str, wanted: str) -> tuple[list[str], list[str]]:
    """Symbols above and below the line. ``J/mol/K``, ``J/(mol K)``, ``J/mol-K`` and ``J mol-1 K-1`` are one unit."""
    plain = _DEGREE.sub("", _POUND_MOLE.sub("lbmol", text.translate(_SIGNS).strip()))
    if "-1" in plain:
        words = plain.replace(".", " ").split()
        above = [word for word in words if not word.endswith("-1")]
        below = [word.removesuffix("-1") for word in words if word.endswith("-1")]
    else:
        head, *tails = plain.split("/")
        tails = [_bare(tail.strip()) for tail in tails]
        above = head.split()
        below = [word for tail in tails for word in re.split(r"[\s.\-]+", tail)]
    if not above or not all(_SYMBOL.fullmatch(word) for word in (*above, *below)):
        right, example = _WANTED[wanted]
        raise UnitError(f"{quoted(text)} is not a unit of {wanted}", hint=f"write {right}, e.g. {example}")
    return above, below


def _bare(text: str) -> str:
    return text[1:-1] if text.startswith("(") and text.endswith(")") else text


def _known(symbol: str, text: str) -> str:
    """The symbol as the table writes it; in a message the whole unit is corrected."""
    if symbol.lower() in CALORIES:
        th, it = f"{symbol.lower()}_th", f"{symbol.lower()}_IT"
        choice = " or ".join(f"{quoted(text.replace(symbol, kind, 1))} ({ENERGIES[kind]:g} J)" for kind in (th, it))
        raise UnitError(f"{symbol} has two meanings", hint=f"write {choice}", unit=text)
    known = resolve(symbol)
    if known is not None:
        return known
    near = meant(symbol, (*ENERGIES, *AMOUNTS, *MASSES, *NORMAL_VOLUMES))
    hint = f"known are {', '.join(ENERGIES)} per {', '.join((*AMOUNTS, *MASSES, *NORMAL_VOLUMES))}"
    if near:
        aside = " (t is 1000 kg)" if near == "t" else ""
        hint = f"did you mean {quoted(text.replace(symbol, near, 1))}?{aside}"
    raise UnitError(f"unknown unit {quoted(symbol)} in {quoted(text)}", hint=hint, unit=text)


def _refuse(text: str, above: list[str], below: list[str], wanted: str, suggestion: str = "") -> NoReturn:
    """Say what the unit is, and what would be right."""
    kind = " per ".join([" times ".join(KINDS[s] for s in above), *(KINDS[s] for s in below)])
    if not suggestion and len(above) == 1:
        suggestion = _likely(above[0], [s for s in below if any(s in table for table in _BASES.values())], wanted)
    words, example = _WANTED[wanted]
    hint = f"did you mean {suggestion}?" if suggestion else f"write {words}, e.g. {example}"
    if KINDS[above[0]] == "energy" and any(KINDS[s] == "volume" for s in below):
        hint = "say at which conditions: Nm3 (0 °C), Sm3 (15 °C) or scf (60 °F)"
    article = "an" if kind[0] in "aeiou" else "a"
    name = {"enthalpy": "an enthalpy", "heat capacity": "a heat capacity or entropy"}[wanted]
    raise UnitError(f"{quoted(text)} is {article} {kind}, not {name}", hint=hint, unit=text)


def _likely(symbol: str, bases: list[str], wanted: str) -> str:
    """The unit that a dimension near the wanted one was meant to be, or nothing."""
    energy = {"W": "J", "kW": "kJ", "MW": "MJ", "GW": "GJ", "mJ": "MJ"}.get(symbol, symbol)
    if energy not in ENERGIES or (energy != symbol and not bases):
        return ""
    end = "/K" if wanted == "heat capacity" else ""
    return " or ".join(f"{energy}/{basis}{end}" for basis in (bases[:1] or ("mol", "kg")))
