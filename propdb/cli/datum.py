"""``propdb datum list|show|add``."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from propdb.cli.app import Call, family, note, verb, write

app = family("List, show and add datums.")


@verb(app, "propdb datum list", name="list")
def list_(call: Call) -> None:
    """List the datums: what each calls zero."""
    from propdb.cli.datumtext import datum_dict, datums_text

    found = call.store.datum_list()
    call.show(lambda: {"datums": [datum_dict(datum) for datum in found]}, lambda: datums_text(found))


@verb(app, "propdb datum show steam-triple-point", "propdb datum show own:l@65C", "propdb datum show gas-25C --toml")
def show(
    call: Call,
    name: Annotated[str, typer.Argument(metavar="DATUM", help="Name, or in place: own:l@65C.", show_default=False)],
    toml: Annotated[bool, typer.Option("--toml", help="Print TOML, as propdb datum add reads it.")] = False,
) -> None:
    """Show what a datum calls zero, in plain words and in full."""
    from propdb.cli.datumtext import datum_dict, datum_text

    datum = call.store.datum_show(name)
    if toml:
        from propdb.datum.writing import dump_toml

        write(dump_toml(datum))
        return
    call.show(lambda: datum_dict(datum), lambda: datum_text(datum))


@verb(app, "propdb datum add my-datums.toml", without=("as_of", "json"))
def add(
    call: Call,
    file: Annotated[
        str, typer.Argument(metavar="FILE", help="TOML, as propdb datum show --toml prints it.", show_default=False)
    ],
) -> None:
    """Add datums of your own from a TOML file."""
    note("added " + ", ".join(call.store.datum_add(Path(file))))
