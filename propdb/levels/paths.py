"""Whether an enthalpy can be carried through the phases of a species: the paths a store claims to have, walked."""

from __future__ import annotations

from propdb.errors import PropdbError
from propdb.levels.curves import Curve
from propdb.levels.engine import Levels
from propdb.levels.tree import expand
from propdb.model.records import T_STANDARD, State

__all__ = ["carries"]

#: What takes a state beyond the split of a table [K].
_BEYOND = 1e-3


def carries(levels: Levels, species: str, phases: tuple[str, ...]) -> bool:
    """Does the engine carry an enthalpy along all ``phases``, without extrapolation?

    Parameters
    ----------
    levels : Levels
    species : str
    phases : tuple of str
        In the order of the path: ``("l", "g")`` or ``("cr", "l", "g")``.

    Returns
    -------
    bool
        True where a crystal, a liquid that is one (above the melting point and not above the critical temperature,
        where those are known) and the ideal gas lie on one way. Each phase is tried at 298.15 K or the nearest
        temperature of its range, and beyond each split of its table: a crystal may count from the form that melts.
    """
    places = [_places(levels, species, phase) for phase in phases]
    starts, *others = places
    return any(all(any(_joined(levels, species, start, end) for end in ends) for ends in others) for start in starts)


def _joined(levels: Levels, species: str, start: State, end: State) -> bool:
    try:
        expand(levels.way(species, start, end))
    except PropdbError:
        return False
    return True


def _places(levels: Levels, species: str, phase: str) -> list[State]:
    """States of a phase to try: 298.15 K, or the nearest temperature where heat capacity and phase both exist."""
    melting, critical = levels.value(species, "Tm"), levels.value(species, "Tc")
    low = melting if phase == "l" and melting is not None else 0.0
    high = critical if phase == "l" and critical is not None else float("inf")
    if phase == "cr" and melting is not None:
        high = melting
    try:
        tracks = levels.tree(species).tracks
    except PropdbError:
        return []
    states = []
    for (found, form), track in tracks.items():
        if found != phase:
            continue
        ranges = [(p.tmin, p.tmax, p.side) for p in track.pieces] if isinstance(track, Curve) else [(low, high, 0)]
        for a, b, side in ranges:
            # A state at a split belongs to the side below it.
            bottom, top = max(a + (_BEYOND if side else 0.0), low), min(b, high)
            if bottom <= top:
                states.append(State(phase, min(max(T_STANDARD, bottom), top), form))
    return states
