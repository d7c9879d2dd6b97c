"""Fuels: an ultimate analysis and a calorific value on the bases of ISO 1170, and what ISO 1928 makes of them.

A fuel is kept dry and ash-free. Per kilogram of it, ``gross`` is the gross calorific value at constant pressure, 25 °C:
combustion in oxygen to gaseous carbon dioxide, sulfur dioxide and nitrogen, liquid water, and, where there is chlorine,
gaseous hydrogen chloride. Everything else follows by stoichiometry: net values from the water that forms and the
moisture, values at constant volume from the change in moles of gas, other bases from moisture and ash. With molar
masses and the enthalpy of vaporisation put in, these are the relations of ISO 1928, whose coefficients are rounded.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from math import floor, log10

from propdb.errors import InvalidInput
from propdb.model.records import R_GAS, T_STANDARD

__all__ = [
    "BASES",
    "ELEMENTS",
    "FORMULA_UNIT",
    "KINDS",
    "MOIST",
    "PLACES",
    "Analysis",
    "Fuel",
    "FuelSheet",
    "estimate",
    "gross_of",
]

#: Elements of an ultimate analysis.
ELEMENTS = ("C", "H", "N", "S", "O", "Cl")
#: Basis to its subscript in ISO 1928.
BASES: Mapping[str, str] = {"as-received": "ar", "air-dried": "ad", "dry": "d", "dry-ash-free": "daf"}
MOIST = ("as-received", "air-dried")
KINDS = ("gross", "net")
PLACES = ("constant volume", "constant pressure")
#: One mole of a fuel is one gram of it, ash and moisture included [kg/mol]: kJ/mol then reads as MJ/kg.
FORMULA_UNIT = 1e-3
#: Atoms are counted to so many digits, and no further than a formula can be written [mol/g].
_DIGITS, _DECIMALS = 5, 8


@dataclass(frozen=True, slots=True)
class Analysis:
    """What is in a fuel, whatever the basis.

    elements
        Of dry ash-free fuel [kg/kg].
    ash
        Of dry fuel [kg/kg]; None where it is not known.
    moisture
        As received and air dried, where known [kg/kg].
    weights
        Molar mass of the atoms [kg/mol].
    """

    elements: Mapping[str, float]
    ash: float | None
    moisture: Mapping[str, float]
    weights: Mapping[str, float]

    def bases(self) -> tuple[str, ...]:
        """Bases that what is known leads to."""
        return tuple(basis for basis in BASES if self._missing(basis) == "")

    def _missing(self, basis: str) -> str:
        if basis != "dry-ash-free" and self.ash is None:
            return "ash"
        return "moisture" if basis in MOIST and basis not in self.moisture else ""

    def dry_ash_free(self, basis: str) -> float:
        """Dry ash-free fuel in one kilogram on a basis [kg/kg].

        Raises
        ------
        InvalidInput
            The ash or the moisture that the basis needs is not known.
        """
        missing = self._missing(basis)
        if missing:
            words = basis.replace("-", " ")
            where = f"[moisture] {basis}" if missing == "moisture" else "[ash] dry"
            raise InvalidInput(f"{missing} is missing: {words} needs it", hint=f"give {where}, 0 if there is none")
        dry = 1.0 - (0.0 if basis == "dry-ash-free" or self.ash is None else self.ash)
        return dry * (1.0 - self.moisture_on(basis))

    def moisture_on(self, basis: str) -> float:
        """Moisture in one kilogram on a basis [kg/kg]."""
        return self.moisture.get(basis, 0.0) if basis in MOIST else 0.0

    def fractions(self, basis: str) -> dict[str, float]:
        """Elements, ash and moisture on a basis [kg/kg] (ISO 1170); H and O without those of the moisture."""
        part, moisture = self.dry_ash_free(basis), self.moisture_on(basis)
        found = {element: self.elements.get(element, 0.0) * part for element in ELEMENTS}
        ash = 0.0 if basis == "dry-ash-free" or self.ash is None else self.ash * (1.0 - moisture)
        return {**found, "ash": ash, "moisture": moisture}

    def _moles(self, basis: str) -> tuple[dict[str, float], float]:
        """Atoms without moisture, and moisture, in one kilogram on a basis [mol/kg]."""
        fractions = self.fractions(basis)
        water = 2.0 * self.weights["H"] + self.weights["O"]
        return {e: fractions[e] / self.weights[e] for e in ELEMENTS if fractions[e]}, fractions["moisture"] / water

    def atoms(self, basis: str) -> dict[str, Fraction]:
        """Atoms per formula unit, moisture included, ash left out: one formula unit is one gram on that basis."""
        moles, water = self._moles(basis)
        for element, count in (("H", 2.0), ("O", 1.0)):
            moles[element] = moles.get(element, 0.0) + count * water
        counted = {e: _counted(n * FORMULA_UNIT) for e, n in moles.items()}
        return {e: n for e, n in counted.items() if n}

    def offset(self, kind: str, at: str, basis: str, *, vaporisation: float) -> float:
        """A calorific value less the gross one at constant pressure, both on one basis [J/kg].

        Parameters
        ----------
        kind, at, basis : str
            ``gross`` or ``net``; ``constant volume`` or ``constant pressure``; one of :data:`BASES`.
        vaporisation : float
            Enthalpy of vaporisation of water at 25 °C, to the ideal gas [J/mol].

        Raises
        ------
        InvalidInput
            As :meth:`dry_ash_free`; or more chlorine than there is hydrogen for.
        """
        n, moisture = self._moles(basis)
        chlorine = n.get("Cl", 0.0)
        water = (n.get("H", 0.0) - chlorine) / 2.0
        if water < 0.0:
            raise InvalidInput(
                "more atoms of chlorine than of hydrogen, so it cannot burn to hydrogen chloride",
                hint="check H and Cl of the analysis",
            )
        # moles of gas that form less those of oxygen that go, water being liquid
        gas = n.get("N", 0.0) / 2.0 + n.get("O", 0.0) / 2.0 + chlorine - water / 2.0
        value = 0.0
        if kind == "net":
            value -= vaporisation * (water + moisture)
            gas += water + moisture
        return value + (R_GAS * T_STANDARD * gas if at == "constant volume" else 0.0)


def _counted(moles: float) -> Fraction:
    decimals = min(_DECIMALS, _DIGITS - 1 - floor(log10(moles))) if moles > 0.0 else 0
    return Fraction(round(moles * 10**decimals), 10**decimals)


@dataclass(frozen=True, slots=True)
class Fuel:
    """A fuel: what is in it, and its gross calorific value at constant pressure, dry and ash-free [J/kg]."""

    name: str
    phase: str
    analysis: Analysis
    gross: float
    vaporisation: float  # of water at 25 °C, to the ideal gas [J/mol]

    def calorific_value(self, kind: str, at: str, basis: str) -> float:
        """A calorific value at 25 °C [J/kg]; arguments and errors as :meth:`Analysis.offset`."""
        part = self.analysis.dry_ash_free(basis)
        return self.gross * part + self.analysis.offset(kind, at, basis, vaporisation=self.vaporisation)


def gross_of(value: float, kind: str, at: str, basis: str, *, analysis: Analysis, vaporisation: float) -> float:
    """The gross calorific value at constant pressure, dry and ash-free, that belongs to another [J/kg].

    Parameters
    ----------
    value : float
        A calorific value [J/kg].
    kind, at, basis, vaporisation
        As :meth:`Analysis.offset`.

    Raises
    ------
    InvalidInput
        As :meth:`Analysis.offset`.
    """
    offset = analysis.offset(kind, at, basis, vaporisation=vaporisation)
    return (value - offset) / analysis.dry_ash_free(basis)


def estimate(fractions: Mapping[str, float]) -> float:
    """Gross calorific value from an ultimate analysis, both dry [J/kg]: a check on a typed one, 1.5 % on average.

    Channiwala, Parikh (2002), Fuel 81, 1051: 0.3491 C + 1.1783 H + 0.1005 S - 0.1034 O - 0.0151 N - 0.0211 ash, MJ/kg
    with mass %.
    """
    factors = {"C": 0.3491, "H": 1.1783, "S": 0.1005, "O": -0.1034, "N": -0.0151, "ash": -0.0211}
    return 1e8 * sum(factor * fractions.get(part, 0.0) for part, factor in factors.items())


@dataclass(frozen=True, slots=True)
class FuelSheet:
    """All that follows from one fuel. Mass fractions [kg/kg], calorific values and enthalpies [J/kg], at 25 °C."""

    name: str
    formula: str  # atoms per gram, as it stands in the store
    phase: str
    basis: str  # on which it stands in the store
    datum: str  # combustion datum of its entry
    given: str  # the calorific value as given
    source: str
    fractions: Mapping[str, Mapping[str, float]]  # basis -> element, ash, moisture
    values: Mapping[str, Mapping[str, float]]  # basis -> "gross constant volume" ...
    formation: Mapping[str, float]  # basis -> on elements-298K
    estimate: float | None  # by Channiwala and Parikh, gross, dry
    remarks: tuple[str, ...]
    entry: str = ""  # id
    status: str = ""  # "" where it is not in the store

    def as_dict(self) -> dict[str, object]:
        """For JSON."""
        return {
            "name": self.name,
            "formula": self.formula,
            "phase": self.phase,
            "basis": self.basis,
            "datum": self.datum,
            "given": self.given,
            "source": self.source,
            "temperature": T_STANDARD,
            "unit": "J/kg",
            "fractions": {basis: dict(row) for basis, row in self.fractions.items()},
            "calorific_values": {basis: dict(row) for basis, row in self.values.items()},
            "formation": {"datum": "elements-298K", **self.formation},
            "estimate": self.estimate,
            "remarks": list(self.remarks),
            "entry": self.entry or None,
            "status": self.status or None,
        }
