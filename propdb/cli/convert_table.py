"""``propdb convert-table``."""

from __future__ import annotations

import sys
from typing import Annotated

import typer

from propdb.cli.app import Call, note, single, verb
from propdb.cli.options import DATUM_HELP, Extrapolate, Form, Phase, Pressure, Saturated, SourceKey, Temperature

app = single()

#: Exit code of a run that is over and left rows without a number.
BAD_ROWS = 11


def _option(flag: str, metavar: str, text: str) -> typer.models.OptionInfo:
    option: typer.models.OptionInfo = typer.Option(flag, metavar=metavar, help=text, show_default=False)
    return option


@verb(
    app,
    "propdb convert-table streams.csv converted.csv --to elements-298K",
    "propdb convert-table steam.csv converted.csv --species water --from steam-triple-point --to elements-298K",
    "propdb convert-table states.csv evaluated.csv --to elements-298K --phase g --unit kJ/kg",
    name="convert-table",
)
def convert_table(
    call: Call,
    table: Annotated[
        str,
        typer.Argument(metavar="IN", help="CSV, TSV, Excel, Parquet, or a directory of Parquet.", show_default=False),
    ],
    out: Annotated[str, typer.Argument(metavar="OUT", help="The converted table.", show_default=False)],
    to: Annotated[str, _option("--to", "DATUM", f"Datum wanted, or suggest. {DATUM_HELP}")],
    from_: Annotated[str | None, _option("--from", "DATUM", "Datum of all rows; else a column says it.")] = None,
    species: Annotated[str | None, _option("--species", "SPECIES", "Of all rows; else a column says it.")] = None,
    phase: Phase = None,
    form: Form = None,
    temperature: Temperature = None,
    pressure: Pressure = None,
    saturated: Saturated = None,
    unit: Annotated[
        str | None, _option("--unit", "UNIT", "Of the enthalpies, where the header does not say: h [kJ/kg].")
    ] = None,
    column: Annotated[
        list[str] | None,
        _option(
            "--column",
            "ROLE=NAME",
            "Which column is what: species, datum, phase, form, temperature, pressure, enthalpy, flow, stream, side.",
        ),
    ] = None,
    units: Annotated[
        list[str] | None,
        _option(
            "--units",
            "ROLE=UNIT",
            "Unit of a temperature, pressure or flow column: temperature=C, pressure=barg+1.01325bar.",
        ),
    ] = None,
    composition: Annotated[
        str, _option("--composition", "wet|dry", "dry: fractions but that of water sum to 1; water is of the whole.")
    ] = "wet",
    decimal: Annotated[str, _option("--decimal", "point|comma", "Decimal sign of a text table.")] = "point",
    digits: Annotated[int | None, _option("--digits", "N", "Decimals written; else as in the column.")] = None,
    sheet: Annotated[str | None, _option("--sheet", "NAME", "Sheet of a workbook.")] = None,
    across: Annotated[bool, typer.Option("--across", help="Sum streams across a reaction on any datum.")] = False,
    overwrite: Annotated[bool, typer.Option("--overwrite", help="Replace an output that exists.")] = False,
    source: SourceKey = None,
    extrapolate: Extrapolate = False,
    scheduler: Annotated[
        str | None, _option("--scheduler", "ADDRESS", "Dask scheduler that shares out a directory of Parquet.")
    ] = None,
    workers: Annotated[int | None, _option("--workers", "N", "The same with N processes of this machine.")] = None,
) -> None:
    """Convert every enthalpy of a table to another datum, or compute them where it has no column of them.

    Columns are found by their headers: species, datum, phase, T [°C], p [bar], h [kJ/kg]; mixtures by x[nitrogen] or
    w[water]; with flow [kg/h], stream and side (in, out) the summary adds up enthalpy flows and the duty. What was
    there stays as it is. Added are the enthalpy, its standard uncertainty, the shift, and a flag with its reason;
    OUT.propdb.json says where every number came from. Exit code 11: done, and some rows could not be converted.
    """
    shown = sys.stderr.isatty()

    def tell(text: str) -> None:
        print(f"\rpropdb: {text}   ", end="", file=sys.stderr, flush=True)

    report = call.store.convert_table(
        table,
        out,
        to=to,
        from_=from_,
        species=species,
        phase=phase,
        form=form,
        temperature=temperature,
        pressure=pressure,
        saturated=saturated,
        unit=unit,
        column=column or (),
        units=units or (),
        composition=composition,
        decimal=decimal,
        digits=digits,
        sheet=sheet,
        across=across,
        overwrite=overwrite,
        source=source,
        extrapolate=extrapolate,
        scheduler=scheduler,
        workers=workers,
        progress=tell if shown else None,
    )
    if shown:
        note("")
    call.show(report.as_dict, lambda: str(report))
    if not report.clean:
        raise typer.Exit(BAD_ROWS)
