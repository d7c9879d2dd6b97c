"""Temperature, pressure and flow columns: their units as factors."""

from __future__ import annotations

from collections.abc import Callable
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from propdb.errors import PressureError, PropdbError, TemperatureError, UnitError
from propdb.units import parse_pressure, parse_temperature
from propdb.units.scalar import _gauge, read_pressure
from propdb.units.table import AMOUNTS, MASSES, NORMAL_VOLUMES, SCALES

__all__ = ["Flow", "flow_unit", "pressure_scale", "temperature_scale", "temperature_unit"]


def temperature_unit(unit: str, column: str) -> str:
    """``K``, ``C``, ``F`` or ``R`` from a unit as written. Raises UnitError."""
    if not unit:
        raise UnitError(
            f"the temperatures of column {column!r} have no unit",
            hint=f"write e.g. {column} [°C] in the header, or give --units temperature=C",
        )
    from propdb.units.scalar import _scale

    try:
        return _scale(unit)
    except PropdbError as error:
        error.where = error.where or f"column {column!r}"
        raise


def temperature_scale(unit: str, column: str) -> Callable[[NDArray[np.float64]], NDArray[np.float64]]:
    """A function from numbers of a column to K. Raises UnitError."""
    offset, numerator, denominator = SCALES[temperature_unit(unit, column)]
    add = float(offset)

    def kelvin(values: NDArray[np.float64]) -> NDArray[np.float64]:
        if not add and numerator == denominator:
            return values
        found = values + add
        return found if numerator == denominator else found * numerator / denominator

    return kelvin


def pressure_scale(unit: str, column: str) -> Callable[[NDArray[np.float64]], NDArray[np.float64]]:
    """A function from numbers of a column to Pa, absolute. A gauge unit states its atmosphere: ``barg+1.01325bar``.

    Raises UnitError or PressureError.
    """
    if not unit:
        raise UnitError(
            f"the pressures of column {column!r} have no unit",
            hint=f"write e.g. {column} [bar] in the header, or give --units pressure=bar",
        )
    bare, _, atmosphere = (part.strip() for part in unit.partition("+"))
    gauge = _gauge(bare)
    if gauge and not atmosphere:
        raise PressureError(
            f"{unit!r} is a gauge pressure, and gauge needs a stated atmosphere",
            where=f"column {column!r}",
            hint=f"say it: --units pressure={gauge}g+{'14.696psi' if gauge == 'psi' else '1.01325bar'}",
        )
    try:
        factor = read_pressure("1", gauge or unit)
        add = parse_pressure(atmosphere) if gauge else 0.0
    except PropdbError as error:
        error.where = error.where or f"column {column!r}"
        raise

    def pascal(values: NDArray[np.float64]) -> NDArray[np.float64]:
        with np.errstate(over="ignore"):  # no pressure is that high, and its row is flagged
            return values * factor + add

    return pascal


class Flow(NamedTuple):
    """A unit of flow: ``factor`` in mol/s, or kg/s where ``mass``."""

    text: str
    mass: bool
    factor: float


#: Units of flow that are no others, and how they are read.
_TRADE = {
    "MMSCFD": (1e6 * NORMAL_VOLUMES["scf"] / 86400.0, False),
    "MMscf": (1e6 * NORMAL_VOLUMES["scf"], False),
    "kNm3": (1e3 * NORMAL_VOLUMES["Nm3"], False),
    "klb": (1e3 * MASSES["lb"], True),
}
_TIMES = {"s": 1.0, "min": 60.0, "h": 3600.0, "hr": 3600.0, "d": 86400.0, "day": 86400.0}


def flow_unit(text: str, column: str) -> Flow:
    """Read ``kg/h``, ``kmol/h``, ``t/d``, ``Nm3/h``, ``klb/h``, ``MMSCFD``. Raises UnitError."""
    above, _, below = text.replace(" ", "").replace("³", "3").partition("/")
    time = _TIMES.get(below)
    if time is not None and above in MASSES:
        return Flow(f"{above}/{below}", True, MASSES[above] / time)
    for table in (AMOUNTS, NORMAL_VOLUMES):
        if time is not None and above in table:
            return Flow(f"{above}/{below}", False, table[above] / time)
    if above in _TRADE and (below == "") == (above == "MMSCFD") and (below == "" or time is not None):
        factor, mass = _TRADE[above]
        return Flow(text, mass, factor / (time or 1.0))
    raise UnitError(
        f"{text!r} is not a unit of flow" if text else f"the flows of column {column!r} have no unit",
        where=f"column {column!r}" if text else "",
        hint="the volume depends on temperature and pressure; convert it to kg/h, kmol/h or Nm3/h"
        if above in ("m3", "ft3", "L", "gal", "bbl")
        else "write an amount or mass per time, e.g. kg/h, kmol/h or Nm3/h",
    )


def kelvin_of(text: str) -> float:
    """A temperature with its unit [K]. Raises TemperatureError."""
    value = parse_temperature(text)
    if not value > 0.0:  # pragma: no cover - the parser refuses it
        raise TemperatureError(f"{text} is not above 0 K")
    return value
