"""Options that mean the same with every verb."""

from __future__ import annotations

from typing import Annotated

import typer


def _option(flag: str, metavar: str, text: str) -> typer.models.OptionInfo:
    option: typer.models.OptionInfo = typer.Option(flag, metavar=metavar, help=text, show_default=False)
    return option


SpeciesArgument = Annotated[
    str, typer.Argument(metavar="SPECIES", help="Name, formula, CAS RN or InChIKey.", show_default=False)
]
SpeciesOption = Annotated[str, _option("--species", "SPECIES", "Name, formula, CAS RN or InChIKey.")]
Phase = Annotated[str | None, _option("--phase", "PHASE", "cr, am, l, g (ideal gas), fluid (real fluid) or aq.")]
Form = Annotated[str | None, _option("--form", "FORM", "Form of a solid: graphite, rhombic, quartz ...")]
Temperature = Annotated[str | None, _option("--temperature", "T", "With its unit: 600C, 873.15K, 1112F, 1571.67R.")]
Pressure = Annotated[str | None, _option("--pressure", "P", "Absolute, with its unit: 40bar, 1atm, 0.1MPa, 600psi.")]
Saturated = Annotated[str | None, _option("--saturated", "liquid|vapour", "The saturated liquid or vapour.")]
Unit = Annotated[str, typer.Option("--unit", metavar="UNIT", help="Unit of the answer: kJ/mol, kJ/kg, BTU/lb ...")]
SourceKey = Annotated[
    str | None, _option("--source", "KEY", "Use this source only; propdb source list shows the keys.")
]
Extrapolate = Annotated[
    bool, typer.Option("--extrapolate", help="Go outside the range of the data; the answer is marked.")
]
Crosscheck = Annotated[
    bool, typer.Option("--crosscheck", help="Compare with other compilations at the state itself, too.")
]
DATUM_HELP = "Name (propdb datum list), or in place: own:l@65C, own:g@60F, own:l,saturated@0C=200kJ/kg."
