"""``propdb fuel``: from a template to a draft; and what is refused, with nothing written."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
from fuel_samples import sample

import propdb
from propdb.errors import InvalidInput, NotFound


@pytest.fixture
def here(own_store: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A directory with a store of its own and a name behind what is added."""
    monkeypatch.setenv("PROPDB_STORE", str(own_store))
    monkeypatch.setenv("PROPDB_USER", "First Engineer")
    monkeypatch.chdir(tmp_path)
    return tmp_path


def toml(data: dict[str, Any]) -> str:
    """A fuel as the file that a person would write."""
    top = [f"{key} = {value!r}" for key, value in data.items() if not isinstance(value, dict)]
    tables = [
        "\n".join([f"[{name}]", *(f"{key} = {value!r}" for key, value in table.items())])
        for name, table in data.items()
        if isinstance(table, dict) and table
    ]
    return "\n".join([*top, *tables]) + "\n"


def head() -> tuple[str, int]:
    with propdb.open() as store:
        info = store.store_info()
    return info["head"], info["species"]


def test_from_template_to_draft(line: Any, here: Path) -> None:
    (here / "chips.toml").write_text(line("fuel template").out, encoding="utf-8")
    before = head()
    dry = line("fuel add chips.toml --dry-run")
    assert dry.code == 0
    assert "nothing was written" in dry.err
    assert head() == before
    added = line("fuel add chips.toml")
    assert added.code == 0, added.err
    assert "draft" in added.err
    assert "20.200" in added.out
    assert head() != before
    shown = line("fuel show 'wood chips, example'")
    assert shown.out == added.out
    for words in ("as received", "dry, ash-free", "net", "constant pressure", "elements-298K", "Channiwala"):
        assert words in shown.out
    assert line("fuel add chips.toml").out == added.out  # the same again is the same
    with propdb.open() as store:
        entries = store.show("wood chips, example").entries
        assert [entry.quantity for entry in entries] == ["Hf"]
        assert store.store_check()["verdict"].startswith("sound")
    listed = line("show 'wood chips, example'").out
    assert "pseudo-species" in listed
    assert "combustion-gross-25C" in listed


def test_a_draft_enters_no_computation(line: Any, here: Path) -> None:
    (here / "chips.toml").write_text(line("fuel template").out, encoding="utf-8")
    assert line("fuel add chips.toml").code == 0
    words = "enthalpy 'wood chips, example' --phase cr --temperature 25C --datum combustion-gross-25C"
    assert "wood chips, example" in line(words).problem


def test_json_is_si_and_finite(line: Any, here: Path) -> None:
    (here / "wood.toml").write_text(toml(sample()), encoding="utf-8")
    found = json.loads(line("fuel add wood.toml --basis dry --json").out)
    assert found["basis"] == "dry"
    assert found["datum"] == "combustion-gross-25C"
    assert found["calorific_values"]["dry"]["gross constant volume"] == pytest.approx(20.2e6)
    assert found["fractions"]["as-received"]["moisture"] == pytest.approx(0.35)
    assert found["formation"]["dry"] < 0
    assert (found["status"], len(found["entry"])) == ("draft", 20)
    assert json.loads(line("fuel show 'test wood' --json").out) == found


def test_chlorine_goes_by_a_datum_that_has_it(line: Any, here: Path) -> None:
    data = sample(analysis__Cl="2.0", analysis__O="40.68")
    (here / "waste.toml").write_text(toml(data), encoding="utf-8")
    found = line("fuel add waste.toml")
    assert "combustion-gross-25C-HClgas" in found.out
    assert "as aqueous acid" in found.out


BAD: list[tuple[dict[str, Any], str, type[Exception], tuple[str, ...]]] = [
    ({"calorific_value__basis": None}, "", InvalidInput, ("fuel.toml", "basis is missing", "dry-ash-free")),
    ({"analysis__C": "45.0"}, "", InvalidInput, ("fuel.toml", "94.8 %", "5.2 short of 100 %")),
    ({"analysis__C": "-50.2"}, "", InvalidInput, ("[analysis] C", "negative")),
    ({"analysis__C": "120"}, "", InvalidInput, ("[analysis] C", "above 100 %")),
    ({"analysis__Na": "1"}, "", InvalidInput, ("'Na'", "keys are")),
    ({"moisture": {}}, "--basis as-received", InvalidInput, ("moisture is missing", "[moisture] as-received")),
    ({}, "--basis wet", InvalidInput, ("--basis", "'wet'", "as-received")),
    ({"source": "nobody-1900", "new-source": None}, "", NotFound, ("nobody-1900", "propdb source list")),
    ({"source": "codata-1989"}, "", InvalidInput, ("codata-1989", "CODATA", "choose another key")),
    ({"name": "ethanol"}, "", InvalidInput, ("'ethanol'", "choose another name")),
    ({"name": "C2H6O"}, "", InvalidInput, ("'C2H6O'", "choose another name")),
]


@pytest.mark.parametrize(("changes", "options", "kind", "words"), BAD, ids=[str(case[0]) for case in BAD])
def test_bad_fuel(
    line: Any, here: Path, changes: dict[str, Any], options: str, kind: Any, words: tuple[str, ...]
) -> None:
    data = sample(**{key.replace("-", "_"): value for key, value in changes.items()})
    (here / "fuel.toml").write_text(toml(data), encoding="utf-8")
    before = head()
    result = line(f"fuel add fuel.toml {options}")
    assert result.code == kind.exit_code
    for word in words:
        assert word in result.problem
    assert head() == before


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"", ("empty",)),
        (b"\xff\xfea\x00", ("UTF-16",)),
        (b"name = ", ("not TOML",)),
        (b"name = 'x\xe4'", ("UTF-8",)),
        (b"species,quantity\nwood,Hf\n", ("propdb fuel template",)),
        (b"<xml/>", ("propdb fuel template",)),
        (b"[[analysis]]\n", ("[analysis]",)),
    ],
)
def test_bad_file(line: Any, here: Path, content: bytes, words: tuple[str, ...]) -> None:
    name = "fuel.csv" if content.startswith(b"species") else "fuel.toml"
    (here / name).write_bytes(content)
    result = line(f"fuel add {name}")
    assert result.code == InvalidInput.exit_code
    for word in words:
        assert word in result.problem


def test_no_file_no_name_no_fuel(line: Any, here: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    assert "no such file" in line("fuel add nothing.toml").problem
    assert "was not added as a fuel" in line("fuel show ethanol").problem
    assert "no-such-fuel" in line("fuel show no-such-fuel").problem
    (here / "wood.toml").write_text(toml(sample()), encoding="utf-8")
    monkeypatch.delenv("PROPDB_USER")
    monkeypatch.setenv("PROPDB_CONFIG", str(here / "none.toml"))
    before = head()
    assert "PROPDB_USER" in line("fuel add wood.toml").problem
    assert head() == before


def test_another_composition_under_the_same_name(line: Any, here: Path) -> None:
    (here / "one.toml").write_text(toml(sample()), encoding="utf-8")
    assert line("fuel add one.toml").code == 0
    before = head()
    (here / "two.toml").write_text(toml(sample(analysis__C="49.2", analysis__O="43.68")), encoding="utf-8")
    assert "of another composition" in line("fuel add two.toml").problem
    assert head() == before
    # a second calorific value of the same fuel is a second entry
    (here / "three.toml").write_text(toml(sample(calorific_value__value="20.3 MJ/kg")), encoding="utf-8")
    assert line("fuel add three.toml").code == 0
    with propdb.open() as store:
        assert len(store.show("test wood").entries) == 2
