"""Running command lines in this process, as a person would type them."""

from __future__ import annotations

import io
import re
import shlex
import shutil
import sys
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path

import pytest

import propdb
from propdb.cli.main import run

#: Progress of a build, which may come before an error.
PROGRESS = re.compile(
    r"propdb: (building the store|read \d+ files of|set aside|checking \d+ entries|wrote \d+ of \d+ entries)"
)


@dataclass(frozen=True, slots=True)
class Result:
    """What a command line printed, and its exit code."""

    code: int
    out: str
    err: str

    @property
    def problem(self) -> str:
        """The one line of an error; everything else about the error is checked on the way."""
        assert self.code not in (0, 70), (self.code, self.err)
        assert self.out == ""
        assert "Traceback" not in self.err
        lines = [line for line in self.err.splitlines() if not PROGRESS.match(line)]
        assert len(lines) == 1, self.err
        assert lines[0].startswith("propdb: ")
        return lines[0]


CommandLine = Callable[..., Result]


def run_line(*words: str, encoding: str = "utf-8") -> Result:
    """Run ``propdb`` with these words, or with one text that is split as a shell would."""
    arguments = shlex.split(words[0]) if len(words) == 1 else list(words)
    if arguments[:1] == ["propdb"]:
        arguments = arguments[1:]
    out = io.TextIOWrapper(io.BytesIO(), encoding=encoding, newline="\n")
    err = io.TextIOWrapper(io.BytesIO(), encoding=encoding, newline="\n", errors="backslashreplace")  # as Python does
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(sys, "stdout", out)
        patch.setattr(sys, "stderr", err)
        code: object = 0
        try:
            run(arguments)
        except SystemExit as stop:
            code = stop.code
    assert isinstance(code, int)
    texts = []
    for stream in (out, err):
        stream.flush()
        texts.append(stream.buffer.getvalue().decode(encoding))  # type: ignore[attr-defined]
    return Result(code, *texts)


@pytest.fixture(scope="session")
def default_store() -> Path:
    """The store that all tests read, built from the seed."""
    with propdb.open() as store:
        return store.store_path()


@pytest.fixture
def line(default_store: Path) -> CommandLine:
    """Run a command line against the default store."""
    return run_line


@pytest.fixture
def own_store(default_store: Path, tmp_path: Path) -> Iterator[Path]:
    """A copy of the store that a test may write to."""
    copy = tmp_path / "own.db"
    with propdb.open() as store:
        store.store_backup(copy)
    yield copy
    shutil.rmtree(tmp_path, ignore_errors=True)
