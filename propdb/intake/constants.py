"""``entries.csv``: one published constant per row."""

from __future__ import annotations

from collections.abc import Iterator

from propdb.intake.common import (
    DIMENSION,
    SI_UNIT,
    Folder,
    carrier,
    cited,
    finish,
    form_of,
    phase_of,
    si,
    species_of,
    uncertainty_kind,
)
from propdb.intake.rows import Row, Table, near
from propdb.model.records import P_STANDARD, PHASES, Entry

__all__ = ["COLUMNS", "read_constant", "read_constants"]

COLUMNS = (
    "species",
    "quantity",
    "phase",
    "form",
    "to",
    "temperature",
    "value",
    "unit",
    "uncertainty",
    "uncertainty_kind",
    "datum",
    "conditions",
    "locator",
    "note",
)

#: Phases that a quantity is filed under; others may stand in any.
_PHASES = {
    "Hvap": ("l",),
    "Hfus": ("cr",),
    "Hsub": ("cr",),
    "Htr": ("cr", "am", "l"),
    "Tm": ("cr",),
    "Tb": ("l", "cr"),
    "Tc": ("l",),
    "Pc": ("l",),
    "omega": ("l",),
}
_NEEDS_T = ("Hf", "Gf", "S", "Cp", "Hvap", "Hfus", "Hsub", "Htr", "dH0")
_POSITIVE = ("Hvap", "Hsub", "dH0", "Cp", "Tb", "Tm", "Tc", "Pc")


def read_constants(table: Table, folder: Folder) -> Iterator[Entry]:
    """The entries of one ``entries.csv``, in SI, the numbers as carried kept beside.

    Raises
    ------
    SeedError
        File, row and column of what cannot be taken, and what would be right.
    """
    seen: dict[tuple[object, ...], Row] = {}
    for row in table:
        yield read_constant(row, folder, seen)


def read_constant(row: Row, folder: Folder, seen: dict[tuple[object, ...], Row]) -> Entry:
    """The entry of one row; ``seen`` holds the rows of this source before it, by what they say.

    Raises
    ------
    SeedError
        File, row and column of what cannot be taken, and what would be right.
    """
    species = species_of(row, folder)
    quantity = row.choice("quantity", tuple(DIMENSION))
    phase = phase_of(row)
    allowed = _PHASES.get(quantity)
    if allowed and phase not in allowed:
        raise row.error("phase", f"{quantity} stands under phase {phase}", f"it goes under {' or '.join(allowed)}")
    form = form_of(row, phase)
    to = _target(row, quantity, phase, form)
    temperature = _temperature(row, quantity)
    unit = row.needed("unit", "the unit as the source prints it")
    carried = row.needed("value", "the number as the source prints it; a row without a number is left out")
    value = si(row, "value", unit=unit, quantity=quantity, species=species)
    if quantity in _POSITIVE and phase != "aq" and not value > 0:  # partial molar Cp of an ion may be negative
        raise row.error("value", f"{quantity} {carried} {unit} is not positive", "check the sign and the unit")
    kind = uncertainty_kind(row)
    uncertainty = (
        si(row, "uncertainty", unit=unit, quantity=quantity, species=species, difference=True) if kind else None
    )
    entry = Entry(
        id="",
        species=species.name,
        quantity=quantity,
        phase=phase,
        form=form,
        to=to,
        equation="",
        temperature=temperature,
        value=value,
        unit=SI_UNIT[DIMENSION[quantity]],
        carried=carried,
        carried_unit=unit,
        params={},
        tmin=None,
        tmax=None,
        uncertainty=uncertainty,
        uncertainty_unit="",
        uncertainty_kind=kind,
        datum=_datum(row, quantity, folder),
        conditions=_conditions(row, quantity, phase, folder),
        source=folder.source.key,
        locator=cited(row),
        status=folder.status,
        note=row.text("note"),
        carriers=(carrier(row, folder),),
    )
    key = (species.name, quantity, phase, form, to, temperature, entry.conditions, entry.datum)
    return finish(entry, species, row, seen, key)


def _target(row: Row, quantity: str, phase: str, form: str) -> str:
    to = row.text("to")
    if quantity != "Htr":
        if to:
            raise row.error("to", f"{quantity} with a target {to!r}", "only Htr has one; leave it blank")
        return ""
    if not to:
        raise row.error("to", "Htr without its target", "the form it turns into, e.g. cr:beta")
    target, _, target_form = to.partition(":")
    if target not in PHASES or (target_form and target != "cr"):
        raise row.error("to", f"{to!r} is not a phase and form", "write e.g. cr:beta")
    if (target, target_form) == (phase, form):
        raise row.error("to", f"{to!r} is where it starts", "the form it turns into")
    return to


def _temperature(row: Row, quantity: str) -> float | None:
    value = row.value("temperature")
    if quantity not in _NEEDS_T:
        if value is not None:
            raise row.error("temperature", f"{quantity} with a temperature", "leave it blank")
        return None
    if value is None:
        raise row.error("temperature", f"{quantity} without a temperature", "in K, e.g. 298.15")
    if value < 0 or (value == 0 and quantity not in ("Hf", "Gf", "Cp", "S")):
        raise row.error("temperature", f"temperature {value:g} K is not positive", "temperatures are in K")
    if quantity == "dH0" and value != 298.15:
        raise row.error("temperature", f"dH0 at {value:g} K", "dH0 is H(298.15 K) - H(0 K); write 298.15")
    return value


def _datum(row: Row, quantity: str, folder: Folder) -> str:
    datum = row.text("datum")
    if datum and quantity not in ("Hf", "Gf"):
        raise row.error("datum", f"{quantity} with datum {datum!r}", "only Hf and Gf have one; leave it blank")
    if not datum:
        if quantity == "Hf":
            raise row.error("datum", "Hf without its datum", "e.g. elements-298K")
        return ""
    if datum not in folder.datums:
        raise row.error("datum", f"unknown datum {datum!r}", near(datum, folder.datums) or "one of datums.toml")
    return datum


def _conditions(row: Row, quantity: str, phase: str, folder: Folder) -> str:
    """Conditions as typed; entropies and Gibbs energies of gases depend on what the source means by standard."""
    conditions = row.text("conditions")
    if quantity == "Hvap" and not conditions:
        raise row.error(
            "conditions",
            "Hvap does not say to which vapour",
            "'to the real vapour', 'to the monomer ideal gas' or 'standard'",
        )
    if quantity in ("S", "Gf") and phase == "g" and folder.source.standard_pressure != P_STANDARD:
        return "; ".join(filter(None, (conditions, "standard pressure 1 atm")))
    return conditions
