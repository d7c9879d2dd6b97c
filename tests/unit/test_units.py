"""Units as people type them: what is taken, what is refused, and what the refusal says."""

from __future__ import annotations

import pickle
import subprocess
import sys
from collections.abc import Callable

import pytest

from propdb.errors import InvalidInput, PressureError, TemperatureError, UnitError
from propdb.units import (
    SI_UNITS,
    EnthalpyUnit,
    enthalpy_decimals,
    format_enthalpy,
    format_number,
    format_pressure,
    format_temperature,
    parse_heat_capacity_unit,
    parse_pressure,
    parse_quantity,
    parse_temperature,
    parse_unit,
    read_si,
)

WATER = 0.018015  # [kg/mol]


def refusal(error: type[InvalidInput], call: Callable[[str], object], text: str) -> str:
    with pytest.raises(error) as caught:
        call(text)
    assert type(caught.value) is error
    message = str(caught.value)
    assert "\n" not in message
    assert str(pickle.loads(pickle.dumps(caught.value))) == message  # noqa: S301
    return message


@pytest.mark.parametrize(
    "text, kelvin",
    [
        ("600C", 873.15),
        ("873.15K", 873.15),
        ("1112F", 873.15),
        ("1571.67R", 873.15),
        ("-40 C", 233.15),
        ("-40F", 233.15),
        ("\u221240 °C", 233.15),
        ("25 °C", 298.15),
        ("25℃", 298.15),
        ("25degC", 298.15),
        ("77 deg F", 298.15),
        ("77f", 298.15),
        ("536.67 °R", 298.15),
        ("32F", 273.15),
        ("2.9815e2 K", 298.15),
        ("+25\u00a0°C", 298.15),
        (".5K", 0.5),
    ],
)
def test_temperatures_are_the_very_float(text: str, kelvin: float) -> None:
    assert parse_temperature(text) == kelvin


@pytest.mark.parametrize(
    "text, says",
    [
        ("298.15", "did you mean 298.15K or 298.15C?"),
        ("25,5C", "did you mean '25.5C'?"),
        ("1,234.5K", "did you mean '1234.5K'?"),
        ("1,234K", "did you mean '1.234K' or '1234K'?"),
        ("NaN", "not a finite number"),
        ("-inf K", "not a finite number"),
        ("1e999K", "too large"),
        ("0K", "at 0 K"),
        ("-273.15C", "at 0 K; write a temperature above -273.15C"),
        ("-300C", "below 0 K"),
        ("-459.68F", "below 0 K"),
        ("", "nothing is given"),
        ("warm", "'warm' is not a temperature"),
        ("1_000K", "not one number"),
        ("1 000 K", "not one number"),
        ("1.2.3K", "not one number"),
    ],
)
def test_temperature_refusals(text: str, says: str) -> None:
    assert says in refusal(TemperatureError, parse_temperature, text)


@pytest.mark.parametrize(
    "text, says",
    [
        ("25bar", "'bar' is a unit of pressure, not of temperature; write K, C, F or R"),
        ("25X", "'X' is not a unit of temperature"),
        ("25 kJ/mol", "'kJ/mol' is not a unit of temperature"),
        ("25 mK", "'mK' is not a unit of temperature"),
    ],
)
def test_temperature_units_that_are_none(text: str, says: str) -> None:
    assert says in refusal(UnitError, parse_temperature, text)


@pytest.mark.parametrize(
    "text, pascal",
    [
        ("40bar", 4e6),
        ("40 Bar", 4e6),
        ("1atm", 101325.0),
        ("0.1MPa", 1e5),
        ("101.325kPa", 101325.0),
        ("101.325 KPA", 101325.0),
        ("1013.25mbar", 101325.0),
        ("1013.25 hPa", 101325.0),
        ("760 torr", 101325.0),
        ("760Torr", 101325.0),
        ("1 bara", 1e5),
        ("1 bar(a)", 1e5),
        ("1bar abs", 1e5),
        ("5barg+1.01325bar", 601325.0),
        ("5 bar(g) + 1.01325 bar", 601325.0),
        ("-0.2barg+1bar", 80000.0),
        ("5barg+1atm", 601325.0),
    ],
)
def test_pressures(text: str, pascal: float) -> None:
    assert parse_pressure(text) == pascal


@pytest.mark.parametrize(
    "text, pascal, half_a_digit",
    # NIST SP 811 (2008), appendix B: factors as printed there, to seven digits
    [
        ("1psi", 6.894757e3, 5e-4),
        ("1psia", 6.894757e3, 5e-4),
        ("1mmHg", 1.333224e2, 5e-5),
        ("1torr", 1.333224e2, 5e-5),
        ("1inHg", 3.386389e3, 5e-4),
        ("1at", 9.80665e4, 0.0),
    ],
)
def test_pressures_published(text: str, pascal: float, half_a_digit: float) -> None:
    assert parse_pressure(text) == pytest.approx(pascal, rel=0, abs=half_a_digit)


@pytest.mark.parametrize(
    "text, says",
    [
        ("5barg", "gauge needs a stated atmosphere; add it, e.g. 5barg+1.01325bar"),
        ("5 bar g", "gauge needs a stated atmosphere"),
        ("100psig", "add it, e.g. 100psig+14.696psi"),
        ("3 mmHgg", "gauge needs a stated atmosphere"),
        ("5barg+1barg", "'1barg' is not an absolute pressure of the atmosphere"),
        ("5barg+-1bar", "'-1bar' is not an absolute pressure of the atmosphere"),
        ("5barg+1", "'1' is not an absolute pressure of the atmosphere"),
        ("5barg+", "the atmosphere is needed"),
        ("5bar+1bar", "not gauge"),
        ("-2barg+1bar", "not a positive absolute pressure"),
        ("0bar", "not a positive absolute pressure"),
        ("-1bar", "not a positive absolute pressure"),
        ("1e308MPa", "too large"),
        ("5", "did you mean 5bar, 5Pa or 5psi?"),
        ("1,5bar", "did you mean '1.5bar'?"),
        ("inf", "not a finite number"),
    ],
)
def test_pressure_refusals(text: str, says: str) -> None:
    assert says in refusal(PressureError, parse_pressure, text)


@pytest.mark.parametrize(
    "text, says",
    [
        ("5K", "'K' is a unit of temperature, not of pressure"),
        ("5mPa", "did you mean MPa?"),
        ("5mpa", "did you mean MPa?"),
        ("5Mbar", "did you mean mbar?"),
        ("5bars", "did you mean bar?"),
        ("5 kgf", "'kgf' is a unit of force"),
    ],
)
def test_pressure_units_that_are_none(text: str, says: str) -> None:
    assert says in refusal(UnitError, parse_pressure, text)


@pytest.mark.parametrize("hint", ["5barg+1.01325bar", "100psig+14.696psi"])
def test_the_offered_gauge_form_is_taken(hint: str) -> None:
    assert parse_pressure(hint) > 1e5


@pytest.mark.parametrize(
    "text, canonical",
    [
        ("KJ/mol", "kJ/mol"),
        ("kj/kg", "kJ/kg"),
        ("kJ/Kg", "kJ/kg"),
        ("btu/lb", "BTU/lb"),
        ("Btu/lbm", "BTU/lb"),
        ("BTU/lb-mol", "BTU/lbmol"),
        ("kJ / Nm³", "kJ/Nm3"),
        ("kJ mol-1", "kJ/mol"),
        ("kJ·mol⁻¹", "kJ/mol"),
        ("kJ mol^\u22121", "kJ/mol"),
        ("kcal_it/kg", "kcal_IT/kg"),
        ("kwh/T", "kWh/t"),
        ("BTU/SCF", "BTU/scf"),
    ],
)
def test_other_writings_of_one_unit(text: str, canonical: str) -> None:
    assert parse_unit(text) == parse_unit(canonical)
    assert str(parse_unit(text)) == canonical


@pytest.mark.parametrize(
    "text, says",
    [
        ("kcal/mol", "kcal has two meanings; write 'kcal_th/mol' (4184 J) or 'kcal_IT/mol' (4186.8 J)"),
        ("cal/g", "write 'cal_th/g' (4.184 J) or 'cal_IT/g' (4.1868 J)"),
        ("Kcal/kg", "two meanings"),
        ("kJ", "'kJ' is an energy, not an enthalpy; did you mean kJ/mol or kJ/kg?"),
        ("kW/kg", "'kW/kg' is a power per mass, not an enthalpy; did you mean kJ/kg?"),
        ("kW", "'kW' is a power"),
        ("bar", "'bar' is a pressure, not an enthalpy; write an energy per amount, mass or normal volume"),
        ("J/mol/K", "an energy per amount per temperature, not an enthalpy; did you mean J/mol?"),
        ("kJ/h", "an energy per time"),
        ("kJ/m3", "say at which conditions: Nm3 (0 °C), Sm3 (15 °C) or scf (60 °F)"),
        ("kJ/mol/kg", "an energy per amount per mass"),
        ("mol/kJ", "an amount per energy"),
        ("kJ/kmole", "did you mean 'kJ/kmol'?"),
        ("kJ/mole", "did you mean 'kJ/mol'?"),
        ("mj/kg", "did you mean 'MJ/kg'?"),
        ("mJ/kg", "did you mean MJ/kg?"),
        ("kJ/nm3", "did you mean 'kJ/Nm3'?"),
        ("MJ/ton", "did you mean 'MJ/t'? (t is 1000 kg)"),
        ("joule/mol", "did you mean 'J/mol'?"),
        ("furlong/mol", "unknown unit 'furlong' in 'furlong/mol'; known are J,"),
        ("BTU_th/lb", "unknown unit 'BTU_th'"),
        ("R", "'R' is a temperature"),
        ("", "not a unit of enthalpy"),
        ("kJ/", "not a unit of enthalpy"),
        ("kJ//mol", "not a unit of enthalpy"),
        ("1", "not a unit of enthalpy"),
    ],
)
def test_unit_refusals(text: str, says: str) -> None:
    assert says in refusal(UnitError, parse_unit, text)


@pytest.mark.parametrize(
    "text, canonical",
    [
        ("J/(mol K)", "J/mol/K"),
        ("J/(mol·K)", "J/mol/K"),
        ("J/mol-K", "J/mol/K"),
        ("J mol-1 K-1", "J/mol/K"),
        ("J·K⁻¹·mol⁻¹", "J/mol/K"),
        ("J/mol K", "J/mol/K"),
        ("Btu/lb-°F", "BTU/lb/F"),
        ("BTU/lb/degF", "BTU/lb/F"),
        ("BTU/lb-mol-R", "BTU/lbmol/R"),
        (" R ", "R"),
    ],
)
def test_other_writings_of_a_heat_capacity(text: str, canonical: str) -> None:
    assert parse_heat_capacity_unit(text) == parse_heat_capacity_unit(canonical)
    assert parse_heat_capacity_unit(text).text == canonical


@pytest.mark.parametrize(
    "text, says",
    [
        ("J/mol", "'J/mol' is an energy per amount, not a heat capacity or entropy; did you mean J/mol/K?"),
        ("kJ/K", "did you mean kJ/mol/K or kJ/kg/K?"),
        ("cal/mol/K", "write 'cal_th/mol/K' (4.184 J) or 'cal_IT/mol/K' (4.1868 J)"),
        ("J/mol/K/K", "per temperature per temperature"),
        ("kW/kg/K", "did you mean kJ/kg/K?"),
    ],
)
def test_heat_capacity_refusals(text: str, says: str) -> None:
    assert says in refusal(UnitError, parse_heat_capacity_unit, text)


def test_published_factors() -> None:
    """NIST SP 811 (2008), appendix B, all exact: Btu_IT/lb 2.326e3 J/kg, Btu_IT/(lb °F) 4.1868e3 J/(kg K)."""
    assert parse_unit("BTU/lb").factor == pytest.approx(2326.0, rel=1e-14)
    assert parse_heat_capacity_unit("BTU/lb/F").factor == pytest.approx(4186.8, rel=1e-14)
    assert parse_unit("kcal_IT/kg").factor == pytest.approx(4186.8, rel=1e-14)
    assert parse_heat_capacity_unit("R").factor == 8.31446261815324  # SI Brochure, 9th edition: k times N_A


def test_per_mass_needs_a_molar_mass() -> None:
    unit = parse_unit("kJ/kg")
    assert unit.to_si(100.0, molar_mass=WATER) == pytest.approx(1801.5, rel=1e-12)
    assert unit.from_si(1801.5, molar_mass=WATER) == pytest.approx(100.0, rel=1e-12)
    assert parse_unit("kJ/mol").to_si(1.0) == 1000.0
    with pytest.raises(UnitError, match="molar mass is not known"):
        unit.to_si(1.0)
    for bad in (0.0, -1.0, float("nan"), float("inf")):
        with pytest.raises(UnitError, match="positive molar mass"):
            unit.scale(molar_mass=bad)


def test_units_are_frozen_and_pickle() -> None:
    unit = parse_unit("kJ/kg")
    with pytest.raises(AttributeError):
        unit.factor = 1.0  # type: ignore[misc]
    assert pickle.loads(pickle.dumps(unit)) == unit  # noqa: S301
    assert unit == EnthalpyUnit("kJ/kg", "mass", 1000.0)
    assert hash(unit) == hash(parse_unit("KJ/KG"))


@pytest.mark.parametrize(
    "text, number, value, unit",
    [
        ("2800.8 kJ/kg", "2800.8", 2800.8, "kJ/kg"),
        ("-393.510kJ/mol", "-393.510", -393.51, "kJ/mol"),
        ("\u2212393.510 kJ/mol", "-393.510", -393.51, "kJ/mol"),
        ("1.2e3 btu/lb", "1.2e3", 1200.0, "BTU/lb"),
        ("5e3 J/mol", "5e3", 5000.0, "J/mol"),
    ],
)
def test_quantities_keep_the_number_as_carried(text: str, number: str, value: float, unit: str) -> None:
    carried, read, of = parse_quantity(text)
    assert (carried, read, of.text) == (number, value, unit)


@pytest.mark.parametrize(
    "text, says",
    [
        ("2800.8", "has no unit; write e.g. '2800.8 kJ/mol' or '2800.8 kJ/kg'"),
        ("2800,8 kJ/kg", "did you mean '2800.8 kJ/kg'?"),
        ("nan kJ/kg", "not a finite number"),
        ("kJ/kg", "is not an enthalpy"),
        ("5 kJ", "'kJ' is an energy"),
    ],
)
def test_quantity_refusals(text: str, says: str) -> None:
    assert says in refusal(UnitError, parse_quantity, text)


def test_read_si_for_rows_of_data() -> None:
    assert read_si("-393.51", "kJ/mol", dimension="enthalpy") == pytest.approx(-393510.0, rel=1e-14)
    assert read_si("75.3", "J/mol/K", dimension="heat capacity") == 75.3
    assert read_si("2.5", "R", dimension="heat capacity") == 2.5 * 8.31446261815324
    assert read_si("4.18", "J/g/K", dimension="heat capacity", molar_mass=WATER) == pytest.approx(75.3027, rel=1e-12)
    assert read_si("100", "C", dimension="temperature") == 373.15
    assert read_si("1.8", "F", dimension="temperature", difference=True) == pytest.approx(1.0)
    assert read_si("0", "K", dimension="temperature", difference=True) == 0.0
    assert read_si("220.64", "bar", dimension="pressure") == 22064000.0
    assert read_si("0", "bar", dimension="pressure", difference=True) == 0.0
    assert read_si("0.3443", "1", dimension="number") == 0.3443
    assert set(SI_UNITS) == {"enthalpy", "heat capacity", "temperature", "pressure", "number"}


@pytest.mark.parametrize(
    "number, unit, dimension, error",
    [
        ("-1", "K", "temperature", TemperatureError),
        ("1", "kJ/mol", "temperature", UnitError),
        ("1", "K", "enthalpy", UnitError),
        ("0", "bar", "pressure", PressureError),
        ("1", "kJ", "number", UnitError),
        ("1 2", "K", "temperature", UnitError),
        ("1 K", "K", "temperature", UnitError),
        ("", "K", "temperature", UnitError),
        ("1e308", "MJ/mol", "enthalpy", UnitError),
        ("1", "kJ/kg", "enthalpy", UnitError),
    ],
)
def test_read_si_refusals(number: str, unit: str, dimension: str, error: type[InvalidInput]) -> None:
    with pytest.raises(error):
        read_si(number, unit, dimension=dimension)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    "value, options, text",
    [
        (-0.0001, {"decimals": 3}, "0.000"),
        (-393.51, {"decimals": 3}, "-393.510"),
        (1234.5678, {"significant": 6}, "1234.57"),
        (123456.0, {"significant": 3}, "123000"),
        (0.00012345, {"significant": 3}, "0.000123"),
        (1e-9, {"significant": 3}, "1.00e-09"),
        (1.5e20, {"decimals": 3}, "1.50000e+20"),
        (0.0, {}, "0.00000"),
        (-393.51, {"uncertainty": 0.13}, "-393.51 ± 0.13"),
        (-0.001, {"uncertainty": 0.13}, "0.00 ± 0.13"),
        (123456.0, {"uncertainty": 2345.0}, "123500 ± 2300"),
        (5.0, {"uncertainty": 0.0996}, "5.00 ± 0.10"),
        (5.0, {"uncertainty": 0.0}, "5.00000"),
        (float("nan"), {"decimals": 2}, "nan"),
    ],
)
def test_numbers_as_written(value: float, options: dict[str, float], text: str) -> None:
    assert format_number(value, **options) == text  # type: ignore[arg-type]


def test_one_way_of_rounding_at_a_time() -> None:
    with pytest.raises(TypeError):
        format_number(1.0, decimals=1, significant=2)


@pytest.mark.parametrize(
    "unit, decimals",
    [("kJ/mol", 3), ("J/mol", 0), ("kJ/kmol", 0), ("MJ/kmol", 3), ("kJ/kg", 2), ("BTU/lb", 2), ("MJ/kg", 5)],
)
def test_decimals_of_an_enthalpy(unit: str, decimals: int) -> None:
    assert enthalpy_decimals(parse_unit(unit)) == decimals


def test_formats() -> None:
    assert format_enthalpy(-393.51, parse_unit("kJ/mol")) == "-393.510 kJ/mol"
    assert format_temperature(298.15) == "298.15 K"
    assert format_temperature(298.15, unit="C") == "25 °C"
    assert format_temperature(273.16, unit="C") == "0.01 °C"
    assert format_temperature(273.15, unit="F") == "32 °F"
    assert format_temperature(300.0) == "300 K"
    assert format_temperature(0.0003) == "0.000300 K"
    assert format_pressure(101325.0) == "1.01325 bar"
    assert format_pressure(101325.0, unit="psi") == "14.6959 psi"
    with pytest.raises(UnitError):
        format_temperature(300.0, unit="bar")
    with pytest.raises(UnitError):
        format_pressure(1e5, unit="K")


def test_nothing_heavy_is_imported() -> None:
    """Start-up time is a feature: units bring neither arrays nor the search for near misses."""
    code = "import sys, propdb.units; print(*sorted({'numpy', 'scipy', 'difflib', 'pint'} & set(sys.modules)))"
    ran = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert ran.stdout.strip() == ""
