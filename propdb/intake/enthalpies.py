"""Tabulated enthalpies of a group's own: rows at temperatures, joined to one entry on a stated datum."""

from __future__ import annotations

from collections.abc import Sequence

from propdb.cp.tabulated import EnthalpyTable
from propdb.errors import EquationError, InvalidInput
from propdb.intake.common import Folder, carrier, cited, finish, form_of, phase_of, species_of, uncertainty_kind
from propdb.intake.rows import Row
from propdb.model.records import Entry
from propdb.units import parse_pressure, read_si

__all__ = ["SHARED", "enthalpy_table", "group_of"]

#: Columns that all rows of one table share.
SHARED = ("unit", "uncertainty", "uncertainty_kind", "locator")


def group_of(row: Row, folder: Folder) -> tuple[str, ...]:
    """What rows of one table have in common: species, phase, form, conditions, datum, source."""
    phase = phase_of(row)
    row.needed("temperature", "one temperature in each row of a table of enthalpies")
    row.needed("datum", "the datum that the table is written on; `propdb datum list` shows them")
    return (
        row.text("species"),
        phase,
        form_of(row, phase),
        row.text("conditions"),
        row.text("datum"),
        folder.source.key,
    )


def enthalpy_table(rows: Sequence[Row], folder: Folder, seen: dict[tuple[object, ...], Row]) -> Entry:
    """One entry of quantity ``H`` from the rows of one table, in any order.

    Raises
    ------
    SeedError
        Rows that do not agree, a temperature that stands twice, a real fluid without pressure or saturation.
    """
    first = rows[0]
    species = species_of(first, folder)
    for column in SHARED:
        odd = next((row for row in rows if row.text(column) != first.text(column)), None)
        if odd is not None:
            raise odd.error(column, f"{column} differs from {first.where()}", "rows of one table share it")
    unit = first.needed("unit", "e.g. kJ/kg or kJ/mol")
    points: list[tuple[float, float, str]] = []
    for row in rows:
        text = row.needed("value", "the enthalpy as the table prints it")
        value = _si(row, "value", text, unit, species.molar_mass)
        kelvin = row.read_number(row.text("temperature"), "temperature")
        points.append((kelvin, value, f"{row.text('temperature')} {text}"))
    points.sort()
    params: dict[str, object] = {"T": [p[0] for p in points], "h": [p[1] for p in points]}
    try:
        EnthalpyTable.from_params(params)
    except EquationError as error:
        raise first.error("temperature", error.problem, "give each temperature once, at least two") from None
    params |= _conditions(first)
    kind = uncertainty_kind(first)
    phase = phase_of(first)
    entry = Entry(
        id="",
        species=species.name,
        quantity="H",
        phase=phase,
        form=form_of(first, phase),
        to="",
        equation="tabulated",
        temperature=None,
        value=None,
        unit="J/mol",
        carried=" | ".join(p[2] for p in points),
        carried_unit=unit,
        params=params,
        tmin=points[0][0],
        tmax=points[-1][0],
        uncertainty=_si(first, "uncertainty", first.text("uncertainty"), unit, species.molar_mass) if kind else None,
        uncertainty_unit="",
        uncertainty_kind=kind,
        datum=first.text("datum"),
        conditions=first.text("conditions"),
        source=folder.source.key,
        locator=cited(first),
        status="draft",
        note="; ".join(dict.fromkeys(row.text("note") for row in rows if row.text("note"))),
        carriers=(carrier(first, folder),),
    )
    key = ("enthalpies", species.name, phase, entry.form, entry.conditions, entry.datum)
    return finish(entry, species, first, seen, key)


def _si(row: Row, column: str, text: str, unit: str, molar_mass: float) -> float:
    row.read_number(text, column)
    try:
        return read_si(text, unit, dimension="enthalpy", molar_mass=molar_mass, difference=column == "uncertainty")
    except InvalidInput as error:
        raise row.error("unit", error.problem, error.hint) from None


def _conditions(row: Row) -> dict[str, object]:
    """Pressure or saturation of a table, from its conditions; the real fluid needs one of them."""
    text = row.text("conditions")
    if text in ("saturated liquid", "saturated vapour"):
        return {"saturated": text.split()[1]}
    if not text and row.text("phase") != "fluid":
        return {}
    if text:
        try:
            return {"pressure": parse_pressure(text)}
        except InvalidInput as error:
            if row.text("phase") != "fluid":
                return {}
            raise row.error(
                "conditions", error.problem, "write the pressure, e.g. 40bar, or: saturated vapour"
            ) from None
    raise row.error(
        "conditions", "a table of the real fluid has no pressure", "write it, e.g. 40bar, or: saturated vapour"
    )
