"""Datum texts: the named ones of the seed, inline ones, and every way to get them wrong."""

from __future__ import annotations

import copy
import tomllib
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest

from propdb.datum import datum_body, dump_toml, parse_datums, parse_inline, read_body, resolve, same_meaning
from propdb.errors import DatumError, NotFound, PropdbError, TemperatureError
from propdb.model.records import P_ATM, Datum

SEED = Path(__file__).resolve().parents[2] / "seeds_data"

NAMED = """
elements-298K elements-298K-1atm elements-0K elements-same-T elements-298K-red-P elements-298K-S2gas
elements-298K-electron-stationary gas-25C gas-0C gas-60F gas-0K stable-25C stable-0C stable-15C stable-20C stable-60F
liquid-25C liquid-0C steam-triple-point liquid-0C-200kJ liquid-minus40 liquid-boiling-1atm humid-air-0C humid-air-0F-32F
combustion-gross-25C combustion-gross-0C combustion-gross-15C combustion-gross-20C combustion-gross-60F
combustion-net-25C combustion-net-0C combustion-net-15C combustion-net-20C combustion-net-60F oxides-298K
combustion-gross-25C-HClgas combustion-net-25C-HClgas
""".split()


@pytest.fixture(scope="module")
def data() -> dict[str, Any]:
    return tomllib.loads((SEED / "datums.toml").read_text(encoding="utf-8"))


@pytest.fixture(scope="module")
def datums(data: dict[str, Any]) -> dict[str, Datum]:
    return parse_datums(data, where="datums.toml")


def test_all_named_datums_are_there(datums: dict[str, Datum]) -> None:
    assert sorted(datums) == sorted(NAMED)


def test_each_says_what_has_zero_and_cites_a_source_that_is_there(datums: dict[str, Datum]) -> None:
    for datum in datums.values():
        assert len(datum.sentence) > 40, datum.name
        assert datum.sentence.endswith(".")
        assert (SEED / datum.source / "source.toml").is_file(), datum.name


def test_temperatures_are_exact(datums: dict[str, Datum]) -> None:
    assert datums["gas-25C"].temperature == 298.15
    assert datums["gas-60F"].temperature == float(Fraction(51967, 180))
    assert datums["liquid-minus40"].temperature == 233.15
    assert datums["gas-0K"].temperature == 0.0
    assert datums["stable-15C"].temperature == 288.15
    assert datums["steam-triple-point"].temperature == 273.16


def test_one_atmosphere_is_no_shift_for_gases_and_the_datum_says_so(datums: dict[str, Datum]) -> None:
    datum = datums["elements-298K-1atm"]
    assert datum.standard_pressure == P_ATM
    assert "no shift" in datum.note
    assert datum.schedule == datums["elements-298K"].schedule


def test_each_reads_back_from_its_own_toml_and_from_the_body_a_store_keeps(datums: dict[str, Datum]) -> None:
    for name, datum in datums.items():
        assert parse_datums(tomllib.loads(dump_toml(datum)), where="dump") == {name: datum}
        assert read_body(name, datum_body(datum)) == datum


def test_no_name_is_known_to_the_code(data: dict[str, Any]) -> None:
    """Renaming a datum changes nothing but its name."""
    renamed = {"elements": data["elements"], "datum": {f"x-{name}": body for name, body in data["datum"].items()}}
    plain = parse_datums(data, where="datums.toml")
    for name, datum in parse_datums(renamed, where="datums.toml").items():
        assert same_meaning(datum, plain[name.removeprefix("x-")])


# -- inline ------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "text, named",
    [
        ("own:g@25C", "gas-25C"),
        ("own:g@298.15K", "gas-25C"),
        ("own:g@77F", "gas-25C"),
        ("own:g@60F", "gas-60F"),
        ("own:g@0K", "gas-0K"),
        ("own:l,saturated@0C=200kJ/kg", "liquid-0C-200kJ"),
        ("own:l,saturated@-40F", "liquid-minus40"),
        ("own:l,saturated@boiling", "liquid-boiling-1atm"),
        ("own:stable@20C", "stable-20C"),
    ],
)
def test_inline_means_the_same_as_named(datums: dict[str, Datum], text: str, named: str) -> None:
    assert same_meaning(parse_inline(text), datums[named])


def test_inline_parts() -> None:
    datum = parse_inline("own:cr:graphite@298.15K")
    assert datum.inline
    assert datum.zero is not None
    assert (datum.zero.phase, datum.zero.form, datum.zero.temperature) == ("cr", "graphite", 298.15)
    assert parse_inline("own:fluid,40bar@25C").zero.pressure == 4e6  # type: ignore[union-attr]
    assert parse_inline("own:fluid,saturated vapour@100C").zero.saturated == "vapour"  # type: ignore[union-attr]
    assert (parse_inline("own:l@25C=10kJ/mol").h0, parse_inline("own:l@25C=10kJ/mol").h0_unit) == (10000.0, "J/mol")
    assert parse_inline("own:l@65C").sentence == "Each species itself, as liquid at 65 °C, has enthalpy zero."


@pytest.mark.parametrize(
    "text, problem",
    [
        ("g@25C", "does not begin with"),
        ("own:g", "has no temperature"),
        ("own:gas@25C", "'gas' in inline datum"),
        ("own:g:alpha@25C", "names a form of phase g"),
        ("own:g,saturated@25C", "does not fit phase g"),
        ("own:l,saturated vapour@25C", "does not fit phase l"),
        ("own:l,boiled@25C", "neither 'saturated' nor a pressure"),
        ("own:g@boiling", "a state of l or fluid"),
        ("own:l@25C=", "nothing behind ="),
        ("own:fluid@25C", "needs a pressure, or saturated"),
    ],
)
def test_inline_refusals(text: str, problem: str) -> None:
    with pytest.raises(DatumError, match=problem) as error:
        parse_inline(text)
    assert "\n" not in str(error.value)


@pytest.mark.parametrize("text", ["own:g@25", "own:g@-300C", "own:g@nan K", "own:g@", "own:l@25C=200kJ", "own:l@25C=5"])
def test_inline_quantities_are_refused_by_the_units(text: str) -> None:
    with pytest.raises(PropdbError) as error:
        parse_inline(text)
    assert "\n" not in str(error.value)


def test_a_temperature_without_unit_names_the_choice() -> None:
    with pytest.raises(TemperatureError, match="no unit"):
        parse_inline("own:g@25")


# -- names -------------------------------------------------------------------------------------------------------------


def test_resolve(datums: dict[str, Datum]) -> None:
    assert resolve("gas-25C", datums) is datums["gas-25C"]
    assert resolve("Gas-25c", datums) is datums["gas-25C"]
    assert resolve("own:l@65C", datums).inline
    with pytest.raises(NotFound, match="did you mean gas-25C"):
        resolve("gas-25", datums)
    with pytest.raises(NotFound, match="propdb datum list"):
        resolve("zzz", datums)


# -- files that contradict themselves ----------------------------------------------------------------------------------

OWN = {"kind": "own", "sentence": "s.", "source": "x", "temperature": "25C", "phase": "g"}
ELEMENTS = {"H": {"forms": [{"species": "hydrogen", "phase": "g"}]}}


@pytest.mark.parametrize(
    "change, problem",
    [
        ({"kind": "none"}, "kind 'none' is unknown"),
        ({"kind": None}, "kind is missing"),
        ({"sentence": None}, "sentence is missing"),
        ({"source": " "}, "source is empty"),
        ({"phase": "gas"}, "phase 'gas' is unknown"),
        ({"form": "alpha"}, "form 'alpha' of phase 'g'"),
        ({"saturated": "liquid"}, "saturated 'liquid' of phase 'g'"),
        ({"temperature": 298.15}, "has no unit"),
        ({"temperature": "25"}, "no unit"),
        ({"temperature": None}, "temperature is missing"),
        ({"temperature": "same"}, "does not go with kind 'own'"),
        ({"temperature": "boiling"}, "a state of phase l or fluid"),
        ({"phase": "fluid"}, "needs a pressure, or saturated"),
        ({"pressure": "minus"}, "pressure: "),
        ({"h0": "200"}, "h0: "),
        ({"h0": 200}, "not a text"),
        ({"only": True}, "no species listed"),
        ({"only": "yes"}, "only is 'yes'"),
        ({"sentense": "s"}, "did you mean 'sentence'"),
        ({"basis": []}, "key 'basis' is unknown"),
        ({"species": {"water": {"phase": "l", "tempreature": "0C"}}}, "did you mean 'temperature'"),
        ({"species": 3}, "is not a table"),
    ],
)
def test_own_refusals(change: dict[str, Any], problem: str) -> None:
    body = {key: value for key, value in {**OWN, **change}.items() if value is not None}
    with pytest.raises(DatumError, match=problem) as error:
        parse_datums({"datum": {"x": body}}, where="f.toml")
    assert str(error.value).startswith("f.toml: datum 'x'")
    assert "\n" not in str(error.value)


@pytest.mark.parametrize(
    "data, problem",
    [
        ({"datums": {}}, "did you mean 'datum'"),
        ({"datum": {"own:x": OWN}}, "is named with letters"),
        ({"datum": {"x": 5}}, "is not a table"),
        ({"elements": {"H": {"forms": []}}}, "forms is missing or empty"),
        (
            {
                "elements": {
                    "S": {
                        "forms": [
                            {"until": "400K", "species": "sulfur", "phase": "cr"},
                            {"until": "300K", "species": "sulfur", "phase": "l"},
                        ]
                    }
                }
            },
            "is not above the form before",
        ),
        (
            {
                "elements": ELEMENTS,
                "datum": {
                    "x": {
                        "kind": "elements",
                        "sentence": "s.",
                        "source": "x",
                        "temperature": "0K",
                        "replace": {"X": {"species": "y", "phase": "g"}},
                    }
                },
            },
            "element 'X' is not in the table",
        ),
        (
            {"datum": {"x": {"kind": "elements", "sentence": "s.", "source": "x", "temperature": "0K"}}},
            "no reference form of any element",
        ),
        (
            {"datum": {"x": {"kind": "basis", "sentence": "s.", "source": "x", "temperature": "0K"}}},
            "basis is missing or empty",
        ),
        (
            {
                "datum": {
                    "x": {
                        "kind": "basis",
                        "sentence": "s.",
                        "source": "x",
                        "temperature": "same",
                        "basis": [{"species": "water", "phase": "l"}],
                    }
                }
            },
            "does not go with kind 'basis'",
        ),
        (
            {
                "datum": {
                    "x": {
                        "kind": "basis",
                        "sentence": "s.",
                        "source": "x",
                        "temperature": "0C",
                        "basis": [{"phase": "l"}],
                    }
                }
            },
            "species is missing",
        ),
    ],
)
def test_file_refusals(data: dict[str, Any], problem: str) -> None:
    with pytest.raises(DatumError, match=problem) as error:
        parse_datums(copy.deepcopy(data), where="f.toml")
    assert "f.toml" in str(error.value)
    assert "\n" not in str(error.value)


def test_a_file_may_lean_on_the_elements_of_the_store() -> None:
    body = {"kind": "elements", "sentence": "s.", "source": "x", "temperature": "0C"}
    found = parse_datums({"datum": {"x": body}}, where="f.toml", elements=ELEMENTS)["x"]
    assert found.schedule["H"][0][1].temperature == 273.15
