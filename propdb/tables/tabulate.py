"""Tables made from the store: enthalpy and heat capacity over a range of temperature, across phases."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

from propdb.errors import InvalidInput, NoData, PropdbError
from propdb.levels.curves import Curve, Formulation
from propdb.levels.engine import Levels
from propdb.model.answer import CAUTION
from propdb.model.records import Datum, Entry, Source, Species, State
from propdb.tables.cells import equation_at
from propdb.tables.kinds import EXTRAPOLATED, NO_DATA, OK, enthalpy_at, finite, one_line
from propdb.tables.phases import stretches
from propdb.units import EnthalpyUnit, parse_heat_capacity_unit
from propdb.units.table import SCALES

__all__ = ["Line", "Tabulation", "tabulate"]

_MOST_LINES = 100_000
_STEP = 0.01  # [K], for the heat capacity of a formulation


@dataclass(frozen=True, slots=True)
class Line:
    """One row of a tabulation. Temperatures in K; enthalpies and heat capacities in the unit of the tabulation."""

    species: str
    phase: str
    form: str
    temperature: float
    shown: float  # the temperature on the scale asked for
    h: float | None
    uncertainty: float | None
    cp: float | None
    mark: str  # melting, boiling, transition ... ; "" on ordinary rows
    flag: str
    reason: str
    entries: tuple[str, ...]
    sources: tuple[str, ...]


@dataclass(frozen=True)
class Tabulation:
    """Rows, and what they stand on."""

    datum: str
    sentence: str
    unit: str
    cp_unit: str
    scale: str  # K, C, F or R
    lines: tuple[Line, ...]
    sources: dict[str, Source]
    store: str

    @property
    def headers(self) -> tuple[str, ...]:
        """Names of the columns, with units."""
        degree = self.scale if self.scale == "K" else f"°{self.scale}"
        return (
            "species", "phase", "form", f"T [{degree}]", f"h on {self.datum} [{self.unit}]",
            f"uncertainty [{self.unit}]", f"cp [{self.cp_unit}]", "transition", "flag", "reason", "entries", "sources",
        )  # fmt: skip

    def rows(self) -> list[tuple[Any, ...]]:
        """Cells of every row, in the order of the headers; entries and sources joined by blanks."""
        return [
            (
                line.species, line.phase, line.form or None, line.shown, line.h, line.uncertainty, line.cp,
                line.mark or None, line.flag, line.reason or None, " ".join(line.entries), " ".join(line.sources),
            )
            for line in self.lines
        ]  # fmt: skip

    def as_dict(self) -> dict[str, Any]:
        """For JSON: numbers finite or None."""
        from propdb.model.cite import text

        keys = ("species", "phase", "form", "temperature", "h", "uncertainty", "cp", "transition", "flag", "reason")
        return {
            "datum": self.datum,
            "sentence": self.sentence,
            "unit": self.unit,
            "cp_unit": self.cp_unit,
            "temperature_unit": self.scale,
            "rows": [
                dict(zip(keys, row[:10], strict=True)) | {"entries": list(line.entries), "sources": list(line.sources)}
                for row, line in zip(self.rows(), self.lines, strict=True)
            ],
            "sources": {key: text(source) for key, source in self.sources.items()},
            "store": self.store,
            "caution": CAUTION,
        }


def tabulate(
    levels: Levels,
    species: Sequence[Species],
    *,
    low: float,
    high: float,
    step: float,
    scale: str,
    datum: Datum,
    unit: EnthalpyUnit,
    phase: str | None,
    form: str | None,
    stamp: str,
) -> Tabulation:
    """See :meth:`propdb.api.Store.tabulate`; temperatures and the step in K."""
    if not high > low:
        raise InvalidInput("the range of temperatures is empty", hint="--high must be above --low")
    if not step > 0.0:
        raise InvalidInput("the step is not above zero", where="--step", hint="write e.g. --step 25K")
    count = math.floor((high - low) / step * (1.0 + 1e-12) + 1e-9) + 1
    if count * len(species) > _MOST_LINES:
        raise InvalidInput(f"{count * len(species):,} rows", where="--step", hint=f"at most {_MOST_LINES:,}")
    grid = [low + i * step for i in range(count)]
    if grid[-1] < high - 1e-6 * step:
        grid.append(high)
    energy = unit.text.replace("kJ/mol", "J/mol").replace("kJ/kmol", "J/kmol")
    cp_unit = parse_heat_capacity_unit(f"{energy}/{'F' if scale in 'FR' else 'K'}")
    lines: list[Line] = []
    sources: dict[str, Source] = {}
    offset, numerator, denominator = SCALES[scale]

    def shown(t: float) -> float:
        return round(t * denominator / numerator - float(offset), 9)

    for one in {one.name: one for one in species}.values():
        per = unit.scale(molar_mass=one.molar_mass)
        per_degree = cp_unit.scale(molar_mass=one.molar_mass)
        parts = stretches(levels, one, phase, form)
        before = ""
        for part in parts:
            inside = [t for t in grid if part.low < t < part.high]
            temperatures = [(t, "") for t in inside]
            if before and low <= part.low <= high:
                temperatures.insert(0, (part.low, before))
            if part.ends and low <= part.high <= high:
                temperatures.append((part.high, part.ends))
            for t, mark in temperatures:
                line, found = _line(levels, one, part.phase, part.form, t, mark, datum, per, per_degree, shown(t))
                lines.append(line)
                sources |= found
            before = part.ends if math.isfinite(part.high) else ""
    if not any(line.h is not None for line in lines):
        reason = next((line.reason for line in lines if line.reason), "no phase of it lies in this range")
        raise NoData(f"no enthalpy of {', '.join(s.name for s in species)} in this range: {reason}")
    return Tabulation(
        datum.name, datum.sentence, unit.text, cp_unit.text, scale, tuple(lines), dict(sorted(sources.items())), stamp
    )


def _line(
    levels: Levels,
    species: Species,
    phase: str,
    form: str,
    t: float,
    mark: str,
    datum: Datum,
    per: float,
    per_degree: float,
    shown: float,
) -> tuple[Line, dict[str, Source]]:
    state = State(phase, t, form)
    h = uncertainty = cp = None
    flag, reason = OK, ""
    entries: tuple[str, ...] = ()
    sources: dict[str, Source] = {}
    try:
        state = levels.check(species.name, state)
        point = enthalpy_at(levels, species, state, datum)
        h, uncertainty = point.value / per, finite(point.standard / per)
        entries, sources = point.entries, dict(point.sources)
        if point.extrapolated:
            flag, reason = EXTRAPOLATED, next((w for w in point.warnings if "extrapolated" in w), "extrapolated")
    except PropdbError as error:
        flag, reason = NO_DATA, one_line(error)
    found = None if h is None else heat_capacity(levels, species.name, state)
    if found is not None:
        cp = found[0] / per_degree
        entries = tuple(dict.fromkeys((*entries, found[1].id)))
        sources[found[1].source] = levels.data.source(found[1].source)
    line = Line(
        species.name, phase, state.form, t, shown, h, uncertainty, cp, mark, flag, reason, entries,
        tuple(sorted(sources)),
    )  # fmt: skip
    return line, sources


def heat_capacity(levels: Levels, species: str, state: State) -> tuple[float, Entry] | None:
    """Heat capacity [J/mol/K] of a state and the entry it is from; None where it is not known."""
    track = levels.tree(species).tracks.get((state.phase, state.form))
    t = state.temperature
    if t is None:
        return None
    if isinstance(track, Curve):
        if not track.covers(t) and not track.extrapolate:
            return None
        equation = equation_at(track, t)
        piece = next((p for p in track.pieces if p.equation is equation), None)
        return None if piece is None else (float(equation.cp(t)), piece.entry)
    if isinstance(track, Formulation) and state.phase == "l":
        return _slope(lambda x: track.h(State("l", x)), t, track)
    return None


def _slope(h: Callable[[float], float], t: float, track: Formulation) -> tuple[float, Entry] | None:
    """Central difference, at 1 bar: above the boiling point there the liquid follows saturation, and none is given."""
    from propdb.levels import water

    try:
        if water.saturation(temperature=t + _STEP)[0] >= 1e5:
            return None
        return (h(t + _STEP) - h(t - _STEP)) / (2.0 * _STEP), track.entry
    except PropdbError:
        return None
