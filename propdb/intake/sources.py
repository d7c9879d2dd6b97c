"""``source.toml``: the bibliographic record of a seed folder."""

from __future__ import annotations

import re
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from propdb.errors import SeedError
from propdb.intake.rows import near, read_toml
from propdb.model.records import Source

__all__ = ["CLASSES", "FIELDS", "KINDS", "parse_source", "read_source"]

KINDS = ("book", "article", "report", "standard", "practice")
CLASSES = ("evaluated", "handbook", "compilation", "practice", "estimate")

_KEY = re.compile(r"[a-z0-9][a-z0-9.-]*")
_DOI = re.compile(r"10\.[0-9]{4,9}/\S+")
_OWN = ("key", "title", "authors", "year", "kind", "class", "terms", "carrier", "standard_pressure", "note", "lineage")
FIELDS = ("publisher", "place", "journal", "volume", "issue", "pages", "number", "edition", "doi", "isbn", "url")


def read_source(path: Path, *, file: str) -> Source:
    """Read a source record.

    Raises
    ------
    SeedError
        The file and the key, and what would be right.
    """
    source = parse_source(read_toml(path, file=file), file=file)
    if source.key != path.parent.name:
        problem = f"key {source.key!r} is not the name of the folder {path.parent.name!r}"
        raise _bad(file, "key", problem, "make them the same")
    return source


def parse_source(data: Mapping[str, Any], *, file: str) -> Source:
    """A source record from its keys and values.

    Raises
    ------
    SeedError
        The key, and what would be right.
    """
    for key in data:
        if key not in (*_OWN, *FIELDS):
            raise _bad(file, key, f"unknown key {key!r}", near(key, (*_OWN, *FIELDS)))
    key = _text(data, "key", file)
    if not _KEY.fullmatch(key):
        raise _bad(file, "key", f"key {key!r} is not kebab-case", "small letters, digits, '-' and '.'")
    kind, cls = _text(data, "kind", file), _text(data, "class", file)
    if kind not in KINDS:
        raise _bad(file, "kind", f"unknown kind {kind!r}", near(kind, KINDS) or f"one of {', '.join(KINDS)}")
    if cls not in CLASSES:
        raise _bad(file, "class", f"unknown class {cls!r}", near(cls, CLASSES) or f"one of {', '.join(CLASSES)}")
    year = data.get("year")
    if kind != "practice" and (not isinstance(year, int) or isinstance(year, bool) or not 1600 < year < 2200):
        raise _bad(file, "year", f"year {year!r} is not one", "write four digits")
    authors = data.get("authors")
    if not isinstance(authors, list) or not all(isinstance(a, str) and a.strip() for a in authors):
        raise _bad(file, "authors", "authors is not a list of names", 'authors = ["Cox, J. D."]')
    if kind != "practice" and not authors:
        raise _bad(file, "authors", "authors is empty", "name the authors or the issuing body")
    pressure = data.get("standard_pressure", 100000)
    if pressure not in (100000, 101325):
        raise _bad(file, "standard_pressure", f"standard_pressure {pressure!r} is neither", "100000 or 101325 [Pa]")
    fields = {name: _text(data, name, file) for name in FIELDS if data.get(name, "") != ""}
    if "doi" in fields and not _DOI.fullmatch(fields["doi"]):
        raise _bad(file, "doi", f"doi {fields['doi']!r} is not one", "write e.g. 10.1063/1.1461829, or leave it blank")
    return Source(
        key=key,
        title=_text(data, "title", file),
        authors=tuple(authors),
        year=year,
        kind=kind,
        cls=cls,
        terms=_text(data, "terms", file),
        fields=fields,
        carrier=_text(data, "carrier", file),
        standard_pressure=float(pressure),
        note=str(data.get("note", "")),
        lineage=_lineage(data, file),
    )


def _lineage(data: Mapping[str, Any], file: str) -> tuple[tuple[str, str], ...]:
    rows = data.get("lineage", [])
    if not isinstance(rows, list) or not all(isinstance(r, dict) and set(r) == {"copies", "evidence"} for r in rows):
        raise _bad(
            file, "lineage", "lineage is not a list of tables", '[{ copies = "other-key", evidence = "one line" }]'
        )
    return tuple((str(r["copies"]), str(r["evidence"])) for r in rows)


def _text(data: Mapping[str, Any], key: str, file: str) -> str:
    value = data.get(key)
    if value is None or value == "":
        raise _bad(file, key, f"{key} is missing", "")
    if not isinstance(value, str):
        raise _bad(file, key, f"{key} is {value!r}, not a text", "put it in quotes")
    return value


def _bad(file: str, key: str, problem: str, hint: str) -> SeedError:
    return SeedError(problem, where=f"{file}, key {key}", hint=hint, file=file, column=key)
