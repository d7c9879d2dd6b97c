"""What a base is made of, and the hashes that identify entries and content."""

from __future__ import annotations

import json
import math
import unicodedata
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from fractions import Fraction
from hashlib import sha256
from itertools import islice
from operator import attrgetter
from typing import Any

from propdb.errors import InvalidInput, NotFound
from propdb.model.records import KIND_TO_STANDARD, PHASES, QUANTITIES, STATUSES, Carrier, Entry, Source, Species

__all__ = [
    "Content",
    "Member",
    "canonical",
    "canonical_lines",
    "content_hash",
    "entry_id",
    "identity",
    "validate_entry",
    "with_id",
]

_ID_LENGTH = 20
_NUMBERS = ("temperature", "value", "tmin", "tmax", "uncertainty")
#: The fields of an entry that its id hashes (with the identity of its species), in this order: all but status, note,
#: printed and carriers.
HASHED = (
    "quantity",
    "phase",
    "form",
    "to",
    "equation",
    "temperature",
    "value",
    "unit",
    "carried",
    "carried_unit",
    "params",
    "tmin",
    "tmax",
    "uncertainty",
    "uncertainty_unit",
    "uncertainty_kind",
    "datum",
    "conditions",
    "source",
    "locator",
)
_fields = attrgetter(*HASHED)
_AT_PARAMS = HASHED.index("params")
_AT_NUMBERS = tuple(map(HASHED.index, _NUMBERS))


@dataclass(frozen=True, slots=True)
class Content:
    """Everything that one base holds.

    Parameters
    ----------
    species, sources : sequences of records
    datums : mapping
        Datum name to its definition, as TOML or JSON could hold it.
    policy : mapping
        Key to value (source ranks, class defaults ...), as JSON could hold it.
    entries : sequence of Entry
        Their ``id`` from :func:`entry_id`; their ``status`` and ``note`` are the base's, unless given below. One entry
        listed twice is one entry with the carriers of both and the worse status.
    carriers : mapping, optional
        Entry id to carriers, beyond those in the entries themselves.
    statuses, notes : mappings, optional
        Entry id to base status and note, over those in the entries.
    """

    species: Sequence[Species] = ()
    sources: Sequence[Source] = ()
    datums: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)
    policy: Mapping[str, Any] = field(default_factory=dict)
    entries: Sequence[Entry] = ()
    carriers: Mapping[str, Sequence[Carrier]] = field(default_factory=dict)
    statuses: Mapping[str, str] = field(default_factory=dict)
    notes: Mapping[str, str] = field(default_factory=dict)


@dataclass(slots=True)
class Member:
    """An entry as a base holds it."""

    entry: Entry
    status: str
    note: str
    printed: bool
    carriers: tuple[Carrier, ...]
    row: tuple[Any, ...] = ()  # the hashed fields, once they have been validated


def members(content: Content) -> dict[str, Member]:
    """The entries of a base by id, each once."""
    found: dict[str, Member] = {}
    for entry in content.entries:
        status = content.statuses.get(entry.id, entry.status)
        note = content.notes.get(entry.id, entry.note)
        extra = content.carriers.get(entry.id, ())
        member = found.get(entry.id)
        if member is None:
            found[entry.id] = Member(entry, status, note, entry.printed, (*entry.carriers, *extra))
            continue
        member.status = max(member.status, status, key=STATUSES.index)
        member.printed = member.printed or entry.printed
        member.carriers = (*member.carriers, *entry.carriers, *extra)
        if note != member.note:
            member.note = "; ".join(sorted({*member.note.split("; "), *note.split("; ")} - {""}))
    return found


def _plain(value: object) -> Any:
    if isinstance(value, Mapping):
        return dict(value)
    if isinstance(value, Fraction):
        return str(value)
    if isinstance(value, (set, frozenset)):
        return sorted(value)
    if hasattr(value, "isoformat"):  # dates of TOML
        return value.isoformat()
    raise TypeError(f"{type(value).__name__} cannot be stored as JSON")


_ENCODER = json.JSONEncoder(
    sort_keys=True, separators=(",", ":"), allow_nan=False, check_circular=False, default=_plain
)


def _encoder(comma: str) -> Callable[[object], str]:
    """``_ENCODER.encode``, without making the compiled encoder anew at each call: that takes longer than a row.

    Where the json module has no such thing, or another than expected, ``_ENCODER.encode`` itself.
    """
    try:
        chunks = json.encoder.c_make_encoder(  # type: ignore[attr-defined]
            None, _plain, json.encoder.encode_basestring_ascii, None, ":", comma, True, False, False
        )
        sample = ["\u00e9\n", None, True, -0.5, 1, {"b": [], "a": {"": 1e-20}}, Fraction(1, 3)]
        if "".join(chunks(sample, 0)).replace(comma, ",") != _ENCODER.encode(sample):
            return _ENCODER.encode
    except (AttributeError, TypeError):
        return _ENCODER.encode
    join = "".join
    return lambda value: join(chunks(value, 0))


_encode = _encoder(",")
_quoted = json.encoder.encode_basestring_ascii
#: No text in JSON holds a line end as such, so that it shows where one value ends.
_encode_many = _encoder(",\n")
_BLOCK = 4096


def canonical(value: object) -> str:
    """One text for one value: JSON, keys sorted, floats by ``repr``, ASCII.

    Raises
    ------
    InvalidInput
        NaN, an infinite number, or something that JSON cannot hold.
    """
    try:
        return _encode(value)
    except (TypeError, ValueError, RecursionError) as error:
        raise InvalidInput(
            f"cannot be stored as JSON: {error}", hint="use texts, finite numbers, lists and tables"
        ) from error


def canonical_lines(rows: Iterable[Sequence[object]]) -> Iterator[str]:
    """:func:`canonical` of each of many rows; together they take half the time.

    Raises
    ------
    InvalidInput
        As :func:`canonical`.
    """
    todo = iter(rows)
    while block := list(islice(todo, _BLOCK)):
        try:
            text = _encode_many(block)
        except (TypeError, ValueError, RecursionError):
            yield from map(canonical, block)  # says it in words
            continue
        lines = text[1:-1].replace("],\n[", "]\n[").replace(",\n", ",").split("\n")
        yield from lines if len(lines) == len(block) else map(canonical, block)  # lists within a row


def identity(species: Species) -> str:
    """What makes a species this one: CAS RN, else InChIKey, else name; with formula and charge."""
    return mark_of(species.cas or species.inchikey or species.name, species.formula, species.charge)


def mark_of(number: str, formula: str, charge: int) -> str:
    """:func:`identity` from its parts: CAS RN, else InChIKey, else name; formula without charge; charge."""
    if type(charge) is int:  # as canonical, which takes longer
        return f"[{_quoted(number)},{_quoted(formula)},{charge}]"
    return canonical([number, formula, charge])


def hashed_row(entry: Entry) -> tuple[Any, ...]:
    """The hashed fields of an entry as they are stored: numbers as floats, params as canonical JSON."""
    row = list(_fields(entry))
    row[_AT_PARAMS] = canonical(row[_AT_PARAMS]) if row[_AT_PARAMS] else "{}"
    for at in _AT_NUMBERS:
        if row[at] is not None:
            row[at] = float(row[at]) + 0.0  # SQLite keeps neither an int nor the sign of zero in a REAL column
    return tuple(row)


def row_id(species_identity: str, row: Iterable[Any]) -> str:
    """The id of an entry, from the identity of its species and its hashed fields."""
    return sha256(canonical([species_identity, *row]).encode()).hexdigest()[:_ID_LENGTH]


def entry_id(entry: Entry, species: Species) -> str:
    """The id of an entry: 20 hex digits of a SHA-256 over what makes it this entry.

    Species identity; quantity, phase, form; equation and params; temperature and range [K]; the number as carried with
    its unit and as SI; uncertainty with unit and kind; datum, conditions, source, locator. Not: ``id``, ``status``,
    ``note``, ``printed``, ``carriers``.
    """
    return row_id(identity(species), hashed_row(entry))


def with_id(entry: Entry, species: Species) -> Entry:
    """The entry with its id and the name of its species set."""
    return replace(entry, id=entry_id(entry, species), species=species.name)


def species_body(species: Species) -> dict[str, Any]:
    """A species as plain values."""
    return {
        "name": species.name,
        "formula": species.formula,
        "charge": species.charge,
        "composition": [[element, str(count)] for element, count in species.composition],
        "molar_mass": float(species.molar_mass),
        "cas": species.cas,
        "inchikey": species.inchikey,
        "synonyms": list(species.synonyms),
        "vapour": species.vapour,
        "kind": species.kind,
        "note": species.note,
    }


def source_body(source: Source) -> dict[str, Any]:
    """A source as plain values."""
    return {
        "key": source.key,
        "title": source.title,
        "authors": list(source.authors),
        "year": source.year,
        "kind": source.kind,
        "class": source.cls,
        "terms": source.terms,
        "fields": dict(source.fields),
        "carrier": source.carrier,
        "standard_pressure": float(source.standard_pressure),
        "note": source.note,
        "lineage": [list(pair) for pair in source.lineage],
    }


def parts_hash(
    species: Iterable[str],
    sources: Iterable[str],
    datums: Iterable[tuple[str, str]],
    policy: Iterable[tuple[str, str]],
    entries: Iterable[tuple[str, str, str, bool]],
) -> str:
    """SHA-256 over the canonical texts of the parts, each sorted. The entries as (id, status, note, printed)."""
    digest = sha256(b"propdb content 1\n")
    for title, part in (
        ("species", species),
        ("sources", sources),
        ("datums", map(canonical, datums)),
        ("policy", map(canonical, policy)),
        ("entries", canonical_lines((entry, status, note, bool(printed)) for entry, status, note, printed in entries)),
    ):
        digest.update(f"{title}\n".encode())
        digest.update(joined(part))
    return digest.hexdigest()


def joined(lines: Iterable[str]) -> bytes:
    """Lines in their order, each with its end."""
    return "\n".join([*sorted(lines), ""]).encode()


def content_hash(content: Content) -> str:
    """SHA-256 of species, sources, datums, policy and base entries with their base status; whatever their order.

    An entry goes in by its id, which hashes its fields. Carriers, own data and the log stay out.
    """
    return hash_of(content, members(content))


def hash_of(content: Content, held: Mapping[str, Member]) -> str:
    """:func:`content_hash`, for a content whose members are known."""
    return parts_hash(
        (canonical(species_body(s)) for s in content.species),
        (canonical(source_body(s)) for s in content.sources),
        ((name, canonical(body)) for name, body in content.datums.items()),
        ((key, canonical(value)) for key, value in content.policy.items()),
        ((m.entry.id, m.status, m.note, m.printed) for m in held.values()),
    )


def _bad(problem: str, where: str, hint: str = "") -> InvalidInput:
    return InvalidInput(problem, where=where, hint=hint)


def _storable(text: str, what: str, where: str) -> None:
    """Refuse what SQLite cannot hold, and control characters in what people must type."""
    if text.isprintable():
        return
    if any(unicodedata.category(char) in ("Cc", "Cs") for char in text):
        raise _bad(f"{what} {text!r} holds a control character", where, "leave it out")


def validate_entry(entry: Entry, species: Species, mark: str = "") -> tuple[Any, ...]:
    """Refuse what the store would refuse, in words; else the hashed fields. ``mark``: identity of the species.

    Raises
    ------
    InvalidInput
        No source, NaN or an infinite number, tmin above tmax, an unknown quantity, phase, status or kind of
        uncertainty, an id that is not that of :func:`entry_id`.
    """
    where = f"entry {entry.species} {entry.quantity} {entry.phase}"
    if not entry.source:
        raise _bad("an entry needs a source", where)
    if entry.quantity not in QUANTITIES:
        raise _bad(f"unknown quantity {entry.quantity!r}", where, f"one of {' '.join(QUANTITIES)}")
    if entry.phase not in PHASES:
        raise _bad(f"unknown phase {entry.phase!r}", where, f"one of {' '.join(PHASES)}")
    if entry.status not in STATUSES:
        raise _bad(f"unknown status {entry.status!r}", where, f"one of {' '.join(STATUSES)}")
    if entry.uncertainty_kind not in KIND_TO_STANDARD:
        raise _bad(
            f"unknown kind of uncertainty {entry.uncertainty_kind!r}", where, f"one of {' '.join(KIND_TO_STANDARD)}"
        )
    for name in _NUMBERS:
        number = getattr(entry, name)
        if number is not None and not math.isfinite(number):
            raise _bad(f"{name} is {number}", where, "a finite number")
    if entry.tmin is not None and entry.tmax is not None and entry.tmin > entry.tmax:
        raise _bad(f"tmin {entry.tmin:g} K is above tmax {entry.tmax:g} K", where)
    if entry.value is None and not entry.equation:
        raise _bad("a constant needs its value", where)
    if entry.uncertainty is not None and entry.uncertainty < 0:
        raise _bad(f"the uncertainty {entry.uncertainty:g} is negative", where)
    if entry.species != species.name:
        raise _bad(f"the entry is of {entry.species!r}, not of {species.name!r}", where)
    row = hashed_row(entry)
    if entry.id != row_id(mark or identity(species), row):
        raise _bad(f"the id {entry.id!r} is not that of its fields", where, "set it with propdb.store.content.with_id")
    return row


def validate(content: Content) -> dict[str, Member]:
    """Check a content as a whole before anything is written; its entries by id.

    Raises
    ------
    InvalidInput
        As :func:`validate_entry`; two species with one name or identity, two sources with one key, an unknown status.
    NotFound
        An entry whose species or source the content lacks.
    """
    by_name: dict[str, Species] = {}
    by_identity: dict[str, str] = {}
    for species in content.species:
        where = f"species {species.name!r}"
        for text in (species.name, species.formula, species.cas, species.inchikey, *species.synonyms):
            _storable(text, "the name", where)
        if species.name in by_name:
            raise _bad("the name is given to two species", where)
        mark = identity(species)
        if mark in by_identity:
            raise _bad(f"the same species as {by_identity[mark]!r}: CAS RN, formula and charge are alike", where)
        by_name[species.name], by_identity[mark] = species, species.name
    marks = {name: mark for mark, name in by_identity.items()}
    keys: set[str] = set()
    for source in content.sources:
        _storable(source.key, "the key", f"source {source.key!r}")
        if source.key in keys:
            raise _bad("the key is given to two sources", f"source {source.key!r}")
        keys.add(source.key)
    for number, status in content.statuses.items():
        if status not in STATUSES:
            raise _bad(f"unknown status {status!r}", f"entry {number}", f"one of {' '.join(STATUSES)}")
    rows: dict[str, tuple[Any, ...]] = {}
    for entry in content.entries:
        if entry.species not in by_name:
            raise NotFound(f"the base holds no species {entry.species!r}", where=f"entry {entry.id}")
        if entry.source not in keys and entry.source:
            raise NotFound(f"the base holds no source {entry.source!r}", where=f"entry {entry.id}")
        rows[entry.id] = validate_entry(entry, by_name[entry.species], marks[entry.species])
    held = members(content)
    for number, member in held.items():
        member.row = rows[number]
    return held
