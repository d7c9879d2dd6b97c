"""Delimited text in blocks that end where a row ends."""

from __future__ import annotations

import csv
import re
from collections.abc import Iterator, Sequence
from typing import NamedTuple

from propdb.errors import InvalidInput
from propdb.tables.output import HashedReader

__all__ = ["BLOCK", "Dialect", "Head", "blocks", "decode", "physical_rows", "read_head"]

BLOCK = 3 << 18
_LONGEST = 16 << 20  # a row longer than this is a quote that was never closed
csv.field_size_limit(max(csv.field_size_limit(), 4 * _LONGEST))  # else 128 kB, and an error
_BOMS = ((b"\xff\xfe", "UTF-16"), (b"\xfe\xff", "UTF-16"), (b"\x00\x00\xfe\xff", "UTF-32"))


class Dialect(NamedTuple):
    """How the fields of a file are told apart."""

    delimiter: str
    comma: bool = False  # decimal commas


class Head(NamedTuple):
    """The header of a file."""

    raw: bytes  # as it stands, without its line end, with a byte order mark where there is one
    end: bytes  # the line end
    names: tuple[str, ...]
    rest: bytes  # what was read beyond it


def decode(raw: bytes) -> str:
    """Text of a piece of a file: UTF-8, else Windows-1252, which every byte string almost is."""
    try:
        return raw.decode("utf-8")
    except UnicodeDecodeError:
        return raw.decode("cp1252", "replace")


def read_head(file: HashedReader, *, delimiter: str | None, where: str) -> tuple[Head, str]:
    """The header line and the delimiter.

    Raises
    ------
    InvalidInput
        An empty file, UTF-16, a quote that is not closed, bytes that are no text.
    """
    data = file.read(BLOCK)
    for mark, name in _BOMS:
        if data.startswith(mark):
            raise InvalidInput(f"is {name}, not UTF-8", where=where, hint="save it as UTF-8")
    if b"\0" in data[:4096]:
        kind = (
            "UTF-16 without a byte order mark" if data[1:64:2].count(0) > 8 or data[:64:2].count(0) > 8 else "no text"
        )
        raise InvalidInput(f"is {kind}", where=where, hint="save it as delimited text in UTF-8")
    if not data.strip(b"\xef\xbb\xbf\r\n\t "):
        raise InvalidInput("the file is empty", where=where, hint="the first line names the columns")
    if b"\r" in data and b"\n" not in data:
        raise InvalidInput("its lines end with CR alone", where=where, hint="save it with LF or CR LF")
    text = data.removeprefix(b"\xef\xbb\xbf")
    prefix = len(data) - len(text)
    stop = 0
    inside = False
    first = text[: text.find(b"\n") if b"\n" in text else len(text)]
    if delimiter is None:
        delimiter = _guess(first)
    while True:
        stop = text.find(b"\n", stop)
        if stop < 0:
            stop = len(text)
            if _open_after(text[:stop], False, delimiter.encode()):
                raise InvalidInput("a quote in the header is never closed", where=where, hint='close it with "')
            break
        inside = _open_after(text[:stop], False, delimiter.encode())
        if not inside:
            break
        stop += 1
    raw = text[:stop]
    end = b"\n"
    if raw.endswith(b"\r"):
        raw, end = raw[:-1], b"\r\n"
    names = next(csv.reader([decode(raw)], delimiter=delimiter), [])
    return Head(data[:prefix] + raw, end, tuple(names), text[stop + 1 :]), delimiter


def first_rows(head: Head, delimiter: str, most: int = 30) -> Iterator[Sequence[str]]:
    """The header and the lines below it, as fields."""
    yield head.names
    for line in head.rest.split(b"\n", most)[:most]:
        yield next(csv.reader([decode(line.rstrip(b"\r"))], delimiter=delimiter), [])


def _guess(line: bytes) -> str:
    bare = re.sub(rb'"[^"]*"', b"", line)
    counts = {d: bare.count(d.encode()) for d in ("\t", ";", ",", "|")}
    best = max(counts, key=lambda d: counts[d])
    return best if counts[best] else ","


def _open_after(line: bytes, inside: bool, delimiter: bytes) -> bool:
    """Is a quoted field still open at the end of a line? A quote opens a field only where the field begins."""
    i = 0
    while True:
        if inside:
            j = line.find(b'"', i)
            if j < 0:
                return True
            if line[j + 1 : j + 2] == b'"':
                i = j + 2
                continue
            inside = False
            i = line.find(delimiter, j + 1)
            if i < 0:
                return False
            i += 1
        elif line[i : i + 1] == b'"':
            inside, i = True, i + 1
        else:
            i = line.find(delimiter, i)
            if i < 0:
                return False
            i += 1


def physical_rows(block: bytes, delimiter: bytes) -> tuple[list[bytes], bytes]:
    """Rows of a block, each with its line end, and what remains open at the end."""
    if b'"' not in block:
        rows = _split(block)
        if rows and not rows[-1].endswith(b"\n"):
            return rows[:-1], rows[-1]
        return rows, b""
    rows, inside = [], False
    held: list[bytes] = []
    for line in _split(block):
        if inside or b'"' in line:
            inside = _open_after(line.rstrip(b"\r\n"), inside, delimiter)
        held.append(line)
        if not inside and line.endswith(b"\n"):
            rows.append(b"".join(held))
            held = []
    return rows, b"".join(held)


def _split(block: bytes) -> list[bytes]:
    lines = block.split(b"\n")
    last = lines.pop()
    return [line + b"\n" for line in lines] + ([last] if last else [])


def blocks(
    file: HashedReader, head: Head, delimiter: str, *, where: str, size: int = BLOCK
) -> Iterator[tuple[bytes, int]]:
    """Blocks of whole rows, each with the number of its lines.

    The last row gets the line end of the header where it has none.

    Raises
    ------
    InvalidInput
        A quote that is opened and never closed.
    """
    mark = delimiter.encode()
    carry = head.rest
    rows = 0
    first = True
    while True:
        data = b"" if first and len(carry) >= size // 2 else file.read(size)
        ended = not data and not (first and carry and len(carry) >= size // 2)
        first = False
        data = carry + data
        if ended:
            break
        if b'"' in data and _odd(data):
            whole, carry = physical_rows(data, mark)
            if len(carry) > _LONGEST:
                raise _unclosed(where, rows + len(whole) + 2)
            block = b"".join(whole)
        else:
            cut = data.rfind(b"\n") + 1
            block, carry = data[:cut], data[cut:]
            if len(carry) > _LONGEST:
                raise InvalidInput(f"row {rows + 2} is longer than 16 MB", where=where, hint="is it delimited text?")
        if block:
            lines = count_lines(block)
            rows += lines
            yield block, lines
    if carry:
        whole, rest = physical_rows(carry if carry.endswith(b"\n") else carry + head.end, mark)
        if rest:
            raise _unclosed(where, rows + len(whole) + 2)
        yield b"".join(whole), len(whole)


def count_lines(block: bytes) -> int:
    """Line ends in a block; ``bytes.count`` takes ten times as long."""
    import numpy as np

    return int(np.count_nonzero(np.frombuffer(block, np.uint8) == 10))


def _odd(data: bytes) -> bool:
    """May a quoted field go on over a line end? Not where every line has an even number of quotes."""
    import numpy as np

    array = np.frombuffer(data, np.uint8)
    ends = np.flatnonzero(array == 10)
    if not len(ends):
        return True
    quotes = np.flatnonzero(array == 34)
    per_line = np.bincount(np.searchsorted(ends, quotes), minlength=len(ends) + 1)
    return bool((per_line[:-1] & 1).any())


def _unclosed(where: str, row: int) -> InvalidInput:
    return InvalidInput(
        "a quote is opened and never closed", where=f"{where}, row {row}", hint='close it with ", or write "" for one'
    )
