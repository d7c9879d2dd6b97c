"""Cubics between tabulated points, against SciPy's, which are of the same authors."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.interpolate import PchipInterpolator

from propdb.cp._spline import monotone_cubics
from propdb.cp.tabulated import EnthalpyTable


@pytest.mark.parametrize("places", [0, 1, 3])
@pytest.mark.parametrize("points", [2, 3, 4, 12, 40])
def test_the_cubics_are_those_of_scipy(points: int, places: int) -> None:
    draw = np.random.default_rng(points)
    for spread in (0.5, 20.0):  # rounded values: level stretches, maxima and minima, ends that turn round
        for going_up in (False, True):
            x = 1.0 + np.cumsum(draw.uniform(0.5, 100.0, points))
            y = np.round(draw.normal(50.0, spread, points), places)
            y = np.sort(y) if going_up else y
            theirs = PchipInterpolator(x, y).c[::-1].T
            size = np.diff(x)[:, None] ** np.arange(4)  # what each term amounts to across its interval
            np.testing.assert_allclose(monotone_cubics(x, y) * size, theirs * size, rtol=0.0, atol=1e-13 * 200.0)


def test_a_table_of_enthalpies_follows_them() -> None:
    t, h = [300.0, 310.0, 350.0, 420.0], [0.0, 75.3, 380.0, 381.0]
    table = EnthalpyTable(t, h)
    curve = PchipInterpolator(t, h)
    for at in (300.0, 304.9, 310.0, 340.0, 350.0, 351.0, 419.0, 420.0):
        assert table.h(at) == pytest.approx(float(curve(at)), rel=1e-13, abs=1e-10)
