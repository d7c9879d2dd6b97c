"""Answers from levels: the enthalpy of a state on a datum, and a tabulated enthalpy moved to another."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from propdb.datum import may_sum
from propdb.errors import PropdbError
from propdb.levels.closures import Judged, contradictions, judged_closures
from propdb.levels.engine import Levels
from propdb.levels.parts import Leg, add_parts, combined, scale
from propdb.levels.tables import matches, tables_of
from propdb.levels.tree import Move, expand
from propdb.model.answer import Answer
from propdb.model.crosscheck import EntryCheck
from propdb.model.records import SAME_T, Closure, Datum, Entry, MaySum, Source, Species, State, Step, Zero
from propdb.units import EnthalpyUnit, format_number

__all__ = ["Derivation", "Difference", "convert", "enthalpy", "net", "zero_members"]

#: (coefficient, species name, state)
Member = tuple[float, str, State]


class Difference:
    """Sum of coefficient x level of some states less that of others, as ways that can be read.

    Where one species stands once on each side with one coefficient, the way goes straight from state to state, so no
    formation enthalpy enters unless the path itself is a difference of two.
    """

    def __init__(self, levels: Levels, plus: Sequence[Member], minus: Sequence[Member]) -> None:
        self.levels = levels
        self.ways: list[tuple[float, str, list[Move]]] = []
        names = list(dict.fromkeys(name for _, name, _ in (*minus, *plus)))
        for name in names:
            up = [(c, s) for c, n, s in plus if n == name]
            down = [(c, s) for c, n, s in minus if n == name]
            if len(up) == len(down) == 1 and up[0][0] == down[0][0]:
                moves = levels.way(name, down[0][1], up[0][1])
                if moves:
                    self.ways.append((up[0][0], name, moves))
                continue
            self.ways += [(-c, name, levels.level_way(name, s)) for c, s in down]
            self.ways += [(c, name, levels.level_way(name, s)) for c, s in up]

    def legs(self) -> list[Leg]:
        """Legs in the order of the ways, with zero definitions left out."""
        legs: list[Leg] = []
        for coefficient, _, moves in self.ways:
            mine = expand(moves)
            formations = [leg for leg in mine if leg.what == "formation"]
            if len(formations) == 2:
                note = "an implied latent heat: difference of two formation enthalpies of one species"
                mine = [replace(leg, note=leg.note or note) if leg.what == "formation" else leg for leg in mine]
            if coefficient < 0:
                mine = list(reversed(mine))
            legs += [scale(leg, coefficient) for leg in mine if not (leg.what == "definition" and leg.value == 0.0)]
        return legs

    def species(self) -> list[str]:
        return list(dict.fromkeys(name for _, name, _ in self.ways))


def net(levels: Levels, plus: Sequence[Member], minus: Sequence[Member]) -> Difference:
    """See :class:`Difference`."""
    return Difference(levels, plus, minus)


def _standing(entry: Entry | None) -> str:
    """What people of this store said for an entry."""
    if entry is None or entry.status not in ("approved", "checked"):
        return ""
    return f"{entry.quantity} of {entry.source} [{entry.id[:8]}] is {entry.status} in this store"


class Derivation:
    """Turns legs into the common fields of an answer."""

    def __init__(self, levels: Levels, difference: Difference, *, per: float, unit: EnthalpyUnit) -> None:
        self.levels = levels
        self.difference = difference
        self.legs = difference.legs()
        self.per = per  # [J/mol] per unit
        self.unit = unit
        self.parts = add_parts(p for leg in self.legs for p in leg.parts)
        self._closures: tuple[Judged, ...] | None = None

    def total(self) -> float:
        """[J/mol]"""
        return sum(leg.value for leg in self.legs)

    def entries(self) -> dict[str, Entry]:
        """Entries that the parts refer to, by id."""
        wanted = {p.entry for p in self.parts} | {leg.entry for leg in self.legs}
        return {e.id: e for name in self.difference.species() for e in self.levels.data.entries(name) if e.id in wanted}

    def uncertainty(self) -> tuple[float | None, str]:
        """Standard uncertainty in J/mol or None, and the sentence that says what lacks one."""
        stated, missing = combined(self.parts)
        entries = self.entries()
        by_source: dict[str, list[str]] = {}
        for i in missing:
            by_source.setdefault(entries[i].source if i in entries else i, []).append(i[:8])
        names = [f"{key} [{' '.join(ids)}]" for key, ids in by_source.items()]
        shown = f"{format_number(stated / self.per, significant=2)} {self.unit.text}"
        if not self.parts:
            return 0.0, "none: the value follows from the conventions alone"
        if not missing:
            return stated, f"standard {shown} (one standard deviation), sensitivities to shared entries cancelled"
        if any(p.stated for p in self.parts):
            return None, f"not stated by {', '.join(names)}; the other entries make standard {shown}"
        return None, f"not stated by {', '.join(names)}"

    def steps(self) -> tuple[Step, ...]:
        entries = self.entries()
        return tuple(
            Step(
                what=leg.what,
                species=leg.species,
                start=leg.start,
                end=leg.end,
                value=leg.value / self.per,
                entry=leg.entry,
                source=leg.source,
                extrapolated=leg.extrapolated,
                note="; ".join(filter(None, (leg.note, _standing(entries.get(leg.entry))))),
                span=leg.span,
            )
            for leg in self.legs
        )

    def crosschecks(self) -> tuple[EntryCheck, ...]:
        """What other compilations say of the entries, as it was stored with them."""
        return tuple(EntryCheck(e, check) for e in self.entries().values() for check in e.crosschecks)

    def sources(self) -> dict[str, Source]:
        keys = {leg.source for leg in self.legs if leg.source}
        keys |= {e.source for e in self.entries().values()}
        return {key: self.levels.data.source(key) for key in sorted(keys)}

    def warnings(self, *, judged: bool = True) -> list[str]:
        """What a reader must mind; ``judged``: also what others contradict, for which all closures are computed."""
        found: list[str] = []
        entries = self.entries()
        for leg in self.legs:
            if leg.extrapolated:
                found.append(f"{leg.species}: {leg.what} {leg.start} to {leg.end} is extrapolated")
            if leg.what == "pressure along saturation" and not leg.parts:
                found.append(f"{leg.species}: the pressure term along saturation is left out ({leg.note})")
        for e in entries.values():
            if e.status in ("disputed", "estimate"):
                reason = f": {e.note}" if e.note else ""
                found.append(f"{e.species}: {e.quantity} of {e.source} [{e.id[:8]}] is {e.status}{reason}")
        if judged:
            found += contradictions(self._judged(), self.unit.text)
        pinned = self.levels.policy.pinned
        if pinned:
            off = sorted({leg.source for leg in self.legs if leg.source and leg.source not in pinned})
            if off:
                found.append(f"not from the pinned source: {', '.join(off)}, which alone supplies that step")
        return list(dict.fromkeys(found))

    def closures(self) -> tuple[Closure, ...]:
        """Unused edges whose loop shares a leg with the way, and heat capacities that were not chosen."""
        return tuple(judged.closure for judged in self._judged())

    def _judged(self) -> tuple[Judged, ...]:
        if self._closures is None:
            self._closures = judged_closures(self.levels, self.difference.ways, per=self.per)
        return self._closures


def zero_members(
    levels: Levels, datum: Datum, species: Species, *, phase: str, temperature: float | None
) -> list[Member]:
    """The states that a datum calls zero for a species, made definite, with their coefficients."""
    z = levels.zero_of(datum, species, phase=phase, temperature=temperature)
    return _members(levels, z, datum, temperature)


def _members(levels: Levels, z: Zero, datum: Datum, temperature: float | None) -> list[Member]:
    members: list[Member] = []
    for term in z.terms:
        try:
            state = levels.check(term.species, levels.resolve(term.zero, term.species, temperature=temperature))
            levels.attach(term.species, state)
        except PropdbError as error:
            error.where = error.where or f"zero of {datum.name}"
            raise
        members.append((float(term.coefficient), term.species, state))
    return members


def _verdict(datum: Datum, temperature: float | None) -> MaySum:
    return may_sum(datum, temperatures=None if temperature is None else [temperature])


def _against_tables(levels: Levels, species: Species, state: State, answer: Answer, unit: EnthalpyUnit) -> Answer:
    """What a group's own tables of enthalpies say of the state, each on its own datum, as closures of the answer."""
    found = []
    per = unit.scale(molar_mass=species.molar_mass)
    for track in tables_of(levels.data.entries(species.name), levels.policy, pinned=False):
        t = state.temperature
        if t is None or not matches(track.entry, state) or not track.table.tmin <= t <= track.table.tmax:
            continue
        datum = levels.data.datum(track.entry.datum)
        try:
            z = levels.zero_of(datum, species, phase=state.phase, temperature=t)
            legs = net(levels, [(1.0, species.name, state)], _members(levels, z, datum, t)).legs()
            ours = sum(leg.value for leg in legs) + levels.offset(z, species, temperature=t)
        except PropdbError:
            continue
        via = f"{species.name}: own table of {track.entry.source} at {t:.7g} K on {datum.name}"
        found.append(Closure(via, (track.table.h(t) - ours) / per, None, track.entry.id, track.entry.source))
    return replace(answer, closures=answer.closures + tuple(found)) if found else answer


def _condensed_pressure(state: State) -> list[str]:
    if state.pressure is None:
        return []
    if state.phase == "g":
        return ["the enthalpy of the ideal gas does not depend on pressure; for the real gas use --phase fluid"]
    if state.phase in ("l", "cr", "am"):
        return ["the effect of pressure on the condensed phase is not included: its volume is not in the store"]
    return []


def enthalpy(levels: Levels, *, species: Species, state: State, datum: Datum, unit: EnthalpyUnit, stamp: str) -> Answer:
    """Enthalpy of a state on a datum: level(state) less what the datum calls zero, plus h0.

    Raises
    ------
    PropdbError
        Any of OutOfRange, NoData, NotFound, Ambiguous, DatumError, as :class:`~propdb.levels.engine.Levels` says.
    """
    state = levels.check(species.name, state)
    z = levels.zero_of(datum, species, phase=state.phase, temperature=state.temperature)
    zeros = _members(levels, z, datum, state.temperature)
    derived = Derivation(
        levels,
        net(levels, [(1.0, species.name, state)], zeros),
        per=unit.scale(molar_mass=species.molar_mass),
        unit=unit,
    )
    offset = levels.offset(z, species, temperature=state.temperature)
    water_formulation = any(leg.what == "formulation" for leg in derived.legs)
    warnings = derived.warnings() + ([] if water_formulation else _condensed_pressure(state))
    answer = _answer(
        derived,
        species=species,
        value=derived.total() + offset,
        offsets=[(f"zero of {datum.name}", offset, _h0_note(z, datum))] if offset else [],
        datum=datum,
        verdict=_verdict(datum, state.temperature),
        warnings=warnings + _pressure_note(datum),
        stamp=stamp,
        state=state.text(),
    )
    return _against_tables(levels, species, state, answer, unit)


def _h0_note(z: Zero, datum: Datum) -> str:
    if z.internal_energy:
        return f"{datum.name} fixes the internal energy; the enthalpy there is p v"
    return f"the zero state of {datum.name} has {z.h0 / 1e3:g} k{z.h0_unit}"


def _pressure_note(datum: Datum) -> list[str]:
    if datum.standard_pressure == 101325.0:
        return [
            "1 atm against 1 bar is no shift: the ideal gas does not depend on pressure, condensed phases by < 2 J/mol"
        ]
    return []


def convert(
    levels: Levels,
    *,
    species: Species,
    value: float,
    given: str,
    source_datum: Datum,
    target_datum: Datum,
    unit: EnthalpyUnit,
    stamp: str,
    phase: str,
    temperature: float | None = None,
) -> Answer:
    """A tabulated enthalpy ``value`` [J/mol] moved from one datum to another: H_B = H_A + Z_A - Z_B.

    ``temperature`` [K] is needed by same-temperature datums only. Raises as :func:`enthalpy`.
    """
    z_a = levels.zero_of(source_datum, species, phase=phase, temperature=temperature)
    z_b = levels.zero_of(target_datum, species, phase=phase, temperature=temperature)
    plus = _members(levels, z_a, source_datum, temperature)
    minus = _members(levels, z_b, target_datum, temperature)
    plus, minus = _cancel(plus, minus)
    derived = Derivation(levels, net(levels, plus, minus), per=unit.scale(molar_mass=species.molar_mass), unit=unit)
    a = levels.offset(z_a, species, temperature=temperature)
    b = levels.offset(z_b, species, temperature=temperature)
    offsets = [(f"as given, on {source_datum.name}", value, "")]
    if a:
        offsets.append((f"zero of {source_datum.name}", -a, _h0_note(z_a, source_datum)))
    if b:
        offsets.append((f"zero of {target_datum.name}", b, _h0_note(z_b, target_datum)))
    return _answer(
        derived,
        species=species,
        value=value - a + b + derived.total(),
        offsets=offsets,
        datum=target_datum,
        verdict=_verdict(target_datum, temperature if target_datum.temperature == SAME_T else None),
        warnings=derived.warnings() + _pressure_note(source_datum) + _pressure_note(target_datum),
        stamp=stamp,
        state="",
        given=f"{given} on {source_datum.name}",
    )


def _cancel(plus: list[Member], minus: list[Member]) -> tuple[list[Member], list[Member]]:
    """Members that stand alike on both sides drop out, as on two names of one zero."""
    rest = list(minus)
    kept = []
    for member in plus:
        if member in rest:
            rest.remove(member)
        else:
            kept.append(member)
    return kept, rest


def _answer(
    derived: Derivation,
    *,
    species: Species,
    value: float,
    offsets: Sequence[tuple[str, float, str]],
    datum: Datum,
    verdict: MaySum,
    warnings: Sequence[str],
    stamp: str,
    state: str,
    given: str = "",
) -> Answer:
    standard, note = derived.uncertainty()
    per = derived.per
    extra = tuple(Step(what, species.name, "", "", v / per, "", "", note=n) for what, v, n in offsets)
    fields: dict[str, Any] = {
        "value": value / per,
        "unit": derived.unit.text,
        "si": value,
        "uncertainty": None if standard is None else standard / per,
        "uncertainty_note": note,
        "datum": datum.name,
        "may_sum": verdict,
        "steps": extra + derived.steps() if given else derived.steps() + extra,
        "closures": derived.closures(),
        "parts": derived.parts,
        "warnings": tuple(dict.fromkeys(warnings)),
        "store": stamp,
        "sources": derived.sources(),
        "crosscheck": derived.crosschecks(),
    }
    return Answer(
        **fields,
        species=species.name,
        formula=species.display_formula,
        state=state,
        molar_mass=species.molar_mass,
        given=given,
    )
