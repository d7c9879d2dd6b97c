"""``propdb convert``."""

from __future__ import annotations

from typing import Annotated

import typer

from propdb.cli.app import Call, single, verb
from propdb.cli.options import DATUM_HELP, Crosscheck, Extrapolate, Form, Phase, SourceKey, SpeciesOption, Temperature

app = single()


@verb(
    app,
    "propdb convert 2800.8 kJ/kg --species water --from steam-triple-point --to elements-298K --unit kJ/mol",
    'propdb convert -393.51 kJ/mol --species "carbon dioxide" --from elements-298K --to combustion-net-25C',
)
def convert(
    call: Call,
    value: Annotated[
        str,
        typer.Argument(
            metavar="VALUE", help="The tabulated enthalpy, e.g. 2800.8 or '2800.8 kJ/kg'.", show_default=False
        ),
    ],
    value_unit: Annotated[
        str | None, typer.Argument(metavar="[UNIT]", help="Its unit: kJ/kg, kJ/mol, BTU/lb ...", show_default=False)
    ] = None,
    *,
    species: SpeciesOption,
    from_: Annotated[str, typer.Option("--from", metavar="DATUM", help="Datum of the table.", show_default=False)],
    to: Annotated[str, typer.Option("--to", metavar="DATUM", help=f"Datum wanted. {DATUM_HELP}", show_default=False)],
    phase: Phase = None,
    form: Form = None,
    temperature: Temperature = None,
    unit: Annotated[
        str | None,
        typer.Option("--unit", metavar="UNIT", help="Unit of the answer; as given if left out.", show_default=False),
    ] = None,
    source: SourceKey = None,
    extrapolate: Extrapolate = False,
    crosscheck: Crosscheck = False,
) -> None:
    """Move a tabulated enthalpy from one datum to another, step by step.

    Phase and temperature of the state are needed only where a datum depends on the temperature of the state
    (elements-same-T).
    """
    answer = call.store.convert(
        value,
        value_unit,
        species=species,
        from_=from_,
        to=to,
        phase=phase,
        form=form,
        temperature=temperature,
        to_unit=unit,
        source=source,
        extrapolate=extrapolate,
        crosscheck=crosscheck,
    )
    call.show(answer.as_dict, answer.explain)
