"""Several processes, and processes that die."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import textwrap
import time
from contextlib import closing
from pathlib import Path

import pytest
from store_samples import SEED, WATER, content, entry

from propdb.store import log
from propdb.store.backup import check
from propdb.store.content import content_hash
from propdb.store.open import open_store
from propdb.store.own import add_own
from propdb.store.read import Reader
from propdb.store.write import build

TESTS = str(Path(__file__).resolve().parent.parent)
BIG = """
import sys
sys.path.insert(0, {tests!r})
from store_samples import ETHANOL, WATER, content, entry
from propdb.store.write import build
def big(first, count=3000):
    return content(entries=tuple(entry((WATER, ETHANOL)[i % 2], value=float(first + i)) for i in range(count)))
"""


def start(code: str) -> subprocess.Popen[str]:
    text = BIG.format(tests=TESTS) + textwrap.dedent(code)
    return subprocess.Popen([sys.executable, "-c", text], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)


def finish(process: subprocess.Popen[str]) -> str:
    out, err = process.communicate(timeout=300)
    assert process.returncode == 0, err
    return out.strip()


def test_two_processes_build_one_store_at_once(tmp_path: Path) -> None:
    path = tmp_path / "store.db"
    code = f"print(build({str(path)!r}, big(0), versions={{}}).changed)"
    said = sorted(finish(process) for process in [start(code), start(code)])
    assert said == ["False", "True"]  # the second finds what it came for
    assert check(path) == []
    with Reader(path) as reader:
        assert len(reader.events()) == 1
        assert len(reader.entries("water")) == 1500


def test_two_processes_build_different_contents_at_once(tmp_path: Path) -> None:
    path = tmp_path / "store.db"
    for process in [start(f"build({str(path)!r}, big({first}), versions={{}})") for first in (0, 1000)]:
        finish(process)
    assert check(path) == []
    with Reader(path) as reader:
        assert len(reader.events()) == 2
        assert len(reader.entries("water")) == 1500
        assert reader.info()["entries"] == {"active": 3000, "inactive": 1000, "own": 0}


@pytest.mark.skipif(not hasattr(signal, "SIGKILL"), reason="there is no SIGKILL here")
@pytest.mark.parametrize(
    "moment", ["checking", "wrote 10000", "done", *(pytest.param(0.02 * i, marks=pytest.mark.full) for i in range(20))]
)
def test_a_build_that_is_killed_leaves_the_store_as_it_was(tmp_path: Path, moment: str | float) -> None:
    path = tmp_path / "store.db"
    build(path, content(), versions={})
    own, hf = entry(WATER, value=-5.0), content().entries[0].id
    with closing(open_store(path, write=True)) as conn:
        add_own(conn, own, SEED, "me")
        log.append(conn, "approved", entry=own.id, who="someone else")
        log.append(conn, "approved", entry=hf, who="me")
        log.append(conn, "waived", entry=hf, who="me", payload={"check": "bounds"})
        events = log.events(conn)

    process = start(
        f"""
        def tell(text):
            print(text, flush=True)
        print("start", flush=True)
        build({str(path)!r}, big(0, 12000), versions={{}}, progress=tell)
        print("done", flush=True)
        """
    )
    assert process.stdout is not None
    if isinstance(moment, str):
        for line in process.stdout:
            if line.startswith(moment):
                break
    else:  # some moment of the writing
        for line in process.stdout:
            if line.startswith("wrote 5000"):
                break
        time.sleep(moment)
    os.kill(process.pid, signal.SIGKILL)
    rest = process.stdout.read()
    process.stdout.close()
    assert process.stderr is not None
    process.stderr.close()
    assert process.wait(timeout=60) in (-signal.SIGKILL, 0)
    finished = moment == "done" or "done" in rest

    assert check(path) == []
    with Reader(path) as reader:
        if not finished and reader.content_hash == content_hash(content()):
            assert reader.events() == events
            assert len(reader.entries("water")) == 4
        else:  # the transaction was over before the kill
            assert len(reader.events()) == len(events) + 1
    assert build(path, content(policy={}), versions={}).changed  # and it can be built
    assert check(path) == []
    with Reader(path) as reader:
        assert reader.events()[: len(events)] == events
        assert reader.entry(own.id).status == reader.entry(hf).status == "approved"
        assert len(reader.entries("water")) == 4
        assert [event.kind for event in reader.events(hf)] == ["approved", "waived"]


@pytest.mark.skipif(not hasattr(signal, "SIGKILL"), reason="there is no SIGKILL here")
@pytest.mark.parametrize("pause", [0.0, 0.1, 0.4, *(pytest.param(0.05 * i, marks=pytest.mark.full) for i in range(20))])
def test_a_first_build_that_is_killed_can_be_repeated(tmp_path: Path, pause: float) -> None:
    path = tmp_path / "store.db"
    process = start(f"print('start', flush=True); build({str(path)!r}, big(0), versions={{}})")
    assert process.stdout is not None
    process.stdout.readline()
    time.sleep(pause)
    os.kill(process.pid, signal.SIGKILL)
    process.communicate(timeout=60)
    build(path, content(), versions={})
    assert check(path) == []
    with Reader(path) as reader:
        assert len(reader.entries("water")) == 3


def test_readers_see_one_state_while_another_process_builds(tmp_path: Path) -> None:
    path = tmp_path / "store.db"
    build(path, content(), versions={})
    process = start(f"for i in range(4): build({str(path)!r}, big(i % 2, 2000 - i), versions={{}})")
    counts = set()
    with Reader(path) as reader:
        while process.poll() is None:
            counts.add((reader.content_hash, len(reader.entries("water")), len(reader.entries("water"))))
            time.sleep(0.01)
        counts.add((reader.content_hash, len(reader.entries("water")), len(reader.entries("water"))))
    finish(process)
    assert {count for _, count, _ in counts} <= {3, 1000, 999}
    assert 999 in {count for _, count, _ in counts}
