"""Reading stored parameters: every complaint names the field."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from typing import Any, Final

from propdb.errors import EquationError

__all__ = ["check_range", "check_touching", "number", "numbers", "only", "rows"]

_PLAIN: Final = frozenset({float, int})


def only(params: Mapping[str, Any], required: Iterable[str], optional: Iterable[str] = ()) -> None:
    """Refuse missing and unknown fields."""
    required = tuple(required)
    for name in required:
        if name not in params:
            raise EquationError(f"{name!r} is missing", hint=f"the fields are {', '.join(required)}")
    known = {*required, *optional}
    for name in params:
        if name not in known:
            raise EquationError(f"{name!r} is not a field", hint=f"the fields are {', '.join(sorted(known))}")


def number(value: Any, field: str) -> float:
    """A finite float."""
    if isinstance(value, (bool, str)):
        raise EquationError(f"{field} must be a number, not {value!r}")
    try:
        result = float(value)
    except (TypeError, ValueError, OverflowError) as error:
        raise EquationError(f"{field} must be a number, not {value!r}") from error
    if not math.isfinite(result):
        raise EquationError(f"{field} must be a finite number, not {value!r}")
    return result


def numbers(values: Any, field: str, *, count: int | None = None) -> tuple[float, ...]:
    """A tuple of finite floats, of the length wanted."""
    result = _plain(values)
    if result is None:
        if isinstance(values, (str, bytes, Mapping)) or not isinstance(values, Iterable):
            raise EquationError(f"{field} must be a list of numbers, not {values!r}")
        result = tuple(number(value, f"{field}[{position}]") for position, value in enumerate(values))
    if count is not None and len(result) != count:
        raise EquationError(f"{field} must have {count} numbers, not {len(result)}")
    return result


def _plain(values: Any) -> tuple[float, ...] | None:
    """Finite numbers in a list or tuple, as nearly all are; None for what has to be looked at one by one."""
    if type(values) not in (list, tuple) or not _PLAIN.issuperset(map(type, values)):
        return None
    try:
        result = tuple(map(float, values))
    except OverflowError:
        return None
    return result if all(map(math.isfinite, result)) else None


def rows(value: Any, field: str) -> Sequence[Mapping[str, Any]]:
    """A list of mappings, at least one."""
    if isinstance(value, (str, bytes, Mapping)) or not isinstance(value, Sequence) or not value:
        raise EquationError(f"{field} must be a list of at least one entry")
    for position, row in enumerate(value):
        if not isinstance(row, Mapping):
            raise EquationError(f"{field}[{position}] must be a table of fields")
    return value


def check_range(tmin: float, tmax: float, *, point: bool = False) -> None:
    """Refuse a range that is not one; `point` allows a single temperature."""
    if not (0.0 <= tmin < tmax or (point and 0.0 < tmin == tmax)):
        raise EquationError(f"the range {tmin!r} to {tmax!r} K is not one", hint="0 <= tmin < tmax, in K")


def check_touching(ranges: Sequence[tuple[float, float]]) -> tuple[float, ...]:
    """The joints of ranges that follow each other without gap or overlap [K]."""
    for (_, upper), (lower, _) in zip(ranges[:-1], ranges[1:], strict=True):
        if upper != lower:
            what = "a gap" if upper < lower else "an overlap"
            raise EquationError(
                f"{what} between {min(upper, lower)!r} and {max(upper, lower)!r} K",
                hint="intervals go up in temperature and each begins where the one before ends",
            )
    return tuple(upper for _, upper in ranges[:-1])
