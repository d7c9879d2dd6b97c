"""Writing a tabulation to a file, by the ending of its name: CSV, TSV, Excel, Parquet or JSON."""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np

from propdb.errors import InvalidInput, PropdbError
from propdb.tables.buffers import arrow, number_array, text_array
from propdb.tables.extras import need
from propdb.tables.output import Whole
from propdb.tables.tabulate import Tabulation

__all__ = ["ENDINGS", "write_tabulation"]

ENDINGS = (".csv", ".tsv", ".xlsx", ".parquet", ".json")


def write_tabulation(table: Tabulation, target: Path, *, overwrite: bool) -> None:
    """Write a tabulation, whole or not at all.

    Raises
    ------
    InvalidInput
        Another ending, or a file that exists.
    PropdbError
        A package that is not installed, a place that cannot be written.
    """
    check_target(target, overwrite=overwrite)
    with Whole(target) as whole:
        ending = target.suffix.lower()
        if ending in (".csv", ".tsv"):
            whole.part.write_bytes(_delimited(table, "," if ending == ".csv" else "\t"))
        elif ending == ".json":
            text = json.dumps(table.as_dict(), indent=1, ensure_ascii=False, allow_nan=False)
            whole.part.write_text(text + "\n", encoding="utf-8")
        elif ending == ".xlsx":
            _excel(table, whole.part)
        else:
            _parquet(table, whole.part)
        whole.commit()


def check_target(target: Path, *, overwrite: bool) -> None:
    """Refuse an ending that is no format, and a file that exists, before anything is computed."""
    if target.suffix.lower() not in ENDINGS:
        raise InvalidInput(
            f"{target.suffix or 'no ending'} is no format of a table",
            where=str(target),
            hint=f"it can be {', '.join(ENDINGS)}",
        )
    if target.is_dir():
        raise InvalidInput("is a directory", where=str(target), hint="name a file")
    if target.exists() and not overwrite:
        raise InvalidInput("the output exists", where=str(target), hint="give another name, or --overwrite")
    if not target.parent.is_dir():
        raise PropdbError("there is no such directory", where=str(target.parent), hint="make it first")


def _delimited(table: Tabulation, delimiter: str) -> bytes:
    text = io.StringIO()
    writer = csv.writer(text, delimiter=delimiter, lineterminator="\n")
    writer.writerow(table.headers)
    writer.writerows(["" if cell is None else _number(cell) for cell in row] for row in table.rows())
    return text.getvalue().encode()


def _number(cell: Any) -> Any:
    """A float to twelve digits: what is behind them is rounding."""
    return f"{cell:.12g}" if isinstance(cell, float) else cell


def _excel(table: Tabulation, part: Path) -> None:
    openpyxl = need("openpyxl", extra="tables", what="Excel")
    from propdb.tables.excel import text_cell

    book = openpyxl.Workbook(write_only=True)
    page = book.create_sheet("enthalpy")
    page.append([text_cell(page, name) for name in table.headers])
    for row in table.rows():
        page.append([text_cell(page, cell) if isinstance(cell, str) else cell for cell in row])
    notes = book.create_sheet("sources")
    notes.append([text_cell(notes, f"datum {table.datum}: {table.sentence}")])
    notes.append([text_cell(notes, f"store {table.store}")])
    for line in table.as_dict()["sources"].values():
        notes.append([text_cell(notes, line)])
    notes.append([text_cell(notes, table.as_dict()["caution"])])
    book.save(part)


def _parquet(table: Tabulation, part: Path) -> None:
    pa = arrow()
    pq = need("pyarrow.parquet", extra="tables", what="Parquet")
    columns: Sequence[Sequence[Any]] = list(zip(*table.rows(), strict=True))
    arrays = []
    for name, cells in zip(table.headers, columns, strict=True):
        if "[" in name:
            values = np.array([math.nan if cell is None else cell for cell in cells], np.float64)
            arrays.append(number_array(values, pa.float64(), np.isnan(values)))
        else:
            arrays.append(text_array(cells))
    schema = pa.schema(
        [pa.field(name, array.type) for name, array in zip(table.headers, arrays, strict=True)],
        metadata={"propdb:datum": table.datum, "propdb:store": table.store},
    )
    pq.write_table(pa.Table.from_arrays(arrays, schema=schema), part)
