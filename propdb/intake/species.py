"""``species.csv``: the central file and those of the folders, merged by name into one list of species."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from fractions import Fraction

from propdb.errors import FormulaError
from propdb.intake.identifiers import identifiers as known_identifiers
from propdb.intake.rows import Row, Table
from propdb.model.formula import check_cas, hill, is_inchikey, molar_mass, parse_formula
from propdb.model.records import Species

__all__ = ["COLUMNS", "OPTIONAL", "contradiction", "merge_species"]

COLUMNS = ("name", "formula", "charge", "cas", "inchikey", "synonyms", "note")
OPTIONAL = ("kind", "vapour", "molar_mass")

Counts = Mapping[str, int | Fraction]

#: A decimal count long enough to be a fraction written out; the reader of formulas takes a point for a hydrate's dot.
_REPEATING = re.compile(r"(?<=[A-Za-z)])[0-9]+\.[0-9]{5,}")


@dataclass(slots=True)
class _Draft:
    """What the rows of one name have said so far, and where each said it first."""

    counts: Counts
    charge: int
    first: Row
    cells: dict[str, str] = field(default_factory=dict)
    places: dict[str, Row] = field(default_factory=dict)
    synonyms: list[str] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)


def merge_species(
    tables: Iterable[Table], *, weights: Mapping[str, float], identifiers: bool = True
) -> dict[str, Species]:
    """The species of all files, by name.

    Rows of one name are one species: blank cells are filled by the others, synonyms and notes are collected.

    Parameters
    ----------
    tables : iterable of Table
    weights : mapping
        Atomic weights [g/mol].
    identifiers : bool
        Compare formulas with those that the ``chemicals`` library lists under the CAS RN.

    Raises
    ------
    SeedError
        A row that cannot be read, or that contradicts another row or its CAS RN.
    """
    drafts: dict[str, _Draft] = {}
    for table in tables:
        seen: dict[str, Row] = {}
        for row in table:
            name = row.needed("name", "give the trade name in small letters")
            if name in seen:
                raise row.error("name", f"{name!r} stands in row {seen[name].number} already", "one row per species")
            seen[name] = row
            counts, charge = _composition(row)
            draft = drafts.setdefault(name, _Draft(counts, charge, row))
            _agree(draft, name, counts, charge, row)
            _fill(draft, name, row)
    species = {name: _species(name, draft, weights) for name, draft in drafts.items()}
    _distinct(drafts)
    if identifiers:
        for name, draft in drafts.items():
            cas = draft.cells.get("cas", "")
            problem = contradiction(cas, draft.counts, draft.charge) if cas else ""
            if problem:
                raise draft.places["cas"].error("formula", f"{name}: {problem}", "correct the formula or the CAS RN")
    return species


def _composition(row: Row) -> tuple[Counts, int]:
    text = row.needed("charge", "write 0 for a neutral species")
    try:
        charge = int(text)
    except ValueError:
        raise row.error("charge", f"charge {text!r} is not an integer", "write e.g. 0, 1 or -2") from None
    formula = row.text("formula")
    if not formula:
        if charge == -1:
            return {}, charge
        raise row.error("formula", "formula is blank", "only the electron, with charge -1, has none")
    try:
        parsed = parse_formula(_REPEATING.sub(_as_fraction, formula))
    except FormulaError as error:
        raise row.error("formula", error.problem, error.hint) from error
    if parsed.charge:
        raise row.error("formula", f"formula {formula!r} holds a charge", "the charge has a column of its own")
    return parsed.counts, charge


def _as_fraction(found: re.Match[str]) -> str:
    """``5.3333333`` as ``16/3``: a count of thirds that was typed as a decimal number."""
    exact = Fraction(found.group())
    simple = exact.limit_denominator(12)
    return f"{simple.numerator}/{simple.denominator}" if abs(exact - simple) < Fraction(1, 10**6) else found.group()


def _agree(draft: _Draft, name: str, counts: Counts, charge: int, row: Row) -> None:
    if dict(counts) != dict(draft.counts):
        raise row.error(
            "formula",
            f"{name!r} is {hill(counts)} here and {hill(draft.counts)} in {draft.first.where()}",
            "one name, one formula",
        )
    if charge != draft.charge:
        raise row.error(
            "charge",
            f"{name!r} has charge {charge} here and {draft.charge} in {draft.first.where()}",
            "one name, one charge",
        )


def _fill(draft: _Draft, name: str, row: Row) -> None:
    for column in ("cas", "inchikey", "kind", "vapour", "molar_mass"):
        value = _checked(row, column)
        if not value:
            continue
        if draft.cells.setdefault(column, value) != value:
            raise row.error(
                column,
                f"{name!r} has {column} {value} here and {draft.cells[column]} in {draft.places[column].where()}",
                "correct one of them, or leave one blank",
            )
        draft.places.setdefault(column, row)
    for synonym in (part.strip() for part in row.text("synonyms").split(";")):
        if synonym and synonym != name and synonym not in draft.synonyms:
            draft.synonyms.append(synonym)
    note = row.text("note")
    if note and note not in draft.notes:
        draft.notes.append(note)


def _checked(row: Row, column: str) -> str:
    value = row.text(column)
    if not value:
        return ""
    if column == "cas":
        try:
            return check_cas(value)
        except FormulaError as error:
            raise row.error(column, error.problem, error.hint) from error
    if column == "inchikey" and not is_inchikey(value):
        raise row.error(column, f"{value!r} is not an InChIKey", "write e.g. XLYOFNOQVPJJNP-UHFFFAOYSA-N")
    if column == "kind":
        return row.choice(column, ("species", "pseudo"))
    if column == "vapour":
        return row.choice(column, ("associating", "hydrogen-bonding"))
    if column == "molar_mass" and not row.read_number(value, column) > 0:
        raise row.error(column, f"molar mass {value} is not positive", "write it in g/mol")
    return value


def _species(name: str, draft: _Draft, weights: Mapping[str, float]) -> Species:
    if "molar_mass" in draft.cells:
        mass = float(draft.cells["molar_mass"]) / 1000
    elif not draft.counts:
        raise draft.first.error(
            "molar_mass", f"{name} has no atoms to compute its molar mass from", "write it in g/mol"
        )
    else:
        try:
            mass = molar_mass(draft.counts, weights)
        except FormulaError as error:
            raise draft.first.error("formula", f"{name}: {error.problem}", "add it to elements.csv") from error
    return Species(
        name=name,
        formula=hill(draft.counts) if draft.counts else "",
        charge=draft.charge,
        composition=tuple(draft.counts.items()),
        molar_mass=mass,
        cas=draft.cells.get("cas", ""),
        inchikey=draft.cells.get("inchikey", ""),
        synonyms=tuple(draft.synonyms),
        vapour=draft.cells.get("vapour", ""),
        kind=draft.cells.get("kind", "species"),
        note="; ".join(draft.notes),
    )


def _distinct(drafts: Mapping[str, _Draft]) -> None:
    """One CAS RN or InChIKey, one species: two names for it would split its data."""
    for column in ("cas", "inchikey"):
        owner: dict[str, str] = {}
        for name, draft in drafts.items():
            value = draft.cells.get(column, "")
            if not value:
                continue
            if value in owner:
                raise draft.places[column].error(
                    column,
                    f"{value} is given to {name!r} here and to {owner[value]!r} in "
                    f"{drafts[owner[value]].places[column].where()}",
                    "use one name, the other as a synonym",
                )
            owner[value] = name


def contradiction(cas: str, counts: Counts, charge: int) -> str:
    """What the ``chemicals`` library says against a formula under a CAS RN, or "".

    It completes radicals with hydrogen and knows ions by other formulas, so hydrogen is not compared, nor the number of
    atoms of a species of one element (S and S8 share a number). Species with fractional counts are passed.
    """
    known = known_identifiers().get(int(cas.replace("-", "")))
    if known is None or charge or known.charge or any(isinstance(n, Fraction) for n in counts.values()):
        return ""
    listed = {e: n for e, n in parse_formula(known.formula).counts.items() if e not in ("H", "D")}
    stated = {e: n for e, n in counts.items() if e not in ("H", "D")}
    if listed == stated or (len(stated) <= 1 and listed.keys() == stated.keys()):
        return ""
    return f"formula {hill(counts)} contradicts CAS RN {cas}, which is listed for {known.formula} ({known.common_name})"
