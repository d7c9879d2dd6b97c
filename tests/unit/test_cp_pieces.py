"""Tables with splits, unions with joints, the registry and what it refuses."""

from __future__ import annotations

import json
import math
import subprocess
import sys
from typing import Any

import numpy as np
import pytest
from scipy.integrate import fixed_quad

import propdb.cp
from propdb.cp import (
    EQUATIONS,
    Constant,
    ConstantLatent,
    Equation,
    LatentHeat,
    Nasa7,
    Nasa9,
    NasaInterval,
    Polynomial,
    Shomate,
    ShomateInterval,
    Table,
    Union,
    Watson,
    build,
    build_heat_capacity,
    build_latent_heat,
    h298_error,
    joint_errors,
)
from propdb.errors import EquationError, SplitError, TemperatureError, TemperatureOutOfRange

# Invented: two sides of a transition at 400 K.
SPLIT = Table((300.0, 350.0, 400.0, 400.0, 500.0), (20.0, 21.0, 25.0, 30.0, 31.0))


def test_split_is_listed_and_belongs_to_the_side_below() -> None:
    assert SPLIT.splits == SPLIT.unstated == (400.0,)
    assert SPLIT.cp(400.0) == 25.0
    assert SPLIT.cp(math.nextafter(400.0, 500.0)) == pytest.approx(30.0, rel=1e-12)
    np.testing.assert_allclose(SPLIT.cp(np.array([400.0, math.nextafter(400.0, 500.0)])), [25.0, 30.0], rtol=1e-12)


def test_enthalpy_across_an_unstated_split_is_refused() -> None:
    beyond = math.nextafter(400.0, 500.0)
    for call in (
        lambda: SPLIT.dh(300.0, 500.0),
        lambda: SPLIT.dh(500.0, 300.0),
        lambda: SPLIT.ds(300.0, beyond),
        lambda: SPLIT.dh(400.0, 500.0),
        lambda: SPLIT.dh(300.0, np.array([350.0, 500.0])),
        lambda: SPLIT.dh([300.0, 450.0], [350.0, 350.0]),
        lambda: SPLIT.h(450.0),
        lambda: SPLIT.s(450.0),
        lambda: SPLIT.h(np.array([350.0, 450.0])),
    ):
        with pytest.raises(SplitError, match="split at 400 K") as caught:
            call()
        assert caught.value.fields["T"] == 400.0
    with pytest.raises(TemperatureError):
        SPLIT.h(np.array([350.0, np.nan]))
    with pytest.raises(TemperatureError):
        SPLIT.dh(300.0, math.nan)


def test_one_side_of_a_split_needs_no_transition() -> None:
    below, above = SPLIT.parts()
    assert SPLIT.h(400.0) == pytest.approx(below.dh(300.0, 400.0), rel=1e-14)
    assert SPLIT.dh(420.0, 480.0) == pytest.approx(above.dh(420.0, 480.0), rel=1e-13)
    assert SPLIT.ds(420.0, 480.0) == pytest.approx(above.ds(420.0, 480.0), rel=1e-12)
    np.testing.assert_allclose(
        SPLIT.dh(np.array([310.0, 420.0]), [390.0, 480.0]),
        [below.dh(310.0, 390.0), above.dh(420.0, 480.0)],
        rtol=1e-12,
    )


@pytest.mark.parametrize("dh", [0.0, 1234.5, -10.0])
def test_stated_transition_is_added_once(dh: float) -> None:
    stated = SPLIT.with_transition(400.0, dh)
    below, above = SPLIT.parts()
    assert SPLIT.unstated == (400.0,)  # the first table is as it was
    assert stated.unstated == ()
    assert stated.splits == (400.0,)
    heating = below.dh(300.0, 400.0) + above.dh(400.0, 500.0)
    assert stated.dh(300.0, 500.0) == pytest.approx(heating + dh, rel=1e-14)
    assert stated.dh(500.0, 300.0) == pytest.approx(-heating - dh, rel=1e-14)
    entropy = below.ds(300.0, 400.0) + above.ds(400.0, 500.0) + dh / 400.0
    assert stated.ds(300.0, 500.0) == pytest.approx(entropy, rel=1e-13)
    assert stated.h(400.0) == pytest.approx(below.dh(300.0, 400.0), rel=1e-14)
    assert stated.params()["transitions"] == [{"T": 400.0, "dh": dh}]


def test_table_passes_through_its_values_and_stays_between_neighbours() -> None:
    nodes = (300.0, 310.0, 325.5, 400.0, 700.0, 701.0)
    values = (20.0, 90.0, 22.0, 22.0, 40.0, 10.0)
    table = Table(nodes, values)
    np.testing.assert_allclose(table.cp(nodes), values, rtol=1e-13)
    for a, b, low, high in zip(nodes[:-1], nodes[1:], values[:-1], values[1:], strict=True):
        inside = table.cp(np.linspace(a, b, 101))
        assert np.all(inside >= min(low, high) - 1e-10)
        assert np.all(inside <= max(low, high) + 1e-10)


def test_table_of_nearly_equal_spacing_keeps_its_digits() -> None:
    # Nodes 0.01 K apart at 1000 K: the closed form with its logarithm would lose seven digits.
    nodes = np.concatenate([[900.0], np.arange(1000.0, 1000.1, 0.01), [1100.0]])
    table = Table(tuple(nodes), tuple(50.0 + 40.0 * np.sin(np.arange(nodes.size))))
    close = nodes[1:-1]
    pairs = zip(close[:-1], close[1:], strict=True)
    expected = sum(fixed_quad(lambda t: table.cp(t) / t, a, b, n=12)[0] for a, b in pairs)
    assert table.ds(float(close[0]), float(close[-1])) == pytest.approx(expected, abs=1e-13)


def test_beyond_a_table_the_end_cubics_go_on() -> None:
    table = Table((300.0, 310.0, 400.0), (20.0, 21.0, 25.0))
    for low, high in ((200.0, 300.0), (400.0, 470.0)):
        x, w = np.polynomial.legendre.leggauss(30)
        t = 0.5 * (high + low) + 0.5 * (high - low) * x
        assert table.dh(low, high) == pytest.approx(0.5 * (high - low) * float(w @ table.cp(t)), rel=1e-12)
        assert table.ds(low, high) == pytest.approx(0.5 * (high - low) * float(w @ (table.cp(t) / t)), rel=1e-9)
    assert table.cp(np.array([1e9, 350.0]))[1] == table.cp(350.0)


# Invented pieces.
LOW = Polynomial((0, 1), (20.0, 0.01), 200.0, 500.0)
HIGH = Polynomial((0, -2), (26.0, -1e5), 500.0, 1000.0)
RECORD = Nasa7((NasaInterval(1000.0, 2000.0, (3.0, 1e-3, 0.0, 0.0, 0.0), (-1000.0, 5.0)),))


def test_union_without_own_constants_is_continuous() -> None:
    union = Union((LOW, HIGH))
    (jump,) = union.jumps()
    assert jump.T == 500.0
    assert jump.cp == pytest.approx(HIGH.cp(500.0) - LOW.cp(500.0), rel=1e-13)
    assert abs(jump.h) < 1e-9
    assert abs(jump.s) < 1e-11
    assert union.dh(300.0, 800.0) == pytest.approx(LOW.dh(300.0, 500.0) + HIGH.dh(500.0, 800.0), rel=1e-14)
    assert union.ds(300.0, 800.0) == pytest.approx(LOW.ds(300.0, 500.0) + HIGH.ds(500.0, 800.0), rel=1e-14)
    assert union.cp(500.0) == LOW.cp(500.0)
    assert (union.tmin, union.tmax, union.joints) == (200.0, 1000.0, (500.0,))
    assert not union.absolute


def test_union_shifts_towards_a_record() -> None:
    union = Union((LOW, HIGH, RECORD))
    assert union.absolute
    assert union.h(1500.0) == RECORD.h(1500.0)
    assert union.h(300.0) == pytest.approx(RECORD.h(1000.0) - HIGH.dh(500.0, 1000.0) - LOW.dh(300.0, 500.0), rel=1e-13)
    assert all(abs(jump.h) < 1e-8 and abs(jump.s) < 1e-10 for jump in union.jumps())


def test_records_keep_their_constants_unless_told_otherwise() -> None:
    shifted = Nasa7((NasaInterval(2000.0, 3000.0, (4.0, 0.0, 0.0, 0.0, 0.0), (0.0, 0.0)),))
    kept = Union((RECORD, shifted))
    assert kept.h(2500.0) == shifted.h(2500.0)
    assert kept.jumps()[0].h == pytest.approx(shifted.h(2000.0) - RECORD.h(2000.0), rel=1e-14)
    joined = Union((RECORD, shifted), continuous=True)
    assert abs(joined.jumps()[0].h) < 1e-8
    assert joined.h(1500.0) == RECORD.h(1500.0)
    assert joined.dh(1500.0, 2500.0) == pytest.approx(RECORD.dh(1500.0, 2000.0) + shifted.dh(2000.0, 2500.0), rel=1e-13)
    loose = Union((LOW, HIGH), continuous=False)
    assert loose.h(800.0) == HIGH.h(800.0)
    assert loose.h(300.0) == LOW.h(300.0)


def test_union_within_a_union_and_with_a_table() -> None:
    table = SPLIT.with_transition(400.0, 100.0)
    inner = Union((Constant(19.0, 200.0, 300.0), table))
    outer = Union((inner, Polynomial((1,), (0.06,), 500.0, 900.0)))
    assert outer.joints == (300.0, 500.0)
    expected = 19.0 * 50.0 + table.dh(300.0, 500.0) + 0.03 * (600.0**2 - 500.0**2)
    assert outer.dh(250.0, 600.0) == pytest.approx(expected, rel=1e-13)


def test_union_refuses_what_does_not_touch_and_unstated_splits() -> None:
    with pytest.raises(EquationError, match=r"a gap between 500\.0 and 600\.0 K"):
        Union((LOW, Constant(25.0, 600.0, 700.0)))
    with pytest.raises(EquationError, match=r"an overlap between 400\.0 and 500\.0 K"):
        Union((LOW, Constant(25.0, 400.0, 700.0)))
    with pytest.raises(EquationError, match="at least two"):
        Union((LOW,))
    with pytest.raises(SplitError, match="400 K"):
        Union((SPLIT, Constant(25.0, 500.0, 700.0)))


def test_shomate_constants() -> None:
    plain = Shomate(
        (ShomateInterval(300.0, 600.0, (20, 5, 0, 0, 0.1)), ShomateInterval(600.0, 900.0, (25, 1, 0, 0, 0)))
    )
    assert not plain.absolute
    assert abs(plain.jumps()[0].h) < 1e-9
    one = (20.0, 5.0, 0.0, 0.0, 0.1, -80.0, 200.0, -75.0)
    full = Shomate((ShomateInterval(300.0, 600.0, one),))
    t = 0.5
    assert full.absolute
    assert full.h(500.0) == pytest.approx(1000.0 * (20 * t + 5 * t**2 / 2 - 0.1 / t - 80.0), rel=1e-13)
    assert full.s(500.0) == pytest.approx(20 * math.log(t) + 5 * t - 0.1 / (2 * t**2) + 200.0, rel=1e-13)
    with pytest.raises(EquationError, match="either every interval"):
        Shomate((ShomateInterval(200.0, 300.0, (20.0, 5.0, 0.0, 0.0, 0.1)), *full.intervals))


def test_gas_constant_of_a_record_is_its_own() -> None:
    interval = NasaInterval(200.0, 1000.0, (3.5, 0.0, 0.0, 0.0, 0.0), (0.0, 0.0))
    assert Nasa7((interval,)).cp(300.0) == pytest.approx(3.5 * 8.314510, rel=1e-15)
    other = Nasa7((interval,), gas_constant=8.314462618)
    assert other.cp(300.0) == pytest.approx(3.5 * 8.314462618, rel=1e-15)
    assert build("nasa7", other.params()) == other != Nasa7((interval,))


def test_checksums_need_298_K() -> None:
    with pytest.raises(TemperatureOutOfRange, match="does not reach"):
        h298_error(RECORD, 0.0)
    assert joint_errors(RECORD) == ()


def test_latent_heats() -> None:
    water = Watson(40_650.0, 373.15, 647.1)
    assert isinstance(water, LatentHeat)
    assert not isinstance(LOW, LatentHeat)
    assert water.exponent == 0.38
    assert water.dh(373.15) == 40_650.0
    assert water.dh(647.1) == 0.0
    assert water.ddh_dT(373.15) == pytest.approx(-0.38 * 40_650.0 / (647.1 - 373.15), rel=1e-14)
    for call in (lambda: water.dh(650.0), lambda: water.ddh_dT(647.1), lambda: water.dh([300.0, 650.0])):
        with pytest.raises(TemperatureOutOfRange, match=r"the critical temperature 647\.1 K"):
            call()
    melting = ConstantLatent(6010.0, 273.15)
    assert (melting.dh(273.15), melting.ddh_dT(273.15)) == (6010.0, 0.0)
    assert melting.covers(273.15)
    assert not melting.covers(273.16)
    assert melting.covers([273.15, 300.0]).tolist() == [True, False]
    assert water.covers([300.0, 700.0]).tolist() == [True, False]


def _interval(**changes: Any) -> dict[str, Any]:
    return {"tmin": 200.0, "tmax": 1000.0, "a": [1.0] * 7, "b": [0.0, 0.0]} | changes


POLYNOMIAL = {"exponents": [0, 1], "coefficients": [1.0, 2.0], "tmin": 200.0, "tmax": 300.0}


@pytest.mark.parametrize(
    "name, params, problem",
    [
        ("spline", {}, "no equation is called 'spline'"),
        (None, {}, "no equation is called None"),
        ("polynomial", [1.0], "must be a table of fields"),
        ("polynomial", {"exponents": [0]}, "'coefficients' is missing"),
        ("polynomial", POLYNOMIAL | {"unit": "R"}, "'unit' is not a field"),
        ("polynomial", POLYNOMIAL | {"exponents": [0]}, "1 exponents do not match 2 coefficients"),
        ("polynomial", POLYNOMIAL | {"exponents": [1, 1]}, "different integers"),
        ("polynomial", POLYNOMIAL | {"exponents": [0.5, 1]}, "different integers"),
        ("polynomial", POLYNOMIAL | {"exponents": [0, 99]}, "exponents must lie between"),
        ("polynomial", POLYNOMIAL | {"coefficients": [1.0, math.nan]}, r"coefficients\[1\] must be a finite number"),
        ("polynomial", POLYNOMIAL | {"coefficients": "12"}, "must be a list of numbers"),
        ("polynomial", POLYNOMIAL | {"coefficients": [1.0, "2"]}, r"coefficients\[1\] must be a number"),
        ("polynomial", POLYNOMIAL | {"tmin": 300.0}, "is not one"),
        ("polynomial", POLYNOMIAL | {"tmax": math.inf}, "tmax must be a finite number"),
        ("constant", {"value": True, "tmin": 1.0, "tmax": 2.0}, "value must be a number"),
        ("nasa9", {"intervals": []}, "at least one entry"),
        ("nasa9", {"intervals": [_interval(a=[1.0] * 6)]}, "a must have 7 numbers, not 6"),
        ("nasa9", {"intervals": [_interval(b=[1.0])]}, "b must have 2 numbers, not 1"),
        ("nasa9", {"intervals": [_interval(), _interval()]}, "an overlap between"),
        ("nasa9", {"intervals": [_interval(), _interval(tmin=1100.0, tmax=2000.0)]}, "a gap between"),
        ("nasa7", {"intervals": [_interval()]}, "a must have 5 numbers, not 7"),
        ("shomate", {"intervals": [{"tmin": 1.0, "tmax": 2.0, "coefficients": [1.0] * 6}]}, "A to E or A to H"),
        ("shomate", {"intervals": [3]}, r"intervals\[0\] must be a table of fields"),
        ("table", {"T": [300.0], "cp": [20.0]}, "at least two temperatures"),
        ("table", {"T": [0.0, 300.0], "cp": [0.0, 20.0]}, "all above 0 K"),
        ("table", {"T": [300.0, 200.0], "cp": [20.0, 20.0]}, "must go up"),
        ("table", {"T": [300.0, 400.0], "cp": [20.0]}, "do not match"),
        ("table", {"T": [300.0, 400.0, 400.0], "cp": [1.0, 2.0, 3.0]}, "fewer than two temperatures"),
        ("table", {"T": [1.0, 2.0], "cp": [1.0, 2.0], "transitions": [{"T": 2.0, "dh": 0.0}]}, "no split at 2.0 K"),
        ("union", {"pieces": [{"tmin": 1.0}, {}]}, "'equation' is missing from a piece"),
        ("union", {"pieces": [{"equation": "watson", "dh": 1.0, "T1": 1.0, "Tc": 2.0}] * 2}, "is a latent heat"),
        ("watson", {"dh": 1.0, "T1": 700.0, "Tc": 600.0}, "must lie between 0 K and Tc"),
        ("watson", {"dh": 1.0, "T1": 300.0, "Tc": 600.0, "exponent": 0.0}, "exponent must be positive"),
        ("constant-latent", {"dh": 1.0, "T": 0.0}, "T must be above 0 K"),
    ],
)
def test_what_makes_no_equation_is_refused(name: Any, params: Any, problem: str) -> None:
    with pytest.raises(EquationError, match=problem) as caught:
        build(name, params)
    assert "\n" not in str(caught.value)


def test_a_split_is_stated_once_and_where_it_is() -> None:
    with pytest.raises(EquationError, match="two enthalpies"):
        SPLIT.with_transition(400.0, 1.0).with_transition(400.0, 1.0)
    with pytest.raises(EquationError, match=r"no split at 401\.0 K"):
        SPLIT.with_transition(401.0, 1.0)


def test_builders_hold_to_the_quantity() -> None:
    assert isinstance(build_heat_capacity("polynomial", POLYNOMIAL), Equation)
    assert isinstance(build_latent_heat("constant-latent", {"dh": 1.0, "T": 300.0}), LatentHeat)
    with pytest.raises(EquationError, match="is a heat capacity"):
        build_latent_heat("polynomial", POLYNOMIAL)


def test_a_value_at_one_temperature_is_a_constant() -> None:
    constant = build_heat_capacity("constant", {"value": 75.3, "tmin": 298.15, "tmax": 298.15})
    assert constant.covers(298.15)
    assert constant.dh(298.15, 300.15) == pytest.approx(150.6, rel=1e-12)


def test_equations_are_frozen_values() -> None:
    with pytest.raises(AttributeError):
        LOW.tmin = 100.0  # type: ignore[misc]
    assert Polynomial([0, 1], [20, 0.01], 200, 500) == LOW  # type: ignore[arg-type]
    assert len({LOW, Polynomial((0, 1), (20.0, 0.01), 200.0, 500.0)}) == 1
    assert LOW != HIGH
    assert repr(LOW) == "Polynomial(exponents=(0, 1), coefficients=(20.0, 0.01), tmin=200.0, tmax=500.0)"
    assert isinstance(Nasa9((NasaInterval(**_interval()),)), Equation)


def test_extreme_temperatures_are_refused_in_both_paths() -> None:
    steep = Polynomial((-6, 6), (1.0, 1.0), 200.0, 300.0)
    for t in (1e-200, 1e200):
        with pytest.raises(TemperatureError):
            steep.cp(t)
        with pytest.raises(TemperatureError):
            steep.cp([t])


def test_exports() -> None:
    assert propdb.cp.__all__ == sorted(propdb.cp.__all__, key=lambda name: (not name.isupper(), name))
    assert all(hasattr(propdb.cp, name) for name in propdb.cp.__all__)
    assert all(spec.form for spec in EQUATIONS.values())


def test_import_leaves_scipy_alone() -> None:
    program = "import sys, json, propdb.cp; print(json.dumps([m for m in sys.modules if m.startswith('scipy')]))"
    found = subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True)
    assert json.loads(found.stdout) == []
