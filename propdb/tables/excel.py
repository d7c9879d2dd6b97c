"""Excel workbooks through openpyxl, read and written row by row.

A workbook holds numbers as floats, so decimals do not apply. Text stays text, also where it starts like a formula.
"""

from __future__ import annotations

import datetime as dt
import math
import zipfile
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from propdb.errors import InvalidInput
from propdb.tables.decimals import MISSING, plain_number
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


def check_workbook(path: Path) -> None:
    """Refuse what is no workbook, or one that unpacks to far more than it is. Raises InvalidInput."""
    try:
        with zipfile.ZipFile(path) as archive:
            whole = sum(info.file_size for info in archive.infolist())
            names = set(archive.namelist())
    except (zipfile.BadZipFile, OSError) as error:
        raise InvalidInput(f"is no workbook: {error}", where=str(path), hint="save it as .xlsx") from None
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
        if len(titles) > 1:
            raise InvalidInput(
                f"{len(titles)} sheets: {', '.join(titles[:8])}", where=str(path), hint="name one with --sheet"
            )
        return book.worksheets[0]
    if name not in titles:
        raise InvalidInput(f"no sheet {name!r}", where=str(path), hint=f"there are {', '.join(titles[:8])}")
    return book[name]


def _rows(sheet: Any, path: Path) -> Iterator[tuple[Any, ...]]:
    try:
        yield from sheet.iter_rows()
    except (KeyError, ValueError, SyntaxError, zipfile.BadZipFile) as error:
        why = " ".join(str(error).split())[:120]
        raise InvalidInput(f"cannot be read as a workbook: {why}", where=str(path), hint="save it anew") from None


def convert_excel(oracle: Oracle, request: Request, source: Path, part: Path, progress: Progress) -> Done:
    """Convert one sheet. Raises InvalidInput for what is no workbook, or an empty sheet."""
    from openpyxl import Workbook

    from propdb.tables.core import added_names
    from propdb.tables.run import Done, _notes, _tally, make_plan

    book = _open(source)
    try:
        sheet = _sheet(book, request.sheet, source)
        total = max(int(sheet.max_row or 1) - 1, 1)
        rows = _rows(sheet, source)
        head = next(rows, ())
        names = tuple("" if cell.value is None else str(cell.value) for cell in head)
        if not any(names):
            raise InvalidInput("the sheet is empty", where=str(source), hint="its first row names the columns")
        plan = make_plan(oracle, request, names, where=source.name)
        tally = _tally(plan, request)
        out = Workbook(write_only=True)
        page = out.create_sheet(sheet.title)
        page.append([_copy(page, cell) for cell in head] + [text_cell(page, name) for name in added_names(plan)])
        held: list[tuple[Any, ...]] = []
        first = 1
        for row in rows:
            held.append(row)
            if len(held) == _ROWS:
                _convert(held, page, plan, tally, first)
                first += len(held)
                progress.step(len(held), min(first / total, 1.0))
                held = []
        _convert(held, page, plan, tally, first)
        out.save(part)
    finally:
        book.close()
    return Done(plan, tally, sha256_of(source), sha256_of(part), _notes(plan))


def text_cell(page: Any, text: str) -> Any:
    """A cell of text, also where the text starts with ``=``."""
    from openpyxl.cell import WriteOnlyCell

    cell = WriteOnlyCell(page, value=None)
    cell.value = text
    cell.data_type = "s"
    return cell


def _copy(page: Any, cell: Any) -> Any:
    from openpyxl.cell import WriteOnlyCell

    value = cell.value
    if value is None:
        return None
    if isinstance(value, str) and cell.data_type != "f":
        return text_cell(page, value)
    new = WriteOnlyCell(page, value=value)
    if isinstance(value, (dt.date, dt.time, dt.timedelta)) or cell.number_format != "General":
        new.number_format = cell.number_format
    return new


def _convert(rows: list[tuple[Any, ...]], page: Any, plan: Plan, tally: Tally, first: int) -> None:
    from propdb.tables.core import compute, needs_state

    if not rows:
        return
    problems: dict[int, str] = {}
    states: dict[int, str] = {}  # what is wrong with temperature and pressure
    given = _given(rows, plan, problems, states)
    found = compute(plan, given)
    column = plan.layout.get("enthalpy")
    verdicts = found.verdicts.copy()
    if column is None:
        h = found.value / found.scale
    else:
        h = (_numbers(rows, column.index, column.name, problems, wanted=True) * found.scale + found.value) / found.scale
    if states:
        needed = needs_state(plan, found)
        problems |= {i: why for i, why in states.items() if i not in problems and (needed[i] or column is None)}
    for i, problem in problems.items():
        verdicts[i] = plan.verdict(BAD_ROW, problem)
        h[i] = math.nan
    shift, standard = found.value / found.scale, found.standard / found.scale
    width = len(plan.layout.names)
    for i, row in enumerate(rows):
        flag, reason = plan.verdicts[verdicts[i]]
        lost = math.isnan(h[i])
        numbers = [h[i], standard[i]] if plan.settings.evaluate else [h[i], standard[i], shift[i]]
        cells = [_copy(page, cell) for cell in row[:width]] + [None] * (width - len(row))
        cells += [None if lost or math.isnan(n) else float(n) for n in numbers]
        page.append([*cells, flag, text_cell(page, reason) if reason else None])
    tally.add(given, found, verdicts, lambda: h, first=first)


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
        elif isinstance(value, str) and plain_number(value) is not None:
            problems.setdefault(i, f"{name}: {shown} is text, not a number; convert the cell to a number")
        else:
            problems.setdefault(i, f"{name}: {shown} is not a number")
    return found
