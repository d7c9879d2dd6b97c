"""What a ThermoML file says, as plain records, and how it states uncertainty."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

__all__ = ["Citation", "Compound", "Condition", "DataSet", "Document", "Property", "Uncertainty", "Value", "stated"]


@dataclass(frozen=True, slots=True)
class Citation:
    """Where the data appeared."""

    title: str
    authors: tuple[str, ...]
    year: str
    dated: str
    kind: str
    fields: dict[str, str]


@dataclass(frozen=True, slots=True)
class Compound:
    """A compound as the file describes it."""

    number: str
    cas: str
    inchikey: str
    formula: str
    names: tuple[str, ...]

    @property
    def label(self) -> str:
        """What to call it in a message."""
        return next(iter(self.names), "") or self.formula or f"compound {self.number}"


@dataclass(frozen=True, slots=True)
class Uncertainty:
    """An uncertainty of one value, or what the property says of all: level of confidence [%], coverage factor."""

    combined: bool
    number: str
    standard: str = ""
    expanded: str = ""
    level: str = ""
    coverage: str = ""


@dataclass(frozen=True, slots=True)
class Property:
    """A property of a data set. ``name`` is without its unit."""

    number: str
    name: str
    unit: str
    method: str
    phase: str
    presentation: str
    uncertainties: tuple[Uncertainty, ...]


@dataclass(frozen=True, slots=True)
class Condition:
    """A variable or a constraint: number of the variable, what it is (``Temperature, K``), its value where constant."""

    number: str
    what: str
    value: str = ""


@dataclass(frozen=True, slots=True)
class Value:
    """One value of one property, with the values of the variables by their number."""

    row: int
    prop: str
    value: str
    variables: dict[str, str]
    uncertainties: tuple[Uncertainty, ...]


@dataclass(frozen=True, slots=True)
class DataSet:
    """``PureOrMixtureData`` or ``ReactionData``. ``members``: number of compound, stoichiometric number, phase."""

    place: str
    number: int
    reaction: str  # kind of reaction; "" for pure or mixture data
    members: tuple[tuple[str, str, str], ...]
    phases: tuple[str, ...]
    properties: tuple[Property, ...]
    conditions: tuple[Condition, ...]
    values: tuple[Value, ...]


@dataclass(frozen=True, slots=True)
class Document:
    """A ThermoML file."""

    file: str
    version: str
    citation: Citation
    compounds: dict[str, Compound]
    data: tuple[DataSet, ...]


def stated(value: Sequence[Uncertainty], of_property: Sequence[Uncertainty]) -> tuple[str, str, str]:
    """The uncertainty of a value: number as carried, kind, and a note where something had to be done or left out.

    Expanded at 95 % or with the coverage factor 2 stays what it is; another coverage factor divides it to a standard
    uncertainty (JCGM 100:2008, 6.2.1 and, where only the level is given, the normal distribution of table G.1).
    """
    levels = {(one.combined, one.number): one for one in of_property}
    for one in value:
        whole = levels.get((one.combined, one.number), one)
        level, coverage = one.level or whole.level, one.coverage or whole.coverage
        note = "" if one.combined else "uncertainty of the property alone, without that of temperature"
        if one.expanded:
            number, kind, told = _expanded(one.expanded, level, coverage)
            if number or not one.standard:
                return number, kind, "; ".join(filter(None, (note, told)))
        if one.standard:
            return one.standard, "standard", note
    return "", "", ""


#: Level of confidence [%] to coverage factor, normal distribution: JCGM 100:2008, table G.1.
_COVERAGE = {"68.27": 1.0, "90": 1.645, "95": 1.96, "95.45": 2.0, "99": 2.576, "99.73": 3.0}


def _expanded(text: str, level: str, coverage: str) -> tuple[str, str, str]:
    plain = f"{float(level):g}" if level else ""
    factor = float(coverage) if coverage else 0.0
    if plain in ("95", "95.45") or (not plain and factor in (2.0, 1.96)):
        return text, "expanded-95", ""
    if factor <= 0:
        factor = _COVERAGE.get(plain, 0.0)
    if factor <= 0:
        return "", "", f"expanded uncertainty {text} without a coverage that is known here: left out"
    at = f"{plain} %, " if plain else ""
    return f"{float(text) / factor:.4g}", "standard", f"stated as expanded {text} ({at}coverage factor {factor:g})"
