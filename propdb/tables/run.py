"""One table from beginning to end: open, bind the columns, convert, write the sidecar, move both into place."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, field, replace
from functools import partial
from pathlib import Path
from typing import NamedTuple

from propdb.errors import InvalidInput
from propdb.model.records import SAME_T
from propdb.tables.buffers import arrow
from propdb.tables.columns import Layout, bind, check_header, listed
from propdb.tables.core import Plan, Settings
from propdb.tables.delimited import convert_delimited, open_delimited
from propdb.tables.lines import first_rows
from propdb.tables.mixtures import check_components
from propdb.tables.oracle import Oracle
from propdb.tables.output import HashedWriter, Whole, check_paths, sha256_of
from propdb.tables.parquet import convert_parquet, open_parquet, parquet_files
from propdb.tables.progress import Progress
from propdb.tables.record import TableReport, data_of, dump, sidecar_path, summary
from propdb.tables.scales import flow_unit, pressure_scale, temperature_unit
from propdb.tables.streams import Streams, lines
from propdb.tables.suggest import suggest
from propdb.tables.tally import Tally
from propdb.units import parse_unit

__all__ = ["SUGGEST", "Request", "convert_table", "make_plan"]

#: Instead of a datum: find the one that serves best.
SUGGEST = "suggest"
_ANY = "elements-298K"  # to read a table once before its datum is chosen

_KINDS = {".csv": "csv", ".tsv": "csv", ".tab": "csv", ".txt": "csv", ".parquet": "parquet", ".pq": "parquet"}
_KINDS |= {".xlsx": "excel", ".xlsm": "excel"}


@dataclass(frozen=True)
class Request:
    """What was asked, beside the settings that rows need; see :meth:`propdb.api.Store.convert_table`."""

    settings: Settings
    unit: str | None = None
    columns: Mapping[str, str] = field(default_factory=dict)
    units: Mapping[str, str] = field(default_factory=dict)
    fixed: Mapping[str, str] = field(default_factory=dict)
    comma: bool = False
    sheet: str | None = None
    across: bool = False
    overwrite: bool = False
    scheduler: str | None = None
    workers: int | None = None


class Done(NamedTuple):
    """A run that is over but for the moving into place."""

    plan: Plan
    tally: Tally
    read: str  # hash of the input
    written: str  # hash of the output
    notes: list[str]


def kind_of_file(path: Path) -> str:
    """``csv``, ``parquet``, ``excel`` or ``directory``. Raises InvalidInput for another ending."""
    if path.is_dir():
        return "directory"
    kind = _KINDS.get(path.suffix.lower())
    if kind is None:
        old = path.suffix.lower() == ".xls"
        raise InvalidInput(
            f"{path.suffix or 'a file without an ending'} is no format of a table here",
            where=str(path),
            hint="save it as .xlsx" if old else "it can be .csv, .tsv, .xlsx, .parquet, or a directory of .parquet",
        )
    return kind


def make_plan(oracle: Oracle, request: Request, names: tuple[str, ...], *, where: str) -> Plan:
    """Bind the columns of a table and settle what is left open.

    Raises
    ------
    InvalidInput, NotFound, UnitError
        Columns missing or doubled, units missing or contradicting, a datum that is none.
    """
    layout = bind(names, chosen=request.columns, units=request.units, fixed=request.fixed, where=where)
    settings = request.settings
    column = layout.get("enthalpy")
    evaluate = column is None
    _required(layout, settings, evaluate, where)
    written = "" if column is None else column.unit
    if written and request.unit and parse_unit(written) != parse_unit(request.unit):
        raise InvalidInput(
            f"two units for the enthalpy: {written!r} in the header and {request.unit!r} by --unit",
            where=where,
            hint="leave --unit out, or correct the header",
        )
    unit = request.unit or written or ("kJ/mol" if evaluate else "")
    if not unit:
        assert column is not None
        raise InvalidInput(
            f"the enthalpies of column {column.name!r} have no unit",
            where=where,
            hint=f"write e.g. {column.name} [kJ/kg] in the header, or give --unit kJ/kg",
        )
    settings = replace(settings, unit=parse_unit(unit), evaluate=evaluate)
    for role, check in (("temperature", temperature_unit), ("pressure", pressure_scale)):
        found = layout.get(role)
        if found is not None:
            check(found.unit, found.name)
    if evaluate and layout.get("vapour") is not None:
        raise InvalidInput(
            "enthalpies of two-phase rows are not computed from a vapour fraction",
            where=where,
            hint="give liquid and vapour a row each, or rename the column",
        )
    plan = Plan(oracle, settings, layout)
    check_components(plan)
    target = oracle.ask(lambda basis: basis.datum(settings.to))
    needs_t = target.temperature == SAME_T
    if settings.datum is not None and not evaluate:
        needs_t |= oracle.ask(lambda basis: basis.datum(settings.datum or "")).temperature == SAME_T
    if needs_t and layout.get("temperature") is None and settings.temperature is None:
        raise InvalidInput(
            "a datum with its zero at the temperature of the state needs temperatures, and there is no such column",
            where=where,
            hint=f"name it: --column temperature=NAME; the columns are {listed(names)}",
        )
    if settings.species is not None:
        oracle.ask(lambda basis: basis.species(settings.species or ""))  # one name for all rows must be right
    return plan


def _required(layout: Layout, settings: Settings, evaluate: bool, where: str) -> None:
    names = layout.names
    if settings.species is None and layout.get("species") is None and not layout.components:
        raise InvalidInput(
            "no species: neither a column nor an option names it",
            where=where,
            hint=f"give --species NAME, or --column species=NAME; the columns are {listed(names)}",
        )
    if not evaluate:
        if settings.datum is None and layout.get("datum") is None:
            raise InvalidInput(
                "no datum: neither a column nor an option says what the enthalpies are measured from",
                where=where,
                hint="give --from DATUM, or --column datum=NAME",
            )
        return
    t_known = layout.get("temperature") is not None or settings.temperature is not None
    p_known = layout.get("pressure") is not None or settings.pressure is not None
    if not t_known and not (settings.saturated and p_known):
        raise InvalidInput(
            "no column of enthalpies to convert, and none of temperatures to compute them from",
            where=where,
            hint=f"name one: --column enthalpy=NAME or temperature=NAME; the columns are {listed(names)}",
        )
    if not settings.phase and layout.get("phase") is None:
        raise InvalidInput(
            "no column of enthalpies to convert, and no phase to compute them for",
            where=where,
            hint="give --phase g, or name a column: --column enthalpy=NAME or phase=NAME",
        )
    if settings.datum is not None:
        raise InvalidInput(
            "--from is given, and there is no column of enthalpies",
            where=where,
            hint=f"name it: --column enthalpy=NAME; the columns are {listed(names)}",
        )


def convert_table(
    oracle: Oracle, request: Request, source: Path, target: Path, tell: Callable[[str], None] | None
) -> TableReport:
    """See :meth:`propdb.api.Store.convert_table`."""
    check_paths(source, target, overwrite=request.overwrite)
    kind = kind_of_file(source)
    if target.suffix.lower() == ".xlsm":
        raise InvalidInput("macros are not kept", where=str(target), hint="end the name with .xlsx")
    if kind != "directory" and kind_of_file(target) != kind:
        raise InvalidInput(
            f"the input is {source.suffix} and the output {target.suffix}",
            where=str(target),
            hint=f"a table keeps its format: end the name with {source.suffix}",
        )
    if kind != "directory" and (request.scheduler is not None or request.workers is not None):
        raise InvalidInput(
            "several machines share a directory of Parquet, not one file",
            where=str(source),
            hint="leave --scheduler and --workers out, or split the table",
        )
    progress = Progress(tell)
    with Whole(target, directory=kind == "directory") as whole:
        suggestion = None
        if request.settings.to == SUGGEST:
            survey = replace(request, settings=replace(request.settings, to=_ANY), across=True)
            suggestion = suggest(_once(kind, oracle, survey, source, whole.part, Progress(None)).tally)
            request = replace(request, settings=replace(request.settings, to=suggestion.datum))
            whole.clear()
        done = _once(kind, oracle, request, source, whole.part, progress)
        plan, tally = done.plan, done.tally
        if suggestion is not None:
            done.notes.insert(0, str(suggestion))
        files = {
            "input": {"name": source.name, "sha256": done.read},
            "output": {"name": target.name, "sha256": done.written},
        }
        streams = None if tally.streams is None else tally.streams.summary()
        data = data_of(plan, tally, stamp=plan.stamp, files=files, notes=done.notes, streams=streams)
        if suggestion is not None:
            data["suggestion"] = suggestion.as_dict()
        whole.commit((sidecar_path(target), dump(data)))
    shown = summary(data, target, progress.seconds()) + ([] if streams is None else lines(streams))
    return TableReport(target, data, tuple(shown))


def _once(kind: str, oracle: Oracle, request: Request, source: Path, part: Path, progress: Progress) -> Done:
    if kind == "excel":
        from propdb.tables.excel import convert_excel

        return convert_excel(oracle, request, source, part, progress)
    run = {"csv": _delimited, "parquet": _parquet, "directory": _directory}[kind]
    return run(oracle, request, source, part, progress)


def _tally(plan: Plan, request: Request) -> Tally:
    column = plan.layout.get("flow")
    if column is None:
        return Tally(plan)
    flow_unit(column.unit, column.name)
    return Tally(plan, Streams(plan, request.across))


def _notes(plan: Plan) -> list[str]:
    notes = []
    if plan.layout.components:
        notes.append(
            "mixtures are taken as ideal: the sum over the components, without an enthalpy of mixing"
            if plan.settings.evaluate
            else "mixtures: the shift is the sum over the components; an enthalpy of mixing stays as it is"
        )
    if plan.layout.get("vapour") is not None:
        notes.append("the vapour fraction has no part in a shift: both phases have one zero")
    return notes


def _delimited(oracle: Oracle, request: Request, source: Path, part: Path, progress: Progress) -> Done:
    arrow()
    with source.open("rb") as file, part.open("wb") as raw:
        given = open_delimited(source, file, comma=request.comma)
        if not request.columns:
            check_header(first_rows(given.head, given.dialect.delimiter), source.name)
        plan = make_plan(oracle, request, given.head.names, where=source.name)
        tally = _tally(plan, request)
        out = HashedWriter(raw)
        digits = convert_delimited(given, plan, out, tally, progress)
        out.close()
    notes = _notes(plan)
    if not digits.fixed and plan.layout.get("enthalpy") is not None and digits.places < 2 and tally.rows:
        places = "1 decimal" if digits.places == 1 else f"{digits.places} decimals"
        notes.append(f"written to {places}, as the column is; --digits N for more")
    return Done(plan, tally, given.reader.hexdigest(), out.hexdigest(), notes)


def _parquet(oracle: Oracle, request: Request, source: Path, part: Path, progress: Progress) -> Done:
    plan = _parquet_plan(oracle, request, source)
    tally = _tally(plan, request)
    with ThreadPoolExecutor(1, "propdb-hash") as pool:
        digest = pool.submit(sha256_of, source)
        with part.open("wb") as raw:
            out = HashedWriter(raw)
            convert_parquet(source, plan, out, tally, progress, share=lambda share: share)
            out.close()
        return Done(plan, tally, digest.result(), out.hexdigest(), _notes(plan))


def _parquet_plan(oracle: Oracle, request: Request, source: Path) -> Plan:
    names = tuple(open_parquet(source).schema_arrow.names)
    return make_plan(oracle, request, names, where=source.name)


def _directory(oracle: Oracle, request: Request, source: Path, part: Path, progress: Progress) -> Done:
    files = parquet_files(source)
    plan = _parquet_plan(oracle, request, files[0])
    tally = _tally(plan, request)
    for file in files[1:]:
        if tuple(open_parquet(file).schema_arrow.names) != plan.layout.names:
            raise InvalidInput(
                f"its columns are not those of {files[0].name}", where=file.name, hint="convert it by itself"
            )
    names = [file.relative_to(source).as_posix() for file in files]
    if request.scheduler is not None or request.workers is not None:
        if tally.streams is not None:
            raise InvalidInput("streams are added up on one machine", hint="leave --scheduler and --workers out")
        from propdb.tables.spread import spread

        jobs = [(file, part / name, name) for file, name in zip(files, names, strict=True)]
        known = spread(plan, jobs, tally, progress, scheduler=request.scheduler, workers=request.workers)
        return Done(plan, tally, sha256_of(source, known=known), sha256_of(part, known=known), _notes(plan))
    for place, (file, name) in enumerate(zip(files, names, strict=True)):
        (part / name).parent.mkdir(parents=True, exist_ok=True)
        with (part / name).open("wb") as raw:
            out = HashedWriter(raw)
            share = partial(_share, place, len(files))
            convert_parquet(file, plan, out, tally, progress, share=share, file=name)
            out.close()
    return Done(plan, tally, sha256_of(source), sha256_of(part), _notes(plan))


def _share(place: int, count: int, share: float) -> float:
    return (place + share) / count
