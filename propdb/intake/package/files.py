"""The files of the ``chemicals`` package: where they are, whether they are as recorded, and their rows as text."""

from __future__ import annotations

import csv
import json
from collections.abc import Mapping
from dataclasses import dataclass
from hashlib import sha256
from importlib.metadata import PackageNotFoundError, version
from importlib.util import find_spec
from pathlib import Path
from typing import Any

from propdb.errors import SeedError
from propdb.intake.rows import read_toml

__all__ = ["FileSpec", "Loaded", "Manifest", "installed", "load", "read_manifest"]

PACKAGE = "chemicals"


@dataclass(frozen=True, slots=True)
class FileSpec:
    """One line of ``files.toml``."""

    key: str
    path: str  # below the package's directory; may be a pattern
    source: str
    title: str  # of the table in the publication
    sha256: str
    rows: int
    columns: tuple[str, ...] = ()  # of a table of text; none for JSON
    unused: Mapping[str, str] | None = None  # column to the reason why it is not read


@dataclass(frozen=True, slots=True)
class Manifest:
    """``files.toml``."""

    version: str
    files: tuple[FileSpec, ...]


@dataclass(frozen=True, slots=True)
class Loaded:
    """One file as found. ``trouble``: why there are no rows. ``remark``: how it differs from what is recorded."""

    spec: FileSpec
    file: str  # its name below the package's directory
    version: str
    sha256: str = ""
    rows: tuple[tuple[int, Mapping[str, Any]], ...] = ()  # (number of the line or record, cells)
    ragged: tuple[tuple[int, int], ...] = ()  # (number of the line, its cells): lines with too few or too many cells
    trouble: str = ""
    remark: str = ""


def read_manifest(root: Path) -> Manifest:
    """Read ``_package/files.toml`` of the seed directory.

    Raises
    ------
    SeedError
        It is missing or a line of it cannot be read.
    """
    name = "_package/files.toml"
    data = read_toml(root / "_package" / "files.toml", file=name)
    try:
        files = tuple(FileSpec(**{**row, "columns": tuple(row.get("columns", ()))}) for row in data["file"])
        return Manifest(str(data["version"]), files)
    except (KeyError, TypeError) as error:
        raise SeedError(f"cannot be read: {error}", where=name, hint="version, and a [[file]] for each file") from error


def installed() -> tuple[Path | None, str]:
    """Directory and version of the package; (None, "") where it is not installed."""
    spec = find_spec(PACKAGE)
    if spec is None or spec.origin is None:
        return None, ""
    try:
        return Path(spec.origin).parent, version(PACKAGE)
    except PackageNotFoundError:
        return Path(spec.origin).parent, "unknown"


def load(spec: FileSpec, root: Path | None, *, found_version: str, recorded_version: str) -> Loaded:
    """Read one file. Nothing is raised: what cannot be read says so in ``trouble``."""
    if root is None:
        return Loaded(spec, spec.path, found_version, trouble=f"the package {PACKAGE} is not installed")
    places = sorted(root.glob(spec.path.replace("[", "[[]")))
    if not places:
        return Loaded(spec, spec.path, found_version, trouble="the file is missing")
    if len(places) > 1:
        return Loaded(spec, spec.path, found_version, trouble=f"{len(places)} files have this name")
    file = places[0].relative_to(root).as_posix()
    try:
        content = places[0].read_bytes()
    except OSError as error:
        return Loaded(spec, file, found_version, trouble=f"cannot be read: {error.strerror or error}")
    digest = sha256(content).hexdigest()
    remark = ""
    if digest != spec.sha256:
        remark = f"its SHA-256 is not the one recorded for {PACKAGE} {recorded_version}"
    try:
        text = content.decode("utf-8")
        rows, ragged = _json_rows(text) if file.endswith(".json") else _text_rows(text, spec)
    except (ValueError, csv.Error) as error:
        return Loaded(spec, file, found_version, digest, trouble=f"cannot be read: {error}", remark=remark)
    if len(rows) + len(ragged) < spec.rows and remark:
        remark += f"; {len(rows)} rows where {spec.rows} are recorded"
    return Loaded(spec, file, found_version, digest, tuple(rows), tuple(ragged), "", remark)


def _text_rows(text: str, spec: FileSpec) -> tuple[list[tuple[int, Mapping[str, Any]]], list[tuple[int, int]]]:
    lines = csv.reader(text.splitlines(), delimiter="\t", quoting=csv.QUOTE_NONE)
    header = tuple(next(lines, ()))
    if header != spec.columns:
        pairs = zip(spec.columns, (*header, *[""] * len(spec.columns)), strict=False)
        odd = next((found or "nothing" for wanted, found in pairs if wanted != found), "one more")
        raise ValueError(f"its columns have changed, first at {odd!r}: another layout than the one recorded")
    rows: list[tuple[int, Mapping[str, Any]]] = []
    ragged: list[tuple[int, int]] = []
    width = len(header)
    for number, cells in enumerate(lines, start=2):
        if len(cells) == width:
            rows.append((number, dict(zip(header, cells, strict=True))))
        else:
            ragged.append((number, len(cells)))
    return rows, ragged


def _json_rows(text: str) -> tuple[list[tuple[int, Mapping[str, Any]]], list[tuple[int, int]]]:
    data = json.loads(text)
    if not isinstance(data, dict):
        raise ValueError("not a table of CAS RN to lists: another layout than the one recorded")
    rows: list[tuple[int, Mapping[str, Any]]] = []
    ragged: list[tuple[int, int]] = []
    for number, (cas, lists) in enumerate(data.items(), start=1):
        if (
            isinstance(lists, list)
            and len(lists) == 2
            and all(isinstance(part, list) for part in lists)
            and len(lists[0]) == len(lists[1])
            and all(isinstance(x, (int, float)) for part in lists for x in part)
        ):
            rows.append((number, {"CAS": cas, "T": lists[0], "cp": lists[1]}))
        else:
            ragged.append((number, len(lists) if isinstance(lists, list) else 1))
    return rows, ragged
