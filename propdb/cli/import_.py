"""``propdb import``."""

from __future__ import annotations

from typing import Annotated

import typer

from propdb.cli.app import Call, single, verb

app = single()


@verb(
    app,
    "propdb import my-values.csv --dry-run",
    "propdb import my-values.csv --json",
    name="import",
    without=("as_of",),
)
def import_(
    call: Call,
    path: Annotated[
        str, typer.Argument(metavar="FILE", help="Template (CSV, TOML) or ThermoML (XML).", show_default=False)
    ],
    dry_run: Annotated[bool, typer.Option("--dry-run", help="Only say what would happen.")] = False,
) -> None:
    """Bring in a file as drafts, and say what was taken, what was skipped and why.

    ThermoML, the IUPAC standard for thermodynamic data, gives heat capacities and enthalpies of transition and
    formation of pure species with their uncertainties and citation; it needs the optional dependency: pip install
    "propdb[thermoml]". All of a file goes in, or nothing.
    """
    from propdb.cli.intaketext import show_report

    show_report(call, call.store.import_file(path, dry_run=dry_run))
