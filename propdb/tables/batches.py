"""Record batches: read the columns that matter, add the converted ones."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from propdb.errors import InvalidInput
from propdb.tables.buffers import arrow, codes_of, dictionary_of, floats, number_array, text_array, valid
from propdb.tables.decimals import MOST_PLACES
from propdb.tables.kinds import BAD_ROW
from propdb.tables.scales import pressure_scale, temperature_scale

if TYPE_CHECKING:
    from propdb.tables.core import Given, Plan, Rows

__all__ = ["Done", "added_fields", "check_types", "convert_arrow", "read"]

#: An enthalpy that is no number of a table, in any unit; text is read up to here, too.
TOO_LARGE = 10.0**MOST_PLACES

_KEYS = ("species", "datum", "phase", "form")


class Done(NamedTuple):
    """What a batch came to, beside the batch: for counts, streams and the sidecar."""

    given: Given
    rows: Rows
    verdicts: NDArray[np.int32]
    h: NDArray[np.float64]  # on the datum wanted [table's unit], NaN where there is none


def check_types(schema: Any, plan: Plan, *, where: str) -> None:
    """Refuse columns whose type cannot serve their role. Raises InvalidInput."""
    types = arrow().types
    for role, column in plan.layout.columns.items():
        kind = schema.field(column.index).type
        value = kind.value_type if types.is_dictionary(kind) else kind
        if role in (*_KEYS, "stream", "side"):
            right = (
                types.is_string(value)
                or types.is_large_string(value)
                or types.is_string_view(value)
                or types.is_null(value)
            )
            wanted = "text"
        else:
            right = types.is_floating(kind) or types.is_integer(kind) or types.is_decimal(kind) or types.is_null(kind)
            wanted = "a number"
        if not right:
            raise InvalidInput(
                f"the {role} is {kind}, not {wanted}", where=f"{where}, column {column.name!r}", hint="cast the column"
            )
    for component in plan.layout.components:
        kind = schema.field(component.index).type
        if not (types.is_floating(kind) or types.is_integer(kind) or types.is_decimal(kind)):
            raise InvalidInput(
                f"the fraction is {kind}, not a number", where=f"{where}, column {component.name!r}", hint="cast it"
            )


def read(batch: Any, plan: Plan) -> Given:
    """The columns of a batch that matter, as numpy arrays."""
    from propdb.tables.core import Given

    layout = plan.layout
    keys = {}
    for role in (*_KEYS, "stream", "side"):
        column = layout.get(role)
        if column is not None:
            keys[role] = codes_of(batch.column(column.index))
    t = p = flow = fractions = None
    if (column := layout.get("temperature")) is not None:
        t = temperature_scale(column.unit, column.name)(floats(batch.column(column.index)))
    if (column := layout.get("pressure")) is not None:
        p = pressure_scale(column.unit, column.name)(floats(batch.column(column.index)))
    if layout.components:
        fractions = np.empty((batch.num_rows, len(layout.components)))
        for place, component in enumerate(layout.components):
            fractions[:, place] = floats(batch.column(component.index))
    if (column := layout.get("flow")) is not None:
        flow = floats(batch.column(column.index))
    return Given(batch.num_rows, keys, t, p, fractions, flow)


def convert_arrow(batch: Any, plan: Plan) -> tuple[Any, Done]:
    """See :func:`propdb.tables.core.convert_batch`; also what it came to."""
    from propdb.tables.core import compute

    pa = arrow()
    given = read(batch, plan)
    rows = compute(plan, given)
    column = plan.layout.get("enthalpy")
    array = None if column is None else batch.column(column.index)
    if array is not None and pa.types.is_decimal(array.type):
        new, h, verdicts, shift = _decimal(array, rows, plan)
    else:
        h, verdicts = _add(None if array is None else floats(array), rows, plan)
        new = number_array(h, pa.float64(), np.isnan(h))
        shift = None
    scale = rows.scale
    standard = rows.standard / scale
    lost = np.isnan(h)
    added = [new, number_array(standard, pa.float64(), np.isnan(standard) | lost)]
    if not plan.settings.evaluate:
        if shift is None:
            shift = rows.value / scale
        added.append(number_array(shift, pa.float64(), np.isnan(shift) | lost))
    added += _flags(plan, verdicts)
    names = [*batch.schema.names, *(f.name for f in added_fields(batch.schema, plan))]
    schema = pa.schema(
        [*(batch.schema.field(i) for i in range(batch.num_columns)), *added_fields(batch.schema, plan)],
        metadata=batch.schema.metadata,
    )
    assert len(names) == len(schema)
    out = pa.RecordBatch.from_arrays([*batch.columns, *added], schema=schema)
    return out, Done(given, rows, verdicts, h)


def added_fields(schema: Any, plan: Plan) -> list[Any]:
    """The fields of the columns that are added to a table of this schema."""
    from propdb.tables.core import added_names

    pa = arrow()
    column = plan.layout.get("enthalpy")
    kind = pa.float64()
    if column is not None and pa.types.is_decimal(schema.field(column.index).type):
        kind = _wider(schema.field(column.index).type, plan)
    text = pa.dictionary(pa.int32(), pa.string())
    names = added_names(plan)
    types = [kind, pa.float64(), *([] if plan.settings.evaluate else [pa.float64()]), text, text]
    return [pa.field(name, kind) for name, kind in zip(names, types, strict=True)]


def _wider(kind: Any, plan: Plan) -> Any:
    digits = plan.settings.digits
    return arrow().decimal128(38, min(kind.scale, MOST_PLACES) if digits is None else digits)


def _add(given: NDArray[np.float64] | None, rows: Rows, plan: Plan) -> tuple[NDArray[np.float64], NDArray[np.int32]]:
    """``(h * scale + shift) / scale``, in the order of the scalar answers."""
    if given is None:
        return rows.value / rows.scale, rows.verdicts
    with np.errstate(over="ignore", invalid="ignore"):
        h = given * rows.scale
        h += rows.value
        h /= rows.scale
    verdicts = rows.verdicts
    large = np.abs(h) >= TOO_LARGE
    if large.any():
        h[large] = math.nan
        verdicts = np.where(large, plan.verdict(BAD_ROW, "the enthalpy is too large"), verdicts).astype(np.int32)
    bad = ~np.isfinite(given)
    if bad.any():
        h[bad] = math.nan
        verdicts = np.where(bad, plan.verdict(BAD_ROW, "no enthalpy"), verdicts).astype(np.int32)
    return h, verdicts


def _decimal(
    array: Any, rows: Rows, plan: Plan
) -> tuple[Any, NDArray[np.float64], NDArray[np.int32], NDArray[np.float64]]:
    """Decimal numbers stay decimal: the shift is rounded to their decimals and added exactly."""
    from decimal import Context, Decimal

    exact = Context(prec=200)
    kind = _wider(array.type, plan)
    ten, most = Decimal(1).scaleb(-kind.scale), Decimal(TOO_LARGE)
    shift = rows.value / rows.scale
    there = valid(array)
    bad = np.zeros(len(array), np.bool_) if there is None else ~there
    verdicts = rows.verdicts
    if bad.any():
        verdicts = np.where(bad, plan.verdict(BAD_ROW, "no enthalpy"), verdicts).astype(np.int32)
    lost = bad | np.isnan(shift)
    large = np.zeros(len(array), np.bool_)
    words = np.zeros(2 * len(array), np.uint64)
    h = np.full(len(array), math.nan)
    for i in np.flatnonzero(~lost).tolist():
        number = exact.add(array[i].as_py(), Decimal(repr(float(shift[i]))))
        if abs(number) >= most:
            large[i] = lost[i] = True
            continue
        scaled = int(exact.scaleb(exact.quantize(number, ten), kind.scale))
        words[2 * i], words[2 * i + 1] = scaled & (2**64 - 1), (scaled >> 64) & (2**64 - 1)
        h[i] = float(number)
    if large.any():
        verdicts = np.where(large, plan.verdict(BAD_ROW, "the enthalpy is too large"), verdicts).astype(np.int32)
    return number_array(words.view("V16"), kind, lost), h, verdicts, shift


def _flags(plan: Plan, verdicts: NDArray[np.int32]) -> list[Any]:
    table = plan.verdicts
    flags: list[str | None] = list(dict.fromkeys(flag for flag, _ in table))
    to_flag = np.array([flags.index(flag) for flag, _ in table], np.int32)
    pa = arrow()
    none = np.array([not reason for _, reason in table])
    reason = pa.DictionaryArray.from_arrays(
        number_array(verdicts, pa.int32(), none[verdicts]), text_array([reason for _, reason in table]), safe=False
    )
    return [dictionary_of(to_flag[verdicts], flags), reason]
