"""``propdb entry show|history``."""

from __future__ import annotations

from typing import Annotated

import typer

from propdb.cli.app import Call, family, verb

app = family("Show one entry with all that is known about it, and its history.")

Id = Annotated[
    str, typer.Argument(metavar="ENTRY", help="Id of the entry, or its first characters.", show_default=False)
]


@verb(app, "propdb entry show e03c1457")
def show(call: Call, id: Id) -> None:
    """Show an entry: the number as carried, its value in SI, range, uncertainty, source, carriers and status."""
    from propdb.cli.sheets import entry_dict, entry_text

    entry = call.store.entry_show(id)
    call.show(lambda: entry_dict(entry), lambda: entry_text(entry))


@verb(app, "propdb entry history e03c1457")
def history(call: Call, id: Id) -> None:
    """Show what happened to an entry: when it came, who decided what about it, and why."""
    from propdb.cli.reviewtext import happening_dict, history_text

    found = call.store.entry_history(id)
    call.show_lines(lambda: [happening_dict(one) for one in found], lambda: history_text(found))
