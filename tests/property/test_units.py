"""Units against pint, for every unit and every combination, and against any text at all."""

from __future__ import annotations

import itertools
import math
import re

import pint
import pytest
from hypothesis import assume, example, given, settings
from hypothesis import strategies as st

from propdb.errors import PropdbError, UnitError
from propdb.units import (
    DIMENSIONS,
    format_number,
    format_temperature,
    parse_heat_capacity_unit,
    parse_pressure,
    parse_quantity,
    parse_temperature,
    parse_unit,
    read_si,
)
from propdb.units.table import AMOUNTS, DEGREES, ENERGIES, KINDS, MASSES, NORMAL_VOLUMES, PRESSURES, SCALES, resolve

UREG = pint.UnitRegistry()
Q = UREG.Quantity

PINT_ENERGY = {
    "J": "joule",
    "kJ": "kilojoule",
    "MJ": "megajoule",
    "GJ": "gigajoule",
    "cal_th": "cal_th",
    "kcal_th": "kilocal_th",
    "cal_IT": "cal_it",
    "kcal_IT": "kilocal_it",
    "BTU": "Btu_it",
    "kWh": "kilowatt_hour",
}
PINT_MASS = {"g": "gram", "kg": "kilogram", "t": "metric_ton", "lb": "pound"}
PINT_DEGREE = {"K": "kelvin", "C": "delta_degC", "F": "delta_degF", "R": "degR"}
PINT_SCALE = {"K": "kelvin", "C": "degC", "F": "degF", "R": "degR"}
PINT_PRESSURE = {
    "Pa": "pascal",
    "hPa": "hectopascal",
    "kPa": "kilopascal",
    "MPa": "megapascal",
    "GPa": "gigapascal",
    "mbar": "millibar",
    "bar": "bar",
    "atm": "atm",
    "at": "technical_atmosphere",
    "psi": "psi",
    "torr": "torr",
    "mmHg": "mmHg",
    "inHg": "inHg",
}
#: One pound-mole: as many moles as there are grams in a pound.
LBMOL = Q(Q(1, "pound").to("gram").magnitude, "mole")
PINT_AMOUNT = {"mol": Q(1, "mole"), "kmol": Q(1, "kilomole"), "lbmol": LBMOL}
#: Moles in a normal volume, from the molar volume that the convention states.
PINT_NORMAL = {
    "Nm3": Q(1, "m**3") / Q(22.41397, "L/mol"),
    "Sm3": Q(1, "m**3") / Q(23.64483, "L/mol"),
    "scf": Q(1, "ft**3") / (Q(379.484, "ft**3") / LBMOL),
}
PINT_BASIS = {**PINT_AMOUNT, **{unit: Q(1, name) for unit, name in PINT_MASS.items()}, **PINT_NORMAL}

CUBIC_FOOT = Q(1, "ft**3").to("L").magnitude  # [L]

UNITS = [f"{energy}/{basis}" for energy, basis in itertools.product(ENERGIES, (*AMOUNTS, *MASSES, *NORMAL_VOLUMES))]
MOLAR_MASS = Q(0.0440095, "kg/mol")  # no power of ten, so that a forgotten factor shows

values = st.floats(-1e9, 1e9)
molar_masses = st.floats(1e-3, 1.0)


def moles(basis: str) -> pint.Quantity[float]:
    """Moles in one of the basis, by pint."""
    of = PINT_BASIS[basis]
    return of / MOLAR_MASS if of.check("[mass]") else of


def test_the_oracle_covers_the_whole_table() -> None:
    assert set(PINT_ENERGY) == set(ENERGIES)
    assert set(PINT_BASIS) == {*AMOUNTS, *MASSES, *NORMAL_VOLUMES}
    assert set(PINT_PRESSURE) == set(PRESSURES)
    assert set(PINT_DEGREE) == set(DEGREES) == set(PINT_SCALE) == set(SCALES)


@pytest.mark.parametrize("energy, basis", [tuple(unit.split("/")) for unit in UNITS])
def test_enthalpies_against_pint(energy: str, basis: str) -> None:
    unit = parse_unit(f"{energy}/{basis}")
    expected = (Q(7.25, PINT_ENERGY[energy]) / moles(basis)).to("J/mol").magnitude
    assert unit.to_si(7.25, molar_mass=MOLAR_MASS.magnitude) == pytest.approx(expected, rel=1e-12)
    assert unit.from_si(expected, molar_mass=MOLAR_MASS.magnitude) == pytest.approx(7.25, rel=1e-12)


@pytest.mark.parametrize("degree", DEGREES)
@pytest.mark.parametrize("energy, basis", [tuple(unit.split("/")) for unit in UNITS])
def test_heat_capacities_against_pint(energy: str, basis: str, degree: str) -> None:
    unit = parse_heat_capacity_unit(f"{energy}/{basis}/{degree}")
    expected = (Q(7.25, PINT_ENERGY[energy]) / moles(basis) / Q(1, PINT_DEGREE[degree])).to("J/mol/K").magnitude
    assert unit.to_si(7.25, molar_mass=MOLAR_MASS.magnitude) == pytest.approx(expected, rel=1e-12)


def test_the_gas_constant_against_pint() -> None:
    expected = Q(1, "molar_gas_constant").to("J/mol/K").magnitude
    assert parse_heat_capacity_unit("R").to_si(1.0) == pytest.approx(expected, rel=1e-14)


@pytest.mark.parametrize(
    "volume, litres_per_mole, half_a_digit, temperature, pressure",
    [
        ("Nm3", 22.41397, 5e-6, Q(0, "degC"), Q(101.325, "kPa")),
        ("Sm3", 23.64483, 5e-6, Q(15, "degC"), Q(101.325, "kPa")),
        ("scf", 379.484 * CUBIC_FOOT / 453.59237, 5e-4 * CUBIC_FOOT / 453.59237, Q(60, "degF"), Q(1, "atm")),
    ],
)
def test_molar_volumes_are_those_of_an_ideal_gas(
    volume: str,
    litres_per_mole: float,
    half_a_digit: float,
    temperature: pint.Quantity[float],
    pressure: pint.Quantity[float],
) -> None:
    """RT/p gives the stated molar volume to its last digit, and the table holds that volume."""
    ideal = (Q(1, "molar_gas_constant") * temperature.to("kelvin") / pressure).to("L/mol").magnitude
    assert litres_per_mole == pytest.approx(ideal, rel=0, abs=half_a_digit)
    size = CUBIC_FOOT if volume == "scf" else 1e3
    assert NORMAL_VOLUMES[volume] * litres_per_mole == pytest.approx(size, rel=1e-12)


@given(value=values, scale=st.sampled_from(sorted(SCALES)))
def test_temperatures_against_pint(value: float, scale: str) -> None:
    expected = Q(value, PINT_SCALE[scale]).to("kelvin").magnitude
    assume(expected > 1e-6)
    assert parse_temperature(f"{value!r}{scale}") == pytest.approx(expected, rel=1e-12, abs=1e-9)


@given(value=st.floats(1e-6, 1e9), unit=st.sampled_from(sorted(PRESSURES)))
def test_pressures_against_pint(value: float, unit: str) -> None:
    expected = Q(value, PINT_PRESSURE[unit]).to("pascal").magnitude
    assert parse_pressure(f"{value!r}{unit}") == pytest.approx(expected, rel=1e-12)
    assert parse_pressure(f"{value!r} {unit}(a)") == parse_pressure(f"{value!r}{unit}")


@given(gauge=st.floats(0, 1e6), atmosphere=st.floats(0.5, 1.5), unit=st.sampled_from(sorted(PRESSURES)))
def test_gauge_is_the_sum_of_its_parts(gauge: float, atmosphere: float, unit: str) -> None:
    expected = Q(gauge, PINT_PRESSURE[unit]).to("pascal").magnitude + Q(atmosphere, "bar").to("pascal").magnitude
    assert parse_pressure(f"{gauge!r}{unit}g+{atmosphere!r}bar") == pytest.approx(expected, rel=1e-12)


@given(value=values, text=st.sampled_from(UNITS), molar_mass=molar_masses)
def test_there_and_back(value: float, text: str, molar_mass: float) -> None:
    unit = parse_unit(text)
    back = unit.from_si(unit.to_si(value, molar_mass=molar_mass), molar_mass=molar_mass)
    assert back == pytest.approx(value, rel=1e-13, abs=1e-300)


@given(value=values, text=st.sampled_from(UNITS))
def test_a_quantity_written_is_read(value: float, text: str) -> None:
    carried, read, unit = parse_quantity(f"{value!r} {text}")
    assert (carried, read, unit) == (repr(value), value, parse_unit(text))


@given(data=st.data(), text=st.sampled_from(UNITS))
def test_letter_case_never_makes_another_unit(data: st.DataObject, text: str) -> None:
    """In any letter case a unit is itself or refused, never a different one."""
    mixed = "".join(data.draw(st.sampled_from((c.lower(), c.upper()))) for c in text)
    try:
        assert parse_unit(mixed) == parse_unit(text)
    except UnitError:
        assert set(re.split("/", mixed.lower())) & {"mj", "nm3"}


def test_where_case_decides_no_other_case_is_taken() -> None:
    """mPa and MPa are both units, so mpa is neither."""
    folded: dict[str, set[str]] = {}
    for symbol in KINDS:
        folded.setdefault(symbol.lower(), set()).add(symbol)
    pairs = {low: group for low, group in folded.items() if len(group) > 1}
    assert {"mpa", "mj", "mbar"} <= set(pairs)
    for low, group in pairs.items():
        assert all(resolve(symbol) == symbol for symbol in group)
        assert low in group or resolve(low) is None


@given(kelvin=st.floats(0.02, 1e5), scale=st.sampled_from(sorted(SCALES)))
def test_a_temperature_written_is_read(kelvin: float, scale: str) -> None:
    text = format_temperature(kelvin, unit=scale, decimals=4)
    assert parse_temperature(text) == pytest.approx(kelvin, abs=6e-5, rel=1e-12)


@given(value=st.floats(allow_nan=False, allow_infinity=False), decimals=st.integers(0, 9))
def test_written_to_decimals(value: float, decimals: int) -> None:
    text = format_number(value, decimals=decimals)
    assert not re.fullmatch(r"-0*\.?0*", text)
    assert float(text) == pytest.approx(value, rel=1e-5, abs=0.51 * 10**-decimals)


@given(value=values, uncertainty=st.floats(1e-6, 1e6))
@example(value=-0.004, uncertainty=0.1)
@example(value=9.996, uncertainty=0.0996)
def test_written_with_uncertainty(value: float, uncertainty: float) -> None:
    """Rounding moves the value by at most a tenth of the uncertainty, and the uncertainty by at most 5 %."""
    written, shown = format_number(value, uncertainty=uncertainty).split(" ± ")
    assert float(shown) == pytest.approx(uncertainty, rel=0.051)
    assert abs(float(written) - value) <= 0.051 * uncertainty + 1e-14 * abs(value)
    assert not written.startswith("-0") or float(written) != 0


PIECES = st.sampled_from(
    [*KINDS, *" /-+.,()^*·°−⁻¹³0123456789", "nan", "inf", "e9", "e-999", "g", "(g)", "a", "deg ", "cal", "kcal", "-1"]
)
anything = st.one_of(st.text(), st.lists(PIECES, max_size=9).map("".join))
numbers_and = st.tuples(st.floats().map(repr) | st.integers().map(str), anything).map("".join)


@settings(max_examples=500)
@given(text=anything | numbers_and)
@example(text="0e99999999999999999999K")
@example(text="1e-99999999999999999999bar")
@example(text="9" * 5000 + "K")
@example(text="0." + "1" * 5000 + " bar")
@example(text="١K")
@example(text="5²K")
def test_no_text_escapes_the_tree_of_errors(text: str) -> None:
    for read in (parse_temperature, parse_pressure):
        try:
            value = read(text)
        except PropdbError as error:
            one_clear_line(error)
        else:
            assert math.isfinite(value)
            assert value > 0
    for call in (parse_unit, parse_heat_capacity_unit, parse_quantity):
        try:
            call(text)
        except PropdbError as error:
            one_clear_line(error)


@settings(max_examples=300)
@given(
    number=anything | st.floats().map(repr), unit=anything, dimension=st.sampled_from(DIMENSIONS), delta=st.booleans()
)
def test_no_row_of_data_escapes_the_tree_of_errors(number: str, unit: str, dimension: str, delta: bool) -> None:
    try:
        value = read_si(number, unit, dimension=dimension, molar_mass=0.018, difference=delta)  # type: ignore[arg-type]
    except PropdbError as error:
        one_clear_line(error)
    else:
        assert math.isfinite(value)


def one_clear_line(error: PropdbError) -> None:
    message = str(error)
    assert message.isprintable(), message
    assert error.problem


@pytest.mark.parametrize(
    "slip", ["kJ/kmole", "joule/mol", "KJ/moles", "mj/kg", "kJ/nm3", "kJ/lbs", "BTUs/lb", "kJ/kgs"]
)
def test_what_is_offered_is_taken(slip: str) -> None:
    with pytest.raises(UnitError) as caught:
        parse_unit(slip)
    offered = re.search(r"did you mean '(.+?)'\?", str(caught.value))
    assert offered is not None
    parse_unit(offered.group(1))
