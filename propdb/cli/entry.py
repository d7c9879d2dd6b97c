"""``propdb entry show``."""

from __future__ import annotations

from typing import Annotated

import typer

from propdb.cli.app import Call, family, verb

app = family("Show one entry with all that is known about it.")


@verb(app, "propdb entry show e03c1457")
def show(
    call: Call,
    id: Annotated[
        str, typer.Argument(metavar="ENTRY", help="Id of the entry, or its first characters.", show_default=False)
    ],
) -> None:
    """Show an entry: the number as carried, its value in SI, range, uncertainty, source, carriers and status."""
    from propdb.cli.sheets import entry_dict, entry_text

    entry = call.store.entry_show(id)
    call.show(lambda: entry_dict(entry), lambda: entry_text(entry))
