"""What a store says about itself, as text."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from propdb.model.text import columns, pairs


def info_text(found: Any) -> str:
    """Names and values, one a line; a list of like rows as a table."""
    if isinstance(found, str):
        return found
    if not isinstance(found, Mapping):
        return "\n".join(str(item) for item in found)
    lines = pairs((_words(name), _text(value)) for name, value in found.items() if not _is_table(value))
    for name, value in found.items():
        if _is_table(value):
            heading = tuple(_words(key) for key in value[0])
            rows = [heading, *(tuple(_text(cell) for cell in row.values()) for row in value)]
            numbers = [index for index, cell in enumerate(value[0].values()) if isinstance(cell, (int, float))]
            lines += ["", _words(name), *columns(rows, right=numbers, indent=2)]
    return "\n".join(lines)


def intake_text(found: Mapping[str, Any]) -> str:
    """One line for each file, what was refused and why; then, if asked for, each row."""
    if not found["files"]:
        return "The store was built without the open data; propdb store rebuild brings them in."
    heading = ("file", "rows", "entries", "refused", "moved", "source")
    keys = ("key", "rows", "entries", "refused", "moved", "source")
    rows = [heading, *(tuple(str(report[key]) for key in keys) for report in found["files"])]
    lines = columns(rows, right=(1, 2, 3, 4))
    lines += ["", f"{found['rows']} rows, {found['entries']} entries, {found['refused']} rows refused"]
    for report in found["files"]:
        said = [f"{count} {kind}" for kind, count in report["reasons"].items()]
        said += [report["trouble"], report["remark"]]
        if report["points_left_out"]:
            said.append(f"{report['points_left_out']} points of tables left out")
        if any(said):
            lines.append(f"{report['key']}: {'; '.join(filter(None, said))}")
    for row in found.get("refusals", ()):
        place = f"{row['key']}, row {row['row']}" + (f", {row['column']}" if row["column"] else "")
        lines.append(f"{place}: {row['what']}: {row['reason']}")
    for row in found.get("moved", ()):
        lines.append(f"{row['key']}, row {row['row']}: {row['what']}: filed under {row['species']}")
    return "\n".join(lines)


def _is_table(value: Any) -> bool:
    return isinstance(value, (list, tuple)) and bool(value) and all(isinstance(row, Mapping) for row in value)


def _words(name: Any) -> str:
    return str(name).replace("_", " ")


def _text(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, Mapping):
        counts = all(isinstance(item, int) for item in value.values())
        return ", ".join(
            f"{_text(item)} {_words(key)}" if counts else f"{_words(key)} {_text(item)}" for key, item in value.items()
        )
    if isinstance(value, (list, tuple)):
        return "\n".join(_text(item) for item in value)
    return str(value)
