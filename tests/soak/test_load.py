"""Eight processes that read while two write: no event is lost, and nobody sees half of a transaction.

Some seconds in the normal run, a minute with ``--full``.
"""

from __future__ import annotations

import json
import shutil
import sqlite3
import time
from collections.abc import Iterator
from contextlib import closing, contextmanager
from pathlib import Path
from typing import Any

import pytest
from soak_samples import DRAFTS, EVENTS, held, settle, start, template_csv

import propdb
from propdb.errors import StoreBusy
from propdb.store import history, seal
from propdb.store.backup import check
from propdb.store.open import open_store

READERS, WRITERS = 8, 2
#: What a writer may hear when it has waited in vain.
BUSY = "another process is writing to it; try again when it has finished"

#: Drafts of three, then a check of the three by a second person, then a doubt about them, for so many seconds.
WRITE = """
import json, os, time
from pathlib import Path
import propdb
from propdb.errors import StoreBusy
from soak_samples import template_csv
path, folder, number, until = sys.argv[1:]
done, busy = [], []
def attempt(user, call):
    os.environ["PROPDB_USER"] = user
    try:
        return call()
    except StoreBusy as error:
        busy.append(str(error))
with propdb.open(path) as store:
    while time.time() < float(until) or len(done) < 3:
        tag = f"{number}-{len(done)}"
        file = Path(folder) / f"{tag}.csv"
        file.write_text(template_csv(tag), encoding="utf-8")
        report = attempt(f"writer {number}", lambda: store.add(file))
        if report is None:
            continue
        ids = [entry.id for _, entry in report.taken]
        done.append([ids, "draft"])
        if attempt("second person", lambda: store.review_check(ids)):
            done[-1][1] = "checked"
            if attempt("third person", lambda: store.review_approve(ids, comment="agreed")):
                done[-1][1] = "approved"
print(json.dumps({"done": done, "busy": busy}))
"""

#: Looks at everything again and again, and says what it saw.
READ = """
import json, time
from collections import Counter
import propdb
from propdb.errors import NotFound
from propdb.store.backup import check
from soak_samples import DRAFTS
path, number, until = sys.argv[1], int(sys.argv[2]), float(sys.argv[3])
seen, looks, statuses = "", 0, Counter()
store = propdb.open(path)
while time.time() < until or looks < 3:
    if looks % 5 == 4:  # a new connection now and then
        store.close()
        store = propdb.open(path)
    log = store.store_log()
    events = [line.event for line in log.lines]
    assert log.events == len(events) and log.head == events[-1].hash, "the head is not that of the last event shown"
    for before, after in zip(events, events[1:]):
        assert after.prev == before.hash and after.seq == before.seq + 1, "the chain is broken"
    assert not seen or seen in {event.hash for event in events}, "an event that was there is gone"
    seen = log.head
    waiting = Counter((one.entry.locator, one.entry.status) for one in store.review_list())
    assert set(waiting.values()) <= {DRAFTS}, f"half of a transaction: {waiting}"
    tags = [line.event.comment for line in log.lines if line.event.kind == "created"]
    for tag in sorted({tag.split(".csv")[0].removeprefix("from ") for tag in tags})[-3:]:
        sheet = store.show(f"solvent {tag}")
        kinds = {entry.status for entry in sheet.entries}
        assert len(sheet.entries) == DRAFTS and len(kinds) == 1, f"half of {tag}: {kinds}"
        statuses.update(kinds)
    assert store.show("water", quantity="Hf").entries
    if number == 0:
        assert check(path) == [], "checked while others write"
    if number == 1:
        answer = store.enthalpy("water", phase="l", temperature="25C", datum="elements-298K")
        assert abs(answer.value + 285.83) < 0.01
    looks += 1
print(json.dumps({"looks": looks, "seen": seen, "statuses": statuses}))
"""


@pytest.fixture
def store(tmp_path: Path) -> Path:
    """A store of its own."""
    copy = tmp_path / "load.db"
    with propdb.open() as base:
        base.store_backup(copy)
    with closing(open_store(copy, write=True)):  # a live store again
        pass
    return copy


def soak(path: Path, folder: Path, seconds: float) -> dict[str, Any]:
    """Let readers and writers loose for so many seconds; what they did."""
    before = held(path)
    until = f"{time.time() + seconds}"
    writers = [start(WRITE, path, folder, str(number), until) for number in range(WRITERS)]
    readers = [start(READ, path, str(number), until) for number in range(READERS)]
    said: list[dict[str, Any]] = []
    for process in [*writers, *readers]:
        out, err = process.communicate(timeout=seconds + 300)
        assert process.returncode == 0, err
        said.append(json.loads(out))
    wrote, read = said[:WRITERS], said[WRITERS:]
    done = [(ids, status) for one in wrote for ids, status in one["done"]]
    busy = [text for one in wrote for text in one["busy"]]
    assert all(text.endswith(BUSY) for text in busy), busy

    assert check(path) == []
    after = held(path)
    decisions = {"draft": 0, "checked": DRAFTS, "approved": 2 * DRAFTS}
    assert len(after.events) == len(before.events) + sum(EVENTS + decisions[status] for _, status in done)
    assert {id: status for id, (_, status) in after.own.items()} == {id: status for ids, status in done for id in ids}
    hashes = {hash for hash, _, _ in after.events}
    assert all(one["seen"] in hashes for one in read)
    return {
        "transactions": sum(1 + decisions[status] // DRAFTS for _, status in done),
        "events": len(after.events) - len(before.events),
        "busy": len(busy),
        "looks": sum(one["looks"] for one in read),
    }


def test_eight_read_and_two_write(store: Path, tmp_path: Path) -> None:
    came = soak(store, tmp_path, 3.0)
    assert came["transactions"] >= 3 * WRITERS
    assert came["looks"] >= 3 * READERS


@pytest.mark.full
def test_eight_read_and_two_write_for_a_minute(store: Path, tmp_path: Path) -> None:
    came = soak(store, tmp_path, 60.0)
    print(came)
    assert came["transactions"] > 10
    assert came["looks"] > 10 * READERS


@contextmanager
def locked(path: Path) -> Iterator[None]:
    """Somebody else writes, and does not come to an end."""
    with closing(sqlite3.connect(path, isolation_level=None)) as other:
        other.execute("BEGIN IMMEDIATE")
        yield
        other.execute("ROLLBACK")


def test_a_writer_waits_and_then_says_that_another_is_writing(
    store: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("PROPDB_USER", "ada")
    monkeypatch.setitem(open_store.__kwdefaults__, "timeout", 0.2)
    file = tmp_path / "mine.csv"
    file.write_text(template_csv("mine"), encoding="utf-8")
    before = held(store)
    with propdb.open(store) as mine, locked(store):
        entry = mine.show("water", quantity="Hf").entries[0].id  # readers go on
        attempts = (
            lambda: mine.add(file),
            lambda: mine.import_file(file),
            lambda: mine.review_check(entry),
            lambda: mine.store_setting("self-review", "on"),
        )
        for attempt in attempts:
            with pytest.raises(StoreBusy, match=BUSY):
                attempt()
        assert mine.add(file, dry_run=True).taken
        mine.store_backup(tmp_path / "copy.db")
    assert held(store) == before
    settle(store)
    shutil.copyfile(store, tmp_path / "again.db")
    with propdb.open(store) as mine:  # and then it goes on
        assert len(mine.add(file).taken) == DRAFTS


def test_a_check_sees_one_state_while_another_writes(
    store: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("PROPDB_USER", "ada")
    file = tmp_path / "mine.csv"
    file.write_text(template_csv("mine"), encoding="utf-8")
    plain, done = seal.state, []

    def meanwhile(conn: sqlite3.Connection) -> dict[str, str]:
        """Between the hashes that an event carries and the rows that they are of."""
        if not done:
            done.append(file)
            with propdb.open(store) as other:
                other.add(file)
        return plain(conn)

    monkeypatch.setattr(seal, "state", meanwhile)
    assert check(store) == []
    assert done


def test_the_head_is_that_of_the_last_event_shown(store: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("PROPDB_USER", "ada")
    plain = history.about

    def meanwhile(*values: Any) -> dict[str, tuple[str, str, str]]:
        with propdb.open(store) as other:
            other.store_setting("self-review", "on")
        return plain(*values)

    monkeypatch.setattr(history, "about", meanwhile)
    with propdb.open(store) as mine:
        found = mine.store_log()
        assert found.head == found.lines[-1].event.hash
        assert found.events == len(found.lines) == len(held(store).events) - 1
