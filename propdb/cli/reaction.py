"""``propdb reaction``."""

from __future__ import annotations

from typing import Annotated

import typer

from propdb.cli.app import Call, single, verb
from propdb.cli.options import DATUM_HELP, Crosscheck, Extrapolate, SourceKey, Unit

app = single()


@verb(
    app,
    'propdb reaction "CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)" --temperature 25C',
    'propdb reaction "H2(g) + 1/2 O2(g) -> H2O(g)" --temperature 1000K',
)
def reaction(
    call: Call,
    equation: Annotated[
        str,
        typer.Argument(
            metavar="EQUATION",
            help="Balanced, each species with its phase: 'CO(g) + 1/2 O2(g) -> CO2(g)'.",
            show_default=False,
        ),
    ],
    temperature: Annotated[
        str, typer.Option(metavar="T", help="Of all species, with its unit: 25C, 1000K.", show_default=False)
    ],
    datum: Annotated[
        str, typer.Option(metavar="DATUM", help=f"An elements or basis-species datum. {DATUM_HELP}")
    ] = "elements-298K",
    unit: Unit = "kJ/mol",
    source: SourceKey = None,
    extrapolate: Extrapolate = False,
    crosscheck: Crosscheck = False,
) -> None:
    """Give the enthalpy of a reaction by the formation route and by sensible heats, and how well they agree."""
    answer = call.store.reaction(
        equation,
        temperature=temperature,
        datum=datum,
        unit=unit,
        source=source,
        extrapolate=extrapolate,
        crosscheck=crosscheck,
    )
    call.show(answer.as_dict, answer.explain)
