"""``propdb tabulate``."""

from __future__ import annotations

from collections import Counter
from typing import TYPE_CHECKING, Annotated

import typer

from propdb.cli.app import Call, single, verb
from propdb.cli.options import DATUM_HELP, Extrapolate, Form, Phase, SourceKey, Unit
from propdb.model.text import columns, wrapped

if TYPE_CHECKING:
    from propdb.tables.tabulate import Tabulation

app = single()


@verb(
    app,
    "propdb tabulate water --datum elements-298K --low 0C --high 200C --step 20K",
    "propdb tabulate nitrogen oxygen --datum gas-25C --phase g --low 25C --high 600C --step 115K --unit kJ/kg",
    "propdb tabulate iron --datum elements-298K --low 300K --high 1900K --step 100K --out iron.csv",
)
def tabulate(
    call: Call,
    species: Annotated[
        list[str],
        typer.Argument(metavar="SPECIES...", help="Names, formulas, CAS RNs or InChIKeys.", show_default=False),
    ],
    datum: Annotated[str, typer.Option(metavar="DATUM", help=DATUM_HELP, show_default=False)],
    low: Annotated[str, typer.Option("--low", metavar="T", help="Lowest temperature; its scale is shown.")] = "25C",
    high: Annotated[str, typer.Option("--high", metavar="T", help="Highest temperature.")] = "1000C",
    step: Annotated[str, typer.Option("--step", metavar="DT", help="Between rows: 25K, 50F.")] = "25K",
    phase: Phase = None,
    form: Form = None,
    unit: Unit = "kJ/mol",
    out: Annotated[
        str | None,
        typer.Option("--out", metavar="FILE", help=".csv, .tsv, .xlsx, .parquet or .json.", show_default=False),
    ] = None,
    overwrite: Annotated[bool, typer.Option("--overwrite", help="Replace a file that exists.")] = False,
    source: SourceKey = None,
    extrapolate: Extrapolate = False,
) -> None:
    """Tabulate enthalpy and heat capacity over temperature, each row with its entries.

    Without --phase the table runs through the phases that are stable at 1 atm, with two marked rows where one becomes
    the next.
    """
    table = call.store.tabulate(
        species,
        datum=datum,
        low=low,
        high=high,
        step=step,
        phase=phase,
        form=form,
        unit=unit,
        out=out,
        overwrite=overwrite,
        source=source,
        extrapolate=extrapolate,
    )
    call.show(table.as_dict, lambda: text(table) if out is None else written(table, out))


def written(table: Tabulation, out: str) -> str:
    """What a person reads of a table that went to a file."""
    flags = Counter(line.flag for line in table.lines)
    count = f"{len(table.lines):,} {'row' if len(table.lines) == 1 else 'rows'}"
    shown = [f"{out}: {count}: {', '.join(f'{times:,} {flag}' for flag, times in flags.items())}"]
    shown += wrapped(f"enthalpy on {table.datum}: {table.sentence}", "  ", "    ")
    for reason, times in Counter(line.reason for line in table.lines if line.reason).most_common(8):
        shown += wrapped(f"{times:,}: {reason}", "  ", "    ")
    return "\n".join(shown)


def text(table: Tabulation) -> str:
    """The table for a terminal: entries by the first characters of their ids."""
    from propdb.model.cite import text as cite
    from propdb.tables.decimals import uncertainty_text
    from propdb.units import enthalpy_decimals, format_number, parse_unit

    places = enthalpy_decimals(parse_unit(table.unit))
    reasons = {reason: i for i, reason in enumerate(dict.fromkeys(x.reason for x in table.lines if x.reason), start=1)}
    rows: list[tuple[str, ...]] = [
        ("species", "phase", table.headers[3], f"h [{table.unit}]", "u", f"cp [{table.cp_unit}]", "", "", "entries")
    ]
    for line in table.lines:
        phase = f"{line.phase} ({line.form})" if line.form else line.phase
        rows.append(
            (
                line.species,
                phase,
                format_number(line.shown, decimals=2),
                "" if line.h is None else format_number(line.h, decimals=places),
                "" if line.uncertainty is None else uncertainty_text(line.uncertainty),
                "" if line.cp is None else format_number(line.cp, significant=5),
                f"* {line.mark}" if line.mark else "",
                "" if line.flag == "ok" else f"{line.flag} ({reasons.get(line.reason, 0)})",
                " ".join(entry[:8] for entry in line.entries if not entry.startswith("model:")),
            )
        )
    shown = [*wrapped(f"Enthalpy on {table.datum}: {table.sentence}"), ""]
    shown += columns(rows, right=(2, 3, 4, 5))
    shown += ["", *wrapped("u: standard uncertainty; empty where an entry states none. *: both sides of a transition.")]
    for reason, i in reasons.items():
        shown += wrapped(f"({i}) {reason}", "", "    ")
    shown += ["", "Sources"]
    for key, source in table.sources.items():
        shown += [f"  {key}", *wrapped(cite(source), "    ")]
    shown += ["", f"Store: {table.store}", *wrapped(table.as_dict()["caution"])]
    return "\n".join(shown)
