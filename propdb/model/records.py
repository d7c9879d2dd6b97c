"""The records that the whole house speaks in. Inside: J/mol, K, Pa, kg/mol."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from types import MappingProxyType
from typing import Any, Literal

from propdb.model.crosscheck import Crosscheck

PHASES = ("cr", "am", "l", "g", "fluid", "aq")
QUANTITIES = ("Hf", "Gf", "S", "Cp", "Hvap", "Hfus", "Hsub", "Htr", "dH0", "Tb", "Tm", "Tc", "Pc", "omega", "H")

#: Best first. Entries with a status that is not listed here never enter a computation.
USABLE_STATUSES = ("approved", "checked", "base", "disputed", "estimate")
STATUSES = (*USABLE_STATUSES, "quarantined", "datum-unknown", "draft", "superseded", "withdrawn")

T_STANDARD = 298.15
P_STANDARD = 1e5
P_ATM = 101325.0
R_GAS = 8.31446261815324


def _empty() -> Mapping[str, Any]:
    return MappingProxyType({})


@dataclass(frozen=True, slots=True)
class Species:
    """A substance of fixed composition."""

    name: str
    formula: str  # Hill order, without charge
    charge: int
    composition: tuple[tuple[str, Fraction | int], ...]  # (element symbol, count), Hill order
    molar_mass: float  # [kg/mol]
    cas: str = ""
    inchikey: str = ""
    synonyms: tuple[str, ...] = ()
    vapour: str = ""  # "associating" (carboxylic acids, HF: no equation of state) or "hydrogen-bonding"
    kind: str = "species"  # or "pseudo"
    note: str = ""

    @property
    def display_formula(self) -> str:
        """Formula with its charge, e.g. ``SO4^2-``."""
        if not self.charge:
            return self.formula
        sign = "+" if self.charge > 0 else "-"
        size = abs(self.charge)
        return f"{self.formula or 'e'}^{size if size > 1 else ''}{sign}"


@dataclass(frozen=True, slots=True)
class Ancestor:
    """A source that another takes values from or refits, with its own ancestors."""

    key: str
    title: str
    evidence: str
    copies: tuple[Ancestor, ...] = ()


@dataclass(frozen=True, slots=True)
class Source:
    """A bibliographic record."""

    key: str
    title: str
    authors: tuple[str, ...]
    year: int | None
    kind: str  # book | article | report | standard | practice
    cls: str  # evaluated | handbook | compilation | estimate | practice
    terms: str
    fields: Mapping[str, str] = field(
        default_factory=_empty
    )  # publisher, journal, volume, number, pages, place, doi, isbn ...
    carrier: str = ""
    standard_pressure: float = P_STANDARD
    note: str = ""
    lineage: tuple[tuple[str, str], ...] = ()  # (copies which source key, evidence)
    chain: tuple[Ancestor, ...] = ()  # derived from the lineage of all sources
    copied_by: tuple[str, ...] = ()  # derived likewise


@dataclass(frozen=True, slots=True)
class Carrier:
    """How a number reached us: outside the entry's identity."""

    package: str  # "propdb seed", "chemicals", "own"
    version: str
    file: str
    row: int | None
    how: str = ""  # "typed from memory", ...


@dataclass(frozen=True, slots=True)
class Entry:
    """One published quantity of one species. Immutable; ``id`` hashes what makes it this entry."""

    id: str
    species: str
    quantity: str
    phase: str
    form: str
    to: str  # Htr: the high-temperature form as "cr:beta"; else ""
    equation: str  # "" for a constant
    temperature: float | None  # [K] of a constant
    value: float | None  # SI; None for an equation
    unit: str  # SI unit of value and uncertainty
    carried: str  # the number as carried, text (or the coefficients, space separated)
    carried_unit: str
    params: Mapping[str, Any]  # of the equation, SI; {} for a constant
    tmin: float | None
    tmax: float | None
    uncertainty: float | None  # in `unit`; a fraction where uncertainty_unit is "%"
    uncertainty_unit: str  # "" (as unit) or "%"
    uncertainty_kind: str  # expanded-95 | standard | maximum | class | ""
    datum: str
    conditions: str
    source: str
    locator: str
    printed: bool = False  # True only if read from the page
    status: str = "base"
    note: str = ""
    carriers: tuple[Carrier, ...] = ()
    decided: bool = False  # its status is somebody's decision, not that of the base
    crosschecks: tuple[Crosscheck, ...] = ()  # derived, and no part of what makes it this entry

    @property
    def place(self) -> int:
        """Place of its status where entries compete, smaller is better.

        A dispute that only a comparison raised is told and moves nothing: otherwise an entry that a worse source
        contradicts would give way to one that nobody could compare. A person's dispute puts it behind the others.
        """
        if self.status == "disputed" and not self.decided:
            return USABLE_STATUSES.index("base")
        return USABLE_STATUSES.index(self.status)

    def standard_uncertainty(self) -> float | None:
        """As one standard deviation (JCGM 100:2008, 4.3): 95 % halves, a maximum error is rectangular."""
        if self.uncertainty is None:
            return None
        return self.uncertainty * KIND_TO_STANDARD[self.uncertainty_kind]


#: Factor from an uncertainty of a kind to a standard uncertainty (JCGM 100:2008, 4.3.4 and 4.3.7).
KIND_TO_STANDARD: Mapping[str, float] = MappingProxyType(
    {"standard": 1.0, "expanded-95": 0.5, "maximum": 3.0**-0.5, "class": 1.0, "": 1.0}
)


@dataclass(frozen=True, slots=True)
class State:
    """Phase, temperature, and pressure or saturation of one species."""

    phase: str
    temperature: float | None  # [K]; None when it follows from saturation at a pressure
    form: str = ""
    pressure: float | None = None  # [Pa]
    saturated: Literal["", "liquid", "vapour"] = ""

    def text(self) -> str:
        """Short text, e.g. ``g, 873.15 K`` or ``fluid, saturated vapour, 40 bar``."""
        parts = [f"{self.phase} ({self.form})" if self.form else self.phase]
        if self.saturated:
            parts.append(f"saturated {self.saturated}")
        if self.temperature is not None:
            parts.append(f"{self.temperature:.7g} K")
        if self.pressure is not None:
            parts.append(f"{self.pressure / 1e5:.6g} bar")
        return ", ".join(parts)


SAME_T: Literal["same"] = "same"
BOILING: Literal["boiling"] = "boiling"


@dataclass(frozen=True, slots=True)
class ZeroState:
    """A state named by a datum, still symbolic where the species decides.

    ``species`` is a species name; "" means the species itself. ``phase`` may be ``stable`` (the phase stable at
    ``temperature`` and 1 bar). ``temperature`` is in K, or ``"same"`` (that of the state asked for), or ``"boiling"``
    (the normal boiling point).
    """

    phase: str
    temperature: float | Literal["same", "boiling"]
    species: str = ""
    form: str = ""
    pressure: float | None = None
    saturated: Literal["", "liquid", "vapour"] = ""


@dataclass(frozen=True, slots=True)
class Datum:
    """A convention that says which state has which enthalpy. Data only: see ``propdb.datum`` for what it means.

    kind
        ``own``: the species itself in a named state has ``h0``. ``elements``: each element has 0. ``basis``: each
        basis species has 0.
    """

    name: str
    kind: Literal["own", "elements", "basis"]
    sentence: str  # plain words
    source: str  # source key, or "common-practice"
    temperature: float | Literal["same", "boiling"]
    # own
    zero: ZeroState | None = None
    per_species: Mapping[str, ZeroState] = field(default_factory=_empty)  # overrides, and when `only` the full list
    only: bool = False  # True: only the species in per_species have this datum
    h0: float = 0.0
    h0_unit: str = "J/mol"  # or J/kg
    internal_energy: bool = False  # the convention fixes u, not h
    # elements: element symbol (or "e-") -> schedule [(upper T [K], species, phase, form)], ascending
    schedule: Mapping[str, tuple[tuple[float, ZeroState], ...]] = field(default_factory=_empty)
    # basis
    basis: tuple[ZeroState, ...] = ()
    standard_pressure: float = P_STANDARD
    inline: bool = False
    note: str = ""


@dataclass(frozen=True, slots=True)
class Term:
    """One member of the zero of a species on a datum: ``coefficient`` x enthalpy of ``state`` of ``species``."""

    coefficient: Fraction
    species: str
    zero: ZeroState


@dataclass(frozen=True, slots=True)
class Zero:
    """What a datum calls zero for one species: sum of terms, less ``h0``."""

    terms: tuple[Term, ...]
    h0: float = 0.0
    h0_unit: str = "J/mol"
    internal_energy: bool = False


@dataclass(frozen=True, slots=True)
class Step:
    """One leg between two states, tied to the entry that supplies it. ``value`` in the unit of its answer."""

    what: str
    species: str
    start: str
    end: str
    value: float
    entry: str  # entry id, or "" for a definition
    source: str
    extrapolated: bool = False
    note: str = ""
    span: tuple[float, float] | None = None  # [K], of heating along a heat capacity


@dataclass(frozen=True, slots=True)
class Closure:
    """What an edge that the path does not use says less what the path says, in the unit of its answer."""

    via: str
    difference: float
    uncertainty: float | None
    entry: str = ""
    source: str = ""


@dataclass(frozen=True, slots=True)
class Part:
    """Sensitivity of an answer to one entry.

    ``coefficient`` x (error of the entry) is the error of the answer [J/mol]; ``standard`` is the standard error of the
    entry in the unit the coefficient expects (J/mol for a constant, a fraction for a heat capacity).
    """

    entry: str
    coefficient: float
    standard: float
    stated: bool


@dataclass(frozen=True, slots=True)
class MaySum:
    """May enthalpies on this datum be summed, across what, and why (not)."""

    streams: bool  # across streams of the same species without reaction
    reaction: bool
    why: str
