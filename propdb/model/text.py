"""Aligned plain text."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence

#: Characters that would move the cursor, colour a terminal, turn the order of the text or break a line.
_UNSEEN = re.compile("[\x00-\x1f\x7f-\x9f\u061c\u200e\u200f\u2028-\u202e\u2066-\u2069\ud800-\udfff]")


def visible(text: str) -> str:
    """One line of what somebody typed, control characters as ``\\n`` or ``\\x1b``."""
    return _UNSEEN.sub(lambda found: ascii(found[0])[1:-1], text)


#: Width of running text.
WIDTH = 100


def columns(
    rows: Iterable[Sequence[str]], *, right: Iterable[int] = (), indent: int = 0, gap: int = 2, headed: bool = True
) -> list[str]:
    """Align rows of cells into lines.

    Parameters
    ----------
    rows
        Cells of each row; all rows have the same number of cells. Columns that are empty, but for their heading, are
        left out.
    right
        Columns that are aligned to the right.
    indent, gap
        Spaces before each line and between columns.
    headed
        Whether the first row is a heading.
    """
    table = [[cell.replace("\n", " ") for cell in row] for row in rows]
    if not table:
        return []
    used = [index for index in range(len(table[0])) if any(row[index] for row in (table[headed:] or table))]
    widths = {index: max(len(row[index]) for row in table) for index in used}
    rightward = set(right)
    lines = []
    for row in table:
        cells = [
            row[index].rjust(widths[index]) if index in rightward else row[index].ljust(widths[index]) for index in used
        ]
        lines.append((" " * indent + (" " * gap).join(cells)).rstrip())
    return lines


def pairs(items: Iterable[tuple[str, str]], *, indent: int = 0, width: int = 110) -> list[str]:
    """Align names and what they are, wrapped; items with nothing to say are left out.

    Parameters
    ----------
    items
        Name and text; lines of a text stay lines.
    indent
        Spaces before each line.
    width
        Longest line, words that are longer apart.
    """
    kept = [(name, text) for name, text in items if text]
    if not kept:
        return []
    from textwrap import wrap

    longest = max(len(name) for name, _ in kept)
    start = " " * (indent + longest + 2)
    lines = []
    for name, text in kept:
        parts = [part for line in text.splitlines() for part in wrap(line, width - len(start), break_long_words=False)]
        lines.append(f"{' ' * indent}{name.ljust(longest)}  {parts[0] if parts else ''}".rstrip())
        lines += [start + part for part in parts[1:]]
    return lines


def wrapped(text: str, first: str = "", rest: str | None = None) -> list[str]:
    """Running text in lines of :data:`WIDTH`: the first begins with ``first``, the others with ``rest`` or blanks."""
    from textwrap import wrap

    rest = " " * len(first) if rest is None else rest
    return wrap(text, WIDTH, initial_indent=first, subsequent_indent=rest, break_on_hyphens=False)


def kelvin(temperature: float) -> str:
    """A temperature [K] without its unit, to a thousandth at most: ``298.15``, ``1000``."""
    text = f"{temperature:.3f}"
    return text.rstrip("0").rstrip(".")
