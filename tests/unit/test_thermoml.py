"""ThermoML files. All numbers are invented; see ``thermoml_samples``."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import pytest
from thermoml_samples import (
    CITATION,
    DENSITY,
    ETHANOL,
    FORMATION,
    FUSION,
    HEAT_CAPACITY,
    INVENTANE,
    REACTION,
    VAPORISATION,
    VERSION,
    compound,
    curve,
    data_set,
    participant,
    report,
    uncertainty,
)

import propdb
from propdb.api import Store
from propdb.errors import InvalidInput
from propdb.intake.thermoml_records import Uncertainty, stated

U95 = uncertainty(level="95")


@pytest.fixture(scope="module")
def shared(tmp_path_factory: pytest.TempPathFactory) -> Path:
    copy = tmp_path_factory.mktemp("thermoml") / "shared.db"
    with propdb.open() as store:
        store.store_backup(copy)
    return copy


@pytest.fixture
def store(shared: Path) -> Iterator[Store]:
    with propdb.open(shared) as opened:
        yield opened


Plan = Callable[..., Any]


@pytest.fixture
def plan(store: Store, tmp_path: Path) -> Plan:
    """What a file with these parts would come to."""
    pytest.importorskip("defusedxml")

    def planned(*parts: str, **options: str) -> Any:
        (tmp_path / "paper.xml").write_text(report(*parts, **options), encoding="utf-8")
        return store.import_file(tmp_path / "paper.xml", dry_run=True)

    return planned


@pytest.fixture
def refuse(store: Store, tmp_path: Path) -> Callable[..., InvalidInput]:
    """Import a text; the error, which is one line that names the file, and nothing is written."""
    pytest.importorskip("defusedxml")

    def refused(text: str | bytes) -> InvalidInput:
        (tmp_path / "paper.xml").write_bytes(text if isinstance(text, bytes) else text.encode())
        before = store.store_info()
        with pytest.raises(InvalidInput) as error:
            store.import_file(tmp_path / "paper.xml")
        assert store.store_info() == before
        assert str(error.value).startswith("paper.xml")
        assert "\n" not in str(error.value)
        return error.value

    return refused


def entries(report: Any) -> list[Any]:
    return [entry for _, entry in report.taken]


# -- without the optional dependency ----------------------------------------------------------------------------------


def test_without_the_optional_dependency_one_line_says_what_to_install(
    store: Store, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    import sys

    monkeypatch.setitem(sys.modules, "defusedxml", None)
    (tmp_path / "paper.xml").write_text(report(curve()), encoding="utf-8")
    with pytest.raises(InvalidInput, match=r'^paper.xml: .*defusedxml; pip install "propdb\[thermoml\]"$'):
        store.import_file(tmp_path / "paper.xml")


# -- uncertainty ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "value, of_property, expected",
    [
        ({"expanded": "1.2"}, {"level": "95"}, ("1.2", "expanded-95")),
        ({"expanded": "1.2", "level": "95"}, {}, ("1.2", "expanded-95")),
        ({"expanded": "1.2"}, {"coverage": "2"}, ("1.2", "expanded-95")),
        ({"expanded": "1.2"}, {"coverage": "3"}, ("0.4", "standard")),
        ({"expanded": "2.576"}, {"level": "99"}, ("1", "standard")),
        ({"expanded": "1.2", "coverage": "4"}, {"level": "80"}, ("0.3", "standard")),
        ({"expanded": "1.2"}, {}, ("", "")),
        ({"expanded": "1.2", "standard": "0.7"}, {}, ("0.7", "standard")),
        ({"standard": "0.7"}, {"level": "95"}, ("0.7", "standard")),
        ({}, {"level": "95"}, ("", "")),
    ],
)
def test_stated_uncertainty(value: dict[str, str], of_property: dict[str, str], expected: tuple[str, str]) -> None:
    found = stated([Uncertainty(True, "1", **value)], [Uncertainty(True, "1", **of_property)])
    assert found[:2] == expected
    if value.get("expanded") and expected[1] != "expanded-95" and not value.get("standard"):
        assert "1.2" in found[2] or "2.576" in found[2]  # what was done to it is said


# -- what is taken ----------------------------------------------------------------------------------------------------


@pytest.mark.extras
def test_heat_capacities_become_a_table_with_source_and_uncertainty(plan: Plan) -> None:
    values = [
        ("300", "113.0", uncertainty("1.2")),
        ("290", "110.0", uncertainty("1.1")),
        ("310.0", "116.5", uncertainty("1.3")),
    ]
    found = plan(data_set(HEAT_CAPACITY, "Liquid", values, phases=("Liquid",), stated=U95, number=7))
    ((place, entry),) = found.taken
    assert (entry.species, entry.quantity, entry.phase, entry.equation) == ("ethanol", "Cp", "l", "table")
    assert entry.params == {"T": [290.0, 300.0, 310.0], "cp": [110.0, 113.0, 116.5]}
    assert (entry.tmin, entry.tmax, entry.conditions) == (290.0, 310.0, "101.3 kPa")
    assert (entry.uncertainty_kind, entry.uncertainty_unit) == ("expanded-95", "%")
    assert entry.uncertainty == pytest.approx(1.3 / 116.5, rel=1e-12)
    assert "the largest stated" in entry.note
    assert "Invented calorimetry" in entry.note
    assert entry.carried == "300 113.0 | 290 110.0 | 310.0 116.5"
    assert (place, entry.locator, entry.source) == ("data set 7", "ThermoML data set 7", "nobody-2011")
    assert [(c.package, c.version, c.row) for c in entry.carriers] == [("ThermoML", "4.0", 7)]
    assert found.sources == ("nobody-2011",)
    assert found.species == ()


@pytest.mark.extras
def test_citation_becomes_a_source(plan: Plan, store: Store, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    copy = tmp_path / "own.db"
    store.store_backup(copy)
    monkeypatch.setenv("PROPDB_USER", "A. Tester")
    (tmp_path / "paper.xml").write_text(report(curve()), encoding="utf-8")
    with propdb.open(copy) as own:
        taken = own.import_file(tmp_path / "paper.xml").taken
        source = own.source_show("nobody-2011")
        assert (source.title, source.year, source.kind) == ("Invented numbers of invented samples", 2011, "article")
        assert source.authors == ("Nobody, A.", "Noone, B.")
        assert source.fields["doi"] == "10.9999/invented.1"
        assert own.entry_show(taken[0][1].id).status == "draft"
        retitled = CITATION.replace("10.9999", "https://doi.org/10.9999").replace(" samples", "")
        resolver = report(curve(), citation=retitled)
        (tmp_path / "paper.xml").write_text(resolver, encoding="utf-8")
        again = own.import_file(tmp_path / "paper.xml")  # the same source by its DOI, under another title
        assert (again.taken, again.sources) == ((), ())
        assert taken[0][1].id in again.skipped[0].why
        other = report(curve(number=2), citation=CITATION.replace("Invented numbers", "Other").replace(".1<", ".2<"))
        (tmp_path / "other.xml").write_text(other, encoding="utf-8")
        assert own.import_file(tmp_path / "other.xml").sources == ("nobody-2011b",)


@pytest.mark.extras
def test_specific_and_saturated_heat_capacities(plan: Plan, store: Store) -> None:
    name = "Specific heat capacity at saturation pressure, J/K/kg"
    (entry,) = entries(plan(data_set(name, "Liquid", [("290", "2400"), ("300", "2450")], pressure="")))
    mass = store.show("ethanol").species.molar_mass
    assert entry.params["cp"] == pytest.approx([2400 * mass, 2450 * mass], rel=1e-12)
    assert entry.conditions == "saturated"


@pytest.mark.extras
def test_points_that_make_no_curve_stay_points(plan: Plan) -> None:
    values = [("290", "110.0", uncertainty("1.1")), ("290", "110.4"), ("300", "113.0")]
    found = plan(data_set(HEAT_CAPACITY, "Liquid", values, stated=U95))
    assert [(e.temperature, e.value, e.equation) for e in entries(found)] == [
        (290.0, 110.0, ""),
        (290.0, 110.4, ""),
        (300.0, 113.0, ""),
    ]
    assert [e.uncertainty for e in entries(found)] == [1.1, None, None]
    assert "290 K stands twice" in found.remarks[0][1]
    (single,) = entries(plan(data_set(HEAT_CAPACITY, "Ideal gas", [("298.15", "65.2")])))
    assert (single.phase, single.temperature) == ("g", 298.15)


@pytest.mark.extras
def test_latent_heats_end_where_the_file_says(plan: Plan) -> None:
    values = [("298.15", "42.3", uncertainty("0.4", tag="Std"))]
    (real,) = entries(plan(data_set(VAPORISATION, "Liquid", values, phases=("Liquid", "Gas"))))
    (ideal,) = entries(plan(data_set(VAPORISATION, "Liquid", values, phases=("Liquid", "Ideal gas"))))
    (sublimed,) = entries(plan(data_set(VAPORISATION, "Crystal", values, phases=("Gas", "Crystal"))))
    assert (real.quantity, real.phase, real.conditions, real.value) == ("Hvap", "l", "to the real vapour", 42300.0)
    assert (real.uncertainty, real.uncertainty_kind, real.uncertainty_unit) == (400.0, "standard", "")
    assert ideal.conditions == "to the ideal gas"
    assert (sublimed.quantity, sublimed.phase) == ("Hsub", "cr")


@pytest.mark.extras
def test_fusion_and_the_direction_of_transitions(plan: Plan) -> None:
    fusion = data_set(FUSION, "Crystal 1", [("330", "50.0")], phases=("Crystal 1", "Liquid"), of=(2,))
    low = data_set(FUSION, "Crystal 3", [("270", "2.0")], phases=("Crystal 2", "Crystal 3"), of=(2,), number=2)
    high = data_set(FUSION, "Crystal 1", [("300", "3.0")], phases=("Crystal 1", "Crystal 2"), of=(2,), number=3)
    found = plan(low, high, fusion)
    assert [(e.quantity, e.form, e.to, e.value) for e in entries(found)] == [
        ("Htr", "crystal 3", "cr:crystal 2", 2000.0),
        ("Htr", "crystal 2", "cr:crystal 1", 3000.0),
        ("Hfus", "crystal 1", "", 50000.0),
    ]
    assert found.species == ("inventane",)
    alone = plan(high)
    assert alone.taken == ()
    assert "which of cr:crystal 1 and cr:crystal 2 is stable below" in alone.skipped[0].why


@pytest.mark.extras
def test_formation_from_elements(plan: Plan) -> None:
    others = compound(3, "carbon", "C") + compound(4, "hydrogen", "H2") + compound(5, "oxygen", "O2")
    members = (
        participant(3, "-2", "Crystal")
        + participant(4, "-3", "Ideal gas")
        + participant(5, "-0.5", "Ideal gas")
        + participant(1, "1", "Liquid")
    )
    values = [("298.15", "-277.0", uncertainty("0.8"))]
    options: dict[str, Any] = {"members": members, "stated": U95}
    compounds = ETHANOL + others
    (entry,) = entries(plan(data_set(REACTION, "", values, reaction=FORMATION, **options), compounds=compounds))
    assert (entry.species, entry.quantity, entry.phase, entry.value) == ("ethanol", "Hf", "l", -277000.0)
    assert (entry.datum, entry.temperature, entry.uncertainty) == ("elements-298K", 298.15, 800.0)
    hot = [("400", "-270.0")]
    (entry,) = entries(plan(data_set(REACTION, "", hot, reaction=FORMATION, **options), compounds=compounds))
    assert (entry.datum, entry.temperature) == ("elements-same-T", 400.0)
    burned = plan(data_set(REACTION, "", values, reaction="Combustion with oxygen", **options), compounds=compounds)
    assert "only formation from elements" in burned.skipped[0].why
    twice = members.replace(">1<", ">2<").replace("<nOrgNum>2<", "<nOrgNum>1<")
    left = plan(data_set(REACTION, "", values, reaction=FORMATION, members=twice), compounds=compounds)
    assert "2 mol at once" in left.skipped[0].why


# -- what is skipped, and why -----------------------------------------------------------------------------------------

LEFT = [
    ((data_set(HEAT_CAPACITY, "Liquid", [("290", "100")], of=(1, 2)),), "a mixture: only pure species"),
    ((data_set(DENSITY, "Liquid", [("290", "789")]),), "not a heat capacity at constant pressure"),
    ((data_set(HEAT_CAPACITY, "Gas", [("290", "65")]),), "the phase (Gas) is not"),
    ((data_set(HEAT_CAPACITY, "Liquid mixture 1", [("290", "65")]),), "is not a solid, liquid"),
    ((data_set(HEAT_CAPACITY, "Liquid", [("290", "100"), ("300", "1")], pressure="20000"),), "at 20000 kPa"),
    ((data_set(HEAT_CAPACITY, "Liquid", [("290", "100")], variable="Pressure, kPa", pressure=""),), "no temperature"),
    ((data_set(HEAT_CAPACITY, "Liquid", [("290", "1")], presentation="Ratio of X with Y"),), "not a direct value"),
    ((data_set(HEAT_CAPACITY, "Liquid", []),), "no value is given"),
    ((data_set(FUSION, "Crystal", [("290", "5")]),), "two phases are needed"),
    ((), "no data"),
]


@pytest.mark.extras
@pytest.mark.parametrize("parts, why", LEFT, ids=[why for _, why in LEFT])
def test_what_is_skipped_and_why(plan: Plan, parts: tuple[str, ...], why: str) -> None:
    found = plan(*parts)
    assert (found.taken, found.refused, found.sources) == ((), (), ())
    assert why in found.skipped[0].why


COMPOUNDS = [
    (compound(1, "ethanol", "C3H8O"), "the file gives C3H8O for ethanol"),
    (compound(1, "ethanol", "C2H6O", "64-17-6"), "64-17-6"),
    (compound(1, "ethanol", "C2H6O", "64-17-5", "XLYOFNOQVPJJNP-UHFFFAOYSA-N"), "and its InChIKey water"),
    (compound(1, "", "C2H6O"), "does not give its name and formula"),
    (compound(1, "invented stuff"), "does not give its name and formula"),
    (compound(1, "invented stuff", "C2Xx"), "is not an element"),
    (compound(1, "invented stuff", "CO2", "64-19-7"), "the file gives CO2"),
]


@pytest.mark.extras
@pytest.mark.parametrize("listed, why", COMPOUNDS, ids=[why for _, why in COMPOUNDS])
def test_a_compound_that_contradicts_the_store_is_skipped(plan: Plan, listed: str, why: str) -> None:
    found = plan(curve(), compounds=listed)
    assert found.taken == ()
    assert why in found.skipped[0].why


# -- what is refused --------------------------------------------------------------------------------------------------

BOMB = (
    '<?xml version="1.0"?><!DOCTYPE DataReport [<!ENTITY a "aaaaaaaaaa"><!ENTITY b "&a;&a;&a;&a;&a;&a;&a;&a;">'
    '<!ENTITY c "&b;&b;&b;&b;&b;&b;&b;&b;">]><DataReport>&c;</DataReport>'
)
EXTERNAL = '<?xml version="1.0"?><!DOCTYPE d [<!ENTITY x SYSTEM "file:///etc/passwd">]><DataReport>&x;</DataReport>'
DTD = '<?xml version="1.0"?><!DOCTYPE DataReport SYSTEM "http://localhost/x.dtd"><DataReport/>'
NEXT_YEAR = str(datetime.now(UTC).year + 1)
GOOD = report(curve())
NUMBER, OTHER, VALUE = "<nPropNumber>1</nPropNumber>", "<nPropNumber>2</nPropNumber>", "113.0</nPropValue>"
WRONG: list[tuple[str, str | bytes, str]] = [
    ("a bomb of entities", BOMB, "declares a document type or entities"),
    ("an external entity", EXTERNAL, "declares a document type or entities"),
    ("a document type", DTD, "declares a document type or entities"),
    ("an unknown entity", GOOD.replace("ethanol", "&auml;thanol"), "paper.xml, line"),
    ("cut short", GOOD[:-40], "is not XML"),
    ("UTF-16", GOOD.encode("utf-16"), "UTF-16"),
    ("another root", "<html><body/></html>", "the root element is 'html'"),
    ("another namespace", GOOD.replace("namespaces/ThermoML", "namespaces/Other"), "the namespace is"),
    ("version 9.9", GOOD.replace(">4<", ">9<"), "there is no ThermoML 9.0; known are versions 2 to 4"),
    ("version 4.x", GOOD.replace("Minor>0<", "Minor>x<"), "'x' is not a number"),
    ("no version", report(curve(), version=""), "does not say its version"),
    ("no citation", report(curve(), citation=""), "there is no Citation"),
    ("no title", GOOD.replace("<sTitle>Invented numbers of invented samples</sTitle>", ""), "sTitle is missing"),
    ("no author", GOOD.replace("sAuthor", "sOther"), "there is no sAuthor"),
    ("a year to come", GOOD.replace("2011", NEXT_YEAR), f"the year {NEXT_YEAR} is in the future"),
    ("a date to come", GOOD.replace("<sVol>", f"<dateCit>{NEXT_YEAR}-01-01</dateCit><sVol>"), "is in the future"),
    ("no year", GOOD.replace("2011", "once"), "the year 'once' is none"),
    ("a C1 control character", GOOD.replace("Noone, B.", "No\u009bone"), "control character \\x9b"),
    ("text as a value", GOOD.replace("113.0", "about 113"), "NumValues 2, nPropValue: 'about 113' is not a number"),
    ("a decimal comma", GOOD.replace("113.0", "113,0"), "the decimal point is '.': 113.0"),
    ("not a number", GOOD.replace("113.0", "NaN"), "is not a number"),
    ("infinite", GOOD.replace("113.0", "1e999"), "is not a number"),
    ("a negative heat capacity", GOOD.replace("113.0", "-113.0"), "NumValues 2: a heat capacity of -113.0 J/K/mol"),
    ("a negative temperature", GOOD.replace(">300<", ">-300<"), "a temperature of -300 K"),
    ("an unknown property", GOOD.replace(f"{NUMBER}<nPropValue>", f"{OTHER}<nPropValue>"), "no property '2'"),
    ("an unknown variable", GOOD.replace("1</nVarNumber><nVarV", "3</nVarNumber><nVarV"), "no variable '3'"),
    ("an unknown compound", report(curve(of=(4,))), "there is no compound '4'"),
    ("an unknown unit", GOOD.replace("J/K/mol", "J/K/mole"), "did you mean"),
    ("a wrong unit", GOOD.replace("J/K/mol", "kJ/mol"), "not a heat capacity"),
    ("no unit", GOOD.replace(", J/K/mol", ""), "is not a unit of"),
    ("no property group", GOOD.replace("PropertyGroup", "Group"), "PropertyGroup is missing"),
    ("a negative uncertainty", report(curve(stated=U95)).replace(VALUE, VALUE + uncertainty("-1")), "is negative"),
]  # fmt: skip


@pytest.mark.extras
@pytest.mark.parametrize("text, said", [case[1:] for case in WRONG], ids=[case[0] for case in WRONG])
def test_a_wrong_file_is_refused(refuse: Callable[..., InvalidInput], text: str | bytes, said: str) -> None:
    assert said in str(refuse(text))


@pytest.mark.extras
def test_a_file_nested_deeply_is_refused(refuse: Callable[..., InvalidInput]) -> None:
    refuse("<a>" * 200_000 + "</a>" * 200_000)


@pytest.mark.extras
def test_too_many_values_are_refused(refuse: Callable[..., InvalidInput], monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("propdb.intake.thermoml.MAX_ROWS", 2)
    assert "3 values, and 2 are taken at once" in str(refuse(GOOD))


@pytest.mark.extras
def test_one_wrong_data_set_keeps_all_out(refuse: Callable[..., InvalidInput], plan: Plan) -> None:
    wrong = curve(number=2).replace("113.0", "-113.0")
    error = refuse(report(curve(), wrong))
    assert error.where == "paper.xml, data set 2, NumValues 2"
    found = plan(curve(), wrong)
    assert [one.place for one in found.refused] == ["data set 2, NumValues 2"]


@pytest.mark.extras
def test_a_file_without_namespace_and_with_a_byte_order_mark_is_taken(store: Store, tmp_path: Path) -> None:
    pytest.importorskip("defusedxml")
    text = GOOD.replace(' xmlns="http://www.iupac.org/namespaces/ThermoML"', "")
    (tmp_path / "paper.dat").write_bytes(b"\xef\xbb\xbf" + text.encode())
    assert len(store.import_file(tmp_path / "paper.dat", dry_run=True).taken) == 1
    assert INVENTANE in GOOD
    assert VERSION in GOOD
