"""The whole build, against reading the same files with ``chemicals`` and pandas and a bare ``executemany``."""

from __future__ import annotations

import json
import sqlite3
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from pathlib import Path

from ratios import Ratio, medians, seconds

from propdb.api.opening import build_seed
from propdb.intake.package.files import installed, read_manifest
from propdb.intake.where import seed_root
from propdb.store.read import Reader
from propdb.store.search import find, resolve

#: Identifiers are read too, in a process of their own: the library keeps them once they are loaded.
_IDENTIFIERS = "from chemicals.identifiers import pubchem_db; pubchem_db.finish_loading()"


def _read_with_pandas() -> None:
    from pandas import read_csv

    root, _ = installed()
    assert root is not None
    for spec in read_manifest(seed_root()).files:
        (path,) = root.glob(spec.path)
        if path.suffix == ".json":
            json.loads(path.read_bytes())
        else:
            read_csv(path, sep="\t", quoting=3, index_col=0)


def _python(code: str) -> float:
    return seconds(lambda: subprocess.run([sys.executable, "-c", code], check=True))


def run() -> Iterator[Ratio]:
    with tempfile.TemporaryDirectory() as folder:
        path, plain = Path(folder) / "propdb.db", Path(folder) / "plain.db"
        call = f"build_seed(Path({str(path)!r}), None, open_data=True)"
        built = _python(f"from pathlib import Path; from propdb.api.opening import build_seed; {call}") - _python("")
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

        _read_with_pandas()
        least = seconds(_read_with_pandas) + seconds(insert) + _python(_IDENTIFIERS) - _python("import chemicals")
        yield Ratio(
            "whole build / read with pandas and insert", built / least, 4.0, detail=f"{built:.1f} / {least:.1f} s"
        )

        again = seconds(lambda: build_seed(path, None))
        yield Ratio("build it again unchanged / build it", again / built, 1.0, detail=f"{again:.1f} / {built:.1f} s")
        with Reader(path) as reader:
            exact, resolved, part, miss = medians(
                lambda: source.execute("SELECT * FROM name WHERE folded = 'toluene'").fetchall(),
                lambda: resolve(reader, "toluene"),
                lambda: find(reader, "chlorotolu"),
                lambda: find(reader, "tolueen"),
            )
        detail = f"{resolved * 1e6:.0f} / {exact * 1e6:.0f} µs; a part {part * 1e3:.1f}, a miss {miss * 1e3:.0f} ms"
        yield Ratio("full store: resolve a name / bare select of it", resolved / exact, 20.0, detail=detail)
        source.close()


if __name__ == "__main__":
    for ratio in run():
        print(f"{ratio.what:<60}{ratio.measured:>8.3g}   {ratio.detail}")
