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

from propdb.cp.registry import build_heat_capacity
from propdb.cp.trc import TrcGas
from propdb.datum.hypotheses import Facts, elements_increment, to_298
from propdb.datum.reading import read_body
from propdb.datum.zeros import reference_form
from propdb.errors import DatumError, EquationError
from propdb.model.records import R_GAS, T_STANDARD, USABLE_STATUSES, Entry, Species
from propdb.store.content import Content, with_id

__all__ = [
    "Decision",
    "Heard",
    "Resolution",
    "Witness",
    "counted_from",
    "decide",
    "element_increments",
    "hear",
    "resolve",
]

SOURCE: Final = "trc-1994"
AT_0: Final = "0 K"
AT_298: Final = "298.15 K"
NEITHER: Final = "neither"
UNKNOWN: Final = "unknown"
#: What :func:`decide` says where the constant stands alone; the verdict is then ``unknown``.
ALONE: Final = "alone"

#: No gas has less than the translation and p V of its molecules, 5/2 R T; tables are rounded.
_LEAST_INCREMENT: Final = 2.5 * R_GAS * T_STANDARD - 50.0
#: A table that counts from 298.15 K has H(298.15 K) = 0 but for the fit [J/mol].
_FIT: Final = 1000.0
#: Numbers printed to 0.1 kJ/mol, and an increment as exact, agree within this if one was copied from the other [J/mol].
_EQUAL: Final = 150.0
#: Beyond this two sources contradict each other [J/mol]: the 90th percentile of how far sources differ.
_CONTRADICTS: Final = 10_000.0
#: A witness tells two readings apart if the farther is this many times as far, and by this much [J/mol].
_TIMES: Final = 3.0
_APART: Final = 3000.0
_CLOSE: Final = 4000.0

#: Datums on which a neutral gas has one enthalpy, whatever they say of pressure and electrons.
_SAME: Final = ("elements-298K", "elements-298K-1atm", "elements-298K-electron-stationary")
_PREFERRED: Final = ("codata-1989", "nasa-tp-2002-211556", "chase-1998")


@dataclass(frozen=True, slots=True)
class Witness:
    """Another source's enthalpy of formation of the gas at 298.15 K.

    source
        Its key, or two joined by "+" where the value is a sum (liquid and vaporisation).
    value
        [J/mol]
    estimate
        Whether the source estimates it: then it testifies by being equal only.
    """

    source: str
    value: float
    estimate: bool = False


@dataclass(frozen=True, slots=True)
class Heard:
    """What a witness said.

    says
        ``0 K``, ``298.15 K``, ``neither``, or "" where it cannot tell the temperatures apart.
    off
        Its distance from the number at that temperature, or from the nearer of both [J/mol].
    estimate
        As of the witness.
    """

    source: str
    says: str
    off: float
    estimate: bool = False


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
            f"TRC gas tables: {len(self.decisions)} formation enthalpies without a temperature, {count[AT_0]} are at "
            f"0 K, {count[AT_298]} at 298.15 K, {count[NEITHER]} fit neither, {count[UNKNOWN]} stay unknown "
            f"({sum(decision.alone for decision in self.decisions)} of them because no other source tells)"
        )


def counted_from(increment: float | None) -> str:
    """From where a table counts H(T), by its H(298.15 K) [J/mol]: ``0 K``, ``298.15 K``, "" where it does not tell."""
    if increment is None:
        return ""
    if abs(increment) <= _FIT:
        return AT_298
    return AT_0 if increment >= _LEAST_INCREMENT else ""


def hear(value: float, shift: float | None, witness: Witness) -> Heard:
    """What a witness says of a number.

    Parameters
    ----------
    value : float
        The number as it stands [J/mol].
    shift : float or None
        Brings it from 0 K to 298.15 K [J/mol]; None where that is not known.
    """

    def said(says: str, off: float) -> Heard:
        return Heard(witness.source, says, off, witness.estimate)

    off = abs(value - witness.value)
    if shift is None:
        # What it would be from 0 K is not known: agreement as it stands, or contradiction, is all that shows.
        if off <= (_EQUAL if witness.estimate else _CLOSE):
            return said(AT_298, off)
        return said(NEITHER if off > _CONTRADICTS and not witness.estimate else "", off)
    off_0 = abs(value + shift - witness.value)
    near, far = sorted((off_0, off))
    reading = AT_0 if off_0 < off else AT_298
    if near <= _EQUAL < far - near:
        return said(reading, near)
    if witness.estimate:
        return said("", near)
    if near > _CONTRADICTS:
        return said(NEITHER, near)
    return said(reading if far >= _TIMES * near and far - near >= _APART else "", near)


def decide(
    value: float, *, increment: float | None, elements: float | None, witnesses: Sequence[Witness]
) -> tuple[str, str, tuple[Heard, ...]]:
    """Verdict and reason for one number, and what each witness said.

    Parameters
    ----------
    value : float
        The number as it stands [J/mol].
    increment : float or None
        H(298.15 K) of the row's own equation with its constant of integration [J/mol].
    elements : float or None
        Sum of H(298.15 K) - H(0 K) over the elements of the compound [J/mol].
    witnesses : sequence of Witness
    """
    counted = counted_from(increment)
    if not counted:
        if increment is None:
            return UNKNOWN, "the table has no constant of integration", ()
        return UNKNOWN, f"the table's H(298.15 K), {increment:.0f} J/mol, counts neither from 0 K nor from 298.15 K", ()
    shift = None
    if counted == AT_0:
        if elements is None or increment is None:
            return UNKNOWN, "H(298.15 K) - H(0 K) of an element is not known", ()
        shift = increment - elements
    heard = tuple(hear(value, shift, witness) for witness in witnesses)
    other = AT_298 if counted == AT_0 else AT_0
    base = f"its H(T) counts from {counted}"
    voices = Counter(each.says for each in heard if each.says)
    equal = {each.says for each in heard if each.says and each.off <= _EQUAL}
    if voices[other] > voices[counted] or (other in equal and counted not in equal):
        return UNKNOWN, f"{base}, but the number at {other} is that of {_named(heard, other)}", heard
    if any(each.says == counted and (each.off <= _CLOSE and not each.estimate) for each in heard):
        return counted, f"{base}; {_named(heard, counted)} agrees", heard
    # Estimates that equal it are copies: they tell the temperature, but not that the number is right.
    doubted = [each for each in heard if not each.estimate and each.off > _CLOSE]
    if voices[counted] and not doubted:
        return counted, f"{base}; {_named(heard, counted)} is the same", heard
    if doubted and all(each.says == NEITHER for each in doubted):
        return NEITHER, f"{base}, and {_named(heard, NEITHER)} contradicts the number at 0 K and at 298.15 K", heard
    if doubted:
        away = ", ".join(f"{each.source} is {each.off / 1000.0:.1f} kJ/mol away" for each in doubted)
        return UNKNOWN, f"{base}, but {away}", heard
    return ALONE, f"{base}, and no other source tells the temperatures apart", heard


def _named(heard: Iterable[Heard], says: str) -> str:
    return ", ".join(each.source for each in heard if each.says == says)


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


def resolve(content: Content, *, withheld: Collection[str] = (), alone: bool = False) -> Resolution:
    """Decide every formation enthalpy of the source that came in as datum-unknown.

    Parameters
    ----------
    content : Content
        With the entries of the other sources, which testify.
    withheld : collection of str
        Keys of sources that are not heard: to measure how often the others decide right.
    alone : bool
        Decide also where the constant of integration stands alone.

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
    above = {key: found for key, entry in curves.items() if (found := _increment(entry)) is not None}
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


def _increment(curve: Entry) -> float | None:
    try:
        equation = build_heat_capacity(curve.equation, curve.params)
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
