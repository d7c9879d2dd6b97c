"""Own entries: the rows of a filled template to entries in SI, through the same readers as the seed.

A row is a constant; a heat-capacity equation over a range (``polynomial``, ``shomate``, ``constant``; rows of one
species, phase, form, conditions and source that touch become one entry); with the equation ``table``, a heat capacity
at one temperature (all such rows become one entry); or, with the quantity ``H``, one row of a table of enthalpies.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import replace
from functools import cached_property
from typing import Any

from propdb.datum import resolve as resolve_datum
from propdb.errors import Ambiguous, EquationError, InvalidInput, NotFound, PropdbError, SeedError
from propdb.intake.common import Folder, carrier, cited, finish, form_of, phase_of, si, species_of, uncertainty_kind
from propdb.intake.constants import read_constant
from propdb.intake.curves import read_curves
from propdb.intake.enthalpies import enthalpy_table, group_of
from propdb.intake.files import UserFile
from propdb.intake.plan import Candidate, Known, Plan, Skipped, as_invalid, own_carrier, settle, this_year
from propdb.intake.points import Point, table_params
from propdb.intake.rows import Row, Table, near
from propdb.intake.sources import parse_source
from propdb.intake.species import merge_species
from propdb.intake.written import Given, Written, place_of, read_values, read_written
from propdb.model.formula import hill
from propdb.model.records import Entry, Source, Species
from propdb.units import parse_temperature

__all__ = ["EQUATIONS", "plan_template", "plan_values"]

EQUATIONS = ("polynomial", "shomate", "constant", "table")
_NUMBERS = ("temperature", "value", "uncertainty", "tmin", "tmax", "exponents", "scales", "coefficients")
_TEMPERATURES = ("temperature", "tmin", "tmax")
_WITH_UNIT = re.compile(r".*[0-9.]\s*(?:°|º|deg)?\s*[CFRK]|.*[℃℉]", re.IGNORECASE)
_ONLY_CURVES = ("tmin", "tmax", "exponents", "scales", "coefficients")
_ONLY_CONSTANTS = ("to", "datum")
#: A bare number below this is more often in Celsius than in kelvin.
_COLD = 150.0
_MINUS = str.maketrans(dict.fromkeys("\u2212\u2013\ufe63\uff0d", "-"))


def plan_template(file: UserFile, known: Known) -> Plan:
    """What a filled template holds; every row that cannot be taken is in ``problems``.

    Raises
    ------
    InvalidInput, NotFound
        The file as a whole cannot be read, or holds no value.
    """
    written = read_written(file)
    if not written.rows and not written.problems:
        hint = "fill in the template: one row ([[entry]] in TOML) for each value"
        raise NotFound("the file holds no value", where=file.name, hint=hint)
    return _plan(written, Plan(file.name, file.kind), known, f"read from a {file.kind.upper()} template")


def plan_values(values: Sequence[Mapping[str, Any]], known: Known, how: str = "given by a program") -> Plan:
    """What values given by a program or typed one by one hold; as :func:`plan_template`."""
    return _plan(read_values(values), Plan("values", "values"), known, how)


def _plan(written: Written, plan: Plan, known: Known, how: str) -> Plan:
    builder = _Builder(written, plan, known, how)
    for row in written.rows:
        builder.take(row)
    builder.join()
    plan.candidates.sort(key=lambda one: one.carrier.row or 0)
    problems = [*written.problems, *builder.problems]
    plan.problems = [as_invalid(error) for error in sorted(problems, key=lambda e: e.fields.get("row") or 0)]
    used = {one.entry.species for one in plan.candidates}, {one.entry.source for one in plan.candidates}
    plan.species = {name: one for name, one in plan.species.items() if name in used[0]}
    plan.sources = {key: one for key, one in plan.sources.items() if key in used[1]}
    return settle(plan, known)


class _Failed(Exception):
    """What a row refers to has been complained about before."""


class _Builder:
    """Rows in, candidates and problems out."""

    def __init__(self, written: Written, plan: Plan, known: Known, how: str) -> None:
        self.written, self.plan, self.known, self.how = written, plan, known, how
        self.problems: list[PropdbError] = []
        self.species: dict[str, Species] = {}
        self.folders: dict[str, Folder] = {}
        self.failed: set[tuple[str, str]] = set()
        self.seen: dict[str, dict[tuple[object, ...], Row]] = {}
        self.groups: dict[tuple[str, ...], list[tuple[Row, Folder]]] = {}

    @cached_property
    def weights(self) -> dict[str, float]:
        """Atomic weights [g/mol]."""
        from propdb.intake.seeds import atomic_weights
        from propdb.intake.where import seed_root

        return atomic_weights(seed_root())

    def take(self, row: Row) -> None:
        """Make the entry of a row, or put it with those it is to be joined with."""
        if not any(row.text(column) for column in ("value", "coefficients")):
            what = f"{row.text('quantity')} of {row.text('species')}".strip()
            self.plan.skipped.append(Skipped(place_of(row), what, "no value is given"))
            return
        try:
            row, folder = self._prepared(row)
            equation = row.text("equation")
            if row.text("quantity") == "H":
                self._blank(row, (*_ONLY_CURVES, "to"), "a table of enthalpies")
                self.groups.setdefault(("enthalpies", *group_of(row, folder)), []).append((row, folder))
                return
            if equation:
                self._group(row, folder, equation)
                return
            self._blank(row, _ONLY_CURVES, "a value at one temperature")
            key = folder.source.key
            self._add(read_constant(row, folder, self.seen.setdefault(key, {})), row, folder)
        except _Failed:
            return
        except PropdbError as error:
            self.problems.append(error)

    def join(self) -> None:
        """Make the entries of rows that belong together."""
        for key, members in self.groups.items():
            rows, folder = [row for row, _ in members], members[0][1]
            try:
                if key[0] == "enthalpies":
                    seen = self.seen.setdefault(folder.source.key, {})
                    self._add(enthalpy_table(rows, folder, seen), rows[0], folder)
                elif key[0] == "table":
                    self._add(self._table(rows, folder), rows[0], folder)
                else:
                    for entry in read_curves(Table(rows[0].file, tuple(rows)), folder):
                        first = next(r for r in rows if r.number == entry.carriers[0].row)
                        self._add(entry, first, folder)
            except PropdbError as error:
                self.problems.append(error)

    def _add(self, entry: Entry, row: Row, folder: Folder) -> None:
        species = folder.species[entry.species]
        entry, last = own_carrier(entry, self.how)
        self.plan.candidates.append(Candidate(place_of(row), entry, species, last))

    def _prepared(self, row: Row) -> tuple[Row, Folder]:
        """The row in the words of the seed, and what it refers to."""
        species = self._species(row)
        source = self._source(row)
        cells = dict(row.cells) | {"species": species.name, "source": source.key}
        for column in _NUMBERS:
            cells[column] = cells.get(column, "").translate(_MINUS)
        for column in _TEMPERATURES:
            cells[column] = self._kelvin(row, column, cells[column])
        if cells.get("datum"):
            cells["datum"] = self._datum(row, cells["datum"])
        folder = self.folders.get(source.key)
        if folder is None:
            folder = self.folders[source.key] = Folder(source, self.species, self.known.datums)
        return replace(row, cells=cells), folder

    def _kelvin(self, row: Row, column: str, text: str) -> str:
        if _WITH_UNIT.fullmatch(text):
            try:
                return repr(parse_temperature(text))
            except InvalidInput as error:
                raise row.error(column, error.problem, error.hint) from None
        if text and 0 < abs(row.read_number(text, column)) < _COLD:
            self.plan.remarks.append(
                (place_of(row), f"{column} {text} is taken as {text} K; write {text}C if meant so")
            )
        return text

    def _datum(self, row: Row, text: str) -> str:
        try:
            datum = resolve_datum(text, self.known.datums)
        except PropdbError as error:
            raise row.error("datum", error.problem, error.hint) from None
        if datum.inline:
            raise row.error("datum", f"{text!r} is a datum in place", "add it by `propdb datum add`, and give its name")
        return datum.name

    # -- what a row refers to -----------------------------------------------------------------------------------------

    def _species(self, row: Row) -> Species:
        name = row.needed("species", "give a name, formula or CAS RN")
        if ("species", name) in self.failed:
            raise _Failed
        try:
            found = self._known_species(row, name)
            given = self.written.species.get(name)
            if given is not None:
                found = self._given_species(row, name, given, found)
            if found is None:
                near_names = near(name, self.written.species) or self._near(name)
                hint = (
                    near_names or "`propdb find` looks for it; a new one needs species_formula ([species.NAME] in TOML)"
                )
                raise row.error("species", f"unknown species {name!r}", hint)
        except PropdbError:
            self.failed.add(("species", name))
            raise
        self.species[found.name] = found
        return found

    def _near(self, name: str) -> str:
        from propdb.store.search import find

        names = [match.name for match in find(self.known.reader, name, 3)]
        return f"did you mean {', '.join(names)}? A new one needs species_formula" if names else ""

    def _known_species(self, row: Row, text: str) -> Species | None:
        if text in self.plan.species:
            return self.plan.species[text]
        try:
            return self.known.species(text)
        except Ambiguous as error:
            raise row.error("species", error.problem, error.hint) from None

    def _given_species(self, row: Row, name: str, given: Given, found: Species | None) -> Species:
        """A species that the file defines; where the store has it, the two must agree."""
        if name in self.plan.species:
            return self.plan.species[name]
        cells = {"charge": "0", **{key: str(value) for key, value in given.data.items()}, "name": name}
        part = replace(given.row, cells=cells)
        try:
            if found is None or cells.get("formula"):
                (one,) = merge_species([Table(row.file, (part,))], weights=self.weights).values()
        except SeedError as error:
            column = str(error.fields.get("column", ""))
            hint = "write species_molar_mass in g/mol" if "elements.csv" in error.hint else error.hint
            raise given.row.error(given.prefix + column, error.problem, hint) from None
        if found is not None:
            if cells.get("formula") and dict(one.composition) != dict(found.composition):
                right = f"{found.name} is {found.display_formula} in the store"
                hint = "leave the formula blank, or choose another name"
                raise given.row.error(f"{given.prefix}formula", f"{one.formula} contradicts the store: {right}", hint)
            return found
        for column in ("cas", "inchikey"):
            other = self.known.species(getattr(one, column)) if getattr(one, column) else None
            if other is not None:
                problem = f"{getattr(one, column)} is {other.name} in the store, {hill(dict(other.composition))}"
                raise given.row.error(given.prefix + column, problem, f"write {other.name!r} as species")
        self.plan.species[name] = one
        return one

    def _source(self, row: Row) -> Source:
        key = row.needed("source", "give the key of a source; `propdb source list` shows them")
        if ("source", key) in self.failed:
            raise _Failed
        try:
            given = self.written.sources.get(key)
            found = self.known.source(key) or self.plan.sources.get(key)
            if given is not None and key not in self.plan.sources:
                found = self._given_source(key, given, found)
            if found is None:
                known = (*self.known.sources, *self.written.sources)
                hint = near(key, known) or "a new one needs source_title and so on ([source.KEY] in TOML)"
                raise row.error("source", f"unknown source {key!r}", hint)
        except PropdbError:
            self.failed.add(("source", key))
            raise
        return found

    def _given_source(self, key: str, given: Given, found: Source | None) -> Source:
        data = _source_data(key, given)
        if found is not None:
            mine = {"title": found.title, "year": found.year, "doi": found.fields.get("doi", "")}
            odd = next((name for name, value in mine.items() if data.get(name, value) not in (value, "")), None)
            if odd is not None:
                problem = f"source {key!r} is in the store with the {odd} {mine[odd]!r}"
                raise given.row.error(given.prefix + odd, problem, "leave its fields blank, or choose another key")
            return found
        year = data.get("year")
        if isinstance(year, int) and year > this_year():
            raise given.row.error(f"{given.prefix}year", f"year {year} is in the future", "when did it appear?")
        try:
            source = parse_source(data, file=given.row.file)
        except SeedError as error:
            column = str(error.fields.get("column", ""))
            column = "source" if given.prefix and column == "key" else given.prefix + column
            raise given.row.error(column, error.problem, error.hint) from None
        self.plan.sources[key] = source
        return source

    # -- rows that are joined -----------------------------------------------------------------------------------------

    def _blank(self, row: Row, columns: Sequence[str], what: str) -> None:
        odd = next((column for column in columns if row.text(column)), None)
        if odd is not None:
            raise row.error(odd, f"{odd} of {what}", "leave it blank, or name the equation")

    def _group(self, row: Row, folder: Folder, equation: str) -> None:
        row.choice("equation", EQUATIONS)
        if row.choice("quantity", ("Cp", row.text("quantity"))) != "Cp":
            raise row.error("equation", f"{row.text('quantity')} as an equation", "only Cp may be one; leave it blank")
        self._blank(row, _ONLY_CONSTANTS, "an equation")
        cells = dict(row.cells)
        if cells.get("uncertainty", "").endswith("%"):
            cells["uncertainty"] = cells["uncertainty"][:-1].rstrip()
        kind = "table"
        if equation == "table":
            self._blank(row, _ONLY_CURVES, "one row of a table")
            row.needed("temperature", "one temperature in each row of a table")
        else:
            kind = "curve"
            odd = next((column for column in ("temperature", "value") if row.text(column)), None)
            if odd is not None:
                raise row.error(odd, f"{odd} of equation {equation}", "it goes into tmin, tmax and coefficients")
            if equation == "polynomial" and not cells.get("scales"):
                cells["scales"] = " ".join("1" for _ in row.text("coefficients").split())
        row = replace(row, cells=cells)
        phase = phase_of(row)
        rest = (row.text("species"), phase, form_of(row, phase), row.text("conditions"), folder.source.key)
        self.groups.setdefault((kind, *rest), []).append((row, folder))

    def _table(self, rows: Sequence[Row], folder: Folder) -> Entry:
        first = rows[0]
        species = species_of(first, folder)
        for column in ("unit", "uncertainty", "uncertainty_kind", "locator"):
            odd = next((row for row in rows if row.text(column) != first.text(column)), None)
            if odd is not None:
                raise odd.error(column, f"{column} differs from {place_of(first)}", "rows of one table share it")
        unit = first.needed("unit", "e.g. J/mol/K or kJ/kg/K")
        points = []
        for row in rows:
            value = si(row, "value", unit=unit, quantity="Cp", species=species)
            kelvin = row.read_number(row.text("temperature"), "temperature")
            points.append(Point(kelvin, value, f"{row.text('temperature')} {row.text('value')}"))
        try:
            params = table_params(points)
        except (InvalidInput, EquationError) as error:
            raise first.error("temperature", error.problem, error.hint) from None
        kind = uncertainty_kind(first)
        percent = first.value("uncertainty") if kind else None
        phase = phase_of(first)
        entry = Entry(
            id="",
            species=species.name,
            quantity="Cp",
            phase=phase,
            form=form_of(first, phase),
            to="",
            equation="table",
            temperature=None,
            value=None,
            unit="J/mol/K",
            carried=" | ".join(point.carried for point in points),
            carried_unit=unit,
            params=params,
            tmin=params["T"][0],
            tmax=params["T"][-1],
            uncertainty=None if percent is None else percent / 100.0,
            uncertainty_unit="%" if kind else "",
            uncertainty_kind=kind,
            datum="",
            conditions=first.text("conditions"),
            source=folder.source.key,
            locator=cited(first),
            status="draft",
            note="; ".join(dict.fromkeys(row.text("note") for row in rows if row.text("note"))),
            carriers=(carrier(first, folder),),
        )
        key = ("table", species.name, phase, entry.form, entry.conditions)
        return finish(entry, species, first, self.seen.setdefault(folder.source.key, {}), key)


def _source_data(key: str, given: Given) -> dict[str, Any]:
    """Values of a source as its record has them; what came from cells is text."""
    data: dict[str, Any] = {name: value for name, value in given.data.items() if value != ""}
    if isinstance(data.get("authors"), str):
        data["authors"] = [name.strip() for name in data["authors"].split(";") if name.strip()]
    for name in ("year", "standard_pressure"):
        text = data.get(name)
        if isinstance(text, str) and re.fullmatch(r"[0-9]{1,9}(?:\.0*)?", text):
            data[name] = int(float(text))
    data.setdefault("terms", "Own entry: facts as the source states them.")
    data.setdefault("carrier", "own entry")
    if data.get("kind") == "practice":
        data.setdefault("authors", [])
    if data.setdefault("key", key) != key:
        raise given.row.error("key", f"key {data['key']!r} is not {key!r}", "leave it out")
    return data
