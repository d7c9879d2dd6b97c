"""Legs, their sensitivities, and the combination of uncertainties.

An answer is linear in the errors of its entries, so a leg keeps ``coefficient x error of entry`` for each; an entry
that serves on both sides of a difference cancels (JCGM 100:2008, 5.2: fully correlated inputs add with their sign).
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from math import sqrt

from propdb.model.records import Part, Step

__all__ = ["Leg", "add_parts", "combined", "scale", "to_steps"]


@dataclass(frozen=True, slots=True)
class Leg:
    """One readable step with its sensitivities. ``value`` in J/mol of ``species``."""

    what: str
    species: str
    start: str
    end: str
    value: float
    parts: tuple[Part, ...] = ()
    entry: str = ""
    source: str = ""
    extrapolated: bool = False
    note: str = ""
    span: tuple[float, float] | None = None  # [K], of heating along a heat capacity


def scale(leg: Leg, factor: float) -> Leg:
    """The leg times a stoichiometric coefficient; -1 walks it backwards."""
    start, end = (leg.start, leg.end) if factor > 0 else (leg.end, leg.start)
    parts = tuple(replace(p, coefficient=p.coefficient * factor) for p in leg.parts)
    span = leg.span if leg.span is None or factor > 0 else (leg.span[1], leg.span[0])
    return replace(leg, value=leg.value * factor, parts=parts, start=start, end=end, span=span)


def add_parts(parts: Iterable[Part]) -> tuple[Part, ...]:
    """Sum the sensitivities entry by entry; those that cancel disappear."""
    found: dict[str, Part] = {}
    sizes: dict[str, float] = {}
    for part in parts:
        sizes[part.entry] = max(sizes.get(part.entry, 0.0), abs(part.coefficient))
        old = found.get(part.entry)
        found[part.entry] = part if old is None else replace(old, coefficient=old.coefficient + part.coefficient)
    return tuple(p for p in found.values() if abs(p.coefficient) > 1e-12 * max(sizes[p.entry], 1e-300))


def combined(parts: Sequence[Part]) -> tuple[float, tuple[str, ...]]:
    """``(standard uncertainty of the stated parts [J/mol], ids of the entries that state none)``."""
    total = sum((p.coefficient * p.standard) ** 2 for p in parts if p.stated)
    return sqrt(total), tuple(p.entry for p in parts if not p.stated and p.coefficient)


def ranking_uncertainty(parts: Sequence[Part]) -> float:
    """Standard uncertainty with class defaults where none is stated [J/mol]: for ranking and for closures only."""
    return sqrt(sum((p.coefficient * p.standard) ** 2 for p in parts))


def to_steps(legs: Iterable[Leg]) -> tuple[Step, ...]:
    """Legs as the steps of an answer."""
    return tuple(
        Step(
            what=leg.what,
            species=leg.species,
            start=leg.start,
            end=leg.end,
            value=leg.value,
            entry=leg.entry,
            source=leg.source,
            extrapolated=leg.extrapolated,
            note=leg.note,
            span=leg.span,
        )
        for leg in legs
    )
