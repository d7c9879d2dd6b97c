"""Fuels: bases, gross and net, constant volume and pressure; and what is refused, with its place."""

from __future__ import annotations

from typing import Any

import pytest
from fuel_samples import FUELS, VAPORISATION, WEIGHTS, fuel, sample
from hypothesis import given
from hypothesis import strategies as st

from propdb.errors import InvalidInput
from propdb.intake.files import UserFile
from propdb.intake.fuel import GivenFuel, entry_of, read_fuel, species_of
from propdb.intake.fuelfile import TEMPLATE, parse_fuel_file, read_basis
from propdb.model.formula import hill, parse_formula
from propdb.model.fuel import BASES, KINDS, PLACES, Analysis, Fuel, estimate, gross_of

RT = 8.31446261815324 * 298.15


def read(data: dict[str, Any]) -> GivenFuel:
    return read_fuel(data, where="fuel.toml", weights=WEIGHTS, vaporisation=VAPORISATION)


def analysis(*, ash: float | None = 0.1, moisture: dict[str, float] | None = None, **elements: float) -> Analysis:
    return Analysis(elements, ash, {"as-received": 0.2} if moisture is None else moisture, WEIGHTS)


# -- bases ------------------------------------------------------------------------------------------------------------


def test_bases_by_hand() -> None:
    """ISO 1170: dry ash-free carbon of 80 % is 72 % dry with 10 % ash, 57.6 % as received with 20 % moisture."""
    coal = analysis(C=0.80, H=0.05, O=0.15)
    assert coal.fractions("dry-ash-free")["C"] == pytest.approx(0.80)
    assert coal.fractions("dry") == pytest.approx(
        {"C": 0.72, "H": 0.045, "N": 0.0, "S": 0.0, "O": 0.135, "Cl": 0.0, "ash": 0.10, "moisture": 0.0}
    )
    assert coal.fractions("as-received") == pytest.approx(
        {"C": 0.576, "H": 0.036, "N": 0.0, "S": 0.0, "O": 0.108, "Cl": 0.0, "ash": 0.08, "moisture": 0.20}
    )
    for basis in coal.bases():
        assert sum(coal.fractions(basis).values()) == pytest.approx(1.0)


def test_what_is_not_known_leaves_bases_out() -> None:
    assert analysis(C=1.0).bases() == ("as-received", "dry", "dry-ash-free")
    assert analysis(C=1.0, moisture={}).bases() == ("dry", "dry-ash-free")
    assert analysis(C=1.0, ash=None).bases() == ("dry-ash-free",)
    with pytest.raises(InvalidInput, match=r"moisture is missing: air dried needs it; give \[moisture\] air-dried"):
        analysis(C=1.0).dry_ash_free("air-dried")
    with pytest.raises(InvalidInput, match="ash is missing: dry needs it"):
        analysis(C=1.0, ash=None).dry_ash_free("dry")


@pytest.mark.parametrize(("name", "basis"), [(n, b) for n in FUELS for b in read(fuel(n)).fuel.analysis.bases()])
def test_an_analysis_says_the_same_whatever_basis_it_is_given_on(name: str, basis: str) -> None:
    first = read(fuel(name)).fuel.analysis
    parts = {part: repr(100 * share) for part, share in first.fractions(basis).items() if share}
    moisture = {key: repr(100 * share) for key, share in first.moisture.items()}
    data = {**fuel(name), "analysis": {"basis": basis, **parts}, "moisture": moisture}
    data["ash"] = {"dry": repr(100 * (first.ash or 0.0))} if basis == "dry-ash-free" else {}
    again = read(data).fuel.analysis
    assert again.ash == pytest.approx(first.ash, abs=1e-9)
    # what rounding left over stays out of the dry ash-free basis in one way or another
    for element, share in first.elements.items():
        assert again.elements[element] == pytest.approx(share, rel=2e-3)


# -- calorific values -------------------------------------------------------------------------------------------------


def test_offsets_by_hand() -> None:
    """Pure elements, dry: hydrogen takes 1/4 mol of gas away an atom, oxygen and nitrogen leave 1/2."""
    bare = {"ash": 0.0, "moisture": {}}
    for atoms, gas in (
        ({"C": 1.0}, 0.0),
        ({"C": 0.9, "H": 0.1}, -0.25 * 0.1 / WEIGHTS["H"]),
        ({"C": 0.9, "O": 0.1}, 0.5 * 0.1 / WEIGHTS["O"]),
        ({"C": 0.9, "N": 0.1}, 0.5 * 0.1 / WEIGHTS["N"]),
        ({"C": 0.9, "S": 0.1}, 0.0),
    ):
        one = analysis(**bare, **atoms)  # type: ignore[arg-type]
        assert one.offset("gross", "constant pressure", "dry", vaporisation=VAPORISATION) == 0.0
        found = one.offset("gross", "constant volume", "dry", vaporisation=VAPORISATION)
        assert found == pytest.approx(RT * gas, abs=1e-6)
    wet = analysis(C=0.9, H=0.1, ash=0.0, moisture={"as-received": 0.5})
    water = 0.05 / WEIGHTS["H"] / 2 + 0.5 / (2 * WEIGHTS["H"] + WEIGHTS["O"])
    found = wet.offset("net", "constant pressure", "as-received", vaporisation=VAPORISATION)
    assert found == pytest.approx(-VAPORISATION * water)


def test_chlorine_takes_its_hydrogen_away_from_the_water() -> None:
    """C2H3Cl + 5/2 O2 -> 2 CO2 + H2O + HCl: one mole of water, and half a mole more gas with liquid water."""
    mass = 2 * WEIGHTS["C"] + 3 * WEIGHTS["H"] + WEIGHTS["Cl"]
    atoms = {e: n * WEIGHTS[e] / mass for e, n in (("C", 2), ("H", 3), ("Cl", 1))}
    one = analysis(ash=0.0, moisture={}, **atoms)
    net = one.offset("net", "constant pressure", "dry", vaporisation=VAPORISATION)
    assert net * mass == pytest.approx(-VAPORISATION)
    assert one.offset("gross", "constant volume", "dry", vaporisation=VAPORISATION) * mass == pytest.approx(0.5 * RT)
    with pytest.raises(InvalidInput, match="more atoms of chlorine than of hydrogen"):
        analysis(C=0.3, H=0.01, Cl=0.69).offset("gross", "constant volume", "dry", vaporisation=VAPORISATION)


shares = st.floats(0.01, 0.9)


@given(
    value=st.floats(1e6, 5e7),
    hydrogen=shares,
    ash=st.floats(0.0, 0.8),
    moisture=st.floats(0.0, 0.8),
    kind=st.sampled_from(KINDS),
    at=st.sampled_from(PLACES),
    basis=st.sampled_from(["as-received", "dry", "dry-ash-free"]),
)
def test_a_value_comes_back(
    value: float, hydrogen: float, ash: float, moisture: float, kind: str, at: str, basis: str
) -> None:
    one = Analysis({"C": 1 - hydrogen, "H": hydrogen}, ash, {"as-received": moisture}, WEIGHTS)
    gross = gross_of(value, kind, at, basis, analysis=one, vaporisation=VAPORISATION)
    back = Fuel("any", "cr", one, gross, VAPORISATION).calorific_value(kind, at, basis)
    assert back == pytest.approx(value, rel=1e-9, abs=1e-3)


@pytest.mark.parametrize("name", FUELS)
def test_the_value_given_comes_back_and_orders_hold(name: str) -> None:
    found = read(fuel(name))
    table = FUELS[name].get("calorific-value", sample()["calorific-value"])
    back = found.fuel.calorific_value(table["kind"], table["at"], table["basis"])
    number, unit = table["value"].split()
    assert back == pytest.approx(float(number) * {"MJ/kg": 1e6, "kcal_IT/kg": 4186.8}[unit])
    for basis in found.fuel.analysis.bases():
        gross = found.fuel.calorific_value("gross", "constant pressure", basis)
        assert gross > found.fuel.calorific_value("net", "constant pressure", basis)


def test_estimate_by_hand() -> None:
    # Channiwala, Parikh (2002): carbon alone 34.91, and 0.3491*50 + 1.1783*6 - 0.1034*44 MJ/kg
    assert estimate({"C": 1.0}) == pytest.approx(34.91e6)
    assert estimate({"C": 0.5, "H": 0.06, "O": 0.44}) == pytest.approx(19.9752e6)


# -- species and entry ------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", FUELS)
def test_one_formula_unit_is_one_gram(name: str) -> None:
    one = read(fuel(name)).fuel
    for basis in one.analysis.bases():
        species = species_of(one, basis)
        assert (species.kind, species.molar_mass) == ("pseudo", 1e-3)
        mass = sum(float(count) * WEIGHTS[element] for element, count in species.composition)
        parts = one.analysis.fractions(basis)
        inert = parts["ash"] + 1.0 - sum(parts.values())
        assert mass + inert * 1e-3 == pytest.approx(1e-3, rel=3e-5)
        assert hill(parse_formula(species.formula).counts) == species.formula


def test_entry_holds_the_measured_value() -> None:
    data = sample(calorific_value__uncertainty="0.12 MJ/kg", calorific_value__uncertainty_kind="expanded-95")
    found = read(data)
    entry = entry_of(found, "as-received", datum="combustion-gross-25C")
    gross = found.fuel.calorific_value("gross", "constant pressure", "as-received")
    assert entry.value == pytest.approx(gross * 1e-3, abs=1e-3)
    assert (entry.quantity, entry.phase, entry.temperature, entry.unit) == ("Hf", "cr", 298.15, "J/mol")
    assert float(entry.carried) * 1e6 == pytest.approx(gross, abs=1.0)
    assert entry.uncertainty == pytest.approx(0.12e6 * 1e-3 * 0.65)
    assert (entry.source, entry.locator, entry.status) == ("own-test-fuels", "test wood", "draft")
    again = {key: value for key, value in entry.params["fuel"].items() if key != "basis"}
    assert read({**sample(), **again}).fuel == found.fuel


def test_numbers_of_a_program_are_as_good_as_texts() -> None:
    table = {"basis": "d", "C": 50.2, "H": 6.1, "N": 0.2, "S": 0.02, "O": 42.68, "ash": 0.8}
    one = read({**sample(), "analysis": table, "moisture": {"as_received": 35, "air_dried": 7.5}})
    assert one.fuel == read(sample()).fuel


def test_oxygen_by_difference() -> None:
    assert read(sample(analysis__O="by difference")).fuel == read(sample()).fuel
    with pytest.raises(
        InvalidInput, match=r"\[analysis\] O: oxygen by difference is negative: the others add up to 10"
    ):
        read(sample(analysis__O="by difference", analysis__C="93.5"))


def test_rounding_is_forgiven_and_told_what_exceeds_it_is_not() -> None:
    found = read(sample(analysis__O="42.6"))
    assert found.remarks == ("the analysis adds up to 99.92 %, which its rounding explains",)
    assert not read(sample()).remarks
    with pytest.raises(InvalidInput, match=r"\[analysis\]: the analysis adds up to 97.32 %, 2.68 short of 100 %"):
        read(sample(analysis__O="40.0"))
    with pytest.raises(InvalidInput, match=r"adds up to 102.32 %, 2.32 above 100 %"):
        read(sample(analysis__O="45.0"))


def test_the_template_is_a_fuel() -> None:
    data = parse_fuel_file(UserFile("fuel.toml", "toml", TEMPLATE, ""))
    found = read(data)
    assert found.new_source is not None
    assert found.new_source.key == found.source == data["source"]
    assert "invented" in TEMPLATE


def test_words_for_a_basis() -> None:
    assert [read_basis(symbol) for symbol in BASES.values()] == list(BASES)
    assert read_basis("As received") == "as-received"
    with pytest.raises(InvalidInput, match="unknown basis 'wet'"):
        read_basis("wet")


BAD: list[tuple[dict[str, Any], str]] = [
    ({"calorific_value__basis": None}, r"fuel.toml, \[calorific-value\] basis: basis is missing; write as-received"),
    ({"calorific_value__basis": "wet"}, r"\[calorific-value\] basis: unknown basis 'wet'"),
    ({"calorific_value__kind": None}, r"\[calorific-value\] kind: kind is missing; write gross or net"),
    ({"calorific_value__kind": "lower"}, r"unknown kind 'lower'; write gross or net"),
    ({"calorific_value__at": None}, r"at is missing; write constant volume or constant pressure"),
    ({"calorific_value__value": None}, r"\[calorific-value\] value: value is missing"),
    ({"calorific_value__value": 20.2}, r"20.2 has no unit"),
    ({"calorific_value__value": "20.2"}, r"'20.2' has no unit"),
    ({"calorific_value__value": "20.2 kJ/mol"}, r"is not per mass"),
    ({"calorific_value__value": "4800 cal/g"}, r"\[calorific-value\] value: .*cal_th/g"),
    ({"calorific_value__value": "-20.2 MJ/kg"}, r"is not positive"),
    ({"calorific_value__value": "20.2 GJ/kg"}, r"\[calorific-value\] value: .*GJ"),
    ({"calorific_value__value": "20200 MJ/kg"}, r"'20200 MJ/kg' is above that of hydrogen, 141.8 MJ/kg; check"),
    ({"calorific_value__value": "20,2 MJ/kg"}, r"20.2"),
    ({"calorific_value__uncertainty": "0.1 MJ/kg"}, r"uncertainty-kind: an uncertainty without its kind"),
    ({"calorific_value__uncertainty_kind": "standard"}, r"kind 'standard' without an uncertainty"),
    ({"calorific_value__basis": "air-dried", "moisture__air_dried": None}, r"moisture is missing: air dried needs it"),
    ({"analysis__basis": None}, r"\[analysis\] basis: basis is missing"),
    ({"analysis__basis": "as-received", "moisture__as_received": None}, r"\[analysis\] moisture: moisture is missing"),
    ({"analysis__moisture": "5"}, r"\[analysis\] moisture: moisture in an analysis that is dry; give it under"),
    (
        {"analysis__basis": "daf"},
        r"\[analysis\] ash: ash in an analysis that is dry ash free; give it under \[ash\] dry",
    ),
    ({"analysis__C": "-1"}, r"\[analysis\] C: -1 is negative; write mass %, from 0 to 100"),
    ({"analysis__C": "150"}, r"\[analysis\] C: 150 is above 100 %"),
    ({"analysis__C": "50,2"}, r"\[analysis\] C: '50,2' has a comma in its number; did you mean '50.2'"),
    ({"analysis__C": "half"}, r"\[analysis\] C: 'half' is not a mass percentage"),
    ({"analysis__C": "nan"}, r"\[analysis\] C: 'nan' is not a finite number"),
    ({"analysis__C": True}, r"\[analysis\] C: True is not a number"),
    ({"analysis__F": "0.1"}, r"\[analysis\] F: 'F' is no part of an ultimate analysis here; keys are basis, C, H"),
    ({"analysis__ash": "100"}, r"the analysis adds up to"),
    ({"moisture__as_received": "100"}, r"\[moisture\] as-received: 100 leaves no fuel"),
    ({"moisture__dry": "1"}, r"\[moisture\] dry: unknown key 'dry'"),
    ({"ash__dry": "2"}, r"\[ash\] dry: 2 here and 0.8 by the analysis; leave one of them out"),
    ({"name": None}, r"fuel.toml: name is missing"),
    ({"name": "a\x1bb"}, r"name holds the control character"),
    ({"phase": None}, r"phase is missing"),
    ({"phase": "g"}, r"phase 'g'; a gas needs no analysis"),
    ({"source": None}, r"source is missing"),
    ({"analisys": {}}, r"unknown key 'analisys'; did you mean 'analysis'"),
    ({"analysis": "50"}, r"analysis is not a table"),
    ({"new_source__year": "last"}, r"\[new-source\], key year: year 'last' is not one"),
]


@pytest.mark.parametrize(("changes", "words"), BAD, ids=[str(changes) for changes, _ in BAD])
def test_refused_in_one_line_with_its_place(changes: dict[str, Any], words: str) -> None:
    with pytest.raises(InvalidInput, match=words) as caught:
        read(sample(**changes))
    assert "fuel.toml" in str(caught.value)
    assert "\n" not in str(caught.value)


def test_moistures_that_contradict() -> None:
    data = fuel("coal")
    data["moisture"] = {"air-dried": "4.0"}
    with pytest.raises(
        InvalidInput, match=r"\[moisture\] air-dried: 4 here and 3.2 in the analysis, which is air dried"
    ):
        read(data)


def test_a_value_that_only_expands_gas_is_refused() -> None:
    """1 J/kg at constant volume is less than the work of the gas that half the oxygen sets free."""
    parts = {"basis": "dry", "C": "30", "O": "70"}
    value = {"value": "1 J/kg", "kind": "gross", "at": "constant volume", "basis": "dry"}
    with pytest.raises(InvalidInput, match=r"\[calorific-value\] value: 1 J/kg leaves no heat of combustion; check"):
        read({**sample(), "analysis": parts, "calorific-value": value})


SPLICES = ["-", "0", "1e9", "1e400", "nan", "inf", '"', "[", "]", "{", "=", "\n", "true", "1979-05-27", "100", "1e-300"]
SPLICES += ['"by difference"', '"gross"', '"1e308 MJ/kg"', "dry", "é", "[[analysis]]\n", "99.9999", "\x7f"]


@given(
    st.lists(
        st.tuples(st.integers(0, len(TEMPLATE) - 1), st.integers(0, 40), st.sampled_from(SPLICES)),
        min_size=1,
        max_size=4,
    )
)
def test_a_damaged_file_is_read_or_refused_in_one_line(cuts: list[tuple[int, int, str]]) -> None:
    text = TEMPLATE
    for at, length, splice in cuts:
        text = text[:at] + splice + text[at + length :]
    problem = None
    try:
        found = read(parse_fuel_file(UserFile("fuel.toml", "toml", text, "")))
    except InvalidInput as error:
        problem = str(error)
    if problem is not None:
        assert "\n" not in problem
        assert "fuel.toml" in problem
        return
    for basis in found.fuel.analysis.bases():
        species_of(found.fuel, basis)
        value = entry_of(found, basis, datum="combustion-gross-25C").value
        assert value is not None
        assert 0.0 < abs(value) < 1e9
