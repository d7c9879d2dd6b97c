"""An answer: one object that carries everything an enthalpy needs to be signed off."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from math import isfinite
from types import MappingProxyType
from typing import Any

from propdb.model.crosscheck import EntryCheck
from propdb.model.records import Closure, MaySum, Part, Source, Step

__all__ = ["CAUTION", "Answer", "ReactionAnswer", "ReactionTerm"]

CAUTION = (
    "For engineering judgement only: local codes and licensed practice come first, and design values must be verified "
    "against their sources."
)


def _finite(value: float | None) -> float | None:
    return value if value is not None and isfinite(value) else None


@dataclass(frozen=True, slots=True)
class _Derived:
    """What every answer carries. ``value`` and steps in ``unit``; ``si`` in J/mol."""

    value: float
    unit: str
    si: float
    uncertainty: float | None  # standard [unit]; None when an entry on the path states none
    uncertainty_note: str
    datum: str
    may_sum: MaySum
    steps: tuple[Step, ...]
    closures: tuple[Closure, ...]
    parts: tuple[Part, ...]  # sensitivities [J/mol]
    warnings: tuple[str, ...]
    store: str  # content hash and log head, or release id
    sources: Mapping[str, Source] = field(default_factory=lambda: MappingProxyType({}))
    crosscheck: tuple[EntryCheck, ...] = ()  # other compilations about the entries; at the state where asked for

    def explain(self) -> str:
        """The derivation: steps with entries and sources, closures, what may be summed, cautions."""
        from propdb.model.render import explain

        return explain(self)

    def cite(self) -> str:
        """The sources that the answer stands on, one per line."""
        from propdb.model.cite import text

        return "\n".join(text(self.sources[key]) for key in sorted(self.sources))

    def _common(self) -> dict[str, Any]:
        return {
            "value": _finite(self.value),
            "unit": self.unit,
            "uncertainty": _finite(self.uncertainty),
            "uncertainty_note": self.uncertainty_note,
            "datum": self.datum,
            "may_sum": {"streams": self.may_sum.streams, "reaction": self.may_sum.reaction, "why": self.may_sum.why},
            "steps": [
                {
                    "what": s.what,
                    "species": s.species,
                    "from": s.start,
                    "to": s.end,
                    "value": _finite(s.value),
                    "unit": self.unit,
                    "entry": s.entry or None,
                    "source": s.source or None,
                    "extrapolated": s.extrapolated,
                    "note": s.note or None,
                }
                for s in self.steps
            ],
            "closures": [
                {
                    "via": c.via,
                    "difference": _finite(c.difference),
                    "uncertainty": _finite(c.uncertainty),
                    "entry": c.entry or None,
                    "source": c.source or None,
                }
                for c in self.closures
            ],
            "crosscheck": [one.as_dict() for one in self.crosscheck],
            "warnings": list(self.warnings),
            "store": self.store,
        }


@dataclass(frozen=True, slots=True)
class Answer(_Derived):
    """The enthalpy of a state, or a tabulated enthalpy on another datum."""

    species: str = ""
    formula: str = ""
    state: str = ""
    molar_mass: float = 0.0  # [kg/mol]
    given: str = ""  # the number that was converted, as typed, with its datum

    def __str__(self) -> str:
        from propdb.model.render import headline

        return headline(self)

    def as_dict(self) -> dict[str, Any]:
        """For JSON: numbers finite or None."""
        return {
            **self._common(),
            "species": self.species,
            "formula": self.formula,
            "state": self.state or None,
            "given": self.given or None,
        }


@dataclass(frozen=True, slots=True)
class ReactionTerm:
    """One member of a reaction. Enthalpies in the unit of the answer, per mole of the species."""

    coefficient: str  # "-2", "1/2"; negative for reactants
    species: str
    formula: str
    state: str
    formation: float  # enthalpy of the state at T on the datum of the answer
    standard: float  # enthalpy of formation of the phase that the sensible heat starts from, at 298.15 K
    sensible: float  # from there to the state
    start: str = ""  # where the sensible heat starts


@dataclass(frozen=True, slots=True)
class ReactionAnswer(_Derived):
    """The enthalpy of a reaction by two routes."""

    equation: str = ""
    temperature: float = 0.0  # [K]
    terms: tuple[ReactionTerm, ...] = ()
    formation_route: float = 0.0  # sum of coefficients x enthalpy at T on the datum
    reaction_standard: float = 0.0  # sum of coefficients x formation enthalpy at 298.15 K
    sensible: float = 0.0  # sum of coefficients x sensible heat
    sensible_route: float = 0.0  # heat of reaction at 298.15 K plus sensible heats
    disagreement: float = 0.0

    def __str__(self) -> str:
        from propdb.model.render import reaction_headline

        return reaction_headline(self)

    def as_dict(self) -> dict[str, Any]:
        """For JSON: numbers finite or None."""
        return {
            **self._common(),
            "equation": self.equation,
            "temperature": self.temperature,
            "terms": [
                {
                    "coefficient": t.coefficient,
                    "species": t.species,
                    "formula": t.formula,
                    "state": t.state,
                    "formation": _finite(t.formation),
                    "standard": _finite(t.standard),
                    "sensible": _finite(t.sensible),
                    "from": t.start,
                }
                for t in self.terms
            ],
            "routes": {
                "formation": _finite(self.formation_route),
                "sensible": {
                    "reaction_at_298K": _finite(self.reaction_standard),
                    "sensible_heats": _finite(self.sensible),
                    "sum": _finite(self.sensible_route),
                },
                "difference": _finite(self.disagreement),
            },
        }
