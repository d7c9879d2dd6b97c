"""Each verb does what its help says, in text and in JSON."""

from __future__ import annotations

import json
import math
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import pytest

import propdb
from propdb.model.records import QUANTITIES


def data(result: Any) -> Any:
    """JSON of a result; NaN and Infinity are refused."""
    assert result.code == 0, result.err
    return json.loads(result.out, parse_constant=lambda word: pytest.fail(f"{word} in JSON"))


def test_version_carries_the_caution(line: Any) -> None:
    result = line("propdb --version")
    assert result.code == 0
    assert result.out.startswith(f"propdb {propdb.__version__}\n")
    assert "engineering judgement" in result.out
    assert "local codes" in result.out
    assert "verif" in result.out


def test_no_arguments_show_the_help(line: Any) -> None:
    assert line("propdb").out == line("propdb --help").out
    assert line("propdb datum").out == line("propdb datum --help").out
    assert line("propdb").code == 0


def test_find(line: Any) -> None:
    for text in ("water", "H2O", "OH2", "7732-18-5", "XLYOFNOQVPJJNP-UHFFFAOYSA-N"):
        found = data(line("find", text, "--json"))["matches"]
        assert found[0]["name"] == "water", text
        assert set(found[0]) == {"name", "formula", "cas", "inchikey", "score"}
    assert line("find water").out.splitlines()[1].split()[:3] == ["water", "H2O", "7732-18-5"]


def test_find_takes_words_without_quotes(line: Any) -> None:
    assert line("find carbon dioxide").out == line("find", "carbon dioxide").out


def test_find_limits(line: Any) -> None:
    assert len(data(line("find e --limit 3 --json"))["matches"]) <= 3


def test_show_text_says_what_each_value_is(line: Any) -> None:
    text = line("show water --quantity Hf").out
    assert "Hf: enthalpy of formation" in text
    row = next(row for row in text.splitlines() if "-285.830" in row and "codata-1989" in row)
    for part in ("l", "298.15 K", "kJ/mol", "± 0.040 (95 %)", "elements-298K"):
        assert part in row
    assert "CODATA Key Values" in text.split("Sources")[1]


def test_show_text_has_the_coefficients(line: Any) -> None:
    text = line("show nitrogen --quantity Cp --phase g").out
    assert "cp/R = a1/T^2 + a2/T + a3" in text
    assert "200 to 1000 K" in text


def test_show_json_keeps_its_contract(line: Any) -> None:
    found = data(line("show water --json"))
    assert found["species"]["name"] == "water"
    keys = {*"id quantity phase form equation value unit carried tmin tmax uncertainty datum conditions".split()}
    keys |= {*"status source locator carriers crosscheck".split()}
    for entry in found["entries"]:
        assert keys <= set(entry)
        assert entry["quantity"] in QUANTITIES
        assert entry["source"]
        assert entry["carriers"]
        assert entry["value"] is None or math.isfinite(entry["value"])


def test_show_filters(line: Any) -> None:
    everything = data(line("show water --json"))["entries"]
    some = data(line("show water --quantity Hf --phase l --source codata-1989 --json"))["entries"]
    assert some == [
        entry
        for entry in everything
        if (entry["quantity"], entry["phase"], entry["source"]) == ("Hf", "l", "codata-1989")
    ]
    assert some


ANSWER_KEYS = {*"value unit uncertainty datum may_sum species state steps closures crosscheck warnings store".split()}


def test_enthalpy(line: Any) -> None:
    command = "enthalpy nitrogen --phase g --temperature 600C --datum gas-25C --unit kJ/mol"
    found = data(line(command + " --json"))
    assert set(found) >= ANSWER_KEYS
    assert found["value"] == pytest.approx(17.39, rel=2e-3)  # common practice, no source
    assert found["unit"] == "kJ/mol"
    for step in found["steps"]:
        assert {"what", "from", "to", "value", "unit", "entry", "source", "extrapolated"} <= set(step)
    text = line(command).out
    assert text.splitlines()[0].startswith("nitrogen")
    assert "Sources" in text


def test_convert_there_and_back(line: Any) -> None:
    there = data(
        line("convert 2800.8 kJ/kg --species water --from steam-triple-point --to elements-298K --unit kJ/mol --json")
    )
    assert there["value"] == pytest.approx(-237.263, abs=0.01)  # common practice, no source
    back = data(
        line("convert", repr(there["value"]), "kJ/mol", "--species", "water", "--from", "elements-298K", "--to",
             "steam-triple-point", "--unit", "kJ/kg", "--json")
    )  # fmt: skip
    assert back["value"] == pytest.approx(2800.8, rel=1e-9)


def test_convert_answers_in_the_unit_given(line: Any) -> None:
    assert data(line("convert 10 kJ/mol --species nitrogen --from gas-25C --to gas-0C --json"))["unit"] == "kJ/mol"
    assert data(line("convert 10 BTU/lb --species nitrogen --from gas-25C --to gas-0C --json"))["unit"] == "BTU/lb"


@pytest.mark.parametrize("value", ["-393.51", "\u2212393.51", "-.39351e3"])
def test_negative_numbers_are_arguments(line: Any, value: str) -> None:
    words = ["--species", "carbon dioxide", "--from", "elements-298K", "--to", "combustion-net-25C", "--json"]
    apart = data(line("convert", value, "kJ/mol", *words))
    joined = data(line("convert", f"{value} kJ/mol", *words))
    assert apart["value"] == pytest.approx(0.0, abs=0.05)
    assert joined["value"] == apart["value"]


def test_negative_numbers_are_option_values(line: Any) -> None:
    words = "enthalpy nitrogen --phase g --datum gas-25C --json --temperature"
    one, two = (data(line(f"{words}{between}-10C")) for between in (" ", "="))
    assert one == two
    assert one["value"] < 0


def test_reaction(line: Any) -> None:
    found = data(line("reaction", "CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)", "--temperature", "25C", "--json"))
    assert found["value"] == pytest.approx(-890.58, abs=0.1)  # ISO 6976:2016, gross molar calorific value at 25 °C
    half = data(line("reaction", "H2(g) + 1/2 O2(g) -> H2O(l)", "--temperature", "25C", "--json"))
    assert half["value"] == pytest.approx(-285.83, abs=0.1)  # ISO 6976:2016


def test_datum_list_and_show(line: Any) -> None:
    names = [datum["name"] for datum in data(line("datum list --json"))["datums"]]
    assert {"elements-298K", "gas-25C", "steam-triple-point", "combustion-gross-25C"} <= set(names)
    text = line("datum list").out
    for name in names:
        assert name in text
        shown = data(line("datum", "show", name, "--json"))
        assert shown["name"] == name
        assert shown["sentence"]
        assert shown["sentence"] in " ".join(text.split())
        assert line("datum", "show", name).code == 0


def test_a_datum_printed_as_toml_can_be_added(line: Any, own_store: Path, tmp_path: Path) -> None:
    printed = line("datum show own:g@50C --toml").out.replace("[datum.own-g-50C]", "[datum.gas-50C]")
    file = tmp_path / "mine.toml"
    file.write_text(printed, encoding="utf-8")
    added = line("datum", "add", str(file), "--store", str(own_store))
    assert (added.code, added.out, added.err) == (0, "", "added gas-50C\n")
    command = [
        "enthalpy",
        "nitrogen",
        "--phase",
        "g",
        "--temperature",
        "100C",
        "--json",
        "--store",
        str(own_store),
        "--datum",
    ]
    assert data(line(*command, "gas-50C"))["value"] == data(line(*command, "own:g@50C"))["value"]
    again = line("datum", "add", str(file), "--store", str(own_store))
    assert "exists" in again.problem


def test_source_list_show_cite(line: Any) -> None:
    sources = data(line("source list --json"))["sources"]
    assert "codata-1989" in {source["key"] for source in sources}
    text = line("source list").out
    for source in sources:
        key = source["key"]
        assert key in text
        assert data(line("source", "show", key, "--json")) == source
        assert source["terms"]
        assert line("source", "cite", key, "--format", "bibtex").out.startswith("@")
        (item,) = data(line("source", "cite", key, "--format", "csl-json"))
        assert item["id"] == key
        assert source["title"].rstrip(".") in line("source", "cite", key).out


def test_entry_show(line: Any) -> None:
    entry = data(line("show water --quantity Hf --json"))["entries"][0]
    whole = data(line("entry", "show", entry["id"], "--json"))
    assert whole == entry
    assert data(line("entry", "show", entry["id"][:12], "--json")) == entry
    text = line("entry", "show", entry["id"]).out
    assert entry["id"] in text
    assert entry["carried"]["number"] in text
    assert entry["source"] in text


def test_store_info_check_path(line: Any, default_store: Path) -> None:
    assert line("store path").out.strip() == str(default_store)
    info = data(line("store info --json"))
    assert info["entries"]["active"] > 0
    assert info["content_hash"] in line("store info").out
    covered = data(line("store info --coverage --json"))
    assert {"species", "coverage", "paths"} <= set(covered)
    assert {"liquid_to_gas", "solid_to_gas"} <= set(covered["paths"])
    for row in covered["coverage"]:
        assert set(row) == {"quantity", "phase", "source", "species", "entries"}
    assert "coverage" in line("store info --coverage").out
    assert line("store check").code == 0


def test_show_begins_with_what_answers_use(line: Any) -> None:
    """Of each phase; what has no part in answers stands last, and what is at another temperature behind."""
    for name, phase in (("ammonia", "g"), ("carbon dioxide", "g"), ("water", "l"), ("toluene", "g")):
        entries = [e for e in data(line("show", name, "--json"))["entries"] if e["phase"] == phase]
        used = data(
            line("enthalpy", name, "--phase", phase, "--temperature", "25C", "--datum", "elements-298K", "--json")
        )
        first = next(e for e in entries if e["quantity"] == "Hf")
        assert first["id"] in [step["entry"] for step in used["steps"]]
        fit = [e["status"] != "quarantined" for e in entries if e["quantity"] == "Hf"]
        assert fit == sorted(fit, reverse=True)
    curves = [bool(e["equation"]) for e in entries if e["quantity"] == "Cp" and e["status"] != "quarantined"]
    assert curves == sorted(curves, reverse=True)


def test_store_backup_and_rebuild(line: Any, own_store: Path, tmp_path: Path) -> None:
    copy = tmp_path / "copy.db"
    done = line("store", "backup", str(copy), "--store", str(own_store))
    assert (done.code, done.out) == (0, "")
    hashes = {
        data(line("store", "info", "--json", "--store", str(store)))["content_hash"] for store in (copy, own_store)
    }
    assert len(hashes) == 1
    assert line("store", "backup", str(copy), "--store", str(own_store)).problem
    assert line("store", "rebuild", "--without-open-data", "--store", str(own_store)).code == 0
    assert data(line("store", "info", "--json", "--store", str(own_store)))["content_hash"] in hashes


def test_store_option_stands_before_or_after_the_verb(line: Any, own_store: Path) -> None:
    paths = [
        line("--store", str(own_store), "store", "path"),
        line("store", "--store", str(own_store), "path"),
        line("store", "path", "--store", str(own_store)),
        line("store", "path", f"--store={own_store}"),
    ]
    assert {path.out.strip() for path in paths} == {str(own_store)}
    assert line("--json", "find", "water").out == line("find", "water", "--json").out


def test_environment_names_the_store(line: Any, own_store: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("PROPDB_STORE", str(own_store))
    assert line("store path").out.strip() == str(own_store)


def test_a_missing_default_store_is_built(line: Any, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    fresh = tmp_path / "deep" / "er" / "propdb.db"
    monkeypatch.setenv("PROPDB_STORE", str(fresh))
    result = line("find water")
    assert result.code == 0
    assert fresh.exists()
    assert "building" in result.err
    assert "building" not in result.out


def test_as_of_shows_the_store_as_it_was(line: Any) -> None:
    today = datetime.now(UTC).date().isoformat()
    assert line(f"show water --as-of {today}").out == line("show water").out
    assert "lies in the future" in line("show water --as-of 2999-12-31").problem
    assert "2000-01-01" in line("show water --as-of 2000-01-01").problem


def test_output_for_a_terminal_that_knows_ascii_only() -> None:
    from cli.conftest import run_line

    result = run_line("show water --quantity Hf", encoding="ascii")
    assert result.code == 0
    assert "+/- 0.040" in result.out
    json.loads(run_line("show water --json", encoding="ascii").out)
