"""The template for own entries, as CSV and as TOML: the columns, and what may stand in them."""

from __future__ import annotations

import csv
import io

from propdb.errors import InvalidInput
from propdb.intake.common import DIMENSION, KINDS
from propdb.intake.sources import CLASSES
from propdb.intake.sources import KINDS as SOURCE_KINDS
from propdb.intake.written import ROW_COLUMNS, SOURCE_COLUMNS, SPECIES_COLUMNS
from propdb.model.records import PHASES

__all__ = ["COLUMN_HELP", "TEMPLATES", "template"]

TEMPLATES = ("csv", "toml")

#: What belongs into each column; the guided ``propdb add`` asks with the same words.
COLUMN_HELP = {
    "species": "name, formula or CAS RN",
    "quantity": " ".join(DIMENSION) + "; H for a table of enthalpies, one row for each temperature",
    "phase": " ".join(PHASES) + " (g is the ideal gas, l is 1 bar or saturated)",
    "form": "of a crystal: graphite, rhombic ...; blank where there is one form only",
    "to": "Htr only: what it turns into, e.g. cr:beta",
    "temperature": "a plain number is in K; 25C is taken too; blank for Tb Tm Tc Pc omega",
    "value": "digits as the source gives them, with a decimal point",
    "unit": "kJ/mol, kcal_th/mol, kJ/kg, J/mol/K, J/g/K, K, C, bar ...; 1 for omega",
    "uncertainty": "in the unit of the value; in percent where equation is filled in; blank if not stated",
    "uncertainty_kind": " ".join(KINDS),
    "datum": "Hf and Gf: elements-298K, ...; H: the datum of the table; else blank",
    "conditions": "Hvap: to the real vapour, to the monomer ideal gas, or standard; Tb: at 101.325 kPa; "
    "H: 40bar, saturated vapour",
    "equation": "Cp only: polynomial, shomate, constant, or table (one row for each temperature); else blank",
    "tmin": "lower end of the range of an equation, as temperature",
    "tmax": "upper end of the range of an equation, as temperature",
    "exponents": "polynomial: whole numbers, e.g. 0 1 2 -2 for A + B T + C T^2 + D/T^2 with T in K",
    "scales": "polynomial: what each coefficient is multiplied by, e.g. 1 1e-3 1e-6 1e5; blank for ones",
    "coefficients": "as the source gives them, separated by blanks",
    "source": "key of a source, see propdb source list; or a new one in small letters, e.g. data-sheet-7",
    "locator": "table, record or name under which the source lists the value",
    "note": "anything else",
}

_SOURCE_HELP = {
    "title": "title of the publication, sheet or report",
    "authors": "names, or the body that issued it; several are parted by ;",
    "year": "four digits",
    "kind": " ".join(SOURCE_KINDS) + " (a data sheet is a report)",
    "class": " ".join(CLASSES) + " (a data sheet is a compilation)",
}
_SHEET = {
    "source": "data-sheet-7",
    "source_title": "Data sheet 7",
    "source_authors": "Invented Works",
    "source_year": "2024",
    "source_kind": "report",
    "source_class": "compilation",
}
_ETHANOL = {"species": "ethanol", "phase": "l", "source": "data-sheet-7"}
_CP = {**_ETHANOL, "quantity": "Cp", "conditions": "1 bar"}
_TABLE = {**_CP, "unit": "kJ/kg/K", "equation": "table", "locator": "table 3"}
#: One of each kind of row; the numbers are invented.
_EXAMPLES = (
    {**_ETHANOL, "quantity": "Hvap", "temperature": "25C", "value": "42.3", "unit": "kJ/mol", "uncertainty": "0.4",
     "uncertainty_kind": "expanded-95", "conditions": "to the real vapour", "locator": "table 1", **_SHEET},
    {**_CP, "equation": "polynomial", "tmin": "280", "tmax": "330", "unit": "J/mol/K", "exponents": "0 1",
     "scales": "1 1e-3", "coefficients": "20.0 310", "uncertainty": "2", "uncertainty_kind": "class",
     "locator": "table 2"},
    {**_TABLE, "temperature": "20C", "value": "2.41"},
    {**_TABLE, "temperature": "40C", "value": "2.57"},
)  # fmt: skip
_CSV_SOURCES = ("title", "authors", "year", "kind", "class", "publisher", "journal", "volume", "pages", "number", "doi")
_CSV_SPECIES = ("formula", "charge", "cas", "synonyms")


def template(kind: str) -> str:
    """An empty template with its explanation.

    Parameters
    ----------
    kind : str
        ``csv`` or ``toml``.

    Raises
    ------
    InvalidInput
        Another kind.
    """
    if kind not in TEMPLATES:
        raise InvalidInput(f"there is no template {kind!r}", hint=f"templates are {' and '.join(TEMPLATES)}")
    return _csv() if kind == "csv" else _toml()


def _csv() -> str:
    header = [
        *ROW_COLUMNS,
        *(f"source_{name}" for name in _CSV_SOURCES),
        *(f"species_{name}" for name in _CSV_SPECIES),
    ]
    also = [c for c in (*SOURCE_COLUMNS, *SPECIES_COLUMNS) if c not in header]
    lines = [
        "Own values for propdb, one row for each. Rows that begin with # are not read. Save as CSV in UTF-8.",
        "Columns may be left out and stand in any order; species, quantity, phase, unit, source are needed.",
        *(f"{name}: {text}" for name, text in COLUMN_HELP.items()),
        "A source that propdb does not know yet needs in one of its rows",
        *(f"source_{name}: {text}" for name, text in _SOURCE_HELP.items()),
        "A species that propdb does not know yet needs in one of its rows species_formula; an ion, species_charge.",
        f"Columns that may be added: {' '.join(also)}",
        "The rows below the header are examples with invented numbers.",
    ]
    out = io.StringIO()
    rows = csv.writer(out, lineterminator="\n")
    rows.writerows([f"# {line}"] for line in lines)
    rows.writerow(header)
    for example in _EXAMPLES:
        cells = [example.get(name, "") for name in header]
        rows.writerow([f"# {cells[0]}", *cells[1:]])
    return out.getvalue()


def _toml() -> str:
    lines = [
        "# Own values for propdb: one [[entry]] for each. Remove the # before what you use.",
        "# Numbers stand in quotes, so that their digits are kept as the source gives them.",
        "#",
        *(f"# {name}: {text}" for name, text in COLUMN_HELP.items()),
        "#",
        "# A source that propdb does not know yet (all numbers here are invented):",
        "# [source.data-sheet-7]",
        '# title = "Data sheet 7"',
        '# authors = ["Invented Works"]',
        "# year = 2024",
        f'# kind = "report"  # {_SOURCE_HELP["kind"]}',
        f'# class = "compilation"  # {_SOURCE_HELP["class"]}',
        '# publisher = "Invented Works"  # also journal, volume, issue, pages, number, edition, place, doi, isbn, url',
        "#",
        "# A species that propdb does not know yet:",
        '# [species."my solvent"]',
        '# formula = "C10H22O2"',
        "# charge = 0",
        '# cas = ""',
        '# synonyms = ["solvent 7"]',
        "#",
        "# [[entry]]",
        '# species = "ethanol"',
        '# quantity = "Hvap"',
        '# phase = "l"',
        '# temperature = "25C"',
        '# value = "42.3"',
        '# unit = "kJ/mol"',
        '# uncertainty = "0.4"',
        '# uncertainty_kind = "expanded-95"',
        '# conditions = "to the real vapour"',
        '# source = "data-sheet-7"',
        '# locator = "table 1"',
        "#",
        "# [[entry]]",
        '# species = "ethanol"',
        '# quantity = "Cp"',
        '# phase = "l"',
        '# equation = "polynomial"',
        '# tmin = "280"',
        '# tmax = "330"',
        '# unit = "J/mol/K"',
        "# exponents = [0, 1]",
        '# coefficients = "20.0 0.31"',
        '# conditions = "1 bar"',
        '# source = "data-sheet-7"',
        '# locator = "table 2"',
    ]
    return "\n".join(lines) + "\n"
