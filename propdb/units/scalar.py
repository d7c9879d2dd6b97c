"""Temperatures and absolute pressures, read from text and written."""

from __future__ import annotations

import math
import re
from decimal import Decimal
from typing import Final, NoReturn

from propdb.errors import PressureError, TemperatureError, UnitError
from propdb.units.numbers import EXACT, exact, format_number, quoted, split_number
from propdb.units.table import DEGREES, KINDS, PRESSURES, SCALES, meant, resolve

_DEGREE_SIGN: Final = re.compile(r"^(?:[°º]|deg(?:rees?)?\b|deg(?=[CFRKcfrk]$)) ?")
_SIGNED_SCALES: Final = str.maketrans({"℃": "°C", "℉": "°F", "\u212a": "K"})
_ABSOLUTE: Final = re.compile(r"^(.*?) ?(?:a|\(a\)|abs|\(abs\))$")
_GAUGE: Final = re.compile(r"^(.*?) ?(?:g|\(g\)|gauge|\(gauge\))$")


def parse_temperature(text: str) -> float:
    """Read ``600C``, ``873.15K``, ``1112F``, ``1571.67R``, ``-40 °C`` [K].

    Raises
    ------
    TemperatureError
        Not one finite number, no unit, or at or below 0 K.
    UnitError
        The unit is not one of temperature.
    """
    number, unit = split_number(text, "a temperature", "600C", TemperatureError)
    if not unit:
        raise TemperatureError(f"{quoted(text)} has no unit", hint=f"did you mean {number}K or {number}C?")
    return read_temperature(number, unit)


def read_temperature(number: str, unit: str) -> float:
    """A number that :func:`~propdb.units.numbers.split_number` has let through, on a scale [K]; errors as above."""
    scale = _scale(unit)
    offset, numerator, denominator = SCALES[scale]
    kelvin = EXACT.add(exact(number), offset)
    kelvin = EXACT.divide(EXACT.multiply(kelvin, Decimal(numerator)), Decimal(denominator))
    value = float(kelvin)
    if not value > 0:
        raise TemperatureError(
            f"{number} {scale} is {'below' if value < 0 else 'at'} 0 K",
            hint=f"write a temperature above {'0' if not offset else -offset}{scale}",
        )
    return value


def temperature_step(unit: str) -> float:
    """Size of one degree of a unit of temperature [K]. Raises UnitError for any other unit."""
    return DEGREES[_scale(unit)]


def _scale(unit: str) -> str:
    symbol = _DEGREE_SIGN.sub("", unit.translate(_SIGNED_SCALES).strip())
    known = resolve(symbol)
    if known is None or known not in SCALES:
        _refuse(unit, known, "temperature", "K, C, F or R", meant(symbol, SCALES))
    return known


def parse_pressure(text: str) -> float:
    """Read an absolute pressure: ``40bar``, ``1atm``, ``0.1MPa``, ``600psi``, ``760 mmHg`` [Pa].

    A gauge pressure states its atmosphere: ``5barg+1.01325bar``.

    Raises
    ------
    PressureError
        Not one finite number, no unit, not positive, or gauge without its atmosphere.
    UnitError
        The unit is not one of pressure.
    """
    number, unit = split_number(text, "a pressure", "40bar", PressureError)
    if not unit:
        raise PressureError(f"{quoted(text)} has no unit", hint=f"did you mean {number}bar, {number}Pa or {number}psi?")
    unit, plus, atmosphere = (part.strip() for part in unit.partition("+"))
    gauge = _gauge(unit)
    if gauge and not plus:
        raise PressureError(
            f"{quoted(text)} is a gauge pressure, and gauge needs a stated atmosphere",
            hint=f"add it, e.g. {number}{gauge}g+{'14.696psi' if gauge == 'psi' else '1.01325bar'}",
        )
    if not plus:
        return read_pressure(number, unit)
    if not gauge:
        raise PressureError(
            f"{quoted(text)} adds to a pressure that is not gauge", hint="write e.g. 5barg+1.01325bar, or the sum"
        )
    added, added_unit = split_number(atmosphere, "the atmosphere", "1.01325bar", PressureError)
    if not added_unit or _gauge(added_unit) or not float(added) > 0:
        raise PressureError(
            f"{quoted(atmosphere)} is not an absolute pressure of the atmosphere", hint="write e.g. 5barg+1.01325bar"
        )
    return _pascal(EXACT.add(_exact_pascal(number, gauge), _exact_pascal(added, added_unit)), quoted(text))


def read_pressure(number: str, unit: str, *, positive: bool = True) -> float:
    """A number in a unit of pressure [Pa]. Raises PressureError unless positive (where asked), UnitError."""
    return _pascal(_exact_pascal(number, unit), f"{number} {unit.strip()}", positive=positive)


def _pascal(value: Decimal, shown: str, *, positive: bool = True) -> float:
    pascal = float(value)
    if math.isinf(pascal):
        raise PressureError(f"{shown} is too large to be a pressure", hint="write e.g. 40bar")
    if positive and not pascal > 0:
        raise PressureError(f"{shown} is not a positive absolute pressure", hint="write e.g. 1bar")
    return pascal


def _exact_pascal(number: str, unit: str) -> Decimal:
    known = _pressure_unit(unit)
    if known is None:
        absolute = _ABSOLUTE.match(unit.strip())
        known = _pressure_unit(absolute.group(1)) if absolute else None
    if known is None:
        symbol = unit.strip()
        _refuse(unit, resolve(symbol), "pressure", "Pa, kPa, MPa, bar, atm, psi or mmHg", meant(symbol, PRESSURES))
    numerator, denominator = PRESSURES[known]
    return EXACT.divide(EXACT.multiply(exact(number), numerator), denominator)


def _pressure_unit(symbol: str) -> str | None:
    known = resolve(symbol.strip())
    return known if known in PRESSURES else None


def _gauge(unit: str) -> str | None:
    """The unit beneath a gauge unit; None when the unit is not gauge (``mmHg`` ends in g and is not)."""
    gauge = None if _pressure_unit(unit) else _GAUGE.match(unit.strip())
    return _pressure_unit(gauge.group(1)) if gauge else None


def _refuse(unit: str, known: str | None, wanted: str, choice: str, near: str | None) -> NoReturn:
    kind = KINDS.get(known or "")
    if kind is not None and kind != wanted:
        raise UnitError(f"{quoted(unit)} is a unit of {kind}, not of {wanted}", hint=f"write {choice}", unit=unit)
    hint = f"did you mean {near}?" if near else f"write {choice}"
    raise UnitError(f"{quoted(unit)} is not a unit of {wanted}", hint=hint, unit=unit)


def format_temperature(kelvin: float, *, unit: str = "K", decimals: int = 2) -> str:
    """Write a temperature, to at most `decimals`: ``298.15 K``, ``25 °C``; :func:`parse_temperature` reads it back.

    Parameters
    ----------
    kelvin : float
        The temperature [K].
    unit : str
        ``K``, ``C``, ``F`` or ``R``.
    decimals : int
        Most digits after the point; trailing zeros are dropped [-].

    Raises
    ------
    UnitError
        `unit` is not one of temperature.
    """
    scale = _scale(unit)
    offset, numerator, denominator = SCALES[scale]
    value = kelvin * denominator / numerator - float(offset)
    text = format_number(value, decimals=decimals)
    if "." in text and "e" not in text:
        text = text.rstrip("0").rstrip(".")
    if text == "0" and scale in ("K", "R") and value:
        text = format_number(value, significant=3)
    return f"{text} {scale}" if scale == "K" else f"{text} °{scale}"


def format_pressure(pascal: float, *, unit: str = "bar") -> str:
    """Write a pressure `pascal` [Pa] in `unit`, to six significant digits: ``1.01325 bar``. Raises UnitError."""
    known = _pressure_unit(unit)
    if known is None:
        _refuse(unit, resolve(unit), "pressure", "Pa, kPa, MPa, bar, atm, psi or mmHg", meant(unit, PRESSURES))
    numerator, denominator = PRESSURES[known]
    return f"{pascal * float(denominator) / float(numerator):.6g} {known}"
