"""Sources as text to read and as data for ``--json``."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from textwrap import wrap
from typing import TYPE_CHECKING, Any, Final

from propdb.model.cite import text as reference
from propdb.model.text import columns, pairs
from propdb.units import format_pressure

if TYPE_CHECKING:
    from propdb.model.records import Ancestor, Source

_WIDTH: Final = 110


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
        "lineage": [_ancestor_dict(ancestor) for ancestor in source.chain],
        "copied_by": source.copied_by,
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
        ("note", source.note),
    ]
    return "\n".join([*pairs(rows), *chain_lines(source)])


def _ancestor_dict(ancestor: Ancestor) -> dict[str, Any]:
    return {
        "copies": ancestor.key,
        "title": ancestor.title,
        "evidence": ancestor.evidence,
        "lineage": [_ancestor_dict(further) for further in ancestor.copies],
    }


def chain_lines(source: Source) -> list[str]:
    """What a source copies, and what that copies in turn, as a tree; and who copies it."""
    if not source.chain and not source.copied_by:
        return ["", "Lineage: copies no source that is known here, and none copies it"]
    lines = [
        "",
        "Lineage: what it copies or refits" if source.chain else "Lineage: copies no source that is known here",
    ]
    if source.chain:
        lines.append(f"  {source.key}")
        lines += _branches(source.chain, "  ")
    if source.copied_by:
        lines += wrap("copied by " + ", ".join(source.copied_by), _WIDTH, initial_indent="  ", subsequent_indent="    ")
    return lines


def _branches(ancestors: Sequence[Ancestor], indent: str) -> list[str]:
    lines = []
    for i, ancestor in enumerate(ancestors):
        last = i == len(ancestors) - 1
        below = indent + ("   " if last else "|  ")
        lines += wrap(
            f"{ancestor.key}: {ancestor.evidence}",
            _WIDTH,
            initial_indent=f"{indent}+- ",
            subsequent_indent=below + ("|    " if ancestor.copies else "     "),
            break_on_hyphens=False,
        )
        lines += _branches(ancestor.copies, below)
    return lines
