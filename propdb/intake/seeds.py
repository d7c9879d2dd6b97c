"""The seed: everything in ``seeds_data``, read into the content of a base.

::

    species.csv, */species.csv    species, merged by name
    elements.csv                  atomic weights
    datums.toml                   datums and the reference forms of the elements
    ranks.toml                    source ranks and class defaults
    lineage.toml                  who copies whom, and what a difference from another compilation may be
    */source.toml                 one bibliographic record per folder
    */entries.csv                 constants
    */curves.csv                  heat-capacity fits
    */nasa9.csv, */nasa7.csv      polynomial records

Each row that cannot be taken is a :class:`~propdb.errors.SeedError` with file, row and column, and what would be right.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from fractions import Fraction
from pathlib import Path
from typing import Any

from propdb.datum import datum_body, parse_datums
from propdb.errors import DatumError, SeedError
from propdb.intake import constants, curves, nasa, species
from propdb.intake.common import Folder
from propdb.intake.lineage import read_lineage
from propdb.intake.rows import Table, near, read_csv, read_toml
from propdb.intake.sources import read_source
from propdb.model.records import QUANTITIES, Datum, Entry, Source, Species
from propdb.store.content import Content

__all__ = ["atomic_weights", "load_seed"]

_ELEMENT_COLUMNS = ("symbol", "name", "atomic_number", "atomic_weight", "note")

_READERS: Mapping[str, tuple[tuple[str, ...], Callable[[Table, Folder], Iterator[Entry]]]] = {
    "entries.csv": (constants.COLUMNS, constants.read_constants),
    "curves.csv": (curves.COLUMNS, curves.read_curves),
    "nasa9.csv": (nasa.COLUMNS9, lambda table, folder: nasa.read_nasa(table, folder, terms=9)),
    "nasa7.csv": (nasa.COLUMNS7, lambda table, folder: nasa.read_nasa(table, folder, terms=7)),
}


def load_seed(root: Path, *, identifiers: bool = True) -> Content:
    """Read the seed.

    Parameters
    ----------
    root : Path
        The directory; see :func:`propdb.intake.where.seed_root`.
    identifiers : bool
        Compare formulas with those that the ``chemicals`` library lists under each CAS RN.

    Returns
    -------
    Content
        Species, sources, datums (as :func:`propdb.datum.read_body` reads them), policy (``ranks``; ``elements``, the
        table of reference forms; ``lineage``) and entries in SI.

    Raises
    ------
    SeedError
        The first thing that cannot be taken, with its place.
    """
    if not root.is_dir():
        raise SeedError("there is no such directory", where=str(root), hint="give the directory with datums.toml")
    folders = sorted(path for path in root.iterdir() if path.is_dir() and not path.name.startswith((".", "_")))
    sources = {
        path.name: read_source(_needed(path / "source.toml", root), file=_name(path / "source.toml", root))
        for path in folders
    }
    weights = atomic_weights(root)
    found = species.merge_species(_species_tables(root, folders), weights=weights, identifiers=identifiers)
    datum_tables = read_toml(_needed(root / "datums.toml", root), file="datums.toml")
    datums = _datums(datum_tables, found, sources)
    entries: list[Entry] = []
    for path in folders:
        folder = Folder(sources[path.name], found, datums)
        for name, (columns, reader) in _READERS.items():
            if (path / name).is_file():
                entries.extend(reader(read_csv(path / name, file=_name(path / name, root), columns=columns), folder))
        _only_known(path, root)
    return Content(
        species=list(found.values()),
        sources=list(sources.values()),
        datums={name: datum_body(datum) for name, datum in datums.items()},
        policy={
            "ranks": _ranks(root),
            "elements": datum_tables.get("elements", {}),
            "lineage": read_lineage(root / "lineage.toml", sources=sources, species=found),
        },
        entries=entries,
    )


def _name(path: Path, root: Path) -> str:
    return path.relative_to(root).as_posix()


def _needed(path: Path, root: Path) -> Path:
    if not path.is_file():
        raise SeedError(
            "the file is missing",
            where=_name(path, root),
            hint="every source folder has a source.toml" if path.name == "source.toml" else "it belongs to the seed",
        )
    return path


def _only_known(path: Path, root: Path) -> None:
    """A misspelt file name would leave its rows out in silence."""
    known = (*_READERS, "source.toml", "species.csv")
    for file in sorted(path.iterdir()):
        if file.suffix in (".csv", ".toml") and file.name not in known:
            raise SeedError(
                "a file of this name is not read",
                where=_name(file, root),
                hint=near(file.name, known) or f"one of {', '.join(known)}",
            )


def _species_tables(root: Path, folders: list[Path]) -> Iterator[Table]:
    for path in (root / "species.csv", *(folder / "species.csv" for folder in folders)):
        if path.is_file():
            yield read_csv(path, file=_name(path, root), columns=species.COLUMNS, optional=species.OPTIONAL)


def atomic_weights(root: Path) -> dict[str, float]:
    """Atomic weights [g/mol] by symbol."""
    weights: dict[str, float] = {}
    for row in read_csv(_needed(root / "elements.csv", root), file="elements.csv", columns=_ELEMENT_COLUMNS):
        symbol = row.needed("symbol", "the symbol of the element")
        weight = row.read_number(row.needed("atomic_weight", "the standard atomic weight"), "atomic_weight")
        if symbol in weights:
            raise row.error("symbol", f"{symbol!r} stands there twice", "one row per element")
        if not weight > 0:
            raise row.error("atomic_weight", f"atomic weight {weight:g} is not positive", "the standard atomic weight")
        weights[symbol] = weight
    return weights


def _datums(data: Mapping[str, Any], found: Mapping[str, Species], sources: Mapping[str, Source]) -> dict[str, Datum]:
    def composition(name: str) -> tuple[dict[str, int | Fraction], int]:
        if name not in found:
            raise SeedError(
                f"unknown species {name!r} in a basis",
                where="datums.toml",
                hint=near(name, found) or "add it to species.csv",
            )
        return dict(found[name].composition), found[name].charge

    try:
        datums = parse_datums(data, where="datums.toml", composition=composition)
    except DatumError as error:
        raise SeedError(error.problem, where=error.where, hint=error.hint) from error
    for name, datum in datums.items():
        where = f"datums.toml: datum {name!r}"
        if datum.source not in sources:
            raise SeedError(
                f"unknown source {datum.source!r}", where=where, hint=near(datum.source, sources) or "make its folder"
            )
        named = {z.species for stages in datum.schedule.values() for _, z in stages} | set(datum.per_species)
        for other in sorted(named):
            if other not in found:
                raise SeedError(
                    f"unknown species {other!r}", where=where, hint=near(other, found) or "add it to species.csv"
                )
    return datums


def _ranks(root: Path) -> dict[str, Any]:
    """``ranks.toml``, checked as far as its words go. It may rank sources that other packages carry."""
    data = read_toml(_needed(root / "ranks.toml", root), file="ranks.toml")
    for part, needed in (
        ("rank", ("quantities", "sources", "reasons")),
        ("class_default", ("quantities", "classes", "reason")),
    ):
        for i, group in enumerate(data.get(part, ()), start=1):
            where = f"ranks.toml: {part} {i}"
            for key in needed:
                if not group.get(key) and not (key == "classes" and group.get("sources")):
                    raise SeedError(f"{key} is missing", where=where)
            for quantity in group["quantities"]:
                if quantity not in QUANTITIES:
                    raise SeedError(f"unknown quantity {quantity!r}", where=where, hint=near(quantity, QUANTITIES))
            unexplained = [key for key in group.get("sources", ()) if not group.get("reasons", {}).get(key)]
            if part == "rank" and unexplained:
                raise SeedError(
                    f"no reason for {unexplained[0]}", where=where, hint="a rank without a reason is an opinion"
                )
            if part == "class_default" and ("percent" in group) == ("standard" in group):
                raise SeedError("give one of percent and standard", where=where)
    return data
