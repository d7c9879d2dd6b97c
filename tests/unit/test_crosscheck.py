"""The cross-check on its own: lineage, what may be compared with what, how far apart is too far, and the verdict."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest
from store_samples import BOOK, ETHANOL, REPORT, WATER, entry

from propdb.model.crosscheck import Crosscheck, EntryCheck, difference_text, telling
from propdb.model.records import Entry, Source, Species
from propdb.store.content import Content, with_id
from propdb.vetting.crosscheck import ELECTRON, Checker, against_text, disputing, settle
from propdb.vetting.functions import heat_capacities, latent_heats, same_formula
from propdb.vetting.library import library
from propdb.vetting.lineage import Lineage

LINEAGE: dict[str, Any] = {
    "compilation": [
        {"key": "atct-1.112", "title": "A network", "decides": True, "reason": "measured"},
        {
            "key": "crc-95",
            "title": "A handbook",
            "decides": True,
            "reason": "read",
            "copies": [{"of": "codata-1989", "evidence": "equal"}, {"of": "chase-1998", "evidence": "many equal"}],
        },
        {
            "key": "chase-1998",
            "title": "Tables",
            "decides": True,
            "reason": "evaluated",
            "copies": [{"of": "codata-1989", "evidence": "atoms"}],
        },
        {"key": "trc-1994", "title": "Gases", "decides": True, "reason": "evaluated"},
        {"key": "perry-8", "title": "Liquids", "decides": True, "reason": "evaluated"},
        {"key": "vdi-2010", "title": "Heat atlas", "decides": True, "reason": "fitted"},
        {"key": "gharagheizi-2013", "title": "Appendix", "decides": True, "reason": "collected"},
        {"key": "yaws-2014", "title": "Estimates too", "decides": False, "reason": "mixed"},
    ],
    "copies": [{"source": "report-2010", "of": "chase-1998", "evidence": "a refit"}],
    "limit": [
        {"quantities": ["Hf"], "standard": 2000.0, "reason": "2 kJ/mol"},
        {"quantities": ["Hvap"], "standard": 2000.0, "percent": 3.0, "reason": "the smaller"},
        {"quantities": ["Cp", "S"], "percent": 1.0, "reason": "1 %"},
        {"quantities": ["Tb"], "standard": 1.0, "reason": "1 K"},
    ],
    "form": [{"species": "carbon", "form": "diamond", "cas": "7782-40-3"}],
}
METHANE = Species("methane", "CH4", 0, (("C", 1), ("H", 4)), 0.016, "74-82-8")
ACETIC = Species("acetic acid", "C2H4O2", 0, (("C", 2), ("H", 4), ("O", 2)), 0.06, "64-19-7", vapour="associating")
ARGON_ION = Species("argon ion", "Ar", 1, (("Ar", 1),), 0.04, "14791-69-6")
NITRIDE = Species("nitric oxide anion", "NO", -1, (("N", 1), ("O", 1)), 0.03, "14967-78-3")
CARBON = Species("carbon", "C", 0, (("C", 1),), 0.012, "7440-44-0")


@pytest.fixture(scope="module")
def checker() -> Checker:
    return Checker(LINEAGE, [BOOK, REPORT])


def plain(species: Species, quantity: str = "Hf", value: float | None = -74_600.0, **fields: Any) -> Entry:
    """An entry of book-2001 without uncertainty."""
    return entry(species, quantity, value, **({"uncertainty": None, "uncertainty_kind": ""} | fields))


def by(checks: tuple[Crosscheck, ...], compilation: str) -> list[Crosscheck]:
    return [check for check in checks if check.compilation == compilation]


# -- lineage --------------------------------------------------------------------------------------------------------


def test_independent_means_no_common_ancestor() -> None:
    lineage = Lineage(LINEAGE, [BOOK, REPORT])
    assert lineage.ancestors("crc-95") == {"crc-95", "codata-1989", "chase-1998"}
    assert not lineage.independent("crc-95", "codata-1989")  # copies it
    assert not lineage.independent("codata-1989", "crc-95")
    assert not lineage.independent("report-2010", "crc-95")  # both go back to chase-1998
    assert not lineage.independent("trc-1994", "trc-1994")
    assert lineage.independent("crc-95", "trc-1994")
    assert lineage.independent("nobody-knows-it", "crc-95")


def test_a_source_brings_its_own_lineage() -> None:
    lineage = Lineage({}, [BOOK, replace(REPORT, lineage=(("older-1990", "so does this"),))])
    assert not lineage.independent("book-2001", "report-2010")
    assert lineage.copied_by("older-1990") == ("book-2001", "report-2010")


def test_the_chain_is_a_tree_and_a_circle_ends() -> None:
    lineage = Lineage(LINEAGE, [])
    codata, chase = lineage.chain("crc-95")
    assert (codata.key, codata.evidence, codata.copies) == ("codata-1989", "equal", ())
    assert [further.key for further in chase.copies] == ["codata-1989"]
    ring = [Source(k, k, (), 2000, "book", "handbook", "", lineage=((o, "x"),)) for k, o in (("a", "b"), ("b", "a"))]
    assert [one.key for one in Lineage({}, ring).chain("a")] == ["b"]
    assert Lineage({}, ring).ancestors("a") == {"a", "b"}


def test_a_compilation_that_is_no_source_has_a_record() -> None:
    lineage = Lineage(LINEAGE, [replace(REPORT, key="chase-1998")])
    found = lineage.compilation("trc-1994")
    assert found is not None
    assert (found.title, found.note) == ("Gases", "evaluated")
    assert lineage.compilation("chase-1998") is None  # it is one of the sources
    assert lineage.compilation("nobody-knows-it") is None


# -- what is compared with what -------------------------------------------------------------------------------------


def test_a_constant_is_compared_with_each_compilation(checker: Checker) -> None:
    checks = checker(plain(METHANE), METHANE)
    assert {c.compilation for c in checks} == {"atct-1.112", "chase-1998", "crc-95", "albahri-2013", "yaws-2014"}
    (network,) = by(checks, "atct-1.112")
    assert (network.value, network.difference, network.temperature) == (-74_534.0, -66.0, 298.15)
    assert network.independent
    assert network.package.startswith("chemicals ")
    (mixed,) = by(checks, "yaws-2014")
    assert mixed.allowed is None  # shown, and decides nothing
    assert not mixed.beyond


def test_independence_is_that_of_the_source(checker: Checker) -> None:
    fit = with_id(replace(plain(METHANE), source="report-2010"), METHANE)
    relations = {c.compilation: c.relation("report-2010") for c in checker(fit, METHANE)}
    assert relations["chase-1998"] == relations["crc-95"] == "same chain"
    assert relations["atct-1.112"] == "independent"
    copy = with_id(replace(plain(METHANE), source="crc-95"), METHANE)
    assert {c.relation("crc-95") for c in by(checker(copy, METHANE), "crc-95")} == {"same publication"}


def test_the_mislabelled_zero_of_the_gas_tables_is_left_out(checker: Checker) -> None:
    """TRC's column "Hfg" is at 0 K for most rows; only its heat capacities are used."""
    for species in (METHANE, ETHANOL):
        assert not by(checker(plain(species), species), "trc-1994")
    assert "trc-1994" in {f.compilation for f in heat_capacities(library(), METHANE, phase="g", form="", cas="74-82-8")}


def test_only_the_phases_that_a_compilation_means(checker: Checker) -> None:
    """VDI's saturation tables hold real-vapour heat capacities: no gas of it."""
    found = {f.compilation for f in heat_capacities(library(), WATER, phase="g", form="", cas=WATER.cas)}
    assert found == {"trc-1994", "poling-2001", "chase-1998"}
    assert not checker(plain(WATER, phase="fluid"), WATER)
    assert not checker(plain(WATER), replace(WATER, kind="pseudo"))
    assert not checker(plain(WATER), replace(WATER, cas=""))


def test_another_datum_is_not_compared(checker: Checker) -> None:
    assert not checker(plain(METHANE, datum="combustion-net-25C"), METHANE)
    assert checker(plain(METHANE, datum="elements-298K-1atm"), METHANE)


def test_another_species_under_the_number_is_not_compared(checker: Checker) -> None:
    """The library's JANAF row of 14967-78-3 (NO-) holds NO+."""
    assert not by(checker(plain(NITRIDE), NITRIDE), "chase-1998")
    assert by(checker(plain(NITRIDE), NITRIDE), "atct-1.112")
    assert same_formula("H2CO (g)", replace(METHANE, formula="CH2O"))
    assert not same_formula("NO+", NITRIDE)
    assert same_formula("what is this?", METHANE)


def test_ions_are_brought_to_one_convention_of_the_electron(checker: Checker) -> None:
    """ATcT has the electron at rest; JANAF, as entries do, as an ideal gas (H(298.15) - H(0) = 6.197 kJ/mol).

    The ionisation energy of argon is one number to both, so Ar+ must agree to the last digits once the electron counts.
    """
    checks = checker(plain(ARGON_ION, value=0.0), ARGON_ION)
    (network,) = by(checks, "atct-1.112")
    (tables,) = by(checks, "chase-1998")
    assert network.value == pytest.approx(tables.value, abs=5.0)
    assert abs(network.value - ELECTRON - tables.value) > 6000.0


def test_a_form_has_a_number_of_its_own(checker: Checker) -> None:
    diamond = plain(CARBON, value=1895.0, phase="cr", form="diamond")
    (handbook,) = by(checker(diamond, CARBON), "crc-95")
    assert handbook.value == 1900.0


def test_which_vapour_an_acid_evaporates_to(checker: Checker) -> None:
    """Acetic acid: 23 kJ/mol to the real vapour, 51 to the monomer."""
    real = plain(ACETIC, "Hvap", 23_360.0, phase="l", datum="", conditions="to the real vapour")
    single = plain(ACETIC, "Hvap", 51_600.0, phase="l", datum="", conditions="to the monomer ideal gas")
    against_real = {c.compilation: c.value for c in checker(real, ACETIC)}
    assert set(against_real) == {"crc-95", "perry-8", "vdi-2010"}
    assert all(value < 26_000.0 for value in against_real.values())
    against_single = {c.compilation: c.value for c in checker(single, ACETIC)}
    assert set(against_single) == {"gharagheizi-2013"}
    assert against_single["gharagheizi-2013"] > 50_000.0


def test_a_boiling_point_of_another_table_is_still_the_same_state(checker: Checker) -> None:
    at = plain(ETHANOL, "Hvap", 38_560.0, phase="l", datum="", temperature=351.2, conditions="to the real vapour")
    assert by(checker(at, ETHANOL), "crc-95")[0].temperature == 351.2
    far = replace(at, temperature=340.0, id="")
    assert not by(checker(far, ETHANOL), "crc-95")


# -- equations ------------------------------------------------------------------------------------------------------


def cp(value: float = 35.69, tmin: float = 200.0, tmax: float = 6000.0, **fields: Any) -> Entry:
    params = {"value": value, "tmin": tmin, "tmax": tmax}
    limits: dict[str, Any] = {"tmin": tmin, "tmax": tmax, "temperature": None, "datum": "", "unit": "J/mol/K"}
    return plain(METHANE, "Cp", None, equation="constant", params=params, **(limits | fields))


def test_an_equation_is_compared_at_298_and_both_ends(checker: Checker) -> None:
    checks = checker(cp(), METHANE)
    assert sorted(c.temperature or 0 for c in by(checks, "trc-1994")) == [200.0, 298.15, 5000.0]
    assert sorted(c.temperature or 0 for c in by(checks, "chase-1998")) == [200.0, 298.15, 6000.0]  # printed ones
    assert sorted(c.temperature or 0 for c in by(checks, "crc-95")) == [298.15]
    # NIST-JANAF Thermochemical Tables, 4th ed., CH4 (g): 35.639 J/mol/K at 298.15 K, 71.795 at 1000 K
    at_298 = next(c for c in by(checks, "chase-1998") if c.temperature == 298.15)
    assert at_298.value == pytest.approx(35.639, abs=5e-4)
    (function,) = (
        f
        for f in heat_capacities(library(), METHANE, phase="g", form="", cas=METHANE.cas)
        if f.compilation == "chase-1998"
    )
    assert function.at(1000.0) == pytest.approx(71.795, abs=5e-4)


def test_a_range_apart_from_298_is_compared_where_both_hold(checker: Checker) -> None:
    found = by(checker(cp(tmin=1000.0, tmax=1500.0), METHANE), "trc-1994")
    assert [c.temperature for c in found] == [1000.0, 1500.0]
    assert not by(checker(cp(tmin=1000.0, tmax=1500.0), METHANE), "crc-95")


def test_the_value_at_zero_of_a_table_is_no_heat_capacity() -> None:
    for function in heat_capacities(library(), METHANE, phase="g", form="", cas=METHANE.cas):
        assert function.tmin > 0.0
        assert function.at(max(function.tmin, 100.0)) > 30.0


def test_heating_is_compared_over_the_way_itself(checker: Checker) -> None:
    checks = checker.heating(cp(), METHANE, 298.15, 1000.0)
    assert {c.compilation for c in checks} == {"trc-1994", "poling-2001", "chase-1998"}
    (tables,) = by(checks, "chase-1998")
    # NIST-JANAF Thermochemical Tables, 4th ed., CH4 (g): H(1000 K) - H(298.15 K) = 38.179 kJ/mol
    assert tables.value == pytest.approx(38_179.0, abs=15.0)
    assert tables.difference == pytest.approx(35.69 * 701.85 - tables.value)
    back = checker.heating(cp(), METHANE, 1000.0, 298.15)
    assert by(back, "chase-1998")[0].value == pytest.approx(-tables.value)
    assert by(back, "chase-1998")[0].allowed == tables.allowed
    assert checker.heating(plain(METHANE), METHANE, 298.15, 1000.0) == ()


def test_latent_heats_of_water() -> None:
    """44.0 kJ/mol at 298.15 K (CODATA: 285.830 - 241.826) within 1 %, at the true vapour 0.02 less."""
    found = {f.compilation: f.at(298.15) for f in latent_heats(library(), cas=WATER.cas)}
    assert set(found) == {"perry-8", "vdi-2010"}
    assert all(value == pytest.approx(44_004.0, rel=0.01) for value in found.values())
    later = {f.compilation: f for f in tuple(latent_heats(library(), cas="67-64-1"))}  # each keeps its own Tc
    at_once = {f.compilation: f.at(300.0) for f in latent_heats(library(), cas="67-64-1")}
    assert {key: f.at(300.0) for key, f in later.items()} == at_once


# -- how far apart is too far ---------------------------------------------------------------------------------------


def test_two_stated_uncertainties_add(checker: Checker) -> None:
    stated = entry(METHANE, "Hf", -74_000.0, uncertainty=400.0, uncertainty_kind="expanded-95")
    (network,) = by(checker(stated, METHANE), "atct-1.112")
    assert network.allowed is not None
    assert 400.0 < network.allowed < 600.0  # ATcT 1.112 states 0.06 kJ/mol
    assert network.beyond
    single = with_id(replace(stated, uncertainty=200.0, uncertainty_kind="standard"), METHANE)
    assert by(checker(single, METHANE), "atct-1.112")[0].allowed == pytest.approx(network.allowed)


def test_where_one_states_none_the_limit_or_the_larger_one_holds(checker: Checker) -> None:
    def allowed(one: Entry, compilation: str = "crc-95") -> float | None:
        return by(checker(one, METHANE), compilation)[0].allowed

    assert allowed(plain(METHANE)) == 2000.0
    assert allowed(entry(METHANE, "Hf", -74_000.0, uncertainty=400.0)) == 2000.0
    assert allowed(entry(METHANE, "Hf", -74_000.0, uncertainty=9000.0)) == 9000.0
    fraction = cp(uncertainty=0.03, uncertainty_unit="%", uncertainty_kind="expanded-95")
    assert allowed(fraction) == pytest.approx(0.03 * 35.69)
    assert allowed(cp()) == pytest.approx(0.01 * 35.69)
    heat = plain(ETHANOL, "Hvap", 42_300.0, phase="l", datum="", conditions="to the real vapour")
    assert by(checker(heat, ETHANOL), "crc-95")[0].allowed == pytest.approx(0.03 * 42_300.0)


def test_the_same_publication_may_differ_by_its_last_digit_only(checker: Checker) -> None:
    copy = with_id(replace(plain(METHANE, value=-74_700.0), source="crc-95"), METHANE)
    (same,) = by(checker(copy, METHANE), "crc-95")
    assert same.difference == -100.0
    assert same.beyond
    right = with_id(replace(plain(METHANE, value=-74_600.0), source="crc-95"), METHANE)
    assert not by(checker(right, METHANE), "crc-95")[0].beyond


# -- verdict --------------------------------------------------------------------------------------------------------


def check(compilation: str, difference: float, allowed: float | None = 10.0, independent: bool = True) -> Crosscheck:
    return Crosscheck(compilation, 298.15, 100.0, difference, allowed, independent, "nothing 0")


def test_independent_compilations_decide_before_those_of_the_chain() -> None:
    one = plain(METHANE)
    assert disputing(one, []) == ()
    assert disputing(one, [check("a", 10.0)]) == ()
    assert [c.compilation for c in disputing(one, [check("a", 10.1)])] == ["a"]
    far_copy = check("b", 50.0, independent=False)
    assert disputing(one, [check("a", 0.0), far_copy]) == ()
    assert disputing(one, [far_copy]) == (far_copy,)  # nothing else there: a slip, or another edition
    assert disputing(one, [check("a", 50.0, None)]) == ()  # shown only
    own = replace(far_copy, compilation=one.source)
    assert disputing(one, [check("a", 0.0), own]) == (own,)  # the same publication, copied wrongly


def test_of_each_compilation_the_worst() -> None:
    worst = replace(check("a", -40.0), temperature=1000.0)
    assert disputing(plain(METHANE), [check("a", 20.0), worst, check("b", -11.0)]) == (worst, check("b", -11.0))


def content(*entries: Entry) -> Content:
    return Content(species=[METHANE], sources=[BOOK], policy={"lineage": LINEAGE}, entries=entries)


def test_settling_gives_the_status_and_the_numbers(checker: Checker) -> None:
    wrong_sign = with_id(replace(plain(METHANE, value=74_600.0), note="verdict: the sign"), METHANE)
    right = plain(METHANE)
    estimate = with_id(replace(plain(METHANE, value=99_000.0), status="estimate"), METHANE)
    settled = settle(content(wrong_sign, right, estimate), checker)
    assert settled.statuses == {wrong_sign.id: "disputed"}
    note = settled.notes[wrong_sign.id]
    assert note.startswith("atct-1.112 has -74.534 kJ/mol, here 74.600; chase-1998 has -74.873 kJ/mol, here 74.600; ")
    assert note.endswith("; verdict: the sign")
    assert estimate.id not in settled.notes


def test_the_numbers_of_a_heat_capacity_come_with_their_temperature(checker: Checker) -> None:
    one = cp(40.0)
    (against, *_) = (c for c in disputing(one, checker(one, METHANE)) if c.compilation == "trc-1994")
    assert against_text(one, against) == "trc-1994 has 119.5 J/mol/K at 5000 K, here 40.00"


def test_a_dispute_by_comparison_keeps_its_place_and_a_persons_does_not() -> None:
    base, disputed = plain(METHANE), replace(plain(METHANE), status="disputed")
    assert disputed.place == base.place
    by_a_person = replace(disputed, decided=True)
    estimate = replace(base, status="estimate")
    assert replace(base, status="checked").place < base.place < by_a_person.place < estimate.place


# -- what is shown --------------------------------------------------------------------------------------------------


def test_the_telling_check_is_independent_and_the_worst_of_them() -> None:
    assert telling([]) is None
    assert telling([check("a", 1.0, None)]) is None
    near, far = check("a", 1.0), check("b", -5.0)
    assert telling([near, far, check("c", 90.0, independent=False)]) == far
    assert telling([check("c", 90.0, independent=False)]) == check("c", 90.0, independent=False)


def test_differences_as_people_read_them() -> None:
    assert difference_text(check("a", 380.0), "J/mol") == "+0.38 kJ/mol"
    assert difference_text(check("a", -1.5), "J/mol/K") == "-1.50 %"
    assert difference_text(check("a", -2.0), "K") == "-2.00 K"
    assert EntryCheck(cp(), check("a", 1.0), start=298.15).unit == "J/mol"
