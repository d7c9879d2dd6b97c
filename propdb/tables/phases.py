"""Which phase and form a species is in along the temperature axis, and where one hands over to the next."""

from __future__ import annotations

import math
from dataclasses import dataclass

from propdb.errors import NoData
from propdb.levels.engine import Levels
from propdb.levels.policy import choose
from propdb.model.records import Species

__all__ = ["Stretch", "stretches"]


@dataclass(frozen=True, slots=True)
class Stretch:
    """A phase between two temperatures [K], and the entry that says where it ends (id, "" where open)."""

    phase: str
    form: str
    low: float
    high: float
    ends: str = ""  # transition | melting | sublimation | boiling
    entry: str = ""


def stretches(levels: Levels, species: Species, phase: str | None, form: str | None) -> list[Stretch]:
    """The stable phases going up in temperature at 1 atm, by the transition points of the store; or the one asked for.

    Raises
    ------
    NoData
        Several phases, and no melting or boiling point that says which is stable where.
    """
    name = species.name
    if phase is not None:
        return [Stretch(phase, form or "", 0.0, math.inf)]
    melting, boiling = levels.point(name, "Tm"), levels.point(name, "Tb")
    crystals = _crystals(levels, species)
    liquid, gas = bool(levels.forms(name, "l")), bool(levels.forms(name, "g"))
    sublimes = boiling is not None and boiling.phase == "cr"
    t_melt = melting.value if melting is not None and not sublimes else None
    t_boil = boiling.value if boiling is not None else None
    found: list[Stretch] = []
    top = 0.0
    if crystals and (t_melt is not None or sublimes or not (liquid or gas)):
        point = boiling if sublimes else melting
        end = math.inf if point is None or point.value is None else point.value
        what = "sublimation" if sublimes else "melting"
        for i, (f, upper, entry) in enumerate(crystals):
            last = i + 1 == len(crystals) or upper >= end
            if last:
                found.append(Stretch("cr", f, top, end, what, point.id if point is not None else ""))
                break
            found.append(Stretch("cr", f, top, upper, "transition", entry))
            top = upper
        top = end
    elif t_melt is not None:
        top = t_melt
    if not sublimes and liquid and (t_melt is not None or t_boil is not None or not (gas or crystals)):
        end = math.inf if t_boil is None else t_boil
        found.append(Stretch("l", "", top, end, "boiling", boiling.id if boiling is not None else ""))
        top = end
    elif t_boil is not None:
        top = max(top, t_boil)
    if gas:
        found.append(Stretch("g", "", top if found else 0.0, math.inf))
    known = [p for p, there in (("cr", bool(crystals)), ("l", liquid), ("g", gas)) if there]
    if not found or (len(known) > 1 and t_melt is None and t_boil is None):
        raise NoData(
            f"which phase of {name} is stable where is not known: no melting or boiling point in the store",
            hint=f"name the phase: --phase {' or '.join(known) or 'g'}",
        )
    return [s for s in found if s.high > s.low]


def _crystals(levels: Levels, species: Species) -> list[tuple[str, float, str]]:
    """Crystal forms going up, each with the temperature [K] at which it turns into the next, and the entry."""
    name = species.name
    forms = levels.forms(name, "cr")
    if not forms:
        return []
    turns = [
        e
        for e in choose(levels.data.entries(name), levels.policy)
        if e.quantity == "Htr" and e.phase == "cr" and e.temperature is not None and e.to.startswith("cr")
    ]
    targets = {e.to.partition(":")[2] for e in turns}
    zeros = [n.form for n in levels.zero_nodes(species) if n.phase == "cr"]
    form = next((f for f in forms if f not in targets and any(e.form == f for e in turns)), "")
    form = form or (zeros[0] if zeros else forms[0])
    chain: list[tuple[str, float, str]] = []
    seen = {form}
    while True:
        turn = next((e for e in turns if e.form == form), None)
        following = turn.to.partition(":")[2] if turn is not None else ""
        if turn is None or turn.temperature is None or following in seen:
            chain.append((form, math.inf, ""))
            return chain
        chain.append((form, turn.temperature, turn.id))
        form = following
        seen.add(form)
