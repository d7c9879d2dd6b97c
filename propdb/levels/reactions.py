"""The enthalpy of a reaction by two routes: levels at T, and the heat of reaction at 298.15 K plus sensible heats."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction

from propdb.datum import may_sum
from propdb.errors import DatumMismatch, PropdbError
from propdb.levels.answers import Derivation, net, zero_members
from propdb.levels.engine import Levels
from propdb.levels.tree import expand
from propdb.model.answer import ReactionAnswer, ReactionTerm
from propdb.model.records import T_STANDARD, Datum, Species, State
from propdb.units import EnthalpyUnit

__all__ = ["Participant", "reaction"]


@dataclass(frozen=True, slots=True)
class Participant:
    """A species with its signed coefficient (negative for reactants) and state."""

    coefficient: Fraction
    species: Species
    state: State


def _standard_state(levels: Levels, p: Participant) -> State:
    """Where the sensible heat of a participant starts: its own phase at 298.15 K, else the phase stable there."""
    own = State(p.state.phase, T_STANDARD, p.state.form)
    try:
        levels.level_way(p.species.name, levels.check(p.species.name, own))
    except PropdbError:
        phase, form = levels.stable_phase(p.species.name, T_STANDARD)
        return State(phase, T_STANDARD, form)
    return own


def reaction(
    levels: Levels,
    *,
    equation: str,
    participants: Sequence[Participant],
    temperature: float,
    datum: Datum,
    unit: EnthalpyUnit,
    stamp: str,
) -> ReactionAnswer:
    """Enthalpy of a balanced reaction at a temperature [K], in ``unit`` per mole of reaction as written.

    Route 1 sums the enthalpies at T on ``datum``. Route 2 sums the formation enthalpies at 298.15 K and adds each
    sensible heat, taken state to state along the shortest way. Both are sums over one potential, so they must agree to
    rounding; a difference would betray a broken tree.

    Raises
    ------
    DatumMismatch
        An own-state datum: its enthalpies may not be summed across a reaction.
    PropdbError
        As :meth:`Levels.level <propdb.levels.engine.Levels.level>`, for the first participant that fails.
    """
    verdict = may_sum(datum, temperatures=[temperature])
    if not verdict.reaction:
        why = "it gives each species its own zero" if datum.kind == "own" else verdict.why
        raise DatumMismatch(
            f"enthalpies on {datum.name} cannot be summed across a reaction: {why}",
            hint="use elements-298K",
            datum=datum.name,
        )
    per = unit.scale()
    terms = []
    formation = standard = sensible = 0.0
    members = []
    for p in participants:
        state = levels.check(p.species.name, p.state)
        start = levels.check(p.species.name, _standard_state(levels, p))
        zeros = zero_members(levels, datum, p.species, phase=state.phase, temperature=temperature)
        level = sum(leg.value for leg in net(levels, [(1.0, p.species.name, state)], zeros).legs())
        at_298 = sum(leg.value for leg in levels.level(p.species.name, start))
        heat = sum(leg.value for leg in expand(levels.way(p.species.name, start, state)))
        nu = float(p.coefficient)
        formation += nu * level
        standard += nu * at_298
        sensible += nu * heat
        members.append((nu, p.species.name, state))
        terms.append(
            ReactionTerm(
                coefficient=str(p.coefficient),
                species=p.species.name,
                formula=p.species.display_formula,
                state=state.text(),
                formation=level / per,
                standard=at_298 / per,
                sensible=heat / per,
                start=start.text(),
            )
        )
    derived = Derivation(levels, net(levels, members, []), per=per, unit=unit)
    uncertainty, note = derived.uncertainty()
    return ReactionAnswer(
        value=formation / per,
        unit=unit.text,
        si=formation,
        uncertainty=None if uncertainty is None else uncertainty / per,
        uncertainty_note=note,
        datum=datum.name,
        may_sum=verdict,
        steps=derived.steps(),
        closures=derived.closures(),
        parts=derived.parts,
        warnings=tuple(derived.warnings() + _mixed_charge(participants)),
        store=stamp,
        sources=derived.sources(),
        crosscheck=derived.crosschecks(),
        equation=equation,
        temperature=temperature,
        terms=tuple(terms),
        formation_route=formation / per,
        reaction_standard=standard / per,
        sensible=sensible / per,
        sensible_route=(standard + sensible) / per,
        disagreement=(formation - standard - sensible) / per,
    )


def _mixed_charge(participants: Sequence[Participant]) -> list[str]:
    charged = {p.state.phase == "aq" for p in participants if p.species.charge}
    if len(charged) == 2:
        return ["ions in solution (H+(aq) = 0) and in the gas (electron gas = 0) stand on two conventions for charge"]
    return []
