"""Values of the package that what else is known of the species rules out: they are kept, and never used."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable
from dataclasses import replace
from typing import Final

from propdb.model.records import Entry

__all__ = ["quarantine", "set_aside"]

#: A melting point this far from one that was typed [1] belongs to another species: no two tables differ by so much.
_FAR: Final = 0.2


def set_aside(entry: Entry, reason: str) -> Entry:
    """The entry as one that is never used, with the reason beside what its note says already."""
    return replace(entry, status="quarantined", note="; ".join(filter(None, (entry.note, reason))))


def quarantine(entries: list[Entry], seed: Iterable[Entry]) -> int:
    """Set aside, in place, critical and melting temperatures that cannot be those of their species.

    A critical temperature lies above the melting and the boiling point. Returns how many were set aside.
    """
    stated: dict[tuple[str, str], list[Entry]] = defaultdict(list)
    typed: dict[tuple[str, str], list[Entry]] = defaultdict(list)
    for entry in seed:
        typed[entry.species, entry.quantity].append(entry)
    for entry in (*(e for group in typed.values() for e in group), *entries):
        if entry.quantity in ("Tb", "Tm") and entry.value is not None:
            stated[entry.species, entry.quantity].append(entry)
    count = 0
    for place, entry in enumerate(entries):
        reason = ""
        if entry.quantity == "Tc" and entry.value is not None:
            lower = [e for q in ("Tb", "Tm") for e in stated.get((entry.species, q), ())]
            above = max(lower, key=lambda e: e.value or 0.0, default=None)
            if above is not None and above.value is not None and above.value >= entry.value:
                word = "boils" if above.quantity == "Tb" else "melts"
                reason = f"no critical temperature: by {above.source} it {word} at {above.value:.7g} K"
        elif entry.quantity == "Tm" and entry.value is not None:
            known = [e for e in typed.get((entry.species, "Tm"), ()) if e.value is not None]
            far = [e for e in known if e.value is not None and abs(entry.value - e.value) > _FAR * e.value]
            if far and len(far) == len(known):
                reason = f"another species' melting point: {far[0].source} has {far[0].value:.7g} K"
        if reason:
            entries[place] = set_aside(entry, reason)
            count += 1
    return count
