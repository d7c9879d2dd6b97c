"""What the package files give as a whole: every row accounted for, every entry with its origin."""

from __future__ import annotations

from collections import Counter, defaultdict

import pytest

from propdb.api import Store
from propdb.intake.package import Package
from propdb.intake.package.files import read_manifest
from propdb.intake.where import seed_root
from propdb.model.records import USABLE_STATUSES, Entry

#: Rows, rows that gave an entry, entries of chemicals 1.5.2.
COUNTS = {
    "atct-gas": (595, 595, 1190),
    "atct-liquid": (34, 34, 34),
    "janaf-constants": (950, 950, 4440),
    "crc-standard": (2470, 2460, 7147),
    "crc-vaporisation": (926, 926, 2241),
    "crc-fusion": (1112, 1111, 1111),
    "crc-ions": (173, 173, 480),
    "trc-gas": (1961, 1937, 3676),
    "poling-gas": (367, 364, 889),
    "perry-liquid": (332, 332, 332),
    "perry-vaporisation": (344, 344, 344),
    "perry-liquid-reduced": (11, 11, 11),
    "zabransky": (1292, 1267, 1267),
    "vdi-vaporisation": (272, 272, 272),
    "gharagheizi-vaporisation": (2723, 2619, 2619),
    "gharagheizi-sublimation": (1241, 1125, 1125),
    "albahri-gas": (571, 557, 557),
    "yaws-gas": (5030, 5003, 9871),
    "staveley-triple": (189, 189, 189),
    "iupac-critical": (810, 803, 1402),
    "crc-critical": (861, 856, 1663),
    "mathews-critical": (120, 118, 186),
    "psrk-critical": (995, 986, 2958),
    "janaf-gas": (889, 889, 889),
    "janaf-liquid": (221, 221, 221),
    "janaf-solid": (342, 319, 614),
    "crc-solids": (42, 42, 42),
    "perry-mixed": (477, 469, 469),
}


@pytest.fixture(scope="module")
def carried(package: Package) -> list[Entry]:
    """Entries that a file of the package carries."""
    if package.version != read_manifest(seed_root()).version:
        pytest.skip(f"chemicals {package.version} is installed, another version is recorded")
    return [e for e in package.content.entries if any(c.package == "chemicals" for c in e.carriers)]


def test_counts_of_each_file(package: Package, carried: list[Entry]) -> None:
    found = {r.key: (r.rows, r.used, r.entries) for r in package.reports if r.key in COUNTS}
    assert found == COUNTS
    assert not any(r.trouble for r in package.reports)
    (said,) = (r for r in package.reports if r.remark)
    assert said.key == "trc-gas"
    assert "formation enthalpies without a temperature" in said.remark


def test_every_row_is_an_entry_or_a_refusal(package: Package, carried: list[Entry]) -> None:
    rows: dict[str, set[int | None]] = defaultdict(set)
    for entry in carried:
        for carrier in entry.carriers:
            if carrier.package == "chemicals":
                rows[carrier.file].add(carrier.row)
    for report in package.reports:
        refused = {refusal.row for refusal in report.refusals}
        assert len(rows[report.file] | refused) == report.rows, report.key
        assert len(rows[report.file]) == report.used, report.key
        assert all(refusal.reason and refusal.kind for refusal in report.refusals)


def test_every_entry_has_its_origin(package: Package, carried: list[Entry]) -> None:
    keys = {source.key: source for source in package.content.sources}
    assert all(keys[key].title and keys[key].authors and keys[key].terms for key in {e.source for e in carried})
    for e in carried:
        where = f"{e.species} {e.quantity} {e.phase} {e.source}"
        assert e.source in keys, where
        assert e.locator.rpartition(": ")[2], where
        assert e.carried, where
        assert e.carried_unit, where
        assert all(c.file and c.version and c.how for c in e.carriers), where
        if e.quantity in ("Hf", "Gf"):
            assert e.datum or e.status == "datum-unknown", where
        if e.quantity in ("Hvap", "Hsub"):
            assert e.conditions, where
        if e.equation:
            assert (e.tmin is not None and e.tmax is not None) or "no range stated" in e.note, where
        elif e.quantity in ("Cp", "S", "Hf", "Gf", "Hvap", "Hsub", "dH0"):
            stated = e.temperature is not None or "no range stated" in e.note or e.status == "datum-unknown"
            assert stated, where


def test_what_must_be_reached(package: Package, carried: list[Entry]) -> None:
    species: dict[str, set[str]] = defaultdict(set)
    for e in package.content.entries:
        usable = e.status in USABLE_STATUSES
        species["any"].add(e.species)
        species[f"{e.quantity} {e.phase}"].add(e.species)
        if e.source != "yaws-2014":
            species[f"{e.quantity} {e.phase}, no Yaws"].add(e.species)
            if usable and e.source != "trc-1994":
                species[f"{e.quantity} {e.phase}, usable"].add(e.species)
        if e.equation and usable:
            species[f"{e.quantity}(T) {e.phase}"].add(e.species)
    least = {
        "any": 9500,
        "Hf g": 6500,
        "Hf g, no Yaws": 3600,
        "Hf g, usable": 2600,
        "Hf l": 1150,
        "Hf cr": 1100,
        "Cp(T) g": 2680,
        "Cp(T) l": 1150,
        "Cp(T) cr": 350,
        "Hvap l": 3000,
    }
    assert {name: len(species[name]) for name in least if len(species[name]) < least[name]} == {}


def test_nothing_undecided_is_usable(carried: list[Entry]) -> None:
    waiting = [e for e in carried if e.status == "datum-unknown"]
    assert waiting
    assert {(e.source, e.quantity, e.datum, e.temperature) for e in waiting} == {("trc-1994", "Hf", "", None)}


def test_ions_keep_charge_and_convention(package: Package, carried: list[Entry]) -> None:
    charge = {s.name: s.charge for s in package.content.species}
    for e in carried:
        if e.quantity == "Hf" and e.source == "atct-1.112" and e.temperature:
            expected = "elements-298K-electron-stationary" if charge[e.species] else "elements-298K"
            assert e.datum == expected, e.species
        if e.quantity == "Hf" and e.source == "chase-1998":
            assert e.datum == "elements-298K"
        assert e.phase in ("g", "aq") or not charge[e.species], e.species


def test_forms_are_kept_apart(carried: list[Entry]) -> None:
    forms = Counter((e.species, e.form) for e in carried if e.phase == "cr" and e.form)
    for wanted in (
        ("carbon", "graphite"),
        ("carbon", "diamond"),
        ("iron", "alpha"),
        ("iron", "gamma"),
        ("sulfur", "rhombic"),
        ("sulfur", "monoclinic"),
        ("tin", "grey"),
        ("phosphorus", "white"),
        ("silicon dioxide", "quartz"),
        ("titanium dioxide", "rutile"),
    ):
        assert forms[wanted], wanted
    assert not [e for e in carried if e.species == "methane" and e.phase == "cr" and e.quantity == "Cp"]


def test_coverage_of_the_store(full_store: Store, carried: list[Entry]) -> None:
    """A complete path: heat capacities over temperature in each phase and links between them; connected: walked."""
    found = full_store.store_info(coverage=True)
    assert found["species"] >= 9500
    for count in ("paths", "connected"):
        assert found[count]["liquid_to_gas"] >= 500, count
        assert found[count]["solid_to_gas"] >= 150, count
    totals = {(row["quantity"], row["phase"]): row for row in found["totals"]}
    assert totals["Hf", "g"]["stored"] >= 6500
    assert totals["Hf", "g"]["without_estimates"] >= 3600
    assert totals["Cp", "l"]["over_temperature"] >= 1150
    assert totals["Hvap", "l"]["usable"] >= 3000


def test_every_entry_of_the_store_says_where_it_comes_from(full_store: Store, carried: list[Entry]) -> None:
    """Source, locator, carrier, number and unit as carried; a range, or a temperature, or why there is none."""
    reader = full_store._reader
    count = 0
    for number, name in reader.conn.execute("SELECT id, name FROM species WHERE canon = id"):
        for e in reader.entries(name):
            count += 1
            where = f"{number} {e.species} {e.quantity} {e.phase} {e.source} {e.id}"
            assert e.source, where
            assert e.locator, where
            assert e.carriers, where
            assert all(c.how for c in e.carriers), where
            assert e.carried_unit, where
            assert e.carried or e.equation, where
            if e.equation:
                ranged = e.tmin is not None and e.tmax is not None and e.tmin < e.tmax
                assert ranged or "no range stated" in e.note, where
            elif e.quantity not in ("Tb", "Tm", "Tc", "Pc", "omega"):
                at = e.temperature is not None or e.status == "datum-unknown"
                assert at or "at the melting point" in e.conditions or "no range stated" in e.note, where
    assert count == full_store.store_info()["entries"]["active"]


def test_importing_again_changes_nothing(full_store: Store, package: Package) -> None:
    from propdb.store.write import build

    before = full_store.store_info()
    again = build(full_store.store_path(), package.content, versions={"chemicals": package.version})
    assert not again.changed
    assert again.content_hash == before["content_hash"]


def test_what_cannot_be_is_kept_and_not_used(package: Package, carried: list[Entry]) -> None:
    aside = {(e.species, e.quantity, e.phase, e.source) for e in carried if e.status == "quarantined"}
    for known in (
        ("titanium tetrachloride", "Hf", "l", "chase-1998"),  # +804 for -804 kJ/mol
        ("ethylbenzene", "Cp", "l", "zabransky-1996"),  # a first coefficient ten times too small
        ("phenanthrene", "Tc", "l", "iupac-critical"),  # 0.869 for 869 K
        ("(Z)-1,2-Diiodoethene", "Hf", "g", "crc-95"),
        ("dichlorodifluoromethane", "Hf", "g", "albahri-2013"),
        ("1,2-dimethoxyethane", "Cp", "l", "zabransky-1996"),
    ):
        assert known in aside
    assert len(aside) < 150
    assert not any(source == "atct-1.112" and species != "cyclopentadiene" for species, _, _, source in aside)


def test_the_report_of_the_build(full_store: Store, package: Package) -> None:
    short, long = full_store.store_intake(), full_store.store_intake(refused=True)
    assert [f["key"] for f in short["files"]] == [r.key for r in package.reports]
    assert short["rows"] == sum(f["used"] + f["refused"] for f in short["files"])
    assert len(long["refusals"]) == sum(len(r.refusals) for r in package.reports)
    assert {"key": "perry-mixed", "row": 255, "what": "7704-34-9 H2S", "species": "hydrogen sulfide"} in long["moved"]


def test_a_species_is_found_by_what_the_package_calls_it(full_store: Store) -> None:
    for typed, name in (
        ("toluene", "toluene"),
        ("108-88-3", "toluene"),
        ("methylbenzene", "toluene"),
        ("LFQSCWFLJHTTHZ-UHFFFAOYSA-N", "ethanol"),
        ("propan-2-one", "acetone"),
    ):
        assert full_store.find(typed)[0].name == name


def test_a_salt_is_found_before_a_radical_of_its_elements(full_store: Store) -> None:
    for typed, composition in (
        ("barium iodide", {"Ba": 1, "I": 2}),
        ("lead chloride", {"Pb": 1, "Cl": 2}),
        ("calcium bromide", {"Ca": 1, "Br": 2}),
        ("strontium iodide", {"Sr": 1, "I": 2}),
        ("barium hydroxide", {"Ba": 1, "O": 2, "H": 2}),
    ):
        assert dict(full_store.show(typed).species.composition) == composition


def test_every_species_has_a_name_and_most_an_inchikey(package: Package) -> None:
    """The identifiers of the package do not know a quarter of the CAS RNs in its files: those have no InChIKey."""
    species = package.content.species
    assert all((s.name and s.formula) or s.charge for s in species)
    assert len({s.name for s in species}) == len(species)
    assert sum(bool(s.inchikey) for s in species) > 7800


def test_an_element_is_not_evaporated_into_its_atoms(full_store: Store) -> None:
    """The latent heat of phosphorus is that of P4, and its phase g the atom: CODATA Key Values (1989), 316.5 kJ/mol."""
    atom = full_store.enthalpy("phosphorus", phase="g", temperature="298.15K", datum="elements-298K")
    assert atom.value == pytest.approx(316.5, abs=0.1)
