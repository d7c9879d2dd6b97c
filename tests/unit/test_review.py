"""Who may decide what: the table of review, one by one; and that the log says who did."""

from __future__ import annotations

import itertools
import sqlite3
from contextlib import closing
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from store_samples import BOOK, ETHANOL, SEED, WATER, content, entry

from propdb.api import person
from propdb.api.person import who
from propdb.errors import Ambiguous, InvalidInput, NotFound
from propdb.model.records import STATUSES, USABLE_STATUSES
from propdb.store import log, migrate, seal
from propdb.store.backup import check
from propdb.store.history import history
from propdb.store.open import open_store
from propdb.store.own import add_own, add_own_all, put_own
from propdb.store.read import Reader
from propdb.store.review import DECISIONS, NEXT, Decision, decide, set_setting, settings_of, waiting
from propdb.store.write import build

HF = content().entries[0].id
OWN = entry(WATER, value=7.0)


@pytest.fixture
def store(tmp_path: Path) -> Path:
    """A store with one draft of Ada's."""
    path = tmp_path / "store.db"
    build(path, content(), versions={})
    add_own(path, OWN, SEED, "Ada")
    return path


def status(path: Path, number: str = OWN.id, **how: Any) -> str:
    with Reader(path, **how) as reader:
        return reader.entry(number).status


def give(path: Path, wanted: str) -> None:
    """Bring the draft to a status, by events."""
    kinds = {"draft": (), "approved": ("checked", "approved")}.get(wanted, ())
    with closing(open_store(path, write=True)) as conn:
        for kind in kinds:
            log.append(conn, kind, entry=OWN.id, who="Cid")
        if wanted not in ("draft", "approved"):
            log.append(conn, "waived", entry=OWN.id, who="Cid", status=wanted)


#: verb -> the statuses it takes: written out here once more, so that a change of the table is a decision.
TAKES = {
    "check": {"draft", "base", "estimate"},
    "approve": {"checked"},
    "reject": {"draft", "checked"},
    "dispute": {"approved", "checked", "base", "estimate"},
    "waive": {"disputed", "quarantined"},
    "withdraw": {*STATUSES} - {"withdrawn", "superseded"},
}
GIVES = {
    "check": "checked",
    "approve": "approved",
    "reject": "withdrawn",
    "dispute": "disputed",
    "withdraw": "withdrawn",
}


@pytest.mark.parametrize("verb, before", list(itertools.product(DECISIONS, STATUSES)))
def test_the_table(store: Path, verb: str, before: str) -> None:
    give(store, before)
    assert status(store) == before
    with Reader(store) as reader:
        head = reader.head
    if before in TAKES[verb]:
        (event,) = decide(store, verb, [OWN.id], who="Ben", comment="because")
        assert (event.who, event.comment, event.entry) == ("Ben", "because", OWN.id)
        assert status(store) == event.status == GIVES.get(verb, "draft")
    else:
        with pytest.raises(InvalidInput) as caught:
            decide(store, verb, [OWN.id], who="Ben", comment="because")
        assert OWN.id in str(caught.value)
        assert before in str(caught.value)
        assert "\n" not in str(caught.value)
        with Reader(store) as reader:
            assert reader.head == head
    assert check(store) == []


def test_every_status_that_waits_can_be_decided() -> None:
    for before, verbs in NEXT.items():
        assert all(before in DECISIONS[verb].on for verb in verbs)
    assert "draft" not in USABLE_STATUSES


@pytest.mark.parametrize("verb", [verb for verb, decision in DECISIONS.items() if decision.reason])
@pytest.mark.parametrize("comment", ["", "  \n\t "])
def test_a_reason_is_needed(store: Path, verb: str, comment: str) -> None:
    with pytest.raises(InvalidInput, match=rf"to {verb} needs a reason.*--comment"):
        decide(store, verb, [HF], who="Ben", comment=comment)


@pytest.mark.parametrize("name", ["Ada", "ada", " ADA ", "Ａda"])
def test_nobody_decides_for_an_own_entry(store: Path, name: str) -> None:
    with pytest.raises(InvalidInput, match=r"made it and cannot check it; somebody else must.*self-review"):
        decide(store, "check", [OWN.id], who=name)
    decide(store, "check", [OWN.id], who="Ben")
    with pytest.raises(InvalidInput, match="cannot approve it"):
        decide(store, "approve", [OWN.id], who=name)
    decide(store, "approve", [OWN.id], who="Ben")
    decide(store, "dispute", [OWN.id], who=name, comment="I doubt it now")  # doubt is free
    with pytest.raises(InvalidInput, match="cannot waive it"):
        decide(store, "waive", [OWN.id], who=name, comment="no, it is right")
    with pytest.raises(InvalidInput, match="cannot waive it"):
        decide(store, "waive", [OWN.id], who=name, comment="no, it is right", finding="bounds")
    decide(store, "withdraw", [OWN.id], who=name, comment="wrong column")
    assert status(store) == "withdrawn"


def test_a_store_of_one_person(store: Path) -> None:
    with Reader(store) as reader:
        assert settings_of(reader) == {"self-review": "off"}
        set_setting(store, "self-review", "on", who="Ada")
        set_setting(store, "self-review", "on", who="Ada")  # nothing to say twice
        assert settings_of(reader) == {"self-review": "on"}
        (event,) = [event for event in reader.events() if event.kind == "setting"]
        assert (event.who, dict(event.payload)) == ("Ada", {"name": "self-review", "value": "on"})
    (event,) = decide(store, "check", [OWN.id], who="Ada")
    assert event.payload == {"self": True}  # the log says so
    (event,) = decide(store, "approve", [OWN.id], who="Ben")
    assert event.payload == {}
    set_setting(store, "self-review", "off", who="Ada")
    decide(store, "dispute", [OWN.id], who="Ada", comment="c")
    with pytest.raises(InvalidInput, match="somebody else must"):
        decide(store, "waive", [OWN.id], who="Ada", comment="c")
    with pytest.raises(NotFound, match="settings are self-review"):
        set_setting(store, "colour", "on", who="Ada")
    with pytest.raises(InvalidInput, match="off or on"):
        set_setting(store, "self-review", "maybe", who="Ada")
    assert check(store) == []


def test_several_in_one_transaction(store: Path) -> None:
    other = entry(ETHANOL, value=3.0)
    add_own(store, other, SEED, "Ben")
    with Reader(store) as reader:
        head = reader.head
    with pytest.raises(InvalidInput, match=other.id):  # Ben's own is the second of three
        decide(store, "check", [OWN.id, other.id, HF], who="Ben")
    for bad, error in (("f" * 20, NotFound), ("", NotFound)):
        with pytest.raises(error):
            decide(store, "check", [OWN.id, bad], who="Cid")
    with Reader(store) as reader:
        assert reader.head == head
    events = decide(store, "check", [OWN.id, other.id[:12], HF, OWN.id], who="Cid", comment="one sheet")
    assert [event.entry for event in events] == [OWN.id, other.id, HF]
    assert [event.seq for event in events] == list(range(events[0].seq, events[0].seq + 3))
    with pytest.raises(InvalidInput, match="nothing to check"):
        decide(store, "check", [], who="Cid")


def test_an_ambiguous_beginning(store: Path) -> None:
    add_own_all(store, [(entry(WATER, value=float(i)), SEED) for i in range(40)], "Ada")
    with Reader(store) as reader:
        ids = [one.id for one in reader.entries("water")]
    first = next(id[0] for id in ids if sum(other[0] == id[0] for other in ids) > 1)
    for call in (lambda: decide(store, "check", [first], who="Ben"), lambda: history(Reader(store), first)):
        with pytest.raises(Ambiguous, match="several entries begin with"):
            call()


def test_why_it_is_refused(store: Path) -> None:
    def said(verb: str, **fields: str) -> str:
        with pytest.raises(InvalidInput) as caught:
            decide(store, verb, [OWN.id], who="Ben", **{"comment": "c", **fields})
        return str(caught.value)

    assert "nobody has checked" in said("approve")
    assert f"propdb review check {OWN.id[:8]} first" in said("approve")
    decide(store, "check", [OWN.id], who="Ben")
    assert "already (checked by Ben on " in said("check")
    decide(store, "reject", [OWN.id], who="Ben", comment="another grade")
    assert "withdrawn (rejected by Ben on " in said("approve")
    assert "add it anew" in said("approve")
    assert "withdrawn" in said("waive", finding="bounds")
    with pytest.raises(InvalidInput, match=r"it is base and cannot be approved; type propdb review check"):
        decide(store, "approve", [HF], who="Ben")
    decide(store, "dispute", [HF], who="Ben", comment="c")
    with pytest.raises(InvalidInput, match="waive that first"):
        decide(store, "approve", [HF], who="Ben")
    with pytest.raises(InvalidInput, match="4001 characters"):
        decide(store, "waive", [HF], who="Ben", comment="x" * 4001)


@pytest.mark.parametrize("before", ["base", "estimate", "checked", "approved"])
@pytest.mark.parametrize("doubt", ["disputed", "quarantined"])
def test_waiving_brings_the_status_before_back(tmp_path: Path, before: str, doubt: str) -> None:
    path = tmp_path / "store.db"
    build(path, content(statuses={HF: before}), versions={})
    with closing(open_store(path, write=True)) as conn:
        for _ in range(2):
            log.append(conn, doubt, entry=HF, who="Ben")
    decide(path, "waive", [HF], who="Ben", comment="settled")
    assert status(path, HF) == before


def test_waiving_a_quarantine_of_the_base(tmp_path: Path) -> None:
    path = tmp_path / "store.db"
    build(path, content(statuses={HF: "quarantined"}), versions={})
    decide(path, "waive", [HF], who="Ben", comment="the joint is at the transition")
    assert status(path, HF) == "base"


def test_waiving_a_finding_leaves_the_status(store: Path) -> None:
    (event,) = decide(store, "waive", [HF], who="Ben", comment="known", finding="closure")
    assert (event.payload, event.status, status(store, HF)) == ({"finding": "closure"}, "", "base")


def test_a_withdrawn_entry_may_be_added_again(store: Path) -> None:
    decide(store, "check", [OWN.id], who="Ben")
    decide(store, "reject", [OWN.id], who="Ben", comment="unit?")
    assert add_own(store, OWN, SEED, "Ada", comment="it is kJ") == OWN.id
    assert status(store) == "draft"
    assert add_own(store, OWN, SEED, "Ada") == OWN.id  # a draft already
    with Reader(store) as reader:
        assert [event.kind for event in reader.events(OWN.id)] == ["created", "checked", "rejected", "created"]
        assert len([one for one in reader.entries("water") if one.id == OWN.id]) == 1
    decide(store, "check", [OWN.id], who="Ben")
    assert check(store) == []


WORST = '\'; DROP TABLE event; --\x00\x1b[31mred\x1b[0m\r\n\u202eright\u2029\x9b5m \U0001f600 {"a": 1}'


def test_any_comment_is_kept_as_it_is(store: Path) -> None:
    (event,) = decide(store, "check", [OWN.id], who="Ben'; --", comment=WORST)
    with Reader(store) as reader:
        (_, again) = reader.events(OWN.id)
    assert (again, again.comment, again.who) == (event, WORST, "Ben'; --")
    assert check(store) == []
    with pytest.raises(InvalidInput, match="not Unicode"):
        decide(store, "dispute", [OWN.id], who="Ben", comment="\ud800")


# -- what waits ----------------------------------------------------------------------------------------------------


def test_what_waits(store: Path) -> None:
    def listed() -> list[tuple[str, str, str, tuple[str, ...]]]:
        with Reader(store) as reader:
            return [(one.entry.id, one.author, one.event.who, one.next) for one in waiting(reader)]

    assert listed() == [(OWN.id, "Ada", "Ada", ("check", "reject"))]
    decide(store, "dispute", [HF], who="Cid", comment="c")
    decide(store, "check", [OWN.id], who="Ben")
    assert listed() == [(HF, "", "Cid", ("waive", "withdraw")), (OWN.id, "Ada", "Ben", ("approve", "reject"))]
    decide(store, "approve", [OWN.id], who="Ben")
    decide(store, "waive", [HF], who="Ben", comment="c")
    assert listed() == []
    build(store, content(entries=content().entries[1:]), versions={})  # the base lets one go that was decided about
    assert listed() == []


# -- history -------------------------------------------------------------------------------------------------------


def test_history_of_an_entry(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "store.db"
    times = iter(f"2025-03-{day:02d}T12:00:00.000000Z" for day in range(1, 30))
    now = [""]

    def day() -> None:
        now[0] = next(times)

    monkeypatch.setattr(migrate, "utc_now", lambda: now[0])
    day()
    build(path, content(), versions={})
    day()
    build(path, content(policy={}), versions={})  # nothing about the entry
    day()
    decide(path, "dispute", [HF], who="Ben", comment="too low")
    day()
    build(path, content(statuses={HF: "estimate"}), versions={})
    day()
    build(path, content(entries=content().entries[1:]), versions={})
    day()
    build(path, content(), versions={})
    day()
    decide(path, "waive", [HF], who="Ben", comment="no")
    day()

    def told(**how: Any) -> list[tuple[str, str, str]]:
        with Reader(path, **how) as reader:
            return [(one.kind, one.status, one.comment) for one in history(reader, HF[:10])]

    assert told() == [
        ("base", "base", "enters the base"),
        ("disputed", "disputed", "too low"),
        ("base", "disputed", "the base has another status"),
        ("base", "", "the base no longer holds it"),
        ("base", "disputed", "enters the base"),
        ("waived", "base", "no"),
    ]
    assert told(as_of="2025-03-03") == told()[:2]
    assert told(as_of="2025-03-05") == told()[:4]
    with Reader(path, as_of="2025-03-05") as reader, pytest.raises(NotFound, match="was not in the store then"):
        reader.entry(HF)
    add_own(path, OWN, SEED, "Ada", comment="ours")
    with Reader(path) as reader:
        (made,) = history(reader, OWN.id)
        assert (made.kind, made.who, made.comment, made.status, dict(made.payload)) == (
            "created",
            "Ada",
            "ours",
            "draft",
            {},
        )
        for bad in ("", "ffffffffff", "%"):
            with pytest.raises(NotFound, match="no entry"):
                history(reader, bad)
    with Reader(path, as_of="2025-03-05") as reader, pytest.raises(NotFound, match="was not in the store then"):
        history(reader, OWN.id)


# -- own data in the log -------------------------------------------------------------------------------------------


def test_own_data_are_in_the_log(store: Path) -> None:
    put_own(store, policy={"ranks": {}}, datums={"x": {"a": 1}}, who="Ada", comment="as agreed")
    put_own(store, policy={"ranks": {}}, datums={"x": {"a": 1}}, who="Ada")  # nothing new
    add_own_all(store, [(entry(WATER, value=9.0, source="mine"), SEED)], "Ben", sources=(replace(BOOK, key="mine"),))
    with Reader(store) as reader:
        defined = [event for event in reader.events() if event.kind == "defined"]
    facts = [{key: names for key, names in event.payload.items() if key != "rows"} for event in defined]
    assert facts == [{"datums": ["x"], "policy": ["ranks"]}, {"sources": ["mine"]}]
    assert [(event.who, event.comment) for event in defined] == [("Ada", "as agreed"), ("Ben", "")]
    assert check(store) == []


def test_another_carrier_of_an_own_entry_is_in_the_log(store: Path) -> None:
    add_own(store, OWN, replace(SEED, file="again.csv"), "Ben")
    with Reader(store) as reader:
        assert reader.events()[-1].payload["carriers"] == [OWN.id]  # type: ignore[comparison-overlap]
    assert check(store) == []


@pytest.mark.parametrize(
    "by_hand, part",
    [
        ("UPDATE source SET class = 'evaluated' WHERE own = 1", "own sources"),
        ("UPDATE datum SET body = '{\"a\":2}' WHERE own = 1", "own datums"),
        ("UPDATE lineage SET evidence = 'none' WHERE own = 1", "own lineage"),
        ("UPDATE carrier SET how = 'measured'", "carriers"),
    ],
)
def test_what_was_changed_by_hand_is_not_made_good_by_writing_beside_it(store: Path, by_hand: str, part: str) -> None:
    put_own(store, sources=(replace(BOOK, key="mine"),), datums={"x": {"a": 1}})
    with closing(sqlite3.connect(store)) as conn:
        conn.execute(by_hand)
        conn.commit()
    assert [problem.where for problem in check(store)] == [part]
    add_own_all(store, [(entry(WATER, value=9.0, source="mine"), SEED)], "Ben", sources=(replace(BOOK, key="other"),))
    put_own(store, policy={"x": 1})
    build(store, content(policy={}), versions={})
    assert [problem.where for problem in check(store)] == [part]


def test_what_was_changed_by_hand_can_be_put_back(store: Path) -> None:
    put_own(store, datums={"x": {"a": 1}})
    with closing(sqlite3.connect(store)) as conn:
        conn.execute("UPDATE datum SET body = '{}' WHERE own = 1")
        conn.execute("UPDATE species SET molar_mass = 0.02 WHERE name = 'water'")
        conn.commit()
    assert {problem.where for problem in check(store)} >= {"own datums", "base species"}
    put_own(store, datums={"x": {"a": 1}})
    build(store, content(policy={}), versions={})  # which writes the rows of the base anew
    assert check(store) == []


def test_a_seal_covers_every_part(store: Path) -> None:
    with closing(open_store(store)) as conn:
        last = seal.carried(conn)
        assert last is not None
        assert set(last[1]) == set(seal.PARTS)
        assert last[1] == seal.state(conn)


def test_a_decision_is_a_record() -> None:
    assert DECISIONS["approve"] == Decision("approved", ("checked",), False, True)


# -- who -----------------------------------------------------------------------------------------------------------


def test_the_name_is_never_guessed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    config = tmp_path / "config.toml"
    monkeypatch.setenv("PROPDB_CONFIG", str(config))
    monkeypatch.setenv("USER", "login")
    for empty in (None, "", "  "):
        if empty is None:
            monkeypatch.delenv("PROPDB_USER", raising=False)
        else:
            monkeypatch.setenv("PROPDB_USER", empty)
        with pytest.raises(InvalidInput, match=r"nobody is named.*set PROPDB_USER.*config\.toml"):
            who()
    config.write_text('user = " Ada  L. "', encoding="utf-8-sig")
    assert who() == "Ada L."
    monkeypatch.setenv("PROPDB_USER", "Ben")
    assert who() == "Ben"


@pytest.mark.parametrize(
    "text, problem",
    [
        ("user = Ada", "not TOML"),
        ("user = 3", "not a text"),
        ('usr = "Ada"', "unknown setting 'usr'"),
        ('user = "A\\u001bda"', "control character"),
        ('user = "A\\u202eda"', "control character"),
        (f'user = "{"x" * 101}"', "101 characters"),
        (b'user = "\xff"', "not text in UTF-8"),
    ],
)
def test_a_bad_configuration(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, text: str | bytes, problem: str) -> None:
    config = tmp_path / "config.toml"
    config.write_bytes(text if isinstance(text, bytes) else text.encode())
    monkeypatch.setenv("PROPDB_CONFIG", str(config))
    with pytest.raises(InvalidInput, match=problem) as caught:
        who()
    assert str(config) in str(caught.value)
    assert "\n" not in str(caught.value)


def test_a_configuration_that_is_a_directory(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("PROPDB_CONFIG", str(tmp_path))
    with pytest.raises(InvalidInput, match="cannot be read"):
        who()


def test_where_the_configuration_is(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("PROPDB_CONFIG")
    assert person.config_path().name == "config.toml"
    assert "propdb" in person.config_path().parts
