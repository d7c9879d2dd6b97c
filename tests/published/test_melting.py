"""Melting points and glass steps read out of JANAF's paired tables, against what does not depend on them."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable
from math import log
from statistics import median
from typing import NamedTuple

import pytest

from propdb.api import Store
from propdb.intake.package import Package
from propdb.model.records import USABLE_STATUSES, Entry

SOURCE = "chase-1998"


class Melting(NamedTuple):
    """Of one substance: melting point, liquid less crystal there, and where their Gibbs energies cross."""

    point: float  # [K]
    rise: float  # enthalpy [J/mol]
    crossing: float | None  # [K]


def _constant(entries: list[Entry], quantity: str, phase: str, *, source: str = "") -> float | None:
    """Best value at 298.15 K: of a source, or of the first that has one in the order of trust."""
    order = ("codata-1989", "nbs-1982", "crc-95") if not source else (source,)
    found = {
        e.source: e.value
        for e in entries
        if (e.quantity, e.phase, e.temperature, e.form) == (quantity, phase, 298.15, "") and e.value is not None
    }
    return next((found[key] for key in order if key in found), None)


def _integral(points: list[tuple[float, float]], high: float, weight: Callable[[float, float], float]) -> float | None:
    """Sum over a table from 298.15 K, of cp over ``weight`` of each stretch; splits add nothing."""
    inside = [p for p in points if 298.15 <= p[0] <= high]
    if not inside or inside[0][0] != 298.15 or inside[-1][0] < high - 100.0:
        return None
    if inside[-1][0] < high:
        inside.append((high, inside[-1][1]))
    return sum(0.5 * (c1 + c2) * weight(t1, t2) for (t1, c1), (t2, c2) in zip(inside, inside[1:], strict=False))


def _melting(entries: list[Entry]) -> Melting | None:
    points = {
        e.phase: list(zip(e.params["T"], e.params["cp"], strict=True))
        for e in entries
        if (e.quantity, e.equation, e.source, e.form) == ("Cp", "table", SOURCE, "") and e.phase in ("cr", "l")
    }
    point = next((e.value for e in entries if (e.quantity, e.source) == ("Tm", SOURCE)), None)
    liquid, crystal = _constant(entries, "Hf", "l", source=SOURCE), _constant(entries, "Hf", "cr")
    if len(points) < 2 or point is None or liquid is None or crystal is None:
        return None
    heats = [_integral(points[phase], point, lambda a, b: b - a) for phase in ("l", "cr")]
    if heats[0] is None or heats[1] is None:
        return None
    rise = liquid - crystal + heats[0] - heats[1]
    s_liquid, s_crystal = _constant(entries, "S", "l", source=SOURCE), _constant(entries, "S", "cr")
    entropies = [_integral(points[phase], point, lambda a, b: log(b / a)) for phase in ("l", "cr")]
    if None in (s_liquid, s_crystal, *entropies):
        return Melting(point, rise, None)
    drop = s_liquid - s_crystal + entropies[0] - entropies[1]  # type: ignore[operator]
    return Melting(point, rise, rise / drop if drop > 0.0 else None)  # dG = rise - T drop near the melting point


@pytest.fixture(scope="module")
def meltings(package: Package) -> dict[str, Melting]:
    by_species: dict[str, list[Entry]] = defaultdict(list)
    for e in package.content.entries:
        if e.status in USABLE_STATUSES:
            by_species[e.species].append(e)
    found = {name: _melting(entries) for name, entries in by_species.items()}
    return {name: melting for name, melting in found.items() if melting is not None}


def test_the_gibbs_energies_of_crystal_and_liquid_cross_there(meltings: dict[str, Melting]) -> None:
    """Formation enthalpies and entropies of 298.15 K (crystal: CODATA, NBS, CRC; liquid: JANAF) know nothing of it."""
    off = {n: abs(m.crossing / m.point - 1.0) for n, m in meltings.items() if m.crossing is not None}
    assert len(off) > 80
    assert median(off.values()) < 0.02
    for name in ("sodium chloride", "potassium chloride", "potassium bromide", "sodium iodide", "lithium hydroxide",
                 "calcium chloride", "magnesium oxide", "magnesium fluoride", "lead(II) chloride", "copper",
                 "aluminium", "silicon", "molybdenum trioxide", "tungsten trioxide", "iodine", "zinc"):  # fmt: skip
        assert off[name] < 0.02, name


def test_no_enthalpy_is_missing_across_a_glass_step(meltings: dict[str, Melting]) -> None:
    """With 0 at the glass step the liquid at its melting point is one heat of fusion above the crystal.

    CRC Handbook, 95th edition, enthalpy of fusion [kJ/mol]; substances whose crystal has no transition.
    """
    fusion = {
        "sodium chloride": 28.16, "calcium oxide": 80.0, "magnesium oxide": 77.0, "magnesium fluoride": 58.7,
        "molybdenum trioxide": 48.7, "lead(II) chloride": 21.88, "nickel(II) chloride": 77.9, "sodium iodide": 23.7,
        "copper": 13.26, "aluminium": 10.71, "zinc": 7.32, "lead": 4.774, "tantalum": 36.57, "boron": 50.2,
        "lithium chloride": 19.8,
    }  # fmt: skip
    for name, expected in fusion.items():
        assert meltings[name].rise / 1e3 == pytest.approx(expected, rel=0.03), name


def test_they_are_the_melting_points_of_the_handbook(full_store: Store) -> None:
    """CRC Handbook, 95th edition, as typed: within 1 %, the difference between temperature scales and editions."""
    compared = 0
    for name in full_store._reader.path_species()["solid_to_gas"]:
        points = {e.source: e.value for e in full_store.show(name).entries if e.quantity == "Tm" and not e.form}
        if SOURCE in points and "crc-95" in points:
            compared += 1
            assert points[SOURCE] == pytest.approx(points["crc-95"], rel=0.01), name
    assert compared >= 15


@pytest.mark.parametrize("species", ["iodine monochloride", "molybdenum(v) chloride", "potassium bromide"])
def test_an_enthalpy_is_carried_from_crystal_to_gas(full_store: Store, species: str) -> None:
    melting = next(e.value for e in full_store.show(species).entries if (e.quantity, e.source) == ("Tm", SOURCE))
    assert melting is not None
    states = [("cr", melting - 0.5), ("l", melting + 0.5), ("g", melting + 0.5)]
    values = [full_store.enthalpy(species, phase=phase, temperature=f"{t}K", datum="gas-25C").si for phase, t in states]
    assert values[0] < values[1] < values[2]
