"""A datum as TOML that :func:`propdb.datum.parse_datums` reads back to the same record."""

from __future__ import annotations

import json
import math
import tomllib
from typing import Any

from propdb.datum.quantities import read_temperature
from propdb.model.records import P_STANDARD, Datum, ZeroState

__all__ = ["datum_body", "dump_toml"]


def datum_body(datum: Datum) -> dict[str, Any]:
    """A datum as plain values (texts, lists, tables), what a store keeps; :func:`propdb.datum.read_body` reads it."""
    return tomllib.loads(dump_toml(datum))


def dump_toml(datum: Datum) -> str:
    """Write one datum, with the reference forms it uses, as a TOML file of its own.

    An inline datum is written under a name without the colon and the commas, since names hold letters, digits and '-'.
    """
    lines: list[str] = []
    for element, stages in datum.schedule.items():
        lines += [f"[elements.{_key(element)}]", "forms = ["]
        for upper, state in stages:
            until = "" if math.isinf(upper) else f"until = {_quote(_temperature(upper))}, "
            lines.append(f"    {{ {until}{_fields(state, without_temperature=True)} }},")
        lines += ["]", ""]
    lines += [
        f"[datum.{_key(_name(datum))}]",
        f"kind = {_quote(datum.kind)}",
        f"sentence = {_quote(datum.sentence)}",
        f"source = {_quote(datum.source)}",
    ]
    if datum.zero is not None or datum.kind != "own":
        lines.append(f"temperature = {_quote(_temperature(datum.temperature))}")
    if datum.standard_pressure != P_STANDARD:
        lines.append(f"standard_pressure = {_quote(f'{datum.standard_pressure!r} Pa')}")
    if datum.note:
        lines.append(f"note = {_quote(datum.note)}")
    lines += _body(datum)
    return "\n".join(lines) + "\n"


def _body(datum: Datum) -> list[str]:
    lines: list[str] = []
    if datum.zero is not None:
        lines += _fields(datum.zero, without_temperature=True).split(", ")
    if datum.h0:
        lines.append(f"h0 = {_quote(f'{datum.h0!r} {datum.h0_unit}')}")
    if datum.internal_energy:
        lines.append("internal_energy = true")
    if datum.only:
        lines.append("only = true")
    for name, state in datum.per_species.items():
        lines.append(f"species.{_key(name)} = {{ {_fields(state)} }}")
    for element, stages in datum.schedule.items():
        state = stages[0][1]
        if len(stages) == 1 and state.temperature != datum.temperature:
            lines.append(f"replace.{_key(element)} = {{ {_fields(state)} }}")
    if datum.basis:
        lines += [
            "basis = [",
            *(f"    {{ {_fields(state, without_temperature=True)} }}," for state in datum.basis),
            "]",
        ]
    return lines


def _name(datum: Datum) -> str:
    if not datum.inline:
        return datum.name
    return "".join(c if c.isalnum() or c in ".+-" else "-" for c in datum.name)


def _fields(state: ZeroState, *, without_temperature: bool = False) -> str:
    parts = [f"species = {_quote(state.species)}"] if state.species else []
    parts.append(f"phase = {_quote(state.phase)}")
    if state.form:
        parts.append(f"form = {_quote(state.form)}")
    if not without_temperature:
        parts.append(f"temperature = {_quote(_temperature(state.temperature))}")
    if state.pressure is not None:
        parts.append(f"pressure = {_quote(f'{state.pressure!r} Pa')}")
    if state.saturated:
        parts.append(f"saturated = {_quote(state.saturated)}")
    return ", ".join(parts)


def _temperature(value: float | str) -> str:
    """The shortest text that reads back to the same float."""
    if isinstance(value, str):
        return value
    for unit, number in (("C", value - 273.15), ("F", value * 1.8 - 459.67)):
        text = f"{round(number)}{unit}"
        if value > 0 and abs(number - round(number)) < 1e-6 and read_temperature(text) == value:
            return text
    return f"{value!r}K"


def _key(text: str) -> str:
    return text if all(c.isascii() and (c.isalnum() or c in "-_") for c in text) else _quote(text)


def _quote(text: str) -> str:
    return json.dumps(text, ensure_ascii=False)  # a TOML basic string takes the same escapes
