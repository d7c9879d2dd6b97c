"""``convert-table`` and ``tabulate`` as they are typed."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest
from table_samples import write_samples

from propdb.cli.convert_table import BAD_ROWS
from propdb.errors import DatumMismatch, InvalidInput, NotFound


@pytest.fixture
def samples(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    pytest.importorskip("pyarrow")
    monkeypatch.chdir(tmp_path)
    write_samples(tmp_path)
    return tmp_path


@pytest.mark.extras
def test_a_table_is_converted(line: Any, samples: Path) -> None:
    done = line("convert-table streams.csv out.csv --to elements-298K")
    assert (done.code, done.err) == (0, "")
    assert "3 rows: 3 ok" in done.out
    assert "enthalpy flows on elements-298K" in done.out
    assert json.loads(
        line("convert-table streams.csv out.csv --to elements-298K --overwrite --json").out
    ) == json.loads((samples / "out.csv.propdb.json").read_text(encoding="utf-8"))


@pytest.mark.extras
def test_the_exit_code_tells_of_bad_rows(line: Any, samples: Path) -> None:
    (samples / "bad.csv").write_text("species,h [kJ/kg]\nmethane,1.5\nmethan,x\n", encoding="utf-8")
    done = line("convert-table bad.csv out.csv --from gas-25C --to gas-0C")
    assert done.code == BAD_ROWS
    assert "1 bad row" in done.out
    assert (samples / "out.csv").read_text(encoding="utf-8").count("\n") == 3


@pytest.mark.extras
@pytest.mark.parametrize(
    "words, error, text",
    [
        ("streams.csv streams.csv --to gas-25C", InvalidInput, "the output is the input"),
        ("streams.csv out.csv --to gas-25", NotFound, "gas-25C"),
        ("streams.csv out.xlsx --to gas-25C", InvalidInput, ".csv"),
        ("steam.csv out.csv --to gas-25C", InvalidInput, "--species"),
        ("steam.csv out.csv --species watr --from gas-25C --to gas-0C", NotFound, "water"),
        ("states.csv out.csv --to gas-25C", InvalidInput, "--phase"),
        ("streams.csv out.csv --to gas-25C --column enthalpy=hh", NotFound, "hh"),
        ("streams.csv out.csv --to gas-25C --digits -1", InvalidInput, "0 to 15"),
        ("streams.csv out.csv --to elements-same-T", DatumMismatch, "--across"),
        ("streams.csv out.csv --to gas-25C --workers 2", InvalidInput, "directory of Parquet"),
    ],
)
def test_refused(line: Any, samples: Path, words: str, error: type[Exception], text: str) -> None:
    before = sorted(p.name for p in samples.iterdir())
    done = line(f"convert-table {words}")
    assert text in done.problem
    assert done.code == error.exit_code  # type: ignore[attr-defined]
    assert sorted(p.name for p in samples.iterdir()) == before


@pytest.mark.extras
@pytest.mark.skipif(sys.platform == "win32", reason="sends a signal the POSIX way")
def test_an_interrupt_leaves_nothing_behind(default_store: Path, samples: Path) -> None:
    rows = "".join(f"S{i},methane,{i % 7000}.123456\n" for i in range(2_000_000))
    (samples / "long.csv").write_text(f"tag,species,h [kJ/kg]\n{rows}", encoding="utf-8")
    before = sorted(p.name for p in samples.iterdir())
    command = [sys.executable, "-m", "propdb", "convert-table", "long.csv", "out.csv"]
    child = subprocess.Popen([*command, "--from", "gas-25C", "--to", "gas-0C"], stderr=subprocess.PIPE)
    for _ in range(600):
        parts = list(samples.glob(".out.csv.*"))
        if parts and parts[0].stat().st_size > 1000:
            break
        time.sleep(0.05)
    assert parts
    os.kill(child.pid, signal.SIGINT)
    _, err = child.communicate(timeout=60)
    assert child.returncode == 130
    assert b"Traceback" not in err
    assert sorted(p.name for p in samples.iterdir()) == before


@pytest.mark.extras
@pytest.mark.skipif(sys.platform == "win32", reason="sends a signal the POSIX way")
@pytest.mark.parametrize("pause", [0.0, 3.0])
def test_an_interrupt_of_workers_is_quiet(default_store: Path, tmp_path: Path, pause: float) -> None:
    """Ctrl-C reaches every process of a terminal; only the one that waits says something, and none stays."""
    pq = pytest.importorskip("pyarrow.parquet")
    pa = pytest.importorskip("pyarrow")
    pytest.importorskip("distributed")
    (tmp_path / "year").mkdir()
    count = 400_000
    columns = {"T [K]": [300.0 + i % 500 for i in range(count)], "h [kJ/kg]": [float(i) for i in range(count)]}
    for i in range(8):
        pq.write_table(pa.table(columns), tmp_path / "year" / f"{i}.parquet")
    command = [sys.executable, "-m", "propdb", "convert-table", str(tmp_path / "year"), str(tmp_path / "out")]
    command += ["--species", "methane", "--from", "gas-25C", "--to", "elements-same-T", "--workers", "1"]
    run = subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, start_new_session=True)
    while run.poll() is None and not any(tmp_path.glob(".*.part")):
        time.sleep(0.02)
    time.sleep(pause)
    os.killpg(run.pid, signal.SIGINT)
    out, err = run.communicate(timeout=60)
    assert "Traceback" not in err
    if run.returncode:  # it was not over before
        assert run.returncode == 130
        assert [path.name for path in tmp_path.iterdir()] == ["year"]


def test_tabulate_shows_phases_and_entries(line: Any) -> None:
    done = line("tabulate water --datum elements-298K --low 80C --high 120C --step 20K")
    assert done.code == 0
    assert done.out.count("* boiling") == 2
    assert "T [°C]" in done.out
    assert "  iapws-r6-95\n    International Association" in done.out
    assert max(map(len, done.out.splitlines())) <= 100
    found = json.loads(line("tabulate water --datum elements-298K --low 80C --high 120C --step 20K --json").out)
    assert [row["transition"] for row in found["rows"]] == [None, "boiling", "boiling", None, None]
    assert set(found["rows"][0]) >= {"species", "phase", "temperature", "h", "uncertainty", "cp", "flag", "entries"}


def test_tabulate_refuses_in_one_line(line: Any, tmp_path: Path) -> None:
    assert "watr" in line("tabulate watr --datum elements-298K").problem
    assert "kW" in line("tabulate water --datum elements-298K --unit kW").problem
    assert ".doc" in line("tabulate", "water", "--datum", "elements-298K", "--out", str(tmp_path / "x.doc")).problem


def test_tabulate_tells_why_below_the_table(line: Any) -> None:
    done = line("tabulate iron iron --datum elements-298K --low 300K --high 1900K --step 400K")
    assert done.code == 0
    assert max(map(len, done.out.splitlines())) <= 100
    assert "no data (1)" in done.out
    assert "\n(1) iron, cr (alpha): the heat capacity does not reach 1100 K" in done.out
    assert done.out.count("300.00") == 1


@pytest.mark.extras
def test_tabulate_to_a_file_is_summed_up(line: Any, samples: Path) -> None:
    done = line("tabulate water --datum elements-298K --low 80C --high 120C --step 20K --out water.csv")
    assert done.out.splitlines()[0] == "water.csv: 5 rows: 5 ok"
    assert len(done.out.splitlines()) < 6
    assert (samples / "water.csv").read_text(encoding="utf-8").count("\n") == 6
