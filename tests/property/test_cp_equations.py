"""What must hold for every registered equation, whatever its coefficients.

Each line of the registry needs a strategy here; an equation without one fails `test_every_equation_is_tested`.
"""

from __future__ import annotations

import json
import pickle
from concurrent.futures import ThreadPoolExecutor
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import fixed_quad

from propdb.cp import EQUATIONS, Equation, LatentHeat, TrcGas, build
from propdb.cp._blocks import BLOCK
from propdb.cp.registry import HEAT_CAPACITY, LATENT_HEAT
from propdb.errors import TemperatureError

Params = dict[str, Any]

# Coefficients are drawn for T/500, so that every power contributes; the sizes are those of real molecules.
_SCALE = 500.0


def _number(low: float, high: float) -> st.SearchStrategy[float]:
    return st.floats(low, high, allow_nan=False, allow_infinity=False).map(lambda x: round(x, 6))


def _coefficients(exponents: list[int]) -> st.SearchStrategy[list[float]]:
    return st.lists(_number(-20.0, 40.0), min_size=len(exponents), max_size=len(exponents)).map(
        lambda cs: [c / _SCALE**n for c, n in zip(cs, exponents, strict=True)]
    )


@st.composite
def _ranges(draw: st.DrawFn, count: int) -> list[tuple[float, float]]:
    ends = [draw(_number(50.0, 300.0))]
    for _ in range(count):
        ends.append(ends[-1] + draw(_number(20.0, 2000.0)))
    return list(zip(ends[:-1], ends[1:], strict=True))


@st.composite
def _constant(draw: st.DrawFn) -> Params:
    ((low, high),) = draw(_ranges(1))
    return {"value": draw(_number(5.0, 300.0)), "tmin": low, "tmax": high}


@st.composite
def _polynomial(draw: st.DrawFn) -> Params:
    exponents = draw(st.lists(st.integers(-4, 6), min_size=1, max_size=6, unique=True))
    ((low, high),) = draw(_ranges(1))
    return {"exponents": exponents, "coefficients": draw(_coefficients(exponents)), "tmin": low, "tmax": high}


def _nasa(exponents: list[int]) -> st.SearchStrategy[Params]:
    @st.composite
    def record(draw: st.DrawFn) -> Params:
        ranges = draw(_ranges(draw(st.integers(1, 3))))
        constants = st.tuples(_number(-5e4, 5e4), _number(-30.0, 30.0))
        return {
            "intervals": [
                {"tmin": low, "tmax": high, "a": draw(_coefficients(exponents)), "b": list(draw(constants))}
                for low, high in ranges
            ]
        }

    return record()


@st.composite
def _shomate(draw: st.DrawFn) -> Params:
    ranges = draw(_ranges(draw(st.integers(1, 3))))
    count = draw(st.sampled_from([5, 8]))
    coefficients = st.lists(_number(-40.0, 60.0), min_size=count, max_size=count)
    return {"intervals": [{"tmin": a, "tmax": b, "coefficients": draw(coefficients)} for a, b in ranges]}


@st.composite
def _table(draw: st.DrawFn) -> Params:
    nodes, transitions = [draw(_number(5.0, 400.0))], []
    for _ in range(draw(st.integers(1, 4))):
        for _ in range(draw(st.integers(1, 6))):
            nodes.append(round(nodes[-1] + draw(st.one_of(_number(0.05, 2.0), _number(5.0, 300.0))), 6))
        transitions.append({"T": nodes[-1], "dh": draw(st.one_of(st.just(0.0), _number(-500.0, 20_000.0)))})
        nodes.append(nodes[-1])
    nodes.pop()
    transitions.pop()
    cp = draw(st.lists(_number(0.5, 200.0), min_size=len(nodes), max_size=len(nodes)))
    return {"T": nodes, "cp": cp, "transitions": transitions}


@st.composite
def _union(draw: st.DrawFn) -> Params:
    pieces: list[Params] = []
    for low, high in draw(_ranges(draw(st.integers(2, 4)))):
        kind = draw(st.sampled_from(["constant", "polynomial", "nasa9", "table"]))
        piece: Params = {"equation": kind, "tmin": low, "tmax": high}
        if kind == "constant":
            piece |= {"value": draw(_number(5.0, 300.0))}
        elif kind == "polynomial":
            piece |= {"exponents": [0, 1, -2], "coefficients": draw(_coefficients([0, 1, -2]))}
        elif kind == "nasa9":
            piece = {"equation": kind, "intervals": [{"tmin": low, "tmax": high, "b": [100.0, 3.0]}]}
            piece["intervals"][0]["a"] = draw(_coefficients([-2, -1, 0, 1, 2, 3, 4]))
        else:
            middle = 0.5 * (low + high)
            cp = draw(st.lists(_number(0.5, 200.0), min_size=3, max_size=3))
            piece = {"equation": kind, "T": [low, middle, high], "cp": cp}
        pieces.append(piece)
    return {"pieces": pieces, "continuous": draw(st.sampled_from([True, False, None]))}


@st.composite
def _watson(draw: st.DrawFn) -> Params:
    tc = draw(_number(50.0, 900.0))
    t1 = tc * draw(_number(0.3, 0.9))
    return {"dh": draw(_number(500.0, 60_000.0)), "T1": t1, "Tc": tc, "exponent": draw(_number(0.1, 1.5))}


@st.composite
def _aly_lee(draw: st.DrawFn) -> Params:
    ((low, high),) = draw(_ranges(1))
    sizes, temperatures = _number(-20.0, 100.0), st.one_of(_number(20.0, 4000.0), _number(-4000.0, -20.0))
    kept = draw(st.sampled_from([(1, 1), (1, 0), (0, 1), (0, 0)]))
    b, d = (draw(sizes) * keep for keep in kept)
    c, e = (draw(temperatures) if keep else draw(st.sampled_from([0.0, 500.0])) for keep in kept)
    return {"coefficients": [draw(_number(10.0, 80.0)), b, c, d, e], "tmin": low, "tmax": high}


@st.composite
def _trc(draw: st.DrawFn) -> Params:
    ((low, high),) = draw(_ranges(1))
    a = [draw(_number(2.0, 5.0)), draw(_number(-1e6, 5e6)), draw(st.one_of(st.just(0.0), _number(20.0, 900.0)))]
    a += [draw(_number(-20.0, 150.0)), draw(_number(-60.0, 60.0)), draw(_number(-5e7, 5e7))]
    a += draw(
        st.one_of(
            st.tuples(_number(5.0, 600.0), _number(5.0, 600.0)),  # a7/a6 on both sides of the switch to the series
            st.tuples(_number(5.0, 600.0), st.just(0.0)),
            st.tuples(st.just(0.0), _number(5.0, 600.0)),
        )
    )
    if draw(st.integers(0, 9)) == 0:
        a[1:] = [0.0] * 7  # a monatomic gas
    params = {"a": a, "tmin": low, "tmax": high}
    if draw(st.booleans()):
        params |= {"I": draw(_number(-300.0, 300.0)), "J": draw(_number(-20.0, 30.0))}
    return params


@st.composite
def _liquid(draw: st.DrawFn, *, reduced: bool) -> Params:
    tc = draw(_number(100.0, 900.0))
    tmax = tc * draw(_number(0.5, 0.9))  # the tests go a tenth beyond, and the equation ends at Tc
    params: Params = {"Tc": tc, "tmin": tmax * draw(_number(0.1, 0.9)), "tmax": tmax}
    if reduced:
        coefficients = [draw(_number(-100.0, 100.0)), draw(_number(-1e5, 5e5))]
        coefficients += [draw(_number(-3e3, 3e3)), draw(_number(-3e3, 3e3))]
        return params | {"coefficients": coefficients, "scale": draw(st.sampled_from([1.0, 0.001]))}
    return params | {"a": draw(st.lists(_number(-20.0, 40.0), min_size=6, max_size=6))}


@st.composite
def _zabransky_cubic(draw: st.DrawFn) -> Params:
    ((low, high),) = draw(_ranges(1))
    return {"a": draw(st.lists(_number(-20.0, 40.0), min_size=1, max_size=4)), "tmin": low, "tmax": high}


@st.composite
def _vaporisation(draw: st.DrawFn, *, exponent: bool) -> Params:
    tc = draw(_number(50.0, 900.0))
    if exponent:
        b, c = draw(_number(0.2, 0.6)), draw(_number(-0.5, 0.5))
        coefficients = [draw(_number(500.0, 90_000.0)), b, c, 0.2 - min(0.0, c)]
    else:
        coefficients = draw(st.lists(_number(-10.0, 15.0), min_size=5, max_size=5))
    params: Params = {"coefficients": coefficients, "Tc": tc}
    if draw(st.booleans()):
        params |= {"tmin": tc * draw(_number(0.2, 0.8)), "tmax": tc}
    return params


STRATEGIES: dict[str, st.SearchStrategy[Params]] = {
    "constant": _constant(),
    "polynomial": _polynomial(),
    "nasa7": _nasa([0, 1, 2, 3, 4]),
    "nasa9": _nasa([-2, -1, 0, 1, 2, 3, 4]),
    "shomate": _shomate(),
    "aly-lee": _aly_lee(),
    "trc-gas": _trc(),
    "zabransky-cubic": _zabransky_cubic(),
    "zabransky-quasi": _liquid(reduced=False),
    "perry-liquid": _liquid(reduced=True),
    "table": _table(),
    "union": _union(),
    "constant-latent": st.fixed_dictionaries({"dh": _number(100.0, 60_000.0), "T": _number(10.0, 900.0)}),
    "watson": _watson(),
    "perry-vaporisation": _vaporisation(exponent=True),
    "vdi-vaporisation": _vaporisation(exponent=False),
}

HEAT_CAPACITIES = sorted(name for name, spec in EQUATIONS.items() if spec.quantity == HEAT_CAPACITY)
LATENT_HEATS = sorted(name for name, spec in EQUATIONS.items() if spec.quantity == LATENT_HEAT)
every_heat_capacity = pytest.mark.parametrize("name", HEAT_CAPACITIES)
every_equation = pytest.mark.parametrize("name", sorted(EQUATIONS))
few = settings(max_examples=60, deadline=None)


def test_every_equation_is_tested() -> None:
    assert set(STRATEGIES) == set(EQUATIONS)
    assert {*HEAT_CAPACITIES, *LATENT_HEATS} == set(EQUATIONS)


def _inside(data: st.DataObject, equation: Equation, count: int) -> list[float]:
    shares = st.lists(st.floats(0.0, 1.0), min_size=count, max_size=count)
    edge = st.sampled_from([equation.tmin, equation.tmax, *equation.joints, *getattr(equation, "splits", ())])
    drawn = [equation.tmin + (equation.tmax - equation.tmin) * x for x in data.draw(shares)]
    return [data.draw(edge) if data.draw(st.integers(0, 9)) == 0 else t for t in drawn]


def _stretches(equation: Equation, low: float, high: float) -> list[tuple[float, float]]:
    """Cuts at every temperature where a formula changes, and short ones, so that quadrature is exact."""
    edges = {low, high, *equation.joints, *getattr(equation, "temperatures", ())}
    if isinstance(equation, TrcGas):
        edges.add(equation.a[7])  # its second derivative jumps there
    for piece in getattr(equation, "pieces", ()):
        edges |= set(getattr(piece, "temperatures", ()))
    cuts = [low]
    for edge in sorted(t for t in edges if low < t <= high):
        parts = int(np.log(edge / cuts[-1]) / 0.2) + 1
        cuts += np.geomspace(cuts[-1], edge, parts + 1)[1:-1].tolist()
        cuts.append(edge)
    return list(zip(cuts[:-1], cuts[1:], strict=True))


def _transitions(equation: Equation, low: float, high: float) -> tuple[float, float]:
    """What splits and unjoined records add to h and s between two temperatures; a joint belongs to the lower side."""
    steps = [(t, dh, dh / t) for t, dh in getattr(equation, "transitions", ())]
    steps += [(jump.T, jump.h, jump.s) for jump in equation.jumps()]
    inside = [(dh, ds) for t, dh, ds in steps if low <= t < high]
    return sum(dh for dh, _ in inside), sum(ds for _, ds in inside)


@every_heat_capacity
@few
@given(data=st.data())
def test_value_and_both_integrals_agree_with_quadrature(name: str, data: st.DataObject) -> None:
    equation = build(name, data.draw(STRATEGIES[name]))
    low, high = sorted(_inside(data, equation, 2))
    # A stretch starts just above its lower edge, which belongs to the formula below.
    sizes = [0.0, 0.0]
    integrals = list(_transitions(equation, low, high))
    for a, b in _stretches(equation, low, high):
        integrals[0] += fixed_quad(lambda t: np.asarray(equation.cp(t)), a, b, n=24)[0]
        integrals[1] += fixed_quad(lambda t: np.asarray(equation.cp(t)) / t, a, b, n=24)[0]
    grid = np.linspace(low, high, 9)
    sizes[0] = float(np.max(np.abs(equation.h(grid))) + high * np.max(np.abs(equation.cp(grid))))
    sizes[1] = float(np.max(np.abs(equation.s(grid))) + np.max(np.abs(equation.cp(grid))))
    assert equation.dh(low, high) == pytest.approx(integrals[0], rel=1e-11, abs=1e-11 * sizes[0])
    assert equation.ds(low, high) == pytest.approx(integrals[1], rel=1e-11, abs=1e-11 * sizes[1])
    assert equation.dh(high, low) == -equation.dh(low, high)


@pytest.mark.parametrize("name", LATENT_HEATS)
@few
@given(data=st.data())
def test_latent_heat_is_the_integral_of_its_slope(name: str, data: st.DataObject) -> None:
    equation = build(name, data.draw(STRATEGIES[name]))
    assert isinstance(equation, LatentHeat)
    top = 0.95 * equation.tmax
    low, high = sorted(top * x for x in data.draw(st.tuples(st.floats(0.1, 1.0), st.floats(0.1, 1.0))))
    ends = np.linspace(low, high, 21)
    rise = sum(fixed_quad(equation.ddh_dT, a, b, n=20)[0] for a, b in zip(ends[:-1], ends[1:], strict=True))
    assert equation.dh(high) - equation.dh(low) == pytest.approx(rise, rel=1e-9, abs=1e-9 * abs(equation.dh(low)))


def _methods(equation: Any) -> list[Any]:
    names = ("dh", "ddh_dT") if isinstance(equation, LatentHeat) else ("cp", "h", "s")
    return [getattr(equation, name) for name in names]


def _temperatures(data: st.DataObject, equation: Any, count: int = 12) -> list[float]:
    if isinstance(equation, LatentHeat):
        return [equation.tmax * x for x in data.draw(st.lists(st.floats(0.1, 0.99), min_size=count, max_size=count))]
    beyond = [equation.tmin * 0.9, equation.tmax * 1.1]
    return _inside(data, equation, count) + beyond


@every_equation
@few
@given(data=st.data())
def test_number_and_array_agree(name: str, data: st.DataObject) -> None:
    equation = build(name, data.draw(STRATEGIES[name]))
    T = np.array(_temperatures(data, equation))
    for method in _methods(equation):
        one_by_one = [method(t) for t in T.tolist()]
        assert all(type(value) is float for value in one_by_one)
        together = method(T)
        assert together.dtype == np.float64
        assert np.all(np.abs(together - one_by_one) <= 4.0 * np.spacing(np.abs(together)))
        np.testing.assert_array_equal(method(np.float64(T[0])), one_by_one[0])


@every_equation
@few
@given(data=st.data())
def test_stored_form_survives(name: str, data: st.DataObject) -> None:
    equation = build(name, data.draw(STRATEGIES[name]))
    assert equation.name == name
    again = build(name, json.loads(json.dumps(equation.params())))
    assert again == equation
    assert hash(again) == hash(equation)
    moved = pickle.loads(pickle.dumps(equation))  # noqa: S301
    T = _temperatures(data, equation)
    for first, second, third in zip(_methods(equation), _methods(again), _methods(moved), strict=True):
        np.testing.assert_array_equal(first(T), second(T))
        np.testing.assert_array_equal(first(T), third(T))


@every_equation
@few
@given(data=st.data())
def test_any_real_input_gives_float64_and_stays_as_it_is(name: str, data: st.DataObject) -> None:
    equation = build(name, data.draw(STRATEGIES[name]))
    low = int(max(equation.tmin, 1.0)) + 1 if not isinstance(equation, LatentHeat) else 5
    whole = [low, low + 1, low + 2]
    for method in _methods(equation):
        expected = method(np.array(whole, dtype=float))
        inputs = (whole, np.array(whole), np.array(whole, dtype=np.float32), np.array([whole, whole]).T[:, 0])
        for given_ in inputs:
            before = np.array(given_)
            result = method(given_)
            assert result.dtype == np.float64
            np.testing.assert_array_equal(result, expected)
            np.testing.assert_array_equal(given_, before)
        assert method(np.array([[float(low)]])).shape == (1, 1)
        assert method(np.array([])).shape == (0,)
        assert method(low) == expected[0]


@every_heat_capacity
@few
@given(data=st.data())
def test_out_is_filled_wherever_it_lies(name: str, data: st.DataObject) -> None:
    equation = build(name, data.draw(STRATEGIES[name]))
    T = np.array(_temperatures(data, equation))
    for method in _methods(equation):
        expected = method(T)
        plain, strided, same = np.empty(T.size), np.empty(2 * T.size)[::2], T.copy()
        shifted = np.concatenate([T, [0.0]])
        assert method(T, out=plain) is plain
        assert method(T, out=strided) is strided
        assert method(same, out=same) is same
        method(shifted[:-1], out=shifted[1:])
        for result in (plain, strided, same, shifted[1:]):
            np.testing.assert_array_equal(result, expected)
        for bad in (np.empty(T.size + 1), np.empty(T.size, dtype=np.float32), [0.0] * T.size):
            with pytest.raises(TypeError, match="out must be"):
                method(T, out=bad)


@every_equation
@settings(max_examples=15, deadline=None)
@given(data=st.data())
def test_what_is_no_temperature_is_refused(name: str, data: st.DataObject) -> None:
    equation = build(name, data.draw(STRATEGIES[name]))
    good = 0.5 * (equation.tmin + equation.tmax)
    for bad in (0.0, -0.0, -300.0, float("nan"), float("inf"), float("-inf")):
        place = data.draw(st.integers(0, 4))
        row = np.full(5, good)
        row[place] = bad
        for method in _methods(equation):
            with pytest.raises(TemperatureError):
                method(bad)
            with pytest.raises(TemperatureError) as caught:
                method(row)
            if not isinstance(equation, LatentHeat):
                assert caught.value.fields["position"] == place
    for method in _methods(equation):
        for nonsense in (["warm"], [1 + 2j], [None], [[300.0], [300.0, 400.0]]):
            with pytest.raises(TemperatureError):
                method(nonsense)


@every_heat_capacity
@settings(max_examples=3, deadline=None)
@given(data=st.data())
def test_long_arrays_and_threads(name: str, data: st.DataObject) -> None:
    equation = build(name, data.draw(STRATEGIES[name]))
    random = np.random.default_rng(data.draw(st.integers(0, 99)))
    T = random.uniform(equation.tmin, equation.tmax, 2 * BLOCK + 17)
    for method in _methods(equation):
        pieces = np.concatenate([method(part) for part in np.array_split(T, 101)])
        np.testing.assert_array_equal(method(T), pieces)
        np.testing.assert_array_equal(method(np.sort(T)), pieces[np.argsort(T)])
        with ThreadPoolExecutor(4) as pool:
            for result in pool.map(method, [T] * 8):
                np.testing.assert_array_equal(result, pieces)
        T[-1] = 0.0
        with pytest.raises(TemperatureError):
            method(T)
        T[-1] = equation.tmax
        pieces[-1] = method(equation.tmax)


@every_heat_capacity
@few
@given(data=st.data())
def test_range_includes_its_ends(name: str, data: st.DataObject) -> None:
    equation = build(name, data.draw(STRATEGIES[name]))
    T = [np.nextafter(equation.tmin, 0.0), equation.tmin, equation.tmax, np.nextafter(equation.tmax, np.inf)]
    assert [equation.covers(float(t)) for t in T] == [False, True, True, False]
    assert equation.covers(T).tolist() == [False, True, True, False]
