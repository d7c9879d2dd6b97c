"""``propdb add``."""

from __future__ import annotations

import sys
from typing import Annotated

import typer

from propdb.cli.app import Call, note, single, verb, write
from propdb.errors import InvalidInput

app = single()


@verb(
    app,
    "propdb add my-values.csv --dry-run",
    "propdb add my-values.csv",
    "propdb add --template csv new-values.csv",
    "propdb add --template toml",
    without=("as_of",),
)
def add(
    call: Call,
    values: Annotated[
        str | None, typer.Argument(metavar="FILE", help="Filled template, CSV or TOML.", show_default=False)
    ] = None,
    template: Annotated[
        str | None,
        typer.Option("--template", metavar="csv|toml", help="Write an empty template to FILE, or print it."),
    ] = None,
    dry_run: Annotated[bool, typer.Option("--dry-run", help="Only say what would happen.")] = False,
) -> None:
    """Add values of your own as drafts: from a filled template, or asked for one by one in a terminal.

    All of a file goes in, or nothing. Drafts enter no computation until somebody else has checked them (propdb review).
    """
    from propdb.cli.intaketext import show_report

    if template is not None:
        _template(template, values)
    elif values is not None:
        show_report(call, call.store.add(values, dry_run=dry_run))
    elif sys.stdin is not None and sys.stdin.isatty():
        from propdb.cli.guided import ask_entry

        ask_entry(call, dry_run=dry_run)
    else:
        raise InvalidInput(
            "nothing to add: no file is named, and this is no terminal to ask in",
            hint="`propdb add --template csv my-values.csv` writes a template to fill in",
        )


def _template(kind: str, file: str | None) -> None:
    from propdb.intake.templates import template

    text = template(kind)
    if file is None:
        write(text)
        return
    try:
        with open(file, "x", encoding="utf-8", newline="\n") as out:
            out.write(text)
    except FileExistsError:
        raise InvalidInput("the file exists", where=file, hint="name another; a filled template is not lost") from None
    except (OSError, ValueError) as error:
        problem = getattr(error, "strerror", None) or error
        raise InvalidInput(f"cannot be written: {problem}", where=file) from None
    note(f"wrote {file}")
