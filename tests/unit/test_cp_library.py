"""Every row that the chemicals library carries, through its own functions and through ours; and what is refused."""

from __future__ import annotations

import csv
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import chemicals
import numpy as np
import pytest
from chemicals.heat_capacity import (
    TRCCp,
    TRCCp_integral,
    TRCCp_integral_over_T,
    Zabransky_cubic,
    Zabransky_cubic_integral,
    Zabransky_cubic_integral_over_T,
    Zabransky_quasi_polynomial,
    Zabransky_quasi_polynomial_integral,
)
from scipy.integrate import quad

from propdb.cli.equationtext import equation_lines
from propdb.cp import Equation, TrcGas, Union, build
from propdb.errors import EquationError, TemperatureError, TemperatureOutOfRange

FILES = Path(chemicals.__file__).parent
Params = dict[str, Any]


def _rows(name: str) -> Iterator[dict[str, str]]:
    (file,) = FILES.glob(name)
    with file.open(encoding="utf-8", errors="replace", newline="") as lines:
        yield from csv.DictReader(lines, delimiter="\t")


def _numbers(row: dict[str, str], names: list[str]) -> list[float]:
    return [float(row[name] or 0.0) for name in names]


def test_every_row_of_the_trc_gas_table() -> None:
    count = 0
    for row in _rows("Heat Capacity/TRC *.tsv"):
        a, (i, j) = _numbers(row, [f"a{n}" for n in range(8)]), _numbers(row, ["I", "J"])
        low, high = _numbers(row, ["Tmin", "Tmax"])
        equation = build("trc-gas", {"a": a, "tmin": low, "tmax": high, "I": i, "J": j})
        assert isinstance(equation, TrcGas)
        count += 1
        if not a[6]:  # the library divides by a6
            assert equation.cp(300.0) == pytest.approx(2.5 * 8.31446261815324, rel=1e-14)
            assert equation.increment == pytest.approx(2.5 * 8.31446261815324 * 298.15, rel=1e-14)
            continue
        for t in np.linspace(low, high, 6).tolist():
            assert equation.cp(t) == pytest.approx(TRCCp(t, *a), rel=1e-12)
            assert equation.h(t) == pytest.approx(TRCCp_integral(t, *a, i), rel=1e-11, abs=1e-11 * 40.0 * t)
            if 0.0 < a[7] < 1.5 * a[6]:  # beyond, the library's form loses up to (a7/a6)^8
                assert equation.s(t) == pytest.approx(TRCCp_integral_over_T(t, *a, j), rel=1e-10)
    assert count > 1900


def test_where_the_closed_form_of_the_entropy_loses_its_digits() -> None:
    # a7/a6 = 37: the library's function is 1e-5 off here, this one is not.
    a = [4.0, 668000.0, 379.0, 21.168, 13.33, 1160000.0, 7.0, 192.0]
    equation = build("trc-gas", {"a": a, "tmin": 200.0, "tmax": 1000.0})
    assert isinstance(equation, Equation)
    for low, high in [(150.0, 192.0), (192.0, 300.0), (300.0, 1000.0)]:
        expected = quad(lambda t: TRCCp(t, *a) / t, low, high, epsabs=0.0, epsrel=1e-12)[0]
        assert equation.ds(low, high) == pytest.approx(expected, rel=1e-11)


def test_every_row_of_zabransky() -> None:
    cubics = quasis = 0
    for row in _rows("Heat Capacity/Zabransky.tsv"):
        low, high = _numbers(row, ["Tmin", "Tmax"])
        if low >= high:
            continue
        cubic = _numbers(row, [f"A{n}-spline" for n in range(1, 5)])
        quasi = _numbers(row, [f"A{n}-quasi" for n in range(1, 7)])
        if any(cubic):
            cubics += 1
            equation = build("zabransky-cubic", {"a": cubic, "tmin": low, "tmax": high})
            pairs = [(Zabransky_cubic, Zabransky_cubic_integral, Zabransky_cubic_integral_over_T, cubic)]
        else:
            quasis += 1
            equation = build("zabransky-quasi", {"a": quasi, "tmin": low, "tmax": high, "Tc": float(row["Tc"])})
            args = [float(row["Tc"]), *quasi]
            pairs = [(Zabransky_quasi_polynomial, Zabransky_quasi_polynomial_integral, None, args)]
        assert isinstance(equation, Equation)
        ((cp, h, s, args),) = pairs
        terms = [abs(c) * (high / 100.0) ** n for n, c in enumerate(cubic)] + [10.0 * abs(c) for c in quasi]
        size = 8.3 * max(terms) + 300.0  # they may cancel
        for t in np.linspace(low, 0.999 * high, 4).tolist():
            assert equation.cp(t) == pytest.approx(cp(t, *args), rel=1e-12, abs=1e-13 * size)
            dh = equation.dh(low, t)
            assert dh == pytest.approx(h(t, *args) - h(low, *args), rel=1e-11, abs=1e-13 * size * high)
            if s is not None:
                assert equation.ds(low, t) == pytest.approx(s(t, *args) - s(low, *args), rel=1e-11, abs=1e-12 * size)
    assert cubics > 900
    assert quasis > 180


REFUSED: list[tuple[str, Params, str]] = [
    ("trc-gas", {"a": [4.0] * 7, "tmin": 50, "tmax": 60}, "a must have 8 numbers, not 7"),
    ("trc-gas", {"a": [4.0, 0, 0, 1, 0, 0, 0, 0], "tmin": 50, "tmax": 60}, "a6 and a7 are both 0"),
    ("trc-gas", {"a": [4.0, 0, 0, 1, 0, 0, -1, 9], "tmin": 50, "tmax": 60}, "a6 = -1.0 and a7 = 9.0 must not be neg"),
    ("trc-gas", {"a": [4.0] * 8, "tmin": 50, "tmax": 60, "I": "x"}, "I must be a number"),
    ("aly-lee", {"coefficients": [1, 2, 0, 0, 0], "tmin": 50, "tmax": 60}, "C must not be 0"),
    ("aly-lee", {"coefficients": [1, 0, 0, 2, 0], "tmin": 50, "tmax": 60}, "E must not be 0"),
    ("zabransky-cubic", {"a": [], "tmin": 50, "tmax": 60}, "one to four numbers, not 0"),
    ("zabransky-quasi", {"a": [1] * 6, "Tc": 300, "tmin": 50, "tmax": 301}, "tmax = 301.0 K must not exceed"),
    ("perry-liquid", {"coefficients": [1] * 4, "Tc": 300, "tmin": 50, "tmax": 301}, "tmax = 301.0 K must not exceed"),
    ("perry-vaporisation", {"coefficients": [1, 0, 0, 0], "Tc": 300}, "must be positive, not 0.0"),
    ("perry-vaporisation", {"coefficients": [1, 0.4, 0, 0], "Tc": 300, "tmax": 301}, "must not exceed the critical"),
    ("vdi-vaporisation", {"coefficients": [1] * 5, "Tc": 0}, "Tc must be above 0 K"),
    ("vdi-vaporisation", {"coefficients": [1] * 5, "Tc": 300, "tmin": 301}, "is not one"),
]


@pytest.mark.parametrize("name, params, says", REFUSED, ids=[f"{name}: {says}" for name, _, says in REFUSED])
def test_what_makes_no_equation_is_refused(name: str, params: Params, says: str) -> None:
    with pytest.raises(EquationError) as caught:
        build(name, params)
    assert says in str(caught.value)
    assert caught.value.where == name


def test_nothing_beyond_the_critical_temperature() -> None:
    liquid = build("zabransky-quasi", {"a": [-3.0, 0.1, 13.7, 1.3, 6.4, 4.1], "Tc": 591.79, "tmin": 162, "tmax": 570})
    vaporisation = build("perry-vaporisation", {"coefficients": [49507, 0.37742, 0, 0], "Tc": 591.75})
    for method in (liquid.cp, liquid.h, liquid.s):  # type: ignore[union-attr]
        for T in (600.0, [300.0, 600.0]):
            with pytest.raises(TemperatureOutOfRange, match="600 K is at or above the critical temperature"):
                method(T)
    assert vaporisation.dh(591.75) == 0.0  # type: ignore[arg-type, call-arg]
    for T in (600.0, [300.0, 600.0]):
        with pytest.raises(TemperatureOutOfRange, match="600 K is above the critical temperature"):
            vaporisation.dh(T)  # type: ignore[arg-type, call-arg]
    with pytest.raises(TemperatureOutOfRange, match="at or above"):
        vaporisation.ddh_dT(591.75)  # type: ignore[union-attr]


def test_far_from_any_range() -> None:
    gas = build("trc-gas", {"a": [4.0, 8e5, 720.0, 3.5, -0.1, -1e6, 52.0, 201.0], "tmin": 50, "tmax": 3000, "I": 1.0})
    steam = build("aly-lee", {"coefficients": [33.363, 26.79, 2610.5, 8.896, 1169.0], "tmin": 100, "tmax": 2273})
    for equation in (gas, steam):
        assert isinstance(equation, Equation)
        for t in (1e-3, 1.0, 1e5):  # neither overflow nor a warning
            assert equation.cp(t) == pytest.approx(equation.cp([t])[0], rel=1e-15)
        with pytest.raises(TemperatureError, match="too extreme"):
            equation.cp(1e-306)
        with pytest.raises(TemperatureError, match="too extreme"):
            equation.cp([1e-306])


def test_pieces_of_a_union_meet() -> None:
    first = build("zabransky-cubic", {"a": [21.6638, -7.51813, 2.97181, -0.255049], "tmin": 162, "tmax": 350})
    second = build("zabransky-cubic", {"a": [2.78361, 8.6649, -1.65192, 0.185306], "tmin": 350, "tmax": 500})
    third = build("zabransky-quasi", {"a": [-3.1, 0.1, 13.7, 1.3, 6.4, 4.1], "Tc": 591.79, "tmin": 500, "tmax": 570})
    union = Union((first, second, third))  # type: ignore[arg-type]
    assert [abs(jump.h) < 1e-9 and abs(jump.s) < 1e-9 for jump in union.jumps()] == [True, True]
    total = first.dh(300.0, 350.0) + second.dh(350.0, 500.0) + third.dh(500.0, 550.0)  # type: ignore[union-attr, call-arg]
    assert union.dh(300.0, 550.0) == pytest.approx(total, rel=1e-13)


def test_printed_with_everything_needed_to_compute_by_hand() -> None:
    lines = equation_lines("trc-gas", {"a": [4, 1, 2, 3, 4, 5, 6, 7], "tmin": 50, "tmax": 3000, "I": 1.2, "J": 7.6})
    assert lines[0].endswith("0 below a7   [1], I = 1.2 K, J = 7.6")
    assert lines[1] == "  a0 = 4, a1 = 1, a2 = 2, a3 = 3, a4 = 4, a5 = 5, a6 = 6, a7 = 7"
    lines = equation_lines("perry-liquid", {"coefficients": [1, 2, 3, 4], "Tc": 540.2, "scale": 0.001})
    assert lines[0].endswith("[J/mol/K], Tc = 540.2 K, scale = 0.001")
    assert lines[1] == "  A = 1, B = 2, C = 3, D = 4"
