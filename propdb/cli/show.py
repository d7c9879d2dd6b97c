"""``propdb show``."""

from __future__ import annotations

from typing import Annotated

import typer

from propdb.cli.app import Call, single, verb
from propdb.cli.options import Phase, SourceKey, SpeciesArgument

app = single()


@verb(app, "propdb show water", "propdb show water --quantity Hf", 'propdb show "carbon dioxide" --phase g --json')
def show(
    call: Call,
    species: SpeciesArgument,
    quantity: Annotated[
        str | None,
        typer.Option(
            metavar="QUANTITY",
            help="Hf Gf S Cp Hvap Hfus Hsub Htr dH0 Tb Tm Tc Pc or omega.",
            show_default=False,
        ),
    ] = None,
    phase: Phase = None,
    source: SourceKey = None,
) -> None:
    """Show every entry of a species: value, range, uncertainty, datum, source and status.

    Hf, Gf: enthalpy and Gibbs energy of formation; S: standard entropy; Cp: heat capacity; Hvap, Hfus, Hsub, Htr:
    enthalpy of vaporisation, fusion, sublimation, transition; dH0: H(298.15 K) - H(0 K); Tb, Tm, Tc: boiling, melting
    and critical temperature; Pc: critical pressure; omega: acentric factor. In each phase what answers use first stands
    first, as far as its range goes.
    """
    from propdb.cli.sheets import sheet_dict, sheet_text

    sheet = call.store.show(species, quantity=quantity, phase=phase, source=source)
    call.show(lambda: sheet_dict(sheet), lambda: sheet_text(sheet))
