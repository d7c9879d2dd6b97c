"""What a fuel of the user's comes to: its analysis dry and ash-free, its species and its entry."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from decimal import Decimal
from typing import Any, Final

from propdb.errors import InvalidInput
from propdb.intake.fuelfile import BY_DIFFERENCE, PARTS, FuelReader
from propdb.model.formula import hill
from propdb.model.fuel import ELEMENTS, FORMULA_UNIT, KINDS, MOIST, PLACES, Analysis, Fuel, gross_of
from propdb.model.records import T_STANDARD, Entry, Source, Species

__all__ = ["GivenFuel", "entry_of", "read_fuel", "species_of"]

#: However coarse its numbers, an analysis adds up to 100 % within this [mass %].
_COARSEST: Final = Decimal("0.5")


@dataclass(frozen=True, slots=True)
class GivenFuel:
    """A fuel as it was given, and what it comes to.

    ``typed`` are its tables as texts; a store keeps them beside the entry, and :func:`read_fuel` reads them back.
    """

    fuel: Fuel
    analysis_basis: str
    value_basis: str
    given: str
    uncertainty: float | None  # of the calorific value, on its basis [J/kg]
    uncertainty_kind: str
    source: str
    new_source: Source | None
    locator: str
    note: str
    typed: Mapping[str, Mapping[str, str]]
    remarks: tuple[str, ...] = field(default=())


def read_fuel(data: Mapping[str, Any], *, where: str, weights: Mapping[str, float], vaporisation: float) -> GivenFuel:
    """Read a fuel.

    Parameters
    ----------
    data : mapping
        The tables of a file as ``propdb fuel template`` writes it; numbers as numbers or as texts.
    where : str
        How messages call it.
    weights : mapping
        Molar mass of the atoms of :data:`~propdb.model.fuel.ELEMENTS` [kg/mol].
    vaporisation : float
        Enthalpy of vaporisation of water at 25 °C, to the ideal gas [J/mol].

    Raises
    ------
    InvalidInput
        What is missing, not a number, out of its bounds or in contradiction, with table and key.
    """
    reader = FuelReader(data, where)
    name, phase = reader.name(), reader.phase()
    basis = reader.basis("analysis")
    analysis, remarks = _analysis(reader, basis, weights)
    quantity, value = reader.calorific_value()
    kind, at = reader.word("calorific-value", "kind", KINDS), reader.word("calorific-value", "at", PLACES)
    value_basis = reader.basis("calorific-value")
    uncertainty, uncertainty_kind = reader.uncertainty()
    try:
        gross = gross_of(value, kind, at, value_basis, analysis=analysis, vaporisation=vaporisation)
    except InvalidInput as error:
        raise InvalidInput(error.problem, where=where, hint=error.hint) from None
    if not gross > 0.0:
        raise reader.error(
            "calorific-value", "value", f"{quantity} leaves no heat of combustion", "check value, kind and basis"
        )
    source, new_source = reader.source()
    return GivenFuel(
        fuel=Fuel(name, phase, analysis, gross, vaporisation),
        analysis_basis=basis,
        value_basis=value_basis,
        given=f"{quantity} {kind} at {at}, {value_basis.replace('-', ' ')}",
        uncertainty=uncertainty,
        uncertainty_kind=uncertainty_kind,
        source=source,
        new_source=new_source,
        locator=reader.text("locator") or name,
        note=reader.text("note"),
        typed=reader.typed(),
        remarks=tuple(remarks),
    )


def _analysis(reader: FuelReader, basis: str, weights: Mapping[str, float]) -> tuple[Analysis, list[str]]:
    """The analysis on the dry ash-free basis, and what is worth a remark."""
    parts = _parts(reader, basis)
    remarks = _add_up(reader, parts)
    fractions = {part: float(percent) / 100.0 for part, percent in parts.items()}
    moisture = {key: found for key in MOIST if (found := reader.below("moisture", key)) is not None}
    if basis in MOIST:
        own = fractions.pop("moisture")
        if abs(moisture.setdefault(basis, own) - own) > 1e-9:
            raise reader.error(
                "moisture",
                basis,
                f"{100 * moisture[basis]:g} here and {100 * own:g} in the analysis, which is {basis.replace('-', ' ')}",
                "give it once",
            )
    ash = reader.below("ash", "dry")
    if basis != "dry-ash-free":
        dry = 1.0 - moisture.get(basis, 0.0) if basis in MOIST else 1.0
        own = fractions.pop("ash", 0.0) / dry
        if ash is not None and abs(ash - own) > 1e-4:
            raise reader.error(
                "ash", "dry", f"{100 * ash:g} here and {100 * own:.4g} by the analysis", "leave one of them out"
            )
        ash = own
        if ash >= 1.0 - 1e-9:
            raise reader.error("analysis", "ash", "ash and moisture leave no fuel", "check the analysis")
        fractions = {part: value / dry / (1.0 - ash) for part, value in fractions.items()}
    if not fractions.get("C") and not fractions.get("H"):
        raise reader.error("analysis", "C", "neither carbon nor hydrogen", "give C and H in mass %")
    return Analysis({e: fractions[e] for e in ELEMENTS if fractions.get(e)}, ash, moisture, weights), remarks


def _parts(reader: FuelReader, basis: str) -> dict[str, Decimal]:
    """What the analysis gives, in mass %, oxygen filled in where it is by difference."""
    table = reader.tables["analysis"]
    by_difference = isinstance(table.get("O"), str) and table["O"].strip().lower() == BY_DIFFERENCE
    names = [part for part in PARTS if not (part == "O" and by_difference)]
    parts = {part: percent for part in names if (percent := reader.number("analysis", part)) is not None}
    if not parts:
        raise reader.error("analysis", "C", "the analysis is empty", "give C, H, N, S, O, ash in mass %")
    words = basis.replace("-", " ")
    if basis in MOIST and "moisture" not in parts:
        known = reader.number("moisture", basis)
        if known is None:
            problem = f"moisture is missing: an analysis {words} has it as a part"
            raise reader.error("analysis", "moisture", problem, "give it, 0 if there is none")
        parts["moisture"] = known
    for part, absent in (("moisture", basis not in MOIST), ("ash", basis == "dry-ash-free")):
        if absent and parts.get(part):
            where = "[moisture]" if part == "moisture" else "[ash] dry"
            raise reader.error("analysis", part, f"{part} in an analysis that is {words}", f"give it under {where}")
    if by_difference:
        rest = 100 - sum(parts.values(), Decimal(0))
        if rest < 0:
            problem = f"oxygen by difference is negative: the others add up to {100 - rest} %"
            raise reader.error("analysis", "O", problem, "check the others, and their basis")
        parts["O"] = rest
    return parts


def _add_up(reader: FuelReader, parts: Mapping[str, Decimal]) -> list[str]:
    """Refuse an analysis that rounding cannot explain; a remark where it does not add up to the digit."""
    total = sum(parts.values(), Decimal(0))
    off = total - 100
    halves = [Decimal(5).scaleb(int(percent.as_tuple().exponent) - 1) for percent in parts.values() if percent]
    allowed = min(max(sum(halves, Decimal(0)), Decimal("1e-6")), _COARSEST)
    if abs(off) > allowed:
        side = "short of" if off < 0 else "above"
        raise InvalidInput(
            f"the analysis adds up to {total.normalize():f} %, {abs(off).normalize():f} {side} 100 %",
            where=f"{reader.place}, [analysis]",
            hint='check the parts and their basis, or write O = "by difference"',
        )
    if abs(off) > Decimal("1e-6"):
        return [f"the analysis adds up to {total.normalize():f} %, which its rounding explains"]
    return []


def species_of(fuel: Fuel, basis: str) -> Species:
    """The pseudo-species of a fuel on a basis: one formula unit is one gram of it, ash and moisture included."""
    atoms = fuel.analysis.atoms(basis)
    fractions = fuel.analysis.fractions(basis)
    inert = ", ".join(f"{part} {100 * fractions[part]:.6g} %" for part in ("ash", "moisture"))
    return Species(
        name=fuel.name,
        formula=hill(atoms),
        charge=0,
        composition=tuple(atoms.items()),
        molar_mass=FORMULA_UNIT,
        kind="pseudo",
        note=f"fuel, {basis.replace('-', ' ')}: {inert}; atoms per gram, so that kJ/mol reads as MJ/kg; ash is inert",
    )


def entry_of(given: GivenFuel, basis: str, *, datum: str) -> Entry:
    """The entry of a fuel: its gross calorific value at constant pressure, as an enthalpy on a combustion datum.

    So the measured number is what is stored, and the formation enthalpy follows from the products that the store holds.
    """
    fuel = given.fuel
    value = fuel.calorific_value("gross", "constant pressure", basis)
    share = fuel.analysis.dry_ash_free(basis) / fuel.analysis.dry_ash_free(given.value_basis)
    uncertainty = None if given.uncertainty is None else given.uncertainty * share * FORMULA_UNIT
    text = f"{value / 1e6:.6f}"
    return Entry(
        id="",
        species=fuel.name,
        quantity="Hf",
        phase=fuel.phase,
        form="",
        to="",
        equation="",
        temperature=T_STANDARD,
        value=float(text) * 1e6 * FORMULA_UNIT,
        unit="J/mol",
        carried=text,
        carried_unit="MJ/kg",
        params={"fuel": {**given.typed, "basis": basis}},
        tmin=None,
        tmax=None,
        uncertainty=uncertainty,
        uncertainty_unit="",
        uncertainty_kind=given.uncertainty_kind,
        datum=datum,
        conditions=f"{basis.replace('-', ' ')}; gross calorific value at constant pressure",
        source=given.source,
        locator=given.locator,
        status="draft",
        note="; ".join(filter(None, (f"from {given.given}", given.note))),
    )
