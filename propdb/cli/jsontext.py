"""JSON of results: numbers finite or null, every character as itself where the output can hold it."""

from __future__ import annotations

import json
import math
import re
import sys
from collections.abc import Mapping
from dataclasses import fields, is_dataclass
from fractions import Fraction
from pathlib import Path
from typing import Any

#: Control characters that JSON itself would leave as they are.
_CONTROL = re.compile("[\x7f-\x9f\u061c\u200e\u200f\u2028-\u202e\u2066-\u2069\ud800-\udfff]")


def dumps(data: Any, *, indent: int | None = 2) -> str:
    """Write data as JSON, ``indent=None`` in one line.

    Dataclasses become objects, fractions text (``"1/2"``), and a number that is not finite ``null``.
    """
    unicode = (getattr(sys.stdout, "encoding", None) or "").lower().replace("-", "") == "utf8"
    text = json.dumps(_plain(data), indent=indent, ensure_ascii=not unicode, allow_nan=False)
    return _CONTROL.sub(lambda found: f"\\u{ord(found[0]):04x}", text)


def _plain(value: Any) -> Any:
    if value is None or isinstance(value, (bool, int, str)):
        return value
    if isinstance(value, float):
        return float(value) if math.isfinite(value) else None
    if isinstance(value, Mapping):
        return {str(key): _plain(item) for key, item in value.items()}
    if is_dataclass(value) and not isinstance(value, type):
        return {field.name: _plain(getattr(value, field.name)) for field in fields(value)}
    if isinstance(value, (Fraction, Path)):
        return str(value)
    if hasattr(value, "tolist"):  # numpy
        return _plain(value.tolist())
    return [_plain(item) for item in value]
