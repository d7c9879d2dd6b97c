"""Find a datum by what was typed: a name of the store, or an inline own-state text."""

from __future__ import annotations

import difflib
from collections.abc import Mapping

from propdb.datum.inline import INLINE_PREFIX, parse_inline
from propdb.errors import NotFound
from propdb.model.records import Datum

__all__ = ["resolve"]


def resolve(text: str, datums: Mapping[str, Datum]) -> Datum:
    """The datum that ``text`` names, or that it spells out inline (``own:l@65C``).

    Raises
    ------
    NotFound
        No datum of that name; the nearest names are in the message and in ``fields['candidates']``.
    DatumError, TemperatureError, UnitError
        An inline text that cannot be read.
    """
    name = text.strip()
    if name.startswith(INLINE_PREFIX):
        return parse_inline(name)
    if name in datums:
        return datums[name]
    folded = {key.lower(): key for key in datums}
    if name.lower() in folded:
        return datums[folded[name.lower()]]
    near = [folded[key] for key in difflib.get_close_matches(name.lower(), folded, n=3, cutoff=0.5)]
    if near:
        hint = f"did you mean {' or '.join(near)}?"
    else:
        hint = "list them with: propdb datum list; or write one inline, e.g. own:l@65C"
    raise NotFound(f"no datum named {name!r}", hint=hint, candidates=tuple(near))
