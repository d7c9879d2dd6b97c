"""The one table of units, exact by definition unless noted, and what a misspelt unit was meant to be."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from decimal import Decimal
from typing import Final

#: Molar gas constant [J/mol/K], exact since the SI of 2019.
R_GAS: Final = 8.31446261815324

#: Energies [J]. Thermochemical and International Table calories: ISO 80000-5. BTU is the International Table one
#: (2326 J/kg times the pound).
ENERGIES: Final[Mapping[str, float]] = {
    "J": 1.0,
    "kJ": 1e3,
    "MJ": 1e6,
    "GJ": 1e9,
    "cal_th": 4.184,
    "kcal_th": 4184.0,
    "cal_IT": 4.1868,
    "kcal_IT": 4186.8,
    "BTU": 1055.05585262,
    "kWh": 3.6e6,
}

#: Amounts [mol]. The pound of the yard and pound agreement of 1959 is 0.45359237 kg.
AMOUNTS: Final[Mapping[str, float]] = {"mol": 1.0, "kmol": 1e3, "lbmol": 453.59237}

#: Masses [kg].
MASSES: Final[Mapping[str, float]] = {"g": 1e-3, "kg": 1.0, "t": 1e3, "lb": 0.45359237}

#: Normal volumes [mol of ideal gas]. Molar volumes: 22.41397 L/mol at 0 °C and 101.325 kPa, 23.64483 L/mol at 15 °C and
#: 101.325 kPa, 379.484 ft3/lbmol at 60 °F and 1 atm.
NORMAL_VOLUMES: Final[Mapping[str, float]] = {
    "Nm3": 1e3 / 22.41397,
    "Sm3": 1e3 / 23.64483,
    "scf": 453.59237 / 379.484,
}

#: Size of one degree [K].
DEGREES: Final[Mapping[str, float]] = {"K": 1.0, "C": 1.0, "F": 5 / 9, "R": 5 / 9}

#: Scale -> (what to add, numerator, denominator): T [K] = (number + offset) * numerator / denominator.
SCALES: Final[Mapping[str, tuple[Decimal, int, int]]] = {
    "K": (Decimal(0), 1, 1),
    "C": (Decimal("273.15"), 1, 1),
    "F": (Decimal("459.67"), 5, 9),
    "R": (Decimal(0), 5, 9),
}

#: Pressures as a ratio of decimals [Pa]. psi: pound-force (9.80665 m/s2) per square inch (25.4 mm). mmHg: mercury of
#: 13595.1 kg/m3.
PRESSURES: Final[Mapping[str, tuple[Decimal, Decimal]]] = {
    symbol: (Decimal(numerator), Decimal(denominator))
    for symbol, numerator, denominator in (
        ("Pa", "1", "1"),
        ("hPa", "1e2", "1"),
        ("kPa", "1e3", "1"),
        ("MPa", "1e6", "1"),
        ("GPa", "1e9", "1"),
        ("mbar", "1e2", "1"),
        ("bar", "1e5", "1"),
        ("atm", "101325", "1"),
        ("at", "98066.5", "1"),
        ("psi", "4.4482216152605", "0.00064516"),
        ("torr", "101325", "760"),
        ("mmHg", "133.322387415", "1"),
        ("inHg", "3386.388640341", "1"),
    )
}

#: What else a person may type, to say what it is when it is in the wrong place.
_OTHER_KINDS: Final[Mapping[str, str]] = {
    **dict.fromkeys(("W", "kW", "MW", "GW", "hp"), "power"),
    **dict.fromkeys(("s", "min", "h", "d"), "time"),
    **dict.fromkeys(("L", "mL", "m3", "cm3", "ft3"), "volume"),
    **dict.fromkeys(("m", "mm", "cm", "ft"), "length"),
    **dict.fromkeys(("N", "kN", "lbf", "kgf"), "force"),
    **dict.fromkeys(("mJ", "Wh", "MWh", "eV"), "energy"),
    "mPa": "pressure",
    "Mbar": "pressure",
}

#: Other spellings that mean the same and nothing else.
_SAME: Final[Mapping[str, str]] = {
    "lbm": "lb",
    "btu_it": "BTU",
    "kelvin": "K",
    "celsius": "C",
    "centigrade": "C",
    "fahrenheit": "F",
    "rankine": "R",
    "ra": "R",
    "ata": "at",
}

#: Letter case decides here, since the other case is another unit: milli or mega, cubic nanometre.
_CASE_MATTERS: Final = frozenset({"mj", "mpa", "mbar", "nm3", "mw", "mwh", "gw", "m", "s", "d", "n"})

#: Misspellings and habits -> what was meant.
_MEANT: Final[Mapping[str, str]] = {
    "mole": "mol",
    "moles": "mol",
    "gmol": "mol",
    "g-mol": "mol",
    "kmole": "kmol",
    "kmoles": "kmol",
    "kgmol": "kmol",
    "lbmole": "lbmol",
    "lbmoles": "lbmol",
    "lbs": "lb",
    "pound": "lb",
    "gram": "g",
    "gr": "g",
    "kilogram": "kg",
    "kgs": "kg",
    "ton": "t",
    "tonne": "t",
    "joule": "J",
    "joules": "J",
    "btus": "BTU",
    "m3n": "Nm3",
    "ncm": "Nm3",
    "scm": "Sm3",
    "sft3": "scf",
    "nm3": "Nm3",
    "mj": "MJ",
    "mpa": "MPa",
    "mbar": "mbar",
    "bars": "bar",
    "atmosphere": "atm",
    "atmospheres": "atm",
    "pascal": "Pa",
}

#: A calorie without its kind.
CALORIES: Final = frozenset({"cal", "kcal"})

KINDS: Final[Mapping[str, str]] = {
    **dict.fromkeys(ENERGIES, "energy"),
    **dict.fromkeys(AMOUNTS, "amount"),
    **dict.fromkeys(MASSES, "mass"),
    **dict.fromkeys(NORMAL_VOLUMES, "normal volume"),
    **dict.fromkeys(SCALES, "temperature"),
    **dict.fromkeys(PRESSURES, "pressure"),
    **_OTHER_KINDS,
}

_FOLDED: Final[Mapping[str, str]] = {
    **{symbol.lower(): symbol for symbol in reversed(tuple(KINDS)) if symbol.lower() not in _CASE_MATTERS},
    **_SAME,
}


def resolve(symbol: str) -> str | None:
    """The unit as the table writes it, or None when the table has no such unit."""
    return symbol if symbol in KINDS else _FOLDED.get(symbol.lower())


def meant(symbol: str, among: Iterable[str]) -> str | None:
    """What a symbol that does not belong was likely meant to be, out of `among`; None when nothing is near."""
    candidates = list(among)
    likely = _MEANT.get(symbol.lower())
    if likely in candidates:
        return likely
    import difflib  # only on the way to an error

    near = difflib.get_close_matches(symbol.lower(), [c.lower() for c in candidates], n=1, cutoff=0.7)
    return next((c for c in candidates if near and c.lower() == near[0]), None)
