"""Temperatures, pressures and enthalpies in datum texts, through :mod:`propdb.units`; 0 K is a temperature here."""

from __future__ import annotations

import re
from typing import Literal

from propdb import units

__all__ = ["read_enthalpy", "read_pressure", "read_temperature", "write_temperature"]

_ZERO_KELVIN = re.compile(r"[+-]?0+(\.0*)?\s*K")


def read_temperature(text: str) -> float:
    """Temperature [K]; unlike a state, a datum may stand at 0 K.

    Raises
    ------
    TemperatureError
        Not a temperature, or without a unit.
    """
    if _ZERO_KELVIN.fullmatch(text.strip()):
        return 0.0
    return units.parse_temperature(text)


def read_pressure(text: str) -> float:
    """Absolute pressure [Pa].

    Raises
    ------
    PressureError
        Not a pressure.
    """
    return units.parse_pressure(text)


def read_enthalpy(text: str) -> tuple[float, str]:
    """Enthalpy and its unit, ``J/mol`` or ``J/kg`` (a normal volume counts as an amount); zero is 0 J/mol.

    Raises
    ------
    UnitError
        Not an enthalpy per amount or mass.
    """
    quantity = units.parse_quantity(text)
    value = quantity.value * quantity.unit.factor
    return (value, "J/kg" if quantity.unit.basis == "mass" else "J/mol") if value else (0.0, "J/mol")


def write_temperature(temperature: float | Literal["same", "boiling"]) -> str:
    """A temperature [K] as text, in the unit that gives the shortest number: 25 °C, 60 °F, 273.16 K."""
    if isinstance(temperature, str):
        return temperature
    celsius = round(temperature - 273.15, 9)
    fahrenheit = round(temperature * 1.8 - 459.67, 9)
    if temperature and celsius == int(celsius):
        return f"{celsius:.0f} °C"
    if temperature and fahrenheit == int(fahrenheit):
        return f"{fahrenheit:.0f} °F"
    return f"{temperature:.10g} K"
