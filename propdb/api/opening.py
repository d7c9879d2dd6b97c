"""Building a store from the seed of this version."""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

from propdb._version import __version__

__all__ = ["build_seed", "to_stderr"]


def to_stderr(text: str) -> None:
    """Progress of a build that nobody asked for goes where it disturbs no data."""
    print(text, file=sys.stderr, flush=True)


def build_seed(path: Path, progress: Callable[[str], None] | None) -> Any:
    """Bring the seed of this version into a store, in one transaction."""
    import sqlite3

    import chemicals

    from propdb.intake.seeds import load_seed
    from propdb.intake.where import seed_root
    from propdb.store.write import build
    from propdb.vetting.crosscheck import Checker, settle

    if progress is not None:
        progress(f"propdb: building the store {path}")
    content = load_seed(seed_root())
    versions = {"propdb": __version__, "python": sys.version.split()[0], "sqlite": sqlite3.sqlite_version}
    versions["chemicals"] = chemicals.__version__
    tell = None if progress is None else lambda text: progress(f"propdb: {text}")
    checker = Checker(content.policy["lineage"], content.sources)
    return build(path, settle(content, checker), versions=versions, progress=tell, checker=checker)
