"""``propdb enthalpy``."""

from __future__ import annotations

from typing import Annotated

import typer

from propdb.cli.app import Call, single, verb
from propdb.cli.options import (
    DATUM_HELP,
    Crosscheck,
    Extrapolate,
    Form,
    Pressure,
    Saturated,
    SourceKey,
    SpeciesArgument,
    Temperature,
    Unit,
)

app = single()


@verb(
    app,
    "propdb enthalpy nitrogen --phase g --temperature 600C --datum gas-25C --unit kJ/mol",
    "propdb enthalpy methane --phase g --temperature 1000K --datum elements-298K --crosscheck",
    "propdb enthalpy water --phase fluid --pressure 40bar --saturated vapour --datum steam-triple-point --unit kJ/kg",
)
def enthalpy(
    call: Call,
    species: SpeciesArgument,
    phase: Annotated[
        str,
        typer.Option(metavar="PHASE", help="cr, am, l, g (ideal gas), fluid (real fluid) or aq.", show_default=False),
    ],
    datum: Annotated[str, typer.Option(metavar="DATUM", help=DATUM_HELP, show_default=False)],
    form: Form = None,
    temperature: Temperature = None,
    pressure: Pressure = None,
    saturated: Saturated = None,
    unit: Unit = "kJ/mol",
    source: SourceKey = None,
    extrapolate: Extrapolate = False,
    crosscheck: Crosscheck = False,
) -> None:
    """Give the enthalpy of a state on a datum, with every step, entry, source and check behind it."""
    answer = call.store.enthalpy(
        species,
        phase=phase,
        form=form,
        temperature=temperature,
        pressure=pressure,
        saturated=saturated,
        datum=datum,
        unit=unit,
        source=source,
        extrapolate=extrapolate,
        crosscheck=crosscheck,
    )
    call.show(answer.as_dict, answer.explain)
