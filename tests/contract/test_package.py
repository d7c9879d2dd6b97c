"""The package says of itself what is true: public names, version, licences of sources, direction of imports."""

from __future__ import annotations

import subprocess
import sys
import tomllib
from pathlib import Path

import pytest

import propdb


def test_public_names_are_sorted_and_exist() -> None:
    names = propdb.__all__
    assert names == sorted(names)
    assert len(names) == len(set(names))
    for name in names:
        assert getattr(propdb, name) is not None
    assert set(names) <= set(dir(propdb))


def test_every_error_is_public_and_has_an_exit_code_of_its_branch() -> None:
    from propdb import errors

    assert errors.__all__ == sorted(errors.__all__)
    for name in errors.__all__:
        assert name in propdb.__all__
        cls = getattr(errors, name)
        assert issubclass(cls, propdb.PropdbError)
        assert 1 <= cls.exit_code <= 10


def test_unknown_names_are_attribute_errors() -> None:
    with pytest.raises(AttributeError, match="nothing_of_the_kind"):
        propdb.nothing_of_the_kind  # noqa: B018


def test_version_is_one_literal(root: Path) -> None:
    project = tomllib.loads((root / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    assert propdb.__version__ == project["version"]


def test_notice_lists_every_source(root: Path) -> None:
    notice = (root / "NOTICE").read_text(encoding="utf-8")
    keys = [
        tomllib.loads(file.read_text(encoding="utf-8"))["key"] for file in sorted(root.glob("seeds_data/*/source.toml"))
    ]
    assert keys
    missing = [key for key in keys if f"\n{key}\n" not in notice]
    assert not missing, f"NOTICE says nothing about {missing}; run python scripts/reference"


def test_imports_point_one_way(root: Path) -> None:
    code = "from importlinter.cli import lint_imports_command as run; run()"
    done = subprocess.run(
        [sys.executable, "-c", code, "--no-cache"], cwd=root, capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stdout + done.stderr


def test_import_loads_nothing_but_the_version() -> None:
    code = "import sys; before = set(sys.modules); import propdb; print(sorted(set(sys.modules) - before))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    allowed = {"__future__", "importlib", "propdb", "propdb._version", "typing"}
    loaded = set(eval(done.stdout))  # noqa: S307 - a list of strings printed by the line above
    assert {name for name in loaded if name.startswith("propdb")} == {"propdb", "propdb._version"}
    assert not loaded & {"numpy", "scipy", "pandas", "sqlite3", "importlib.metadata", "typer"}, loaded - allowed
