"""Clean blocks, all rows at once, in Arrow: the enthalpy as decimals, names as dictionaries, rows as bytes."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from propdb.tables.buffers import arrow, codes_of, floats, number_array, text_array, valid, view
from propdb.tables.decimals import MISSING, Digits, shift_text, uncertainty_text
from propdb.tables.delimited import BlockWork, Part, added_tail, localised
from propdb.tables.kinds import BAD_ROW
from propdb.tables.scales import pressure_scale, temperature_scale

if TYPE_CHECKING:
    from propdb.tables.core import Given, Plan, Rows

__all__ = ["Refused", "convert_block"]


class Refused(Exception):
    """The block is not clean enough to take all rows at once."""


def convert_block(block: bytes, first: int, work: BlockWork) -> Part:
    """Convert a block. Raises Refused where it must be taken field by field."""
    from propdb.tables.core import compute

    pa = arrow()
    plan, digits = work.plan, work.digits
    if work.digits.places > MOST_SWIFT:
        raise Refused
    lines, rest = _lines(block)
    count = len(lines)
    whole = plan.varies or work.tally.streams is not None
    table = _parse(block, work, whole)
    if table.num_rows != count:
        raise Refused
    given = _given(table, work, count, whole)
    rows = compute(plan, given)
    if plan.varies and not whole:  # the first rows that depend on T
        table = _parse(block, work, True)
        given = _given(table, work, count, True)
        rows = compute(plan, given)
    verdicts = rows.verdicts
    mark = text_array([work.dialect.delimiter])[0]
    h_column = plan.layout.get("enthalpy")
    h = None
    missing = None
    if h_column is not None:
        h = _column(table, h_column.index)
        there = valid(h)
        if there is not None:
            missing = ~there
            verdicts = np.where(missing, plan.verdict(BAD_ROW, "no enthalpy"), verdicts).astype(np.int32)
    if h is not None:
        new = _sum(h, rows, plan, digits)
        new_text = _text(new, digits, work)
        if rows.constant:
            tail = _constant_tails(work, rows, verdicts, missing)
            joined = _join(lines, new_text, tail, mark)
        else:
            shift, uncertainty = _varying_cells(work, rows, digits, missing)
            ends = text_array([added_tail(work, v) for v in range(len(plan.verdicts))])
            tail = ends.take(number_array(verdicts, pa.int32()))
            joined = _join(lines, new_text, uncertainty, shift, tail, mark)
    else:
        value, uncertainty = _varying_cells(work, rows, digits, None)
        ends = text_array([added_tail(work, v) for v in range(len(plan.verdicts))])
        tail = ends.take(number_array(verdicts, pa.int32()))
        joined = _join(lines, value, uncertainty, tail, mark)
        new = None
    work.tally.add(
        given, rows, verdicts, lambda: floats(new) if new is not None else rows.value / rows.scale, first=first
    )
    buffers = joined.buffers()
    return Part(count, [buffers[2], rest])


def _join(*columns: Any) -> Any:
    """Join the cells of each row; the last argument is what stands between them."""
    import pyarrow.compute as pc

    return pc.binary_join_element_wise(*columns, null_handling="replace", null_replacement="", memory_pool=pool())


def pool() -> Any:
    """Where blocks are allocated: the system's allocator keeps what it gets back, so memory is not faulted in anew."""
    return arrow().system_memory_pool()


#: Columns that a shift which does not depend on T has no use for.
_WHOLE = ("temperature", "pressure", "flow", "stream", "side", "vapour")

#: Arrow writes small decimals with more places than this in scientific notation, and adds no more than 38 digits.
MOST_SWIFT = 18


def _lines(block: bytes) -> tuple[Any, bytes]:
    """Rows as strings, each with the line end of the one before it, and the last line end."""
    pa = arrow()
    array = np.frombuffer(block, np.uint8)
    ends = np.flatnonzero(array == 10).astype(np.int32)
    windows = block.find(b"\r") >= 0
    if windows:
        back = array[np.maximum(ends - 1, 0)] == 13
        if not back.all() or block.count(b"\r") != len(ends):
            raise Refused
        ends = ends - 1
    offsets = np.zeros(len(ends) + 1, np.int32)
    offsets[1:] = ends
    strings = pa.Array.from_buffers(pa.string(), len(ends), [None, pa.py_buffer(offsets), pa.py_buffer(block)])
    return strings, b"\r\n" if windows else b"\n"


def _parse(block: bytes, work: BlockWork, whole: bool) -> Any:
    """The columns that matter; temperatures and what streams need only where ``whole``."""
    from pyarrow import csv

    pa = arrow()
    plan, digits = work.plan, work.digits
    layout = plan.layout
    types: dict[str, Any] = {}
    text = pa.dictionary(pa.int32(), pa.string())
    for role, column in layout.columns.items():
        if role == "enthalpy":
            types[f"c{column.index}"] = pa.decimal128(MOST_SWIFT + digits.places, digits.places)
        elif role in _WHOLE and not whole:
            continue
        elif role in ("temperature", "pressure", "flow"):
            types[f"c{column.index}"] = pa.float64()
        else:
            types[f"c{column.index}"] = text
    for component in layout.components:
        types[f"c{component.index}"] = pa.float64()
    try:
        return csv.read_csv(
            pa.py_buffer(block),
            read_options=csv.ReadOptions(
                column_names=[f"c{i}" for i in range(len(layout.names))],
                use_threads=False,
                block_size=len(block) + 1,
            ),
            parse_options=csv.ParseOptions(delimiter=work.dialect.delimiter, ignore_empty_lines=False),
            memory_pool=pool(),
            convert_options=csv.ConvertOptions(
                include_columns=list(types) or ["c0"],
                column_types=types,
                null_values=list(MISSING),
                strings_can_be_null=False,
                decimal_point="," if work.dialect.comma else ".",
            ),
        )
    except pa.ArrowInvalid:
        raise Refused from None


def _column(table: Any, index: int) -> Any:
    chunks = table.column(f"c{index}").chunks
    if len(chunks) != 1:
        raise Refused
    return chunks[0]


def _given(table: Any, work: BlockWork, count: int, whole: bool) -> Given:
    from propdb.tables.core import Given

    layout = work.plan.layout
    keys = {}
    for role in ("species", "datum", "phase", "form", "stream", "side"):
        column = layout.get(role)
        if column is not None and (whole or role not in _WHOLE):
            keys[role] = codes_of(_column(table, column.index))
    t = p = flow = fractions = None
    if whole and (column := layout.get("temperature")) is not None:
        t = _finite(floats(_column(table, column.index)))
        t = temperature_scale(column.unit, column.name)(t)
    if whole and (column := layout.get("pressure")) is not None:
        p = pressure_scale(column.unit, column.name)(_finite(floats(_column(table, column.index))))
    if layout.components:
        fractions = np.empty((count, len(layout.components)))
        for place, component in enumerate(layout.components):
            fractions[:, place] = _finite(floats(_column(table, component.index)))
    if whole and (column := layout.get("flow")) is not None:
        flow = _finite(floats(_column(table, column.index)))
    return Given(count, keys, t, p, fractions, flow)


def _finite(values: NDArray[np.float64]) -> NDArray[np.float64]:
    if np.isinf(values).any():  # Arrow reads "inf"; field by field it is refused by name
        raise Refused
    return values


def _decimals(values: NDArray[np.float64], scale: int, lost: NDArray[np.bool_]) -> Any:
    """Numbers as decimals of a scale, null where lost. Raises Refused where they do not fit 64 bits."""
    pa = arrow()
    scaled = np.rint(np.where(lost, 0.0, values) * 10.0**scale)
    if len(scaled) and np.abs(scaled).max() >= 2.0**62:
        raise Refused
    words = np.empty((len(values), 2), np.int64)
    words[:, 0] = scaled
    words[:, 1] = words[:, 0] >> 63
    bits, nulls = None, int(np.count_nonzero(lost))
    if nulls:
        bits = pa.py_buffer(np.packbits(~lost, bitorder="little"))
    return pa.Array.from_buffers(pa.decimal128(19, scale), len(lost), [bits, pa.py_buffer(words)], nulls)


def _sum(h: Any, rows: Rows, plan: Plan, digits: Digits) -> Any:
    import pyarrow.compute as pc

    if rows.constant and rows.kinds is not None:
        _, value, _, scale, _, _ = plan.arrays()
        kinds = number_array(rows.kinds, arrow().int32())
        return pc.add(h, _decimals(value / scale, digits.scale, np.isnan(value)).take(kinds), memory_pool=pool())
    values = rows.value / rows.scale
    return pc.add(h, _decimals(values, digits.scale, np.isnan(values)), memory_pool=pool())


def _text(new: Any, digits: Digits, work: BlockWork) -> Any:
    """Decimals as text, with the decimal sign of the file."""
    import pyarrow.compute as pc

    pa = arrow()
    if digits.places > 6:
        small = np.abs(view(new, np.dtype("V16")).view(np.int64)[0::2]) < 10 ** (digits.places - 6)
        there = valid(new)
        if (small if there is None else small & there).any():  # Arrow would write an exponent
            raise Refused
    text = new.cast(pa.string(), memory_pool=pool())
    if digits.ragged and digits.places:
        text = pc.ascii_rtrim(pc.ascii_rtrim(text, characters="0"), characters=".")
    if work.dialect.comma:
        text = pc.replace_substring(text, pattern=".", replacement=",")
    return text


def _constant_tails(work: BlockWork, rows: Rows, verdicts: NDArray[np.int32], missing: NDArray[np.bool_] | None) -> Any:
    """Uncertainty, shift, flag and reason: one text for each kind of row, and one for rows without an enthalpy."""
    number = work.plan.arrays()[0]
    if work.tails is None or work.tails[0] != number:
        work.tails = (number, text_array(_tail_texts(work)))
    known, texts = work.tails
    assert rows.kinds is not None
    kinds = rows.kinds
    if missing is not None:
        kinds = np.where(missing, np.int32(known), kinds).astype(np.int32)
    return texts.take(number_array(kinds, arrow().int32()))


def _tail_texts(work: BlockWork) -> list[str | None]:
    plan, mark = work.plan, work.dialect.delimiter
    number, value, standard, scale, verdict, _ = plan.arrays()
    texts: list[str | None] = []
    for i in range(number):
        cells = ["", ""]
        if not math.isnan(value[i]):
            cells = [uncertainty_text(standard[i] / scale[i]), shift_text(value[i] / scale[i], work.digits)]
        texts.append(mark.join([*(localised(work, c) for c in cells), added_tail(work, verdict[i])]))
    texts.append(mark.join(["", "", added_tail(work, plan.verdict(BAD_ROW, "no enthalpy"))]))
    return texts


def _varying_cells(work: BlockWork, rows: Rows, digits: Digits, missing: NDArray[np.bool_] | None) -> tuple[Any, Any]:
    """Shifts (or enthalpies) and their uncertainties as text, row by row."""
    pa = arrow()
    values, standards = rows.value / rows.scale, rows.standard / rows.scale
    lost = np.isnan(values) if missing is None else np.isnan(values) | missing
    shift = _text(_decimals(values, digits.scale, lost), digits._replace(places=digits.scale), work)
    texts, codes = _uncertainties(np.where(lost, np.nan, standards))
    uncertainty = text_array([localised(work, t) for t in texts]).take(number_array(codes, pa.int32()))
    return shift, uncertainty


def _uncertainties(standards: NDArray[np.float64]) -> tuple[list[str], NDArray[np.int32]]:
    """Distinct texts of uncertainties to two digits, and which row has which."""
    if np.isnan(standards).all():
        return [""], np.zeros(len(standards), np.int32)
    there = standards > 0.0
    exponent = np.floor(np.log10(np.where(there, standards, 1.0))) - 1.0
    with np.errstate(invalid="ignore"):
        digits = np.rint(standards / 10.0**exponent)
    keys = np.where(there, exponent * 1000.0 + digits, np.where(standards == 0.0, -1e9, 1e9))
    _, first, codes = np.unique(keys, return_index=True, return_inverse=True)
    return [uncertainty_text(u) for u in standards[first].tolist()], codes.astype(np.int32)
