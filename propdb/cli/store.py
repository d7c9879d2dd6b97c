"""``propdb store info|intake|check|path|log|setting|rebuild|backup``."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from propdb.cli.app import Call, family, note, verb, write

app = family("Look after the store: info, intake, check, path, log, setting, rebuild, backup.")


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


@verb(app, "propdb store log", "propdb store log --last 20 --json", "propdb store log --verify")
def log(
    call: Call,
    last: Annotated[
        int | None, typer.Option("--last", metavar="N", help="Only the last events.", show_default=False)
    ] = None,
    verify: Annotated[
        bool, typer.Option("--verify", help="Check that everything is as propdb wrote it; list whatever is not.")
    ] = False,
) -> None:
    """Show what was built, added and decided, and the head of the log; with --json one event a line."""
    from propdb.cli.reviewtext import event_dict, head_text, log_text
    from propdb.errors import IntegrityError

    try:
        found = (call.unopened if verify else call.store).store_log(last=last, verify=verify)
    except IntegrityError as error:
        facts = error.fields
        if "findings" in facts:
            call.show_lines(lambda: facts["findings"], lambda: "\n".join(facts["problems"]))
        raise
    if verify and not call.json:
        write(f"everything is as it was written; {head_text(found)}")
    else:
        call.show_lines(lambda: [event_dict(line.event, line) for line in found.lines], lambda: log_text(found))


@verb(app, "propdb store setting", "propdb store setting self-review off")
def setting(
    call: Call,
    name: Annotated[str | None, typer.Argument(metavar="NAME", help="self-review.", show_default=False)] = None,
    value: Annotated[
        str | None,
        typer.Argument(
            metavar="VALUE", help="on or off: may people check, approve and waive their own.", show_default=False
        ),
    ] = None,
) -> None:
    """Show the settings of the store, or change one; the log records it."""
    from propdb.cli.storetext import info_text

    found = call.store.store_setting(name, value)
    call.show(lambda: found, lambda: info_text(found))


@verb(app, "propdb store rebuild", without=("as_of", "json"))
def rebuild(
    call: Call,
    open_data: Annotated[
        bool,
        typer.Option(
            "--open-data/--without-open-data", help="With what the chemicals library carries, 50,000 entries, or not."
        ),
    ] = True,
) -> None:
    """Bring in the data of this version again; what you added or decided stays.

    With --without-open-data the store holds only what was typed and cross-checked; the rest becomes inactive.
    """
    from propdb.cli.storetext import info_text

    write(info_text(call.unopened.store_rebuild(note, open_data=open_data)))


@verb(app, "propdb store backup my-backup.db", without=("as_of", "json"))
def backup(
    call: Call, file: Annotated[str, typer.Argument(metavar="FILE", help="File to write; it must not exist yet.")]
) -> None:
    """Copy the whole store to a file, also while in use."""
    call.store.store_backup(Path(file))
    note(f"wrote {file}")
