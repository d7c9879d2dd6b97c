"""The rows of a filled template, CSV or TOML, or of values given by a program: cells as text, each with its place."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

from propdb.errors import InvalidInput, SeedError
from propdb.intake.files import UserFile
from propdb.intake.plan import control_character
from propdb.intake.rows import Row, near, parse_csv
from propdb.intake.sources import FIELDS

__all__ = [
    "MAX_ROWS",
    "NEEDED",
    "ROW_COLUMNS",
    "SOURCE_COLUMNS",
    "SPECIES_COLUMNS",
    "Given",
    "Item",
    "Written",
    "place_of",
    "read_values",
    "read_written",
]

#: More rows than that are no longer typed by hand, and one transaction should not hold them.
MAX_ROWS = 20_000
_MAX_TEXT = 2000

NEEDED = ("species", "quantity", "phase", "unit", "source")
ROW_COLUMNS = (
    "species", "quantity", "phase", "form", "to", "temperature", "value", "unit", "uncertainty", "uncertainty_kind",
    "datum", "conditions", "equation", "tmin", "tmax", "exponents", "scales", "coefficients", "source", "locator",
    "note",
)  # fmt: skip
SOURCE_COLUMNS = tuple(
    f"source_{name}"
    for name in ("title", "authors", "year", "kind", "class", *FIELDS, "standard_pressure", "carrier", "terms", "note")
)
SPECIES_COLUMNS = tuple(
    f"species_{name}" for name in ("formula", "charge", "cas", "inchikey", "synonyms", "molar_mass", "vapour", "note")
)
_OPTIONAL = tuple(c for c in (*ROW_COLUMNS, *SOURCE_COLUMNS, *SPECIES_COLUMNS) if c not in NEEDED)
_SOURCE_KEYS = ("key", "lineage", *(column.removeprefix("source_") for column in SOURCE_COLUMNS))
_LISTS = ("exponents", "scales", "coefficients")
_BLANKS = re.compile(r"[\t\r\n]")


@dataclass(frozen=True, slots=True)
class Item(Row):
    """A row that has a label instead of a number: a table of a TOML file, a value given by a program."""

    label: str = ""

    def where(self, column: str = "") -> str:
        """``values.toml, entry 2 (line 14), key unit``."""
        return ", ".join(filter(None, (self.file, self.label, f"key {column}" if column else "")))


@dataclass(frozen=True, slots=True)
class Given:
    """A source or species that a file defines: its values, the row to complain about, what its columns begin with."""

    data: Mapping[str, Any]
    row: Row
    prefix: str = ""


@dataclass(slots=True)
class Written:
    """All that a template says, and what is wrong with its cells."""

    rows: list[Row] = field(default_factory=list)
    sources: dict[str, Given] = field(default_factory=dict)
    species: dict[str, Given] = field(default_factory=dict)
    problems: list[SeedError] = field(default_factory=list)


def place_of(row: Row) -> str:
    """The place of a row within its file: ``row 5``."""
    return row.where()[len(row.file) :].lstrip(", ")


def read_written(file: UserFile) -> Written:
    """The rows of a template file.

    Raises
    ------
    InvalidInput
        It is not CSV or TOML, has an unknown column or key, one twice, or too many rows.
    """
    return _csv(file) if file.kind == "csv" else _toml(file)


def read_values(values: Sequence[Mapping[str, Any]]) -> Written:
    """Values given by a program: one mapping of column to text or number for each."""
    written = Written()
    for number, value in enumerate(values, start=1):
        label = f"value {number}" if len(values) > 1 else ""
        _add(written, Item("values", number, {}, label), value, (*NEEDED, *_OPTIONAL))
    _columns_to_given(written)
    return written


# -- CSV ------------------------------------------------------------------------------------------------------------


def _csv(file: UserFile) -> Written:
    try:
        table = parse_csv(file.text, file=file.name, columns=NEEDED, optional=_OPTIONAL, spreadsheet=True)
    except SeedError as error:
        hint = error.hint
        if hint.startswith("the header is"):
            hint = "`propdb add --template csv` shows the columns"
        elif hint.startswith("quote a cell"):
            hint = "write decimals with a point, and quote a cell that holds a comma"
        raise InvalidInput(error.problem, where=error.where, hint=hint, **error.fields) from None
    _not_too_many(len(table.rows), file.name)
    written = Written()
    for row in table:
        _keep(written, row, dict(row.cells))
    _columns_to_given(written)
    return written


def _not_too_many(count: int, name: str) -> None:
    if count > MAX_ROWS:
        raise InvalidInput(
            f"{count} rows, and {MAX_ROWS} are taken at once", where=name, hint="split it, and give the parts in turn"
        )


def _keep(written: Written, row: Row, cells: dict[str, str]) -> None:
    try:
        checked = {column: clean(row, column, text) for column, text in cells.items() if text}
    except SeedError as error:
        written.problems.append(error)
    else:
        written.rows.append(replace(row, cells=checked))


def clean(row: Row, column: str, text: str) -> str:
    """A cell on one line without blanks around it.

    Raises
    ------
    SeedError
        It holds a control character, or is very long.
    """
    odd = control_character(_BLANKS.sub(" ", text))
    if odd:
        raise row.error(column, f"{column} holds the control character {odd}", "leave it out")
    if len(text) > _MAX_TEXT:
        raise row.error(column, f"{column} has {len(text)} characters", f"write at most {_MAX_TEXT}")
    return " ".join(text.split())


def _columns_to_given(written: Written) -> None:
    """The columns ``source_...`` and ``species_...`` define what the row names; a later row may repeat them."""
    kept: list[Row] = []
    for row in written.rows:
        try:
            _define(row, "source", SOURCE_COLUMNS, written.sources)
            _define(row, "species", SPECIES_COLUMNS, written.species)
        except SeedError as error:
            written.problems.append(error)
        else:
            kept.append(row)
    written.rows[:] = kept


def _define(row: Row, what: str, columns: Sequence[str], found: dict[str, Given]) -> None:
    name = row.text(what)
    data = {column.removeprefix(f"{what}_"): row.text(column) for column in columns if row.text(column)}
    if not name or not data:
        return
    first = found.setdefault(name, Given(data, row, f"{what}_"))
    for key, text in data.items():
        if first.data.get(key, text) != text:
            raise row.error(
                f"{what}_{key}", f"{text!r} differs from {place_of(first.row)}", f"say it once for {what} {name!r}"
            )


# -- TOML -----------------------------------------------------------------------------------------------------------


def _toml(file: UserFile) -> Written:
    try:
        data = tomllib.loads(file.text, parse_float=str)  # digits as typed, trailing zeros too
    except tomllib.TOMLDecodeError as error:
        raise InvalidInput(f"is not TOML: {error}", where=file.name, hint="see toml.io") from None
    except (RecursionError, ValueError) as error:
        problem = "tables are nested too deeply" if isinstance(error, RecursionError) else str(error)
        raise InvalidInput(f"is not TOML that is read here: {problem}", where=file.name) from None
    known = ("entry", "source", "species")
    for key in data:
        if key not in known:
            hint = near(key, known) or "it holds [[entry]], [source.KEY] and [species.NAME]"
            raise InvalidInput(f"unknown key {key!r}", where=file.name, hint=hint)
    entries = data.get("entry", [])
    if not isinstance(entries, list) or not all(isinstance(one, dict) for one in entries):
        raise InvalidInput("entry is not a list of tables", where=file.name, hint="write [[entry]] above each")
    _not_too_many(len(entries), file.name)
    lines = [i for i, line in enumerate(file.text.splitlines(), start=1) if re.match(r"\s*\[\[\s*entry\s*\]\]", line)]
    written = Written()
    for number, one in enumerate(entries, start=1):
        line = f" (line {lines[number - 1]})" if len(lines) == len(entries) else ""
        _add(written, Item(file.name, number, {}, f"entry {number}{line}"), one, ROW_COLUMNS)
    _tables(written, file.name, data.get("source", {}), "source", _SOURCE_KEYS, written.sources)
    species = tuple(column.removeprefix("species_") for column in SPECIES_COLUMNS)
    _tables(written, file.name, data.get("species", {}), "species", species, written.species)
    return written


def _add(written: Written, row: Row, value: Mapping[str, Any], columns: Sequence[str]) -> None:
    cells: dict[str, str] = {}
    try:
        for key, one in value.items():
            if key not in columns:
                hint = near(str(key), columns) or "`propdb add --template toml` shows the keys"
                raise row.error(str(key)[:60], f"unknown key {str(key)[:60]!r}", hint)
            cells[key] = _cell(row, key, one)
    except SeedError as error:
        written.problems.append(error)
        return
    _keep(written, row, cells)


def _cell(row: Row, key: str, value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, (list, tuple)):
        if key in _LISTS:
            return " ".join(_cell(row, key, one) for one in value)
        if key.endswith(("synonyms", "authors")):
            return "; ".join(_cell(row, key, one) for one in value)
    if isinstance(value, str):
        return value
    if isinstance(value, (int, float)) and not isinstance(value, bool):
        try:
            return str(value)
        except ValueError:  # an integer of thousands of digits
            raise row.error(key, "the number is too long", "write a finite number") from None
    raise row.error(key, f"{key} is a {type(value).__name__}", "write a text in quotes, or a number")


def _tables(written: Written, file: str, data: Any, what: str, keys: Sequence[str], found: dict[str, Given]) -> None:
    example = '[source.data-sheet-7] or [species."my solvent"]'
    if not isinstance(data, dict) or not all(isinstance(one, dict) for one in data.values()):
        raise InvalidInput(f"{what} is not a table of tables", where=file, hint=f"write e.g. {example}")
    for number, (name, table) in enumerate(data.items(), start=1):
        row = Item(file, number, {}, f"{what} {name[:60]!r}")
        try:
            clean(row, "", name)
            for key, value in table.items():
                if key not in keys:
                    raise row.error(key, f"unknown key {key!r}", near(key, keys) or f"one of {', '.join(keys)}")
                if what == "source" and isinstance(value, (list, int, bool)):
                    for part in value if isinstance(value, list) else ():
                        clean(row, key, str(part))
                else:
                    table[key] = clean(row, key, _cell(row, key, value))
        except SeedError as error:
            written.problems.append(error)
        else:
            found[name] = Given(table, row)
