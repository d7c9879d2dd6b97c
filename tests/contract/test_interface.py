"""Verb ``a b`` or ``a-b`` is method ``a_b`` of the store with the same options; generated documents are up to date."""

from __future__ import annotations

import inspect
import subprocess
import sys
from pathlib import Path

import pytest
from verbs import commands

from propdb.api import Store
from propdb.cli.equationtext import KNOWN
from propdb.cp.registry import EQUATIONS

#: Options of the command line that are no arguments of the method, or have another name there.
SHARED = {"store", "as_of", "json", "help"}
RENAMED = {
    "find": {"text": "text"},
    "convert": {"value_unit": "unit", "unit": "to_unit"},
    "datum show": {"toml": ""},
    "add": {"template": ""},
}
#: Python's own words get an underscore or another name as methods.
METHODS = {"import": "import_file"}


COMMANDS = commands()


def _method(verb: str) -> str:
    return METHODS.get(verb, verb.replace(" ", "_").replace("-", "_"))


@pytest.mark.parametrize("verb", COMMANDS)
def test_verb_has_its_method(verb: str) -> None:
    method = getattr(Store, _method(verb))
    wanted = {name: parameter for name, parameter in inspect.signature(method).parameters.items() if name != "self"}
    renamed = RENAMED.get(verb, {})
    given = {renamed.get(param.name, param.name) for param in COMMANDS[verb].params} - SHARED - {""}
    wanted.pop("progress", None)
    assert given == set(wanted)
    assert method.__doc__


def test_method_has_its_verb() -> None:
    public = {name for name in dir(Store) if callable(getattr(Store, name)) and not name.startswith("_")}
    assert public - {"close"} == {_method(verb) for verb in COMMANDS}


def test_every_equation_can_be_printed() -> None:
    assert set(EQUATIONS) == KNOWN


@pytest.mark.extras
def test_generated_documents_are_up_to_date(root: Path) -> None:
    """With the extras, for some of the examples need them."""
    pytest.importorskip("pyarrow")
    pytest.importorskip("openpyxl")
    done = subprocess.run(
        [sys.executable, str(root / "scripts" / "reference"), "--inside", "--check"],
        capture_output=True,
        text=True,
        encoding="utf-8",
        check=False,
    )
    assert done.returncode == 0, done.stdout + done.stderr
