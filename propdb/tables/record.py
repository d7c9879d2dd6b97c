"""What a run leaves behind beside its table: a report, and the sidecar that says where every number came from."""

from __future__ import annotations

import json
import math
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

from propdb._version import __version__
from propdb.model.answer import CAUTION
from propdb.model.text import visible, wrapped
from propdb.tables.kinds import BAD_ROW, NO_DATA, OK

if TYPE_CHECKING:
    from propdb.tables.core import Plan
    from propdb.tables.tally import Tally

__all__ = ["SIDECAR", "TableReport", "kinds_of", "sidecar_path"]

SIDECAR = ".propdb.json"
_MOST = 2000


def sidecar_path(target: Path) -> Path:
    """Where the sidecar of an output stands."""
    return target.with_name(target.name + SIDECAR)


@dataclass(frozen=True)
class TableReport:
    """What a table came to. ``data`` is what the sidecar holds."""

    target: Path
    data: dict[str, Any]
    lines: tuple[str, ...] = field(default=())

    @property
    def flags(self) -> dict[str, int]:
        """Rows by flag."""
        return dict(self.data["rows"]["flags"])

    @property
    def clean(self) -> bool:
        """Did every row get its number?"""
        return not self.flags[BAD_ROW] and not self.flags[NO_DATA]

    def as_dict(self) -> dict[str, Any]:
        """For JSON."""
        return self.data

    def __str__(self) -> str:
        return "\n".join(self.lines)


def _finite(value: float) -> float | None:
    return value if math.isfinite(value) else None


def kinds_of(plan: Plan, tally: Tally) -> tuple[list[dict[str, Any]], dict[str, Any]]:
    """The kinds of rows that occurred, each with shift, entries and count; and the sources, by key."""
    from propdb.model.cite import text

    found: list[dict[str, Any]] = []
    sources: dict[str, str] = {}
    counted = sorted(tally.kinds.items(), key=lambda pair: -pair[1]) or [(i, 0) for i in range(len(plan.kinds))]
    for number, rows in counted[:_MOST]:
        kind = plan.kinds[number]
        used = kind.used()
        sources |= {key: text(source) for key, source in used.sources.items()}
        item: dict[str, Any] = {
            "species": kind.species.name if kind.species is not None else None,
            "as_written": kind.key.species,
            "from": None if plan.settings.evaluate else kind.datum or kind.key.datum or None,
            "phase": kind.key.phase or None,
            "form": kind.key.form or None,
            "flag": kind.flag,
            "reason": kind.reason or None,
            "rows": rows or None,
            "entries": {entry: used.origins.get(entry) for entry in used.entries},
            "warnings": list(kind.warnings),
        }
        if not plan.settings.evaluate:
            item["shift"] = _finite(kind.value / kind.scale) if kind.varying is None else "varies with temperature"
            item["uncertainty"] = _finite(kind.standard / kind.scale)
        found.append(item)
    return found, dict(sorted(sources.items()))


def data_of(
    plan: Plan, tally: Tally, *, stamp: str, files: dict[str, Any], notes: list[str], streams: dict[str, Any] | None
) -> dict[str, Any]:
    """Everything the sidecar says."""
    settings = plan.settings
    kinds, sources = kinds_of(plan, tally)
    names = sorted({k["from"] for k in kinds if k["from"] and k["flag"] == OK} - {settings.to})
    sentences = plan.oracle.ask(lambda basis: {name: basis.datum(name).sentence for name in [*names, settings.to]})
    found: dict[str, Any] = {
        "propdb": __version__,
        "what": "enthalpies evaluated" if settings.evaluate else "enthalpies converted",
        "to": settings.to,
        "unit": settings.unit.text,
        "datums": sentences,
        "store": stamp,
        **files,
        "columns": {role: c.name for role, c in plan.layout.columns.items()}
        | ({"composition": [c.name for c in plan.layout.components]} if plan.layout.components else {}),
        "rows": {"total": tally.rows, "flags": tally.flags()},
        "reasons": tally.reasons(),
        "first_rows_not_ok": [
            {"row": s.row, "flag": s.flag, "reason": s.reason} | ({"file": s.file} if s.file else {})
            for s in tally.first_samples()
        ],
        "kinds": kinds,
        "sources": sources,
        "notes": notes,
        "caution": CAUTION,
    }
    if streams is not None:
        found["streams"] = streams
    return found


def dump(data: dict[str, Any]) -> bytes:
    """The sidecar as bytes."""
    return (json.dumps(data, indent=1, ensure_ascii=False, allow_nan=False) + "\n").encode()


def summary(data: dict[str, Any], target: Path, seconds: float) -> list[str]:
    """What a person reads when the run is over."""
    flags, total = data["rows"]["flags"], data["rows"]["total"]
    parts = [f"{times:,} {flag}" for flag, times in flags.items() if times]
    rate = f", {total / seconds:,.0f} rows/s" if total > 10_000 else ""
    lines = [f"{target.name}: {total:,} {'row' if total == 1 else 'rows'}: {', '.join(parts) or 'none'}{rate}"]
    for r in data["reasons"][:8]:
        file = f" of {r['first_file']}" if "first_file" in r else ""
        first = f"{'first in ' if r['rows'] > 1 else ''}row {r['first_row']:,}{file}"
        lines += wrapped(f"{r['rows']:,} {r['flag']}: {visible(r['reason'] or 'no reason')} ({first})", "  ", "    ")
    if len(data["reasons"]) > 8:
        lines.append(f"  and {len(data['reasons']) - 8} more reasons in {target.name}{SIDECAR}")
    return lines + [line for note in data["notes"] for line in wrapped(note, "  ", "    ")]
