"""Fuels against published relations, ISO 1928 and ISO 6976 between gross and net, and against known substances.

The fuels themselves are invented; what is published are the relations. Their coefficients are rounded, and each check
allows half a unit of the last digit of every coefficient, times what it multiplies.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from contextlib import closing
from pathlib import Path
from typing import Any

import pytest
from fuel_samples import FUELS, fuel, sample

import propdb
from propdb.api import Store
from propdb.model.fuel import FuelSheet
from propdb.store import log
from propdb.store.open import open_store


@pytest.fixture(scope="module")
def sheets(store: Store) -> dict[str, FuelSheet]:
    """Every invented fuel, as a dry run gives it."""
    return {name: store.fuel_add(fuel(name), dry_run=True) for name in FUELS}


def percent(sheet: FuelSheet, basis: str) -> dict[str, float]:
    return {part: 100.0 * share for part, share in sheet.fractions[basis].items()}


def kilojoules(sheet: FuelSheet, what: str, basis: str) -> float:
    """A calorific value [J/g]."""
    return sheet.values[basis][what] / 1e3


# -- ISO 1928 ---------------------------------------------------------------------------------------------------------

#: Chlorine is not in the relations of ISO 1928.
NAMES = [name for name in FUELS if name != "waste"]


def net_at_constant_pressure(*, gross: float, h: float, o: float, n: float, m: float) -> float:
    """ISO 1928: from the dry gross value at constant volume [J/g]; H, O, N dry and moisture [mass %]."""
    return (gross - 212.0 * h - 0.8 * (o + n)) * (1.0 - 0.01 * m) - 24.43 * m


def net_at_constant_volume(*, gross: float, h: float, m: float) -> float:
    """ISO 1928, likewise."""
    return (gross - 206.0 * h) * (1.0 - 0.01 * m) - 23.05 * m


@pytest.mark.parametrize("name", NAMES)
def test_net_by_iso_1928(sheets: Mapping[str, FuelSheet], name: str) -> None:
    sheet = sheets[name]
    dry = percent(sheet, "dry")
    gross = kilojoules(sheet, "gross constant volume", "dry")
    for basis in sheet.fractions:
        if basis == "dry-ash-free":
            continue
        m = percent(sheet, basis)["moisture"]
        found = kilojoules(sheet, "net constant pressure", basis)
        expected = net_at_constant_pressure(gross=gross, h=dry["H"], o=dry["O"], n=dry["N"], m=m)
        rounding = 0.5 * dry["H"] + 0.05 * dry["O"] + 0.1 * dry["N"] + 0.005 * m
        assert found == pytest.approx(expected, abs=rounding)
        assert rounding < 1e-3 * gross
        found = kilojoules(sheet, "net constant volume", basis)
        expected = net_at_constant_volume(gross=gross, h=dry["H"], m=m)
        assert found == pytest.approx(expected, abs=0.5 * dry["H"] + 0.01 * m)


@pytest.mark.parametrize("name", NAMES)
def test_gross_at_constant_pressure(sheets: Mapping[str, FuelSheet], name: str) -> None:
    """The 212 of ISO 1928 is the 218.3 J/g that a percent of hydrogen takes to evaporate its water, less 6.15."""
    sheet = sheets[name]
    dry = percent(sheet, "dry")
    change = kilojoules(sheet, "gross constant pressure", "dry") - kilojoules(sheet, "gross constant volume", "dry")
    assert change == pytest.approx(6.15 * dry["H"] - 0.8 * (dry["O"] + dry["N"]), abs=0.05 * (dry["O"] + 2 * dry["N"]))


def test_a_wrong_relation_is_seen(sheets: Mapping[str, FuelSheet]) -> None:
    """Hydrogen and oxygen, or gross and net, exchanged; moisture forgotten."""
    sheet = sheets["wood"]
    dry, m = percent(sheet, "dry"), percent(sheet, "as-received")["moisture"]
    gross = kilojoules(sheet, "gross constant volume", "dry")
    found = kilojoules(sheet, "net constant pressure", "as-received")
    for wrong in (
        net_at_constant_pressure(gross=gross, h=dry["O"], o=dry["H"], n=dry["N"], m=m),
        net_at_constant_pressure(gross=found, h=dry["H"], o=dry["O"], n=dry["N"], m=m),
        net_at_constant_pressure(gross=gross, h=dry["H"], o=dry["O"], n=dry["N"], m=0.0),
    ):
        assert abs(wrong - found) > 500.0


@pytest.mark.parametrize("name", FUELS)
def test_bases_by_iso_1170(sheets: Mapping[str, FuelSheet], name: str) -> None:
    """ISO 1170: dry is 100/(100 - M) of as received, dry ash-free 100/(100 - A) of dry; so is the gross value."""
    sheet = sheets[name]
    received, dry, bare = (percent(sheet, basis) for basis in ("as-received", "dry", "dry-ash-free"))
    to_dry, to_bare = 100.0 / (100.0 - received["moisture"]), 100.0 / (100.0 - dry["ash"])
    for part in ("C", "H", "N", "S", "O", "Cl"):
        assert dry[part] == pytest.approx(received[part] * to_dry)
        assert bare[part] == pytest.approx(dry[part] * to_bare)
    assert dry["ash"] == pytest.approx(received["ash"] * to_dry)
    for at in ("volume", "pressure"):
        values = [kilojoules(sheet, f"gross constant {at}", basis) for basis in ("as-received", "dry", "dry-ash-free")]
        assert values[1] == pytest.approx(values[0] * to_dry)
        assert values[2] == pytest.approx(values[1] * to_bare)


# -- known substances -------------------------------------------------------------------------------------------------

WEIGHTS = {"C": 12.011, "H": 1.008, "O": 15.999}


def substance(
    name: str, atoms: Mapping[str, int], value: float, *, phase: str, kind: str = "gross"
) -> tuple[Any, float]:
    """A pure substance as a fuel, from its molar heat of combustion [kJ/mol]; and its molar mass [g/mol]."""
    mass = sum(WEIGHTS[element] * count for element, count in atoms.items())
    parts = {element: repr(100 * WEIGHTS[element] * count / mass) for element, count in atoms.items()}
    data = sample(phase=phase, name=f"{name} as a fuel", moisture={})
    data["analysis"] = {"basis": "dry", **parts}
    data["calorific-value"] = {
        "value": f"{value / mass!r} kJ/g", "kind": kind, "at": "constant pressure", "basis": "dry"
    }  # fmt: skip
    return data, mass


@pytest.mark.parametrize(
    ("name", "atoms", "phase", "burns", "forms"),
    # Heat of combustion: CRC Handbook of Chemistry and Physics, 95th ed., "Enthalpy of Combustion". Formation: Pedley,
    # Naylor, Kirby (1986), and for glucose the CRC Handbook [kJ/mol, 25 C].
    [
        ("benzene", {"C": 6, "H": 6}, "l", 3267.6, 49.0),
        ("ethanol", {"C": 2, "H": 6, "O": 1}, "l", 1366.8, -277.6),
        ("methanol", {"C": 1, "H": 4, "O": 1}, "l", 726.1, -239.1),
        ("n-octane", {"C": 8, "H": 18}, "l", 5470.5, -250.1),
        ("glucose", {"C": 6, "H": 12, "O": 6}, "cr", 2803.0, -1273.3),
    ],
)
def test_formation_from_combustion(
    store: Store, name: str, atoms: Mapping[str, int], phase: str, burns: float, forms: float
) -> None:
    data, mass = substance(name, atoms, burns, phase=phase)
    sheet = store.fuel_add(data, dry_run=True)
    # the counts of atoms are kept to five digits: up to 2e-5 of the formation enthalpies of the products
    assert sheet.formation["dry"] * mass / 1e6 == pytest.approx(forms, abs=0.35 + 2e-5 * burns)


@pytest.mark.parametrize(
    ("name", "atoms", "gross", "net"),
    # ISO 6976:2016, gross and net molar calorific value of the gas at 25 C [kJ/mol]; the phase does not enter what
    # separates them: half a mole of water an atom of hydrogen, 44.013 kJ/mol.
    [("methane", {"C": 1, "H": 4}, 890.58, 802.55), ("hydrogen", {"H": 2}, 285.83, 241.82)],
)
def test_net_by_iso_6976(store: Store, name: str, atoms: Mapping[str, int], gross: float, net: float) -> None:
    data, mass = substance(name, atoms, gross, phase="l")
    sheet = store.fuel_add(data, dry_run=True)
    assert sheet.values["dry"]["net constant pressure"] * mass / 1e6 == pytest.approx(net, abs=0.01)
    data, mass = substance(name, atoms, net, phase="l", kind="net")
    sheet = store.fuel_add(data, dry_run=True)
    assert sheet.values["dry"]["gross constant pressure"] * mass / 1e6 == pytest.approx(gross, abs=0.01)


def test_benzoic_acid_in_the_bomb(store: Store) -> None:
    """C7H6O2 + 7.5 O2 -> 7 CO2 + 3 H2O(l): half a mole of gas is gone, and R x 298.15 K is 2.479 kJ/mol."""
    # CRC Handbook of Chemistry and Physics, 95th ed., "Enthalpy of Combustion": 3226.9 kJ/mol
    data, mass = substance("benzoic acid", {"C": 7, "H": 6, "O": 2}, 3226.9, phase="cr")
    sheet = store.fuel_add(data, dry_run=True)
    assert sheet.values["dry"]["gross constant volume"] * mass / 1e6 == pytest.approx(3226.9 - 0.5 * 2.479, abs=0.001)


# -- on any datum -----------------------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def burning(store: Store, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Store]:
    """A store with every invented fuel, approved by a second person."""
    place = tmp_path_factory.mktemp("fuels") / "own.db"
    store.store_backup(place)
    with pytest.MonkeyPatch.context() as patch, propdb.open(place) as own:
        patch.setenv("PROPDB_USER", "First Engineer")
        for name in FUELS:
            sheet = own.fuel_add(fuel(name))
            assert sheet.status == "draft"
            with closing(open_store(place, write=True)) as conn:
                log.append(conn, "approved", entry=sheet.entry, who="Second Engineer")
    with propdb.open(place) as own:
        yield own


@pytest.mark.parametrize("name", FUELS)
def test_the_calorific_value_comes_back_on_the_combustion_datums(burning: Store, name: str) -> None:
    sheet = burning.fuel_show(f"test {name}")
    assert sheet.status == "approved"
    for kind in ("gross", "net"):
        answer = burning.enthalpy(
            sheet.name,
            phase=sheet.phase,
            temperature="25C",
            datum=sheet.datum.replace("gross", kind),
            unit="MJ/kg",
        )
        expected = sheet.values[sheet.basis][f"{kind} constant pressure"] / 1e6
        # gross to the digit carried; net to that of the counted atoms
        assert answer.value == pytest.approx(expected, abs=1e-6 if kind == "gross" else 1e-4)


@pytest.mark.parametrize("name", FUELS)
def test_its_formation_enthalpy_on_the_elements(burning: Store, name: str) -> None:
    sheet = burning.fuel_show(f"test {name}")
    answer = burning.enthalpy(sheet.name, phase=sheet.phase, temperature="25C", datum="elements-298K", unit="MJ/kg")
    assert answer.value == pytest.approx(sheet.formation[sheet.basis] / 1e6, abs=2e-6)
    assert answer.may_sum.reaction
    assert sheet.entry in {step.entry for step in answer.steps}
    # Cox, Wagman, Medvedev (1989), CODATA: formation of CO2, H2O(l), SO2 and HCl(g) [kJ/mol]
    atoms = {e: float(n) for e, n in burning.show(sheet.name).species.composition}
    chlorine = atoms.get("Cl", 0.0)
    products = -393.51 * atoms["C"] - 285.830 * (atoms["H"] - chlorine) / 2
    products += -296.81 * atoms.get("S", 0.0) - 92.31 * chlorine
    gross = sheet.values[sheet.basis]["gross constant pressure"] / 1e6
    assert answer.value == pytest.approx(gross + products, abs=2e-6)


def test_converting_between_them(burning: Store) -> None:
    sheet = burning.fuel_show("test coal")
    net = burning.convert(
        sheet.formation[sheet.basis] / 1e6,
        "MJ/kg",
        species="test coal",
        from_="elements-298K",
        to="combustion-net-25C",
        phase="cr",
        temperature="25C",
    )
    assert net.value == pytest.approx(sheet.values["as-received"]["net constant pressure"] / 1e6, abs=1e-4)


def test_the_uncertainty_is_that_of_the_calorific_value(store: Store, tmp_path: Path) -> None:
    """On the combustion datum the products cancel, and what the laboratory states is left; ISO 1928 names no other."""
    place = tmp_path / "own.db"
    store.store_backup(place)
    data = sample(calorific_value__uncertainty="0.12 MJ/kg", calorific_value__uncertainty_kind="expanded-95")
    with pytest.MonkeyPatch.context() as patch, propdb.open(place) as own:
        patch.setenv("PROPDB_USER", "First Engineer")
        sheet = own.fuel_add(data, basis="dry")
        with closing(open_store(place, write=True)) as conn:
            log.append(conn, "approved", entry=sheet.entry, who="Second Engineer")
    with propdb.open(place) as own:
        answer = own.enthalpy("test wood", phase="cr", temperature="25C", datum="combustion-gross-25C", unit="MJ/kg")
    assert answer.value == pytest.approx(20.204, abs=1e-3)
    assert answer.uncertainty == pytest.approx(0.06, abs=1e-9)


def test_estimate_is_near_for_real_kinds_of_fuel_and_far_for_a_wrong_unit(store: Store) -> None:
    # Channiwala, Parikh (2002), Fuel 81, 1051: average absolute error 1.45 %
    assert not store.fuel_add(fuel("wood"), dry_run=True).remarks
    wrong = store.fuel_add(sample(calorific_value__value="20.2 kWh/kg"), dry_run=True)
    assert any("check its unit, kind and basis" in remark for remark in wrong.remarks)
