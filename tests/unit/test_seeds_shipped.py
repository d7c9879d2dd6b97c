"""The seed that ships: it loads as a whole, and holds what the rest relies on."""

from __future__ import annotations

import tomllib

import pytest

from propdb.datum import parse_inline, read_body, resolve
from propdb.intake.seeds import load_seed
from propdb.intake.where import seed_root
from propdb.store.content import Content, validate


@pytest.fixture(scope="module")
def content() -> Content:
    return load_seed(seed_root())


def test_it_is_a_base(content: Content) -> None:
    assert len(validate(content)) == len(content.entries)


def test_it_loads_the_same_twice(content: Content) -> None:
    again = load_seed(seed_root(), identifiers=False)
    assert [e.id for e in again.entries] == [e.id for e in content.entries]
    assert again.datums == content.datums


def test_water_has_the_molar_mass_of_its_formulation(content: Content) -> None:
    """IAPWS R6-95(2018): M = 18.015268 g/mol."""
    (water,) = (s for s in content.species if s.name == "water")
    assert water.molar_mass == pytest.approx(0.018015268, abs=1e-12)
    (entry,) = (e for e in content.entries if e.equation == "iapws95")
    assert (entry.species, entry.phase, entry.tmin, entry.tmax) == ("water", "fluid", 273.16, 1273.0)
    assert (entry.uncertainty, entry.uncertainty_unit, entry.uncertainty_kind) == (0.001, "%", "class")


def test_pseudo_species_and_associating_vapours(content: Content) -> None:
    species = {s.name: s for s in content.species}
    assert species["dry air"].kind == "pseudo"
    assert species["dry air"].molar_mass == pytest.approx(0.028965, abs=2e-6)  # NASA/TP-2002-211556: 28.9651 g/mol
    assert {n for n, s in species.items() if s.vapour == "associating"} >= {
        "acetic acid",
        "formic acid",
        "hydrogen fluoride",
    }


def test_each_datum_reads_back_from_the_base(content: Content) -> None:
    datums = {name: read_body(name, body) for name, body in content.datums.items()}
    assert resolve("gas-25C", datums).zero == parse_inline("own:g@25C").zero


def test_each_entry_cites_a_source_and_says_how_it_came(content: Content) -> None:
    keys = {s.key for s in content.sources}
    for entry in content.entries:
        assert entry.source in keys
        assert entry.locator
        assert entry.carried
        assert entry.carriers
        assert not entry.printed


def test_quarantined_records_say_why(content: Content) -> None:
    for entry in content.entries:
        assert entry.status in ("base", "estimate", "quarantined")
        if entry.status == "quarantined":
            assert "do not meet" in entry.note or "off the stated" in entry.note, entry


def test_no_rank_names_a_source_that_nobody_carries(content: Content) -> None:
    """Sources of the chemicals library are outside the seed; every other rank is of a seed folder."""
    elsewhere = set(tomllib.loads((seed_root() / "_package" / "sources.toml").read_text(encoding="utf-8"))["source"])
    keys = {s.key for s in content.sources}
    for group in content.policy["ranks"]["rank"]:
        assert set(group["sources"]) <= keys | elsewhere
