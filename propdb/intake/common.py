"""What the readers of constants, curves and NASA records share: a folder, and the columns they have in common."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from propdb._version import __version__
from propdb.errors import InvalidInput
from propdb.intake.rows import Row, near
from propdb.model.records import KIND_TO_STANDARD, PHASES, Carrier, Datum, Entry, Source, Species
from propdb.store.content import with_id
from propdb.units import read_si

__all__ = [
    "DIMENSION",
    "SI_UNIT",
    "Folder",
    "carrier",
    "cited",
    "finish",
    "form_of",
    "phase_of",
    "range_of",
    "si",
    "species_of",
]

#: Quantity -> dimension of :func:`propdb.units.read_si`.
DIMENSION = {
    **dict.fromkeys(("Hf", "Gf", "Hvap", "Hfus", "Hsub", "Htr", "dH0"), "enthalpy"),
    **dict.fromkeys(("S", "Cp"), "heat capacity"),
    **dict.fromkeys(("Tb", "Tm", "Tc"), "temperature"),
    "Pc": "pressure",
    "omega": "number",
}

#: Dimension -> SI unit of an entry.
SI_UNIT = {"enthalpy": "J/mol", "heat capacity": "J/mol/K", "temperature": "K", "pressure": "Pa", "number": "1"}

KINDS = tuple(kind for kind in KIND_TO_STANDARD if kind)


@dataclass(frozen=True, slots=True)
class Folder:
    """One source folder, and what its rows refer to."""

    source: Source
    species: Mapping[str, Species]
    datums: Mapping[str, Datum]

    @property
    def status(self) -> str:
        """Base status of its entries."""
        return "estimate" if self.source.cls == "estimate" else "base"


def species_of(row: Row, folder: Folder) -> Species:
    """The species that a row names.

    Raises
    ------
    SeedError
        No species.csv lists it.
    """
    name = row.needed("species", "give the name of a species")
    if name in folder.species:
        return folder.species[name]
    raise row.error("species", f"unknown species {name!r}", near(name, folder.species) or "add it to species.csv")


def phase_of(row: Row, column: str = "phase") -> str:
    """The phase of a row."""
    return row.choice(column, PHASES)


def form_of(row: Row, phase: str) -> str:
    """The form of a row; only crystals have one."""
    form = row.text("form")
    if form and phase != "cr":
        raise row.error("form", f"form {form!r} of phase {phase}", "only cr has forms; leave it blank")
    return form


def range_of(row: Row) -> tuple[float, float]:
    """``tmin`` and ``tmax`` of a row [K].

    Raises
    ------
    SeedError
        One is blank, negative, or tmin is not below tmax.
    """
    tmin = row.read_number(row.needed("tmin", "the lower end of the range in K"), "tmin")
    tmax = row.read_number(row.needed("tmax", "the upper end of the range in K"), "tmax")
    if tmin < 0:
        raise row.error("tmin", f"tmin {tmin:g} K is negative", "temperatures are in K")
    if tmin >= tmax:
        raise row.error("tmin", f"tmin {tmin:g} K is not below tmax {tmax:g} K", "exchange them, or correct one")
    return tmin, tmax


def si(row: Row, column: str, *, unit: str, quantity: str, species: Species, difference: bool = False) -> float:
    """A cell in its unit, as SI of the quantity.

    Raises
    ------
    SeedError
        Not a number, or a unit that is unknown or does not go with the quantity.
    """
    text = row.text(column)
    row.read_number(text, column)
    try:
        return read_si(
            text,
            unit,
            dimension=DIMENSION[quantity],  # type: ignore[arg-type]
            molar_mass=species.molar_mass,
            difference=difference,
        )
    except InvalidInput as error:
        place = "unit" if "unit" in type(error).__name__.lower() else column
        raise row.error(place, error.problem, error.hint) from error


def uncertainty_kind(row: Row) -> str:
    """Kind of the uncertainty; neither stands without the other.

    Raises
    ------
    SeedError
        An uncertainty without a kind, a kind without an uncertainty, an unknown kind, or a negative uncertainty.
    """
    value = row.value("uncertainty")
    kind = row.choice("uncertainty_kind", KINDS, blank=True)
    if value is not None and not kind:
        raise row.error("uncertainty_kind", "an uncertainty without its kind", f"one of {', '.join(KINDS)}")
    if value is None and kind:
        raise row.error("uncertainty", f"kind {kind!r} without an uncertainty", "give it, or leave the kind blank")
    if value is not None and value < 0:
        raise row.error("uncertainty", f"uncertainty {value:g} is negative", "write it as a positive number")
    return kind


def carrier(row: Row, folder: Folder) -> Carrier:
    """How the row reached us."""
    return Carrier("propdb seed", __version__, row.file, row.number, folder.source.carrier)


def cited(row: Row) -> str:
    """The locator: what the source lists the value under.

    Raises
    ------
    SeedError
        It is blank.
    """
    return row.needed("locator", "the table, record or species name as the source lists it")


def finish(
    entry: Entry, species: Species, row: Row, seen: dict[tuple[object, ...], Row], key: tuple[object, ...]
) -> Entry:
    """The entry with its id, once no other row of the folder says the same.

    Raises
    ------
    SeedError
        Another row has this key.
    """
    if key in seen:
        raise row.error(
            "species",
            f"{entry.quantity} of {species.name} ({entry.phase}) stands in {seen[key].where()} already",
            "one row per value; tell them apart by form, temperature or conditions",
        )
    seen[key] = row
    return with_id(entry, species)
