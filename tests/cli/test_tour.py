"""The tour in README.md, followed as a new user would: every command line and every piece of Python in it runs."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

import pytest

from propdb.errors import PropdbError

README = (Path(__file__).resolve().parents[2] / "README.md").read_text(encoding="utf-8")
_BLOCK = re.compile(r"([^\n]+(?:\n[^\n]+)*)\n\n```(console|python)\n(.*?)```", re.DOTALL)


def _tour() -> list[tuple[bool, str]]:
    """(is refused, command line); the paragraph before a block of refused lines says so."""
    return [
        ("refused" in words, line.removeprefix("$ "))
        for words, language, block in _BLOCK.findall(README)
        if language == "console"
        for line in block.splitlines()
        if line.startswith("$ propdb ") and "store log" not in line and "vendor-12" not in line
    ]  # what needs the files and users of the tour is run by the check of the generated documents


def test_the_tour_is_found() -> None:
    assert len(_tour()) > 10
    assert {refused for refused, _ in _tour()} == {True, False}


@pytest.mark.parametrize("refused, command", _tour(), ids=[command for _, command in _tour()])
def test_command(line: Any, refused: bool, command: str) -> None:
    assert command.startswith("propdb ")
    result = line(command)
    if refused:
        assert result.problem
    else:
        assert result.code == 0, result.err
        assert result.out


@pytest.mark.parametrize("code", [block for _, language, block in _BLOCK.findall(README) if language == "python"])
def test_python(default_store: Path, code: str, capsys: pytest.CaptureFixture[str]) -> None:
    exec(compile(code, "README.md", "exec"), {})  # noqa: S102
    assert capsys.readouterr().out


def test_exit_codes_are_listed() -> None:
    listed = {int(code) for code in re.findall(r"(?:Exit codes: |; )(\d+) ", README[README.index("Exit codes:") :])}

    def codes(cls: type[PropdbError]) -> set[int]:
        return {cls.exit_code}.union(*(codes(sub) for sub in cls.__subclasses__()))

    assert codes(PropdbError) - {1} <= listed
