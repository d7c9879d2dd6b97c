"""Looking after the store: what it holds, checks, rebuild, backup."""

from __future__ import annotations

import os
from collections.abc import Callable
from dataclasses import asdict
from pathlib import Path
from typing import Any

from propdb.api.core import Core
from propdb.api.opening import build_seed
from propdb.errors import IntegrityError

__all__ = ["Care"]


class Care(Core):
    """``store info|intake|check|path|rebuild|backup``."""

    def store_info(self, *, coverage: bool = False) -> dict[str, Any]:
        """What the store holds: counts, content hash, log head, versions; with ``coverage`` by quantity and source."""
        info = dict(self._reader.info())
        if coverage:
            info.update(self._reader.coverage())
            info["connected"] = self._connected()
        return info

    def _connected(self) -> dict[str, int]:
        """Of the species under ``paths`` those through whose phases an enthalpy can be carried, each one walked."""
        from propdb.levels.paths import carries

        levels = self._engine(None, False)
        phases = {"liquid_to_gas": ("l", "g"), "solid_to_gas": ("cr", "l", "g")}
        return {
            path: sum(carries(levels, name, phases[path]) for name in names)
            for path, names in self._reader.path_species().items()
        }

    def store_intake(self, *, refused: bool = False) -> dict[str, Any]:
        """What became of each row of the package files at the last build; with ``refused`` each row that gave nothing.

        Returns ``rows, entries, refused, files[{key, file, source, version, sha256, rows, used, refused, entries,
        moved, points_left_out, trouble, remark, reasons}]`` and, if asked for, ``refusals[{key, row, what, kind,
        reason, column}]`` and ``moved[{key, row, what, species}]``.
        """
        reports = self._reader.policy("package-report", [])
        totals = {name: sum(report[name] for report in reports) for name in ("rows", "entries", "refused")}
        files = [
            {name: value for name, value in report.items() if name not in ("refusals", "moves")}
            | {"moved": len(report["moves"])}
            for report in reports
        ]
        found: dict[str, Any] = {**totals, "files": files}
        if refused:
            keys = ("row", "what", "kind", "reason", "column")
            found["refusals"] = [
                {"key": report["key"], **dict(zip(keys, row, strict=True))}
                for report in reports
                for row in report["refusals"]
            ]
            found["moved"] = [
                {"key": report["key"], "row": row, "what": what, "species": species}
                for report in reports
                for row, what, species in report["moves"]
            ]
        return found

    def store_check(self) -> dict[str, Any]:
        """Check the file, its content hash and the chain of its log. Raises IntegrityError with the first problems."""
        from propdb.store.backup import check

        problems = check(self._path)
        if problems:
            more = f"; and {len(problems) - 3} more" if len(problems) > 3 else ""
            raise IntegrityError(
                "; ".join(str(p) for p in problems[:3]) + more,
                where=f"store {self._path}",
                hint="restore a backup; propdb store backup makes one",
                problems=[str(p) for p in problems],
            )
        info = self._reader.info()
        return {
            "path": info["path"],
            "verdict": "sound: pages, references, entries, log",
            **{key: info[key] for key in ("content_hash", "head", "events", "entries")},
        }

    def store_path(self) -> Path:
        """Where the store is."""
        return self._path

    def store_rebuild(self, progress: Callable[[str], None] | None = None, *, open_data: bool = True) -> dict[str, Any]:
        """Bring in the data of this version again; own entries, datums and decisions stay.

        Without ``open_data`` only what was typed and cross-checked: entries that an earlier build took from the
        installed ``chemicals`` library become inactive.
        """
        report = build_seed(self._path, progress, open_data=open_data)
        self.close()
        self._forget()
        return asdict(report)

    def store_backup(self, file: str | os.PathLike[str]) -> None:
        """Copy the whole store, log included, to a new file. Raises StoreError where that exists."""
        from propdb.store.backup import backup

        backup(self._path, Path(file))
