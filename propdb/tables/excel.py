"""Excel workbooks through openpyxl, read and written row by row.

A workbook holds numbers as floats, so decimals do not apply. Text stays text, also where it starts like a formula.
Cells keep values, formulas and formats; what stands around them is not carried over, and the report says so.
"""

from __future__ import annotations

import math
import re
import warnings
import zipfile
from collections.abc import Iterator
from contextlib import suppress
from copy import copy as copy_of
from itertools import chain, islice
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from propdb.errors import InvalidInput
from propdb.tables.batches import TOO_LARGE
from propdb.tables.columns import check_header
from propdb.tables.decimals import MISSING
from propdb.tables.extras import need
from propdb.tables.kinds import BAD_ROW
from propdb.tables.output import sha256_of
from propdb.tables.progress import Progress
from propdb.tables.scales import pressure_scale, temperature_scale

if TYPE_CHECKING:
    from propdb.tables.core import Given, Plan
    from propdb.tables.oracle import Oracle
    from propdb.tables.run import Done, Request
    from propdb.tables.tally import Tally

__all__ = ["convert_excel", "text_cell"]

_ROWS = 4096
_MOST_BYTES = 2 << 30
_MOST_RATIO = 200.0
_RATIO_FROM = 50 << 20
_OLD = b"\xd0\xcf\x11\xe0"  # how .xls and encrypted workbooks begin
_SEARCHED = 30  # rows in which a header that is not the first row is looked for

_TEXT = re.compile(r"\s*[+−-]?[\d.,'’ \u00a0\u2009\u202f]*\d[\d.,]*(?:[eE][+-]?\d+)?\s*", re.ASCII)  # a number as text

_LOST = "cells keep values, formulas and formats; column widths, merged cells, comments, links and charts are not kept"


def check_workbook(path: Path) -> None:
    """Refuse what is no workbook, or one that unpacks to far more than it is. Raises InvalidInput."""
    try:
        with zipfile.ZipFile(path) as archive:
            whole = sum(info.file_size for info in archive.infolist())
            names = set(archive.namelist())
    except zipfile.BadZipFile:
        with path.open("rb") as file:
            old = file.read(len(_OLD)) == _OLD
        what = "is an .xls workbook or has a password, whatever its name says" if old else "is no workbook, or damaged"
        hint = "open it, and save it as .xlsx without a password" if old else "save it as .xlsx"
        raise InvalidInput(what, where=str(path), hint=hint) from None
    except OSError as error:
        raise InvalidInput(f"cannot be read: {error.strerror or error}", where=str(path)) from None
    if "xl/workbook.xml" not in names:
        raise InvalidInput("is no workbook", where=str(path), hint="save it as .xlsx")
    packed = max(path.stat().st_size, 1)
    if whole > _MOST_BYTES or (whole > _RATIO_FROM and whole / packed > _MOST_RATIO):
        raise InvalidInput(
            f"unpacks from {packed:,} to {whole:,} bytes, which no table of this size does",
            where=str(path),
            hint="save it anew, or as CSV",
        )


def _open(path: Path) -> Any:
    openpyxl = need("openpyxl", extra="tables", what="Excel")
    check_workbook(path)
    try:
        return openpyxl.load_workbook(path, read_only=True, data_only=False)
    except Exception as error:  # noqa: BLE001  (the library raises whatever its XML parser meets)
        why = " ".join(str(error).split())[:120]
        raise InvalidInput(f"cannot be read as a workbook: {why}", where=str(path), hint="save it anew") from None


def _sheet(book: Any, name: str | None, path: Path) -> Any:
    titles = [sheet.title for sheet in book.worksheets]
    if name is None:
        shown = [sheet for sheet in book.worksheets if sheet.sheet_state == "visible"]
        if len(shown) != 1:
            raise InvalidInput(
                f"{len(titles)} sheets: {', '.join(titles[:8])}", where=str(path), hint="name one with --sheet"
            )
        return shown[0]
    if name not in titles:
        raise InvalidInput(f"no sheet {name!r}", where=str(path), hint=f"there are {', '.join(titles[:8])}")
    return book[name]


def _rows(sheet: Any, path: Path) -> Iterator[tuple[Any, ...]]:
    try:
        yield from sheet.iter_rows()
    except (KeyError, ValueError, SyntaxError, zipfile.BadZipFile) as error:
        why = " ".join(str(error).split())[:120]
        raise InvalidInput(f"cannot be read as a workbook: {why}", where=str(path), hint="save it anew") from None


def _head(
    rows: Iterator[tuple[Any, ...]], path: Path, *, search: bool
) -> tuple[tuple[Any, ...], tuple[str, ...], list[Any]]:
    """The first row, its names, and rows that were read beyond it.

    Raises InvalidInput for an empty sheet, or where a later row looks like the header and the first does not.
    """
    head, *beyond = [*islice(rows, _SEARCHED)] or [()]
    names = _names(head)
    if search:
        check_header((_names(row) for row in (head, *beyond)), str(path))
    if not any(names):
        raise InvalidInput("the first row is empty", where=str(path), hint="it names the columns")
    return head, names, beyond


def _names(row: tuple[Any, ...]) -> tuple[str, ...]:
    return tuple("" if cell.value is None else str(cell.value) for cell in row)


def convert_excel(oracle: Oracle, request: Request, source: Path, part: Path, progress: Progress) -> Done:
    """Convert one sheet. Raises InvalidInput for what is no workbook, or an empty sheet."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # of openpyxl, about what it does not keep
        return _convert_excel(oracle, request, source, part, progress)


def _convert_excel(oracle: Oracle, request: Request, source: Path, part: Path, progress: Progress) -> Done:
    from openpyxl import Workbook

    from propdb.tables.core import added_names
    from propdb.tables.run import Done, _notes, _tally, make_plan

    book = _open(source)
    page: Any = None
    try:
        sheet = _sheet(book, request.sheet, source)
        total = max(int(sheet.max_row or 1) - 1, 1)
        rows = _rows(sheet, source)
        head, names, beyond = _head(rows, source, search=not request.columns)
        plan = make_plan(oracle, request, names, where=source.name)
        tally = _tally(plan, request)
        out = Workbook(write_only=True)
        page = out.create_sheet(sheet.title)
        copy = Copy(page)
        page.append([copy(cell) for cell in head] + [text_cell(page, name) for name in added_names(plan)])
        held: list[tuple[Any, ...]] = []
        first = 1
        for row in chain(beyond, rows):
            held.append(row)
            if len(held) == _ROWS:
                _convert(held, copy, plan, tally, first)
                first += len(held)
                progress.step(len(held), min(first / total, 1.0))
                held = []
        _convert(held, copy, plan, tally, first)
        out.save(part)
        others = [one.title for one in book.worksheets if one.title != sheet.title]
    except BaseException:
        with suppress(Exception):
            page.close()  # else it complains when it is thrown away
        raise
    finally:
        book.close()
    lost = _LOST + (f"; nor are other sheets ({', '.join(others[:4])})" if others else "")
    return Done(plan, tally, sha256_of(source), sha256_of(part), [*_notes(plan), lost])


def text_cell(page: Any, text: str) -> Any:
    """A cell of text, also where the text starts with ``=``."""
    from openpyxl.cell import WriteOnlyCell

    cell = WriteOnlyCell(page, value=None)
    cell.value = text
    cell.data_type = "s"
    return cell


def number_cell(page: Any, value: float) -> Any:
    """A cell of a number with all its digits; openpyxl itself writes sixteen, and some numbers need seventeen."""
    from openpyxl.cell import WriteOnlyCell

    cell = WriteOnlyCell(page, value=value)
    if float(f"{value:.16g}") != value:
        cell._value = repr(value)  # written as it is, its type still being that of a number
    return cell


class Copy:
    """Copies cells to a page: values, formulas and formats."""

    def __init__(self, page: Any) -> None:
        self.page = page
        self._styles: dict[int, Any] = {}  # by the number of a style in the input

    def __call__(self, cell: Any) -> Any:
        """A cell for the output; None for one that is empty and has no format."""
        from openpyxl.cell import WriteOnlyCell

        value = cell.value
        styled = getattr(cell, "has_style", False)
        if value is None and not styled:
            return None
        if isinstance(value, str) and cell.data_type != "f":
            new = text_cell(self.page, value)
            new.data_type = "e" if cell.data_type == "e" else "s"
        elif isinstance(value, float):
            new = number_cell(self.page, value)
        else:
            new = WriteOnlyCell(self.page, value=value)
        if styled:
            self._dress(new, cell)
        return new

    def _dress(self, new: Any, cell: Any) -> None:
        known = self._styles.get(cell._style_id)
        if known is None:
            for what in ("font", "fill", "border", "alignment", "protection"):
                setattr(new, what, copy_of(getattr(cell, what)))
            new.number_format = cell.number_format
            self._styles[cell._style_id] = copy_of(new._style)
        else:
            new._style = copy_of(known)


def _convert(rows: list[tuple[Any, ...]], copy: Copy, plan: Plan, tally: Tally, first: int) -> None:
    """Convert rows; those that are empty from end to end stay as they are, and are none of the table."""
    places = [i for i, row in enumerate(rows) if any(cell.value is not None for cell in row)]
    added = iter(_added([rows[i] for i in places], plan, tally, first + np.array(places, np.int64)))
    width, page = len(plan.layout.names), copy.page
    for row in rows:
        cells = [copy(cell) for cell in row[:width]]
        if any(cell.value is not None for cell in row):
            *numbers, flag, reason = next(added)
            cells += [None] * (width - len(cells)) + [None if n is None else number_cell(page, n) for n in numbers]
            cells += [flag, text_cell(page, reason) if reason else None]
        page.append(cells)


def _added(rows: list[tuple[Any, ...]], plan: Plan, tally: Tally, numbers: NDArray[np.int64]) -> list[tuple[Any, ...]]:
    """For each row the numbers that are added, flag and reason."""
    from propdb.tables.core import compute, needs_state

    if not rows:
        return []
    problems: dict[int, str] = {}
    states: dict[int, str] = {}  # what is wrong with temperature and pressure
    given = _given(rows, plan, problems, states)
    found = compute(plan, given)
    column = plan.layout.get("enthalpy")
    verdicts = found.verdicts.copy()
    if column is None:
        h = found.value / found.scale
    else:
        given_h = _numbers(rows, column.index, column.name, problems, wanted=True)
        with np.errstate(over="ignore", invalid="ignore"):
            h = (given_h * found.scale + found.value) / found.scale
        problems |= dict.fromkeys(np.flatnonzero(np.abs(h) >= TOO_LARGE).tolist(), "the enthalpy is too large")
    if states:
        needed = needs_state(plan, found)
        problems |= {i: why for i, why in states.items() if i not in problems and (needed[i] or column is None)}
    for i, problem in problems.items():
        verdicts[i] = plan.verdict(BAD_ROW, problem)
        h[i] = math.nan
    shift, standard = found.value / found.scale, found.standard / found.scale
    tally.add(given, found, verdicts, lambda: h, numbers=numbers)
    columns = [h, standard] if plan.settings.evaluate else [h, standard, shift]
    return [
        (
            *(None if math.isnan(h[i]) or math.isnan(c[i]) else float(c[i]) for c in columns),
            *plan.verdicts[verdicts[i]],
        )
        for i in range(len(rows))
    ]


def _cell(row: tuple[Any, ...], index: int) -> Any:
    return row[index] if index < len(row) else None


def _given(rows: list[tuple[Any, ...]], plan: Plan, problems: dict[int, str], states: dict[int, str]) -> Given:
    from propdb.tables.core import Given

    layout = plan.layout
    keys = {}
    for role in ("species", "datum", "phase", "form", "stream", "side"):
        column = layout.get(role)
        if column is None:
            continue
        places: dict[str, int] = {}
        codes = []
        for row in rows:
            cell = _cell(row, column.index)
            value = None if cell is None else cell.value
            codes.append(places.setdefault("" if value is None else str(value), len(places)))
        keys[role] = (np.array(codes, np.int32), [*places, None])
    t = p = flow = fractions = None
    if (column := layout.get("temperature")) is not None:
        t = temperature_scale(column.unit, column.name)(_numbers(rows, column.index, column.name, states))
    if (column := layout.get("pressure")) is not None:
        p = pressure_scale(column.unit, column.name)(_numbers(rows, column.index, column.name, states))
    if layout.components:
        fractions = np.empty((len(rows), len(layout.components)))
        for place, component in enumerate(layout.components):
            fractions[:, place] = _numbers(rows, component.index, component.name, problems)
    if (column := layout.get("flow")) is not None:
        flow = _numbers(rows, column.index, column.name, problems)
    return Given(len(rows), keys, t, p, fractions, flow)


def _numbers(
    rows: list[tuple[Any, ...]], index: int, name: str, problems: dict[int, str], *, wanted: bool = False
) -> np.ndarray[Any, np.dtype[np.float64]]:
    found = np.full(len(rows), math.nan)
    for i, row in enumerate(rows):
        cell = _cell(row, index)
        value = None if cell is None else cell.value
        if isinstance(value, (int, float)) and not isinstance(value, bool) and math.isfinite(value):
            found[i] = value
            continue
        if value is None or (isinstance(value, str) and value.strip() in MISSING and cell.data_type != "f"):
            if wanted:
                problems.setdefault(i, "no enthalpy")
            continue
        shown = repr(str(value)[:40])
        if cell.data_type == "f":
            problems.setdefault(i, f"{name}: {shown} is a formula; save the sheet with values")
        elif isinstance(value, str) and _TEXT.fullmatch(value) is not None:
            problems.setdefault(i, f"{name}: {shown} is text, not a number; convert the cell to a number")
        else:
            problems.setdefault(i, f"{name}: {shown} is not a number")
    return found
