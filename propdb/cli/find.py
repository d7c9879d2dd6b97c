"""``propdb find``."""

from __future__ import annotations

from typing import Annotated

import typer

from propdb.cli.app import Call, single, verb

app = single()


@verb(app, "propdb find water", "propdb find C2H6O", "propdb find 64-17-5")
def find(
    call: Call,
    text: Annotated[
        list[str],
        typer.Argument(
            metavar="TEXT", help="Name, synonym, formula, CAS RN, InChIKey, or part of one.", show_default=False
        ),
    ],
    limit: Annotated[int, typer.Option(metavar="N", help="At most so many matches.")] = 10,
) -> None:
    """Find species by name, synonym, formula in any order of atoms, CAS RN or InChIKey."""
    from propdb.cli.sheets import match_dict, matches_text

    found = call.store.find(" ".join(text), limit=limit)
    call.show(lambda: {"matches": [match_dict(match) for match in found]}, lambda: matches_text(found))
