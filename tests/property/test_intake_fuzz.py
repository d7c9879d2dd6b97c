"""Whatever comes in: a report or one line of complaint, and a store that holds all of it or nothing.

Short in the normal run; with ``--full`` ten thousand files and values.
"""

from __future__ import annotations

import random
import sqlite3
from collections.abc import Iterator
from contextlib import closing
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from thermoml_samples import FORMATION, FUSION, REACTION, curve, data_set, participant, report, uncertainty

import propdb
from propdb.api import Store
from propdb.errors import PropdbError
from propdb.intake.templates import template
from propdb.intake.written import ROW_COLUMNS, SOURCE_COLUMNS, SPECIES_COLUMNS

TOML = """\
[source.sheet-9]
title = "Data sheet 9"
authors = ["Invented Works"]
year = 2024
kind = "report"
class = "compilation"
[species."my solvent"]
formula = "C10H22O2"
charge = 0
synonyms = ["solvent 9"]
[[entry]]
species = "my solvent"
quantity = "Hvap"
phase = "l"
temperature = "25C"
value = 52.30
unit = "kJ/mol"
uncertainty = "0.4"
uncertainty_kind = "expanded-95"
conditions = "to the real vapour"
source = "sheet-9"
locator = "table 1"
[[entry]]
species = "my solvent"
quantity = "Cp"
phase = "l"
equation = "polynomial"
tmin = "280"
tmax = "330"
unit = "J/mol/K"
exponents = [0, 1]
coefficients = "20.0 0.31"
source = "sheet-9"
locator = "table 2"
"""
XML = report(
    curve(stated=uncertainty(level="95")),
    data_set(FUSION, "Crystal", [("330", "50.0", uncertainty("0.4"))], phases=("Crystal", "Liquid"), of=(2,), number=2),
    data_set(REACTION, "", [("298.15", "-277.0")], reaction=FORMATION, members=participant(1, "1", "Liquid"), number=3),
    data_set("Mass density, kg/m3", "Liquid", [("290", "1")], of=(1, 2), number=4),
)
CSV = template("csv").replace("\n# ethanol,", "\nethanol,")
CSV = CSV[CSV.index("\nspecies,") + 1 :]  # without the explanations, where a change means nothing
SEEDS = {"own.csv": CSV, "own.toml": TOML, "own.xml": XML}
#: Pieces that have broken readers elsewhere.
PIECES = [
    b"", b"\0", b"\xff", b"\xfe\xff", b"\xef\xbb\xbf", b"\r", b"\n", b"\t", b'"', b"'", b",", b";", b"#", b"[",
    b"]]", b"=", b"<", b">", b"&", b"&lt;", b"<!--", b"-->", b"<![CDATA[", b"]]>", b"<!DOCTYPE x>", b"<?x?>", b"/",
    b"\\", b"%s", b"{}", b"-", b"+", b"0", b"1e308", b"1e-308", b"1e999", b"-1", b"NaN", b"inf", b"1,5", b"1.2.3",
    b"9" * 400, b"0x10", b"1_000", b"true", b"null", b"\x1b[31m", b"\xe2\x80\xae", b"\xe2\x88\x92", b"\xc2\xa0",
    b"\xf0\x9f\x92\xa7", b"water", b"64-17-5", b"K", b"kJ/mol", b"%", b"'; DROP TABLE entry; --", b"codata-1989",
    b"Hf", b"aq", b"table", b"2999", b"cr:beta", b" ",
]  # fmt: skip


def mutated(content: bytes, dice: random.Random) -> bytes:
    """One to three changes: a piece put in or in place of something, a part dropped, doubled, exchanged, or cut off."""
    for _ in range(dice.randint(1, 3)):
        a = dice.randrange(len(content) + 1)
        b = min(len(content), a + dice.choice((0, 1, 1, 3, 8, 40, 300)))
        kind = dice.randrange(8)
        if kind <= 2:
            content = content[:a] + dice.choice(PIECES) + content[b:]
        elif kind == 3:
            content = content[:a] + content[b:]
        elif kind == 4:
            content = content[:b] + content[a:b] + content[b:]
        elif kind == 5:
            content = content[:a] + bytes(dice.randrange(256) for _ in range(b - a)) + content[b:]
        elif kind == 6:  # two cells, words or elements exchanged
            words = content.split(dice.choice((b",", b"\n", b"<", b" ", b'"')))
            i, j = dice.randrange(len(words)), dice.randrange(len(words))
            mark = content[len(words[0]) : len(words[0]) + 1]
            words[i], words[j] = words[j], words[i]
            content = mark.join(words)
        else:
            content = content[:a] if dice.random() < 0.3 else content
    return content


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Store]:
    copy = tmp_path_factory.mktemp("fuzz") / "fuzz.db"
    with propdb.open() as base:
        base.store_backup(copy)
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("PROPDB_USER", "A. Tester")
        with propdb.open(copy) as opened:
            yield opened
            opened.store_check()


def counts(store: Store) -> tuple[int, ...]:
    """Own rows of each kind, and events."""
    with closing(sqlite3.connect(store.store_path())) as conn:
        sql = "SELECT (SELECT count(*) FROM base_entry WHERE own), (SELECT count(*) FROM species WHERE own),"
        sql += " (SELECT count(*) FROM source WHERE own), (SELECT count(*) FROM event), (SELECT count(*) FROM entry)"
        return tuple(conn.execute(sql).fetchone())


def attempt(store: Store, what: Any, *, dry_run: bool) -> bool:
    """Let something in; True if it was read. All of it is in the store afterwards, or nothing."""
    before = counts(store)
    refused: PropdbError | None = None
    try:
        done = store.import_file(what, dry_run=dry_run) if isinstance(what, Path) else store.add(what, dry_run=dry_run)
    except PropdbError as error:
        refused = error
    if refused is not None:
        assert "\n" not in str(refused)
        assert refused.problem
        assert counts(store) == before
        return False
    after = counts(store)
    if dry_run:
        assert after == before
        return not done.refused
    added = tuple(b - a for a, b in zip(before, after, strict=True))
    size = len(done.taken)
    assert added[:3] + added[4:] == (size, len(done.species), len(done.sources), size)
    assert added[3] == size + bool(
        done.species or done.sources
    )  # one event for each entry, one for what is new with it
    for _, entry in done.taken:
        assert store.entry_show(entry.id).status == "draft"
    return True


def run_files(store: Store, folder: Path, count: int, seed: int) -> dict[str, int]:
    """Mutate each kind of file so often; how many of them could be read."""
    read = dict.fromkeys(SEEDS, 0)
    for name, text in SEEDS.items():
        for number in range(count):
            dice = random.Random(f"{name} {seed} {number}")
            (folder / name).write_bytes(mutated(text.encode(), dice))
            try:
                read[name] += attempt(store, folder / name, dry_run=number % 4 == 3)
            except BaseException:
                print(f"{name}, seed {seed}, number {number}")
                raise
    return read


def test_mutated_files(store: Store, tmp_path: Path) -> None:
    read = run_files(store, tmp_path, 60, seed=1)
    assert read["own.csv"] > 0  # some changes leave a file that is right
    assert read["own.toml"] > 0


@pytest.mark.full
def test_many_mutated_files(store: Store, tmp_path: Path) -> None:
    run_files(store, tmp_path, 2400, seed=2)


_WORDS = st.sampled_from([piece.decode("utf-8", "replace") for piece in PIECES])
_GOOD = st.sampled_from(
    [
        *"ethanol water l cr g aq 25C 298.15 300 42.3 -277.0 kJ/mol J/mol/K K standard polynomial table".split(),
        *"280 330 to codata-1989 elements-298K Hf Hvap Cp Tb Htr graphite".split(),
        *("to the real vapour", "0 1", "20 0.3"),
    ]
)
_CELL = st.one_of(_GOOD, _WORDS, st.text(max_size=20), st.floats(), st.integers(), st.lists(st.floats(), max_size=3))
_ROW = st.dictionaries(st.sampled_from((*ROW_COLUMNS, *SOURCE_COLUMNS, *SPECIES_COLUMNS)), _CELL, max_size=24)
_START = st.sampled_from(
    [
        {"species": "ethanol", "phase": "l", "source": "codata-1989", "locator": "x"},
        {"species": "ethanol", "quantity": "Hvap", "phase": "l", "temperature": "25C", "value": "42", "unit": "kJ/mol",
         "conditions": "standard", "source": "codata-1989", "locator": "x"},
        {"species": "new", "species_formula": "C9H9", "quantity": "Tb", "phase": "l", "value": "400", "unit": "K",
         "source": "sheet-5", "source_title": "x", "source_authors": "x", "source_year": "2024",
         "source_kind": "report", "source_class": "estimate", "locator": "x"},
    ]
)  # fmt: skip
_QUIET = {"deadline": None, "suppress_health_check": list(HealthCheck)}


@settings(max_examples=60, **_QUIET)  # type: ignore[arg-type]
@given(start=_START, rows=st.lists(_ROW, min_size=1, max_size=3), dry_run=st.booleans())
def test_values(store: Store, start: dict[str, str], rows: list[dict[str, Any]], dry_run: bool) -> None:
    attempt(store, [{**start, **row} for row in rows], dry_run=dry_run)


@pytest.mark.full
@settings(max_examples=2800, **_QUIET)  # type: ignore[arg-type]
@given(start=_START, rows=st.lists(_ROW, min_size=1, max_size=3), dry_run=st.booleans())
def test_many_values(store: Store, start: dict[str, str], rows: list[dict[str, Any]], dry_run: bool) -> None:
    attempt(store, [{**start, **row} for row in rows], dry_run=dry_run)
