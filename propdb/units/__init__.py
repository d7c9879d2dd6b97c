"""Units, read and written at the edges only. Inside propdb: J/mol, J/mol/K, K, Pa, kg/mol.

* :mod:`propdb.units.table`: the one table of units, and what a misspelt one was meant to be
* :mod:`propdb.units.compound`: enthalpies and heat capacities, per amount, mass or normal volume
* :mod:`propdb.units.scalar`: temperatures and absolute pressures
* :mod:`propdb.units.numbers`: numbers as text

Letter case: ``btu/lb`` and ``KJ/kg`` can mean one thing only and are taken as ``BTU/lb`` and ``kJ/kg``. Where another
case means something else (``mJ``, ``mPa``, ``Mbar``, ``nm3``) the unit is refused and the likely one is named.
"""

from __future__ import annotations

from propdb.units.compound import (
    DIMENSIONS,
    SI_UNITS,
    EnthalpyUnit,
    HeatCapacityUnit,
    Quantity,
    enthalpy_decimals,
    format_enthalpy,
    parse_heat_capacity_unit,
    parse_quantity,
    parse_unit,
    read_si,
)
from propdb.units.numbers import format_number
from propdb.units.scalar import format_pressure, format_temperature, parse_pressure, parse_temperature
from propdb.units.table import R_GAS

__all__ = [
    "DIMENSIONS",
    "R_GAS",
    "SI_UNITS",
    "EnthalpyUnit",
    "HeatCapacityUnit",
    "Quantity",
    "enthalpy_decimals",
    "format_enthalpy",
    "format_number",
    "format_pressure",
    "format_temperature",
    "parse_heat_capacity_unit",
    "parse_pressure",
    "parse_quantity",
    "parse_temperature",
    "parse_unit",
    "read_si",
]
