"""Heat capacities that no substance of their formula can have: kept, and never used.

The bounds are wide, so that only slips are caught: a digit, a sign, a coefficient, another formula unit than the row
says. An ideal gas has at least 5/2 R, and little more than R for each degree of freedom. A crystal at room temperature
lies near 3 R for each atom (Dulong and Petit), a liquid at its cold end between a third of that and twice that.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Iterable, Mapping, Sequence
from typing import Any, Final

from propdb.cp.registry import build_heat_capacity
from propdb.errors import PropdbError
from propdb.intake.package.contradictions import set_aside
from propdb.model.records import R_GAS, T_STANDARD, Entry, Species

__all__ = ["implausible", "quarantine_heat_capacities"]

#: Bounds in units of the classical value. Of what the tables hold rightly, liquid sulfur trioxide (2.6 times 3 R for
#: each atom) and the crystal Cu2Sb (1.37) come nearest to them.
_CRYSTAL: Final = 1.4
_LIQUID: Final = (0.2, 2.7)
_GAS: Final = (2.45, 1.4)

#: Two heat capacities agree within the one, and a third one further from both than the other is none of this substance.
_CLOSE: Final = 0.1
_FAR: Final = 0.3

_Function = tuple[float, float, Callable[[float], float]]

_COLD: Final = 150.0  # [K], below it the heat capacity of a liquid of light molecules is that of a quantum fluid
_NEAR_CRITICAL: Final = 0.9


def implausible(
    entry: Entry, *, atoms: float, critical: float | None = None, built: Mapping[str, Any] | None = None
) -> str:
    """Why a heat capacity cannot be one of its species; "" where it can.

    Parameters
    ----------
    entry : Entry
        A heat capacity of crystal, liquid or ideal gas.
    atoms : float
        Atoms in the formula.
    critical : float, optional
        Critical temperature [K]: near it the heat capacity of a liquid has no bound.
    built : mapping, optional
        Entry id to heat capacity, where it has been made.
    """
    values = _values(entry, {} if built is None else built)
    if not values or atoms <= 0:
        return ""
    coldest = values[0]
    lowest = min(values, key=lambda point: point[1])
    if lowest[1] <= 0.0:
        return f"{lowest[1]:.4g} J/mol/K at {lowest[0]:.5g} K is no heat capacity"
    if entry.phase == "g":
        if lowest[1] < _GAS[0] * R_GAS:
            return f"{lowest[1]:.4g} J/mol/K at {lowest[0]:.5g} K: an ideal gas has at least 5/2 R"
        highest = max(values, key=lambda point: point[1])
        if atoms >= 4 and highest[1] > _GAS[1] * (3.0 * atoms - 2.0) * R_GAS:
            return f"{highest[1]:.4g} J/mol/K at {highest[0]:.5g} K: more than {atoms:g} atoms can take up"
        return ""
    classical = 3.0 * atoms * R_GAS
    if entry.phase == "cr":
        room = min(values, key=lambda point: abs(point[0] - T_STANDARD))
        if atoms >= 2 and room[0] < 400.0 and room[1] > _CRYSTAL * classical:
            return f"{room[1]:.4g} J/mol/K at {room[0]:.5g} K: too much for {atoms:g} atoms, of another formula unit"
    if entry.phase == "l" and (critical is None or coldest[0] < _NEAR_CRITICAL * critical):
        if coldest[1] > _LIQUID[1] * classical:
            return f"{coldest[1]:.4g} J/mol/K at {coldest[0]:.5g} K: too much for {atoms:g} atoms"
        if coldest[0] > _COLD and coldest[1] < _LIQUID[0] * classical:
            return f"{coldest[1]:.4g} J/mol/K at {coldest[0]:.5g} K: too little for {atoms:g} atoms"
    return ""


def quarantine_heat_capacities(
    entries: list[Entry], species: Iterable[Species], built: Mapping[str, Any] | None = None
) -> int:
    """Set aside, in place, heat capacities that cannot be. Returns how many were.

    Where a crystal's table is of another formula unit, so are the other condensed data of its source. ``built`` as for
    :func:`implausible`.
    """
    made = {} if built is None else built
    atoms = {s.name: sum(float(n) for _, n in s.composition) for s in species}
    critical: dict[str, float] = {}
    for e in entries:
        if e.quantity == "Tc" and e.value is not None and e.status != "quarantined":
            critical[e.species] = min(e.value, critical.get(e.species, e.value))
    count = _outvoted(entries, made)
    units: dict[tuple[str, str], str] = {}
    for place, entry in enumerate(entries):
        if entry.quantity != "Cp" or entry.phase not in ("cr", "l", "g") or entry.status == "quarantined":
            continue
        reason = implausible(
            entry, atoms=atoms.get(entry.species, 0.0), critical=critical.get(entry.species), built=made
        )
        if reason:
            entries[place] = set_aside(entry, reason)
            count += 1
            if "formula unit" in reason and entry.equation == "table":
                units[entry.species, entry.source] = "the heat capacity of its crystal is of another formula unit"
    for place, entry in enumerate(entries) if units else ():
        reason = units.get((entry.species, entry.source), "")
        if reason and entry.phase in ("cr", "l") and entry.status != "quarantined":
            entries[place] = set_aside(entry, reason)
            count += 1
    return count


def _outvoted(entries: list[Entry], built: Mapping[str, Any]) -> int:
    """Set aside liquids' and gases' heat capacities that two others contradict, which agree. Returns how many."""
    groups: dict[tuple[str, str], list[int]] = defaultdict(list)
    for place, entry in enumerate(entries):
        if entry.quantity == "Cp" and entry.phase in ("l", "g"):
            groups[entry.species, entry.phase].append(place)
    count = 0
    for places in groups.values():
        if len(places) < 3 or not any(entries[place].equation for place in places):
            continue
        functions = {place: _function(entries[place], built) for place in places}
        for place in places:
            reason = _against(
                entries[place], functions[place], [(entries[i], functions[i]) for i in places if i != place]
            )
            if reason:
                entries[place] = set_aside(entries[place], reason)
                count += 1
    return count


def _against(entry: Entry, own: _Function | None, others: Sequence[tuple[Entry, _Function | None]]) -> str:
    if own is None:
        return ""
    cp = own[2]
    said: list[tuple[str, float, _Function]] = []
    for other, function in others:
        at = None if function is None else _shared(own, function)
        if function is None or at is None:
            continue
        if abs(cp(at) - function[2](at)) <= _FAR * abs(function[2](at)):
            return ""
        said.append((other.source, at, function))
    for i, (source, at, one) in enumerate(said):
        for _, _, two in said[i + 1 :]:
            between = _shared(one, two)
            if between is not None and abs(one[2](between) - two[2](between)) <= _CLOSE * abs(two[2](between)):
                return f"{cp(at):.4g} J/mol/K at {at:.5g} K, where {source} and another have {one[2](at):.4g}"
    return ""


def _shared(one: _Function, two: _Function) -> float | None:
    """The middle of two ranges' overlap [K]."""
    low, high = max(one[0], two[0]), min(one[1], two[1])
    return None if low > high else 0.5 * (low + high)


def _function(entry: Entry, built: Mapping[str, Any]) -> _Function | None:
    """Range [K] and heat capacity of an entry."""
    if not entry.equation:
        t, value = entry.temperature or T_STANDARD, entry.value
        return None if value is None else (t, t, lambda _: value)
    if entry.tmin is None or entry.tmax is None:
        return None
    try:
        equation = _equation(entry, built)
    except PropdbError:
        return None
    return entry.tmin, entry.tmax, lambda t: float(equation.cp(t))


def _equation(entry: Entry, built: Mapping[str, Any]) -> Any:
    equation = built.get(entry.id)
    return build_heat_capacity(entry.equation, entry.params) if equation is None else equation


def _values(entry: Entry, built: Mapping[str, Any]) -> list[tuple[float, float]]:
    """Temperatures [K] and heat capacities [J/mol/K]: of an equation at its ends and the middle, of a table all."""
    if not entry.equation:
        return [] if entry.value is None else [(entry.temperature or T_STANDARD, entry.value)]
    params: Mapping[str, Any] = entry.params
    if entry.equation == "table":
        return list(zip(params["T"], params["cp"], strict=True))
    if entry.tmin is None or entry.tmax is None:
        return []
    try:
        equation = _equation(entry, built)
        at = sorted(
            {entry.tmin, 0.5 * (entry.tmin + entry.tmax), min(max(T_STANDARD, entry.tmin), entry.tmax), entry.tmax}
        )
        return [(t, float(equation.cp(t))) for t in at]
    except PropdbError:
        return []
