"""What another compilation says of an entry."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from propdb.units import format_number

if TYPE_CHECKING:
    from propdb.model.records import Entry

__all__ = ["Crosscheck", "EntryCheck", "difference_text", "telling", "value_text"]


@dataclass(frozen=True, slots=True)
class Crosscheck:
    """One comparison of an entry with a compilation of the open library.

    Parameters
    ----------
    compilation : str
        Its key in the policy ``lineage``; that of the entry's source where it is the same publication.
    temperature : float or None
        Where they are compared [K].
    value : float
        What the compilation gives, in the entry's unit.
    difference : float
        The entry less that.
    allowed : float or None
        What the difference may be; None where the compilation is shown only.
    independent : bool
        Neither copies the other, and they share no ancestor.
    package : str
        What the number was read from, with its version.
    """

    compilation: str
    temperature: float | None
    value: float
    difference: float
    allowed: float | None
    independent: bool
    package: str

    @property
    def beyond(self) -> bool:
        """Do they differ by more than they may?"""
        return self.allowed is not None and abs(self.difference) > self.allowed

    def relation(self, source: str) -> str:
        """How the compilation is related to a source: ``independent``, ``same chain``, ``same publication``."""
        if self.compilation == source:
            return "same publication"
        return "independent" if self.independent else "same chain"

    def as_dict(self, source: str) -> dict[str, Any]:
        """For JSON; ``source`` is that of the entry."""
        return {
            "compilation": self.compilation,
            "temperature": self.temperature,
            "value": self.value,
            "difference": self.difference,
            "allowed": self.allowed,
            "beyond": self.beyond,
            "independent": self.independent,
            "relation": self.relation(source),
            "package": self.package,
        }


@dataclass(frozen=True, slots=True)
class EntryCheck:
    """A cross-check of an entry that an answer stands on.

    ``start`` [K] is given where enthalpies of heating from there to the temperature of the check are compared [J/mol]:
    a check at the state itself, not one that was stored.
    """

    entry: Entry
    check: Crosscheck
    start: float | None = None

    @property
    def unit(self) -> str:
        """SI unit of the numbers."""
        return self.entry.unit if self.start is None else "J/mol"

    def as_dict(self) -> dict[str, Any]:
        """For JSON."""
        return {
            "entry": self.entry.id,
            "species": self.entry.species,
            "quantity": self.entry.quantity,
            "phase": self.entry.phase,
            "form": self.entry.form,
            "source": self.entry.source,
            "start": self.start,
            "unit": self.unit,
            **self.check.as_dict(self.entry.source),
        }


def telling(checks: Iterable[Crosscheck]) -> Crosscheck | None:
    """The check to show where there is room for one: independent before same chain, then the largest part of what is
    allowed."""
    known = [c for c in checks if c.allowed]
    first = [c for c in known if c.independent] or known
    return max(first, key=lambda c: abs(c.difference) / (c.allowed or 1.0), default=None)


def value_text(value: float, unit: str, *, sign: bool = False) -> str:
    """A number of a check as people read it: kJ/mol, bar, K, J/mol/K."""
    scale, shown, decimals = {
        "J/mol": (1e-3, "kJ/mol", 2),
        "J/mol/K": (1.0, "J/mol/K", 2),
        "K": (1.0, "K", 2),
        "Pa": (1e-5, "bar", 2),
    }.get(unit, (1.0, "", 3))
    text = format_number(value * scale, decimals=decimals)
    if sign and not text.startswith("-"):
        text = f"+{text}"
    return f"{text} {shown}".strip()


def difference_text(check: Crosscheck, unit: str) -> str:
    """The entry less the compilation: heat capacities, entropies and pressures in percent."""
    if unit in ("J/mol/K", "Pa") and check.value:
        return f"{100.0 * check.difference / abs(check.value):+.2f} %"
    return value_text(check.difference, unit, sign=True)
