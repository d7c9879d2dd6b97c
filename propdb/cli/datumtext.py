"""Datums as text to read and as data for ``--json``."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING, Any, Final

from propdb.model.text import kelvin, pairs
from propdb.units import format_pressure

if TYPE_CHECKING:
    from propdb.model.records import Datum, ZeroState


def datum_dict(datum: Datum) -> dict[str, Any]:
    """A datum as data."""
    own = datum.kind == "own"
    found: dict[str, Any] = {
        "name": datum.name,
        "kind": datum.kind,
        "sentence": datum.sentence,
        "source": datum.source,
        "temperature": datum.temperature,
        "standard_pressure": datum.standard_pressure,
        "inline": datum.inline,
        "note": datum.note,
    }
    if own:
        found |= {
            "zero": datum.zero,
            "species": datum.per_species,
            "only_these_species": datum.only,
            "h0": datum.h0,
            "h0_unit": datum.h0_unit,
            "internal_energy": datum.internal_energy,
        }
    elif datum.kind == "elements":
        found["forms"] = {
            element: [{"up_to": None if upper == float("inf") else upper, "zero": zero} for upper, zero in schedule]
            for element, schedule in datum.schedule.items()
        }
    else:
        found["basis"] = datum.basis
    return found


_KIND_WORDS: Final = {
    "own": "own state: the species itself is zero",
    "elements": "elements: each element is zero",
    "basis": "basis species: each of them is zero",
}


def datums_text(datums: Iterable[Datum]) -> str:
    """Datums by kind, one a line with its sentence."""
    found = list(datums)
    lines: list[str] = []
    for kind, words in _KIND_WORDS.items():
        members = [(datum.name, datum.sentence) for datum in found if datum.kind == kind]
        if members:
            lines += ["", words, *pairs(members, indent=2)]
    return "\n".join(lines[1:])


def datum_text(datum: Datum) -> str:
    """One datum in full."""
    fixed = "internal energy" if datum.internal_energy else "enthalpy"
    own = datum.kind == "own"
    rows = [
        ("datum", datum.name),
        ("says", datum.sentence),
        ("kind", _KIND_WORDS[datum.kind]),
        ("zero", zero_text(datum.zero) if datum.zero is not None and not datum.only else ""),
        (fixed if own else "", f"{datum.h0:g} {datum.h0_unit} in that state" if own else ""),
        ("only for" if datum.only else "except", _zeros((name, zero) for name, zero in datum.per_species.items())),
        ("forms", "\n".join(_schedule(datum)) if datum.kind == "elements" else ""),
        ("basis species", _zeros((zero.species, zero) for zero in datum.basis)),
        ("standard pressure", "" if own else format_pressure(datum.standard_pressure)),
        ("source", datum.source),
        ("note", datum.note),
    ]
    return "\n".join(pairs(rows))


def _zeros(states: Iterable[tuple[str, ZeroState]]) -> str:
    return "\n".join(f"{name}: {zero_text(zero)}" for name, zero in states)


def _schedule(datum: Datum) -> list[str]:
    lines = []
    for element, schedule in datum.schedule.items():
        spans = []
        for upper, zero in schedule:
            where = f" up to {kelvin(upper)} K" if upper != float("inf") else ""
            spans.append(f"{zero.species} {zero.phase}{f' ({zero.form})' if zero.form else ''}{where}")
        lines.append(f"{element}: {', then '.join(spans)}")
    return lines


def zero_text(zero: ZeroState) -> str:
    """A state named by a datum in words."""
    parts = [f"{zero.phase} ({zero.form})" if zero.form else zero.phase]
    if zero.saturated:
        parts.append(f"saturated {zero.saturated}")
    if zero.temperature == "same":
        parts.append("the temperature of the state")
    elif zero.temperature == "boiling":
        parts.append("its normal boiling point")
    else:
        parts.append(f"{kelvin(zero.temperature)} K")
    if zero.pressure is not None:
        parts.append(format_pressure(zero.pressure))
    return ", ".join(parts)
