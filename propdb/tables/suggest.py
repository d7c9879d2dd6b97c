"""Which datum serves a table best, with the reason and the runner-up."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from math import isclose, sqrt
from typing import TYPE_CHECKING, Any

from propdb.datum import same_meaning
from propdb.errors import NoData, PropdbError
from propdb.levels.parts import add_parts
from propdb.model.records import SAME_T, T_STANDARD, Datum, Part, State
from propdb.tables.kinds import enthalpy_at, shift_at
from propdb.tables.streams import IN, OUT, Streams, reaction_between

if TYPE_CHECKING:
    from propdb.tables.oracle import Basis
    from propdb.tables.tally import Tally

__all__ = ["Suggestion", "suggest"]


@dataclass(frozen=True, slots=True)
class Suggestion:
    """A datum, why it, and what would come next."""

    datum: str
    reason: str
    runner_up: str | None
    runner_up_reason: str
    reaction: bool

    def as_dict(self) -> dict[str, Any]:
        """For JSON."""
        return {
            "datum": self.datum,
            "reason": self.reason,
            "runner_up": self.runner_up,
            "runner_up_reason": self.runner_up_reason or None,
            "reaction": self.reaction,
        }

    def __str__(self) -> str:
        second = f"; next {self.runner_up}: {self.runner_up_reason}" if self.runner_up else ""
        return f"suggested datum {self.datum}: {self.reason}{second}"


@dataclass(frozen=True, slots=True)
class _Score:
    datum: Datum
    legs: int
    spread: float  # standard uncertainty of the duty, class defaults where none is stated [W, or J/mol x rows]
    shifts: tuple[float, ...]  # of each kind of row [J/mol]
    evaluated: bool  # rows are states, and have no datum of their own

    def alike(self, other: _Score) -> bool:
        """Has every species of the table its zero in the same place?"""
        return all(isclose(a, b, rel_tol=1e-9, abs_tol=1e-6) for a, b in zip(self.shifts, other.shifts, strict=True))

    def text(self, unit: str) -> str:
        if not self.legs:
            return "its levels are all at hand: no shift needs any data"
        steps = "one step" if self.legs == 1 else f"{self.legs} steps"
        size = f", {self.spread:.2g} {unit} of uncertainty with it (typical where not stated)" if unit else ""
        where = "between its states and the zeros" if self.evaluated else "between the table's datums and it"
        return f"{steps} of data {where}{size}"


def suggest(tally: Tally) -> Suggestion:
    """The datum for a table that was read once, on any datum.

    Where its own tables share one datum that may be summed as the streams need it, that one. Else without a reaction
    the own-state datum that leaves the fewest levels to compute, then the least uncertainty in the duty; with a
    reaction the same among elements and basis-species datums.

    Raises NoData where no datum can be reached from all of the table.
    """
    found: Suggestion = tally.plan.oracle.ask(lambda basis: _suggest(basis, tally))
    return found


def _suggest(basis: Basis, tally: Tally) -> Suggestion:
    plan = tally.plan
    weights = _weights(tally)
    reaction = _changed(tally.streams) if tally.streams is not None else []
    kinds = {n: plan.kinds[n] for n in weights if plan.kinds[n].species is not None}
    if not kinds:
        raise NoData("no row of the table has a species and a datum that are known", hint="give --to a datum")
    if plan.settings.evaluate:
        own: list[Datum] = []
    else:
        own = _distinct(basis.datum(kind.datum) for kind in kinds.values())
    streams = tally.streams
    known = streams is not None and streams.low <= streams.high
    middle = 0.5 * (streams.low + streams.high) if streams is not None and known else T_STANDARD
    scores = _scores(basis, kinds, weights, own, bool(reaction), middle)
    unit = "kW" if tally.streams is not None else ""
    shared = own[0] if len(own) == 1 else None
    if shared is not None and shared.temperature != SAME_T and (not reaction or shared.kind != "own"):
        others = [s for s in scores if not same_meaning(s.datum, shared)]
        return Suggestion(
            shared.name,
            "its own tables are all written on it, so nothing is shifted",
            others[0].datum.name if others else None,
            others[0].text(unit) if others else "",
            bool(reaction),
        )
    if not scores:
        raise NoData(
            "no datum can be reached from every row of the table",
            hint="see the reasons of rows with --to elements-298K",
        )
    first = scores[0]
    second = next((s for s in scores if not s.alike(first)), None)
    why = first.text(unit)
    if reaction:
        why = f"species in and out differ ({', '.join(reaction[:3])}), so the zero must be conserved; {why}"
    else:
        why = f"without a reaction an own-state datum will do; {why}" if first.datum.kind == "own" else why
    return Suggestion(
        first.datum.name, why, None if second is None else second.datum.name,
        "" if second is None else second.text(unit), bool(reaction),
    )  # fmt: skip


def _weights(tally: Tally) -> dict[int, float]:
    """How much of each kind of row enters the duty, out less in [mol/s]; rows where there are no flows."""
    streams = tally.streams
    if streams is None or not streams.moles:
        numbers = tally.kinds or dict.fromkeys(range(len(tally.plan.kinds)), 1)
        return {number: float(rows) for number, rows in numbers.items()}
    sides = {side for _, side in streams.moles}
    signed = {IN, OUT} <= sides
    found: dict[int, float] = {}
    for (number, side), moles in streams.moles.items():
        sign = {IN: -1.0, OUT: 1.0}.get(side, 0.0) if signed else 1.0
        found[number] = found.get(number, 0.0) + sign * moles
    return found


def _changed(streams: Streams) -> list[str]:
    sides: dict[str, dict[str, float]] = {IN: {}, OUT: {}}
    for (number, side), moles in streams.moles.items():
        species = streams.plan.kinds[number].species
        if species is not None and side in sides:
            sides[side][species.name] = sides[side].get(species.name, 0.0) + moles
    return reaction_between(sides[IN], sides[OUT]) if sides[IN] and sides[OUT] else []


def _distinct(datums: Iterable[Datum]) -> list[Datum]:
    found: list[Datum] = []
    for datum in datums:
        if not any(same_meaning(datum, other) for other in found):
            found.append(datum)
    return found


def _scores(
    basis: Basis,
    kinds: Mapping[int, Any],
    weights: Mapping[int, float],
    own: list[Datum],
    reaction: bool,
    middle: float,
) -> list[_Score]:
    candidates = [d for d in _distinct([*own, *basis.datums()]) if d.temperature != SAME_T]
    wanted = [d for d in candidates if (d.kind != "own") == reaction]
    scores = []
    for candidate in wanted:
        legs, parts, shifts = 0, [], []
        try:
            for number, kind in kinds.items():
                phase = kind.key.phase or "g"
                if not own:  # evaluated: at a temperature that stands for all
                    pressure = 1e5 if phase == "fluid" else None
                    state = State(phase, middle, kind.key.form, pressure)
                    point = enthalpy_at(basis.levels, kind.species, state, candidate)
                else:
                    source = basis.datum(kind.datum)
                    if source.temperature == SAME_T:
                        continue
                    point = shift_at(basis.levels, kind.species, source, candidate, phase=phase, temperature=None)
                legs += point.legs
                shifts.append(point.value)
                weight = weights[number]
                parts += [Part(p.entry, p.coefficient * weight, p.standard, p.stated) for p in point.parts]
        except PropdbError:
            continue
        spread = sqrt(sum((p.coefficient * p.standard) ** 2 for p in add_parts(parts))) / 1e3
        scores.append(_Score(candidate, legs, spread, tuple(shifts), not own))
    return sorted(scores, key=lambda s: (s.legs, float(f"{s.spread:.6g}"), _away(s.datum)))


def _away(datum: Datum) -> float:
    """Of two that serve alike, the one nearer to 25 °C."""
    t = datum.zero.temperature if datum.zero is not None else datum.temperature
    return abs(t - T_STANDARD) if isinstance(t, float) else 1e3
