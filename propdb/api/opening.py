"""Building a store from the seed of this version and the open data of the packages it stands on."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

from propdb._version import __version__

__all__ = ["SEED_ONLY", "build_seed", "to_stderr"]

#: Environment variable: with the value ``seed`` a build leaves the packages out. Tests use it.
SEED_ONLY = "PROPDB_BUILD"


def to_stderr(text: str) -> None:
    """Progress of a build that nobody asked for goes where it disturbs no data."""
    print(text, file=sys.stderr, flush=True)


def build_seed(path: Path, progress: Callable[[str], None] | None, *, packages: bool | None = None) -> Any:
    """Bring the seed of this version, and what the packages carry, into a store: one base, one transaction.

    Parameters
    ----------
    path : Path
    progress : callable or None
        Called with one line of text now and then.
    packages : bool, optional
        False leaves the packages out. Not given: unless ``PROPDB_BUILD`` is ``seed``.
    """
    import sqlite3

    from propdb.intake.seeds import load_seed
    from propdb.intake.where import seed_root
    from propdb.store.write import build

    tell = None if progress is None else lambda text: progress(f"propdb: {text}")
    if tell is not None:
        tell(f"building the store {path}")
    root = seed_root()
    content = load_seed(root)
    versions = {"propdb": __version__, "python": sys.version.split()[0], "sqlite": sqlite3.sqlite_version}
    if packages is None:
        packages = os.environ.get(SEED_ONLY, "") != "seed"
    if packages:
        from propdb.intake.package import load_package

        package = load_package(content, root, progress=tell)
        content = package.content
        versions["chemicals"] = package.version
    return build(path, content, versions=versions, progress=tell)
