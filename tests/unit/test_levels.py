"""Levels on a small invented world: choices, trees, ranges, refusals. Species, sources and numbers are invented."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import pytest

from propdb.datum import parse_datums
from propdb.errors import (
    Ambiguous,
    NoData,
    NoSuchState,
    NotFound,
    OutOfRange,
    SplitError,
    TemperatureOutOfRange,
)
from propdb.levels.answers import convert, enthalpy
from propdb.levels.engine import Levels
from propdb.levels.policy import Policy, choose
from propdb.model.records import Datum, Entry, Source, Species, State
from propdb.units import parse_unit

KJ = parse_unit("kJ/mol")
ELEMENT = Species("unium", "U2", 0, (("U", 2),), 0.02)
OXIDE = Species("unium oxide", "UO", 0, (("O", 1), ("U", 1)), 0.026)
OXYGEN = Species("oxygen", "O2", 0, (("O", 2),), 0.032)
DATUMS = parse_datums(
    {
        "elements": {
            "U": {"forms": [{"species": "unium", "phase": "g"}]},
            "O": {"forms": [{"species": "oxygen", "phase": "g"}]},
        },
        "datum": {
            "elements-298K": {
                "kind": "elements", "sentence": "x", "source": "common-practice", "temperature": "298.15K",
            },
            "elements-0K": {"kind": "elements", "sentence": "x", "source": "common-practice", "temperature": "0K"},
            "gas": {
                "kind": "own", "sentence": "x", "source": "common-practice", "temperature": "298.15K", "phase": "g",
            },
            "liquid": {
                "kind": "own", "sentence": "x", "source": "common-practice", "temperature": "298.15K", "phase": "l",
            },
            "stable": {
                "kind": "own", "sentence": "x", "source": "common-practice", "temperature": "298.15K",
                "phase": "stable",
            },
            "boiling": {
                "kind": "own", "sentence": "x", "source": "common-practice", "temperature": "boiling", "phase": "l",
            },
        },
    },
    where="the test",
)  # fmt: skip

_count = iter(range(10**6))


def entry(quantity: str, phase: str, value: float | None = None, **fields: Any) -> Entry:
    base = Entry(
        id=f"{next(_count):020x}", species="unium oxide", quantity=quantity, phase=phase, form="", to="", equation="",
        temperature=298.15, value=value, unit="J/mol", carried=str(value), carried_unit="J/mol", params={}, tmin=None,
        tmax=None, uncertainty=None, uncertainty_unit="", uncertainty_kind="", datum="", conditions="", source="good",
        locator="row",
    )  # fmt: skip
    return replace(base, **fields)


def cp(phase: str, value: float, tmin: float, tmax: float, **fields: Any) -> Entry:
    params = {"value": value, "tmin": tmin, "tmax": tmax}
    return entry("Cp", phase, equation="constant", params=params, tmin=tmin, tmax=tmax, temperature=None, **fields)


def hf(phase: str, value: float, **fields: Any) -> Entry:
    return entry("Hf", phase, value, datum=fields.pop("datum", "elements-298K"), **fields)


class World:
    """A store in memory."""

    def __init__(self, *entries: Entry, oxide: Species = OXIDE, elements: tuple[Entry, ...] = ()) -> None:
        self.by_species: Mapping[str, tuple[Entry, ...]] = {
            "unium oxide": tuple(entries),
            "unium": tuple(e for e in elements if e.species == "unium"),
            "oxygen": tuple(e for e in elements if e.species == "oxygen"),
        }
        self.records = {"unium oxide": oxide, "unium": ELEMENT, "oxygen": OXYGEN}

    def species(self, name: str) -> Species:
        return self.records[name]

    def entries(self, species_name: str) -> tuple[Entry, ...]:
        return self.by_species[species_name]

    def source(self, key: str) -> Source:
        return Source(key, key, (), 2000, "book", "evaluated" if key == "good" else "handbook", "")

    def datum(self, name: str) -> Datum:
        return DATUMS[name]

    def policy(self, key: str) -> Any:
        raise AssertionError(key)

    def levels(self, *, pinned: tuple[str, ...] = (), extrapolate: bool = False) -> Levels:
        ranks = {
            "rank": [{"quantities": ["Hf", "Cp", "Hvap", "Hfus", "Tb", "Tm"], "sources": ["good", "fair", "poor"]}],
            "class_default": [
                {"quantities": ["Cp"], "classes": ["evaluated", "handbook"], "percent": 1.0},
                {"quantities": ["Hvap", "Hfus", "Hsub", "Htr"], "classes": ["evaluated", "handbook"], "percent": 1.0},
                {"quantities": ["Hf", "dH0"], "classes": ["evaluated", "handbook"], "standard": 500.0},
            ],
        }
        return Levels(self, Policy(ranks, lambda key: self.source(key).cls, pinned), extrapolate=extrapolate)

    def h(self, phase: str, t: float, datum: str = "elements-298K", **options: Any) -> Any:
        state = State(phase, t, options.pop("form", ""))
        return enthalpy(
            self.levels(**options), species=self.records["unium oxide"], state=state, datum=DATUMS[datum], unit=KJ,
            stamp="",
        )  # fmt: skip


# -- choosing ----------------------------------------------------------------------------------------------------------


def test_status_goes_before_rank_and_rank_before_uncertainty() -> None:
    poor = hf("g", -1.0, source="poor", status="approved")
    good = hf("g", -2.0, source="good")
    sure = hf("g", -3.0, source="fair", uncertainty=1.0, uncertainty_kind="standard")
    levels = World(good, sure, poor).levels()
    assert [e.value for e in choose([sure, good, poor], levels.policy)] == [-1.0, -2.0, -3.0]


@pytest.mark.parametrize("status", ["quarantined", "datum-unknown", "draft", "superseded", "withdrawn"])
def test_what_is_not_fit_never_enters(status: str) -> None:
    with pytest.raises((NoData, NotFound)):
        World(hf("g", -1000.0, status=status)).h("g", 298.15)
    assert World(hf("g", -1000.0, status=status), hf("g", -2.0, source="poor")).h("g", 298.15).si == -2.0


def test_losers_are_closures_with_their_difference() -> None:
    answer = World(
        hf("g", -1000.0),
        hf("g", -1300.0, source="poor"),
        cp("g", 30.0, 200, 1000),
        cp("g", 31.0, 200, 1000, source="poor"),
    ).h("g", 398.15)
    assert answer.si == pytest.approx(-1000.0 + 30.0 * 100.0)
    assert {(round(c.difference, 6), c.source) for c in answer.closures} == {(-0.3, "poor"), (0.1, "poor")}


def test_a_pinned_source_is_used_and_what_it_lacks_is_named() -> None:
    answer = World(hf("g", -1000.0), hf("g", -1300.0, source="poor"), cp("g", 30.0, 200, 1000)).h(
        "g", 398.15, pinned=("poor",)
    )
    assert answer.si == pytest.approx(-1300.0 + 3000.0)
    assert any("not from the pinned source: good" in w for w in answer.warnings)


# -- curves ------------------------------------------------------------------------------------------------------------


def test_a_curve_is_put_together_from_the_best_of_each_range() -> None:
    world = World(hf("g", 0.0), cp("g", 30.0, 200, 500), cp("g", 40.0, 400, 900, source="poor"))
    assert world.h("g", 600.0).si == pytest.approx(30.0 * (500 - 298.15) + 40.0 * 100)


def test_a_gap_is_refused_and_bridged_when_asked_for() -> None:
    world = World(hf("g", 0.0), cp("g", 30.0, 200, 400), cp("g", 40.0, 500, 900))
    with pytest.raises(TemperatureOutOfRange, match="200 to 400 K and 500 to 900 K"):
        world.h("g", 450.0)
    with pytest.raises(TemperatureOutOfRange, match="no anchor reaches"):
        world.h("g", 600.0)
    answer = world.h("g", 600.0, extrapolate=True)
    assert answer.si == pytest.approx(30.0 * (450 - 298.15) + 40.0 * 150)
    assert any(s.extrapolated for s in answer.steps)
    assert any("extrapolated" in w for w in answer.warnings)


def test_a_range_printed_298_holds_at_298_15_and_one_of_300_does_not() -> None:
    assert World(hf("g", 0.0), cp("g", 30.0, 200, 298)).h("g", 298.15).si == 0.0
    assert World(hf("g", 0.0), cp("g", 30.0, 298.3, 900)).h("g", 500.0).si == pytest.approx(30 * 201.85)
    with pytest.raises(TemperatureOutOfRange):
        World(hf("g", 0.0), cp("g", 30.0, 300, 900)).h("g", 500.0)


def test_allowing_extrapolation_changes_nothing_where_it_is_not_needed() -> None:
    entries = (
        hf("g", -1000.0),
        hf("l", -45000.0),
        cp("g", 30.0, 200, 1000),
        cp("l", 75.0, 280, 360),
        entry("Hvap", "l", 40000.0, temperature=500.0, conditions="standard"),
        entry("Hvap", "l", 43000.0, conditions="standard", status="estimate"),
    )
    for phase, t in (("g", 700.0), ("l", 300.0)):
        plain = World(*entries).h(phase, t)
        assert World(*entries).h(phase, t, extrapolate=True).si == plain.si


def test_a_heat_capacity_at_one_temperature_serves_when_extrapolation_is_asked_for() -> None:
    world = World(hf("l", 0.0), entry("Cp", "l", 75.0, unit="J/mol/K"))
    with pytest.raises(TemperatureOutOfRange, match=r"known at 298\.15 K only"):
        world.h("l", 320.0)
    answer = world.h("l", 320.0, extrapolate=True)
    assert answer.si == pytest.approx(75.0 * 21.85)
    assert answer.steps[-1].extrapolated


def test_a_doubled_temperature_needs_the_enthalpy_of_its_transition() -> None:
    table = {"T": [200.0, 400.0, 400.0, 600.0], "cp": [30.0, 30.0, 35.0, 35.0]}
    curve = entry("Cp", "cr", equation="table", params=table, tmin=200.0, tmax=600.0, temperature=None)
    world = World(hf("cr", 0.0), curve)
    assert world.h("cr", 390.0).si == pytest.approx(30.0 * 91.85)
    with pytest.raises(SplitError):
        world.h("cr", 500.0)


# -- trees -------------------------------------------------------------------------------------------------------------


def test_heating_along_a_covered_range_always_is_in_the_tree() -> None:
    """A latent heat with a tiny uncertainty may not displace the curve: the level would jump."""
    sure = {"uncertainty": 0.001, "uncertainty_kind": "standard", "conditions": "standard"}
    world = World(
        hf("l", 0.0),
        cp("l", 75.0, 280, 400),
        cp("g", 30.0, 280, 400),
        entry("Hvap", "l", 40000.0, **sure),
        entry("Hvap", "l", 38000.0, temperature=350.0, **sure),
    )
    below, at, above = (world.h("g", t).si for t in (349.999, 350.0, 350.001))
    assert below < at < above
    assert above - below < 1.0
    (closure,) = [c for c in world.h("g", 350.0).closures if "vaporisation" in c.via]
    # one latent heat and two heat capacities against the other: 38000 - (40000 - 45 x 51.85) = 333 J/mol
    assert abs(closure.difference) == pytest.approx(0.333, abs=0.001)


def test_levels_go_by_the_smaller_variance() -> None:
    def value(size: float) -> float:
        found = World(
            hf("g", -1000.0, uncertainty=size, uncertainty_kind="standard"),
            hf("l", -42000.0, uncertainty=50.0, uncertainty_kind="standard"),
            entry("Hvap", "l", 40000.0, uncertainty=10.0, uncertainty_kind="standard", conditions="standard"),
        ).h("g", 298.15)
        return float(found.si)

    assert value(20.0) == -1000.0
    assert value(80.0) == -42000.0 + 40000.0


def test_two_own_states_without_formation_enthalpies() -> None:
    world = World(
        cp("l", 75.0, 280, 400),
        cp("g", 30.0, 280, 600),
        entry("Hvap", "l", 40000.0, temperature=350.0, conditions="standard"),
    )
    answer = world.h("g", 500.0, "liquid")
    assert answer.si == pytest.approx(75.0 * 51.85 + 40000.0 + 30.0 * 150.0)
    with pytest.raises(NoData, match="no formation enthalpy of unium oxide"):
        world.h("g", 500.0)


def test_an_implied_latent_heat_is_named() -> None:
    answer = World(hf("l", -42000.0), hf("g", -1000.0)).h("g", 298.15, "liquid")
    assert answer.si == 41000.0
    assert all("implied latent heat" in s.note for s in answer.steps)


def test_what_would_connect_two_phases_is_said() -> None:
    with pytest.raises(NoData, match=r"needs a latent heat \(Hvap\) or Hf of both phases"):
        World(cp("l", 75.0, 280, 400), cp("g", 30.0, 280, 600), hf("g", 0.0), entry("dH0", "l", 9000.0)).h(
            "g", 300.0, "liquid"
        )


def test_formation_enthalpies_at_zero_kelvin() -> None:
    """Hf(0 K) on elements-0K: the level at 298.15 K follows with the increments of compound and elements."""
    world = World(
        hf("g", 5000.0, datum="elements-0K", temperature=0.0),
        entry("dH0", "g", 9000.0),
        elements=(
            replace(entry("dH0", "g", 8000.0), species="unium"),
            replace(entry("dH0", "g", 8600.0), species="oxygen"),
        ),
    )
    # level(0 K) = 5000 - 1/2 x 8000 - 1/2 x 8600
    assert world.h("g", 298.15).si == pytest.approx(5000.0 - 4000.0 - 4300.0 + 9000.0)
    assert world.h("g", 298.15, "elements-0K").si == pytest.approx(5000.0 + 9000.0)


@pytest.mark.parametrize(
    "source, direct",
    [("good", True), ("fair", True), ("poor", False)],
    ids=["of its own source", "of a better", "of a worse"],
)
def test_zero_kelvin_does_not_go_round_the_rank_of_sources(source: str, direct: bool) -> None:
    """A formation enthalpy at 0 K, however certain, goes behind one at 298.15 K of its own source or a better one."""
    sure = {"uncertainty": 5.0, "uncertainty_kind": "standard"}
    world = World(
        hf("g", -100.0, source=source, uncertainty=300.0, uncertainty_kind="standard"),
        hf("g", 5000.0, datum="elements-0K", temperature=0.0, source="fair" if source != "good" else "good", **sure),
        entry("dH0", "g", 9000.0, **sure),
        elements=(
            replace(entry("dH0", "g", 8000.0, **sure), species="unium"),
            replace(entry("dH0", "g", 8600.0, **sure), species="oxygen"),
        ),
    )
    answer = world.h("g", 298.15)
    assert answer.si == pytest.approx(-100.0 if direct else 5000.0 - 4000.0 - 4300.0 + 9000.0)
    assert len(answer.closures) == 1


def test_a_to_b_to_c_in_the_small_world() -> None:
    world = World(
        hf("g", -1000.0), cp("l", 75.0, 280, 400), cp("g", 30.0, 280, 600),
        entry("Hvap", "l", 40000.0, temperature=350.0, conditions="standard"),
    )  # fmt: skip

    def shift(a: str, b: str) -> float:
        answer = convert(
            world.levels(), species=OXIDE, value=0.0, given="0", source_datum=DATUMS[a], target_datum=DATUMS[b],
            unit=KJ, stamp="", phase="g",
        )  # fmt: skip
        return answer.si

    assert shift("gas", "liquid") + shift("liquid", "elements-298K") == pytest.approx(shift("gas", "elements-298K"))
    assert shift("liquid", "gas") == pytest.approx(-40000.0 - 45.0 * 51.85)


# -- states ------------------------------------------------------------------------------------------------------------

POINTS = (
    entry("Tm", "cr", 320.0, unit="K"),
    entry("Tb", "l", 450.0, unit="K"),
)


def test_a_supercooled_liquid_is_refused_unless_asked_for() -> None:
    world = World(hf("l", 0.0), cp("l", 75.0, 280, 400), *POINTS)
    with pytest.raises(NoSuchState, match="is solid at 300 K: it melts at 320 K"):
        world.h("l", 300.0)
    assert world.h("l", 300.0, extrapolate=True).si == pytest.approx(75.0 * 1.85)


def test_the_stable_phase_follows_from_melting_and_boiling_point() -> None:
    world = World(hf("l", 0.0), hf("g", 1.0), hf("cr", -9.0), *POINTS)
    levels = world.levels()
    assert [levels.stable_phase("unium oxide", t)[0] for t in (300.0, 320.0, 449.9, 450.0)] == ["cr", "l", "l", "g"]
    assert world.h("g", 298.15, "stable").si == pytest.approx(10.0)


def test_an_unknown_stable_phase_is_refused() -> None:
    with pytest.raises(NoData, match="no melting or boiling point"):
        World(hf("l", 0.0)).h("l", 298.15, "stable")
    with pytest.raises(NoData, match="no boiling point of unium oxide"):
        World(hf("l", 0.0)).h("l", 298.15, "boiling")


def test_forms_are_named() -> None:
    world = World(hf("cr", 0.0, form="alpha"), hf("cr", 500.0, form="beta"))
    with pytest.raises(Ambiguous, match="alpha, beta"):
        world.h("cr", 298.15)
    with pytest.raises(NotFound, match="it has alpha, beta"):
        world.h("cr", 298.15, form="gamma")
    assert world.h("cr", 298.15, form="beta").si == 500.0


def test_a_transition_joins_two_forms() -> None:
    world = World(
        hf("cr", 0.0, form="alpha"),
        cp("cr", 30.0, 200, 500, form="alpha"),
        cp("cr", 33.0, 400, 700, form="beta"),
        entry("Htr", "cr", 400.0, form="alpha", to="cr:beta", temperature=450.0),
    )
    assert world.h("cr", 600.0, form="beta").si == pytest.approx(30.0 * 151.85 + 400.0 + 33.0 * 150.0)


def test_phases_that_are_not_there() -> None:
    with pytest.raises(NotFound, match="the store knows it as g"):
        World(hf("g", 0.0)).h("l", 298.15)
    with pytest.raises(NoData, match="needs Tc, Pc, omega"):
        World(hf("g", 0.0)).h("fluid", 298.15)


# -- real vapour -------------------------------------------------------------------------------------------------------

CRITICAL = (
    entry("Tc", "l", 560.0, unit="K"),
    entry("Pc", "l", 4.9e6, unit="Pa"),
    entry("omega", "l", 0.21, unit="1"),
)
LATENT = (hf("l", 0.0), entry("Hvap", "l", 33000.0, conditions="to the real vapour"))


def test_a_latent_heat_ends_at_the_real_vapour() -> None:
    answer = World(*LATENT, *CRITICAL).h("g", 298.15)
    assert [s.what for s in answer.steps] == ["formation", "vaporisation", "residual enthalpy"]
    gap = answer.si - 33000.0
    assert 10.0 < gap < 100.0
    assert "model" in answer.steps[-1].note
    ideal = World(hf("l", 0.0), entry("Hvap", "l", 33000.0, conditions="to the monomer ideal gas")).h("g", 298.15)
    assert ideal.si == 33000.0


def test_an_associating_vapour_has_no_residual_leg() -> None:
    acid = replace(OXIDE, vapour="associating")
    with pytest.raises(NotFound, match="no data for unium oxide as g"):
        World(*LATENT, *CRITICAL, oxide=acid).h("g", 298.15)
    with pytest.raises(NoData, match="associates"):
        World(*LATENT, hf("g", 0.0), *CRITICAL, oxide=acid).h("fluid", 298.15)


def test_a_hydrogen_bonding_vapour_is_less_certain() -> None:
    def size(kind: str) -> float:
        answer = World(*LATENT, *CRITICAL, oxide=replace(OXIDE, vapour=kind)).h("g", 298.15)
        (part,) = [p for p in answer.parts if p.entry.startswith("model:")]
        return abs(part.coefficient) * part.standard

    assert size("hydrogen-bonding") == pytest.approx(6.0 * size(""), rel=1e-6)


def test_the_liquid_above_its_boiling_point_runs_along_saturation() -> None:
    world = World(hf("l", 0.0), cp("l", 130.0, 280, 520), *CRITICAL, replace(POINTS[1], value=353.0))
    answer = world.h("l", 450.0)
    pressure = [s for s in answer.steps if s.what == "pressure along saturation"]
    assert len(pressure) == 1
    assert 0.0 < pressure[0].value < 0.2  # kJ/mol; v(1 - aT) dp from 1 to some 10 bar
    with pytest.raises(NoSuchState, match="critical temperature is 560 K"):
        world.h("l", 570.0)


def test_errors_name_the_zero_that_fails() -> None:
    with pytest.raises(OutOfRange) as caught:
        World(hf("g", 0.0), hf("l", -1.0), *POINTS).h("g", 298.15, "liquid")
    assert caught.value.where == "zero of liquid"


# -- latent heats where the liquid is known; what others say -----------------------------------------------------------


def test_an_equation_of_vaporisation_meets_the_liquid_in_its_range() -> None:
    """The liquid is known from 320 K only, the equation from 280 K: they meet at 320 K, where both hold."""
    params = {"coefficients": [50000.0, 0.38, 0.0, 0.0], "Tc": 560.0, "tmin": 280.0, "tmax": 560.0}
    curve = entry("Hvap", "l", equation="perry-vaporisation", params=params, tmin=280.0, tmax=560.0, temperature=None,
                  conditions="standard")  # fmt: skip
    answer = World(hf("g", 0.0), cp("g", 80.0, 200, 900), cp("l", 130.0, 320, 400), curve).h("l", 330.0)
    latent = 50000.0 * (1.0 - 320.0 / 560.0) ** 0.38
    assert answer.si == pytest.approx(80.0 * 21.85 - latent + 130.0 * 10.0)
    assert [s.what for s in answer.steps] == ["formation", "heating", "vaporisation", "heating"]


def test_watsons_equation_brings_a_latent_heat_to_the_liquid() -> None:
    """K. M. Watson (1943): ratio of the distances from Tc to the power 0.38, and a model part for the exponent."""
    latent = entry("Hvap", "l", 60000.0, conditions="standard")
    critical = entry("Tc", "l", 760.0, temperature=None)
    world = World(hf("g", 0.0), cp("g", 200.0, 200, 900), cp("l", 400.0, 330, 500), latent, critical)
    answer = world.h("l", 330.0)
    factor = ((760.0 - 330.0) / (760.0 - 298.15)) ** 0.38
    assert answer.si == pytest.approx(200.0 * 31.85 - 60000.0 * factor)
    (step,) = [s for s in answer.steps if s.what == "vaporisation"]
    assert "Watson" in step.note
    assert any(p.entry == "model:watson:unium oxide" and p.standard > 0 for p in answer.parts)
    near = World(hf("g", 0.0), cp("g", 200.0, 200, 900), cp("l", 400.0, 290, 500), latent, critical).h("l", 330.0)
    assert not any("Watson" in s.note for s in near.steps)
    with pytest.raises(TemperatureOutOfRange):
        World(hf("g", 0.0), cp("g", 200.0, 200, 900), cp("l", 400.0, 330, 500), latent).h("l", 330.0)


def test_without_critical_constants_the_vapour_is_taken_as_ideal_and_it_is_said() -> None:
    molecule = replace(OXIDE, composition=(("C", 1), ("O", 1)))
    real = entry("Hvap", "l", 33000.0, conditions="to the real vapour")
    answer = World(real, oxide=molecule).h("g", 298.15, "liquid")
    assert answer.si == 33000.0
    with pytest.raises(NotFound):
        World(real).h("g", 298.15, "liquid")  # a metal's compound may evaporate as other molecules
    assert "taken as ideal" in answer.steps[-1].note
    assert any(p.entry.startswith("model:residual") and p.standard == 500.0 for p in answer.parts)
    hot = entry("Hvap", "l", 25000.0, temperature=400.0, conditions="to the real vapour")
    with pytest.raises(NotFound):
        World(hf("l", 0.0), cp("l", 100.0, 290, 450), hot, oxide=molecule).h(
            "g", 400.0
        )  # above any boiling point that is known


def test_a_range_that_ends_beside_melting_reaches_it() -> None:
    entries = (
        hf("cr", 0.0),
        cp("cr", 50.0, 200, 490),
        cp("l", 70.0, 491, 800),
        entry("Hfus", "cr", 9000.0, temperature=493.0),
    )
    answer = World(*entries).h("l", 600.0)
    assert answer.si == pytest.approx(50.0 * (493.0 - 298.15) + 9000.0 + 70.0 * 107.0)
    assert any("taken to the phase change" in s.note for s in answer.steps)
    far = replace(entries[3], temperature=500.0)
    with pytest.raises(NoData):
        World(*entries[:3], far).h("l", 600.0)


def test_an_answer_says_when_others_contradict_it() -> None:
    plain = World(hf("g", -600000.0), hf("g", -601000.0, source="fair")).h("g", 298.15)
    assert not plain.warnings
    answer = World(hf("g", -600000.0), hf("g", -633000.0, source="fair")).h("g", 298.15)
    (said,) = answer.warnings
    assert "fair contradicts this answer" in said
    assert "-33" in said
    curves = (hf("g", 0.0), cp("g", 30.0, 200, 900), cp("g", 45.0, 200, 900, source="fair"))
    assert any("fair contradicts" in w for w in World(*curves).h("g", 800.0).warnings)


def test_what_carries_and_what_does_not() -> None:
    from propdb.levels.paths import carries

    whole = (
        hf("cr", 0.0),
        hf("g", 90000.0),
        cp("cr", 50.0, 200, 600),
        cp("l", 60.0, 500, 900),
        cp("g", 40.0, 200, 900),
    )
    melting = (entry("Hfus", "cr", 9000.0, temperature=500.0), entry("Tm", "cr", 500.0, temperature=None))
    path = ("cr", "l", "g")
    assert carries(World(*whole, *melting).levels(), "unium oxide", path)
    assert not carries(World(*whole).levels(), "unium oxide", path)
    table = {"T": [298.15, 550.0, 550.0, 900.0], "cp": [60.0, 60.0, 70.0, 70.0]}
    split = entry("Cp", "l", equation="table", params=table, tmin=298.15, tmax=900.0, temperature=None)
    cold = (hf("l", 5000.0), hf("g", 90000.0), cp("g", 40.0, 200, 900), split)
    hot = (*cold, entry("Tm", "cr", 600.0, temperature=None))
    assert carries(World(*cold).levels(), "unium oxide", ("l", "g"))
    assert not carries(World(*hot).levels(), "unium oxide", ("l", "g"))  # what is liquid lies beyond the split
    glass = entry("Htr", "l", 0.0, temperature=550.0, to="l")
    assert carries(World(*hot, glass).levels(), "unium oxide", ("l", "g"))


def test_a_reference_liquid_is_followed_at_one_bar_beyond_its_boiling_point() -> None:
    """The reference form of sulfur is the liquid at 1 bar up to 882 K; it boils at 718 K. No pressure belongs in it."""
    forms = parse_datums(
        {
            "elements": {
                "U": {
                    "forms": [
                        {"species": "unium oxide", "phase": "l", "until": "900K"},
                        {"species": "unium", "phase": "g"},
                    ]
                },
            },
            "datum": {
                "elements-same-T": {
                    "kind": "elements", "sentence": "x", "source": "common-practice", "temperature": "same",
                },
            },
        },
        where="the test",
    )  # fmt: skip

    class Forms(World):
        def datum(self, name: str) -> Datum:
            return forms.get(name) or DATUMS[name]

    critical = (entry("Tb", "l", 700.0), entry("Tc", "l", 1200.0), entry("Pc", "l", 1e7), entry("omega", "l", 0.2))
    entries = (hf("l", -5000.0), cp("l", 30.0, 200, 1100), *critical)
    state = State("l", 850.0)
    at_one_bar = sum(leg.value for leg in Forms(*entries).levels().level("unium oxide", state))
    along = sum(leg.value for leg in World(*entries).levels().level("unium oxide", state))
    assert at_one_bar == pytest.approx(-5000.0 + 30.0 * (850.0 - 298.15))
    assert along != pytest.approx(at_one_bar, abs=1.0)
