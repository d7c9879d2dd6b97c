"""The whole build, against reading the same files with ``chemicals`` and pandas and a bare ``executemany``."""

from __future__ import annotations

import random
import sqlite3
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from pathlib import Path

from ratios import Ratio, seconds
from startup_speed import commands
from store_speed import look_ups

from propdb.api.opening import build_seed
from propdb.intake.package.files import installed, read_manifest
from propdb.intake.where import seed_root

#: A process of its own, as the build is one: with the imports, and the identifiers, which the library keeps.
_READ = """
import json, sys
from chemicals.identifiers import pubchem_db
from pandas import read_csv
for path in sys.argv[1:]:
    if path.endswith(".json"):
        json.load(open(path, "rb"))
    else:
        read_csv(path, sep="\\t", quoting=3, index_col=0)
pubchem_db.finish_loading()
"""


def _files() -> list[str]:
    root, _ = installed()
    assert root is not None
    return [str(path) for spec in read_manifest(seed_root()).files for path in root.glob(spec.path)]


def _python(code: str, *arguments: str) -> float:
    return seconds(lambda: subprocess.run([sys.executable, "-c", code, *arguments], check=True))


def run() -> Iterator[Ratio]:
    with tempfile.TemporaryDirectory() as folder:
        path, plain = Path(folder) / "propdb.db", Path(folder) / "plain.db"
        call = "from propdb.api.opening import build_seed; build_seed(Path(sys.argv[1]), None, open_data=True)"
        code = f"import sys; from pathlib import Path; {call}"
        # The shorter of two runs, on either side: what else the machine does can only add.
        built = min(_python(code, str(place)) for place in (Path(folder) / "first.db", path)) - _python("")
        source = sqlite3.connect(path)
        tables = {name: source.execute(f"SELECT * FROM {name}").fetchall() for name in ("entry", "name")}

        def insert() -> None:
            conn = sqlite3.connect(plain)
            with conn:
                for name, rows in tables.items():
                    marks = ", ".join("?" * len(rows[0]))
                    conn.execute(f"DROP TABLE IF EXISTS {name}")
                    conn.execute(f"CREATE TABLE {name} ({', '.join(f'c{i}' for i in range(len(rows[0])))})")
                    conn.executemany(f"INSERT INTO {name} VALUES ({marks})", rows)
            conn.close()

        least = min(_python(_READ, *_files()) + seconds(insert) for _ in range(2)) - _python("")
        yield Ratio(
            "whole build / read with pandas and insert", built / least, 4.0, detail=f"{built:.1f} / {least:.1f} s"
        )

        again = seconds(lambda: build_seed(path, None, open_data=True))
        yield Ratio("build it again unchanged / build it", again / built, 1.0, detail=f"{again:.1f} / {built:.1f} s")
        many = (
            "SELECT s.name FROM base_entry b JOIN species s ON s.id = b.species GROUP BY b.species HAVING count(*) >= 6"
        )
        names = random.Random(1).sample([name for (name,) in source.execute(f"{many} ORDER BY s.name")], 200)
        yield from look_ups(path, names, part="chlorotolu", miss="tolueen", label="full store: ")
        yield from commands(path, label="full store: ")
        source.close()


if __name__ == "__main__":
    for ratio in run():
        print(f"{ratio.what:<60}{ratio.measured:>8.3g}   {ratio.detail}")
