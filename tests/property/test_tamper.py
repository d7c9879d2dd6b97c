"""Content changed by hand in the SQLite file shows, whatever it was: a thousand random changes, each in a fresh copy.

A change is made as somebody would who knows SQLite: guards taken away and put back, checks and references off.
"""

from __future__ import annotations

import random
import shutil
import sqlite3
from collections import Counter
from contextlib import closing
from dataclasses import replace
from pathlib import Path
from typing import Any, Final

import pytest
from store_samples import BOOK, ETHANOL, SEED, WATER, content, curve, entry

from propdb.model.records import Carrier, Species
from propdb.store.backup import check
from propdb.store.own import add_own_all, put_own
from propdb.store.review import decide, set_setting
from propdb.store.write import build

#: Tables that hold no content: the index of names, cross-checks (which a build computes), housekeeping of SQLite.
NO_CONTENT: Final = ("name_trigram", "sqlite_", "crosscheck", "migration")
MINE: Final = Carrier("own", "", "sheet.csv", 2, "typed from the vendor's sheet")


@pytest.fixture(scope="module")
def pristine(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A store that has seen everything: two bases, the second with less in it; own data; reviews; a setting."""
    path = tmp_path_factory.mktemp("tamper") / "store.db"
    first = content()
    build(path, first, versions={"propdb": "0"})
    gone = {"species": (*first.species[:3], first.species[4]), "sources": (replace(BOOK, note="2nd printing"),)}
    kept = [one for one in first.entries if one.source == BOOK.key]
    mixture = Species("vendor oil", "C2H6O", 0, ETHANOL.composition, 0.2, synonyms=("oil", "fluid"), kind="pseudo")
    sheet = replace(BOOK, key="vendor-2024", title="A vendor's sheet", lineage=((BOOK.key, "copied"), ("x", "perhaps")))
    own = [(entry(WATER, "Hvap", 40.0 + i, phase="l", datum=""), MINE) for i in range(3)]
    add_own_all(path, own, "ada", comment="typed")
    put_own(path, datums={"works": {"kind": "own", "t": 300}}, policy={"ranks": {"vendor-2024": 1}}, who="ada")
    build(path, content(**gone, entries=kept, policy={"ranks": {}}, datums={}), versions={"propdb": "1"})
    late = [(entry(mixture, value=-1.5, source="vendor-2024"), MINE), (curve(mixture, source="vendor-2024"), SEED)]
    ids = add_own_all(path, late, "ben", species=(mixture,), sources=(sheet,))
    decide(path, "check", ids, who="ada", comment="read twice")
    decide(path, "approve", ids[:1], who="cid")
    decide(path, "dispute", [kept[0].id], who="ben", comment="does not close")
    decide(path, "withdraw", [own[0][0].id], who="ada", comment="wrong column")
    add_own_all(path, own[:1], "ada")
    set_setting(path, "self-review", "on", who="ada")
    assert check(path) == []
    return path


def tables(conn: sqlite3.Connection) -> dict[str, list[tuple[str, str]]]:
    """Table to its columns with their types."""
    names = [row[0] for row in conn.execute("SELECT name FROM sqlite_master WHERE type = 'table' ORDER BY name")]
    return {
        name: [(row[1], row[2]) for row in conn.execute(f"SELECT * FROM pragma_table_info('{name}')")]
        for name in names
        if not name.startswith(NO_CONTENT)
    }


def dump(conn: sqlite3.Connection) -> dict[str, list[tuple[Any, ...]]]:
    """Everything that is content, texts byte by byte."""
    found = {}
    for name, columns in tables(conn).items():
        kept = ", ".join(
            f'typeof("{column}"), hex("{column}")' for column, _ in columns if (name, column) != ("name", "num")
        )
        found[name] = sorted(conn.execute(f"SELECT {kept} FROM {name}").fetchall())
    return found


def another(rng: random.Random, kind: str, value: Any, others: list[Any]) -> Any:
    """Some other value of a type; None is one too."""
    if rng.random() < 0.25:
        return rng.choice(others)
    if rng.random() < 0.05:
        return None
    if kind == "INTEGER":
        return rng.choice([(value or 0) + 1, (value or 0) - 1, 0, 1, rng.randrange(1, 50), -(value or 0)])
    if kind == "REAL":
        number = value or 0.0
        return rng.choice([number + 1.0, -number, number * (1 + 1e-12), number * 1000, 0.0, rng.uniform(-1e6, 1e6)])
    text = value or ""
    at = rng.randrange(len(text) + 1)
    return rng.choice(
        [
            text + " ",
            text.swapcase(),
            text[:at] + rng.choice('0123456789abcxyz{}[]",:-\x00\x1bß\u202e') + text[at:],
            text[:at] + text[at + 1 :],
            text[::-1],
            "",
            "null",
            "{}",
            "[1]",
        ]
    )


def change(conn: sqlite3.Connection, rng: random.Random) -> tuple[str, str]:
    """Change one thing at random. (kind of change, what it was)"""
    known = tables(conn)
    table = rng.choice(sorted(known))
    columns = [name for name, _ in known[table]]
    types = dict(known[table])
    listed = ", ".join(f'"{name}"' for name in columns)
    rows = conn.execute(f"SELECT {listed} FROM {table}").fetchall()
    row = rng.choice(rows)
    where = " AND ".join(f'"{name}" IS ?' for name in columns)
    at = rng.randrange(len(columns))
    value = another(rng, types[columns[at]], row[at], [other[at] for other in rows])
    kind = rng.choice(["edit", "edit", "edit", "edit", "delete", "add", "swap", "bytes"])
    if kind == "delete":
        conn.execute(f"DELETE FROM {table} WHERE {where}", row)
    elif kind == "add":
        new = (*row[:at], value, *row[at + 1 :])
        conn.execute(f"INSERT INTO {table} ({listed}) VALUES ({', '.join('?' * len(columns))})", new)
    elif kind == "swap":
        other = rng.choice(rows)
        for to, given in ((row, other), (other, row)):
            conn.execute(f'UPDATE {table} SET "{columns[at]}" = ? WHERE {where}', (given[at], *to))
    elif kind == "bytes":
        conn.execute(f"UPDATE {table} SET \"{columns[at]}\" = CAST(x'41ff80' AS TEXT) WHERE {where}", row)
    else:
        conn.execute(f'UPDATE {table} SET "{columns[at]}" = ? WHERE {where}', (value, *row))
    return kind, f"{kind} of {table}.{columns[at]}, row {row!r}, value {value!r}"


def tampered(path: Path, rng: random.Random) -> tuple[str, str] | None:
    """Take the guards away, change something, put them back; None where nothing came of it."""
    with closing(sqlite3.connect(path, isolation_level=None)) as conn:
        conn.execute("PRAGMA synchronous = OFF")
        conn.execute("PRAGMA foreign_keys = OFF")
        conn.execute("PRAGMA ignore_check_constraints = ON")
        before = dump(conn)
        guards = conn.execute("SELECT name, sql FROM sqlite_master WHERE type = 'trigger'").fetchall()
        conn.execute("BEGIN")
        for name, _ in guards:
            conn.execute(f"DROP TRIGGER {name}")
        try:
            what = change(conn, rng)
        except (
            sqlite3.IntegrityError,
            OverflowError,
        ):  # a column that takes no such value: doubled, NULL, text in REAL
            conn.execute("ROLLBACK")
            return None
        for _, sql in guards:
            conn.execute(sql)
        conn.execute("COMMIT")
        return what if dump(conn) != before else None


def soak(pristine: Path, tmp_path: Path, seed: int, count: int) -> Counter[str]:
    """Make ``count`` changes; all must show."""
    rng = random.Random(seed)
    kinds: Counter[str] = Counter()
    unseen = []
    copy = tmp_path / "copy.db"
    with closing(sqlite3.connect(pristine)) as conn:
        conn.execute("PRAGMA wal_checkpoint(TRUNCATE)")
    while kinds.total() < count:
        for beside in ("-wal", "-shm"):
            Path(f"{copy}{beside}").unlink(missing_ok=True)
        shutil.copyfile(pristine, copy)
        made = tampered(copy, rng)
        if made is None:
            continue
        kinds[made[0]] += 1
        if not check(copy):
            unseen.append(made[1])
    assert not unseen, f"{len(unseen)} of {count} changes went unseen:\n" + "\n".join(unseen)
    return kinds


def test_an_untouched_copy_is_sound(pristine: Path, tmp_path: Path) -> None:
    with closing(sqlite3.connect(pristine)) as conn:
        conn.execute("PRAGMA wal_checkpoint(TRUNCATE)")
        held = dump(conn)
    assert all(held.values()), "every table must have rows to change"
    assert len({row[2:4] for row in held["source"]}) == 2  # of the base, and own
    shutil.copyfile(pristine, tmp_path / "copy.db")
    assert check(tmp_path / "copy.db") == []


def test_random_changes_show(pristine: Path, tmp_path: Path) -> None:
    kinds = soak(pristine, tmp_path, seed=1, count=60)
    assert set(kinds) == {"edit", "delete", "add", "swap", "bytes"}


@pytest.mark.full
@pytest.mark.parametrize("seed", range(2, 6))
def test_a_thousand_random_changes_show(pristine: Path, tmp_path: Path, seed: int) -> None:
    kinds = soak(pristine, tmp_path, seed=seed, count=250)
    assert set(kinds) == {"edit", "delete", "add", "swap", "bytes"}
