"""``propdb fuel template|add|show``."""

from __future__ import annotations

from typing import Annotated

import typer

from propdb.cli.app import Call, family, note, verb, write

app = family("Fuels from an ultimate analysis and a calorific value: write a template, add, show.")


@verb(app, "propdb fuel template", without=("as_of", "json"))
def template(call: Call) -> None:
    """Write a template to fill in: redirect it to a file, and give that to fuel add."""
    write(call.unopened.fuel_template())


@verb(app, "propdb fuel add my-fuel.toml", "propdb fuel add my-fuel.toml --basis dry --dry-run", without=("as_of",))
def add(
    call: Call,
    file: Annotated[
        str, typer.Argument(metavar="FILE", help="TOML, as propdb fuel template writes it.", show_default=False)
    ],
    basis: Annotated[
        str | None,
        typer.Option(
            "--basis",
            metavar="BASIS",
            help="On which the fuel stands in the store: as-received, air-dried, dry or dry-ash-free (ar, ad, d, daf).",
            show_default=False,
        ),
    ] = None,
    dry_run: Annotated[bool, typer.Option("--dry-run", help="Only say what would be added.")] = False,
) -> None:
    """Add a fuel as a pseudo-species, its calorific value being a draft until somebody approves it."""
    from propdb.cli.fueltext import fuel_text

    sheet = call.store.fuel_add(file, basis=basis, dry_run=dry_run)
    call.show(sheet.as_dict, lambda: fuel_text(sheet))
    if dry_run:
        note("nothing was written")
    else:
        note(f"{sheet.name}: entry {sheet.entry} ({sheet.status}); a draft enters no computation until it is approved")


@verb(app, "propdb fuel show 'wood chips, example'")
def show(
    call: Call,
    fuel: Annotated[str, typer.Argument(metavar="FUEL", help="Name of a fuel that was added.", show_default=False)],
) -> None:
    """Show a fuel: analysis, calorific values and formation enthalpy on each basis."""
    from propdb.cli.fueltext import fuel_text

    sheet = call.store.fuel_show(fuel)
    call.show(sheet.as_dict, lambda: fuel_text(sheet))
