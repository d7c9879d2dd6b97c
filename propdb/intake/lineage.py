"""``lineage.toml``: who copies whom, which compilations decide about an entry, and what a difference may be."""

from __future__ import annotations

from collections.abc import Container, Mapping
from pathlib import Path
from typing import Any

from propdb.errors import SeedError
from propdb.intake.rows import near, read_toml
from propdb.model.records import QUANTITIES

__all__ = ["read_lineage"]

_FILE = "lineage.toml"
#: Table to its keys: those that it needs, and all.
_KEYS: Mapping[str, tuple[tuple[str, ...], tuple[str, ...]]] = {
    "compilation": (("key", "title", "decides", "reason"), ("key", "title", "decides", "reason", "copies")),
    "copies": (("source", "of", "evidence"), ("source", "of", "evidence")),
    "limit": (("quantities", "reason"), ("quantities", "reason", "standard", "percent")),
    "form": (("species", "form", "cas"), ("species", "form", "cas", "quantities")),
}


def read_lineage(path: Path, *, sources: Container[str], species: Container[str]) -> dict[str, Any]:
    """The tables of the file as they stand, once they are in order; without the file none.

    Parameters
    ----------
    path : Path
    sources, species : containers of str
        What the seed holds.

    Raises
    ------
    SeedError
        The table and its number, and what would be right.
    """
    if not path.is_file():
        return {}
    data = read_toml(path, file=_FILE)
    for part, rows in data.items():
        if part not in _KEYS:
            raise SeedError(f"unknown table {part!r}", where=_FILE, hint=near(part, _KEYS))
        for i, row in enumerate(rows, start=1):
            where = f"{_FILE}: {part} {i}"
            needed, known = _KEYS[part]
            for key in needed:
                if key not in row or (row[key] == "" and key != "cas"):
                    raise SeedError(f"{key} is missing", where=where)
            for key in row:
                if key not in known:
                    raise SeedError(f"unknown key {key!r}", where=where, hint=near(key, known))
            for quantity in row.get("quantities", ()):
                if quantity not in QUANTITIES:
                    raise SeedError(f"unknown quantity {quantity!r}", where=where, hint=near(quantity, QUANTITIES))
    keys = {row["key"] for row in data.get("compilation", ())}
    if len(keys) < len(data.get("compilation", ())):
        raise SeedError("two compilations have one key", where=_FILE)
    links = [(f"compilation {r['key']}", r["key"], c) for r in data.get("compilation", ()) for c in r.get("copies", ())]
    links += [(f"copies of {row['source']}", row["source"], row) for row in data.get("copies", ())]
    for name, source, link in links:
        where = f"{_FILE}: {name}"
        for key in ("of", "evidence"):
            if not link.get(key):
                raise SeedError(f"{key} is missing", where=where)
        for key in (source, link["of"]):
            if key not in keys and key not in sources:
                raise SeedError(
                    f"{key!r} is neither a compilation nor a source", where=where, hint=near(key, keys) or "name one"
                )
    for i, row in enumerate(data.get("limit", ()), start=1):
        if "standard" not in row and "percent" not in row:
            raise SeedError("give standard or percent", where=f"{_FILE}: limit {i}")
    for i, row in enumerate(data.get("form", ()), start=1):
        if row["species"] not in species:
            raise SeedError(f"unknown species {row['species']!r}", where=f"{_FILE}: form {i}")
    return data
