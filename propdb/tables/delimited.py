"""CSV and TSV: blocks of whole rows, read by Arrow where they are clean and field by field where they are not.

The rows themselves are copied as bytes; what is added is joined to each before its line end.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator
from concurrent.futures import Future, ThreadPoolExecutor
from pathlib import Path
from typing import TYPE_CHECKING, Any, NamedTuple

from propdb.tables.decimals import Digits, look, plain_number
from propdb.tables.lines import Dialect, Head, blocks, decode, physical_rows, read_head
from propdb.tables.output import HashedReader, HashedWriter
from propdb.tables.progress import Progress
from propdb.tables.tally import Tally

if TYPE_CHECKING:
    from propdb.tables.core import Plan

__all__ = ["Delimited", "open_delimited"]

_AHEAD = 4
_THREADS = 3  # one waits for the interpreter now and then; more of them take memory and give little
_LOOK = 10_000  # rows that the decimals of a column are taken from


class Part(NamedTuple):
    """What one block became."""

    rows: int
    pieces: list[Any]  # bytes and buffers, to be written one after the other


class Delimited(NamedTuple):
    """An input that is open, with its header read."""

    path: Path
    reader: HashedReader
    head: Head
    dialect: Dialect


def open_delimited(path: Path, file: Any, *, comma: bool) -> Delimited:
    """Read the header. Raises InvalidInput as :func:`propdb.tables.lines.read_head`."""
    reader = HashedReader(file)
    delimiter = "\t" if path.suffix.lower() in (".tsv", ".tab") else None
    head, delimiter = read_head(reader, delimiter=delimiter, where=path.name)
    return Delimited(path, reader, head, Dialect(delimiter, comma))


def convert_delimited(given: Delimited, plan: Plan, out: HashedWriter, tally: Tally, progress: Progress) -> Digits:
    """Convert all rows to ``out``. Raises InvalidInput for a quote that is never closed."""
    from propdb.tables.core import added_names

    dialect, head = given.dialect, given.head
    mark = dialect.delimiter
    names = mark.join(_quoted(name, mark) for name in added_names(plan))
    out.write(head.raw + mark.encode() + names.encode() + head.end)
    total = max(given.path.stat().st_size, 1)
    source = blocks(given.reader, head, mark, where=given.path.name)
    first = next(source, None)
    digits = digits_of(None if first is None else first[0], plan, dialect)
    if first is None:
        return digits
    block_of = BlockWork(plan, dialect, digits, tally)
    pool = ThreadPoolExecutor(_THREADS, "propdb-table")
    waiting: deque[Future[Part]] = deque()
    row = 1
    try:
        for block, lines in _chain(first, source):
            waiting.append(pool.submit(block_of, block, row))
            row += lines
            if len(waiting) > _AHEAD:
                _write(waiting.popleft().result(), out, progress, given.reader.size / total)
        while waiting:
            _write(waiting.popleft().result(), out, progress, 1.0)
    finally:
        pool.shutdown(wait=True, cancel_futures=True)
    return digits


def _chain(first: tuple[bytes, int], rest: Iterator[tuple[bytes, int]]) -> Iterator[tuple[bytes, int]]:
    yield first
    yield from rest


def _write(part: Part, out: HashedWriter, progress: Progress, share: float) -> None:
    for piece in part.pieces:
        out.write(piece)
    progress.step(part.rows, share)


def _quoted(text: str, delimiter: str) -> str:
    if any(c in text for c in (delimiter, '"', "\n", "\r")):
        return '"' + text.replace('"', '""') + '"'
    return text


def digits_of(block: bytes | None, plan: Plan, dialect: Dialect) -> Digits:
    """Decimals of the enthalpy column, from its first rows."""
    import csv

    column = plan.layout.get("enthalpy")
    if column is None or plan.settings.digits is not None or block is None:
        return look((), plan.settings.digits)
    rows, _ = physical_rows(block, dialect.delimiter.encode())
    cells = []
    for fields in csv.reader((decode(row) for row in rows[:_LOOK]), delimiter=dialect.delimiter):
        if column.index < len(fields):
            number = plain_number(fields[column.index], comma=dialect.comma)
            if number is not None:
                cells.append(number)
    return look(cells, None)


class BlockWork:
    """Converts one block: by Arrow, or field by field where Arrow refuses. Runs in any thread."""

    def __init__(self, plan: Plan, dialect: Dialect, digits: Digits, tally: Tally) -> None:
        self.plan = plan
        self.dialect = dialect
        self.digits = digits
        self.tally = tally
        self.tails: tuple[int, Any] | None = None  # what ends the rows of each kind, for so many kinds

    def __call__(self, block: bytes, first: int) -> Part:
        from propdb.tables.careful import convert_rows
        from propdb.tables.swift import Refused, convert_block

        try:
            if self.dialect.comma and self.dialect.delimiter == ",":
                raise Refused
            return convert_block(block, first, self)
        except Refused:
            return convert_rows(block, first, self)


def added_tail(work: BlockWork, verdict: int) -> str:
    """Flag and reason, as they end a row."""
    flag, reason = work.plan.verdicts[verdict]
    mark = work.dialect.delimiter
    return f"{_quoted(flag, mark)}{mark}{_quoted(reason, mark)}"


def localised(work: BlockWork, number: str) -> str:
    """A number with the decimal sign of the file."""
    return _quoted(number.replace(".", ","), work.dialect.delimiter) if work.dialect.comma else number
