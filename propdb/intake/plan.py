"""What a file of the user's comes to: what would be taken, what is skipped and why, what cannot be taken."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from datetime import UTC, datetime
from functools import cached_property
from math import isclose
from operator import attrgetter
from typing import Any

from propdb._version import __version__
from propdb.errors import Ambiguous, InvalidInput, NotFound, PropdbError
from propdb.model.records import Carrier, Datum, Entry, Source, Species
from propdb.store.content import canonical, entry_id
from propdb.store.read import Reader
from propdb.store.search import resolve

__all__ = [
    "Candidate",
    "Known",
    "Plan",
    "Refused",
    "Report",
    "Skipped",
    "as_invalid",
    "carried",
    "control_character",
    "own_carrier",
    "settle",
    "summary",
    "this_year",
    "whole",
]

#: Characters that turn the direction of a text: what is shown would not be what is stored.
_TURNING = frozenset("\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069")


@dataclass(frozen=True, slots=True)
class Candidate:
    """An entry that may be taken, with its id, and where in the file it stands."""

    place: str
    entry: Entry
    species: Species
    carrier: Carrier


@dataclass(frozen=True, slots=True)
class Skipped:
    """Something that is left out on purpose, and why."""

    place: str
    what: str
    why: str


@dataclass(frozen=True, slots=True)
class Refused:
    """Something that is wrong: nothing of its file is taken until it is put right."""

    place: str
    column: str
    problem: str
    hint: str


@dataclass(slots=True)
class Plan:
    """What a file holds. ``species`` and ``sources`` are those that the store lacks."""

    file: str
    kind: str
    candidates: list[Candidate] = field(default_factory=list)
    species: dict[str, Species] = field(default_factory=dict)
    sources: dict[str, Source] = field(default_factory=dict)
    skipped: list[Skipped] = field(default_factory=list)
    remarks: list[tuple[str, str]] = field(default_factory=list)
    problems: list[PropdbError] = field(default_factory=list)


@dataclass(frozen=True, slots=True)
class Report:
    """What was taken, skipped and refused; in a dry run, what would be.

    Attributes
    ----------
    file, kind : str
        Name of the file; ``csv``, ``toml``, ``thermoml`` or ``values``.
    dry_run : bool
    who : str
        Author of the drafts; "" in a dry run.
    taken : tuple of (place, Entry)
    skipped, refused : tuples
        ``refused`` is empty unless this is a dry run: otherwise the first of them is raised.
    remarks : tuple of (place, text)
        What was taken as it stands and may not be meant.
    species, sources : tuples of str
        Names and keys that are new to the store.
    """

    file: str
    kind: str
    dry_run: bool
    who: str
    taken: tuple[tuple[str, Entry], ...]
    skipped: tuple[Skipped, ...]
    refused: tuple[Refused, ...]
    remarks: tuple[tuple[str, str], ...]
    species: tuple[str, ...]
    sources: tuple[str, ...]


class Known:
    """What the store holds already."""

    def __init__(self, reader: Reader, datums: Mapping[str, Datum]) -> None:
        self.reader = reader
        self.datums = datums

    def species(self, text: str) -> Species | None:
        """The species that ``text`` is exactly, None where there is none. Raises Ambiguous."""
        try:
            return resolve(self.reader, text)
        except Ambiguous:
            raise
        except NotFound:
            return None

    def source(self, key: str) -> Source | None:
        """The source with this key, None where there is none."""
        return self.sources.get(key)

    @cached_property
    def sources(self) -> dict[str, Source]:
        """Every source by key."""
        return {source.key: source for source in self.reader.sources()}


def this_year() -> int:
    """The year it is now (UTC)."""
    return datetime.now(UTC).year


def control_character(text: str) -> str:
    """The first character of a text that must not stand in a store, as it would be typed in Python; "" if none does."""
    for char in text:
        code = ord(char)
        if code < 32 or 127 <= code < 160 or 0xD800 <= code < 0xE000 or char in _TURNING:
            return ascii(char)[1:-1]
    return ""


def as_invalid(error: PropdbError) -> PropdbError:
    """A complaint about a row of the seed, as one about what a user typed."""
    if isinstance(error, InvalidInput):
        return error
    return InvalidInput(error.problem, hint=error.hint, where=error.where, **error.fields)


def carried(entry: Entry, package: str, version: str, how: str) -> tuple[Entry, Carrier]:
    """An entry whose carriers say how it came here: the last of them apart, as the store takes it."""
    carriers = tuple(replace(one, package=package, version=version, how=how) for one in entry.carriers)
    return replace(entry, status="draft", carriers=carriers[:-1]), carriers[-1]


def own_carrier(entry: Entry, how: str) -> tuple[Entry, Carrier]:
    """:func:`carried`, for a row of a template."""
    return carried(entry, "own", __version__, how)


def whole(one: Candidate) -> Entry:
    """The entry of a candidate with all its carriers."""
    return replace(one.entry, carriers=(*one.entry.carriers, one.carrier))


def settle(plan: Plan, known: Known) -> Plan:
    """Set the ids, and skip what is in the store already or stands twice in the file."""
    held: dict[tuple[Any, ...], list[Entry]] = {}
    seen: set[str] = set()
    kept: list[Candidate] = []
    for one in plan.candidates:
        entry = replace(one.entry, id=entry_id(one.entry, one.species))
        if entry.species not in seen:
            seen.add(entry.species)
            if entry.species not in plan.species:
                for other in known.reader.entries(entry.species):
                    held.setdefault(_key(other), []).append(other)
        twins = held.setdefault(_key(entry), [])
        twin = next((other for other in twins if other.status != "withdrawn" and _alike(other, entry)), None)
        if twin is None:  # what was withdrawn may be added anew, and is a draft again
            twins.append(entry)
            kept.append(replace(one, entry=entry))
            continue
        told = "is this value already" if twin.id == entry.id else "is this value from this source already"
        what = f"{entry.quantity} of {entry.species} ({entry.phase})"
        plan.skipped.append(Skipped(one.place, what, f"entry {twin.id} ({twin.status}) {told}"))
    plan.candidates = kept
    return plan


_key = attrgetter(
    "species", "quantity", "phase", "form", "to", "equation", "temperature", "tmin", "tmax", "uncertainty_unit",
    "uncertainty_kind", "datum", "conditions", "source",
)  # fmt: skip


def _alike(a: Entry, b: Entry) -> bool:
    """Of two entries with one key: the same value, perhaps written or located in another way."""
    numbers = ((a.value, b.value), (a.uncertainty, b.uncertainty))
    if not all(x == y or (x is not None and y is not None and isclose(x, y, rel_tol=1e-12)) for x, y in numbers):
        return False
    return canonical(a.params) == canonical(b.params)


def summary(problems: Iterable[PropdbError], file: str) -> PropdbError:
    """The first of several complaints, which says how many more there are."""
    first, *more = problems
    if more:
        first.hint = "; ".join(
            filter(None, (first.hint, f"{len(more)} more in {file}: `propdb import --dry-run` lists them"))
        )
    first.fields["problems"] = [str(one) for one in (first, *more)]
    return first
