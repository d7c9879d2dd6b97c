"""From a vendor's number to an answer that says who approved it; and the record of it all, at the command line."""

from __future__ import annotations

import json
import shutil
import sqlite3
from collections.abc import Iterator
from contextlib import closing
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any

import pytest

import propdb
from propdb.errors import IntegrityError, InvalidInput, NotFound, StoreError
from propdb.model.records import Carrier, Entry, Source
from propdb.store import migrate
from propdb.store.content import with_id
from propdb.store.own import add_own_all

SHEET = Source("vendor-2026", "Data sheet of an invented vendor", (), 2026, "report", "compilation", "invented")
MINE = Carrier("own", "", "sheet.csv", 2, "typed from the sheet")
ENTHALPY = "enthalpy ethanol --phase l --temperature 298.15K --datum elements-298K"
YESTERDAY = (datetime.now(UTC) - timedelta(days=1)).date().isoformat()
BASE_ENTRY = "e03c1457"  # water, Hf of the liquid


@pytest.fixture(scope="module")
def yesterday_store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A store that was built two days ago."""
    path = tmp_path_factory.mktemp("review") / "group.db"
    then = datetime.now(UTC) - timedelta(days=2)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(migrate, "utc_now", lambda: then.strftime("%Y-%m-%dT%H:%M:%S.%fZ"))
        propdb.api.Store(path).store_rebuild(open_data=False)
    return path


@pytest.fixture
def group(yesterday_store: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Path]:
    """The store of a group, of one's own for each test."""
    copy = tmp_path / "group.db"
    with propdb.open(yesterday_store) as store:
        store.store_backup(copy)
    monkeypatch.setenv("PROPDB_STORE", str(copy))
    yield copy
    shutil.rmtree(tmp_path, ignore_errors=True)


def vendor_value(path: Path, value: float = -277_000.0, who: str = "ada") -> str:
    """Add the formation enthalpy of liquid ethanol as a vendor might state it (an invented number)."""
    with propdb.open(path) as store:
        species = store.show("ethanol").species
    made = Entry(
        id="",
        species=species.name,
        quantity="Hf",
        phase="l",
        form="",
        to="",
        equation="",
        temperature=298.15,
        value=value,
        unit="J/mol",
        carried=f"{value / 1e3:.2f}",
        carried_unit="kJ/mol",
        params={},
        tmin=None,
        tmax=None,
        uncertainty=300.0,
        uncertainty_unit="",
        uncertainty_kind="expanded-95",
        datum="elements-298K",
        conditions="",
        source=SHEET.key,
        locator="ethanol",
    )
    (number,) = add_own_all(path, [(with_id(made, species), MINE)], who, sources=(SHEET,))
    return number


@pytest.fixture
def as_user(line: Any, monkeypatch: pytest.MonkeyPatch) -> Any:
    """Run a command line in somebody's name."""

    def run(name: str, *words: str) -> Any:
        with monkeypatch.context() as patch:
            patch.setenv("PROPDB_USER", name)
            return line(*words)

    return run


def lines(result: Any) -> list[dict[str, Any]]:
    """JSON lines of a result."""
    assert result.code == 0, result.err
    return [json.loads(text) for text in result.out.splitlines()]


def test_from_a_vendors_number_to_an_answer(line: Any, as_user: Any, group: Path) -> None:
    before = json.loads(line(f"{ENTHALPY} --json").out)
    number = vendor_value(group)
    short = number[:8]

    # a draft is listed, and never used
    listed = line("review list").out
    assert all(
        word in listed for word in (short, "ethanol Hf l", "-277.00", "vendor-2026", "ada", "draft", "check or reject")
    )
    assert json.loads(line(f"{ENTHALPY} --json").out)["value"] == before["value"]

    # not by the one who made it, nor by nobody
    refused = as_user("Ada", f"review check {short}")
    assert (refused.code, "somebody else must" in refused.problem) == (InvalidInput.exit_code, True)
    assert "PROPDB_USER" in line(f"review check {short}").problem
    assert "propdb review check" in as_user("ben", f"review approve {short}").problem

    done = as_user("ben", "review", "check", short, "--comment", "compared with the sheet")
    assert done.out == f"checked  {short}  ethanol Hf l -277.00 kJ/mol  vendor-2026 by ben\n"
    checked = line(ENTHALPY).out
    assert f"Hf of vendor-2026 [{short}] is checked in this store" in checked
    assert as_user("cid", f"review approve {short}").code == 0
    assert line("review list").out == "nothing waits\n"

    # the answer uses it and says so
    after = json.loads(line(f"{ENTHALPY} --json").out)
    assert after["value"] == pytest.approx(-277.0, abs=1e-9)
    assert after["uncertainty"] == pytest.approx(0.15)
    (step,) = [step for step in after["steps"] if step["entry"] == number]
    assert (step["source"], step["note"]) == ("vendor-2026", f"Hf of vendor-2026 [{short}] is approved in this store")
    assert after["store"] != before["store"]
    text = line(ENTHALPY).out
    assert "Data sheet of an invented vendor" in text
    assert f"[{short}]" in text
    assert any(closure["source"] != "vendor-2026" for closure in after["closures"])  # the base's is compared with it

    # and yesterday it was not there
    then = json.loads(line(f"{ENTHALPY} --json --as-of {YESTERDAY}").out)
    assert then["value"] == before["value"]
    assert then["store"] == before["store"]
    assert "was not in the store then" in line(f"entry show {short} --as-of {YESTERDAY}").problem
    assert "was not in the store then" in line(f"entry history {short} --as-of {YESTERDAY}").problem
    assert line(f"review list --as-of {YESTERDAY}").out == "nothing waits\n"
    assert len(lines(line(f"store log --json --as-of {YESTERDAY}"))) == 1

    # its history
    told = [(one["kind"], one["who"], one["status"]) for one in lines(line(f"entry history {short} --json"))]
    assert told == [("created", "ada", "draft"), ("checked", "ben", "checked"), ("approved", "cid", "approved")]
    history = line(f"entry history {short}").out
    assert history.startswith(f"entry {number}\n")
    assert "compared with the sheet" in history

    # withdrawn, it is out of use, and cannot be approved
    assert as_user("ada", "review", "withdraw", short, "--comment", "the vendor corrected it").code == 0
    assert json.loads(line(f"{ENTHALPY} --json").out)["value"] == before["value"]
    assert "withdrawn (withdrawn by ada on " in as_user("ben", f"review approve {short}").problem
    assert line("store check").code == 0


def test_a_disputed_entry_says_so_in_the_answer(line: Any, as_user: Any, group: Path) -> None:
    ask = "enthalpy 'sulfuric acid' --phase l --temperature 298.15K --datum elements-298K"
    with propdb.open(group) as store:
        ids = [one.id for one in store.show("sulfuric acid", quantity="Hf", phase="l").entries]
    assert "disputed" not in line(ask).out
    assert as_user("ben", "review", "dispute", *ids, "--comment", "which concentration?").code == 0
    assert "is disputed" in line(ask).out  # nothing better is there
    assert "needs a reason" in as_user("ben", "review", "waive", *ids).problem
    assert as_user("ben", "review", "waive", *ids, "--comment", "a slip of mine").code == 0
    assert "disputed" not in line(ask).out


WORST = "'; DROP TABLE event; --\x1b[31m\x1b]0;title\x07\r\nfake  2026-01-01  approved\x9b5m\u202e\u2028end"


def test_a_comment_controls_nothing(line: Any, as_user: Any, group: Path) -> None:
    assert as_user("ben", "review", "check", BASE_ENTRY, "--comment", WORST).code == 0
    for words in ("store log", f"entry history {BASE_ENTRY}"):
        shown = line(words).out
        assert not any(char in shown for char in "\x1b\x07\r\x9b\u202e\u2028")
        (row,) = [row for row in shown.splitlines() if "DROP TABLE" in row]
        assert (
            r"'; DROP TABLE event; --\x1b[31m\x1b]0;title\x07\r\nfake  2026-01-01  approved\x9b5m\u202e\u2028end" in row
        )
        result = line(f"{words} --json")
        assert not any(char in result.out for char in "\x1b\x07\r\x9b\u202e\u2028")
        assert lines(result)[-1]["comment"] == WORST
    as_user("ben", "review", "dispute", BASE_ENTRY, "--comment", WORST)
    assert not any(char in line("review list").out for char in "\x1b\x07\r\x9b\u202e\u2028")
    assert json.loads(line("review list --json").out)["waiting"][0]["last"]["comment"] == WORST
    assert line("store check").code == 0


def test_json_of_decisions_and_of_the_log(line: Any, as_user: Any, group: Path) -> None:
    number = vendor_value(group)
    decided = lines(as_user("ben", f"review check {number} {BASE_ENTRY} --json"))
    assert [event["kind"] for event in decided] == ["checked", "checked"]
    logged = lines(line("store log --json"))
    assert [event["seq"] for event in logged] == list(range(1, len(logged) + 1))
    assert [event["kind"] for event in logged] == ["base", "defined", "created", "checked", "checked"]
    assert [event["hash"] for event in logged[:-1]] == [event["prev"] for event in logged[1:]]
    assert logged[-2] | {"species": 0} == decided[0] | {"species": 0, "quantity": "Hf", "phase": "l"}
    text = line("store log").out
    assert text.splitlines()[-1] == f"head {logged[-1]['hash']} after 5 events"
    assert "sources vendor-2026" in text
    assert "head" in line("store info").out
    assert logged[-1]["hash"] in line("store info").out
    assert len(lines(line("store log --last 2 --json"))) == 2
    assert line("store log --last 2").out.splitlines()[-1] == text.splitlines()[-1]
    assert "ask for 1 or more" in line("store log --last 0").problem


def test_a_store_of_one_person(line: Any, as_user: Any, group: Path) -> None:
    number = vendor_value(group)
    assert line("store setting").out == "self-review  off\n"
    assert "PROPDB_USER" in line("store setting self-review on").problem
    assert as_user("ada", "store setting self-review on").out == "self-review  on\n"
    assert as_user("ada", f"review check {number}").out.endswith("on an entry of one's own by ada\n")
    text = line("store log").out
    assert "setting" in text
    assert "self-review on" in text
    assert "of one's own" in text
    assert json.loads(line("store setting self-review --json").out) == {"self-review": "on"}
    assert line(f"store setting --as-of {YESTERDAY}").out == "self-review  off\n"


CASES: list[tuple[str, type[Exception], tuple[str, ...]]] = [
    ("review check", InvalidInput, ("ENTRY",)),
    ("review check ffffffffffff", NotFound, ("ffffffffffff", "propdb show")),
    ("review check %", NotFound, ("%",)),
    (f"review approve {BASE_ENTRY}", InvalidInput, ("base", "propdb review check e03c1457")),
    (f"review dispute {BASE_ENTRY}", InvalidInput, ("reason", "--comment")),
    (f"review withdraw {BASE_ENTRY} --comment ' '", InvalidInput, ("reason",)),
    (f"review waive {BASE_ENTRY} --comment x", InvalidInput, ("disputed or quarantined",)),
    (f"review waive {BASE_ENTRY} --finding bounds", InvalidInput, ("reason",)),
    (
        f"--as-of YESTERDAY review check {BASE_ENTRY}",
        InvalidInput,
        ("as of 2", "cannot be changed", "leave --as-of out"),
    ),
    ("--as-of YESTERDAY store setting self-review on", InvalidInput, ("cannot be changed",)),
    ("--as-of YESTERDAY datum add my.toml", InvalidInput, ("cannot be changed",)),
    ("store setting colour", NotFound, ("self-review",)),
    ("store setting self-review perhaps", InvalidInput, ("off or on",)),
    ("entry history zzz", NotFound, ("zzz",)),
    ("review praise x", InvalidInput, ("praise", "propdb review")),
    ("review chek x", InvalidInput, ("did you mean propdb review check",)),
    ("store log --as-of 2999-01-01", InvalidInput, ("lies in the future", "leave --as-of out")),
    ("store log --as-of 1999-01-01", NotFound, ("its first base is of",)),
    ("store log --verify --store nowhere.db", StoreError, ("nowhere.db",)),
]


@pytest.mark.parametrize("words, error, parts", CASES, ids=[words for words, _, _ in CASES])
def test_bad_input(
    as_user: Any, group: Path, words: str, error: type[propdb.PropdbError], parts: tuple[str, ...]
) -> None:
    with propdb.open(group) as store:
        head = store.store_log().head
    result = as_user("ben", words.replace("YESTERDAY", YESTERDAY))
    assert result.code == error.exit_code
    assert all(part in result.problem for part in parts), result.problem
    with propdb.open(group) as store:
        assert store.store_log().head == head


READING = [
    "find water",
    "show water",
    ENTHALPY,
    "convert 2800.8 kJ/kg --species water --from steam-triple-point --to elements-298K",
    "reaction 'CO(g) + 1/2 O2(g) -> CO2(g)' --temperature 500K",
    "datum list",
    "datum show gas-25C",
    "source list",
    "source show codata-1989",
    "source cite codata-1989",
    f"entry show {BASE_ENTRY}",
    f"entry history {BASE_ENTRY}",
    "review list",
    "store info",
    "store log",
    "store setting",
]


@pytest.mark.parametrize("words", READING)
def test_every_reading_verb_takes_a_date(line: Any, group: Path, words: str) -> None:
    for placed in (f"{words} --as-of {YESTERDAY}", f"--as-of {YESTERDAY} {words}"):
        result = line(placed)
        assert (result.code, result.out) == (0, line(words).out)
    first = line(f"{words} --as-of 2000-01-01")
    assert first.code == NotFound.exit_code
    assert "no base as of 2000-01-01; its first base is of 20" in first.problem
    future = line(f"{words} --as-of 2999-01-01")
    assert future.code == InvalidInput.exit_code
    assert "2999-01-01 lies in the future" in future.problem


# -- tampering, as the command line tells it -----------------------------------------------------------------------


def by_hand(path: Path, *statements: str) -> None:
    with closing(sqlite3.connect(path, isolation_level=None)) as conn:
        guards = conn.execute("SELECT name, sql FROM sqlite_master WHERE type = 'trigger'").fetchall()
        for name, _ in guards:
            conn.execute(f"DROP TRIGGER {name}")
        for statement in statements:
            conn.execute(statement)
        for _, sql in guards:
            conn.execute(sql)


def test_verify_lists_everything(line: Any, as_user: Any, group: Path) -> None:
    number = vendor_value(group)
    as_user("ben", f"review check {number}")
    sound = line("store log --verify")
    head = lines(line("store log --json"))[-1]["hash"]
    assert sound.out == f"everything is as it was written; head {head} after 4 events\n"
    assert lines(line("store log --verify --json"))[-1]["hash"] == head
    by_hand(
        group,
        f"UPDATE entry SET value = -270000 WHERE id = '{number}'",
        "UPDATE event SET who = 'cid' WHERE kind = 'checked'",
        f"UPDATE source SET class = 'evaluated' WHERE key = '{SHEET.key}'",
        "UPDATE datum SET body = '{}' WHERE name = 'gas-25C'",
        "UPDATE species SET molar_mass = molar_mass * 2 WHERE name = 'ethanol'",
        "UPDATE policy SET value = '{}'",
    )
    result = line("store log --verify")
    assert result.code == IntegrityError.exit_code
    found = result.out.splitlines()
    for part in (f"entry {number}: was edited", "event 4: was edited", "own sources:", "base datums:", "base species:"):
        assert any(text.startswith(part) for text in found), found
    assert any(text.startswith("base policy:") for text in found)
    assert result.err.count("\n") == 1
    assert f"{len(found)} findings: the store is not as propdb wrote it; put a backup in its place" in result.err
    as_json = line("store log --verify --json")
    assert [f"{one['where']}: {one['what']}" for one in map(json.loads, as_json.out.splitlines())] == found
    checked = line("store check")
    assert checked.code == IntegrityError.exit_code
    with propdb.open(group) as store, pytest.raises(IntegrityError) as caught:
        store.store_log(verify=True)
    assert caught.value.fields["problems"] == found


@pytest.mark.parametrize("payload", ["5", "{}", '{"content_hash":7}'])
def test_verify_opens_what_cannot_be_read(line: Any, group: Path, payload: str) -> None:
    by_hand(group, f"UPDATE event SET payload = '{payload}'")
    result = line("store log --verify")
    assert result.code == IntegrityError.exit_code
    assert "event 1: was edited: its hash does not match" in result.out
    assert line("store log").code in (0, IntegrityError.exit_code)
    assert line("find water").code in (0, IntegrityError.exit_code)
