"""What a datum calls zero for one species: a list of coefficient x state, and h0. Nothing is evaluated here."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from fractions import Fraction

from propdb.datum.stoichiometry import Composition, basis_for_phase, solve
from propdb.errors import DatumError
from propdb.model.records import SAME_T, Datum, Species, Term, Zero, ZeroState

__all__ = ["ELECTRON", "PROTON", "reference_form", "zero"]

#: Keys of a schedule that carry charge: the electron gas, and H+(aq) for aqueous species.
ELECTRON = "e-"
PROTON = "H+(aq)"

_HINT = "use an elements datum such as elements-298K, or an own-state one such as gas-25C"


def zero(
    datum: Datum,
    species: Species,
    *,
    phase: str,
    composition: Composition,
    temperature: float | None = None,
) -> Zero:
    """What ``datum`` calls zero for ``species``: sum of coefficient x enthalpy of a state, less h0.

    An enthalpy on the datum is H = level(state) - sum(coefficient x level(term)) + h0.

    Parameters
    ----------
    species : Species
        The species asked for; its atoms and charge are taken from the record.
    phase : str
        Its phase. It decides what carries charge: H+(aq) in ``aq``, the electron gas elsewhere.
    composition : callable
        ``composition(name) -> ({element: count}, charge)`` of the datum's own species.
    temperature : float, optional
        Temperature [K] of the state asked for. Needed by datums with zero at the same temperature only.

    Returns
    -------
    Zero
        Terms name their species; terms of the species itself carry its own name.

    Raises
    ------
    DatumError
        The datum has no zero for this species (an element or charge not covered, another species' datum), or the
        temperature that a same-temperature datum needs is missing or beyond its schedule of forms.
    """
    if datum.kind == "own":
        return _own(datum, species)
    if datum.kind == "elements":
        states = _element_states(datum, species, phase=phase, temperature=temperature)
    else:
        states = basis_for_phase(datum.basis, phase=phase, composition=composition)
    coefficients = solve(
        dict(species.composition),
        species.charge,
        basis=[state.species for state in states],
        composition=composition,
        what=species.name,
        datum=datum.name,
    )
    terms = tuple(Term(nu, state.species, state) for nu, state in zip(coefficients, states, strict=True) if nu)
    return Zero(terms, datum.h0, datum.h0_unit, datum.internal_energy)


def _own(datum: Datum, species: Species) -> Zero:
    state = datum.per_species.get(species.name)
    if state is None and not datum.only:
        state = datum.zero
    if state is None:
        raise DatumError(
            f"{datum.name} is a datum of {', '.join(datum.per_species)} only, and says nothing about {species.name}",
            hint=_HINT,
        )
    name = state.species or species.name
    term = Term(Fraction(1), name, replace(state, species=name))
    return Zero((term,), datum.h0, datum.h0_unit, datum.internal_energy)


def _element_states(datum: Datum, species: Species, *, phase: str, temperature: float | None) -> tuple[ZeroState, ...]:
    """Reference forms of the elements that the species needs, and what carries its charge."""
    keys = [element for element, count in species.composition if count]
    if species.charge:
        if phase == "aq":
            keys.append(PROTON)
            if "H" not in keys:
                keys.append("H")
        else:
            keys.append(ELECTRON)
    missing = [key for key in keys if key not in datum.schedule]
    if missing:
        raise DatumError(
            f"{species.name} has no zero on {datum.name}: it names no reference form for {' and '.join(missing)}",
            hint="add the element's form to the datum",
            elements=tuple(missing),
        )
    if species.charge and phase == "aq" and datum.temperature == 0:
        raise DatumError(
            f"{species.name} (aq) has no zero on {datum.name}: H+(aq) is 0 at 298.15 K and there is no solution at 0 K",
            hint="use elements-298K",
        )
    return tuple(reference_form(datum.schedule, key, datum=datum, temperature=temperature) for key in keys)


def reference_form(
    schedule: Mapping[str, Sequence[tuple[float, ZeroState]]],
    element: str,
    *,
    datum: Datum,
    temperature: float | None,
) -> ZeroState:
    """Reference form of one element: by the schedule where the datum is a same-temperature one.

    At the temperature of a transition itself the form below it counts; both have the same Gibbs energy but not the
    same enthalpy.

    Raises
    ------
    DatumError
        No temperature, or one beyond the last form listed.
    """
    stages = schedule[element]
    if datum.temperature != SAME_T:
        return stages[0][1]
    if temperature is None:
        raise DatumError(
            f"{datum.name} has its zero at the temperature of the state, and no temperature was given",
            hint="give the temperature",
        )
    for upper, state in stages:
        if temperature <= upper:
            return state
    raise DatumError(
        f"{datum.name} lists no reference form of {element} above {stages[-1][0]:g} K",
        hint=f"stay at or below {stages[-1][0]:g} K, or use elements-298K",
        elements=(element,),
    )
