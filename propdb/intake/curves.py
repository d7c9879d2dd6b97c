"""``curves.csv``: heat-capacity fits, one row per temperature interval; rows that touch become one entry."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

from propdb.cp.registry import build_heat_capacity
from propdb.errors import EquationError, InvalidInput
from propdb.intake.common import (
    Folder,
    carrier,
    cited,
    finish,
    form_of,
    phase_of,
    range_of,
    species_of,
    uncertainty_kind,
)
from propdb.intake.rows import Row, Table
from propdb.model.records import Entry, Species
from propdb.units import parse_heat_capacity_unit

__all__ = ["COLUMNS", "read_curves"]

COLUMNS = (
    "species",
    "phase",
    "form",
    "equation",
    "tmin",
    "tmax",
    "unit",
    "exponents",
    "scales",
    "coefficients",
    "uncertainty",
    "uncertainty_kind",
    "conditions",
    "locator",
    "note",
)
EQUATIONS = ("polynomial", "shomate", "constant", "iapws95")


def read_curves(table: Table, folder: Folder) -> Iterator[Entry]:
    """The heat-capacity entries of one ``curves.csv``, coefficients in SI.

    Raises
    ------
    SeedError
        File, row and column of what cannot be taken, and what would be right.
    """
    groups: dict[tuple[str, str, str, str], list[Row]] = {}
    for row in table:
        phase = phase_of(row)
        key = (species_of(row, folder).name, phase, form_of(row, phase), row.text("conditions"))
        groups.setdefault(key, []).append(row)
    seen: dict[tuple[object, ...], Row] = {}
    for key, rows in groups.items():
        for union in _unions(rows):
            yield _entry(union, folder, seen, key)


def _unions(rows: list[Row]) -> Iterator[list[Row]]:
    """Rows in order of temperature, in groups that touch."""
    ordered = sorted(rows, key=range_of)
    group = [ordered[0]]
    for row in ordered[1:]:
        above, below = range_of(row)[0], range_of(group[-1])[1]
        if above < below:
            raise row.error(
                "tmin",
                f"the range begins at {above:g} K, inside that of row {group[-1].number} which ends at {below:g} K",
                "ranges of one species, phase, form and conditions touch or stay apart",
            )
        if above > below:
            yield group
            group = []
        group.append(row)
    yield group


def _entry(
    rows: Sequence[Row], folder: Folder, seen: dict[tuple[object, ...], Row], key: tuple[str, str, str, str]
) -> Entry:
    first = rows[0]
    species = species_of(first, folder)
    for column in ("uncertainty", "uncertainty_kind"):
        odd = next((row for row in rows if row.text(column) != first.text(column)), None)
        if odd is not None:
            raise odd.error(column, f"{column} differs from that of row {first.number}", "pieces of one union share it")
    pieces = [_piece(row, species) for row in rows]
    equation, params = _joined(pieces)
    if equation != "iapws95":
        _check(equation, params, first)
    kind = uncertainty_kind(first)
    percent = first.value("uncertainty") if kind else None
    tmin, tmax = range_of(first)[0], range_of(rows[-1])[1]
    entry = Entry(
        id="",
        species=species.name,
        quantity="Cp",
        phase=key[1],
        form=key[2],
        to="",
        equation=equation,
        temperature=None,
        value=None,
        unit="J/mol/K",
        carried=" | ".join(row.text("coefficients") or row.text("locator") for row in rows),
        carried_unit=" | ".join(dict.fromkeys(row.text("unit") for row in rows)),
        params=params,
        tmin=tmin,
        tmax=tmax,
        uncertainty=None if percent is None else percent / 100.0,
        uncertainty_unit="%" if kind else "",
        uncertainty_kind=kind,
        datum="",
        conditions=key[3],
        source=folder.source.key,
        locator="; ".join(dict.fromkeys(cited(row) for row in rows)),
        status=folder.status,
        note="; ".join(dict.fromkeys(row.text("note") for row in rows if row.text("note"))),
        carriers=tuple(carrier(row, folder) for row in rows),
    )
    return finish(entry, species, first, seen, (*key, tmin, tmax))


def _piece(row: Row, species: Species) -> tuple[str, dict[str, Any]]:
    """Equation and stored parameters of one row."""
    equation = row.choice("equation", EQUATIONS)
    tmin, tmax = range_of(row)
    unit = row.needed("unit", "e.g. J/mol/K, cal_th/mol/K or R")
    try:
        factor = parse_heat_capacity_unit(unit).scale(molar_mass=species.molar_mass)
    except InvalidInput as error:
        raise row.error("unit", error.problem, error.hint) from error
    if equation == "iapws95":
        for column in ("exponents", "scales", "coefficients"):
            if row.text(column):
                raise row.error(
                    column, f"{column} of a formulation", "its coefficients are the library's; leave it blank"
                )
        return equation, {}
    coefficients = _numbers(row, "coefficients")
    if equation != "polynomial":
        for column in ("exponents", "scales"):
            if row.text(column):
                raise row.error(column, f"{column} with equation {equation}", "leave it blank")
    if equation == "constant":
        if len(coefficients) != 1:
            raise row.error("coefficients", f"{len(coefficients)} numbers for a constant", "write one")
        return equation, {"value": coefficients[0] * factor, "tmin": tmin, "tmax": tmax}
    if equation == "shomate":
        if unit != "J/mol/K" or len(coefficients) not in (5, 8):
            column = "unit" if unit != "J/mol/K" else "coefficients"
            raise row.error(column, f"shomate with {len(coefficients)} numbers in {unit}", "A B C D E, in J/mol/K")
        return equation, {"intervals": [{"tmin": tmin, "tmax": tmax, "coefficients": coefficients}]}
    exponents, scales = _numbers(row, "exponents"), _numbers(row, "scales")
    if not len(exponents) == len(scales) == len(coefficients):
        raise row.error(
            "coefficients",
            f"{len(coefficients)} coefficients, {len(exponents)} exponents, {len(scales)} scales",
            "as many of each, separated by spaces",
        )
    if any(exponent != int(exponent) for exponent in exponents):
        raise row.error("exponents", "an exponent is not an integer", "write e.g. 0 1 2 -2")
    return equation, {
        "exponents": [int(exponent) for exponent in exponents],
        "coefficients": [c * s * factor for c, s in zip(coefficients, scales, strict=True)],
        "tmin": tmin,
        "tmax": tmax,
    }


def _numbers(row: Row, column: str) -> list[float]:
    text = row.needed(column, "numbers separated by spaces")
    return [row.read_number(word, column) for word in text.split()]


def _joined(pieces: Sequence[tuple[str, dict[str, Any]]]) -> tuple[str, dict[str, Any]]:
    if len(pieces) == 1:
        return pieces[0]
    if all(equation == "shomate" for equation, _ in pieces):
        return "shomate", {"intervals": [interval for _, params in pieces for interval in params["intervals"]]}
    return "union", {"pieces": [{"equation": equation, **params} for equation, params in pieces]}


def _check(equation: str, params: dict[str, Any], row: Row) -> None:
    try:
        curve = build_heat_capacity(equation, params)
    except EquationError as error:
        raise row.error("coefficients", error.problem, error.hint) from error
    for t in (max(curve.tmin, 1.0), curve.tmax):
        cp = float(curve.cp(t))
        if not 0.0 < cp < 1e5:
            raise row.error(
                "coefficients",
                f"the heat capacity is {cp:.4g} J/mol/K at {t:g} K",
                "check signs, scales, exponents and the unit",
            )
