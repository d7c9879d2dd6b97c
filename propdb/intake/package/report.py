"""What came of each row: an entry or a refusal with its reason, counted file by file."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable
from dataclasses import dataclass, field
from typing import Any

__all__ = ["FileReport", "Refusal"]


@dataclass(frozen=True, slots=True)
class Refusal:
    """A row, or a cell of it (``column``), that became no entry."""

    row: int
    what: str  # CAS RN and name as the file has them
    kind: str  # one of a few, to count by
    reason: str
    column: str = ""


@dataclass(slots=True)
class FileReport:
    """One file of the package and what was made of it."""

    key: str
    file: str
    source: str
    version: str = ""
    sha256: str = ""
    rows: int = 0
    used: int = 0  # rows that gave an entry
    entries: int = 0
    points_left_out: int = 0
    trouble: str = ""
    remark: str = ""
    refusals: list[Refusal] = field(default_factory=list)
    moves: list[tuple[int, str, str]] = field(default_factory=list)  # (row, CAS RN and name, species it went to)

    @property
    def refused(self) -> int:
        """Rows that gave no entry."""
        return self.rows - self.used

    def reasons(self) -> dict[str, int]:
        """Kind of refusal to how often."""
        return dict(sorted(Counter(refusal.kind for refusal in self.refusals).items()))

    def body(self) -> dict[str, Any]:
        """As plain values, for the store."""
        return {
            "key": self.key,
            "file": self.file,
            "source": self.source,
            "version": self.version,
            "sha256": self.sha256,
            "rows": self.rows,
            "used": self.used,
            "refused": self.refused,
            "entries": self.entries,
            "moves": [list(move) for move in self.moves],
            "points_left_out": self.points_left_out,
            "trouble": self.trouble,
            "remark": self.remark,
            "reasons": self.reasons(),
            "refusals": [[r.row, r.what, r.kind, r.reason, r.column] for r in self.refusals],
        }

    def line(self) -> str:
        """One line for the person who watches the build."""
        if self.trouble:
            return f"skipped {self.file}: {self.trouble}"
        text = f"{self.file}: {self.rows} rows, {self.entries} entries"
        if self.refused:
            text += f", {self.refused} rows refused"
        return f"{text} ({self.remark})" if self.remark else text


def total(reports: Iterable[FileReport]) -> tuple[int, int, int]:
    """Rows, entries and refused rows of all files."""
    rows = entries = refused = 0
    for report in reports:
        rows, entries, refused = rows + report.rows, entries + report.entries, refused + report.refused
    return rows, entries, refused
