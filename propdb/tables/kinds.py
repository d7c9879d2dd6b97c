"""What one kind of row needs: one species, on one datum, in one phase, moved to another datum or evaluated on it."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, NamedTuple

from propdb.errors import OutOfRange, PropdbError
from propdb.levels.answers import Derivation, Member, net, zero_members
from propdb.levels.engine import Levels
from propdb.levels.typed import read_phase
from propdb.model.records import SAME_T, Datum, Part, Source, Species, State
from propdb.units import EnthalpyUnit, parse_unit

if TYPE_CHECKING:
    from propdb.tables.oracle import Basis
    from propdb.tables.varying import Used, Varying

__all__ = ["BAD_ROW", "EXTRAPOLATED", "NO_DATA", "OK", "Key", "Kind", "Point", "make_kind", "one_line", "shift_at"]

OK, EXTRAPOLATED, NO_DATA, BAD_ROW = "ok", "extrapolated", "no data", "bad row"

_J_MOL = parse_unit("J/mol")
_NAN = float("nan")


class Key(NamedTuple):
    """A kind of row as it is written in the table; ``datum`` is "" where rows are evaluated and not converted."""

    species: str
    datum: str
    phase: str
    form: str


class Point(NamedTuple):
    """A shift (or an enthalpy) at one temperature."""

    value: float  # [J/mol]
    standard: float  # [J/mol], NaN where an entry states none
    extrapolated: bool
    parts: tuple[Part, ...]
    entries: tuple[str, ...]
    sources: Mapping[str, Source]
    origins: Mapping[str, str]  # source of each entry
    warnings: tuple[str, ...]
    legs: int


@dataclass(frozen=True)
class Kind:
    """One kind of row, resolved.

    Attributes
    ----------
    flag, reason
        What its rows are flagged with; a reason where the flag is not ``ok``.
    value : float
        What is added to the number of the table, Z_A - Z_B [J/mol]; NaN where it depends on T, or where there is none.
    standard : float
        Standard uncertainty of that [J/mol]; NaN where an entry states none.
    scale : float
        One of the table's unit [J/mol].
    varying
        The shift, or the enthalpy itself, as a function of T.
    """

    key: Key
    flag: str
    reason: str = ""
    species: Species | None = None
    datum: str = ""
    value: float = _NAN
    standard: float = _NAN
    scale: float = _NAN
    parts: tuple[Part, ...] = ()
    entries: tuple[str, ...] = ()
    sources: Mapping[str, Source] = field(default_factory=dict)
    origins: Mapping[str, str] = field(default_factory=dict)  # source of each entry
    warnings: tuple[str, ...] = ()
    near: tuple[str, ...] = ()  # what an unknown name may have meant
    unknown: bool = False
    varying: Varying | None = None

    def used(self) -> Used:
        """The entries and sources of its rows so far."""
        from propdb.tables.varying import Used

        found = Used(dict.fromkeys(self.entries), dict(self.sources), dict(self.origins))
        if self.varying is not None:
            found.add(self.varying.used)
        return found


def one_line(error: PropdbError) -> str:
    """An error as the reason of a row."""
    return " ".join(str(error).split())


def _cancel(plus: list[Member], minus: list[Member]) -> tuple[list[Member], list[Member]]:
    rest, kept = list(minus), []
    for member in plus:
        if member in rest:
            rest.remove(member)
        else:
            kept.append(member)
    return kept, rest


def _point(
    levels: Levels,
    plus: Sequence[Member],
    minus: Sequence[Member],
    before: float,
    after: float,
    *,
    judged: bool = False,
) -> Point:
    """``before + after + levels``, added in the order of the scalar answers, so that the results are the same.

    ``judged``: with the warning where other sources contradict it, which takes longer than the rest.
    """
    derived = Derivation(levels, net(levels, plus, minus), per=1.0, unit=_J_MOL)
    standard, _ = derived.uncertainty()
    ids = [p.entry for p in derived.parts] + [leg.entry for leg in derived.legs]
    return Point(
        value=before + derived.total() + after,
        standard=_NAN if standard is None else standard,
        extrapolated=any(leg.extrapolated for leg in derived.legs),
        parts=derived.parts,
        entries=tuple(dict.fromkeys(i for i in ids if i)),
        sources=derived.sources(),
        origins={leg.entry: leg.source for leg in derived.legs if leg.entry},
        warnings=tuple(derived.warnings(judged=judged)),
        legs=len(derived.legs),
    )


def shift_at(
    levels: Levels,
    species: Species,
    source: Datum,
    target: Datum,
    *,
    phase: str,
    temperature: float | None,
    judged: bool = False,
) -> Point:
    """Z_A - Z_B with h0 of both [J/mol]: what an enthalpy of a species gains when its datum becomes another.

    ``temperature`` in K, needed by same-temperature datums only. Raises as :func:`propdb.levels.answers.convert`.
    """
    plus = zero_members(levels, source, species, phase=phase, temperature=temperature)
    minus = zero_members(levels, target, species, phase=phase, temperature=temperature)
    offsets = [
        levels.offset(
            levels.zero_of(d, species, phase=phase, temperature=temperature), species, temperature=temperature
        )
        for d in (source, target)
    ]
    return _point(levels, *_cancel(plus, minus), 0.0 - offsets[0] + offsets[1], 0.0, judged=judged)


def enthalpy_at(levels: Levels, species: Species, state: State, target: Datum) -> Point:
    """Enthalpy of a state on a datum [J/mol]. Raises as :func:`propdb.levels.answers.enthalpy`."""
    state = levels.check(species.name, state)
    t = state.temperature
    minus = zero_members(levels, target, species, phase=state.phase, temperature=t)
    z = levels.zero_of(target, species, phase=state.phase, temperature=t)
    offset = levels.offset(z, species, temperature=t)
    return _point(levels, [(1.0, species.name, state)], minus, 0.0, offset)


def make_kind(
    basis: Basis, key: Key, *, to: str, unit: EnthalpyUnit, evaluate: bool, saturated: str = "", has_t: bool = True
) -> Kind:
    """Resolve one kind of row; what goes wrong becomes its flag and reason, never an error.

    Parameters
    ----------
    basis : Basis
        The store.
    key : Key
        As written in the table.
    to : str
        Datum wanted.
    unit : EnthalpyUnit
        Of the table.
    evaluate : bool
        Compute the enthalpy, rather than shift one.
    saturated : str
        ``liquid`` or ``vapour``, of the real fluid.
    has_t : bool
        Whether the table has temperatures.
    """
    from propdb.tables.varying import vary_enthalpy, vary_shift

    levels = basis.levels
    target = basis.datum(to)
    if not key.species or not (key.datum or evaluate):
        return Kind(key, BAD_ROW, "no species" if not key.species else "no datum")
    try:
        species = basis.species(key.species)
        phase = read_phase(key.phase) if key.phase else "g"
        source = target if evaluate else basis.datum(key.datum)
        scale = unit.scale(molar_mass=species.molar_mass)
    except PropdbError as error:
        near = error.fields.get("candidates", ())
        return Kind(key, BAD_ROW, one_line(error), near=tuple(str(n) for n in near), unknown=True)
    common = {"key": key, "species": species, "datum": source.name, "scale": scale}
    try:
        if evaluate:
            if not key.phase:
                return Kind(flag=BAD_ROW, reason="no phase", **common)  # type: ignore[arg-type]
            varying = vary_enthalpy(basis, species, target, phase=phase, form=key.form, saturated=saturated)
            return Kind(flag=OK, varying=varying, **common)  # type: ignore[arg-type]
        if SAME_T in (source.temperature, target.temperature):
            if not has_t:
                name = target.name if target.temperature == SAME_T else source.name
                reason = f"{name} has its zero at the temperature of the state, and the table has no temperatures"
                return Kind(flag=BAD_ROW, reason=reason, **common)  # type: ignore[arg-type]
            return Kind(flag=OK, varying=vary_shift(basis, species, source, target, phase=phase), **common)  # type: ignore[arg-type]
        point = shift_at(levels, species, source, target, phase=phase, temperature=None, judged=True)
    except PropdbError as error:
        return Kind(flag=NO_DATA, reason=one_line(error), **common)  # type: ignore[arg-type]
    flag = EXTRAPOLATED if point.extrapolated else OK
    reason = next((w for w in point.warnings if "extrapolated" in w), "") if point.extrapolated else ""
    return Kind(
        flag=flag,
        reason=reason,
        value=point.value,
        standard=point.standard,
        parts=point.parts,
        entries=point.entries,
        sources=point.sources,
        origins=point.origins,
        warnings=point.warnings,
        **common,  # type: ignore[arg-type]
    )


def out_of_range(error: PropdbError) -> str:
    """The reason of rows that the data do not reach, without the temperature or pressure of one of them."""
    if isinstance(error, OutOfRange) and error.hint:
        return f"outside the data; {error.hint}"
    return one_line(error)


def finite(value: float) -> float | None:
    """A number, or None where it is not finite."""
    return value if math.isfinite(value) else None
