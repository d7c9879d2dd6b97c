"""What data that a path does not use say against it, and when that is more than their uncertainties explain."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from math import hypot
from typing import NamedTuple

from propdb.errors import PropdbError
from propdb.levels.curves import PRINTED_SLACK, Curve
from propdb.levels.engine import Levels, Way, passes
from propdb.levels.parts import Leg, add_parts, combined, ranking_uncertainty
from propdb.levels.policy import choose
from propdb.levels.tree import Move
from propdb.model.records import Closure, Part
from propdb.units import format_number

__all__ = ["Judged", "contradictions", "judged_closures"]

#: A closure is a contradiction beyond this many combined standard uncertainties, class defaults where none is stated,
#: and beyond this many J/mol: below it nothing hangs on it.
_TIMES, _LEAST = 3.0, 2000.0


class Judged(NamedTuple):
    """A closure, and whether uncertainties explain it."""

    closure: Closure
    contradicts: bool


def judged_closures(levels: Levels, ways: Way, *, per: float) -> tuple[Judged, ...]:
    """Unused edges whose loop shares a leg with the ways, and heat capacities that were not chosen.

    Parameters
    ----------
    levels : Levels
    ways : sequence of (float, str, list of Move)
        Coefficient, species, moves.
    per : float
        The unit of the answer [J/mol].
    """
    found: list[Judged] = []
    for _, name, moves in ways:
        used = passes(moves)
        tree = levels.tree(name)
        for edge in tree.unused:
            loop = levels.loop(name, edge)
            if loop is None or (loop.isdisjoint(used) and edge.start != edge.end):
                continue
            result = levels.closure_error(name, edge)
            if result is None or not edge.leg.source:
                continue
            error, parts = result
            via = f"{name}: {edge.leg.what} {edge.start.text()} to {edge.end.text()} by {edge.leg.source}"
            found.append(_judge(via, error, parts, edge.leg, per))
        found += _other_curves(levels, name, moves, per)
    unique = {(judged.closure.via, judged.closure.entry): judged for judged in found}
    return tuple(unique.values())


def contradictions(judged: Iterable[Judged], unit: str) -> list[str]:
    """One sentence where other sources contradict the path, naming the one that does most."""
    against = [j.closure for j in judged if j.contradicts]
    if not against:
        return []
    worst = max(against, key=lambda c: abs(c.difference))
    sources = list(dict.fromkeys(c.source for c in against))
    others = f"{', '.join(sources[:3])}{' and others' if len(sources) > 3 else ''}"
    verb = "contradicts" if len(sources) == 1 else "contradict"
    much = f"{format_number(worst.difference, significant=3)} {unit}"
    said = f"{others} {verb} this answer by more than the uncertainties explain, {worst.source} by {much}"
    return [f"{said}: see the closures"]


def _judge(via: str, error: float, parts: Iterable[Part], leg: Leg, per: float) -> Judged:
    summed = add_parts(parts)
    total, missing = combined(summed)
    closure = Closure(via, error / per, None if missing else total / per, leg.entry, leg.source)
    return Judged(closure, abs(error) > max(_LEAST, _TIMES * ranking_uncertainty(summed)))


def _other_curves(levels: Levels, name: str, moves: Sequence[Move], per: float) -> list[Judged]:
    found = []
    for move in moves:
        curve = move.track
        if not isinstance(curve, Curve) or move.start == move.end:
            continue
        used = {p.entry.id for p in curve.pieces}
        others = [
            e
            for e in choose(levels.data.entries(name), levels.policy)
            if e.quantity == "Cp"
            and (e.phase, e.form) == (curve.phase, curve.form)
            and e.equation not in ("", "iapws95")
            and e.id not in used
        ]
        low, high = min(move.start, move.end), max(move.start, move.end)
        for e in others:
            if e.tmin is None or e.tmax is None or e.tmin > low + PRINTED_SLACK or e.tmax < high - PRINTED_SLACK:
                continue
            from propdb.cp.registry import build_heat_capacity

            try:
                value = float(build_heat_capacity(e.equation, e.params).dh(move.start, move.end))
                legs = [leg for leg in curve.legs(move.start, move.end) if leg.what == "heating"]
            except PropdbError:
                continue
            error = value - sum(leg.value for leg in legs)
            via = f"{name}: heating {curve.phase} {move.start:.7g} to {move.end:.7g} K by {e.source}"
            size, unit, _ = levels.policy.standard(e)
            own = ranking_uncertainty(add_parts(p for leg in legs for p in leg.parts))
            doubt = hypot(own, size * abs(value) if unit == "%" else size * (high - low))
            contradicts = abs(error) > max(_LEAST, _TIMES * doubt)
            found.append(Judged(Closure(via, error / per, None, e.id, e.source), contradicts))
    return found
