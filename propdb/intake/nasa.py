"""``nasa9.csv``, ``nasa7.csv``: polynomial records, one row per temperature interval, tested by their own checksums."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import replace
from typing import Any

from propdb.cp.checks import T_STANDARD, h298_error
from propdb.cp.registry import build_heat_capacity
from propdb.errors import EquationError
from propdb.intake.common import Folder, carrier, cited, finish, form_of, phase_of, range_of, species_of
from propdb.intake.rows import Row, Table
from propdb.model.records import Entry

__all__ = ["COLUMNS7", "COLUMNS9", "H298_LIMIT", "JOINT_LIMIT", "read_nasa"]

_HEAD = ("species", "phase", "form", "tmin", "tmax", "a1", "a2", "a3", "a4", "a5")
_TAIL = ("hf298", "dh0", "locator", "note")
COLUMNS7 = (*_HEAD, "a6", "a7", *_TAIL)
COLUMNS9 = (*_HEAD, "a6", "a7", "b1", "b2", *_TAIL)

#: Beyond these a record contradicts itself: h(298.15 K) against the stated formation enthalpy [J/mol], and the jumps of
#: cp, h and s at a joint relative to the values themselves, or to cp T and cp where these are larger [1].
H298_LIMIT = 5.0
JOINT_LIMIT = 1e-6

_ELEMENTS_DATUM = "elements-298K"


def read_nasa(table: Table, folder: Folder, *, terms: int) -> Iterator[Entry]:
    """One heat-capacity entry per record, and its formation enthalpy and H(298.15 K) - H(0 K) where it states them.

    A record that contradicts itself is quarantined with the figures in its note: all of it where h(298.15 K) does not
    meet the formation enthalpy, the heat capacity alone where only a joint does not close. The zero formation enthalpy
    of an element in its reference form is a definition and makes no entry. What a note says after ``verdict on Cp:``,
    ``verdict on Hf:`` or ``verdict on dH0:`` stands with that quantity only.

    Parameters
    ----------
    terms : int
        9 or 7.

    Raises
    ------
    SeedError
        File, row and column of what cannot be taken, and what would be right.
    """
    groups: dict[tuple[str, str, str], list[Row]] = {}
    for row in table:
        phase = phase_of(row)
        groups.setdefault((species_of(row, folder).name, phase, form_of(row, phase)), []).append(row)
    seen: dict[tuple[object, ...], Row] = {}
    for key, rows in groups.items():
        yield from _record(sorted(rows, key=range_of), folder, seen, key, terms)


def _record(
    rows: Sequence[Row],
    folder: Folder,
    seen: dict[tuple[object, ...], Row],
    key: tuple[str, str, str],
    terms: int,
) -> Iterator[Entry]:
    first = rows[0]
    species = species_of(first, folder)
    for column in ("hf298", "dh0", "locator"):
        odd = next((row for row in rows if row.text(column) != first.text(column)), None)
        if odd is not None:
            raise odd.error(
                column, f"{column} differs from that of row {first.number}", "repeat it on each row of a record"
            )
    a_columns, b_columns = (COLUMNS9[5:12], ("b1", "b2")) if terms == 9 else (COLUMNS7[5:10], ("a6", "a7"))
    params = {"intervals": [_interval(row, a_columns, b_columns) for row in rows]}
    try:
        record = build_heat_capacity(f"nasa{terms}", params)
    except EquationError as error:
        raise first.error("tmin", f"{species.name}: {error.problem}", error.hint) from error
    hf298, dh0 = first.value("hf298"), first.value("dh0")
    if dh0 is not None and not dh0 > 0:
        raise first.error(
            "dh0", f"H(298.15 K) - H(0 K) of {dh0:g} J/mol is not positive", "leave it blank if not stated"
        )
    level, joints = _faults(record, hf298)
    note = "; ".join(dict.fromkeys(row.text("note") for row in rows if row.text("note")))
    shared: dict[str, Any] = {
        "id": "",
        "species": species.name,
        "phase": key[1],
        "form": key[2],
        "to": "",
        "uncertainty": None,
        "uncertainty_unit": "",
        "uncertainty_kind": "",
        "conditions": "",
        "source": folder.source.key,
        "locator": cited(first),
    }
    curve = Entry(
        **shared,
        quantity="Cp",
        equation=record.name,
        temperature=None,
        value=None,
        unit="J/mol/K",
        carried=" | ".join(" ".join(row.text(c) for c in (*a_columns, *b_columns)) for row in rows),
        carried_unit="R",
        params=params,
        tmin=record.tmin,
        tmax=record.tmax,
        datum="",
        status="quarantined" if level or joints else folder.status,
        note="; ".join(filter(None, (level, joints, _about(note, "Cp")))),
        carriers=tuple(carrier(row, folder) for row in rows),
    )
    yield finish(curve, species, first, seen, ("Cp", *key))
    constant = replace(
        curve,
        equation="",
        temperature=T_STANDARD,
        unit="J/mol",
        carried_unit="J/mol",
        params={},
        tmin=None,
        tmax=None,
        status="quarantined" if level else folder.status,
        carriers=(carrier(first, folder),),
    )
    if hf298 is not None and not (hf298 == 0 and _is_reference(key, folder)):
        hf = replace(
            constant,
            quantity="Hf",
            value=hf298,
            carried=first.text("hf298"),
            datum=_ELEMENTS_DATUM,
            note="; ".join(filter(None, (level, _about(note, "Hf")))),
        )
        yield finish(hf, species, first, seen, ("Hf", *key))
    if dh0 is not None:
        said = "; ".join(filter(None, (level, _about(note, "dH0"))))
        increment = replace(constant, quantity="dH0", value=dh0, carried=first.text("dh0"), note=said)
        yield finish(increment, species, first, seen, ("dH0", *key))


_VERDICT = re.compile(r"(?:^|; )verdict on (Cp|Hf|dH0): ")


def _about(note: str, quantity: str) -> str:
    """What the note of a record says of one of its quantities: all but ``verdict on`` another one."""
    common, *verdicts = _VERDICT.split(note)
    said = [f"verdict: {text}" for what, text in zip(verdicts[::2], verdicts[1::2], strict=True) if what == quantity]
    return "; ".join(filter(None, (common, *said)))


def _interval(row: Row, a_columns: Sequence[str], b_columns: Sequence[str]) -> dict[str, Any]:
    tmin, tmax = range_of(row)

    def value(column: str) -> float:
        return row.read_number(row.needed(column, "a coefficient; write 0 if the record has 0"), column)

    return {"tmin": tmin, "tmax": tmax, "a": [value(c) for c in a_columns], "b": [value(c) for c in b_columns]}


def _is_reference(key: tuple[str, str, str], folder: Folder) -> bool:
    """Whether this is an element in its reference form, as the elements datum lists it."""
    datum = folder.datums.get(_ELEMENTS_DATUM)
    if datum is None:
        return True
    return any((z.species, z.phase, z.form) == key for stages in datum.schedule.values() for _, z in stages)


def _faults(record: Any, hf298: float | None) -> tuple[str, str]:
    """What the record's own checksums say against it: the level at 298.15 K, and the joints. "" where they agree."""
    level = ""
    if hf298 is not None and record.covers(T_STANDARD):
        off = h298_error(record, hf298)
        if abs(off) > H298_LIMIT:
            level = f"h(298.15 K) is {off:+.1f} J/mol off the stated formation enthalpy"
    open_joints = []
    for jump in record.jumps():  # the values just below a joint are those of the lower interval
        cp, h, s = (abs(float(f(jump.T))) for f in (record.cp, record.h, record.s))
        scales = {"cp": cp, "h": max(h, cp * jump.T), "s": max(s, cp)}  # h and s may pass through zero
        for name, scale in scales.items():
            off = getattr(jump, name) / scale
            if abs(off) > JOINT_LIMIT:
                open_joints.append(f"{name} by {off:.1e} at {jump.T:g} K")
    joints = f"intervals do not meet: {', '.join(open_joints)} (relative)" if open_joints else ""
    return level, joints
