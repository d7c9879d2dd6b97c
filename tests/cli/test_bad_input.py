"""Bad input: one line that says what is wrong and what to type next, an exit code by class, nothing half-written."""

from __future__ import annotations

import sqlite3
import subprocess
import sys
from contextlib import closing
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from propdb.errors import (
    Ambiguous,
    DatumMismatch,
    FormulaError,
    IntegrityError,
    InvalidInput,
    NoData,
    NotFound,
    OutOfRange,
    PropdbError,
    StoreBusy,
    StoreError,
    TemperatureError,
    Unbalanced,
    UnitError,
)

N2 = "enthalpy nitrogen --phase g --datum gas-25C --temperature"
WATER = "convert 2800.8 kJ/kg --species water --from steam-triple-point --to"

# (command line, class of the error, words that its line must hold)
CASES: list[tuple[str, type[PropdbError], tuple[str, ...]]] = [
    # species
    ("show unobtainium", NotFound, ("unobtainium",)),
    ("show watr", NotFound, ("watr", "water")),
    ("show C2H6O", Ambiguous, ("ethanol", "dimethyl ether")),
    ("find zzzzqqqq", NotFound, ("zzzzqqqq",)),
    ("enthalpy C2H6O --phase g --temperature 25C --datum gas-25C", Ambiguous, ("ethanol",)),
    # quantity, phase, form, source, entry
    ("show water --quantity hf", NotFound, ("Hf",)),
    ("show water --quantity viscosity", NotFound, ("viscosity", "Hvap")),
    ("show water --phase gas", NotFound, ("'gas'", "g")),
    ("enthalpy water --phase steam --temperature 200C --datum elements-298K", NotFound, ("fluid",)),
    ("enthalpy carbon --phase cr --form soot --temperature 500C --datum elements-298K", NotFound, ("soot", "graphite")),
    ("show water --source codata-1998", NotFound, ("codata-1998", "propdb source list")),
    (f"{N2} 100C --source codata-1998", NotFound, ("codata-1998", "propdb source list")),
    ("source show nobody-1900", NotFound, ("nobody-1900",)),
    ("source cite codata-1989 --format endnote", InvalidInput, ("endnote", "bibtex")),
    ("entry show ffffffffffffffffffff", NotFound, ("ffffffffffffffffffff",)),
    # datum
    ("datum show gas-25", NotFound, ("gas-25", "gas-25C")),
    (f"{WATER} elements-298", NotFound, ("elements-298K",)),
    ("datum show own:q@25C", InvalidInput, ("'q'", "phase")),
    ("datum show own:l@-300C", InvalidInput, ("-300",)),
    ("datum show own:l", InvalidInput, ("own:l@65C",)),
    # unit
    (f"{N2} 100C --unit kJ/mole3", UnitError, ("kJ/mole3",)),
    (f"{N2} 100C --unit kW", UnitError, ("kW",)),
    (f"{N2} 100C --unit J/mol/K", UnitError, ("J/mol",)),
    (f"{N2} 100C --unit cal/mol", UnitError, ("cal_th/mol", "cal_IT/mol")),
    ("convert 10 bar --species water --from gas-25C --to gas-0C", UnitError, ("bar",)),
    ("convert 10 --species water --from gas-25C --to gas-0C", UnitError, ("unit",)),
    ("convert nan kJ/mol --species water --from gas-25C --to gas-0C", InvalidInput, ("nan",)),
    ("convert inf kJ/mol --species water --from gas-25C --to gas-0C", InvalidInput, ("inf",)),
    ("convert ten kJ/mol --species water --from gas-25C --to gas-0C", InvalidInput, ("ten",)),
    ("convert 1,5 kJ/mol --species water --from gas-25C --to gas-0C", InvalidInput, ("1.5",)),
    # temperature
    (f"{N2} 0K", TemperatureError, ("0 K",)),
    (f"{N2} -300C", TemperatureError, ("-300", "0 K")),
    (f"{N2} nan", TemperatureError, ("nan",)),
    (f"{N2} nanK", TemperatureError, ("nan",)),
    (f"{N2} 600", TemperatureError, ("600K", "600C")),
    (f"{N2} hot", TemperatureError, ("hot",)),
    (f"{N2} 600bar", UnitError, ("bar",)),
    (f"{N2} 50000K", OutOfRange, ("--extrapolate", "20000 K")),
    ("enthalpy nitrogen --phase g --datum gas-25C", InvalidInput, ("--temperature",)),
    # pressure, saturation
    (
        "enthalpy water --phase fluid --pressure 5barg --saturated vapour --datum elements-298K",
        InvalidInput,
        ("gauge",),
    ),
    ("enthalpy water --phase fluid --pressure -1bar --saturated vapour --datum elements-298K", InvalidInput, ("-1",)),
    ("enthalpy water --phase fluid --pressure 40bar --saturated gas --datum elements-298K", InvalidInput, ("vapour",)),
    # states that cannot be
    ("enthalpy water --phase l --temperature 400C --datum elements-298K", OutOfRange, ("critical",)),
    (
        "enthalpy water --phase fluid --pressure 300bar --saturated vapour --datum elements-298K",
        OutOfRange,
        ("220.64 bar",),
    ),
    # sums
    ("reaction 'CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)' --temperature 25C --datum gas-25C", DatumMismatch, ("gas-25C",)),
    ("reaction 'CH4(g) + O2(g) -> CO2(g) + 2 H2O(l)' --temperature 25C", Unbalanced, ("O",)),
    ("reaction 'sodium(cr) -> sodium ion(aq)' --temperature 25C", Unbalanced, ("charge",)),
    ("reaction 'CH4 + 2 O2 -> CO2 + 2 H2O' --temperature 25C", InvalidInput, ("phase",)),
    ("reaction 'CH4(g) + 2 O2(g)' --temperature 25C", FormulaError, ("->",)),
    ("reaction 'H2(g) + 1/0 O2(g) -> H2O(l)' --temperature 25C", FormulaError, ()),
    ("reaction '' --temperature 25C", FormulaError, ()),
    # the command line itself
    ("frobnicate", InvalidInput, ("frobnicate", "propdb --help")),
    ("fnd water", InvalidInput, ("propdb find",)),
    ("datum lst", InvalidInput, ("propdb datum list",)),
    ("show", InvalidInput, ("SPECIES", "propdb show --help")),
    ("show water ice", InvalidInput, ("propdb show --help",)),
    ("show water --colour red", InvalidInput, ("--colour",)),
    ("find water --limit many", InvalidInput, ("many",)),
    ("find water --limit 0", InvalidInput, ("0",)),
    ("find water --as-of yesterday", InvalidInput, ("yesterday",)),
    ("enthalpy nitrogen --phase g --temperature 25C", InvalidInput, ("--datum",)),
    ("convert 10 kJ/mol --from gas-25C --to gas-0C", InvalidInput, ("--species",)),
    ("--store", InvalidInput, ("--store",)),
    ("find \udcff", InvalidInput, ("UTF-8",)),
]


@pytest.mark.parametrize(("command", "kind", "words"), CASES, ids=[command for command, _, _ in CASES])
def test_one_clear_line(line: Any, command: str, kind: type[PropdbError], words: tuple[str, ...]) -> None:
    result = line(command)
    problem = result.problem
    assert result.code == kind.exit_code, problem
    for word in words:
        assert word in problem


def test_a_missing_formation_enthalpy_is_named(line: Any) -> None:
    problem = line("convert 1 kJ/mol --species 'ammonium chloride' --phase g --from gas-25C --to elements-298K")
    assert problem.code in (NoData.exit_code, NotFound.exit_code)
    assert problem.problem


# -- files -----------------------------------------------------------------------------------------------------------


def test_a_store_that_is_not_there(line: Any, tmp_path: Path) -> None:
    file = tmp_path / "nowhere.db"
    for words in (("--store", str(file), "find", "water"), ("find", "water", "--store", str(file))):
        result = line(*words)
        assert str(file) in result.problem
        assert result.code == StoreError.exit_code
    assert not file.exists()


def test_a_store_that_is_not_sqlite(line: Any, tmp_path: Path) -> None:
    file = tmp_path / "notes.db"
    for content in (b"dear diary\n" * 200, b"x", b"\x00" * 4096):
        file.write_bytes(content)
        result = line("find", "water", "--store", str(file))
        assert str(file) in result.problem
        assert result.code == StoreError.exit_code
        assert file.read_bytes() == content


def test_an_empty_store(line: Any, tmp_path: Path) -> None:
    file = tmp_path / "empty.db"
    file.touch()
    result = line("find", "water", "--store", str(file))
    assert "rebuild" in result.problem
    assert result.code == StoreError.exit_code


def test_rebuild_makes_a_store_where_there_is_none(line: Any, tmp_path: Path) -> None:
    """What the messages about a missing and an empty store tell to type must work."""
    (tmp_path / "empty.db").touch()
    for name in ("empty.db", "missing.db"):
        file = str(tmp_path / name)
        assert line("store", "rebuild", "--without-open-data", "--store", file).code == 0
        assert line("find", "water", "--store", file).code == 0


def test_a_directory_for_a_store(line: Any, tmp_path: Path) -> None:
    assert line("find", "water", "--store", str(tmp_path)).code == StoreError.exit_code


def test_a_truncated_store(line: Any, own_store: Path) -> None:
    whole = own_store.read_bytes()
    for size in (50, 512, 4096, len(whole) // 2, len(whole) - 4096):
        own_store.write_bytes(whole[:size])
        result = line("store", "check", "--store", str(own_store))
        assert result.problem
        assert result.code in (StoreError.exit_code, IntegrityError.exit_code)


def test_a_store_of_another_program(line: Any, tmp_path: Path) -> None:
    file = tmp_path / "other.db"
    with closing(sqlite3.connect(file)) as conn:
        conn.execute("CREATE TABLE stamps (country TEXT)")
        conn.commit()
    result = line("find", "water", "--store", str(file))
    assert "another program" in result.problem
    assert result.code == StoreError.exit_code


def test_a_store_of_a_newer_schema(line: Any, own_store: Path) -> None:
    with closing(sqlite3.connect(own_store)) as conn:
        conn.execute("PRAGMA user_version = 999")
    result = line("find", "water", "--store", str(own_store))
    assert "999" in result.problem
    assert result.code == StoreError.exit_code


def test_a_data_directory_that_cannot_be_written(line: Any, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "file").touch()
    monkeypatch.setenv("PROPDB_STORE", str(tmp_path / "file" / "propdb.db"))
    result = line("find water")
    assert str(tmp_path / "file") in result.problem
    assert result.code == StoreError.exit_code


def test_a_second_writer(line: Any, own_store: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    file = tmp_path / "mine.toml"
    file.write_text(line("datum show own:g@50C --toml").out, encoding="utf-8")
    monkeypatch.setattr("propdb.store.open._TIMEOUT", 0.1)
    with closing(sqlite3.connect(own_store, isolation_level=None)) as writer:
        writer.execute("BEGIN IMMEDIATE")
        result = line("datum", "add", str(file), "--store", str(own_store))
        assert "another process" in result.problem
        assert result.code == StoreBusy.exit_code


@pytest.mark.parametrize(
    "text",
    [
        "",
        "[datum.x]\n",
        "not toml at all [",
        "[datum.x]\nkind = 'own'\nsentence = 's'\nsource = 'nobody'\n",
        "\x00\x01",
    ],
)
def test_a_datum_file_that_cannot_be_taken(line: Any, own_store: Path, tmp_path: Path, text: str) -> None:
    file = tmp_path / "mine.toml"
    file.write_text(text, encoding="utf-8")
    before = line("datum", "list", "--store", str(own_store)).out
    problem = line("datum", "add", str(file), "--store", str(own_store)).problem
    assert "mine.toml" in problem or "nobody" in problem
    assert line("datum", "list", "--store", str(own_store)).out == before


def test_a_datum_file_that_is_not_there(line: Any, own_store: Path) -> None:
    assert "nowhere.toml" in line("datum", "add", "nowhere.toml", "--store", str(own_store)).problem


def test_a_backup_over_a_file(line: Any, own_store: Path, tmp_path: Path) -> None:
    file = tmp_path / "precious.txt"
    file.write_text("keep me", encoding="utf-8")
    assert str(file) in line("store", "backup", str(file), "--store", str(own_store)).problem
    assert file.read_text(encoding="utf-8") == "keep me"


# -- the ends of a pipe ----------------------------------------------------------------------------------------------


def test_nobody_reads_the_output(default_store: Path) -> None:
    child = subprocess.Popen(
        [sys.executable, "-m", "propdb", "datum", "list"], stdout=subprocess.PIPE, stderr=subprocess.PIPE
    )
    assert child.stdout is not None
    assert child.stderr is not None
    child.stdout.close()
    err = child.stderr.read()
    child.stderr.close()
    assert child.wait() in (0, 141)
    assert err == b""


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs /dev/full")
@pytest.mark.parametrize("words", [["store", "path"], ["datum", "list"], ["--version"]])
def test_a_full_disk_under_the_output(default_store: Path, words: list[str]) -> None:
    with Path("/dev/full").open("w") as full:
        done = subprocess.run(
            [sys.executable, "-m", "propdb", *words], stdout=full, stderr=subprocess.PIPE, text=True, check=False
        )
    assert done.returncode == 1
    assert done.stderr.startswith("propdb: the output cannot be written")
    assert done.stderr.count("\n") == 1


@pytest.mark.skipif(sys.platform == "win32", reason="closes a file descriptor the POSIX way")
def test_a_closed_output(default_store: Path) -> None:
    code = (
        f"import os; os.close(1); os.execv({sys.executable!r}, [{sys.executable!r}, '-m', 'propdb', 'store', 'path'])"
    )
    done = subprocess.run([sys.executable, "-c", code], stderr=subprocess.PIPE, text=True, check=False)
    assert "Traceback" not in done.stderr


def test_an_interrupt_is_no_traceback(line: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    def interrupt(*_: object, **__: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("propdb.api.Store.find", interrupt)
    result = line("find water")
    assert result.code == 130
    assert result.out == ""
    assert "Traceback" not in result.err


def test_a_fault_of_our_own_is_one_line_too(line: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    def fail(*_: object, **__: object) -> None:
        raise ZeroDivisionError("by hand")

    monkeypatch.setattr("propdb.api.Store.find", fail)
    result = line("find water")
    assert result.code == 70
    assert result.err.count("\n") == 1
    assert "ZeroDivisionError" in result.err


# -- whatever is typed -----------------------------------------------------------------------------------------------

_PLAIN = """
find show enthalpy convert reaction datum source entry store list info path check cite water nitrogen carbon C2H6O
--json --phase --datum --unit --temperature --pressure --saturated --from --to --species --source --form --extrapolate
--quantity g l cr fluid aq 25C -40C 600C 0K 1e9K 40bar vapour kJ/mol kJ/kg -393.51 elements-298K gas-25C elements-same-T
own:l@65C own: - -- %s ' ../.. -1 \u22125 NaN
"""
_WORDS = st.sampled_from([*_PLAIN.split(), "", "H2(g) + 1/2 O2(g) -> H2O(l)", "\x00", "🔥", "1e400 kJ/mol", "\ud800"])


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(_WORDS, max_size=12))
def test_nothing_typed_is_a_fault(line: Any, words: list[str]) -> None:
    result = line(*words, "--limit") if len(words) == 1 else line(*words)
    assert result.code != 70, (words, result.err)
    assert "Traceback" not in result.err
    if result.code:
        assert result.err.startswith("propdb: ")
        assert result.err.count("\n") == 1


@pytest.mark.full
@settings(max_examples=2000, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(st.one_of(_WORDS, st.text(max_size=20)), max_size=14))
def test_nothing_typed_is_a_fault_at_length(line: Any, words: list[str]) -> None:
    result = line(*words, "--limit") if len(words) == 1 else line(*words)
    assert result.code != 70, (words, result.err)
    assert "Traceback" not in result.err
