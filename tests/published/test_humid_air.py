"""Moist air on the datums of psychrometric charts: dry air as a gas and water as a liquid are zero.

The formulas are those of ASHRAE Handbook, Fundamentals, chapter Psychrometrics: per unit mass of dry air,
h = 1.006 t + W (2501 + 1.86 t) kJ/kg with t in degrees Celsius, and h = 0.240 t + W (1061 + 0.444 t) BTU/lb in
degrees Fahrenheit. Their coefficients are rounded, and a constant heat capacity is good to some 0.1 %.
"""

from __future__ import annotations

import pytest

from propdb.api import Store
from propdb.errors import DatumError

SI, INCH_POUND = "humid-air-0C", "humid-air-0F-32F"


def moist_air(store: Store, *, temperature: str, humidity_ratio: float, datum: str, unit: str) -> float:
    """Enthalpy of dry air and of ``humidity_ratio`` times its mass of water vapour, per mass of dry air [unit]."""
    dry = store.enthalpy("dry air", phase="g", temperature=temperature, datum=datum, unit=unit)
    vapour = store.enthalpy("water", phase="g", temperature=temperature, datum=datum, unit=unit)
    return dry.value + humidity_ratio * vapour.value


def ashrae_si(*, celsius: float, humidity_ratio: float) -> float:
    return 1.006 * celsius + humidity_ratio * (2501.0 + 1.86 * celsius)


def ashrae_inch_pound(*, fahrenheit: float, humidity_ratio: float) -> float:
    return 0.240 * fahrenheit + humidity_ratio * (1061.0 + 0.444 * fahrenheit)


@pytest.mark.parametrize(("celsius", "humidity_ratio"), [(25.0, 0.010), (10.0, 0.004), (40.0, 0.030), (60.0, 0.0)])
def test_moist_air_in_si(store: Store, celsius: float, humidity_ratio: float) -> None:
    ours = moist_air(store, temperature=f"{celsius}C", humidity_ratio=humidity_ratio, datum=SI, unit="kJ/kg")
    assert ours == pytest.approx(ashrae_si(celsius=celsius, humidity_ratio=humidity_ratio), rel=2e-3)


@pytest.mark.parametrize(("fahrenheit", "humidity_ratio"), [(77.0, 0.010), (50.0, 0.004), (100.0, 0.030), (140.0, 0.0)])
def test_moist_air_in_inch_pound_units(store: Store, fahrenheit: float, humidity_ratio: float) -> None:
    ours = moist_air(
        store, temperature=f"{fahrenheit}F", humidity_ratio=humidity_ratio, datum=INCH_POUND, unit="BTU/lb"
    )
    expected = ashrae_inch_pound(fahrenheit=fahrenheit, humidity_ratio=humidity_ratio)
    assert ours == pytest.approx(expected, rel=2e-3)


def test_the_check_would_see_another_zero_or_swapped_arguments(store: Store) -> None:
    """Air on 25 C, water on its vapour, or t and W exchanged, are far outside 0.2 %."""
    right = ashrae_si(celsius=25.0, humidity_ratio=0.010)
    vapour = store.enthalpy("water", phase="g", temperature="25C", datum="gas-0C", unit="kJ/kg").value
    dry = store.enthalpy("dry air", phase="g", temperature="25C", datum=SI, unit="kJ/kg").value
    for wrong in (dry + 0.010 * vapour, 0.010 + 25.0 * (2501.0 + 1.86 * 0.010), 1.006 * 25.0):
        assert abs(wrong / right - 1.0) > 0.05


def test_the_zeros(store: Store) -> None:
    assert store.enthalpy("dry air", phase="g", temperature="0C", datum=SI).value == pytest.approx(0.0, abs=1e-9)
    assert store.enthalpy("water", phase="l", temperature="0C", datum=SI).value == pytest.approx(0.0, abs=1e-9)
    assert store.enthalpy("dry air", phase="g", temperature="0F", datum=INCH_POUND).value == pytest.approx(0, abs=1e-9)
    assert store.enthalpy("water", phase="l", temperature="32F", datum=INCH_POUND).value == pytest.approx(0, abs=1e-9)


def test_from_the_si_chart_to_the_inch_pound_chart(store: Store) -> None:
    """Dry air moves by 32 F of heating, 0.240 BTU/lb/F (ASHRAE); water is on the same liquid in both."""
    air = store.convert("0 BTU/lb", species="dry air", from_=SI, to=INCH_POUND)
    assert air.value == pytest.approx(0.240 * 32.0, rel=2e-3)
    water = store.convert("0 BTU/lb", species="water", from_=SI, to=INCH_POUND)
    assert water.value == pytest.approx(0.0, abs=1e-9)


def test_dry_air_is_a_sourced_pseudo_species(store: Store) -> None:
    sheet = store.show("air")
    assert sheet.species.name == "dry air"
    assert sheet.species.kind == "pseudo"
    # ASHRAE Handbook, Fundamentals: 28.966 g/mol. Composition by McBride, Zehe, Gordon (2002), record Air: 0.78084 N2,
    # 0.20948 O2, 0.00937 Ar with the other noble gases, 0.00032 CO2.
    assert sheet.species.molar_mass * 1e3 == pytest.approx(28.966, abs=0.001)
    atoms = {element: float(count) for element, count in sheet.species.composition}
    assert atoms["N"] / 2 == pytest.approx(0.78084, abs=2e-5)
    assert (atoms["O"] - 2 * atoms["C"]) / 2 == pytest.approx(0.20948, abs=2e-5)
    assert atoms["Ar"] + atoms["C"] == pytest.approx(0.0097, abs=2e-5)
    curves = [e for e in sheet.entries if e.quantity == "Cp" and e.phase == "g"]
    assert [e.source for e in curves] == ["nasa-tp-2002-211556"]
    assert all(e.locator for e in sheet.entries)


def test_air_carries_no_calorific_value(store: Store) -> None:
    """On a combustion datum air is its own products. The -0.126 kJ/mol of McBride et al. (2002) is that of the CO2."""
    answer = store.enthalpy("dry air", phase="g", temperature="25C", datum="combustion-net-25C")
    assert answer.value == pytest.approx(0.0, abs=0.001)


def test_a_chart_of_moist_air_says_nothing_about_methane(store: Store) -> None:
    with pytest.raises(DatumError, match="dry air, water only"):
        store.enthalpy("methane", phase="g", temperature="25C", datum=SI)
