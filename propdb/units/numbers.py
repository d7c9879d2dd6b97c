"""Numbers as text: reading one in front of a unit, writing one with the digits that mean something."""

from __future__ import annotations

import math
import re
from decimal import Context, Decimal

from propdb.errors import InvalidInput

#: Exact decimal arithmetic for offsets and factors, so that 77F is the very float 298.15.
EXACT = Context(prec=50)

_NUMBER = re.compile(r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_COMMA = re.compile(r"([+-]?[0-9]+(?:,[0-9]+)+)(\.[0-9]+)?")
_THOUSANDS = re.compile(r"[+-]?[1-9][0-9]{0,2}(?:,[0-9]{3})+")
_WORDS = re.compile(r"[+-]?(?:nan|inf(?:inity)?)(?![a-z]{2})", re.IGNORECASE)
_MINUS = str.maketrans(dict.fromkeys("\u2212\u2013\ufe63\uff0d", "-"))  # minus sign, en dash, small and full-width


def quoted(text: str) -> str:
    """`text` for use in a message: in quotes, on one line, not longer than 60 characters."""
    return repr(text if len(text) <= 60 else text[:57] + "...")


def split_number(text: str, what: str, example: str, error: type[InvalidInput]) -> tuple[str, str]:
    """Split ``2800.8 kJ/kg`` into its number and the rest, both as text.

    Parameters
    ----------
    text
        What was typed. A Unicode minus is taken as a minus.
    what, example
        For the message: ``a temperature``, ``600C``.
    error
        The class raised when there is no number, it is not finite, or it has a decimal comma.
    """
    plain = text.translate(_MINUS).strip()
    if not plain:
        raise error(f"{what} is needed and nothing is given", hint=f"write e.g. {example}")
    found = _NUMBER.match(plain)
    if found is None:
        if _WORDS.match(plain):
            raise error(f"{quoted(text)} is not a finite number", hint=f"write e.g. {example}")
        raise error(f"{quoted(text)} is not {what}", hint=f"write a number and a unit, e.g. {example}")
    comma = _COMMA.match(plain)
    if comma is not None:
        raise error(f"{quoted(text)} has a comma in its number", hint=_without_comma(plain, comma))
    number, rest = found.group(), plain[found.end() :].strip()
    if not math.isfinite(float(number)):
        raise error(f"{quoted(text)} is too large to be a number here", hint=f"write e.g. {example}")
    if rest[:1].isdigit() or rest[:1] in (".", ",", "_"):
        raise error(f"{quoted(text)} is not one number and a unit", hint=f"write e.g. {example}")
    return number, rest


def _without_comma(plain: str, comma: re.Match[str]) -> str:
    digits, fraction, rest = comma.group(1), comma.group(2) or "", plain[comma.end() :]
    if digits.count(",") == 1 and not fraction:
        point = quoted(digits.replace(",", ".") + rest)
        if not _THOUSANDS.fullmatch(digits):
            return f"did you mean {point}?"
        joined = quoted(digits.replace(",", "") + rest)
        return f"did you mean {point} or {joined}?"
    return f"did you mean {quoted(digits.replace(',', '') + fraction + rest)}?"


def exact(number: str) -> Decimal:
    """The number as a decimal, exactly, for a text that :func:`split_number` has let through."""
    return Decimal(number) if float(number) else Decimal(0)


def format_number(
    value: float,
    *,
    decimals: int | None = None,
    significant: int | None = None,
    uncertainty: float | None = None,
) -> str:
    """Write a number with the digits that mean something; never ``-0.000``.

    Parameters
    ----------
    value : float
        The number, in the unit it is shown in [any].
    decimals : int, optional
        Digits after the point [-].
    significant : int, optional
        Significant digits, trailing zeros kept [-]. The default is 6.
    uncertainty : float, optional
        Written with two significant digits behind the value, which is rounded to match [as value]:
        ``-393.51 ± 0.13``. Rounding as in JCGM 100:2008, 7.2.6.

    Give at most one of the three.
    """
    if sum(option is not None for option in (decimals, significant, uncertainty)) > 1:
        raise TypeError("give one of decimals, significant and uncertainty")
    if not math.isfinite(value):
        return str(value)
    if uncertainty is not None and math.isfinite(uncertainty) and uncertainty > 0:
        return _with_uncertainty(value, uncertainty)
    if decimals is not None and abs(value) < 1e15:
        return _fixed(value, decimals)
    return _significant(value, significant or 6)


def _with_uncertainty(value: float, uncertainty: float) -> str:
    places = 1 - _exponent(uncertainty, 2)
    if value and places + _exponent(value, 1) > 15:  # finer than a float holds
        return f"{_significant(value, 15)} ± {_significant(uncertainty, 2)}"
    if abs(value) >= 1e15 or uncertainty >= 1e15 or places > 12:
        return f"{_significant(value, 6)} ± {_significant(uncertainty, 2)}"
    return f"{_fixed(value, places)} ± {_fixed(uncertainty, places)}"


def _exponent(value: float, digits: int) -> int:
    """Decimal exponent of `value` once rounded to `digits` significant digits."""
    return int(f"{value:.{digits - 1}e}".partition("e")[2])


def _significant(value: float, digits: int) -> str:
    exponent = _exponent(value, digits)
    if -5 <= exponent < max(digits, 7):
        return _fixed(value, digits - 1 - exponent)
    return f"{value:.{digits - 1}e}"


def _fixed(value: float, places: int) -> str:
    text = f"{round(value, places):.0f}" if places < 0 else f"{value:.{places}f}"
    return text.lstrip("-") if not text.strip("-0.") else text
