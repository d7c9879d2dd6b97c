"""Fuels of our own invention for the tests: no real certificate, mine or supplier is behind them."""

from __future__ import annotations

from typing import Any

#: Molar masses of the atoms [kg/mol] (CIAAW 2021, abridged) and the enthalpy of vaporisation of water at 25 C [J/mol].
WEIGHTS = {"C": 12.011e-3, "H": 1.008e-3, "N": 14.007e-3, "S": 32.06e-3, "O": 15.999e-3, "Cl": 35.45e-3}
VAPORISATION = 44012.0

SOURCE = {"title": "Invented certificate", "authors": ["Example laboratory"], "year": 2024}


def sample(**changes: Any) -> dict[str, Any]:
    """Wood as a certificate might give it; ``table__key=value`` changes a key, None takes it out."""
    data: dict[str, Any] = {
        "name": "test wood",
        "phase": "cr",
        "source": "own-test-fuels",
        "new-source": dict(SOURCE),
        "analysis": {"basis": "dry", "C": "50.2", "H": "6.1", "N": "0.2", "S": "0.02", "O": "42.68", "ash": "0.8"},
        "moisture": {"as-received": "35.0", "air-dried": "7.5"},
        "calorific-value": {"value": "20.2 MJ/kg", "kind": "gross", "at": "constant volume", "basis": "dry"},
    }
    for name, value in changes.items():
        table, _, key = name.partition("__")
        where = data.setdefault(table.replace("_", "-"), {}) if key else data
        key = (key or table).replace("_", "-")
        if value is None:
            where.pop(key, None)
        else:
            where[key] = value
    return data


#: As wood, coal, sludge, oil and waste may come: analysis and moistures in mass %.
FUELS: dict[str, dict[str, Any]] = {
    "wood": {},
    "coal": {
        "analysis": {
            "basis": "air-dried", "C": "68.42", "H": "4.31", "N": "1.35", "S": "0.71", "O": "8.66", "ash": "13.35",
            "moisture": "3.20",
        },
        "moisture": {"as-received": "9.8"},
        "calorific-value": {"value": "27.63 MJ/kg", "kind": "gross", "at": "constant volume", "basis": "air-dried"},
    },
    "sludge": {
        "analysis": {
            "basis": "as-received", "C": "8.1", "H": "1.2", "N": "1.2", "S": "0.3", "O": "5.0", "ash": "9.2",
            "moisture": "75.0",
        },
        "moisture": {},
        "calorific-value": {"value": "1.2 MJ/kg", "kind": "net", "at": "constant pressure", "basis": "as-received"},
    },
    "oil": {
        "phase": "l",
        "analysis": {"basis": "dry", "C": "86.2", "H": "12.4", "N": "0.2", "S": "0.9", "O": "0.3"},
        "moisture": {"as-received": "0.1"},
        "calorific-value": {"value": "10300 kcal_IT/kg", "kind": "gross", "at": "constant volume", "basis": "dry"},
    },
    "waste": {
        "analysis": {
            "basis": "dry-ash-free", "C": "58.0", "H": "8.0", "N": "1.2", "S": "0.3", "O": "30.5", "Cl": "2.0",
        },
        "ash": {"dry": "17.5"},
        "moisture": {"as-received": "22.0"},
        "calorific-value": {"value": "14.9 MJ/kg", "kind": "net", "at": "constant pressure", "basis": "as-received"},
    },
}  # fmt: skip


def fuel(name: str) -> dict[str, Any]:
    """One of :data:`FUELS`, whole."""
    return {**sample(), "name": f"test {name}", **FUELS[name]}
