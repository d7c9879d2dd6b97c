"""Reading the rows of a seed file: strict about encoding, header and numbers, and precise about the place."""

from __future__ import annotations

import csv
import difflib
import io
import math
import re
import tomllib
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from propdb.errors import SeedError

__all__ = ["Row", "Table", "near", "parse_csv", "read_csv", "read_text", "read_toml"]

_NUMBER = re.compile(r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eEdD][+-]?[0-9]+)?")
_DECIMAL_COMMA = re.compile(r"[+-]?[0-9]+,[0-9]+")
_GROUPED = re.compile(r"[+-]?[1-9][0-9]{0,2},[0-9]{3}")
_THOUSANDS = re.compile(r"[+-]?[0-9]{1,3}(?:,[0-9]{3})+\.[0-9]+")


@dataclass(frozen=True, slots=True)
class Row:
    """One row: cells by column, and its place. Rows are counted as a spreadsheet does, the header being row 1."""

    file: str
    number: int
    cells: Mapping[str, str]

    def where(self, column: str = "") -> str:
        """``codata-1989/entries.csv, row 12, column value``."""
        return f"{self.file}, row {self.number}" + (f", column {column}" if column else "")

    def error(self, column: str, problem: str, hint: str = "", **fields: Any) -> SeedError:
        """A SeedError that names this row and the column."""
        return SeedError(
            problem, hint=hint, where=self.where(column), file=self.file, row=self.number, column=column, **fields
        )

    def text(self, column: str) -> str:
        """A cell, "" where it is blank."""
        return self.cells.get(column, "")

    def needed(self, column: str, what: str) -> str:
        """A cell that must not be blank; ``what`` says what would be right.

        Raises
        ------
        SeedError
            The cell is blank.
        """
        value = self.text(column)
        if not value:
            raise self.error(column, f"{column} is blank", what)
        return value

    def choice(self, column: str, among: Sequence[str], *, blank: bool = False) -> str:
        """A cell that holds one of a few words.

        Raises
        ------
        SeedError
            Another word, or blank where that is not allowed.
        """
        value = self.text(column)
        if value in among or (blank and not value):
            return value
        words = ", ".join(word for word in among if word)
        raise self.error(
            column,
            f"unknown {column} {value!r}" if value else f"{column} is blank",
            near(value, among) or f"one of {words}",
        )

    def value(self, column: str) -> float | None:
        """A cell as a finite number, None where it is blank.

        Raises
        ------
        SeedError
            Not a number, a decimal comma, a thousands separator.
        """
        text = self.text(column)
        return None if not text else self.read_number(text, column)

    def read_number(self, text: str, column: str) -> float:
        """A text of this row as a finite number. FORTRAN's D is taken as an exponent."""
        if _NUMBER.fullmatch(text) is None:
            if _DECIMAL_COMMA.fullmatch(text):
                point = text.replace(",", ".")
                other = (
                    f" or, if the comma parts thousands, {text.replace(',', '')}" if _GROUPED.fullmatch(text) else ""
                )
                raise self.error(column, f"{text!r} has a comma", f"the decimal point is '.': {point}{other}")
            if _THOUSANDS.fullmatch(text):
                raise self.error(column, f"{text!r} has a thousands separator", f"write {text.replace(',', '')}")
            raise self.error(
                column, f"{text!r} is not a number", "write digits with '.' as decimal point, or leave it blank"
            )
        value = float(text.replace("d", "e").replace("D", "e"))
        if not math.isfinite(value):
            raise self.error(column, f"{text!r} is too large to be a number here", "write a finite number")
        return value


@dataclass(frozen=True, slots=True)
class Table:
    """The rows of one file."""

    file: str
    rows: tuple[Row, ...]

    def __iter__(self) -> Iterator[Row]:
        return iter(self.rows)


def near(word: str, among: Iterable[str]) -> str:
    """``did you mean 'kJ/mol'?``, or nothing when no word is near."""
    found = difflib.get_close_matches(word, [w for w in among if w], n=1, cutoff=0.6)
    return f"did you mean {found[0]!r}?" if found else ""


def read_text(path: Path, *, file: str) -> str:
    """A seed file as text: UTF-8 without a byte order mark.

    Raises
    ------
    SeedError
        Another encoding, with the place of the first byte that does not fit; or a file that cannot be read.
    """
    try:
        raw = path.read_bytes()
    except OSError as error:
        raise SeedError(
            f"cannot be read: {error.strerror}", where=file, hint="check the file and its rights"
        ) from error
    for mark, name in ((b"\xef\xbb\xbf", "a byte order mark"), (b"\xff\xfe", "UTF-16"), (b"\xfe\xff", "UTF-16")):
        if raw.startswith(mark):
            raise SeedError(f"the file begins with {name}", where=file, hint="save it as UTF-8 without byte order mark")
    try:
        text = raw.decode("utf-8")
    except UnicodeDecodeError as error:
        line = raw.count(b"\n", 0, error.start) + 1
        raise SeedError(
            f"byte {raw[error.start]:#04x} is not UTF-8", where=f"{file}, line {line}", hint="save the file as UTF-8"
        ) from error
    if "\0" in text:
        raise SeedError("the file holds NUL characters", where=file, hint="save it as UTF-8")
    return text


def read_csv(path: Path, *, file: str, columns: Sequence[str], optional: Sequence[str] = ()) -> Table:
    """The rows of a CSV file with a known header.

    Parameters
    ----------
    path : Path
    file : str
        How messages call it.
    columns, optional : sequence of str
        Columns that the header must and may have, in any order.

    Raises
    ------
    SeedError
        Encoding, header, quoting, or a row with another number of cells than the header.
    """
    return parse_csv(read_text(path, file=file), file=file, columns=columns, optional=optional)


def parse_csv(
    text: str, *, file: str, columns: Sequence[str], optional: Sequence[str] = (), spreadsheet: bool = False
) -> Table:
    """The rows of a CSV text with a known header; see :func:`read_csv`.

    With ``spreadsheet`` what a spreadsheet program leaves is taken too: rows that are empty or begin with ``#`` are
    passed over (and counted), and empty cells beyond the header are dropped.
    """
    reader = csv.reader(io.StringIO(text, newline=""), strict=True)
    rows: list[Row] = []
    header: list[str] | None = None
    try:
        for number, cells in enumerate(reader, start=1):
            if spreadsheet:
                if not any(cell.strip() for cell in cells) or cells[0].lstrip().startswith("#"):
                    continue
                while len(cells) > len(header or ()) and not cells[-1].strip():
                    cells.pop()
            if header is None:
                header = _header(cells, columns, optional, f"{file}, row {number}")
                continue
            if not cells or not any(cell.strip() for cell in cells):
                raise SeedError("the row is empty", where=f"{file}, row {number}", hint="leave empty rows out")
            if len(cells) != len(header):
                raise SeedError(
                    f"{len(cells)} cells, and the header has {len(header)}",
                    where=f"{file}, row {number}",
                    hint="quote a cell that holds a comma, and write an empty cell for what is not stated",
                )
            rows.append(Row(file, number, {name: cell.strip() for name, cell in zip(header, cells, strict=True)}))
    except csv.Error as error:
        raise SeedError(
            f"quoting is broken: {error}", where=f"{file}, line {reader.line_num}", hint="RFC 4180"
        ) from error
    if header is None:
        raise SeedError("the file is empty", where=file, hint=f"the header is {','.join(columns)}")
    return Table(file, tuple(rows))


def _header(cells: Sequence[str], columns: Sequence[str], optional: Sequence[str], where: str) -> list[str]:
    header = [cell.strip() for cell in cells]
    known = (*columns, *optional)
    for name in header:
        if name not in known:
            hint = near(name, known) or f"the header is {','.join(columns)}"
            if ";" in name and len(header) == 1:
                hint = "separate the columns with commas"
            raise SeedError(f"unknown column {name!r}", where=where, hint=hint)
        if header.count(name) > 1:
            raise SeedError(f"column {name!r} stands there twice", where=where, hint="name each column once")
    missing = [name for name in columns if name not in header]
    if missing:
        raise SeedError(f"column {missing[0]!r} is missing", where=where, hint=f"the header is {','.join(columns)}")
    return header


def read_toml(path: Path, *, file: str) -> dict[str, Any]:
    """A TOML file.

    Raises
    ------
    SeedError
        Encoding or syntax, with the line.
    """
    try:
        return tomllib.loads(read_text(path, file=file))
    except tomllib.TOMLDecodeError as error:
        raise SeedError(f"is not TOML: {error}", where=file, hint="see toml.io") from error
