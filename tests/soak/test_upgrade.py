"""A store that people worked in, built anew from another seed and library: their data stay; answers tell of changes."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import chemicals
import pytest
from soak_samples import Row, change_rows, copy_seed, template_csv

import propdb
from propdb.api import Store, opening
from propdb.datum.writing import dump_toml
from propdb.store.backup import check

#: Species whose entries are taken: what the answers below need.
FEW = {"water", "carbonate ion", "methane", "ammonia", "carbon dioxide", "carbon", "hydrogen", "oxygen", "nitrogen"}
CODATA = "codata-1989/entries.csv"
NBS = "nbs-1982/entries.csv"


def entry(store: Store, species: str, phase: str, source: str, quantity: str = "Hf") -> str:
    """Id of the one entry of a source."""
    (found,) = store.show(species, quantity=quantity, phase=phase, source=source).entries
    return found.id


def edited(rows: list[Row], species: str, quantity: str, phase: str, change: Callable[[Row], Row | None]) -> list[Row]:
    """Rows with one of them changed, or dropped."""
    (place,) = [i for i, row in enumerate(rows) if row[:3] == [species, quantity, phase]]
    new = change(rows[place])
    return [*rows[:place], *([] if new is None else [new]), *rows[place + 1 :]]


def with_value(value: str) -> Callable[[Row], Row]:
    return lambda row: [*row[:6], value, *row[7:]]


def answer(store: Store, species: str, phase: str) -> tuple[float, list[str]]:
    """Enthalpy of formation [kJ/mol], and what is said about the latest base."""
    found = store.enthalpy(species, phase=phase, temperature="25C", datum="elements-298K")
    assert found.as_dict()["warnings"] == list(found.warnings)
    return found.value, [text for text in found.warnings if "the base of" in text]


@pytest.fixture(scope="module")
def upgraded(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, dict[str, Any]]:
    """A store with own data and decisions after the upgrade, and what it was before."""
    folder = tmp_path_factory.mktemp("upgrade")
    path = folder / "own.db"
    first, seed = (copy_seed(folder / name, keep=lambda row: row[0] in FEW) for name in ("first", "second"))
    change_rows(seed / CODATA, lambda rows: edited(rows, "water", "Hf", "l", with_value("-285.900")))
    change_rows(seed / CODATA, lambda rows: edited(rows, "carbonate ion", "Hf", "aq", lambda row: None))
    change_rows(seed / CODATA, lambda rows: [*rows, _new_row(rows, "methane", "-74.500", "CH4 (g)")])
    change_rows(seed / NBS, lambda rows: edited(rows, "water", "Hf", "g", lambda row: None))
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("propdb.intake.where.seed_root", lambda: first)
        opening.build_seed(path, None)
    with pytest.MonkeyPatch.context() as patch, propdb.open(path) as store:
        was = _work(store, folder, patch)
        before = {
            name: answer(store, *name.rsplit(" ", 1))
            for name in ("water l", "water g", "carbonate ion aq", "methane g", "ammonia g")
        }
        assert not any(said for _, said in before.values())  # there is one base only
        was["values"] = {name: value for name, (value, _) in before.items()}
        patch.setattr("propdb.intake.where.seed_root", lambda: seed)
        patch.setattr(chemicals, "__version__", "99.9.9")
        was["first"] = first
        was["built"] = store.store_rebuild()
    return path, was


def _new_row(rows: list[Row], species: str, value: str, locator: str) -> Row:
    (like,) = [row for row in rows if row[:3] == ["water", "Hf", "g"]]
    return [species, *like[1:6], value, *like[7:12], locator, *like[13:]]


def _work(store: Store, folder: Path, patch: pytest.MonkeyPatch) -> dict[str, Any]:
    """Own entries, a species, a source, a datum, and a decision of every kind by two people."""
    (folder / "own.csv").write_text(template_csv("own"), encoding="utf-8")
    works = dump_toml(store.datum_show("own:l@65C")).replace("own-l-65C", "works-65C")
    (folder / "datum.toml").write_text(works, encoding="utf-8")
    ids = {name: entry(store, *name.rsplit(" ", 2)) for name in ("water l codata-1989", "carbonate ion aq codata-1989")}
    ids |= {name: entry(store, *name.rsplit(" ", 2)) for name in ("water g nbs-1982", "water g codata-1989")}
    patch.setenv("PROPDB_USER", "ada")
    own = [found.id for _, found in store.add(folder / "own.csv").taken]
    store.datum_add(folder / "datum.toml")
    store.review_dispute(ids["water g codata-1989"], comment="does not close")
    patch.setenv("PROPDB_USER", "ben")
    store.store_setting("self-review", "off")
    store.review_check(own[:2], comment="read twice")
    store.review_approve(own[0])
    store.review_check(ids["water l codata-1989"], comment="as printed")
    store.review_waive(ids["water g codata-1989"], comment="a slip of ours")
    store.review_waive(own[0], finding="bounds", comment="it is so")
    store.review_waive(ids["carbonate ion aq codata-1989"], finding="bounds", comment="it is so")
    store.review_withdraw(ids["water g nbs-1982"], comment="older")
    return {
        "ids": ids,
        "own": {id: store.entry_show(id) for id in own},
        "events": store.store_log().lines,
        "history": {id: store.entry_history(id) for id in own},
        "datum": store.datum_show("works-65C"),
        "source": store.source_show("sheet-own"),
        "species": store.show("solvent own").species,
        "versions": store.store_log().lines[0].event.payload["versions"],
    }


def test_own_data_statuses_and_history_are_as_they_were(upgraded: tuple[Path, dict[str, Any]]) -> None:
    path, was = upgraded
    assert check(path) == []
    with propdb.open(path) as store:
        assert {id: store.entry_show(id) for id in was["own"]} == was["own"]
        assert [found.status for found in was["own"].values()] == ["approved", "checked", "draft"]
        assert {id: store.entry_history(id) for id in was["history"]} == was["history"]
        *before, base = store.store_log().lines
        assert tuple(before) == was["events"]
        assert base.event.kind == "base"
        assert store.datum_show("works-65C") == was["datum"]
        assert store.source_show("sheet-own") == was["source"]
        assert store.show("solvent own").species == was["species"]
        assert base.event.payload["versions"] == {**was["versions"], "chemicals": "99.9.9"}


def test_what_was_decided_about_the_base_holds_and_what_it_lost_is_told(
    upgraded: tuple[Path, dict[str, Any]],
) -> None:
    path, was = upgraded
    ids = was["ids"]
    assert (was["built"]["entries_added"], was["built"]["entries_inactive"]) == (2, 3)
    with propdb.open(path) as store:
        kept = ids["water g codata-1989"]
        assert [one.kind for one in store.entry_history(kept)] == ["base", "disputed", "waived"]
        assert store.entry_show(kept).status == "base"
        for gone, kinds in (
            ("water l codata-1989", ["base", "checked", "base"]),
            ("carbonate ion aq codata-1989", ["base", "waived", "base"]),
            ("water g nbs-1982", ["base", "withdrawn", "base"]),
        ):
            happened = store.entry_history(ids[gone])
            assert [one.kind for one in happened] == kinds
            assert happened[-1].comment == "the base no longer holds it"
            with pytest.raises(propdb.NotFound, match="no longer holds it"):
                store.entry_show(ids[gone])


def test_answers_whose_entry_changed_say_so(upgraded: tuple[Path, dict[str, Any]]) -> None:
    path, was = upgraded
    values = was["values"]
    ids = was["ids"]
    with propdb.open(path) as store:
        value, said = answer(store, "water", "l")
        new, old = entry(store, "water", "l", "codata-1989"), ids["water l codata-1989"]
        assert (values["water l"], value) == pytest.approx((-285.83, -285.9), abs=1e-6)
        (text,) = said
        assert re.fullmatch(
            rf"water: Hf of codata-1989 \[{new[:8]}\] replaced \[{old[:8]}\], which was checked here, with the base of"
            r" \d{4}-\d\d-\d\d: -285\.830 kJ/mol became -285\.900 kJ/mol",
            text,
        )
        derivation = store.enthalpy("water", phase="l", temperature="25C", datum="elements-298K").explain()
        assert text in " ".join(derivation.split())  # it breaks lines

        value, (text,) = answer(store, "carbonate ion", "aq")
        assert value != pytest.approx(values["carbonate ion aq"], abs=0.005)
        assert "comes first since the base of" in text
        assert (
            f"no longer holds that of codata-1989 [{ids['carbonate ion aq codata-1989'][:8]}], -675.23 kJ/mol" in text
        )

        value, (text,) = answer(store, "methane", "g")
        assert value == pytest.approx(-74.5, abs=1e-6)
        assert f"methane: Hf of codata-1989 [{entry(store, 'methane', 'g', 'codata-1989')[:8]}] is new" in text

        value, (text,) = answer(store, "water", "g")  # from the liquid and the heat of vaporisation
        assert value - values["water g"] == pytest.approx(-0.07, abs=1e-6)
        assert f"water: Hf of codata-1989 [{new[:8]}] replaced" in text
        assert answer(store, "ammonia", "g") == (pytest.approx(values["ammonia g"]), [])
        moved = store.convert("0 kJ/mol", species="water", from_="liquid-25C", to="elements-298K")
        burnt = store.reaction("CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)", temperature="25C")
        assert any("replaced" in text for text in moved.warnings)
        assert [text.split(":")[0] for text in burnt.warnings if "the base of" in text] == ["methane", "water"]


def test_the_next_base_speaks_of_its_own_changes(
    upgraded: tuple[Path, dict[str, Any]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path, was = upgraded
    copy = tmp_path / "back.db"
    monkeypatch.setattr("propdb.intake.where.seed_root", lambda: was["first"])
    with propdb.open(path) as store:
        store.store_backup(copy)
    with propdb.open(copy) as store:
        _, (changed,) = answer(store, "water", "l")
        assert store.store_rebuild()["changed"]
        value, (back,) = answer(store, "water", "l")
        assert value == pytest.approx(-285.83, abs=1e-6)
        assert "-285.900 kJ/mol became -285.830 kJ/mol" in back
        first = entry(store, "water", "l", "codata-1989")
        assert store.entry_show(first).status == "checked"  # as it was decided then
        utc = [line.event.utc for line in store.store_log().lines if line.event.kind == "base"]
    with propdb.open(copy, as_of=utc[1]) as store:
        assert answer(store, "water", "l")[1] == [changed]
    with propdb.open(copy, as_of=utc[0]) as store:
        assert answer(store, "water", "l")[1] == []
