"""``propdb find``."""

from __future__ import annotations

from typing import Annotated

import typer

from propdb.cli.app import Call, single, verb
from propdb.errors import NotFound

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

    wanted = " ".join(text)
    found = call.store.find(wanted, limit=limit)
    if found or call.json:
        call.show(lambda: {"matches": [match_dict(match) for match in found]}, lambda: matches_text(found))
    if not found:
        raise NotFound(f"no species is called anything like {wanted!r}", hint="try a formula or a CAS RN")
