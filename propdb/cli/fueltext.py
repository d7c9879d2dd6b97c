"""A fuel as text."""

from __future__ import annotations

from propdb.model.fuel import BASES, ELEMENTS, KINDS, PLACES, FuelSheet
from propdb.model.text import columns, pairs

_PHASES = {"cr": "solid", "am": "amorphous solid", "l": "liquid"}


def fuel_text(sheet: FuelSheet) -> str:
    """Analysis, calorific values and formation enthalpy, a row for each basis."""
    bases = list(sheet.fractions)
    lines = [f"{sheet.name}   {_PHASES[sheet.phase]}, stands in the store {_words(sheet.basis)}"]
    lines += pairs(
        [
            ("formula", f"{sheet.formula}, one mole being one gram"),
            ("given", sheet.given),
            ("datum", sheet.datum),
            ("source", sheet.source),
            ("entry", f"{sheet.entry} {sheet.status}" if sheet.status else ""),
        ],
        indent=2,
    )
    parts = [part for part in (*ELEMENTS, "ash", "moisture") if any(sheet.fractions[basis][part] for basis in bases)]
    table = [("", "", *parts)]
    table += [(*_row(basis), *(f"{100 * sheet.fractions[basis][part]:.2f}" for part in parts)) for basis in bases]
    lines += ["", "Analysis, mass %", *columns(table, right=range(2, 2 + len(parts)), indent=2)]
    kinds = [(kind, at) for kind in KINDS for at in PLACES]
    table = [("", "", *(kind for kind, _ in kinds)), ("", "", *(at for _, at in kinds))]
    table += [(*_row(basis), *(_mega(sheet.values[basis][f"{kind} {at}"]) for kind, at in kinds)) for basis in bases]
    lines += ["", "Calorific value at 25 °C, MJ/kg", *columns(table, right=range(2, 6), indent=2)]
    table = [(*_row(basis), _mega(sheet.formation[basis])) for basis in bases]
    lines += ["", "Enthalpy on elements-298K at 25 °C, MJ/kg", *columns(table, right=(2,), indent=2)]
    remarks = list(sheet.remarks)
    if sheet.estimate is not None:
        remarks.insert(
            0,
            f"the analysis suggests {_mega(sheet.estimate)} MJ/kg gross and dry: Channiwala, Parikh (2002), 1.5 %",
        )
    if remarks:
        lines += ["", "Mind", *(line for remark in remarks for line in pairs([("", remark)], indent=0))]
    return "\n".join(lines)


def _row(basis: str) -> tuple[str, str]:
    return _words(basis), BASES[basis]


def _words(basis: str) -> str:
    return "dry, ash-free" if basis == "dry-ash-free" else basis.replace("-", " ")


def _mega(value: float) -> str:
    return f"{value / 1e6:.3f}"
