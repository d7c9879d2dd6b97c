"""Rows field by field: for blocks with bad cells, odd quotes or too few fields."""

from __future__ import annotations

import csv
import math
from typing import TYPE_CHECKING, Any

import numpy as np

from propdb.tables.decimals import (
    MISSING,
    add_text,
    float_text,
    number_problem,
    plain_number,
    uncertainty_text,
)
from propdb.tables.delimited import BlockWork, Part, added_tail, localised
from propdb.tables.kinds import BAD_ROW
from propdb.tables.lines import decode, physical_rows
from propdb.tables.scales import pressure_scale, temperature_scale

if TYPE_CHECKING:
    from propdb.tables.core import Given

__all__ = ["convert_rows"]


def convert_rows(block: bytes, first: int, work: BlockWork) -> Part:
    """Convert a block; see :class:`propdb.tables.delimited.BlockWork`."""
    from propdb.tables.core import compute, needs_state

    plan, mark, comma = work.plan, work.dialect.delimiter, work.dialect.comma
    width, evaluate = len(plan.layout.names), plan.settings.evaluate
    raw, _ = physical_rows(block, mark.encode())
    texts: list[bytes] = []
    table: list[list[str]] = []
    problems: dict[int, str] = {}
    blank: dict[int, list[bytes]] = {}
    places: list[int] = []  # of the rows among all lines
    for place, line in enumerate(raw):
        text = line.rstrip(b"\r\n")
        if not text and width > 1:
            blank.setdefault(len(texts), []).append(line)
            continue
        fields = next(csv.reader([decode(text)], delimiter=mark), []) or [""]
        if len(fields) != width:
            many = "1 field" if len(fields) == 1 else f"{len(fields)} fields"
            problems[len(texts)] = f"{many} where the header has {width}"
            text += mark.encode() * max(0, width - len(fields))
            fields = (fields + [""] * width)[:width]
        places.append(place)
        texts.append(text)
        table.append(fields)
    ends = [line[len(line.rstrip(b"\r\n")) :] for line in raw if width == 1 or line.rstrip(b"\r\n")]
    states: dict[int, str] = {}  # what is wrong with temperature and pressure
    given = _given(table, work, problems, states)
    rows = compute(plan, given)
    if states:
        needed = needs_state(plan, rows)
        problems |= {i: why for i, why in states.items() if i not in problems and (needed[i] or evaluate)}
    h_column = plan.layout.get("enthalpy")
    verdicts = rows.verdicts.copy()
    numbers: list[str | None] = [None] * len(table)
    if h_column is not None:
        for i, fields in enumerate(table):
            number = plain_number(fields[h_column.index], comma=comma)
            if number is None and i not in problems:
                cell = fields[h_column.index]
                why = number_problem(cell, comma=comma)
                problems[i] = "no enthalpy" if cell.strip() in MISSING else f"{h_column.name}: {why}"
            numbers[i] = number
    for i, problem in problems.items():
        verdicts[i] = plan.verdict(BAD_ROW, problem)
    scale = rows.scale if isinstance(rows.scale, np.ndarray) else np.full(len(table), rows.scale)
    values, standards = rows.value / scale, rows.standard / scale
    pieces: list[Any] = []
    h = np.full(len(table), math.nan)
    for i, text in enumerate(texts):
        pieces += blank.get(i, ())
        cells = ["", ""] if evaluate else ["", "", ""]
        value, number = float(values[i]), numbers[i]
        if i not in problems and not math.isnan(value):
            uncertainty = uncertainty_text(float(standards[i]))
            if evaluate:
                cells = [float_text(value, work.digits), uncertainty]
                h[i] = value
            elif number is not None:
                new, step = add_text(number, value, work.digits)
                cells = [new, uncertainty, step]
                h[i] = float(new)
        tail = mark.join([*(localised(work, cell) for cell in cells), added_tail(work, verdicts[i])])
        pieces += [text, mark.encode(), tail.encode(), ends[i]]
    pieces += blank.get(len(texts), ())
    work.tally.add(given, rows, verdicts, lambda: h, numbers=first + np.array(places, np.int64))
    return Part(len(table), [b"".join(pieces)])


def _given(table: list[list[str]], work: BlockWork, problems: dict[int, str], states: dict[int, str]) -> Given:
    from propdb.tables.core import Given

    layout, comma = work.plan.layout, work.dialect.comma
    keys = {}
    for role in ("species", "datum", "phase", "form", "stream", "side"):
        column = layout.get(role)
        if column is None:
            continue
        places: dict[str, int] = {}
        codes = [places.setdefault(fields[column.index], len(places)) for fields in table]
        keys[role] = (np.array(codes, np.int32), [*places, None])

    def numbers(index: int, name: str, into: dict[int, str] = problems) -> np.ndarray[Any, np.dtype[np.float64]]:
        found = np.full(len(table), math.nan)
        for i, fields in enumerate(table):
            number = plain_number(fields[index], comma=comma)
            if number is not None:
                found[i] = float(number)
            elif fields[index].strip() not in MISSING and i not in problems:
                into[i] = f"{name}: {number_problem(fields[index], comma=comma)}"
        return found

    t = p = flow = fractions = None
    if (column := layout.get("temperature")) is not None:
        t = temperature_scale(column.unit, column.name)(numbers(column.index, column.name, states))
    if (column := layout.get("pressure")) is not None:
        p = pressure_scale(column.unit, column.name)(numbers(column.index, column.name, states))
    if layout.components:
        fractions = np.empty((len(table), len(layout.components)))
        for place, component in enumerate(layout.components):
            fractions[:, place] = numbers(component.index, component.name)
    if (column := layout.get("flow")) is not None:
        flow = numbers(column.index, column.name)
    return Given(len(table), keys, t, p, fractions, flow)
