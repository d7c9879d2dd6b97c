"""The open data that the ``chemicals`` package carries, read from where it is installed, at build time.

``files.toml`` lists the files with their SHA-256, ``sources.toml`` the publications behind them, ``aliases.toml`` CAS
RNs of single forms, ``formulas.csv`` formulas that only a name tells. Every row becomes entries or a refusal with its
reason; the report of each file is stored.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterable, Iterator, Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from propdb.errors import SeedError
from propdb.intake.identifiers import identifiers
from propdb.intake.package import constants, curves
from propdb.intake.package.contradictions import quarantine
from propdb.intake.package.enthalpies import quarantine_enthalpies
from propdb.intake.package.files import FileSpec, Loaded, installed, load, read_manifest
from propdb.intake.package.names import decoded
from propdb.intake.package.plausible import quarantine_heat_capacities
from propdb.intake.package.registry import Registry
from propdb.intake.package.report import FileReport
from propdb.intake.package.sheet import Context, Row, Sheet
from propdb.intake.package.vapour import Estimator
from propdb.intake.rows import Table, read_csv, read_toml
from propdb.intake.seeds import atomic_weights
from propdb.intake.trc import resolve
from propdb.model.records import Source
from propdb.store.content import Content

__all__ = ["REPORT", "Package", "load_package"]

#: The key of the policy under which a store keeps the report of its build.
REPORT = "package-report"

Reader = Callable[[Sheet, Row], None]

#: File of the manifest to its reader and the column with the name.
READERS: Mapping[str, tuple[Reader, str]] = {
    "atct-gas": (constants.atct("g"), "Chemical"),
    "atct-liquid": (constants.atct("l"), "Chemical"),
    "janaf-constants": (constants.janaf_constants, "Chemical"),
    "crc-standard": (constants.crc_standard, "Chemical"),
    "crc-vaporisation": (constants.crc_vaporisation, "Chemical"),
    "crc-fusion": (constants.crc_fusion, "Chemical"),
    "crc-ions": (constants.crc_ions, "Name"),
    "trc-gas": (curves.trc_gas, "Chemical"),
    "poling-gas": (curves.poling_gas, "Chemical"),
    "perry-liquid": (curves.perry_liquid, "Chemical"),
    "perry-vaporisation": (curves.perry_vaporisation, "Chemical"),
    "perry-liquid-reduced": (curves.perry_liquid_reduced, "Name"),
    "zabransky": (curves.zabransky, "Name"),
    "vdi-vaporisation": (curves.vdi_vaporisation, "Chemical"),
    "gharagheizi-vaporisation": (constants.gharagheizi_vaporisation, "Chemical"),
    "gharagheizi-sublimation": (constants.gharagheizi_sublimation, "Chemical"),
    "albahri-gas": (constants.albahri_gas, "Compound"),
    "yaws-gas": (constants.yaws_gas, "name"),
    "staveley-triple": (constants.staveley_triple, "Chemical"),
    "iupac-critical": (constants.critical, "Chemical"),
    "crc-critical": (constants.crc_critical, "Chemical"),
    "mathews-critical": (constants.critical, "Chemical"),
    "psrk-critical": (constants.critical, "Chemical"),
    "janaf-gas": (curves.janaf_table("g"), "CAS"),
    "janaf-liquid": (curves.janaf_table("l"), "CAS"),
    "janaf-solid": (curves.janaf_table("cr"), "CAS"),
    "crc-solids": (curves.crc_solids, "NAME/T(K) J/mol/K"),
    "perry-mixed": (curves.perry_mixed, "Formula"),
}
#: Files of vapour pressures, whose readers need all that the others have given, to the column with the name.
VAPOUR: Mapping[str, str] = {
    "vapour-wagner-poling": "Name",
    "vapour-wagner-mcgarry": "Name",
    "vapour-perry": "Chemical",
    "vapour-antoine-poling": "Chemical",
    "vapour-antoine": "Name",
}
_WAGNER = (1.0, 1.5, 3.0, 6.0)
_WAGNER_25 = (1.0, 1.5, 2.5, 5.0)


@dataclass(frozen=True, slots=True)
class Package:
    """The seed with what the package adds, and what became of each file."""

    content: Content
    reports: tuple[FileReport, ...]
    version: str


def load_package(
    seed: Content, root: Path, *, place: Path | None = None, progress: Callable[[str], None] | None = None
) -> Package:
    """Add what the package carries to the content of the seed.

    Parameters
    ----------
    seed : Content
        From :func:`propdb.intake.seeds.load_seed`; its species keep name, formula and CAS RN.
    root : Path
        The seed directory.
    place : Path, optional
        Directory of the package, instead of the one that is installed.
    progress : callable, optional
        Called with one line for each file.

    Raises
    ------
    SeedError
        A file of ours under ``_package`` cannot be read. Nothing that is wrong with the package raises.
    """
    manifest = read_manifest(root)
    found, version = installed()
    where = place if place is not None else found
    sources = _sources(root, seed)
    files = [load(spec, where, found_version=version, recorded_version=manifest.version) for spec in manifest.files]
    formulas = {row.text("cas"): (row.text("formula"), row.text("name")) for row in _formulas(root)}
    known, by_name, nuclides = _identifiers({*_names(files), *(name.lower() for _, name in formulas.values())})
    registry = Registry(
        seed.species,
        weights={**nuclides, **atomic_weights(root)},
        identifiers=known,
        by_name=by_name,
        aliases=_toml(root, "aliases.toml"),
        formulas=formulas,
    )
    context = Context(
        registry,
        elements=seed.policy.get("elements", {}),
        standard_pressure={source.key: source.standard_pressure for source in sources},
    )
    reports = []
    estimator: Estimator | None = None
    for loaded in files:
        spec = loaded.spec
        if spec.key.startswith("vapour-") and estimator is None:
            estimator = Estimator([*seed.entries, *context.entries])
        reports.append(_read(spec, loaded, context, estimator))
        if progress is not None and (reports[-1].trouble or reports[-1].remark):
            progress(reports[-1].line())
    if progress is not None:
        rows, refused = sum(r.rows for r in reports), sum(r.refused for r in reports)
        progress(f"read {len(reports)} files of chemicals {version}: {rows} rows, {refused} of them refused")
    species = registry.finished({entry.species for entry in context.entries})
    ruled_out = quarantine(context.entries, seed.entries)
    ruled_out += quarantine_heat_capacities(context.entries, species, context.built)
    ruled_out += quarantine_enthalpies(context.entries, seed.entries)
    if progress is not None and ruled_out:
        progress(f"set aside {ruled_out} values that what else is known of their species rules out")
    content = Content(
        species=species,
        sources=sources,
        datums=seed.datums,
        policy=seed.policy,
        entries=[*seed.entries, *context.entries],
        carriers=seed.carriers,
        statuses=seed.statuses,
        notes=seed.notes,
    )
    resolution = resolve(content, built=context.built)
    for report in reports:
        if report.key == "trc-gas" and not report.trouble:
            report.remark = "; ".join(filter(None, (report.remark, resolution.line())))
    policy = {**seed.policy, REPORT: [report.body() for report in reports]}
    return Package(replace(resolution.content, policy=policy), tuple(reports), version)


def _read(spec: FileSpec, loaded: Loaded, context: Context, estimator: Estimator | None) -> FileReport:
    sheet = Sheet(loaded, context)
    if loaded.trouble:
        return sheet.report
    if estimator is not None:
        readers: dict[str, Reader] = {
            "vapour-wagner-poling": estimator.wagner(_WAGNER_25),
            "vapour-wagner-mcgarry": estimator.wagner(_WAGNER),
            "vapour-perry": estimator.perry,
            "vapour-antoine-poling": estimator.antoine,
            "vapour-antoine": estimator.antoine_natural,
        }
        reader, column = readers[spec.key], VAPOUR[spec.key]
    else:
        reader, column = READERS[spec.key]
    return sheet.run(reader, column)


def _names(files: Iterable[Loaded]) -> Iterator[str]:
    """The names of all rows, as the registry asks for them."""
    for loaded in files:
        key = loaded.spec.key
        column = READERS[key][1] if key in READERS else VAPOUR[key]
        for _, cells in loaded.rows:
            if column in cells:
                yield decoded(str(cells[column])).lower()


def _identifiers(names: Collection[str]) -> tuple[Mapping[int, Any], Mapping[str, Any], Mapping[str, float]]:
    """What the package knows of CAS RNs, of names, and of the masses of elements without a standard atomic weight.

    Nothing where it cannot be read.
    """
    try:
        from chemicals.elements import periodic_table

        known = identifiers()
        return known, known.by_name(names), {element.symbol: element.MW for element in periodic_table}
    except Exception:  # noqa: BLE001  (whatever a damaged package raises)
        return {}, {}, {}


def _toml(root: Path, name: str) -> dict[str, Any]:
    return read_toml(root / "_package" / name, file=f"_package/{name}")


def _formulas(root: Path) -> Table:
    name = "_package/formulas.csv"
    return read_csv(root / name, file=name, columns=("cas", "formula", "name"))


def _sources(root: Path, seed: Content) -> list[Source]:
    """Sources of the seed with what the package adds to them, and those that only it carries."""
    data = _toml(root, "sources.toml")
    extend = data.get("extend", {})
    own = ("title", "authors", "year", "kind", "class", "note", "lineage")
    sources = []
    for source in seed.sources:
        more = extend.get(source.key)
        if more is not None:
            source = replace(
                source,
                carrier="; ".join(filter(None, (source.carrier, more.get("carrier", "")))),
                note=" ".join(filter(None, (source.note, more.get("note", "")))),
            )
        sources.append(source)
    for key, row in data["source"].items():
        try:
            sources.append(
                Source(
                    key=key,
                    title=row["title"],
                    authors=tuple(row["authors"]),
                    year=row["year"],
                    kind=row["kind"],
                    cls=row["class"],
                    terms="Numerical facts; the publication itself is not reproduced.",
                    fields={name: text for name, text in row.items() if name not in own},
                    carrier="tables of the chemicals package, read at build time",
                    note=row.get("note", ""),
                    lineage=tuple((pair["copies"], pair["evidence"]) for pair in row.get("lineage", ())),
                )
            )
        except KeyError as error:
            raise SeedError(f"{error} is missing", where=f"_package/sources.toml, source {key!r}") from None
    return sources
