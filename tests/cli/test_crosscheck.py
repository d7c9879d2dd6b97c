"""What other compilations say, as people and programs get to see it."""

from __future__ import annotations

import json
from typing import Any

import pytest

ENTHALPY = "enthalpy methane --phase g --temperature 1000K --datum elements-298K"
KEYS = {*"compilation temperature value difference allowed beyond independent relation package".split()}


def data(result: Any) -> Any:
    assert result.code == 0, result.err
    return json.loads(result.out)


def test_show_has_the_most_telling_check(line: Any) -> None:
    text = line("show methane --quantity Hf --phase g").out
    heading = next(one for one in text.splitlines() if "cross-check" in one)
    assert heading.index("status") < heading.index("cross-check") < heading.index("entry")
    row = next(one for one in text.splitlines() if "pedley-1986" in one)
    assert "+0.13 kJ/mol atct-1.112  independent" in row  # -74.4 against -74.534
    fusion = line("show methane --quantity Hfus").out
    assert "crc-95  same publication" in fusion.replace("           ", "  ")


def test_show_json(line: Any) -> None:
    (entry,) = data(line("show methane --quantity Hf --source pedley-1986 --json"))["entries"]
    network = entry["crosscheck"][0]
    assert set(network) == KEYS
    assert (network["compilation"], network["relation"], network["beyond"]) == ("atct-1.112", "independent", False)
    assert network["difference"] == pytest.approx(entry["value"] - network["value"])
    assert [c["independent"] for c in entry["crosscheck"]] == sorted(
        (c["independent"] for c in entry["crosscheck"]), reverse=True
    )


def test_entry_show_lists_them_all(line: Any) -> None:
    (entry,) = data(line("show methane --quantity Hf --source pedley-1986 --json"))["entries"]
    text = line(f"entry show {entry['id']}").out
    assert "Cross-check, the entry less what others have (chemicals " in text
    for check in entry["crosscheck"]:
        row = next(one for one in text.splitlines() if one.strip().startswith(check["compilation"]))
        assert check["relation"] in row
        assert ("shown only" in row) == (check["allowed"] is None)


def test_an_answer_carries_the_checks_of_its_entries(line: Any) -> None:
    answer = data(line(f"{ENTHALPY} --json"))
    used = {step["entry"] for step in answer["steps"]}
    assert {check["entry"] for check in answer["crosscheck"]} == used
    assert all(check["start"] is None for check in answer["crosscheck"])
    assert set(answer["crosscheck"][0]) == KEYS | {*"entry species quantity phase form source start unit".split()}
    text = line(ENTHALPY).out
    assert "Cross-check: the entries against other compilations" in text
    assert "298.15 to 1000 K" not in text.partition("Cross-check")[2]  # asked for only


def test_crosscheck_at_the_state_itself(line: Any) -> None:
    stored = data(line(f"{ENTHALPY} --json"))["crosscheck"]
    answer = data(line(f"{ENTHALPY} --crosscheck --json"))
    assert answer["crosscheck"][: len(stored)] == stored
    heating = {check["compilation"]: check for check in answer["crosscheck"] if check["start"] is not None}
    # NIST-JANAF Thermochemical Tables, 4th ed., CH4 (g): H(1000 K) - H(298.15 K) = 38.179 kJ/mol
    janaf = heating["chase-1998"]
    assert (janaf["start"], janaf["temperature"], janaf["unit"]) == (298.15, 1000.0, "J/mol")
    assert janaf["value"] == pytest.approx(38_179, abs=15)
    (step,) = (step for step in answer["steps"] if step["what"] == "heating")
    assert janaf["difference"] == pytest.approx(1000.0 * step["value"] - janaf["value"])
    assert "298.15 to 1000 K" in line(f"{ENTHALPY} --crosscheck").out


@pytest.mark.parametrize(
    "command",
    [
        'reaction "CH4(g) + H2O(g) -> CO(g) + 3 H2(g)" --temperature 1000K',
        "convert 0 kJ/mol --species nitrogen --from gas-25C --to gas-0C",
    ],
)
def test_crosscheck_means_the_same_everywhere(line: Any, command: str) -> None:
    answer = data(line(f"{command} --crosscheck --json"))
    assert [check for check in answer["crosscheck"] if check["start"] is not None]


def test_a_disputed_entry_says_so_with_the_numbers(line: Any) -> None:
    ask = "enthalpy 'hydrogen cyanide' --phase g --temperature 298.15K --datum elements-298K"
    answer = data(line(f"{ask} --json"))
    assert answer["steps"][0]["source"] == "nasa-tp-2002-211556"  # disputed, and still the best there is
    (warning,) = (one for one in answer["warnings"] if "is disputed" in one)
    assert "atct-1.112 has 129.29 kJ/mol" in warning
    assert "verdict: superseded" in warning


def test_source_show_draws_the_chain(line: Any) -> None:
    text = line("source show crc-95").out
    tree = text.partition("Lineage: what it copies or refits")[2]
    assert "\n  +- codata-1989: " in tree
    chase = tree.partition("+- chase-1998: ")[2]
    assert chase.partition("+- ")[0].endswith("\n  |  ")  # what it copies in turn hangs below it
    found = data(line("source show crc-95 --json"))
    assert "codata-1989" in {one["copies"] for one in found["lineage"]}
    assert "crc-95" in data(line("source show codata-1989 --json"))["copied_by"]
    assert "copied by " in line("source show codata-1989").out


def test_a_compilation_that_is_only_compared_with_can_be_looked_up(line: Any) -> None:
    text = line("source show atct-1.112").out
    assert "Active Thermochemical Tables" in text
    assert "No entry comes from it" in text
    assert "atct" in line("source show atct").problem


def test_add_compares_before_it_writes(line: Any, tmp_path: Any) -> None:
    row = tmp_path / "row.csv"
    row.write_text(
        "species,quantity,phase,temperature,value,unit,datum,source,locator\n"
        "methane,Hf,g,298.15K,-70.0,kJ/mol,elements-298K,pedley-1986,methane (g) once more\n",
        encoding="utf-8",
    )
    report = data(line("add", str(row), "--dry-run", "--json"))
    (taken,) = report["taken"]
    assert {check["compilation"] for check in taken["crosscheck"]} >= {"atct-1.112", "crc-95"}
    assert any(check["beyond"] for check in taken["crosscheck"])
