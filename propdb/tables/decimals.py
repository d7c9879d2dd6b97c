"""Decimal text stays decimal: reading numbers, adding a shift, writing them with the decimals of their column."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from decimal import Decimal
from typing import NamedTuple

from propdb.units import format_number

__all__ = ["MISSING", "Digits", "add_text", "number_problem", "places", "plain_number", "rounded", "uncertainty_text"]

#: Cells that say there is no number.
MISSING = ("", "-", "NA", "N/A", "n/a", "NaN", "nan", "NULL", "null", "None", "#N/A")

#: A shift is never known better than this, and 64 bits hold it: decimals beyond are those of the table alone.
SHIFT_PLACES = 9
MOST_PLACES = 18

_NUMBER = re.compile(r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d{1,3})?", re.ASCII)
_THOUSANDS = re.compile(r"[+-]?\d{1,3}(?:,\d{3})+(?:\.\d*)?", re.ASCII)
_MINUS = str.maketrans("−–", "--")


class Digits(NamedTuple):
    """Decimals of an enthalpy column.

    ``places`` of the number that is written; ``ragged``: the cells of the column differ, so zeros at the end are left
    out; ``fixed``: asked for, and not found in the column.
    """

    places: int
    ragged: bool = False
    fixed: bool = False

    @property
    def scale(self) -> int:
        """Decimals of a shift."""
        return min(self.places, SHIFT_PLACES)


def plain_number(text: str, *, comma: bool = False) -> str | None:
    """A cell as a plain number with a decimal point; None where it is none."""
    text = text.strip().translate(_MINUS)
    if comma:
        if "." in text:
            return None
        text = text.replace(",", ".")
    if _NUMBER.fullmatch(text) is None:
        return None
    return text if math.isfinite(float(text)) and abs(float(text)) < 10.0**MOST_PLACES else None


def number_problem(text: str, *, comma: bool = False) -> str:
    """Why a cell is no number, and what would be right."""
    shown = repr(text.strip() if len(text) <= 40 else text.strip()[:37] + "...")
    bare = text.strip().translate(_MINUS)
    if text.strip() in MISSING:
        return "no number"
    if bare.startswith("="):
        return f"{shown} is a formula, not a number"
    if not comma and _THOUSANDS.fullmatch(bare):
        return f"{shown} has a comma; remove thousands separators, or give --decimal comma where it is the decimal sign"
    if not comma and "," in bare and plain_number(bare, comma=True) is not None:
        return f"{shown} has a decimal comma; give --decimal comma"
    if plain_number(re.sub(r"[  '’_\u00a0\u2009\u202f]", "", bare)) is not None:
        return f"{shown} has a thousands separator; remove it"
    if comma and "." in bare:
        return f"{shown} has a point, and --decimal comma was given"
    if _NUMBER.fullmatch(bare):
        return f"{shown} is too large"
    return f"{shown} is not a number"


def places(text: str) -> int:
    """Decimals that a plain number is written with."""
    mantissa, _, exponent = text.lower().partition("e")
    digits = len(mantissa.partition(".")[2])
    return max(0, digits - int(exponent)) if exponent else digits


def look(cells: Iterable[str], asked: int | None) -> Digits:
    """The decimals of a column from some of its cells (plain numbers), or as asked for."""
    if asked is not None:
        return Digits(asked, fixed=True)
    found = {places(cell) for cell in cells}
    if not found:
        return Digits(3)
    return Digits(min(max(found), MOST_PLACES), ragged=len(found) > 1)


def rounded(shift: float, scale: int) -> int:
    """A shift as a whole number of 10^-scale: the same whether rows are taken one by one or together."""
    return round(shift * 10.0**scale)


def add_text(number: str, shift: float, digits: Digits) -> tuple[str, str]:
    """A plain number plus a shift, and the shift, both as text. The cell's own decimals are kept where it has more."""
    own = max(digits.places, 0 if digits.fixed else min(places(number), MOST_PLACES))
    step = Decimal(rounded(shift, digits.scale)).scaleb(-digits.scale)
    with_shift = Decimal(number) + step
    return _fixed(with_shift, own, digits.ragged), _fixed(step, digits.scale, digits.ragged)


def shift_text(shift: float, digits: Digits) -> str:
    """A shift as text."""
    return _fixed(Decimal(rounded(shift, digits.scale)).scaleb(-digits.scale), digits.scale, digits.ragged)


def float_text(value: float, digits: Digits) -> str:
    """A computed number as text."""
    return _fixed(Decimal(rounded(value, digits.scale)).scaleb(-digits.scale), digits.scale, digits.ragged)


def _fixed(value: Decimal, digits: int, ragged: bool) -> str:
    text = f"{value:.{digits}f}"
    if ragged and "." in text:
        text = text.rstrip("0").rstrip(".")
    return text.lstrip("-") if not text.strip("-0.") else text


def uncertainty_text(standard: float) -> str:
    """A standard uncertainty to two significant digits; empty where it is not stated."""
    if math.isnan(standard):
        return ""
    return "0" if standard == 0.0 else format_number(standard, significant=2)
