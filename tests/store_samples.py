"""Small contents for the tests of the store. The numbers are invented and mean nothing."""

from __future__ import annotations

from typing import Any

from propdb.model.records import Carrier, Entry, Source, Species
from propdb.store.content import Content, with_id

WATER = Species(
    name="water",
    formula="H2O",
    charge=0,
    composition=(("H", 2), ("O", 1)),
    molar_mass=0.018,
    cas="7732-18-5",
    inchikey="XLYOFNOQVPJJNP-UHFFFAOYSA-N",
    synonyms=("steam", "oxidane"),
)
ETHANOL = Species(
    name="ethanol",
    formula="C2H6O",
    charge=0,
    composition=(("C", 2), ("H", 6), ("O", 1)),
    molar_mass=0.046,
    cas="64-17-5",
    inchikey="LFQSCWFLJHTTHZ-UHFFFAOYSA-N",
    synonyms=("ethyl alcohol",),
)
ETHER = Species(
    name="dimethyl ether",
    formula="C2H6O",
    charge=0,
    composition=(("C", 2), ("H", 6), ("O", 1)),
    molar_mass=0.046,
    cas="115-10-6",
    synonyms=("methoxymethane",),
)
SODIUM = Species("sodium", "Na", 0, (("Na", 1),), 0.023, "7440-23-5")
SODIUM_ION = Species("sodium ion", "Na", 1, (("Na", 1),), 0.023, "17341-25-2")
ALL = (WATER, ETHANOL, ETHER, SODIUM, SODIUM_ION)

BOOK = Source(
    key="book-2001",
    title="A book of invented values",
    authors=("Nobody, N.",),
    year=2001,
    kind="book",
    cls="handbook",
    terms="invented",
    fields={"publisher": "None", "place": "Nowhere"},
    carrier="typed for the tests",
    lineage=(("older-1990", "the same numbers"),),
)
REPORT = Source("report-2010", "A report of invented values", ("Nobody, N.",), 2010, "report", "evaluated", "invented")
SEED = Carrier("propdb seed", "0", "entries.csv", 2, "typed for the tests")


def entry(species: Species, quantity: str = "Hf", value: float | None = -1000.5, **fields: Any) -> Entry:
    """An entry with its id; ``fields`` override the constant in the gas that it is otherwise."""
    plain: dict[str, Any] = {
        "id": "",
        "species": species.name,
        "quantity": quantity,
        "phase": "g",
        "form": "",
        "to": "",
        "equation": "",
        "temperature": 298.15,
        "value": value,
        "unit": "J/mol",
        "carried": "" if value is None else f"{value / 1000:.4f}",
        "carried_unit": "kJ/mol",
        "params": {},
        "tmin": None,
        "tmax": None,
        "uncertainty": 40.0,
        "uncertainty_unit": "",
        "uncertainty_kind": "expanded-95",
        "datum": "elements-298K",
        "conditions": "",
        "source": BOOK.key,
        "locator": species.formula,
        "carriers": (SEED,),
    }
    return with_id(Entry(**(plain | fields)), species)


def curve(species: Species, **fields: Any) -> Entry:
    """A heat-capacity polynomial."""
    plain: dict[str, Any] = {
        "equation": "polynomial",
        "temperature": None,
        "unit": "J/mol/K",
        "carried": "3.5 1e-3",
        "carried_unit": "R",
        "params": {"exponents": [0, 1], "coefficients": [29.1, 0.0083]},
        "tmin": 200.0,
        "tmax": 1500.0,
        "uncertainty": None,
        "uncertainty_kind": "",
        "datum": "",
    }
    return entry(species, "Cp", None, **(plain | fields))


def content(**fields: Any) -> Content:
    """A small base; ``fields`` override its parts."""
    plain: dict[str, Any] = {
        "species": ALL,
        "sources": (BOOK, REPORT),
        "datums": {"elements-298K": {"kind": "elements", "temperature": 298.15, "schedule": [["H", "g"], ["O", "g"]]}},
        "policy": {"ranks": {BOOK.key: 2, REPORT.key: 1}, "defaults": {"class": [1.5, 2]}},
        "entries": (
            entry(WATER),
            entry(WATER, value=-999.0, source=REPORT.key),
            curve(WATER),
            entry(ETHANOL, value=-77.25),
            entry(ETHANOL, "Hvap", 42.0, phase="l", datum=""),
        ),
    }
    return Content(**(plain | fields))
