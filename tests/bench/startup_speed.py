"""Cold starts: verbs against an empty typer command with the same options, the import against an empty interpreter."""

from __future__ import annotations

import compileall
import os
import subprocess
import sys
import tempfile
from collections.abc import Callable, Iterator
from pathlib import Path

from ratios import Ratio, medians

ROUNDS = 21

_SHARED = """
    store: Annotated[str | None, typer.Option("--store", metavar="FILE", help="Store to use.")] = None,
    as_of: Annotated[str | None, typer.Option("--as-of", metavar="DATE", help="The store as it stood then.")] = None,
    json: Annotated[bool, typer.Option("--json", help="Print JSON instead of text.")] = False,
"""
_EMPTY = """
{first}
from typing import Annotated
import typer
app = typer.Typer(add_completion=False)

@app.command()
def verb(
    {own}
    {shared}
) -> None:
    pass
"""
_FIND = "text: list[str], limit: int = 10,"
_SHOW = """species: str, quantity: str | None = None, phase: str | None = None, source: str | None = None,"""
_ENTHALPY = """
    species: str,
    phase: Annotated[str, typer.Option()],
    datum: Annotated[str, typer.Option()],
    form: str | None = None,
    temperature: str | None = None,
    pressure: str | None = None,
    saturated: str | None = None,
    unit: str = "kJ/mol",
    source: str | None = None,
    extrapolate: bool = False,
"""


def _process(*arguments: str, where: Path | None = None, store: Path | None = None) -> Callable[[], object]:
    environment = {key: value for key, value in os.environ.items() if key != "PYTHONDONTWRITEBYTECODE"}
    if store is not None:
        environment["PROPDB_STORE"] = str(store)

    def start() -> None:
        subprocess.run([sys.executable, *arguments], cwd=where, env=environment, stdout=subprocess.DEVNULL, check=True)

    return start


def _empty(directory: Path, name: str, own: str, first: str = "") -> None:
    (directory / f"{name}.py").write_text(_EMPTY.format(first=first, own=own, shared=_SHARED), encoding="utf-8")


def commands(store: Path | None = None, label: str = "") -> Iterator[Ratio]:
    """Verbs on a store, that of the environment unless given, each against an empty command."""
    with tempfile.TemporaryDirectory() as name:
        directory = Path(name)
        _empty(directory, "find_empty", _FIND)
        _empty(directory, "show_empty", _SHOW)
        _empty(directory, "enthalpy_empty", _ENTHALPY, first="import numpy")
        compileall.compile_dir(directory, quiet=2)
        state = ["nitrogen", "--phase", "g", "--temperature", "600C", "--datum", "gas-25C", "--unit", "kJ/mol"]
        for verb, arguments, suffix in (
            ("find", ["water"], ""),
            ("show", ["water"], ""),
            ("enthalpy", state, " with numpy"),
        ):
            start = "import sys; sys.argv[0] = 'propdb'; "
            call = f"{start}from propdb.cli import main; main()"
            ours = _process("-c", call, verb, *arguments, store=store)
            empty = _process("-c", f"{start}from {verb}_empty import app; app()", *arguments, where=directory)
            ours()  # builds the store where there is none
            mine, base = medians(ours, empty, rounds=ROUNDS)
            yield Ratio(
                f"{label}cold propdb {verb} {arguments[0]} / empty typer command{suffix}",
                mine / base,
                1.25,
                detail=f"{mine * 1e3:.0f} / {base * 1e3:.0f} ms",
            )


def run() -> Iterator[Ratio]:
    """Measure with the interpreter of this environment, everything byte-compiled."""
    from importlib.util import find_spec

    package = find_spec("propdb")
    assert package is not None
    assert package.submodule_search_locations is not None
    compileall.compile_dir(package.submodule_search_locations[0], quiet=2)
    yield from commands()
    mine, base = medians(_process("-c", "import propdb"), _process("-c", "pass"), rounds=2 * ROUNDS)
    yield Ratio("import propdb / python -c pass", mine / base, 3.0, detail=f"{mine * 1e3:.1f} / {base * 1e3:.1f} ms")
