"""The log is append-only, chained, and says what an entry is now and what it was then."""

from __future__ import annotations

import json
import sqlite3
from contextlib import closing
from datetime import UTC, date, datetime, timedelta, timezone
from pathlib import Path
from typing import Any

import pytest
from store_samples import SEED, WATER, content, entry

from propdb.errors import IntegrityError, InvalidInput, NotFound, StoreReadOnly
from propdb.model.records import STATUSES
from propdb.store import log, migrate
from propdb.store.backup import check
from propdb.store.content import HASHED
from propdb.store.open import mapped, open_store
from propdb.store.own import add_own, put_own
from propdb.store.read import Reader
from propdb.store.write import build

HF = content().entries[0].id


@pytest.fixture
def store(tmp_path: Path) -> Path:
    path = tmp_path / "store.db"
    build(path, content(), versions={})
    return path


@pytest.fixture
def clock(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """The time that the log is told: the last of the list."""
    times = ["2025-01-01T12:00:00.000000Z"]
    monkeypatch.setattr(migrate, "utc_now", lambda: times[-1])
    return times


def status(path: Path, number: str = HF, **how: Any) -> str:
    with Reader(path, **how) as reader:
        return reader.entry(number).status


def test_kinds_give_a_status() -> None:
    assert set(log.KINDS.values()) <= {"", *STATUSES}


@pytest.mark.parametrize("kind", [kind for kind, given in log.KINDS.items() if given])
def test_an_event_gives_the_status(store: Path, kind: str) -> None:
    with closing(open_store(store, write=True)) as conn:
        event = log.append(conn, kind, entry=HF, who="me", comment="because", payload={"a": [1, 2.5]})
        assert log.head(conn) == event.hash
        assert log.events(conn, HF) == (event,)
        assert log.events(conn)[-1].prev == log.events(conn)[-2].hash
    assert status(store) == log.KINDS[kind]
    assert check(store) == []


def test_the_last_event_counts(store: Path) -> None:
    with closing(open_store(store, write=True)) as conn:
        for kind in ("quarantined", "checked", "approved"):
            log.append(conn, kind, entry=HF, who="me")
        log.append(conn, "waived", entry=HF, who="me", payload={"check": "range"})
        assert status(store) == "approved"
        log.append(conn, "waived", entry=HF, who="me", status="base")
        assert status(store) == "base"
    build(store, content(statuses={HF: "estimate"}), versions={})
    assert status(store) == "base"  # people have the last word, whatever the new base says


def test_several_events_in_one_transaction(store: Path) -> None:
    with closing(open_store(store, write=True)) as conn:
        before = log.head(conn)

        def both() -> None:
            with migrate.immediate(conn):
                log.append(conn, "checked", entry=HF, who="me")
                log.append(conn, "checked", entry="f" * 20, who="me")

        with pytest.raises(NotFound):
            both()
        assert log.head(conn) == before


@pytest.mark.parametrize(
    "kind, fields, problem",
    [
        ("praised", {"entry": HF, "who": "me"}, "unknown kind of event"),
        ("checked", {"entry": HF, "who": " "}, "a name behind it"),
        ("checked", {"who": "me"}, "has no entry"),
        ("base", {"entry": HF, "who": "me"}, "has no entry"),
        ("checked", {"entry": HF, "who": "me", "status": "approved"}, "cannot be given"),
        ("waived", {"entry": HF, "who": "me", "status": "fine"}, "cannot be given"),
        ("checked", {"entry": HF, "who": "me", "payload": {"a": float("inf")}}, "JSON"),
    ],
)
def test_bad_events_are_refused(store: Path, kind: str, fields: dict[str, Any], problem: str) -> None:
    with closing(open_store(store, write=True)) as conn:
        with pytest.raises(InvalidInput, match=problem):
            log.append(conn, kind, **fields)
        assert len(log.events(conn)) == 1


def test_a_reader_cannot_append(store: Path) -> None:
    with Reader(store) as reader, pytest.raises(StoreReadOnly):
        log.append(reader.conn, "checked", entry=HF, who="me")


def test_events_follow_each_other_only(store: Path) -> None:
    sql = (
        "INSERT OR REPLACE INTO event"
        " VALUES (?, '2025-01-01T12:00:00.000000Z', 'checked', ?, 'me', '', '{}', 'checked', ?, ?)"
    )
    with closing(open_store(store, write=True)) as conn:
        last = log.head(conn)
        for seq, prev in ((1, last), (3, last), (2, "x"), (None, "")):
            with pytest.raises(IntegrityError, match="follows the last"), mapped(store):
                conn.execute(sql, (seq, HF, prev, "0" * 64))


def test_a_clock_set_back_does_not_turn_the_order(store: Path, clock: list[str]) -> None:
    with closing(open_store(store, write=True)) as conn:
        base = log.events(conn)[0].utc
        event = log.append(conn, "checked", entry=HF, who="me")
    assert clock[-1] < base == event.utc


def test_as_of(tmp_path: Path, clock: list[str]) -> None:
    path = tmp_path / "store.db"
    clock.append("2025-03-10T08:00:00.000000Z")
    build(path, content(), versions={})
    clock.append("2025-03-20T23:59:59.999999Z")
    own = entry(WATER, value=1.0)
    with closing(open_store(path, write=True)) as conn:
        add_own(conn, own, SEED, "me")
        log.append(conn, "quarantined", entry=HF, who="me")
    clock.append("2025-04-01T00:00:00.000000Z")
    build(path, content(entries=content().entries[:1], statuses={HF: "estimate"}), versions={})
    clock.append("2025-04-02T00:00:00.000000Z")
    with closing(open_store(path, write=True)) as conn:
        log.append(conn, "approved", entry=HF, who="me")

    def seen(when: Any) -> tuple[int, int, str]:
        with Reader(path, as_of=when) as reader:
            return reader.base.seq, len(reader.entries("water")), reader.entry(HF).status

    first, later, rebuilt, now = (1, 3, "base"), (1, 4, "quarantined"), (4, 2, "quarantined"), (4, 2, "approved")
    assert seen(None) == seen("2025-04-02") == now
    assert seen("2025-03-10") == seen(date(2025, 3, 19)) == seen("2025-03-20T23:59:59Z") == first
    assert seen("2025-03-20") == seen("2025-03-31") == seen("2025-03-20T23:59:59.999999") == later
    assert seen("2025-04-01") == seen(datetime(2025, 4, 1)) == seen(datetime(2025, 4, 1, tzinfo=UTC)) == rebuilt
    east = timezone(timedelta(hours=2))
    assert seen(datetime(2025, 4, 1, 1, 59, tzinfo=east)) == later
    assert seen("2025-04-01T02:00:00+02:00") == rebuilt
    with Reader(path, as_of="2025-03-15") as reader:
        assert len(reader.events()) == 1
        assert reader.head == reader.base.hash
        assert len(reader.entries("ethanol")) == 2  # the later base has none of them
        assert reader.coverage()["species"] == 2
        assert reader.info()["entries"]["active"] == 5
    for when in ("2025-03-09", "2025-03-10T07:59:59.999999Z", "0001-01-01"):
        with pytest.raises(NotFound, match=r"no base as of .*first base is of 2025-03-10"):
            Reader(path, as_of=when)
    for when in ("yesterday", "2025-13-01", "", "10.3.2025"):
        with pytest.raises(InvalidInput, match="not a date"):
            Reader(path, as_of=when)
    assert seen("2025-04-02T00:00:00Z") == seen("2025-04-02T02:00:00+02:00") == now
    assert seen("2025-04-02T14:00:00+14:00") == now
    clock.append("2025-04-02T10:00:00.000000Z")
    assert seen("2025-04-03") == now  # it has begun in the east
    for when in ("2025-04-04", "2099-01-01", "9999-12-31", "2025-04-02T10:00:00.000001Z", date(2025, 5, 1)):
        with pytest.raises(InvalidInput, match=r"lies in the future.*leave --as-of out"):
            Reader(path, as_of=when)
    clock.append("2025-03-30T00:00:00.000000Z")  # a clock set back: the log knows better
    assert seen("2025-04-02") == now


# -- tampering -----------------------------------------------------------------------------------------------------


@pytest.fixture
def history(store: Path) -> Path:
    """A store with a log of a few events, and an own entry."""
    with closing(open_store(store, write=True)) as conn:
        add_own(conn, entry(WATER, value=1.0), SEED, "me")
        for kind in ("checked", "approved", "disputed"):
            log.append(conn, kind, entry=HF, who="me", comment="c")
    assert check(store) == []
    return store


GUARDS = "entry_fixed entry_kept entry_once event_fixed event_kept event_next base_entry_fixed base_entry_kept".split()


def tamper(path: Path, *statements: str, guards_back: bool = True) -> list[str]:
    """What the check says after somebody has taken the guards away, changed something, and put them back."""
    with closing(sqlite3.connect(path, isolation_level=None)) as conn:
        conn.execute("PRAGMA foreign_keys = OFF")
        kept = conn.execute("SELECT name, sql FROM sqlite_master WHERE type = 'trigger'").fetchall()
        for name, _ in kept:
            conn.execute(f"DROP TRIGGER {name}")
        for statement in statements:
            conn.execute(statement)
        if guards_back:
            for _, sql in kept:
                conn.execute(sql)
    return [str(problem) for problem in check(path)]


@pytest.mark.parametrize(
    "column, value",
    [
        ("utc", "'2024-01-01T00:00:00.000000Z'"),
        ("kind", "'superseded'"),
        ("entry", f"'{content().entries[1].id}'"),
        ("who", "'somebody'"),
        ("comment", "'no'"),
        ("payload", "'{\"a\":1}'"),
        ("status", "'approved'"),
        ("prev", "'x'"),
        ("hash", "'" + "0" * 64 + "'"),
    ],
)
def test_an_edited_event_shows(history: Path, column: str, value: str) -> None:
    problems = tamper(history, f"UPDATE event SET {column} = {value} WHERE seq = 3")
    assert any(text.startswith(("event 3: was edited", "event 3: does not carry")) for text in problems)


def test_an_edited_event_with_a_new_hash_breaks_the_chain(history: Path) -> None:
    with closing(sqlite3.connect(history)) as conn:
        row = conn.execute(f"SELECT {log._COLUMNS} FROM event WHERE seq = 3").fetchone()
    forged = log.event_hash(row[8], *row[:4], "somebody", *row[5:8])
    problems = tamper(history, f"UPDATE event SET who = 'somebody', hash = '{forged}' WHERE seq = 3")
    assert problems == ["event 4: does not carry the hash of the event before it"]


@pytest.mark.parametrize(
    "where, text", [("seq = 3", "event 4: the event before it is missing"), ("seq >= 4", "log: events 4 to 5")]
)
def test_a_deleted_event_shows(history: Path, where: str, text: str) -> None:
    assert any(problem.startswith(text) for problem in tamper(history, f"DELETE FROM event WHERE {where}"))


@pytest.mark.parametrize(
    "change",
    [
        "value = value + 0.001",
        "carried = '-1.0006'",
        "uncertainty = NULL",
        "source = 'report-2010'",
        "temperature = 298",
        "params = '{\"a\":1}'",
        "identity = 'x'",
        "id = '00000000000000000000'",
    ],
)
def test_an_edited_entry_shows(history: Path, change: str) -> None:
    problems = tamper(history, f"UPDATE entry SET {change} WHERE id = '{HF}'")
    assert any("was edited: its id does not match its fields" in problem for problem in problems)


@pytest.mark.parametrize(
    "change",
    [
        "UPDATE species SET molar_mass = 0.019 WHERE name = 'water'",
        "UPDATE source SET class = 'evaluated' WHERE key = 'book-2001'",
        "DELETE FROM lineage",
        "UPDATE datum SET body = '{}'",
        "UPDATE policy SET value = '{}'",
        "UPDATE base_entry SET status = 'approved' WHERE entry = 1",
        "UPDATE base_entry SET note = 'x' WHERE entry = 2",
        "DELETE FROM base_entry WHERE entry = 2",
    ],
)
def test_an_edited_base_shows(history: Path, change: str) -> None:
    problems = tamper(history, change)
    assert any("does not give its content hash" in problem for problem in problems)


def test_an_added_entry_shows(history: Path) -> None:
    names = list(HASHED)
    columns = ", ".join(f'"{name}"' for name in names)
    problems = tamper(
        history,
        f"INSERT INTO entry (id, identity, {columns}) SELECT '{'1' * 20}', identity, {columns} FROM entry LIMIT 1",
    )
    assert any("its id does not match" in problem for problem in problems)
    assert any("no base holds it and no one created it" in problem for problem in problems)


def test_guards_taken_away_show(history: Path) -> None:
    problems = tamper(history, "SELECT 1", guards_back=False)
    names = {text.removeprefix("trigger ").removesuffix(": was taken away") for text in problems}
    assert len(problems) == len(names)
    assert names == {*GUARDS, "base_entry_once", "name_indexed", "name_unindexed", "name_fixed"}


def test_a_guard_that_guards_nothing_shows(history: Path) -> None:
    with closing(sqlite3.connect(history)) as conn:
        conn.execute("DROP TRIGGER entry_fixed")
        conn.execute("CREATE TRIGGER entry_fixed BEFORE UPDATE ON entry BEGIN SELECT 1; END")
    assert [str(problem) for problem in check(history)] == ["trigger entry_fixed: was changed"]


def test_payload_formatting_is_no_way_around(history: Path) -> None:
    """The hash covers the text of the payload."""
    with closing(sqlite3.connect(history)) as conn:
        payload = conn.execute("SELECT payload FROM event WHERE seq = 1").fetchone()[0]
    spaced = json.dumps(json.loads(payload), indent=1)
    assert spaced != payload
    assert tamper(history, f"UPDATE event SET payload = '{spaced}' WHERE seq = 1")


def test_own_data_are_not_the_base(history: Path) -> None:
    put_own(history, policy={"ranks": {}}, datums={"x": {"a": 1}})
    assert check(history) == []
