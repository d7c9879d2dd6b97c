"""Every verb of the command line with its command."""

from __future__ import annotations

from importlib import import_module
from typing import Any

import typer

from propdb.cli.main import VERBS


def commands() -> dict[str, Any]:
    """Verb (those of families as two words) -> its command."""
    found: dict[str, Any] = {}
    for verb, (module, _) in VERBS.items():
        command: Any = typer.main.get_command(import_module(module).app)
        members = getattr(command, "commands", None)
        found.update({f"{verb} {name}": member for name, member in members.items()} if members else {verb: command})
    return found
