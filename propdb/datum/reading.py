"""Datums from a TOML table: ``[elements.X]`` reference forms shared by all, and one ``[datum.NAME]`` each.

::

    [elements.S]
    forms = [
        { until = "368.3K", species = "sulfur", phase = "cr", form = "rhombic" },
        ...
        { species = "disulfur", phase = "g" },
    ]

    [datum.gas-25C]
    kind = "own"                  # own | elements | basis
    sentence = "..."
    source = "common-practice"    # key of a source
    temperature = "25C"           # or "same" (elements), "boiling" (own)
    phase = "g"                   # own: the state; also form, pressure, saturated
    h0 = "200 kJ/kg"              # own: its enthalpy, if not 0; internal_energy = true if u0 is meant
    species.water = { phase = "l", temperature = "0C" }    # own: another state for one species
    only = true                   # own: the datum is of the species listed and of no other
    replace.P = { species = "phosphorus", phase = "cr", form = "red" }   # elements: another form
    basis = [ { species = "water", phase = "l" } ]         # basis
"""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Mapping, Sequence
from typing import Any, Literal, cast

from propdb.datum.inline import INLINE_PREFIX
from propdb.datum.quantities import read_enthalpy, read_pressure, read_temperature
from propdb.datum.stoichiometry import Composition, basis_for_phase, check_independent
from propdb.errors import DatumError, InvalidInput
from propdb.model.records import BOILING, P_ATM, P_STANDARD, PHASES, SAME_T, Datum, ZeroState

__all__ = ["parse_datums", "read_body"]

_KINDS = ("own", "elements", "basis")
_COMMON = {"kind", "sentence", "source", "temperature", "standard_pressure", "note"}
_STATE = {"phase", "form", "pressure", "saturated"}
_ALLOWED = {
    "own": _COMMON | _STATE | {"h0", "internal_energy", "species", "only"},
    "elements": _COMMON | {"replace"},
    "basis": _COMMON | {"basis"},
}
_NAME = re.compile(r"[A-Za-z0-9][A-Za-z0-9.+-]*")

Schedule = Mapping[str, tuple[tuple[float, ZeroState], ...]]


def parse_datums(
    data: Mapping[str, Any],
    *,
    where: str,
    composition: Composition | None = None,
    elements: Mapping[str, Any] | None = None,
) -> dict[str, Datum]:
    """Read every datum of a parsed TOML file.

    Parameters
    ----------
    data : mapping
        The file as ``tomllib`` gives it, with the tables ``elements`` and ``datum``.
    where : str
        Name of the file, for messages.
    composition : callable, optional
        ``composition(name) -> ({element: count}, charge)``. With it each basis is checked: its species are known and
        linearly independent.
    elements : mapping, optional
        A table of reference forms for elements that the file itself does not list.

    Raises
    ------
    DatumError
        One line that names the file, the datum and what would be right.
    """
    _only_keys(data, {"elements", "datum"}, where)
    table = _elements({**(elements or {}), **_table(data.get("elements", {}), f"{where}: elements")}, where)
    result: dict[str, Datum] = {}
    for name, body in _table(data.get("datum", {}), f"{where}: datum").items():
        place = f"{where}: datum {name!r}"
        if not _NAME.fullmatch(name) or name.startswith(INLINE_PREFIX):
            raise DatumError("a datum is named with letters, digits, '.', '+' and '-'", where=place)
        result[name] = _datum(name, _table(body, place), table, place)
        if composition is not None and result[name].kind == "basis":
            _check_basis(result[name], composition, place)
    return result


def read_body(name: str, body: Mapping[str, Any]) -> Datum:
    """The datum that :func:`propdb.datum.datum_body` turned into plain values.

    Raises
    ------
    DatumError
        As :func:`parse_datums`.
    """
    found = parse_datums(body, where="store")
    if name not in found:
        raise DatumError(f"its body defines {', '.join(found) or 'nothing'}", where=f"datum {name!r}")
    return found[name]


def _check_basis(datum: Datum, composition: Composition, place: str) -> None:
    for phase in ("g", "aq"):
        members = basis_for_phase(datum.basis, phase=phase, composition=composition)
        check_independent([z.species for z in members], composition=composition, where=place)


def _datum(name: str, body: Mapping[str, Any], table: Mapping[str, list[dict[str, Any]]], place: str) -> Datum:
    kind = _text(body, "kind", place)
    if kind not in _KINDS:
        raise DatumError(f"kind {kind!r} is unknown", where=place, hint=f"kinds are {', '.join(_KINDS)}")
    _only_keys(body, _ALLOWED[kind], place)
    for key in ("sentence", "source"):
        if not _text(body, key, place).strip():
            raise DatumError(f"{key} is empty", where=place, hint=_WANTED[key])
    only = _flag(body, "only", place)
    common: dict[str, Any] = {
        "name": name,
        "kind": cast(Literal["own", "elements", "basis"], kind),
        "sentence": body["sentence"].strip(),
        "source": body["source"].strip(),
        "standard_pressure": _pressure(body, "standard_pressure", place) or P_STANDARD,
        "note": _text(body, "note", place, default="").strip(),
    }
    if kind == "own":
        return _own(body, common, only, place)
    temperature = _temperature(body, place)
    if temperature == BOILING or (temperature == SAME_T and kind != "elements"):
        raise DatumError(f"temperature {temperature!r} does not go with kind {kind!r}", where=place, hint=_WANTED_T)
    if kind == "elements":
        schedule = _schedule(body, table, temperature, place)
        return Datum(**common, temperature=temperature, schedule=schedule)
    states = tuple(
        _state(_table(row, place), temperature, f"{place}: basis species {i}", named=True)
        for i, row in enumerate(_rows(body, "basis", place), start=1)
    )
    return Datum(**common, temperature=temperature, basis=states)


_WANTED_T = "write e.g. '25C', 'same' (elements) or 'boiling' (own)"
_WANTED = {
    "kind": "own, elements or basis",
    "sentence": "say in plain words what has zero and when one meets it",
    "source": "give the key of a source, e.g. common-practice",
    "phase": f"one of {', '.join(PHASES)} or stable",
    "species": "give the name of a species",
    "basis": "a list of { species, phase, form }",
    "forms": "a list of { until, species, phase, form }",
}


def _own(body: Mapping[str, Any], common: dict[str, Any], only: bool, place: str) -> Datum:
    overrides = _table(body.get("species", {}), f"{place}: species")
    if only and not overrides:
        raise DatumError("only = true, and no species listed", where=place, hint="list them under species")
    if only and "phase" in body:
        raise DatumError("only = true leaves no use for a common phase", where=place, hint="leave phase out")
    zero: ZeroState | None = None
    if not only:
        zero = _state(body, _temperature(body, place), place, named=False)
    default = zero.temperature if zero else _temperature(body, place) if "temperature" in body else None
    per_species: dict[str, ZeroState] = {}
    for name, row in overrides.items():
        state = _table(row, f"{place}: species {name!r}")
        _only_keys(state, _STATE | {"temperature"}, f"{place}: species {name!r}")
        per_species[name] = _state(state, default, f"{place}: species {name!r}", named=False)
    first = default if default is not None else next(iter(per_species.values())).temperature
    if first == SAME_T or any(z.temperature == SAME_T for z in per_species.values()):
        raise DatumError("temperature 'same' does not go with kind 'own'", where=place, hint=_WANTED_T)
    h0, h0_unit = 0.0, "J/mol"
    if "h0" in body:
        try:
            h0, h0_unit = read_enthalpy(_text(body, "h0", place))
        except InvalidInput as error:
            raise DatumError(
                f"h0: {error.problem}", hint=error.hint or "write e.g. '200 kJ/kg'", where=place
            ) from error
    return Datum(
        **common,
        temperature=first,
        zero=zero,
        per_species=per_species,
        only=only,
        h0=h0,
        h0_unit=h0_unit,
        internal_energy=_flag(body, "internal_energy", place),
    )


def _elements(raw: Mapping[str, Any], where: str) -> dict[str, list[dict[str, Any]]]:
    """The shared table, checked: element -> rows ``{until [K], state}``, ascending."""
    result: dict[str, list[dict[str, Any]]] = {}
    for element, body in raw.items():
        place = f"{where}: element {element!r}"
        forms = _table(body, place)
        _only_keys(forms, {"forms", "note"}, place)
        rows: list[dict[str, Any]] = []
        below = 0.0
        for i, row in enumerate(_rows(forms, "forms", place), start=1):
            here = f"{place}, form {i}"
            stage = _table(row, here)
            _only_keys(stage, _STATE | {"until", "species"}, here)
            upper = _kelvin(stage["until"], here) if "until" in stage else math.inf
            if upper <= below:
                raise DatumError(
                    f"until {stage.get('until')!r} is not above the form before", where=here, hint="sort by temperature"
                )
            rows.append({"until": upper, "row": stage, "place": here})
            below = upper
        result[element] = rows
    return result


def _schedule(
    body: Mapping[str, Any],
    table: Mapping[str, list[dict[str, Any]]],
    temperature: float | Literal["same", "boiling"],
    place: str,
) -> Schedule:
    replaced = _table(body.get("replace", {}), f"{place}: replace")
    schedule: dict[str, tuple[tuple[float, ZeroState], ...]] = {}
    for element, rows in table.items():
        if temperature == SAME_T:
            schedule[element] = tuple((r["until"], _state(r["row"], SAME_T, r["place"], named=True)) for r in rows)
            continue
        row = next((r for r in rows if cast(float, temperature) <= r["until"]), None)
        if row is not None:  # an element without a form at this temperature is refused when it is asked for
            schedule[element] = ((math.inf, _state(row["row"], temperature, row["place"], named=True)),)
    for element, row in replaced.items():
        here = f"{place}: replace {element!r}"
        stage = _table(row, here)
        _only_keys(stage, _STATE | {"species", "temperature"}, here)
        if element not in table:
            raise DatumError(
                f"element {element!r} is not in the table of elements", where=here, hint=_near(element, table)
            )
        schedule[element] = ((math.inf, _state(stage, temperature, here, named=True)),)
    if not schedule:
        raise DatumError("no reference form of any element", where=place, hint="add a table [elements.X]")
    return schedule


def _state(
    row: Mapping[str, Any], default: float | Literal["same", "boiling"] | None, place: str, *, named: bool
) -> ZeroState:
    phase = _text(row, "phase", place)
    if phase not in (*PHASES, "stable"):
        raise DatumError(f"phase {phase!r} is unknown", where=place, hint=_WANTED["phase"])
    form = _text(row, "form", place, default="")
    if form and phase != "cr":
        raise DatumError(f"form {form!r} of phase {phase!r}", where=place, hint="only cr has forms")
    saturated = _text(row, "saturated", place, default="")
    if saturated not in ("", "liquid", "vapour"):
        raise DatumError(f"saturated {saturated!r} is unknown", where=place, hint="write liquid or vapour")
    if saturated and phase not in ("l", "fluid"):
        raise DatumError(f"saturated {saturated!r} of phase {phase!r}", where=place, hint="the phase is l or fluid")
    temperature = _temperature(row, place) if "temperature" in row else default
    if temperature is None:
        raise DatumError("temperature is missing", where=place, hint=_WANTED_T)
    pressure = _pressure(row, "pressure", place)
    if phase == "fluid" and not saturated and pressure is None:
        raise DatumError("a real fluid needs a pressure, or saturated", where=place, hint='pressure = "40 bar"')
    if temperature == BOILING:
        if phase not in ("l", "fluid"):
            raise DatumError("'boiling' is a state of phase l or fluid", where=place, hint='phase = "l"')
        pressure = pressure or P_ATM
    return ZeroState(
        phase=phase,
        temperature=temperature,
        species=_text(row, "species", place) if named else "",
        form=form,
        pressure=pressure,
        saturated=cast(Literal["", "liquid", "vapour"], saturated),
    )


def _temperature(row: Mapping[str, Any], place: str) -> float | Literal["same", "boiling"]:
    value = row.get("temperature")
    if value is None:
        raise DatumError("temperature is missing", where=place, hint=_WANTED_T)
    if value in (SAME_T, BOILING):
        return cast(Literal["same", "boiling"], value)
    return _kelvin(value, place)


def _kelvin(value: object, place: str) -> float:
    if not isinstance(value, str):
        raise DatumError(f"temperature {value!r} has no unit", where=place, hint="write it as text, e.g. '298.15K'")
    try:
        return read_temperature(value)
    except InvalidInput as error:
        raise DatumError(error.problem, hint=error.hint or _WANTED_T, where=place) from error


def _pressure(row: Mapping[str, Any], key: str, place: str) -> float | None:
    if key not in row:
        return None
    try:
        return read_pressure(_text(row, key, place))
    except InvalidInput as error:
        raise DatumError(f"{key}: {error.problem}", hint=error.hint or "write e.g. '1 atm'", where=place) from error


def _text(row: Mapping[str, Any], key: str, place: str, *, default: str | None = None) -> str:
    value = row.get(key, default)
    if value is None:
        raise DatumError(f"{key} is missing", where=place, hint=_WANTED.get(key, ""))
    if not isinstance(value, str):
        raise DatumError(f"{key} is {value!r}, not a text", where=place, hint="put it in quotes")
    return value


def _flag(row: Mapping[str, Any], key: str, place: str) -> bool:
    value = row.get(key, False)
    if not isinstance(value, bool):
        raise DatumError(f"{key} is {value!r}", where=place, hint="write true or false")
    return value


def _table(value: object, place: str) -> Mapping[str, Any]:
    if not isinstance(value, Mapping):
        raise DatumError(f"{value!r} is not a table", where=place)
    return value


def _rows(row: Mapping[str, Any], key: str, place: str) -> Sequence[Any]:
    value = row.get(key)
    if not isinstance(value, (list, tuple)) or not value:
        raise DatumError(f"{key} is missing or empty", where=place, hint=_WANTED[key])
    return value


def _only_keys(row: Mapping[str, Any], allowed: set[str], place: str) -> None:
    for key in row:
        if key not in allowed:
            raise DatumError(f"key {key!r} is unknown", where=place, hint=_near(key, allowed))


def _near(word: str, among: Mapping[str, Any] | set[str]) -> str:
    near = difflib.get_close_matches(word, list(among), n=1, cutoff=0.5)
    return f"did you mean {near[0]!r}?" if near else f"one of {', '.join(sorted(among))}"
