"""A file of the user's: what kind it is, and its text; refused in one line when it is none of those that are read."""

from __future__ import annotations

import os
import re
import stat
from dataclasses import dataclass
from hashlib import sha256
from pathlib import Path

from propdb.errors import InvalidInput, NotFound

__all__ = ["MAX_BYTES", "UserFile", "read_file"]

#: Largest file that is read [byte]: templates hold some hundred bytes a row, literature files some hundred a value.
MAX_BYTES = 32 * 1024 * 1024

_MARKS = (
    (b"\xff\xfe", "is in UTF-16", "save it as UTF-8"),
    (b"\xfe\xff", "is in UTF-16", "save it as UTF-8"),
    (b"PK\x03\x04", "is a workbook or an archive, not a text", "save the sheet as CSV (UTF-8)"),
    (b"\xd0\xcf\x11\xe0", "is a workbook of an old kind, not a text", "save the sheet as CSV (UTF-8)"),
    (b"SQLite format 3", "is a database, not a text", "give a CSV or TOML template or a ThermoML file"),
    (b"%PDF", "is a PDF, not a text", "give a CSV or TOML template or a ThermoML file"),
)
_TOML = re.compile(r"^\s*(?:\[\[?\s*[\w.\"' -]+\s*\]\]?\s*(?:#.*)?$|[\w-]+\s*=)")


@dataclass(frozen=True, slots=True)
class UserFile:
    """A file as it was read: ``kind`` is ``csv``, ``toml`` or ``xml``; ``text`` is without byte order mark."""

    name: str
    kind: str
    text: str
    digest: str  # SHA-256 of the bytes


def read_file(path: str | os.PathLike[str]) -> UserFile:
    """Read a file and tell its kind, by what is in it and then by its name.

    Raises
    ------
    NotFound
        There is no such file.
    InvalidInput
        It cannot be read, is too large, is not UTF-8, or is none of the kinds.
    """
    place = Path(path)
    name = (place.name or os.fspath(path)).encode("utf-8", "replace").decode("utf-8")
    raw = _bytes(place, name)
    for mark, problem, hint in _MARKS:
        if raw.startswith(mark):
            raise InvalidInput(f"the file {problem}", where=name, hint=hint)
    if raw[:2].count(0) or raw[:4].count(0) > 1:
        raise InvalidInput("the file is in UTF-16 or UTF-32, or not a text", where=name, hint="save it as UTF-8")
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = raw.count(b"\n", 0, error.start) + 1
        raise InvalidInput(
            f"byte {raw[error.start]:#04x} is not UTF-8", where=f"{name}, line {line}", hint="save the file as UTF-8"
        ) from None
    if "\0" in text:
        line = text.count("\n", 0, text.index("\0")) + 1
        raise InvalidInput("the file holds a NUL character", where=f"{name}, line {line}", hint="save it as UTF-8")
    if not text.strip():
        raise InvalidInput("the file is empty", where=name, hint="`propdb add --template csv` writes a template")
    return UserFile(name, _kind(place, text, name), text, sha256(raw).hexdigest())


def _bytes(place: Path, name: str) -> bytes:
    try:
        status = place.stat()
        if stat.S_ISDIR(status.st_mode):
            raise InvalidInput("this is a directory", where=name, hint="give a file")
        if not stat.S_ISREG(status.st_mode):
            raise InvalidInput("this is not a regular file", where=name, hint="give a file")
        with place.open("rb") as file:
            raw = file.read(MAX_BYTES + 1)
    except FileNotFoundError:
        raise NotFound("there is no such file", where=name, hint="`propdb add --template csv` writes one") from None
    except (OSError, ValueError) as error:
        problem = getattr(error, "strerror", None) or str(error)
        raise InvalidInput(f"cannot be read: {problem}", where=name, hint="check the file and its rights") from None
    if len(raw) > MAX_BYTES:
        problem = f"the file is larger than {MAX_BYTES // 1024**2} MiB"
        raise InvalidInput(problem, where=name, hint="split it, and give the parts in turn")
    return raw


def _kind(place: Path, text: str, name: str) -> str:
    suffix = place.suffix.lower()
    if text.lstrip().startswith("<"):
        return "xml"
    if suffix in (".toml", ".csv"):
        return suffix[1:]
    first = next((line for line in text.splitlines() if line.strip() and not line.lstrip().startswith("#")), "")
    if _TOML.match(first):
        return "toml"
    if "species" in first.lower() and re.search(r"[,;\t]", first):
        return "csv"
    raise InvalidInput(
        "this is none of the kinds that are read",
        where=name,
        hint="give a template (`propdb add --template csv`, or toml) or a ThermoML file (XML)",
    )
