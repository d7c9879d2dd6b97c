"""What the soak tests share: seeds cut short or changed, templates of one's own, and a look at all that a store holds.

All numbers and names of own data are invented.
"""

from __future__ import annotations

import csv
import os
import shutil
import sqlite3
import subprocess
import sys
from collections.abc import Callable
from contextlib import closing
from dataclasses import dataclass
from hashlib import sha256
from pathlib import Path
from typing import Final

from propdb.intake.where import seed_root
from propdb.store.read import Reader

TESTS: Final = Path(__file__).resolve().parent
_READ: Final = ("entries.csv", "curves.csv", "nasa9.csv", "nasa7.csv")

Row = list[str]


def copy_seed(to: Path, *, keep: Callable[[Row], bool]) -> Path:
    """A copy of the seed of this version with some rows (species, quantity, phase ...) of its files of entries.

    It brings no open data.
    """
    shutil.copytree(seed_root(), to, ignore=shutil.ignore_patterns("_package"))
    for file in to.glob("*/*.csv"):
        if file.name in _READ:
            change_rows(file, lambda rows: [row for row in rows if keep(row)])
    return to


def change_rows(file: Path, change: Callable[[list[Row]], list[Row]]) -> None:
    """Rewrite the rows below the header of a file of the seed."""
    with file.open(encoding="utf-8", newline="") as text:
        header, *rows = csv.reader(text)
    with file.open("w", encoding="utf-8", newline="") as text:
        csv.writer(text, lineterminator="\n").writerows([header, *change(rows)])


_HEADER: Final = (
    "species,quantity,phase,temperature,value,unit,conditions,source,locator,"
    "source_title,source_authors,source_year,source_kind,source_class,species_formula"
)
#: Entries, and events, that one template makes.
DRAFTS: Final = 3
EVENTS: Final = DRAFTS + 1  # one more says that species and source are new


def template_csv(tag: str) -> str:
    """A filled template: a new species, a new source, and three values that all carry ``tag``."""
    tail = f"sheet-{tag},table {tag},Data sheet {tag},Invented Works,2024,report,compilation,C9H20O"
    rows = [
        f"solvent {tag},Hvap,l,25C,48.2,kJ/mol,to the real vapour,{tail}",
        f"solvent {tag},Hvap,l,80C,45.1,kJ/mol,to the real vapour,{tail}",
        f"solvent {tag},Tb,l,,461.5,K,at 101.325 kPa,{tail}",
    ]
    return "\n".join([_HEADER, *rows]) + "\n"


def template_toml(tag: str) -> str:
    """The same, as TOML."""
    lines = [f"[source.sheet-{tag}]", f'title = "Data sheet {tag}"', 'authors = ["Invented Works"]', "year = 2024"]
    lines += ['kind = "report"', 'class = "compilation"', f'[species."solvent {tag}"]', 'formula = "C9H20O"']
    values = (("Hvap", "25C", "48.2", "kJ/mol"), ("Hvap", "80C", "45.1", "kJ/mol"), ("Tb", "", "461.5", "K"))
    for quantity, temperature, value, unit in values:
        conditions = "at 101.325 kPa" if quantity == "Tb" else "to the real vapour"
        lines += ["[[entry]]", f'species = "solvent {tag}"', f'quantity = "{quantity}"', 'phase = "l"']
        lines += [f'temperature = "{temperature}"'] if temperature else []
        lines += [f'value = "{value}"', f'unit = "{unit}"', f'conditions = "{conditions}"']
        lines += [f'source = "sheet-{tag}"', f'locator = "table {tag}"']
    return "\n".join(lines) + "\n"


@dataclass(frozen=True)
class Held:
    """All that a store holds."""

    events: tuple[tuple[str, str, str], ...]  # (hash, kind, entry) in order
    own: dict[str, tuple[str, str]]  # entry id to locator and status
    content: str
    rows: str  # hash of every row of every table


def held(path: Path) -> Held:
    """What a store holds, seen through a fresh read-only connection as any reading verb sees it."""
    with Reader(path) as reader:
        events = tuple((event.hash, event.kind, event.entry) for event in reader.events())
        own = {
            id: (reader.entry(id).locator, reader.entry(id).status)
            for id in {e for _, k, e in events if k == "created"}
        }
        return Held(events, own, reader.content_hash, _rows(reader.conn))


def _rows(conn: sqlite3.Connection) -> str:
    digest = sha256()
    for (table,) in conn.execute("SELECT name FROM sqlite_master WHERE type = 'table' ORDER BY name").fetchall():
        digest.update(f"{table}\n".encode())
        lines = sorted(repr(row) for row in conn.execute(f'SELECT * FROM "{table}"'))
        digest.update("\n".join(lines).encode())
    return digest.hexdigest()


def settle(path: Path) -> None:
    """Bring everything beside the file into it, so that it can be copied."""
    with closing(sqlite3.connect(path)) as conn:
        conn.execute("PRAGMA wal_checkpoint(TRUNCATE)")


def start(code: str, *arguments: str | os.PathLike[str], user: str = "") -> subprocess.Popen[str]:
    """Run Python code in a process of its own, with the modules of this directory at hand."""
    whole = f"import sys\nsys.path.insert(0, {str(TESTS)!r})\n{code}"
    variables = {**os.environ, **({"PROPDB_USER": user} if user else {})}
    return subprocess.Popen(
        [sys.executable, "-c", whole, *map(os.fspath, arguments)],
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        encoding="utf-8",
        env=variables,
    )
