"""``propdb store info|intake|check|path|rebuild|backup``."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from propdb.cli.app import Call, family, note, verb, write

app = family("Look after the store: info, intake, check, path, rebuild, backup.")


@verb(app, "propdb store info", "propdb store info --coverage")
def info(
    call: Call,
    coverage: Annotated[bool, typer.Option("--coverage", help="Count species and entries by quantity and source.")] = (
        False
    ),
) -> None:
    """Show what the store holds, its hash and log head."""
    from propdb.cli.storetext import info_text

    found = call.store.store_info(coverage=coverage)
    call.show(lambda: found, lambda: info_text(found))


@verb(app, "propdb store intake", "propdb store intake --refused")
def intake(
    call: Call,
    refused: Annotated[bool, typer.Option("--refused", help="List every row that gave nothing, and why.")] = False,
) -> None:
    """Show what became of each row of the package files when the store was built."""
    from propdb.cli.storetext import intake_text

    found = call.store.store_intake(refused=refused)
    call.show(lambda: found, lambda: intake_text(found))


@verb(app, "propdb store check")
def check(call: Call) -> None:
    """Check the file, its content hash and the chain of its log."""
    from propdb.cli.storetext import info_text

    found = call.store.store_check()
    call.show(lambda: found, lambda: info_text(found))


@verb(app, "propdb store path", without=("as_of", "json"))
def path(call: Call) -> None:
    """Print where the store is."""
    write(str(call.unopened.store_path()))


@verb(app, "propdb store rebuild", without=("as_of", "json"))
def rebuild(call: Call) -> None:
    """Bring in the data of this version again; what you added or decided stays."""
    from propdb.cli.storetext import info_text

    write(info_text(call.unopened.store_rebuild(note)))


@verb(app, "propdb store backup my-backup.db", without=("as_of", "json"))
def backup(
    call: Call, file: Annotated[str, typer.Argument(metavar="FILE", help="File to write; it must not exist yet.")]
) -> None:
    """Copy the whole store to a file, also while in use."""
    call.store.store_backup(Path(file))
    note(f"wrote {file}")
