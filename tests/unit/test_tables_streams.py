"""Streams of a fictional plant: enthalpy flows add up to duties that are known from elsewhere."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any, NamedTuple

import pytest

import propdb
from propdb.errors import DatumMismatch, UnitError

pytestmark = pytest.mark.extras
pytest.importorskip("pyarrow")


class Stream(NamedTuple):
    """A stream of pure species; ``datum`` is what its own table is written on. Flows in kmol/h."""

    side: str
    species: str
    phase: str
    temperature: str
    flow: float
    datum: str
    pressure: str | None = None


#: Ten units of a plant that does not exist; flows and temperatures are invented.
PLANT: dict[str, list[Stream]] = {
    "air heater": [
        Stream("in", "nitrogen", "g", "25C", 40, "gas-25C"),
        Stream("out", "nitrogen", "g", "600C", 40, "gas-25C"),
    ],
    "two vendors": [
        Stream("in", "oxygen", "g", "60F", 12, "gas-60F"),
        Stream("out", "oxygen", "g", "400C", 12, "gas-0C"),
    ],
    "boiler": [
        Stream("in", "water", "l", "105C", 55, "steam-triple-point"),
        Stream("out", "water", "fluid", "400C", 55, "steam-triple-point", "40bar"),
    ],
    "deaerator": [
        Stream("in", "water", "l", "20C", 50, "liquid-0C"),
        Stream("in", "water", "fluid", "150C", 6, "steam-triple-point", "3bar"),
        Stream("out", "water", "l", "95C", 56, "own:l@25C"),
    ],
    "condenser": [
        Stream("in", "benzene", "g", "100C", 9, "gas-25C"),
        Stream("out", "benzene", "l", "60C", 9, "own:l@25C"),
    ],
    "cooler": [
        Stream("in", "carbon dioxide", "g", "500C", 8, "elements-298K"),
        Stream("in", "water", "l", "20C", 100, "liquid-0C"),
        Stream("out", "carbon dioxide", "g", "120C", 8, "gas-0C"),
        Stream("out", "water", "l", "45C", 100, "liquid-0C"),
    ],
    "mixer": [
        Stream("in", "nitrogen", "g", "25C", 30, "gas-25C"),
        Stream("in", "methane", "g", "25C", 10, "gas-0C"),
        Stream("out", "nitrogen", "g", "25C", 30, "gas-25C"),
        Stream("out", "methane", "g", "25C", 10, "gas-25C"),
    ],
    "vaporiser": [
        Stream("in", "ethanol", "l", "25C", 5, "own:l@25C"),
        Stream("out", "ethanol", "g", "120C", 5, "gas-25C"),
    ],
    "economiser": [
        Stream("in", "water", "l", "25C", 70, "liquid-25C"),
        Stream("out", "water", "l", "90C", 70, "liquid-0C"),
        Stream("in", "sulfur dioxide", "g", "300C", 20, "gas-25C"),
        Stream("out", "sulfur dioxide", "g", "200C", 20, "gas-25C"),
    ],
    "burner": [
        Stream("in", "methane", "g", "25C", 1, "elements-298K"),
        Stream("in", "oxygen", "g", "25C", 2, "gas-25C"),
        Stream("out", "carbon dioxide", "g", "25C", 1, "elements-0K"),
        Stream("out", "water", "l", "25C", 2, "steam-triple-point"),
    ],
}  # fmt: skip


@pytest.fixture(scope="module")
def store() -> Iterator[propdb.Store]:
    with propdb.open() as opened:
        yield opened


def enthalpy(store: propdb.Store, stream: Stream, datum: str) -> float:
    """[kJ/kmol]"""
    return store.enthalpy(
        stream.species, phase=stream.phase, temperature=stream.temperature, pressure=stream.pressure, datum=datum,
        unit="kJ/kmol",
    ).value  # fmt: skip


def write(path: Path, store: propdb.Store, streams: list[Stream]) -> None:
    lines = ["stream,side,species,datum,h [kJ/kmol],flow [kmol/h]"]
    lines += [
        f"S{i},{s.side},{s.species},{s.datum},{enthalpy(store, s, s.datum):.4f},{s.flow}" for i, s in enumerate(streams)
    ]
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")


@pytest.mark.parametrize("unit", PLANT)
def test_the_duty_is_the_known_one(store: propdb.Store, tmp_path: Path, unit: str) -> None:
    streams = PLANT[unit]
    write(tmp_path / "in.csv", store, streams)
    report = store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to="elements-298K")
    found = report.data["streams"]
    rounding = sum(s.flow for s in streams) * 1e-4 / 3600.0
    if unit == "burner":
        # Gross calorific value of methane at 25 °C, 890.58 kJ/mol with a standard uncertainty of 0.19 kJ/mol: ISO 6976
        known, allowed = -890.58e3 / 3600.0, 2 * 0.19e3 / 3600.0
        assert found["reaction"]
    else:
        # Without a reaction the duty does not depend on the datum: here each species on its own state, by the states.
        common = {s.species: next(o.datum for o in streams if o.species == s.species) for s in streams}
        known = sum((1 if s.side == "out" else -1) * s.flow * enthalpy(store, s, common[s.species]) for s in streams)
        known, allowed = known / 3600.0, rounding
        assert not found["reaction"]
    assert found["duty"] == pytest.approx(known, abs=allowed + rounding)
    assert found["duty"] == pytest.approx(found["total_out"] - found["total_in"], abs=1e-9)
    assert len(found["streams"]) == len(streams)
    assert f"{found['duty']:.3f}" in str(report)


def test_published_steam(store: propdb.Store, tmp_path: Path) -> None:
    """Saturated steam at 40 bar from water at 20 °C: 2800.8 and 83.9 kJ/kg, steam tables on IAPWS-95."""
    text = (
        "stream,side,phase,species,datum,h [kJ/kg],flow [kg/s]\n"
        "feed,in,l,water,steam-triple-point,83.9,2\nsteam,out,fluid,water,steam-triple-point,2800.8,2\n"
    )
    (tmp_path / "in.csv").write_text(text, encoding="utf-8")
    for to in ("liquid-25C", "elements-298K", "elements-0K", "combustion-net-25C"):
        report = store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to=to, overwrite=True)
        assert report.data["streams"]["duty"] == pytest.approx(2 * (2800.8 - 83.9), abs=0.2)
        assert report.data["streams"]["duty_uncertainty"] == pytest.approx(0.0, abs=1e-6)  # one shift on both sides


def test_uncertainty_of_a_duty_is_that_of_the_difference(store: propdb.Store, tmp_path: Path) -> None:
    text = (
        "side,species,datum,h [kJ/mol],flow [mol/s]\nin,carbon dioxide,gas-25C,0.000,1\n"
        "out,carbon dioxide,elements-298K,-393.510,1\n"
    )
    (tmp_path / "in.csv").write_text(text, encoding="utf-8")
    found = store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to="elements-298K").data["streams"]
    one = store.convert("0 kJ/mol", species="carbon dioxide", from_="gas-25C", to="elements-298K")
    assert one.uncertainty is not None
    assert found["duty_uncertainty"] == pytest.approx(one.uncertainty)


def test_own_states_across_a_reaction_are_refused(store: propdb.Store, tmp_path: Path) -> None:
    write(tmp_path / "in.csv", store, PLANT["burner"])
    with pytest.raises(DatumMismatch, match="reaction") as caught:
        store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to="gas-25C")
    assert "--across" in str(caught.value)
    assert [p.name for p in tmp_path.iterdir()] == ["in.csv"]
    report = store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to="gas-25C", across=True)
    assert any("on request" in note for note in report.data["streams"]["notes"])


def test_elements_that_do_not_balance_are_named(store: propdb.Store, tmp_path: Path) -> None:
    streams = [*PLANT["burner"][:3], PLANT["burner"][3]._replace(flow=1.5)]
    write(tmp_path / "in.csv", store, streams)
    report = store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to="elements-298K")
    assert any("do not balance" in note and "H " in note for note in report.data["streams"]["notes"])


def test_mass_flows_and_mixtures(store: propdb.Store, tmp_path: Path) -> None:
    text = (
        "stream,side,x[nitrogen],x[oxygen],phase,T [°C],flow [kg/h]\n"
        "air,in,0.79,0.21,g,25,3600\nhot,out,0.79,0.21,g,525,3600\n"
    )
    (tmp_path / "in.csv").write_text(text, encoding="utf-8")
    found = store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to="gas-25C").data["streams"]
    per_mol = sum(
        x * store.enthalpy(name, phase="g", temperature="525C", datum="gas-25C").value
        for name, x in (("nitrogen", 0.79), ("oxygen", 0.21))
    )
    molar = 0.79 * 28.014e-3 + 0.21 * 31.9988e-3
    assert found["duty"] == pytest.approx(per_mol / molar, rel=1e-4)
    assert found["streams"][0]["flow_mass"] == pytest.approx(1.0)


def test_rows_without_a_number_are_named(store: propdb.Store, tmp_path: Path) -> None:
    text = "side,species,datum,h [kJ/mol],flow [mol/s]\nin,methan,gas-25C,0,1\nout,nitrogen,gas-25C,1,1\n"
    (tmp_path / "in.csv").write_text(text, encoding="utf-8")
    report = store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to="gas-25C")
    assert not report.clean
    assert any("1 row without" in note for note in report.data["streams"]["notes"])


def test_a_flow_without_its_unit(store: propdb.Store, tmp_path: Path) -> None:
    (tmp_path / "in.csv").write_text("species,datum,h [kJ/mol],flow\nmethane,gas-25C,0,1\n", encoding="utf-8")
    with pytest.raises(UnitError, match="flow"):
        store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to="gas-25C")
    report = store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to="gas-25C", units=["flow=kmol/h"])
    assert report.data["streams"]["total"] == 0.0


# -- suggest -----------------------------------------------------------------------------------------------------------


def suggestion(store: propdb.Store, tmp_path: Path, unit: str) -> dict[str, Any]:
    write(tmp_path / "in.csv", store, PLANT[unit])
    report = store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to="suggest")
    assert "suggested datum" in str(report)
    assert report.data["to"] == report.data["suggestion"]["datum"]
    found: dict[str, Any] = report.data["suggestion"]
    assert found["runner_up"] != found["datum"]
    assert found["reason"]
    return found


def test_suggested_is_the_datum_that_the_tables_share(store: propdb.Store, tmp_path: Path) -> None:
    found = suggestion(store, tmp_path, "air heater")
    assert found["datum"] == "gas-25C"
    assert "its own tables" in found["reason"]
    assert found["runner_up"]


@pytest.mark.parametrize("unit", ["two vendors", "condenser", "cooler"])
def test_suggested_without_a_reaction_is_an_own_state(store: propdb.Store, tmp_path: Path, unit: str) -> None:
    found = suggestion(store, tmp_path, unit)
    assert not found["reaction"]
    assert store.datum_show(found["datum"]).kind == "own"


def test_suggested_with_a_reaction_conserves_its_zero(store: propdb.Store, tmp_path: Path) -> None:
    found = suggestion(store, tmp_path, "burner")
    assert found["reaction"]
    assert store.datum_show(found["datum"]).kind in ("elements", "basis")
    assert store.datum_show(found["runner_up"]).kind in ("elements", "basis")
    assert "species in and out differ" in found["reason"]


# -- provenance --------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("to", ["combustion-gross-25C", "elements-298K", "elements-same-T"])
def test_the_sidecar_names_what_heats_a_row(store: propdb.Store, tmp_path: Path, to: str) -> None:
    """Evaluated rows stand on the same entries as the answers for one state, those of the heat capacity among them."""
    states = [
        ("oxygen", "180C"),
        ("carbon dioxide", "180C"),
        ("methane", "400C"),
        ("water", "900C"),
        ("ethanol", "60C"),
    ]
    lines = ["species,phase,T [C]"]
    lines += [f"{name},{'l' if name == 'ethanol' else 'g'},{t.removesuffix('C')}" for name, t in states]
    (tmp_path / "in.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    kinds = store.convert_table(tmp_path / "in.csv", tmp_path / "out.csv", to=to).data["kinds"]
    for name, t in states:
        one = store.enthalpy(name, phase="l" if name == "ethanol" else "g", temperature=t, datum=to)
        (kind,) = [k for k in kinds if k["species"] == name]
        assert kind["from"] is None
        assert set(kind["entries"]) >= {step.entry for step in one.steps if step.entry}
        assert any(step.what == "heating" for step in one.steps) == (to != "elements-same-T" or name != "oxygen")


def run(store: propdb.Store, folder: Path, text: str, **options: Any) -> dict[str, Any]:
    (folder / "in.csv").write_text(text, encoding="utf-8")
    report = store.convert_table(folder / "in.csv", folder / "out.csv", overwrite=True, **options)
    return dict(report.data)


def test_the_duty_of_evaluated_rows_is_as_uncertain_as_the_heat_of_reaction(
    store: propdb.Store, tmp_path: Path
) -> None:
    """A stream that is written in two rows is as uncertain as in one: both stand on the same entries."""
    text = (
        "side,species,phase,T [C],flow [mol/s]\nin,carbon monoxide,g,25,2\nin,oxygen,g,25,1\n"
        "out,carbon dioxide,g,25,1\nout,carbon dioxide,g,25,0.5\nout,carbon dioxide,g,25,0.5\n"
    )
    found = run(store, tmp_path, text, to="elements-298K")["streams"]
    one = store.reaction("CO(g) + 1/2 O2(g) -> CO2(g)", temperature="25C")
    assert found["duty"] == pytest.approx(2 * one.value)
    assert found["duty_uncertainty"] == pytest.approx(2 * one.uncertainty)


@pytest.mark.parametrize("phase, pressure", [("l", ""), ("fluid", "10")])
def test_what_inlets_and_outlets_share_cancels_in_the_duty(
    store: propdb.Store, tmp_path: Path, phase: str, pressure: str
) -> None:
    text = f"side,species,phase,T [C],p [bar],flow [mol/s]\nin,water,l,25,1,2\nout,water,{phase},70,{pressure or 1},2\n"
    found = run(store, tmp_path, text, to="elements-298K")["streams"]
    state = {"phase": phase, "temperature": "70C", "pressure": f"{pressure}bar" if pressure else None}
    one = store.enthalpy("water", datum="own:l@25C", **state)
    assert one.uncertainty is not None
    assert found["duty"] == pytest.approx(2 * one.value, rel=1e-6)
    assert found["duty_uncertainty"] == pytest.approx(2 * one.uncertainty, rel=0.02)


def test_a_mixture_is_as_uncertain_as_its_parts_in_two_streams(store: propdb.Store, tmp_path: Path) -> None:
    """At the temperature of the state both stand on the heat capacities of the same elements."""
    mixed = "side,x[carbon dioxide],x[carbon monoxide],phase,T [C],flow [mol/s]\nin,1,0,g,25,1\nout,0.5,0.5,g,25,4\n"
    apart = (
        "side,species,phase,T [C],flow [mol/s]\nin,carbon dioxide,g,25,1\n"
        "out,carbon dioxide,g,25,2\nout,carbon monoxide,g,25,2\n"
    )
    first = run(store, tmp_path, mixed, to="elements-298K")["streams"]
    second = run(store, tmp_path, apart, to="elements-298K")["streams"]
    assert first["duty"] == pytest.approx(second["duty"])
    assert first["duty_uncertainty"] == pytest.approx(second["duty_uncertainty"])
    assert first["duty_uncertainty"] > 0.0


def test_sources_without_an_uncertainty_are_named(store: propdb.Store, tmp_path: Path) -> None:
    text = "side,species,phase,T [C],flow [mol/s]\nin,nitrogen,g,25,1\nout,nitrogen,g,180,1\n"
    found = run(store, tmp_path, text, to="elements-298K")
    entry = next(iter(found["kinds"][0]["entries"]))
    assert found["streams"]["duty_uncertainty"] is None
    assert found["streams"]["duty_uncertainty_note"] == f"not stated by nasa-tp-2002-211556 [{entry[:8]}]"
    assert found["kinds"][0]["entries"] == {entry: "nasa-tp-2002-211556"}


def test_streams_that_enter_no_total_are_named(store: propdb.Store, tmp_path: Path) -> None:
    head = "side,species,datum,h [kJ/mol],flow [mol/s]\n"
    rows = [f"{side},nitrogen,gas-25C,1.0,{flow}" for side, flow in (("in", 2), ("Outlet", 1), ("up", 1), ("", 1))]
    found = run(store, tmp_path, head + "\n".join([*rows, "in,nitrogen,gas-25C,1.0,-1"]) + "\n", to="gas-25C")[
        "streams"
    ]
    assert (found["total_in"], found["total_out"]) == pytest.approx((1.0, 1.0))
    assert found["notes"] == [
        "neither in nor out, and in no total: side 'up'",
        "streams without a side are in no total",
        "1 row has a negative flow, which is added up with the sign",
    ]


#: A flow that carries 1 mol/s, in many units. Molar volumes at 0 °C and 1 atm, 60 °F and 1 atm: 22.41397 L/mol,
#: 379.484 ft3/lbmol; nitrogen has 28.014 g/mol (CIAAW, abridged).
UNITS = {
    "kmol/h": 3.6, "mol/min": 60.0, "lbmol/h": 3600 / 453.59237, "kg/h": 3.6 * 28.014, "t/d": 0.0864 * 28.014,
    "g/s": 28.014, "lb/hr": 3.6 * 28.014 / 0.45359237, "klb/h": 3.6e-3 * 28.014 / 0.45359237,
    "Nm3/h": 3.6 * 22.41397, "Nm³/h": 3.6 * 22.41397, "kNm3/h": 3.6e-3 * 22.41397,
    "scf/h": 3600 / 453.59237 * 379.484, "MMSCFD": 86400e-6 / 453.59237 * 379.484,
    "MMscf/d": 86400e-6 / 453.59237 * 379.484,
}  # fmt: skip


@pytest.mark.parametrize("unit", UNITS)
def test_units_of_flow(store: propdb.Store, tmp_path: Path, unit: str) -> None:
    text = f"species,datum,h [kJ/mol],flow [{unit}]\nnitrogen,gas-25C,1000.0,{UNITS[unit]!r}\n"
    found = run(store, tmp_path, text, to="gas-25C")["streams"]
    assert found["total"] == pytest.approx(1000.0, rel=2e-5)
    assert found["streams"][0]["flow_amount"] == pytest.approx(1.0, rel=2e-5)
