"""Killed at random points, by the clock and between any two SQL statements: a store holds all of a command or nothing.

A dozen kills in the normal run, fifty of each kind of command with ``--full``.
"""

from __future__ import annotations

import random
import shutil
import time
from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest
from soak_samples import (
    DRAFTS,
    EVENTS,
    Held,
    Row,
    change_rows,
    copy_seed,
    held,
    settle,
    start,
    template_csv,
    template_toml,
)

from propdb.api import Store, opening
from propdb.store.backup import check

#: One command line in a process that kills itself before its Nth SQL statement (0: never), and says how many it ran and
#: which of them began to write.
RUN = """
import os, signal, sqlite3
from pathlib import Path
at, seed, *words = sys.argv[1:]
plain, count, first = sqlite3.connect, 0, 0
def step(statement):
    global count, first
    count += 1
    if statement.startswith("BEGIN IMMEDIATE"):
        first = first or count
    if count == int(at):
        os.kill(os.getpid(), getattr(signal, "SIGKILL", signal.SIGTERM))
def connect(*values, **named):
    conn = plain(*values, **named)
    conn.set_trace_callback(step)
    return conn
sqlite3.connect = connect
from functools import partial
from propdb.intake import seeds, where
where.seed_root = lambda: Path(seed)
seeds.load_seed = partial(seeds.load_seed, identifiers=False)  # takes long and writes nothing
from propdb.cli.main import run
try:
    run(words)
finally:
    print("statements", first, count, file=sys.stderr)
"""


@dataclass(frozen=True)
class World:
    """A store that was built from the first of two small seeds, and has drafts of its own."""

    store: Path
    folder: Path
    seeds: tuple[Path, Path]


@dataclass(frozen=True)
class Command:
    """A command line, who types it, and whether the store holds what it does."""

    words: list[str]
    done: Callable[[Held, Held], bool]  # (before, after)
    user: str = "ben"
    seed: int = 0


def _few(row: Row) -> bool:
    """Constants that are quickly compared: what is loaded before the writing takes long enough."""
    return row[0] in ("water", "ammonia", "methane", "nitrogen") and row[1] in ("Hf", "S", "Tb")


@pytest.fixture(scope="module")
def pristine(tmp_path_factory: pytest.TempPathFactory) -> World:
    folder = tmp_path_factory.mktemp("kill")
    seeds = (copy_seed(folder / "seed-0", keep=_few), copy_seed(folder / "seed-1", keep=_few))
    change_rows(seeds[1] / "crc-95" / "entries.csv", lambda rows: rows[1:])
    change_rows(seeds[1] / "codata-1989" / "entries.csv", lambda rows: [[*r[:6], r[6] + "5", *r[7:]] for r in rows])
    path = folder / "pristine.db"
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("propdb.intake.where.seed_root", lambda: seeds[0])
        patch.setenv("PROPDB_USER", "ada")
        opening.build_seed(path, None)
        for number in range(12):
            draft = folder / f"first-{number}.csv"
            draft.write_text(template_csv(f"first-{number}"), encoding="utf-8")
            with Store(path) as store:
                store.add(draft)
    settle(path)
    return World(path, folder, seeds)


@pytest.fixture
def world(pristine: World, tmp_path: Path) -> World:
    """The same, to be written to."""
    shutil.copyfile(pristine.store, tmp_path / "store.db")
    return World(tmp_path / "store.db", tmp_path, pristine.seeds)


def _added(tag: str) -> Callable[[Held, Held], bool]:
    def done(before: Held, after: Held) -> bool:
        new = {id: facts for id, facts in after.own.items() if id not in before.own}
        return (
            len(after.events) == len(before.events) + EVENTS
            and list(new.values()) == [(f"table {tag}", "draft")] * DRAFTS
            and after.content == before.content
        )

    return done


def add(world: World, tag: str, dice: random.Random) -> Command:
    file = world.folder / f"{tag}.csv"
    file.write_text(template_csv(tag), encoding="utf-8")
    return Command(["add", str(file)], _added(tag))


def import_(world: World, tag: str, dice: random.Random) -> Command:
    file = world.folder / f"{tag}.toml"
    file.write_text(template_toml(tag), encoding="utf-8")
    return Command(["import", str(file)], _added(tag))


#: What may be decided, by status; seldom what nothing comes after.
OPEN = {
    "draft": ("check", "check", "reject"),
    "checked": ("approve", "approve", "reject"),
    "approved": ("dispute",),
    "disputed": ("waive", "waive", "withdraw"),
}


def review(world: World, tag: str, dice: random.Random) -> Command:
    """Any decision that is open, about all entries of one status that share a sheet: all or none of them."""
    by_sheet: dict[tuple[str, str], list[str]] = {}
    for id, facts in held(world.store).own.items():
        by_sheet.setdefault(facts, []).append(id)
    (_, status), ids = dice.choice(sorted((facts, ids) for facts, ids in by_sheet.items() if facts[1] in OPEN))
    verb = dice.choice(OPEN[status])

    def done(before: Held, after: Held) -> bool:
        changed = {id for id in after.own if after.own[id] != before.own[id]}
        new = after.events[len(before.events) :]
        return sorted(changed) == sorted(ids) == sorted(entry for _, _, entry in new)

    return Command(["review", verb, *ids, "--comment", f"said {tag}"], done)


def rebuild(world: World, tag: str, dice: random.Random) -> Command:
    """The seed that the store does not have."""
    bases = sum(kind == "base" for _, kind, _ in held(world.store).events)

    def done(before: Held, after: Held) -> bool:
        new = [kind for _, kind, _ in after.events[len(before.events) :]]
        return new == ["base"] and after.content != before.content and after.own == before.own

    return Command(["store", "rebuild"], done, seed=bases % 2)


Maker = Callable[[World, str, random.Random], Command]
COMMANDS: dict[str, Maker] = {"add": add, "import": import_, "review": review, "rebuild": rebuild}


def run(world: World, command: Command, *, at: int = 0, after: float | None = None) -> tuple[bool, list[int], float]:
    """Run a command line, killed before a statement, or after a while [s].

    Returns whether it was acknowledged, its first statement that writes and its last (nothing if killed before), and
    how long it took [s].
    """
    began = time.monotonic()
    process = start(
        RUN, str(at), world.seeds[command.seed], *command.words, "--store", str(world.store), user=command.user
    )
    if after is not None:
        time.sleep(after)
        process.kill()
    out, err = process.communicate(timeout=300)
    last = (err.splitlines() or [""])[-1]
    statements = [int(number) for number in last.split()[1:]] if last.startswith("statements") else []
    assert process.returncode <= 0 or not statements, err  # all went well, or it was killed
    return process.returncode == 0 or bool(out.strip()), statements, time.monotonic() - began


def soak(world: World, make: Maker, kills: int, seed: int) -> Counter[str]:
    """Kill a kind of command so often, half of the times by the clock; what came of it."""
    dice = random.Random(seed)
    before = held(world.store)
    command = make(world, "whole", dice)
    acknowledged, (first, last), seconds = run(world, command)  # to know how many moments there are
    after = held(world.store)
    assert acknowledged
    assert command.done(before, after)
    came: Counter[str] = Counter()
    for number in range(kills):
        before = after
        command = make(world, f"kill-{number}", dice)
        if number % 2:
            how = f"after {(pause := dice.uniform(0, 1.2 * seconds)):.3f} s"
            acknowledged, ran, _ = run(world, command, after=pause)
            seconds *= 0.8 if ran else 1.1  # the machine may have become faster or slower
        else:  # mostly while it writes
            at = dice.randint(first if dice.random() < 0.8 else 1, last)
            how = f"before statement {at} of {last}"
            acknowledged, ran, _ = run(world, command, at=at)
        what = f"{command.words} killed {how} ({number}, seed {seed})"
        after = held(world.store)  # it opens
        assert check(world.store) == [], what
        if acknowledged:
            assert command.done(before, after), f"acknowledged and not there: {what}"
            came["over before the kill" if ran else "acknowledged"] += 1
        elif after == before:
            came["nothing"] += 1
        else:
            assert command.done(before, after), f"half of it: {what}"
            came["all"] += 1
        assert after.events[: len(before.events)] == before.events, what
    command = make(world, "last", dice)  # and goes on as if nothing had been
    before = held(world.store)
    run(world, command)
    assert command.done(before, held(world.store))
    assert check(world.store) == []
    return came


@pytest.mark.parametrize("kind, kills", [("add", 3), ("import", 2), ("review", 4), ("rebuild", 3)])
def test_kills(world: World, kind: str, kills: int) -> None:
    assert soak(world, COMMANDS[kind], kills, seed=1).total() == kills


@pytest.mark.full
@pytest.mark.parametrize("kind", COMMANDS)
def test_many_kills(world: World, kind: str) -> None:
    came = soak(world, COMMANDS[kind], 50, seed=2)
    print(f"{kind}: {dict(came)}")
    assert came["nothing"] > 0
    assert came["nothing"] < came.total()
