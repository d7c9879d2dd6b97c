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
    """``store info|check|path|rebuild|backup``."""

    def store_info(self, *, coverage: bool = False) -> dict[str, Any]:
        """What the store holds: counts, content hash, log head, versions; with ``coverage`` by quantity and source."""
        info = dict(self._reader.info())
        if coverage:
            info.update(self._reader.coverage())
            info["paths"] = self._paths()
        return info

    def _paths(self) -> dict[str, int]:
        """Species whose phases are connected by data: liquid to ideal gas, solid to ideal gas."""
        from propdb.errors import PropdbError
        from propdb.levels.edges import ROOT

        levels = self._engine(None, False)
        counts = {"liquid_to_gas": 0, "solid_to_gas": 0, "elements-298K": 0}
        for record in self._reader.all_species():
            name = record.name
            try:
                tree = levels.tree(name)
            except PropdbError:
                continue
            by_phase: dict[str, set[int]] = {}
            for node, component in tree.component.items():
                if node != ROOT:
                    by_phase.setdefault(node.phase, set()).add(component)
            gas = by_phase.get("g", set())
            counts["liquid_to_gas"] += bool(gas & by_phase.get("l", set()))
            counts["solid_to_gas"] += bool(gas & by_phase.get("cr", set()))
            counts["elements-298K"] += any(tree.rooted(n) for n in tree.nodes if n != ROOT)
        return counts

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

    def store_rebuild(self, progress: Callable[[str], None] | None = None) -> dict[str, Any]:
        """Bring in the seed of this version again; own entries, datums and decisions stay."""
        report = build_seed(self._path, progress)
        self.close()
        self._forget()
        return asdict(report)

    def store_backup(self, file: str | os.PathLike[str]) -> None:
        """Copy the whole store, log included, to a new file. Raises StoreError where that exists."""
        from propdb.store.backup import backup

        backup(self._path, Path(file))
