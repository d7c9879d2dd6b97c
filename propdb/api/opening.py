"""Building a store from the seed of this version and the open data of the package it stands on."""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

from propdb._version import __version__

if TYPE_CHECKING:
    from propdb.model.crosscheck import Crosscheck
    from propdb.model.records import Entry, Species
    from propdb.vetting.crosscheck import Checker

__all__ = ["build_seed", "to_stderr"]


def to_stderr(text: str) -> None:
    """Progress of a build that nobody asked for goes where it disturbs no data."""
    print(text, file=sys.stderr, flush=True)


def build_seed(path: Path, progress: Callable[[str], None] | None, *, open_data: bool = True) -> Any:
    """Bring the seed of this version into a store: one base, one transaction.

    Parameters
    ----------
    path : Path
    progress : callable or None
        Called with one line of text now and then.
    open_data : bool
        Bring in what the installed ``chemicals`` library carries, too; a seed without a list of its files brings none.
    """
    import gc

    # A hundred thousand records are made and all of them kept: looking for garbage among them costs a fifth of a build.
    collecting = gc.isenabled()
    gc.disable()
    try:
        return _build(path, progress, open_data)
    finally:
        if collecting:
            gc.enable()


def _build(path: Path, progress: Callable[[str], None] | None, open_data: bool) -> Any:
    import sqlite3

    import chemicals

    from propdb.intake.seeds import load_seed
    from propdb.intake.where import seed_root
    from propdb.store.open import check_place
    from propdb.store.write import build
    from propdb.vetting.crosscheck import Checker, settle

    tell = None if progress is None else lambda text: progress(f"propdb: {text}")
    if tell is not None:
        tell(f"building the store {path}")
    check_place(path)
    root = seed_root()
    content = load_seed(root)
    checker = Checker(content.policy["lineage"], content.sources)
    content = settle(content, checker)
    versions = {"propdb": __version__, "python": sys.version.split()[0], "sqlite": sqlite3.sqlite_version}
    versions["chemicals"] = chemicals.__version__
    if open_data and (root / "_package").is_dir():
        from propdb.intake.package import load_package

        content = load_package(content, root, progress=tell).content
    return build(path, content, versions=versions, progress=tell, checker=_Typed(checker))


class _Typed:
    """Checks what was typed only: comparing the rows of the library with the library itself says nothing."""

    def __init__(self, checker: Checker) -> None:
        self._checker = checker
        self.package = checker.package

    def __call__(self, entry: Entry, species: Species) -> tuple[Crosscheck, ...]:
        for carrier in entry.carriers:
            if carrier.package != "chemicals":
                return self._checker(entry, species)
        return () if entry.carriers else self._checker(entry, species)
