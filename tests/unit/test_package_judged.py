"""What the package's values are held against: paired tables, physical bounds, other sources. Numbers are invented."""

from __future__ import annotations

from dataclasses import replace

import pytest

from propdb.intake.package.contradictions import quarantine
from propdb.intake.package.enthalpies import contradiction, quarantine_enthalpies
from propdb.intake.package.plausible import implausible, quarantine_heat_capacities
from propdb.intake.package.transitions import glass_steps, melting_point, merged
from propdb.model.records import R_GAS, Entry, Species

# a crystal with a transition at 640 K that melts at 1073.8 K; its liquid leaves the crystal's values at 800 K
CRYSTAL = [(298.15, 50.0), (400.0, 52.0), (600.0, 56.0), (640.0, 57.0), (640.0, 60.0), (800.0, 60.0), (1000.0, 62.0),
           (1073.8, 63.0), (1100.0, 63.0)]  # fmt: skip
LIQUID = [(298.15, 50.0), (600.0, 56.0), (640.0, 57.0), (640.0, 60.0), (800.0, 60.0), (800.0, 76.0), (1000.0, 72.0),
          (1073.8, 70.0), (1200.0, 68.0)]  # fmt: skip


def test_the_melting_point_is_the_smooth_row_of_both_tables() -> None:
    assert melting_point(crystal=CRYSTAL, liquid=LIQUID) == 1073.8
    without = [point for point in LIQUID if point[0] != 1073.8]
    assert melting_point(crystal=CRYSTAL, liquid=without) == 1073.8
    assert melting_point(crystal=[p for p in CRYSTAL if p[0] != 1073.8], liquid=without) is None
    both = [*LIQUID, (1250.5, 68.0), (1300.0, 68.0)]
    assert melting_point(crystal=[*CRYSTAL, (1250.5, 63.0), (1300.0, 63.0)], liquid=both) is None
    round_one = [(900.0, 5.0), (1000.0, 5.0), (1000.0, 5.0), (1100.0, 5.0)]
    assert melting_point(crystal=round_one, liquid=round_one) == 1000.0


def test_a_glass_step_leaves_a_crystal_that_has_none() -> None:
    assert glass_steps(crystal=CRYSTAL, liquid=LIQUID, melting=1073.8) == [800.0]  # 640 K is the crystal's own
    other = [(t, cp * 1.05 if t <= 800.0 else cp) for t, cp in LIQUID]
    assert glass_steps(crystal=CRYSTAL, liquid=other, melting=1073.8) == []
    assert glass_steps(crystal=CRYSTAL, liquid=LIQUID, melting=700.0) == []


def test_a_row_printed_twice_with_one_value_is_no_split() -> None:
    doubled = [(900.0, 5.0), (1000.0, 6.0), (1000.0, 6.0), (1100.0, 7.0), (1100.0, 8.0)]
    assert merged(doubled, at=None) == [(900.0, 5.0), (1000.0, 6.0), (1100.0, 7.0), (1100.0, 8.0)]
    assert merged(doubled, at=1000.0) == merged(doubled, at=None)
    assert merged(doubled, at=1200.0) == doubled


# -- heat capacities ---------------------------------------------------------------------------------------------------


def _entry(quantity: str = "Cp", phase: str = "l", **fields: object) -> Entry:
    common: dict[str, object] = dict.fromkeys(Entry.__dataclass_fields__, "")
    common |= {
        "id": "0", "quantity": quantity, "phase": phase, "species": "a", "source": "file", "unit": "J/mol/K",
        "temperature": None, "value": None, "tmin": None, "tmax": None, "uncertainty": None, "params": {},
        "printed": False, "status": "base", "carriers": (), "crosschecks": (),
    }  # fmt: skip
    return Entry(**(common | fields))  # type: ignore[arg-type]


def _line(phase: str, cold: float, slope: float, low: float = 298.15, high: float = 500.0, **more: object) -> Entry:
    params = {"exponents": [0, 1], "coefficients": [cold - slope * low, slope], "tmin": low, "tmax": high}
    return _entry("Cp", phase, equation="polynomial", params=params, tmin=low, tmax=high, **more)


@pytest.mark.parametrize(
    ("phase", "cold", "slope", "atoms", "word"),
    [
        ("l", 180.0, 0.3, 18, ""),
        ("l", 180.0, -1.0, 18, "no heat capacity"),  # negative at the warm end
        ("l", 2500.0, 0.3, 18, "too much"),
        ("l", 2.5, 0.02, 18, "too little"),
        ("cr", 50.0, 0.02, 2, ""),
        ("cr", 115.0, 0.02, 3, "of another formula unit"),
        ("cr", 40.0, 0.02, 1, ""),  # an element may have a magnetic transition
        ("g", 2.5 * R_GAS, 0.0, 1, ""),
        ("g", 20.0, 0.0, 1, "at least 5/2 R"),
        ("g", 100.0, 1.0, 17, ""),
        ("g", 100.0, 6.0, 17, "more than 17 atoms"),
    ],
)
def test_bounds_of_a_heat_capacity(phase: str, cold: float, slope: float, atoms: float, word: str) -> None:
    found = implausible(_line(phase, cold, slope), atoms=atoms)
    assert word in found
    assert bool(found) == bool(word)


def test_near_its_critical_point_a_liquid_has_no_upper_bound() -> None:
    near = _line("l", 3500.0, 1.0, low=600.0, high=640.0)
    assert implausible(near, atoms=3)
    assert not implausible(near, atoms=3, critical=647.0)


def test_two_that_agree_outvote_a_third() -> None:
    species = [Species("a", "C4H10O2", 0, (("C", 4), ("H", 10), ("O", 2)), 0.09)]
    constant = _entry(value=193.0, temperature=298.15, source="handbook")
    entries = [_line("l", 480.0, 2.0), _line("l", 194.0, 0.2), constant]
    assert quarantine_heat_capacities(entries, species) == 1
    assert [e.status for e in entries] == ["quarantined", "base", "base"]
    assert "handbook" in entries[0].note or "file" in entries[0].note
    two = [_line("l", 300.0, 0.2), _line("l", 194.0, 0.2)]
    assert quarantine_heat_capacities(two, species) == 0


def test_a_crystal_of_another_formula_unit_takes_its_liquid_along() -> None:
    species = [Species("a", "VO2", 0, (("V", 1), ("O", 2)), 0.083)]
    table = {"T": [298.15, 500.0], "cp": [115.0, 130.0]}
    crystal = _entry("Cp", "cr", equation="table", params=table, tmin=298.15, tmax=500.0)
    liquid = _entry("Hf", "l", value=-1332000.0, temperature=298.15)
    gas = _entry("Hf", "g", value=-232000.0, temperature=298.15)
    entries = [crystal, liquid, gas, replace(liquid, source="another")]
    assert quarantine_heat_capacities(entries, species) == 2
    assert [e.status for e in entries] == ["quarantined", "quarantined", "base", "base"]


# -- critical and melting points, formation enthalpies -----------------------------------------------------------------


def test_a_critical_temperature_lies_above_the_boiling_point() -> None:
    boiling = _entry("Tb", "l", value=613.0)
    entries = [_entry("Tc", "l", value=0.869), _entry("Tc", "l", value=869.0)]
    assert quarantine(entries, [boiling]) == 1
    assert [e.status for e in entries] == ["quarantined", "base"]
    assert "boils at 613 K" in entries[0].note


def test_a_melting_point_far_from_the_typed_one_is_another_species() -> None:
    entries = [_entry("Tm", "cr", value=187.6), _entry("Tm", "cr", value=380.0)]
    assert quarantine(entries, [_entry("Tm", "cr", value=388.4)]) == 1
    assert [e.status for e in entries] == ["quarantined", "base"]
    assert quarantine([_entry("Tm", "cr", value=187.6)], []) == 0


@pytest.mark.parametrize(
    ("value", "source", "others", "strong", "word"),
    [
        (804.2, "chase-1998", [("nbs-1982", -804.2), ("crc-95", -804.2)], (), "sign"),
        (109.8, "albahri-2013", [("crc-95", -110.0)], (), ""),  # one handbook alone decides nothing
        (-207.4, "crc-95", [("atct-1.112", 207.5)], (), "sign"),
        (207.5, "atct-1.112", [("crc-95", -207.4)], (), ""),
        (101.3, "atct-1.112", [("crc-95", 134.3), ("albahri-2013", 130.8)], (), ""),  # older tables copy one another
        (101.3, "atct-1.112", [("crc-95", 134.3), ("crc-95 (cycle)", 135.0)], ("crc-95 (cycle)",), "contradicted"),
        (323.9, "albahri-2013", [("crc-95", 96.8), ("pedley-1986", 96.7)], (), "contradicted"),
        (110.0, "albahri-2013", [("crc-95", 96.8), ("pedley-1986", 96.7)], (), ""),  # not grossly off
        (323.9, "albahri-2013", [("crc-95", 96.8), ("pedley-1986", 60.0)], (), ""),  # they do not agree
    ],
)
def test_who_convicts_a_formation_enthalpy(
    value: float, source: str, others: list[tuple[str, float]], strong: tuple[str, ...], word: str
) -> None:
    entry = _entry("Hf", "g", value=value * 1e3, temperature=298.15, source=source)
    found = contradiction(entry, [(name, other * 1e3) for name, other in others], strong=strong)
    assert word in found
    assert bool(found) == bool(word)


def test_a_cycle_through_the_liquid_is_a_witness_unless_its_source_denies_it() -> None:
    def hf(phase: str, value: float, source: str) -> Entry:
        return _entry("Hf", phase, value=value * 1e3, temperature=298.15, source=source)

    latent = _entry("Hvap", "l", value=41e3, temperature=298.15, source="file", conditions="to the real vapour")
    wrong, liquid, gas = hf("g", 109.8, "albahri-2013"), hf("l", -151.3, "crc-95"), hf("g", -110.0, "crc-95")
    entries = [latent, wrong, liquid, gas]
    assert quarantine_enthalpies(entries, []) == 1
    assert entries[1].status == "quarantined"
    latent = replace(latent, value=14e3)
    molecules = [latent, hf("l", 0.6, "chase-1998"), hf("g", 316.4, "chase-1998"), hf("g", 316.5, "b")]
    assert quarantine_enthalpies(molecules, []) == 0  # the vapour is of larger molecules than the gas
