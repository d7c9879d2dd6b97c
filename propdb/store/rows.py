"""Records to rows and back."""

# ruff: noqa: S608 - what is put into SQL texts here are constants of this package; every value is bound
from __future__ import annotations

import json
import sqlite3
import unicodedata
from collections.abc import Iterator, Mapping
from fractions import Fraction
from types import MappingProxyType
from typing import Any, Final

from propdb.model.crosscheck import Crosscheck
from propdb.model.records import Carrier, Entry, Source, Species
from propdb.store.content import HASHED, canonical, identity, source_body, species_body

__all__ = [
    "ENTRY_COLUMNS",
    "entry_from",
    "fold",
    "frozen",
    "name_rows",
    "source_row",
    "sources_of",
    "species_of",
    "species_row",
]

_Values = tuple[Any, ...] | Mapping[str, Any]
_GREEK: Final = str.maketrans(
    dict(
        zip(
            "αβγδεζηθικλμνξοπρστυφχψω",
            "alpha beta gamma delta epsilon zeta eta theta iota kappa lambda mu nu xi omicron pi rho sigma tau upsilon"
            " phi chi psi omega".split(),
            strict=True,
        )
    )
)
_DASHES: Final = str.maketrans(
    dict.fromkeys("\u2010\u2011\u2012\u2013\u2014\u2212", "-") | {"\u2032": "'", "\u2019": "'"}
)

SPECIES_COLUMNS: Final = "name, formula, charge, composition, molar_mass, cas, inchikey, synonyms, vapour, kind, note"
SOURCE_COLUMNS: Final = "key, title, authors, year, kind, class, terms, fields, carrier, standard_pressure, note"
#: In the order of :data:`~propdb.store.content.HASHED`, behind the alias ``e``.
ENTRY_COLUMNS: Final = ", ".join(f'e."{name}"' for name in HASHED)


def fold(text: str) -> str:
    """What names are compared by: compatible characters, case, dashes, Greek letters and blanks made alike."""
    if text.isascii():  # nearly all, and nothing below concerns them
        return " ".join(text.lower().split())
    plain = unicodedata.normalize("NFKC", text).casefold().translate(_DASHES).translate(_GREEK)
    return " ".join(plain.split())


def frozen(value: Any) -> Any:
    """Lists to tuples and tables to read-only mappings, all the way down."""
    if isinstance(value, list):
        return tuple(map(frozen, value))
    if isinstance(value, dict):
        return MappingProxyType({key: frozen(inner) for key, inner in value.items()})
    return value


def species_row(species: Species) -> dict[str, Any]:
    """Columns of ``species`` that the record gives."""
    row = species_body(species)
    row["composition"] = canonical(row["composition"])
    row["synonyms"] = canonical(row["synonyms"])
    row["identity"] = identity(species)
    return row


def _count(text: str) -> Fraction | int:
    if text.isdecimal():
        return int(text)
    count = Fraction(text)
    return count.numerator if count.denominator == 1 else count


def species_from(row: tuple[Any, ...]) -> Species:
    """A record from :data:`SPECIES_COLUMNS`."""
    name, formula, charge, composition, mass, cas, inchikey, synonyms, vapour, kind, note = row
    counts = tuple((element, _count(count)) for element, count in json.loads(composition))
    return Species(name, formula, charge, counts, mass, cas, inchikey, tuple(json.loads(synonyms)), vapour, kind, note)


def species_of(conn: sqlite3.Connection, where: str, values: _Values = ()) -> Iterator[tuple[int, Species]]:
    """(row id, record), by name. ``where`` is SQL of this package."""
    for row in conn.execute(f"SELECT id, {SPECIES_COLUMNS} FROM species WHERE {where} ORDER BY name, own DESC", values):
        yield row[0], species_from(row[1:])


def source_row(source: Source) -> dict[str, Any]:
    """Columns of ``source`` that the record gives; ``lineage`` has a table of its own."""
    row = source_body(source)
    del row["lineage"]
    row["authors"] = canonical(row["authors"])
    row["fields"] = canonical(row["fields"])
    return row


def sources_of(conn: sqlite3.Connection, where: str, values: _Values = ()) -> Iterator[Source]:
    """Sources by key, the user's before the base's. ``where`` is SQL of this package."""
    sql = f"SELECT own, {SOURCE_COLUMNS} FROM source WHERE {where} ORDER BY key, own DESC"
    for own, key, title, authors, year, kind, cls, terms, fields, carrier, pressure, note in conn.execute(
        sql, values
    ).fetchall():
        lineage = conn.execute(
            "SELECT copies, evidence FROM lineage WHERE source = ? AND own = ? ORDER BY position", (key, own)
        ).fetchall()
        yield Source(
            key,
            title,
            tuple(json.loads(authors)),
            year,
            kind,
            cls,
            terms,
            MappingProxyType(json.loads(fields)),
            carrier,
            pressure,
            note,
            tuple(lineage),
        )


_AT_PARAMS: Final = HASHED.index("params")
_NO_PARAMS: Final[Mapping[str, Any]] = MappingProxyType({})


def entry_from(
    number: str,
    species: str,
    row: tuple[Any, ...],
    *,
    printed: bool,
    status: str,
    note: str,
    carriers: tuple[Carrier, ...],
    decided: bool = False,
    crosschecks: tuple[Crosscheck, ...] = (),
    params: Mapping[str, Any] | None = None,
) -> Entry:
    """A record from :data:`ENTRY_COLUMNS`; ``params`` where they have been decoded before."""
    if params is None:
        text = row[_AT_PARAMS]
        params = _NO_PARAMS if text == "{}" else frozen(json.loads(text))
    beside = (printed, status, note, carriers, decided, crosschecks)
    return Entry(*(number, species, *row[:_AT_PARAMS], params, *row[_AT_PARAMS + 1 :], *beside))


def carrier_from(row: tuple[Any, ...]) -> Carrier:
    """A record from (package, version, file, row, how)."""
    package, version, file, number, how = row
    return Carrier(package, version, file, None if number < 0 else number, how)


def name_rows(species: Species) -> set[tuple[str, str, str]]:
    """(kind, folded, text) of everything that may be typed for a species."""
    rows = {("name", fold(species.name), species.name)}
    rows.update(("synonym", fold(text), text) for text in species.synonyms)
    if species.formula or species.charge:
        rows.add(("formula", species.display_formula, species.display_formula))
    if species.cas:
        rows.add(("cas", species.cas, species.cas))
    if species.inchikey:
        rows.add(("inchikey", species.inchikey, species.inchikey))
    return {row for row in rows if row[1]}
