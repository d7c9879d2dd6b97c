"""Reading and building a store of realistic size, against bare ``sqlite3`` on the same rows."""

from __future__ import annotations

import random
import sqlite3
import sys
import tempfile
from collections.abc import Iterator, Sequence
from dataclasses import replace
from pathlib import Path

from ratios import Ratio, medians, seconds

sys.path.insert(0, str(Path(__file__).resolve().parent.parent))

from store_samples import BOOK, REPORT, content, curve, entry

from propdb.model.records import Species
from propdb.store.content import Content, entry_id
from propdb.store.read import Reader
from propdb.store.search import find, resolve
from propdb.store.write import build

SPECIES = 10_000
PER_SPECIES = 6


def _content(count: int) -> Content:
    """Invented species with a handful of entries each, in the proportions of the real store."""
    draw = random.Random(7)
    species, entries = [], []
    for i in range(count):
        syllables = "".join(
            draw.choice(["meth", "eth", "prop", "but", "yl", "an", "ol", "chlor", "ox"]) for _ in range(4)
        )
        one = Species(
            name=f"{i}-{syllables}",
            formula=f"C{i % 30 + 1}H{i // 30 + 1}",
            charge=0,
            composition=(("C", i % 30 + 1), ("H", i // 30 + 1)),
            molar_mass=0.01 + i / 1e4,
            cas=f"{i + 100}-00-1",
            synonyms=(f"{syllables} number {i}", f"s{i}"),
        )
        species.append(one)
        for j in range(PER_SPECIES - 2):
            source = (BOOK, REPORT)[j % 2].key
            entries.append(entry(one, ("Hf", "S", "Hvap", "Hfus")[j % 4], draw.uniform(-1e6, 1e6), source=source))
        entries.append(
            curve(one, params={"exponents": [0, 1, 2, 3, -2], "coefficients": [draw.random() for _ in range(5)]})
        )
        entries.append(
            curve(one, phase="l", params={"exponents": [0, 1, 2], "coefficients": [draw.random() for _ in range(3)]})
        )
    return replace(content(), species=species, entries=entries)


def _bare(conn: sqlite3.Connection, name: str) -> list[object]:
    """The rows that a look-up needs, by plain selects: species, entries with membership, carriers, cross-checks, events
    and sources."""
    execute = conn.execute
    (number,) = execute("SELECT id FROM species WHERE name = ?", (name,)).fetchone()
    species = execute("SELECT * FROM species WHERE id = ?", (number,)).fetchall()
    entries = execute(
        "SELECT e.*, b.status, b.note, b.printed FROM base_entry b JOIN entry e ON e.num = b.entry WHERE b.species = ?",
        (number,),
    ).fetchall()
    carriers = execute(
        "SELECT c.* FROM base_entry b JOIN carrier c ON c.entry = b.entry WHERE b.species = ?", (number,)
    ).fetchall()
    checks = execute(
        "SELECT x.* FROM base_entry b JOIN crosscheck x ON x.entry = b.entry WHERE b.species = ?", (number,)
    ).fetchall()
    events = execute(
        "SELECT v.* FROM base_entry b JOIN entry e ON e.num = b.entry JOIN event v ON v.entry = e.id"
        " WHERE b.species = ?",
        (number,),
    ).fetchall()
    sources = [
        row
        for key in sorted({row[21] for row in entries})
        for row in execute("SELECT * FROM source WHERE key = ?", (key,)).fetchall()
    ]
    assert len(entries) >= PER_SPECIES
    assert sources
    return [species, entries, carriers, checks, events, sources]


def _look_up(reader: Reader, name: str) -> list[object]:
    entries = reader.entries(name)
    return [reader.species(name), entries, [reader.source(key) for key in sorted({e.source for e in entries})]]


def run() -> Iterator[Ratio]:
    """Build a store of 60,000 entries, then read it warm."""
    with tempfile.TemporaryDirectory() as directory:
        path = Path(directory) / "store.db"
        base = _content(SPECIES)
        built = seconds(lambda: build(path, base, versions={}))
        plain = seconds(lambda: _plain_insert(Path(directory) / "plain.db", base))
        yield Ratio(
            "build a store / insert the entries alone", built / plain, 10.0, detail=f"{built:.1f} / {plain:.1f} s"
        )
        again = seconds(lambda: build(path, base, versions={}))
        yield Ratio("build it again unchanged / build it", again / built, 0.6, detail=f"{again:.1f} / {built:.1f} s")

        names = random.Random(1).sample([one.name for one in base.species], 200)
        yield from look_ups(path, names, part="hylanol", miss="zzmethzzanzzolzz")


def look_ups(path: Path, names: Sequence[str], *, part: str, miss: str, label: str = "") -> Iterator[Ratio]:
    """Reading species, and finding them, against bare selects."""
    conn = sqlite3.connect(path, isolation_level=None, cached_statements=256)
    with Reader(path) as reader:

        def bare() -> None:
            for name in names:
                _bare(conn, name)

        def warm() -> None:
            for name in names:
                _look_up(reader, name)

        def after_a_write() -> None:
            reader._token = None  # as when another process has written something
            for name in names:
                _look_up(reader, name)

        def cold() -> None:
            reader._decoded.clear()
            after_a_write()

        rows, kept, reread, first = medians(bare, warm, after_a_write, cold)
        each = 1e6 / len(names)
        for what, taken, target in (
            ("warm look-up / bare selects", kept, 1.5),
            ("look-up after a write elsewhere / bare selects", reread, 1.5),
            ("first look-up, coefficients decoded / bare selects", first, 3.0),
        ):
            yield Ratio(
                label + what, taken / rows, target, detail=f"{taken * each:.0f} / {rows * each:.0f} µs a species"
            )

        every = "SELECT species, folded FROM name WHERE kind IN ('name', 'synonym')"
        exact, resolved, found, read, missed = medians(
            lambda: conn.execute("SELECT * FROM name WHERE folded = ?", (names[0],)).fetchall(),
            lambda: resolve(reader, names[0]),
            lambda: find(reader, part),
            lambda: conn.execute(every).fetchall(),
            lambda: find(reader, miss),
        )
        detail = f"{resolved * 1e6:.0f} / {exact * 1e6:.0f} µs"
        yield Ratio(f"{label}resolve a name / bare select of it", resolved / exact, 20.0, detail=detail)
        detail = f"{found * 1e3:.1f} / {read * 1e3:.1f} ms"
        yield Ratio(f"{label}find a part / bare select of all names", found / read, 0.5, detail=detail)
        detail = f"{missed * 1e3:.1f} / {read * 1e3:.1f} ms"
        yield Ratio(f"{label}near match / bare select of all names", missed / read, 2.5, detail=detail)
    conn.close()


def _plain_insert(path: Path, base: Content) -> None:
    conn = sqlite3.connect(path)
    columns = ("quantity", "phase", "value", "carried", "source", "locator", "tmin", "tmax", "uncertainty", "unit")
    conn.execute(f"CREATE TABLE entry (id TEXT PRIMARY KEY, params TEXT, {', '.join(columns)})")
    by_name = {one.name: one for one in base.species}
    conn.executemany(
        f"INSERT INTO entry VALUES ({', '.join('?' * (len(columns) + 2))})",
        (
            (entry_id(e, by_name[e.species]), repr(e.params), *(getattr(e, column) for column in columns))
            for e in base.entries
        ),
    )
    conn.commit()
    conn.close()


if __name__ == "__main__":
    for ratio in run():
        print(f"{ratio.what:<60}{ratio.measured:>8.3g}   {ratio.detail}")
