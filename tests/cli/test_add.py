"""``propdb add`` and ``propdb import``: reports, errors, and the questions of a terminal. All numbers are invented."""

from __future__ import annotations

import io
import json
import os
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from thermoml_samples import DENSITY, FUSION, HEAT_CAPACITY, curve, data_set, report

ROW = "ethanol,Hvap,l,25C,42.34,kJ/mol,to the real vapour,codata-1989,ethanol\n"
HEADER = "species,quantity,phase,temperature,value,unit,conditions,source,locator\n"


@pytest.fixture(autouse=True)
def _author(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("PROPDB_USER", "A. Tester")


@pytest.fixture
def here(tmp_path: Path, own_store: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A directory to work in, with a store of its own."""
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("PROPDB_STORE", str(own_store))
    return tmp_path


def test_a_template_is_printed_or_written_and_never_overwritten(line: Any, here: Path) -> None:
    printed = line("add --template csv")
    assert (printed.code, printed.err) == (0, "")
    assert line("add --template csv mine.csv").err == "wrote mine.csv\n"
    assert (here / "mine.csv").read_text(encoding="utf-8") == printed.out
    assert "the file exists" in line("add --template toml mine.csv").problem
    assert (here / "mine.csv").read_text(encoding="utf-8") == printed.out
    assert "there is no template 'xlsx'; templates are csv and toml" in line("add --template xlsx").problem
    assert "cannot be written" in line("add --template csv no/such/place.csv").problem


def test_from_template_to_draft(line: Any, here: Path) -> None:
    (here / "mine.csv").write_text(HEADER + ROW, encoding="utf-8")
    before = line("store info").out
    dry = line("add mine.csv --dry-run")
    assert "1 entry would be taken as drafts" in dry.out
    assert line("store info").out == before
    done = line("add mine.csv --json")
    found = json.loads(done.out)
    assert set(found) == {
        "file", "kind", "dry_run", "who", "taken", "skipped", "refused", "remarks", "new_species", "new_sources",
    }  # fmt: skip
    (taken,) = found["taken"]
    assert (taken["place"], taken["status"], taken["value"]) == ("row 2", "draft", 42340.0)
    assert line(f"entry show {taken['id']}").code == 0
    again = line("import mine.csv")
    assert "nothing taken" in again.out
    assert f"entry {taken['id']} (draft) is this value already" in again.out


def test_a_wrong_row_is_one_line_with_its_place(line: Any, here: Path) -> None:
    (here / "mine.csv").write_text(HEADER + ROW + ROW.replace("42.34", '"42,34"'), encoding="utf-8")
    before = line("store info").out
    result = line("import mine.csv")
    assert result.problem == (
        "propdb: mine.csv, row 3, column value: '42,34' has a comma; the decimal point is '.': 42.34"
    )
    assert result.code == 2
    dry = line("import mine.csv --dry-run")
    assert dry.code == 2
    assert "row 3, column value" in dry.out
    assert dry.err == "propdb: mine.csv: 1 thing is wrong; nothing would go in\n"
    assert line("store info").out == before


@pytest.mark.parametrize(
    "words, code, said",
    [
        ("import none.csv", 3, "there is no such file"),
        ("import .", 2, "this is a directory"),
        ("add paper.xml", 2, "`propdb import paper.xml`"),
        ("add", 2, "nothing to add"),
        ("import", 2, "type propdb import --help"),
        ("import odd.bin", 2, "none of the kinds"),
    ],
)
def test_what_cannot_be_read(line: Any, here: Path, words: str, code: int, said: str) -> None:
    (here / "paper.xml").write_text("<DataReport/>", encoding="utf-8")
    (here / "odd.bin").write_bytes(b"hello\n")
    result = line(words)
    assert said in result.problem
    assert result.code == code


def test_nobody_named(line: Any, here: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (here / "mine.csv").write_text(HEADER + ROW, encoding="utf-8")
    monkeypatch.delenv("PROPDB_USER")
    assert "PROPDB_USER" in line("add mine.csv").problem
    assert line("add mine.csv --dry-run").code == 0


@pytest.mark.extras
def test_a_file_of_mixtures_only_says_what_was_skipped(line: Any, here: Path) -> None:
    pytest.importorskip("defusedxml")
    parts = [data_set(DENSITY, "Liquid", [("290", "1")], of=(1, 2), number=n) for n in (1, 2)]
    (here / "paper.xml").write_text(report(*parts), encoding="utf-8")
    result = line("import paper.xml")
    assert result.code == 0
    assert result.out.splitlines()[0] == "paper.xml: nothing taken"
    assert result.out.count("ethanol + inventane") == 2
    assert "a mixture: only pure species are taken" in result.out


@pytest.mark.extras
def test_a_literature_file_reports_each_data_set(line: Any, here: Path) -> None:
    pytest.importorskip("defusedxml")
    fusion = data_set(FUSION, "Crystal", [("330", "50.0")], phases=("Crystal", "Liquid"), of=(2,), number=2)
    gas = data_set(HEAT_CAPACITY, "Gas", [("330", "50.0")], number=3)
    (here / "paper.xml").write_text(report(curve(), fusion, gas), encoding="utf-8")
    found = json.loads(line("import paper.xml --json").out)
    assert [(one["place"], one["quantity"]) for one in found["taken"]] == [
        ("data set 1", "Cp"),
        ("data set 2, NumValues 1", "Hfus"),
    ]
    assert [one["place"] for one in found["skipped"]] == ["data set 3"]
    assert (found["new_species"], found["new_sources"]) == (["inventane"], ["nobody-2011"])
    assert line("source cite nobody-2011").code == 0
    assert line("show inventane").code == 0


# -- in a terminal ----------------------------------------------------------------------------------------------------


class Terminal(io.StringIO):
    """What somebody types into a terminal."""

    def isatty(self) -> bool:
        return True


Typed = Callable[..., Any]


@pytest.fixture
def typed(line: Any, here: Path, monkeypatch: pytest.MonkeyPatch) -> Typed:
    """Run ``propdb add`` with these answers."""

    def run(*answers: str, words: str = "add") -> Any:
        terminal = Terminal("\n".join(answers) + "\n")
        monkeypatch.setattr(sys, "stdin", terminal)
        result = line(words)
        assert result.code == 130 or terminal.read() == "", result.err
        return result

    return run


VALUE = ("ethanol", "Hvap", "l", "25C", "kJ/mol", "42.34", "", "to the real vapour", "codata-1989", "ethanol", "")


def test_questions_lead_to_a_draft(typed: Typed, line: Any) -> None:
    result = typed(*VALUE, "y")
    assert (result.code, "1 entry taken as drafts, by A. Tester" in result.out) == (0, True)
    assert "would be taken" in result.err  # what it comes to is shown before it is asked for
    assert "42.34" in line("show ethanol --quantity Hvap").out


def test_a_wrong_answer_is_asked_for_again(typed: Typed) -> None:
    result = typed(
        "ethanoll", "n", "ethanol", "hvap", "Hvap", "g", "l", "", "-300C", "25C", "kJ/mole", "kJ/mol", "42,34", "42.34",
        "much", "0.4", "95", "expanded-95", "", "to the real vapour", "codata-1998", "n", "codata-1989", "",
        "ethanol", "", "y",
    )  # fmt: skip
    assert result.code == 0
    for said in (
        "did you mean ethanol", "did you mean 'Hvap'", "it goes under l", "without a temperature", "below 0 K",
        "did you mean 'kJ/mol'", "the decimal point is '.': 42.34", "'much' is not a number",
        "unknown uncertainty_kind", "to which vapour", "did you mean 'codata-1989'", "locator is needed",
    ):  # fmt: skip
        assert said in result.err, said


def test_a_new_species_and_source_are_asked_for(typed: Typed, line: Any) -> None:
    result = typed(
        "my solvent", "y", "C10H22Oo", "C10H22O2", "", "", "Cp", "l", "polynomial", "280", "330", "J/mol/K", "0 1",
        "100 0.5", "", "2", "class", "1 bar", "sheet-7", "y", "report", "compilation", "2999", "2024",
        "Invented Works", "Data sheet 7", "", "", "table 1", "", "y",
    )  # fmt: skip
    assert result.code == 0
    assert "in the future" in result.err
    assert "'Oo' is not an element" in result.err
    assert "new species: my solvent" in result.out
    assert "280 to 330 K" in line("show", "my solvent").out


def test_leaving_leaves_no_trace(typed: Typed, line: Any) -> None:
    before = line("store info").out
    assert typed(*VALUE, "n").code == 0
    assert typed(*VALUE[:4]).code == 130
    dry = typed(*VALUE, words="add --dry-run")
    assert "would be taken" in dry.out
    assert line("store info").out == before
    typed(*VALUE, "y")
    assert "is this value already" in typed(*VALUE).out


@pytest.mark.skipif(os.name == "nt", reason="a pseudo-terminal")
def test_a_real_terminal_asks(here: Path) -> None:
    import pty
    import subprocess

    ours, theirs = pty.openpty()
    with subprocess.Popen(
        [sys.executable, "-m", "propdb", "add"], stdin=theirs, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    ) as process:
        os.close(theirs)
        os.write(ours, ("\n".join((*VALUE, "y")) + "\n").encode())
        out, err = process.communicate(timeout=120)
        os.close(ours)
    assert process.returncode == 0, err
    assert "1 entry taken" in out
