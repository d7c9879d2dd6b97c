"""The same random rows by CSV, Excel, Parquet, a directory, and one by one: verdicts, numbers, entries."""

from __future__ import annotations

import csv
import math
import random
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

import propdb
from propdb.errors import PropdbError

pytestmark = pytest.mark.extras
pa = pytest.importorskip("pyarrow")
pq = pytest.importorskip("pyarrow.parquet")
openpyxl = pytest.importorskip("openpyxl")

SPECIES = (
    "nitrogen", "water", "methane", "SO2", "7446-09-5", "propane", "ethanol", "benzene", "carbon", "iron", "ammonia",
    "hydrogen", "unobtainium", "C2H6O", "sulfur", "octane",
)  # fmt: skip
PHASES = ("g", "l", "fluid", "cr", "aq", "g", "l", "", "x")
DATUMS = (
    "gas-25C", "elements-298K", "own:g@60F", "own:l@25C", "elements-same-T", "combustion-net-25C",
    "steam-triple-point", "elements-0K", "liquid-0C", "nope",
)  # fmt: skip
UNIT = "kJ/kg"


@pytest.fixture(scope="module")
def store() -> Iterator[propdb.Store]:
    with propdb.open() as opened:
        yield opened


def draw_rows(count: int, seed: int) -> list[dict[str, Any]]:
    """Temperatures in K and pressures in bar; some are missing, and some are no numbers of a state."""
    draw = random.Random(seed)
    return [
        {
            "species": draw.choice(SPECIES),
            "phase": draw.choice(PHASES),
            "datum": draw.choice(DATUMS),
            "T [K]": draw.choice(
                [round(draw.uniform(200, 2000), 3), 298.15, 373.12, 300.0 + draw.randrange(90), -3.0, None]
            ),
            "p [bar]": draw.choice([1.0, round(draw.uniform(0.1, 200), 3), None]),
            "h [kJ/kg]": round(draw.uniform(-9000, 4000), 4),
        }
        for _ in range(count)
    ]


def write(folder: Path, rows: list[dict[str, Any]]) -> None:
    names = list(rows[0])
    with (folder / "in.csv").open("w", newline="", encoding="utf-8") as file:
        out = csv.writer(file)
        out.writerow(names)
        out.writerows(["" if c is None else repr(c) if isinstance(c, float) else c for c in r.values()] for r in rows)
    table = pa.table({name: [row[name] for row in rows] for name in names})
    pq.write_table(table, folder / "in.parquet")
    (folder / "in").mkdir()
    for i, part in enumerate((table.slice(0, len(rows) // 3), table.slice(len(rows) // 3))):
        pq.write_table(part, folder / "in" / f"{i}.parquet")
    book = openpyxl.Workbook()
    book.active.append(names)
    for row in rows:
        book.active.append([None if cell == "" else cell for cell in row.values()])
    book.save(folder / "in.xlsx")


def one_by_one(store: propdb.Store, row: dict[str, Any], to: str, evaluate: bool) -> Any:
    """The answer for one row; None where there is none."""
    t = row["T [K]"]
    state = {"temperature": t if t is None or t > 0 else None}
    try:
        if not evaluate:
            return store.convert(
                row["h [kJ/kg]"],
                UNIT,
                species=row["species"],
                from_=row["datum"],
                to=to,
                phase=row["phase"] or "g",
                **state,
            )
        if not row["phase"] or t is None or t < 0 or (row["phase"] == "fluid" and row["p [bar]"] is None):
            return None
        if row["phase"] in ("l", "fluid") and row["p [bar]"] is not None:
            state["pressure"] = row["p [bar]"] * 1e5
        return store.enthalpy(row["species"], phase=row["phase"], datum=to, unit=UNIT, **state)
    except PropdbError:
        return None


@pytest.mark.parametrize(
    "to, evaluate",
    [("elements-298K", False), ("elements-same-T", False), ("elements-298K", True), ("elements-same-T", True)],
)
def test_every_way_gives_the_same(store: propdb.Store, tmp_path: Path, to: str, evaluate: bool) -> None:
    rows = draw_rows(250, seed=11)
    answers = [one_by_one(store, row, to, evaluate) for row in rows]
    if evaluate:
        rows = [{k: v for k, v in row.items() if k not in ("datum", "h [kJ/kg]")} for row in rows]
    write(tmp_path, rows)
    reports = [
        store.convert_table(tmp_path / f"in{end}", tmp_path / f"out{end}", to=to, unit=UNIT)
        for end in (".parquet", "", ".xlsx", ".csv")
    ]
    assert all(report.flags == reports[0].flags for report in reports)
    assert sum(reports[0].flags.values()) == len(rows)
    entries = [{e for kind in report.data["kinds"] for e in kind["entries"]} for report in reports]
    assert all(used == entries[0] for used in entries)

    found = pq.read_table(tmp_path / "out.parquet").to_pylist()
    names = list(found[0])
    assert [*map(str, pq.read_table(tmp_path / "out").to_pylist())] == [*map(str, found)]
    book = openpyxl.load_workbook(tmp_path / "out.xlsx").active
    excel = [dict(zip(names, (cell.value for cell in row), strict=True)) for row in book.iter_rows(min_row=2)]
    with (tmp_path / "out.csv").open(newline="", encoding="utf-8") as file:
        text = list(csv.DictReader(file))
    h, u = f"h on {to} [{UNIT}]", f"uncertainty [{UNIT}]"
    good = 0
    for row, sheet, line, answer in zip(found, excel, text, answers, strict=True):
        assert row["flag"] in ("ok", "no data", "bad row")
        assert bool(row["reason"]) == (row["flag"] != "ok")
        for other in (sheet, line):
            assert (other["flag"], other["reason"] or None) == (row["flag"], row["reason"])
        assert (sheet[h], sheet[u]) == (row[h], row[u])
        assert (answer is None) == (row["flag"] != "ok") == (row[h] is None) == (line[h] == ""), row
        if answer is None:
            continue
        good += 1
        size = max(abs(answer.value), 0.0 if evaluate else abs(row["h [kJ/kg]"]))
        assert abs(row[h] - answer.value) <= 4 * math.ulp(size), row
        assert float(line[h]) == pytest.approx(row[h], abs=0.501e-3)
        assert (answer.uncertainty is None) == (row[u] is None) == (line[u] == ""), row
        if answer.uncertainty is not None:
            assert row[u] == pytest.approx(answer.uncertainty, rel=0.03, abs=1e-6)
            assert float(line[u]) == pytest.approx(row[u], rel=0.051)
        assert {step.entry for step in answer.steps if step.entry} <= entries[0]
    assert good > 20
