"""Sources as text to read and as data for ``--json``."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING, Any

from propdb.cli.text import columns, pairs
from propdb.model.cite import text as reference
from propdb.units import format_pressure

if TYPE_CHECKING:
    from propdb.model.records import Source


def source_dict(source: Source) -> dict[str, Any]:
    """A source as data."""
    return {
        "key": source.key,
        "title": source.title,
        "authors": source.authors,
        "year": source.year,
        "kind": source.kind,
        "class": source.cls,
        **{name: text for name, text in source.fields.items() if text},
        "terms": source.terms,
        "carrier": source.carrier,
        "standard_pressure": source.standard_pressure,
        "note": source.note,
        "lineage": [{"copies": copies, "evidence": evidence} for copies, evidence in source.lineage],
    }


def sources_text(sources: Iterable[Source]) -> str:
    """Sources, one a line."""
    rows = [("key", "class", "year", "title")]
    rows += [(source.key, source.cls, str(source.year or ""), source.title) for source in sources]
    return "\n".join(columns(rows))


def source_text(source: Source) -> str:
    """One source in full."""
    rows = [
        ("source", source.key),
        ("reference", reference(source)),
        ("kind", source.kind),
        ("class", source.cls),
        ("standard pressure", format_pressure(source.standard_pressure)),
        ("terms", source.terms),
        ("carrier", source.carrier),
        ("copies", "\n".join(f"{copies}: {evidence}" for copies, evidence in source.lineage)),
        ("note", source.note),
    ]
    return "\n".join(pairs(rows))
