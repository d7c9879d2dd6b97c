"""Speed of the heat-capacity equations, as ratios against something run beside them.

`python tests/bench/cp_speed.py [--json]`. Each ratio is time(np.copyto) / time(h) on the same 10^6 unsorted
temperatures with `out` given: 0.2 means that an enthalpy costs as much as moving five numbers. Medians of runs taken
in turn with the copy, so that both see the same machine. The last two compare with a Python loop over the `chemicals`
library's Shomate integral, per temperature, over the elements of an array and over plain floats.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Iterable, Iterator
from pathlib import Path

import numpy as np
from ratios import Ratio, medians

if __name__ == "__main__":
    sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from propdb.cp import Nasa9, NasaInterval, Polynomial, Shomate, ShomateInterval, Table, Union

COUNT = 1_000_000
RUNS = 25

# Least ratios; the loop over plain floats is shown for comparison only.
TARGETS = {
    "polynomial": 0.20,
    "shomate": 0.20,
    "nasa9": 0.08,
    "table": 0.07,
    "union of three": 0.045,
    "shomate over a loop (array)": 80.0,
}

# Nitrogen, McBride, Zehe and Gordon, NASA/TP-2002-211556, record N2; typed from memory, checked in the unit tests.
NITROGEN = (
    NasaInterval(
        200.0,
        1000.0,
        (22103.71497, -381.846182, 6.08273836, -0.00853091441, 1.384646189e-05, -9.62579362e-09, 2.519705809e-12),
        (710.846086, -10.76003744),
    ),
    NasaInterval(
        1000.0,
        6000.0,
        (587712.406, -2239.249073, 6.06694922, -0.00061396855, 1.491806679e-07, -1.923105485e-11, 1.061954386e-15),
        (12832.10415, -15.86640027),
    ),
    NasaInterval(
        6000.0,
        20000.0,
        (831013916.0, -642073.354, 202.0264635, -0.03065092046, 2.486903333e-06, -9.70595411e-11, 1.437538881e-15),
        (4938707.04, -1672.09974),
    ),
)


def equations() -> dict[str, tuple[Polynomial | Shomate | Nasa9 | Table | Union, float, float]]:
    """What is timed, with the range of its temperatures [K]."""
    whole = Nasa9(NITROGEN)
    nodes = (200.0, 250.0, 298.15, 300.0, 350.0, 400.0, 450.0, 500.0, *map(float, range(600, 6001, 100)))
    low, middle, high = (Nasa9((interval,)) for interval in NITROGEN)
    return {
        # Numbers without meaning, of the size of an ideal gas's: only the time matters.
        "polynomial": (Polynomial((0, 1, 2, 3), (28.0, 4e-3, 2e-6, -1e-9), 200.0, 2000.0), 200.0, 2000.0),
        "shomate": (Shomate((ShomateInterval(200.0, 2000.0, (20.0, 20.0, -9.0, 1.4, 0.5)),)), 200.0, 2000.0),
        "nasa9": (Nasa9(NITROGEN[:1]), 200.0, 1000.0),
        "table": (Table(nodes, tuple(whole.cp(t) for t in nodes)), 200.0, 6000.0),
        # A third of the temperatures in each range, in random order.
        "union of three": (Union((low, middle, high)), 0.0, 0.0),
    }


def run() -> Iterator[Ratio]:
    """All ratios, each with its target."""
    for name, (measured, detail) in _measured():
        if name in TARGETS:
            yield Ratio(f"{name}, {detail}", measured, TARGETS[name], at_least=True)


def measure() -> dict[str, float]:
    """All ratios by name."""
    return {name: measured for name, (measured, _) in _measured()}


def _measured() -> Iterator[tuple[str, tuple[float, str]]]:
    from chemicals.heat_capacity import Shomate_integral

    random = np.random.default_rng(1)
    out = np.empty(COUNT)
    for name, (equation, low, high) in equations().items():
        if name.startswith("union"):
            edges = np.array([200.0, 1000.0, 6000.0, 20000.0])
            piece = random.integers(0, 3, COUNT)
            T = random.uniform(edges[piece], edges[piece + 1])
        else:
            T = random.uniform(low, high, COUNT)
        copy, ours = medians(lambda T=T: np.copyto(out, T), lambda e=equation, T=T: e.h(T, out), rounds=RUNS)
        yield name, (copy / ours, "copy / h of 10^6 temperatures")

    shomate, low, high = equations()["shomate"]
    T = random.uniform(low, high, COUNT)
    some = T[:: COUNT // 10_000]
    coefficients = shomate.intervals[0].coefficients
    for kind, several in (("array", some), ("floats", some.tolist())):

        def loop(several: Iterable[float] = several) -> list[float]:
            return [Shomate_integral(t, *coefficients) for t in several]

        looped, ours = medians(loop, lambda: shomate.h(T, out), rounds=11)
        yield f"shomate over a loop ({kind})", (looped / ours * COUNT / some.size, "chemicals / h, per temperature")


def main() -> int:
    """Print the ratios; 1 if one misses its target."""
    found = measure()
    if "--json" in sys.argv[1:]:
        print(json.dumps({name: round(value, 4) for name, value in found.items()}))
    else:
        for name, value in found.items():
            target = f"target {TARGETS[name]:g}" if name in TARGETS else ""
            print(f"{name:32} {value:8.3f}   {target}".rstrip())
    return int(any(found[name] < target for name, target in TARGETS.items()))


if __name__ == "__main__":
    sys.exit(main())
