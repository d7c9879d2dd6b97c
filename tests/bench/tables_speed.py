"""Whole tables: conversion against a bare read and rewrite, and against the same work in data-frame libraries.

Rows as a plant's history has them: a tag, 30 species, datums mixed, temperatures, enthalpies with six decimals, all
numbers invented. ``PROPDB_BENCH_ROWS`` sets how many (2 million if it is not set). pandas and polars are compared with
where they are installed.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
from collections.abc import Callable, Iterator
from importlib.util import find_spec
from pathlib import Path
from typing import Any

from ratios import Ratio, medians

ROWS = int(os.environ.get("PROPDB_BENCH_ROWS", "2000000"))
ROUNDS = int(os.environ.get("PROPDB_BENCH_ROUNDS", "5"))
SPECIES = (
    "nitrogen,oxygen,hydrogen,argon,water,methane,ethane,propane,butane,ethylene,propylene,benzene,toluene,methanol,"
    "ethanol,ammonia,carbon dioxide,carbon monoxide,sulfur dioxide,hydrogen sulfide,hydrogen chloride,chlorine,helium,"
    "neon,nitric oxide,nitrogen dioxide,nitrous oxide,hydrogen cyanide,formaldehyde,acetylene"
).split(",")
DATUMS = ("gas-25C", "elements-298K", "gas-0C", "own:g@60F", "gas-60F")
TO = "elements-298K"


def write_tables(directory: Path, rows: int, datums: tuple[str, ...] = DATUMS, name: str = "table") -> None:
    """Write ``name.csv`` and ``name.parquet`` with invented rows."""
    import numpy as np
    import pyarrow as pa
    import pyarrow.compute as pc
    import pyarrow.parquet as pq
    from pyarrow import csv

    random = np.random.default_rng(1)
    writer = None
    with (directory / f"{name}.csv").open("wb") as text:
        text.write(b"tag,species,datum,T [K],h [kJ/kg]\n")
        for start in range(0, rows, 1_000_000):
            count = min(1_000_000, rows - start)
            tags = pa.array(random.integers(0, 9999, count)).cast(pa.string())
            table = pa.table(
                {
                    "tag": pc.binary_join_element_wise(pa.array(["S"] * count), tags, ""),
                    "species": pa.array(SPECIES).take(pa.array(random.integers(0, len(SPECIES), count))),
                    "datum": pa.array(datums).take(pa.array(random.integers(0, len(datums), count))),
                    "T [K]": np.round(random.uniform(300.0, 1500.0, count), 2),
                    "h [kJ/kg]": np.round(random.uniform(-9000.0, 5000.0, count), 6),
                }
            )
            writer = writer or pq.ParquetWriter(directory / f"{name}.parquet", table.schema)
            writer.write_table(table)
            decimals = table.column("h [kJ/kg]").cast(pa.decimal128(20, 6))
            table = table.set_column(4, "h [kJ/kg]", decimals)
            csv.write_csv(table, text, csv.WriteOptions(include_header=False, quoting_style="none"))
    assert writer is not None
    writer.close()


def ours(source: Path, target: Path, to: str = TO, **options: Any) -> Callable[[], object]:
    """``propdb convert-table`` in this process."""
    import propdb

    def run() -> None:
        with propdb.open() as store:
            store.convert_table(source, target, to=to, overwrite=True, **options)

    return run


def shifts() -> dict[tuple[str, str], float]:
    """What the others get for nothing: the shift of every pair [kJ/kg]."""
    import propdb

    with propdb.open() as store:
        return {
            (name, datum): store.convert(0, "kJ/kg", species=name, from_=datum, to=TO).value
            for name in SPECIES
            for datum in DATUMS
        }


def serial(source: Path, target: Path) -> None:
    """pyarrow's own read and rewrite."""
    import pyarrow.parquet as pq

    given = pq.ParquetFile(source)
    with pq.ParquetWriter(target, given.schema_arrow) as writer:
        for batch in given.iter_batches():
            writer.write_batch(batch)


def with_pandas(source: Path, target: Path, table: dict[tuple[str, str], float]) -> Callable[[], object]:
    """The same join, addition and writing in chunks of pandas."""
    import pandas as pd

    pairs = pd.DataFrame([(s, d, v) for (s, d), v in table.items()], columns=["species", "datum", "shift"])

    def run() -> None:
        with target.open("w") as out:
            for place, chunk in enumerate(pd.read_csv(source, chunksize=200_000)):
                both = chunk.merge(pairs, on=["species", "datum"], how="left")
                both["h on elements"] = both["h [kJ/kg]"] + both["shift"]
                both["flag"] = "ok"
                both.to_csv(out, header=place == 0, index=False)

    return run


def with_polars(source: Path, target: Path, table: dict[tuple[str, str], float]) -> Callable[[], object]:
    """The same join, addition and sink in row order."""
    import polars as pl

    pairs = pl.LazyFrame(
        {"species": [s for s, _ in table], "datum": [d for _, d in table], "shift": list(table.values())}
    )

    def run() -> None:
        both = pl.scan_csv(source).join(pairs, on=["species", "datum"], how="left", maintain_order="left")
        both = both.with_columns((pl.col("h [kJ/kg]") + pl.col("shift")).alias("h on elements"), flag=pl.lit("ok"))
        both.sink_csv(target, maintain_order=True)

    return run


_PEAK = """
import sys
import propdb
with propdb.open() as store:
    store.convert_table(sys.argv[1], sys.argv[2], to=sys.argv[3], overwrite=True)
with open("/proc/self/status") as status:  # what getrusage says counts the parent before the start
    size = next(line.split()[1] for line in status if line.startswith("VmHWM"))
print(size, "pandas" in sys.modules)
"""


def peak(source: Path, target: Path) -> float:
    """Peak memory of a run in a process of its own [MB]; 0 where there is no /proc."""
    if not Path("/proc/self/status").exists():
        return 0.0
    done = subprocess.run(
        [sys.executable, "-c", _PEAK, str(source), str(target), TO], capture_output=True, text=True, check=True
    )
    size, pandas = done.stdout.split()
    assert pandas == "False"
    return int(size) / 1e3


def run() -> Iterator[Ratio]:
    """All ratios. Needs the extra ``tables``; without it there is nothing to measure."""
    if find_spec("pyarrow") is None:
        return
    with tempfile.TemporaryDirectory() as name:
        directory = Path(name)
        write_tables(directory, ROWS)
        yield from _parquet(directory)
        yield from _csv(directory)
        yield from _same_t(directory)
        yield from _dask(directory)


def _parquet(directory: Path) -> Iterator[Ratio]:
    source, out, copy = directory / "table.parquet", directory / "out.parquet", directory / "copy.parquet"
    mine, base = medians(ours(source, out), lambda: serial(source, copy), rounds=ROUNDS)
    detail = f"{mine:.2f} / {base:.2f} s, {ROWS / mine:,.0f} rows/s"
    yield Ratio("Parquet: convert / pyarrow's serial read and rewrite", mine / base, 0.95, detail=detail)
    yield Ratio("Parquet: peak memory [MB]", peak(source, out), 350.0)


def _csv(directory: Path) -> Iterator[Ratio]:
    source, out, other = directory / "table.csv", directory / "out.csv", directory / "other.csv"
    table = shifts()
    if find_spec("polars") is not None:
        mine, base = medians(ours(source, out), with_polars(source, other, table), rounds=ROUNDS)
        detail = f"{mine:.2f} / {base:.2f} s, {ROWS / mine:,.0f} rows/s"
        yield Ratio("CSV: rows/s over polars'", base / mine, 0.85, at_least=True, detail=detail)
    if find_spec("pandas") is not None:
        mine, base = medians(ours(source, out), with_pandas(source, other, table), rounds=max(1, ROUNDS // 2))
        detail = f"{mine:.2f} / {base:.2f} s, {ROWS / mine:,.0f} rows/s"
        yield Ratio("CSV: rows/s over pandas' in chunks", base / mine, 10.0, at_least=True, detail=detail)
    whole = peak(source, out)
    yield Ratio("CSV: peak memory [MB]", whole, 200.0)
    write_tables(directory, ROWS // 10, name="tenth")
    tenth = peak(directory / "tenth.csv", out)
    yield Ratio(
        "CSV: peak memory of all rows / of a tenth",
        whole / max(tenth, 1.0),
        1.1,
        detail=f"{whole:.0f} / {tenth:.0f} MB",
    )


def _same_t(directory: Path) -> Iterator[Ratio]:
    write_tables(directory, ROWS, ("elements-same-T",), "same")
    for kind in ("parquet", "csv"):
        varying, constant = medians(
            ours(directory / f"same.{kind}", directory / f"a.{kind}"),
            ours(directory / f"table.{kind}", directory / f"b.{kind}"),
            rounds=ROUNDS,
        )
        detail = f"{varying:.2f} / {constant:.2f} s"
        yield Ratio(f"{kind}: shift that depends on T / constant shift", varying / constant, 2.0, detail=detail)


def _dask(directory: Path) -> Iterator[Ratio]:
    """A directory of Parquet on clusters of one and of two processes that are running already."""
    if find_spec("distributed") is None:
        return
    from distributed import LocalCluster

    source = directory / "year"
    source.mkdir()
    for month in range(8):
        write_tables(directory, ROWS // 8, name=f"year/{month}")
        (source / f"{month}.csv").unlink()
    options: dict[str, Any] = {"threads_per_worker": 1, "dashboard_address": ":0", "silence_logs": 50}
    with LocalCluster(n_workers=1, **options) as one, LocalCluster(n_workers=2, **options) as two:
        alone, both = medians(
            ours(source, directory / "one", scheduler=one.scheduler_address),
            ours(source, directory / "two", scheduler=two.scheduler_address),
            rounds=ROUNDS,
        )
    detail = f"{alone:.2f} / {both:.2f} s, {os.cpu_count()} processors"
    yield Ratio("Parquet on Dask: one worker / two workers", alone / both, 1.6, at_least=True, detail=detail)


if __name__ == "__main__":
    for ratio in run():
        print(f"{ratio.what:<60}{ratio.measured:>8.3g} {ratio.target:>8.3g}   {ratio.detail}", flush=True)
