"""Formation enthalpies of the Thermodynamics Research Center's gas tables, whose column does not state its temperature.

Two things speak for each row. The constant of integration I of its own heat capacity says from where the table counts
H(T): from 0 K, so that H(298.15 K) is an increment of molecular size, or from 298.15 K, so that H(298.15 K) is nearly
0. And other sources' enthalpies of formation at 298.15 K agree with the number as it stands, or with the number brought
from 0 K to 298.15 K by that increment and those of the elements, or with neither. A source that copies this one, or an
estimate that equals it, may testify to the datum; it says nothing about the value.

A row is decided where another source confirms what the constant says: one of its own within 4 kJ/mol or, where none of
those can tell, one that equals it. Whatever is not decided stays datum-unknown.
"""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Collection, Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Final

from propdb.cp import Equation
from propdb.cp.registry import build_heat_capacity
from propdb.cp.trc import TrcGas
from propdb.datum.hypotheses import Facts, elements_increment, to_298
from propdb.datum.reading import read_body
from propdb.datum.zeros import reference_form
from propdb.errors import DatumError, EquationError
from propdb.intake.trc_rules import (
    ALONE,
    AT_0,
    AT_298,
    NEITHER,
    UNKNOWN,
    Heard,
    Witness,
    counted_from,
    decide,
    hear,
)
from propdb.model.records import T_STANDARD, USABLE_STATUSES, Entry, Species
from propdb.store.content import Content, with_id

__all__ = [
    "ALONE",
    "AT_0",
    "AT_298",
    "NEITHER",
    "UNKNOWN",
    "Decision",
    "Heard",
    "Resolution",
    "Witness",
    "counted_from",
    "decide",
    "element_increments",
    "hear",
    "resolve",
    "undecided",
]

SOURCE: Final = "trc-1994"
#: Datums on which a neutral gas has one enthalpy, whatever they say of pressure and electrons.
_SAME: Final = ("elements-298K", "elements-298K-1atm", "elements-298K-electron-stationary")
_PREFERRED: Final = ("codata-1989", "nasa-tp-2002-211556", "chase-1998")


@dataclass(frozen=True, slots=True)
class Decision:
    """What was decided of one row, and why.

    verdict
        ``0 K``, ``298.15 K``, ``neither`` (the number contradicts other sources on both readings) or ``unknown``.
    counted
        From where the row's H(T) counts by its constant of integration: ``0 K``, ``298.15 K`` or "".
    shift
        Enthalpy of formation at 298.15 K less that at 0 K [J/mol], None where an increment is not known.
    heard
        What each witness said.
    alone
        The constant says ``counted`` and no other source confirms or denies it: the verdict is ``unknown``, unless such
        rows were to be decided too.
    """

    entry: Entry
    verdict: str
    reason: str
    counted: str = ""
    increment: float | None = None
    shift: float | None = None
    heard: tuple[Heard, ...] = ()
    alone: bool = False

    @property
    def at_298(self) -> float | None:
        """The row's enthalpy of formation at 298.15 K as decided [J/mol]; None where it is not."""
        value = self.entry.value
        if value is None or (self.verdict == AT_0 and self.shift is None):
            return None
        if self.verdict == AT_0:
            return value + (self.shift or 0.0)
        return value if self.verdict == AT_298 else None


@dataclass(frozen=True, slots=True)
class Resolution:
    """The content with what was decided, and the decision on each row."""

    content: Content
    decisions: tuple[Decision, ...]

    def line(self) -> str:
        """One line for a report."""
        count = Counter(decision.verdict for decision in self.decisions)
        return (
            f"{len(self.decisions)} formation enthalpies without a temperature, {count[AT_0]} are at "
            f"0 K, {count[AT_298]} at 298.15 K, {count[NEITHER]} fit neither, {count[UNKNOWN]} stay unknown "
            f"({sum(decision.alone for decision in self.decisions)} of them because no other source tells)"
        )


def element_increments(content: Content) -> dict[str, float]:
    """H(298.15 K) - H(0 K) of each element in its reference form, per atom [J/mol], from the entries of a content.

    CODATA Key Values first. An element without an entry is left out.
    """
    try:
        datum = read_body("elements-same-T", content.datums["elements-same-T"])
    except (KeyError, DatumError):
        return {}
    atoms = {species.name: dict(species.composition) for species in content.species}
    found: dict[tuple[str, str, str], dict[str, float]] = defaultdict(dict)
    for entry in content.entries:
        if entry.quantity == "dH0" and entry.value is not None and entry.source in _PREFERRED:
            found[entry.species, entry.phase, entry.form].setdefault(entry.source, entry.value)
    increments: dict[str, float] = {}
    for element in datum.schedule:
        form = reference_form(datum.schedule, element, datum=datum, temperature=T_STANDARD)
        count = atoms.get(form.species, {}).get(element)
        by_source = found.get((form.species, form.phase, form.form), {})
        source = next((key for key in _PREFERRED if key in by_source), None)
        if count and source is not None:
            increments[element] = by_source[source] / float(count)
    return increments


def resolve(
    content: Content,
    *,
    withheld: Collection[str] = (),
    alone: bool = False,
    built: Mapping[str, Equation] | None = None,
) -> Resolution:
    """Decide every formation enthalpy of the source that came in as datum-unknown.

    Parameters
    ----------
    content : Content
        With the entries of the other sources, which testify.
    withheld : collection of str
        Keys of sources that are not heard: to measure how often the others decide right.
    alone : bool
        Decide also where the constant of integration stands alone.
    built : mapping, optional
        Entry id to heat capacity, where it has been made.

    Returns
    -------
    Resolution
        Decided entries have their temperature and datum, a note that says why, status ``base``, and a new id; the
        others are as they were but for their note. H(298.15 K) - H(0 K) of each equation that counts from 0 K is added.
    """
    increments = element_increments(content)
    by_name = {species.name: species for species in content.species}
    ours = [entry for entry in content.entries if entry.source == SOURCE]
    waiting = [e for e in ours if e.quantity == "Hf" and e.status == "datum-unknown" and e.value is not None]
    curves = {(e.species, e.locator): e for e in ours if e.quantity == "Cp" and e.equation == TrcGas.name}
    above = {key: found for key, entry in curves.items() if (found := _increment(entry, built or {})) is not None}
    witnesses = _witnesses(content.entries, {entry.species for entry in waiting}, withheld)
    decisions: list[Decision] = []
    changed: dict[str, Entry] = {}
    for entry in waiting:
        species = by_name[entry.species]
        decision = _decision(entry, species, above.get((entry.species, entry.locator)), increments, witnesses, alone)
        decisions.append(decision)
        changed[entry.id] = _resolved(decision, species)
    added = [
        with_id(_increment_entry(curves[key], increment), by_name[key[0]])
        for key, increment in above.items()
        if counted_from(increment) == AT_0
    ]
    entries = [changed.get(entry.id, entry) for entry in content.entries]
    return Resolution(replace(content, entries=[*entries, *added]), tuple(decisions))


def undecided(content: Content) -> Content:
    """The content as it was before :func:`resolve` but for conditions and notes, to decide again by other witnesses."""
    by_name = {species.name: species for species in content.species}
    entries: list[Entry] = []
    for entry in content.entries:
        if entry.source != SOURCE or entry.quantity not in ("Hf", "dH0"):
            entries.append(entry)
        elif entry.quantity == "Hf":
            waiting = replace(entry, temperature=None, datum="", status="datum-unknown", note="")
            entries.append(with_id(waiting, by_name[entry.species]))
    return replace(content, entries=entries)


def _increment(curve: Entry, built: Mapping[str, Equation]) -> float | None:
    try:
        equation = built.get(curve.id) or build_heat_capacity(curve.equation, curve.params)
    except EquationError:
        return None
    return equation.increment if isinstance(equation, TrcGas) else None


def _decision(
    entry: Entry,
    species: Species,
    increment: float | None,
    increments: Mapping[str, float],
    witnesses: Mapping[str, Sequence[Witness]],
    alone: bool,
) -> Decision:
    facts = Facts(dict(species.composition), species.charge, increment=increment, element_increment=increments.get)
    value = entry.value if entry.value is not None else 0.0
    verdict, reason, heard = decide(
        value, increment=increment, elements=elements_increment(facts), witnesses=witnesses.get(entry.species, ())
    )
    counted = counted_from(increment)
    shift = to_298(facts) if counted == AT_0 else None
    stands_alone = verdict == ALONE
    if stands_alone:
        verdict = counted if alone else UNKNOWN
    return Decision(entry, verdict, reason, counted, increment, shift, heard, stands_alone)


def _resolved(decision: Decision, species: Species) -> Entry:
    entry = decision.entry
    if decision.verdict == AT_0:
        new = replace(entry, temperature=0.0, datum="elements-0K", conditions="", status="base")
    elif decision.verdict == AT_298:
        new = replace(entry, temperature=T_STANDARD, datum="elements-298K", conditions="", status="base")
    else:
        return replace(entry, note="; ".join(filter(None, (entry.note, f"{decision.verdict}: {decision.reason}"))))
    note = f"the file states no temperature; {decision.verdict}: {decision.reason}"
    return with_id(replace(new, note="; ".join(filter(None, (entry.note, note)))), species)


def _increment_entry(curve: Entry, increment: float) -> Entry:
    return replace(
        curve,
        quantity="dH0",
        equation="",
        params={},
        temperature=T_STANDARD,
        value=increment,
        unit="J/mol",
        carried=f"{increment:.6g}",
        carried_unit="J/mol",
        tmin=None,
        tmax=None,
        uncertainty=None,
        uncertainty_unit="",
        uncertainty_kind="",
        note="computed from the heat capacity and its constant of integration I, which counts from 0 K",
    )


def _witnesses(
    entries: Iterable[Entry], wanted: Collection[str], withheld: Collection[str]
) -> dict[str, tuple[Witness, ...]]:
    """Enthalpies of formation of gases at 298.15 K: as stated, and of a condensed phase with its latent heat."""
    stated: dict[str, dict[str, Witness]] = defaultdict(dict)
    condensed: dict[tuple[str, str], Entry] = {}
    latent: dict[tuple[str, str], Entry] = {}
    for entry in entries:
        if (
            entry.species not in wanted
            or entry.value is None
            or entry.temperature != T_STANDARD
            or entry.source in withheld
            or entry.source == SOURCE
            or entry.status not in USABLE_STATUSES
        ):
            continue
        if entry.quantity == "Hf" and entry.datum in _SAME:
            if entry.phase == "g":
                witness = Witness(entry.source, entry.value, entry.status == "estimate")
                stated[entry.species].setdefault(entry.source, witness)
            elif entry.phase in ("l", "cr"):
                condensed.setdefault((entry.species, entry.phase), entry)
        elif entry.quantity in ("Hvap", "Hsub") and entry.status != "estimate":
            latent.setdefault((entry.species, "l" if entry.quantity == "Hvap" else "cr"), entry)
    for (species, phase), entry in condensed.items():
        heat = latent.get((species, phase))
        if heat is not None and entry.value is not None and heat.value is not None:
            source = f"{entry.source}+{heat.source}"
            stated[species].setdefault(source, Witness(source, entry.value + heat.value, entry.status == "estimate"))
    return {species: tuple(found.values()) for species, found in stated.items()}
