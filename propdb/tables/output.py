"""Output that appears whole or not at all, with its hash."""

from __future__ import annotations

import hashlib
import os
import shutil
from collections.abc import Callable, Mapping
from pathlib import Path
from types import MappingProxyType, TracebackType
from typing import Any, BinaryIO, Self

from propdb.errors import InvalidInput, PropdbError

__all__ = ["HashedReader", "HashedWriter", "Whole", "check_paths", "sha256_of"]

_CHUNK = 1 << 20


def check_paths(source: Path, target: Path, *, overwrite: bool) -> None:
    """Refuse an input that is not there, an output that is the input or exists. Raises PropdbError, InvalidInput."""
    if not source.exists():
        raise PropdbError("there is no such file", where=str(source), hint="correct the path")
    if not source.is_file() and not source.is_dir():
        raise InvalidInput("is neither a file nor a directory", where=str(source), hint="save it to a file first")
    if target.exists() and os.path.samefile(source, target):
        raise InvalidInput("the output is the input", where=str(target), hint="give another name")
    if source.is_dir() and source.resolve() in target.resolve().parents:
        raise InvalidInput("the output lies in the input directory", where=str(target), hint="give another place")
    if not target.parent.is_dir():
        raise PropdbError("there is no such directory", where=str(target.parent), hint="make it first")
    if target.exists() and not overwrite:
        raise InvalidInput("the output exists", where=str(target), hint="give another name, or --overwrite")
    if target.exists() and target.is_dir() != source.is_dir():
        raise InvalidInput("input and output must both be files, or both directories", where=str(target))


def cannot(target: Path, error: OSError) -> PropdbError:
    """A disk that is full, a directory that cannot be written: one line."""
    return PropdbError(
        f"the output cannot be written: {error.strerror or error}", where=str(target), hint="nothing was written"
    )


class Whole:
    """A place beside the output to write to. :meth:`commit` moves it there; without that, nothing is left behind.

    Parameters
    ----------
    target : path
        File or directory.
    directory : bool
        Whether it is a directory.
    """

    def __init__(self, target: Path, *, directory: bool = False) -> None:
        self.target = target
        self.part = target.with_name(f".{target.name}.{os.getpid()}.part")
        self._directory = directory
        self._done = False

    def __enter__(self) -> Self:
        try:
            if self._directory:
                self.part.mkdir()
            else:
                self.part.touch(exist_ok=False)
        except OSError as error:
            raise cannot(self.target, error) from None
        return self

    def clear(self) -> None:
        """Empty the place, to write to it again."""
        if self._directory:
            shutil.rmtree(self.part)
            self.part.mkdir()
        else:
            self.part.write_bytes(b"")

    def commit(self, *beside: tuple[Path, bytes]) -> None:
        """Move the output to its place, then write the small files that go with it."""
        try:
            for file, content in beside:
                file.with_name(f".{file.name}.{os.getpid()}.part").write_bytes(content)
            if self._directory and self.target.exists():
                self._exchange()
            else:
                os.replace(self.part, self.target)
            for file, _ in beside:
                os.replace(file.with_name(f".{file.name}.{os.getpid()}.part"), file)
        except OSError as error:
            for file, _ in beside:
                file.with_name(f".{file.name}.{os.getpid()}.part").unlink(missing_ok=True)
            raise cannot(self.target, error) from None
        self._done = True

    def _exchange(self) -> None:
        """A directory cannot be replaced in one go: the old one goes aside, and comes back if the new one cannot."""
        old = self.part.with_suffix(".old")
        os.replace(self.target, old)
        try:
            os.replace(self.part, self.target)
        except BaseException:
            os.replace(old, self.target)
            raise
        shutil.rmtree(old, ignore_errors=True)

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._done:
            return
        if self._directory:
            shutil.rmtree(self.part, ignore_errors=True)
        else:
            self.part.unlink(missing_ok=True)
        if isinstance(error, OSError) and not isinstance(error, PropdbError):
            raise cannot(self.target, error) from None


class HashedWriter:
    """A binary file that hashes what is written to it."""

    def __init__(self, file: BinaryIO) -> None:
        self._file = file
        self._hash = hashlib.sha256()
        self.size = 0
        self.closed = False

    def write(self, data: Any) -> int:
        """Write bytes, or anything with their buffer."""
        self._file.write(data)
        self._hash.update(data)
        size = len(memoryview(data))
        self.size += size
        return size

    def flush(self) -> None:
        self._file.flush()

    def tell(self) -> int:
        return self.size

    def writable(self) -> bool:
        return True

    def readable(self) -> bool:
        return False

    def seekable(self) -> bool:
        return False

    def close(self) -> None:
        if not self.closed:
            self._file.flush()
            os.fsync(self._file.fileno())
            self._file.close()
            self.closed = True

    def hexdigest(self) -> str:
        return self._hash.hexdigest()


class HashedReader:
    """Reads a file from its beginning to its end, and hashes it."""

    def __init__(self, file: BinaryIO) -> None:
        self._file = file
        self._hash = hashlib.sha256()
        self.size = 0

    def read(self, size: int) -> bytes:
        data = self._file.read(size)
        self._hash.update(data)
        self.size += len(data)
        return data

    def hexdigest(self) -> str:
        return self._hash.hexdigest()


def sha256_of(
    path: Path, tell: Callable[[int], None] | None = None, known: Mapping[Path, str] = MappingProxyType({})
) -> str:
    """SHA-256 of a file in hex; of a directory, of its sorted list of names and hashes, but for those ``known``."""
    if path.is_dir():
        lines = [
            f"{known.get(file) or sha256_of(file)}  {file.relative_to(path).as_posix()}\n"
            for file in sorted(path.rglob("*"))
            if file.is_file()
        ]
        return hashlib.sha256("".join(lines).encode()).hexdigest()
    digest = hashlib.sha256()
    with path.open("rb") as file:
        while chunk := file.read(_CHUNK):
            digest.update(chunk)
            if tell is not None:
                tell(len(chunk))
    return digest.hexdigest()
