"""Tracks: what a state moves along without changing phase.

A ``Curve`` is the composite heat-capacity curve of one phase and form, put together from the best entries over their
ranges. ``Formulation`` is water's real fluid, liquid included. Both give the legs between two of their positions.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field, replace
from typing import Any, NamedTuple, Protocol

from propdb.errors import SplitError, TemperatureOutOfRange
from propdb.levels import residual, water
from propdb.levels.parts import Leg
from propdb.levels.policy import Policy, choose
from propdb.model.records import Entry, Part, State

__all__ = ["Critical", "Curve", "Formulation", "Piece", "Track", "build_curve", "celsius"]

#: A range printed as 298 K is meant to hold at 298.15 K, and 373 K at 373.15 K.
PRINTED_SLACK = 0.155

#: Boiling points of different tables differ by this much [K]; the pressure term over it is below 0.1 J/mol.
BOILING_SLACK = 0.5


def celsius(t: float) -> str:
    """Temperature as an engineer reads it: ``600 °C`` or, at standard temperatures, in kelvin too."""
    return f"{t:.7g} K"


class Critical(NamedTuple):
    """Critical point and acentric factor, with the entries that give them. [K], [Pa], [1]."""

    tc: float
    pc: float
    omega: float
    entries: tuple[str, ...]
    source: str


class Track(Protocol):
    """Something with positions along which enthalpy is known."""

    def legs(self, start: Any, end: Any) -> list[Leg]: ...


#: A range that ends within this part of a phase change's temperature ends at it: tables round it, or have another one.
#: What is missing is some hundredth of a latent heat at most, and the leg says it.
CHANGE_SLACK = 0.01

#: A transition belongs to the split of a table whose temperature differs by no more than this [K].
SPLIT_SLACK = 2.0


@dataclass(frozen=True, slots=True)
class Piece:
    """One entry of a composite curve over the part of its range where it is the best.

    ``side`` numbers the sides of a table that a doubled temperature splits.
    """

    tmin: float
    tmax: float
    entry: Entry
    equation: Any
    side: int = 0


@dataclass(frozen=True, slots=True)
class Split:
    """A doubled temperature of a table within a curve, and the entry that states its enthalpy, if one does."""

    temperature: float
    stated: Entry | None = None


def range_text(ranges: Sequence[tuple[float, float]]) -> str:
    """``200 to 6000 K and 7000 to 8000 K``."""
    return " and ".join(f"{a:.6g} to {b:.6g} K" if a != b else f"{a:.6g} K only" for a, b in ranges)


@dataclass(frozen=True)
class Curve:
    """Composite heat-capacity curve of one phase and form."""

    species: str
    phase: str
    form: str
    pieces: tuple[Piece, ...]
    policy: Policy = field(repr=False)
    splits: tuple[Split, ...] = ()
    boiling: float | None = None  # [K], of a liquid: above it the curve runs along saturation
    critical: Critical | None = None
    extrapolate: bool = False

    def ranges(self) -> list[tuple[float, float]]:
        """Merged ranges that the entries state [K]."""
        merged: list[tuple[float, float]] = []
        for piece in self.pieces:
            if merged and piece.tmin <= merged[-1][1] + 1e-9:
                merged[-1] = (merged[-1][0], max(merged[-1][1], piece.tmax))
            else:
                merged.append((piece.tmin, piece.tmax))
        return merged

    def covers(self, t1: float, t2: float | None = None) -> bool:
        """Do the stated ranges cover ``t1`` (and all up to ``t2``) without a gap or an unstated split?"""
        low, high = (t1, t1) if t2 is None else (min(t1, t2), max(t1, t2))
        if any(split.stated is None for split in self.between(low, high)):
            return False
        return any(a - PRINTED_SLACK <= low and high <= b + PRINTED_SLACK for a, b in self.ranges())

    def legs(self, start: float, end: float) -> list[Leg]:
        """Legs from ``start`` to ``end`` [K].

        Raises TemperatureOutOfRange outside the ranges unless the curve was built to extrapolate.
        """
        if start == end:
            return []
        covered = self.covers(start, end)
        if not covered and not self.extrapolate:
            unknown = next((s for s in self.between(min(start, end), max(start, end)) if s.stated is None), None)
            if unknown is not None:
                raise self.split_error(unknown.temperature)
            raise self.out_of_range(start if not self.covers(start) else end)
        low, high = min(start, end), max(start, end)
        crossed = list(self.between(low, high))
        unknown = next((split for split in crossed if split.stated is None), None)
        if unknown is not None:
            raise self.split_error(unknown.temperature)
        legs = []
        for piece, a, b in self._cuts(low, high):
            while crossed and crossed[0].temperature <= a:
                legs.append(self._transition_leg(crossed.pop(0)))
            legs.append(self._leg(piece, a, b))
        legs += [self._transition_leg(split) for split in crossed]
        if self.phase == "l" and self.boiling is not None and high > self.boiling + BOILING_SLACK:
            legs.append(self._saturation_leg(max(low, self.boiling), high))
        if end > start:
            return legs
        from propdb.levels.parts import scale

        return [scale(leg, -1.0) for leg in reversed(legs)]

    def between(self, low: float, high: float) -> Iterator[Split]:
        """Splits from ``low`` up to ``high`` [K]; a state at a split belongs to the side below."""
        return (split for split in self.splits if low <= split.temperature < high)

    def split_error(self, t: float) -> SplitError:
        """The enthalpy across a split is not known."""
        return SplitError(
            f"{self.species}, {self.phase}: the table of heat capacities is split at {t:g} K and the enthalpy of the "
            "transition is not stated",
            hint="add an entry Htr at that temperature (0 if there is none), or stay on one side",
            T=t,
        )

    def _transition_leg(self, split: Split) -> Leg:
        entry = split.stated
        assert entry is not None
        assert entry.value is not None
        size, unit, stated = self.policy.standard(entry)
        return Leg(
            what="transition",
            species=self.species,
            start=f"{self.phase}, {celsius(split.temperature)}",
            end=f"{self.phase}, {celsius(split.temperature)}",
            value=entry.value,
            parts=(Part(entry.id, entry.value if unit == "%" else 1.0, size, stated),),
            entry=entry.id,
            source=entry.source,
            note=f"the split of the table at {split.temperature:g} K",
        )

    def out_of_range(self, t: float) -> TemperatureOutOfRange:
        name = f"{self.phase} ({self.form})" if self.form else self.phase
        return TemperatureOutOfRange(
            f"{self.species}, {name}: the heat capacity does not reach {t:.7g} K",
            hint=f"it covers {range_text(self.ranges())}; --extrapolate allows it, and marks it",
            ranges=self.ranges(),
        )

    def _cuts(self, low: float, high: float) -> list[tuple[Piece, float, float]]:
        """Which piece serves which stretch; gaps and ends go to the nearest piece."""
        cuts: list[tuple[Piece, float, float]] = []
        for i, piece in enumerate(self.pieces):
            a = low if i == 0 else self._border(i - 1)
            b = high if i == len(self.pieces) - 1 else self._border(i)
            a, b = max(a, low), min(b, high)
            if b > a:
                cuts.append((piece, a, b))
        return cuts

    def _border(self, i: int) -> float:
        left, right = self.pieces[i], self.pieces[i + 1]
        return left.tmax if right.tmin <= left.tmax else 0.5 * (left.tmax + right.tmin)

    def _leg(self, piece: Piece, a: float, b: float) -> Leg:
        entry = piece.entry
        try:
            value = float(piece.equation.dh(a, b))
        except SplitError as error:
            raise SplitError(
                f"{self.species}, {self.phase}: {error.problem}", hint=error.hint, **error.fields
            ) from None
        size, unit, stated = self.policy.standard(entry)
        coefficient = value if unit == "%" else b - a
        outside = a < piece.tmin - PRINTED_SLACK or b > piece.tmax + PRINTED_SLACK
        phase = f"{self.phase} ({self.form})" if self.form else self.phase
        note = ""
        if outside:
            note = f"extrapolated: {piece.entry.source} covers {range_text([(piece.tmin, piece.tmax)])}"
        elif a < float(entry.tmin or 0.0) - PRINTED_SLACK or b > float(entry.tmax or 0.0) + PRINTED_SLACK:
            stated_range = range_text([(float(entry.tmin or 0.0), float(entry.tmax or 0.0))])
            note = f"taken to the phase change: {entry.source} covers {stated_range}"
        return Leg(
            what="heating",
            species=self.species,
            start=f"{phase}, {celsius(a)}",
            end=f"{phase}, {celsius(b)}",
            value=value,
            parts=(Part(entry.id, coefficient, size, stated),),
            entry=entry.id,
            source=entry.source,
            extrapolated=outside,
            note=note,
            span=(a, b),
        )

    def _saturation_leg(self, a: float, b: float) -> Leg:
        """The pressure rises along saturation: the integral of a heat capacity is not by itself an enthalpy."""
        if self.critical is None:
            return Leg(
                what="pressure along saturation",
                species=self.species,
                start=f"l, {celsius(a)}",
                end=f"l, {celsius(b)}",
                value=0.0,
                note="not computed: needs Tc, Pc and omega",
            )
        isobaric = "saturat" not in self.pieces[-1].entry.conditions
        c = self.critical
        value = residual.liquid_pressure_term(
            start=a, end=min(b, 0.995 * c.tc), tc=c.tc, pc=c.pc, omega=c.omega, isobaric=isobaric
        )
        return Leg(
            what="pressure along saturation",
            species=self.species,
            start=f"l, {celsius(a)}",
            end=f"l, {celsius(b)}",
            value=value,
            parts=(Part(f"model:saturation:{self.species}", value, 0.3, True),),
            source=c.source,
            note="integral of v(1 - aT) dp, v by Yamada-Gunn, p by Lee-Kesler: a model, standard uncertainty 30 %",
        )


def build_curve(
    species: str,
    phase: str,
    form: str,
    entries: Sequence[Entry],
    policy: Policy,
    *,
    extrapolate: bool = False,
    boiling: float | None = None,
    critical: Critical | None = None,
    transitions: Sequence[Entry] = (),
    changes: Sequence[float] = (),
) -> Curve | None:
    """The composite curve: at each temperature the best usable entry whose range covers it. None where there is none.

    A table with a doubled temperature serves side by side; the enthalpy between the sides is what an entry of
    ``transitions`` states, best first, and otherwise nobody's guess. A heat capacity given at one temperature only is a
    curve of no length: it serves when extrapolation is asked for. A range that ends within 1 % of a phase
    change (``changes`` [K]) is taken to reach it.
    """
    usable = [e for e in choose(entries, policy) if e.equation and e.equation != "iapws95"]
    spans = [side for e in usable if e.tmin is not None and e.tmax is not None for side in _sides(e)]
    if not spans and extrapolate:
        points = [e for e in choose(entries, policy) if not e.equation and e.value is not None]
        spans = [Piece(e.temperature or 298.15, e.temperature or 298.15, e, None) for e in points[:1]]
    if not spans:
        return None
    marks = sorted({t for span in spans for t in (span.tmin, span.tmax)})
    pieces: list[Piece] = []
    stretches = list(zip(marks, marks[1:], strict=False)) or [(marks[0], marks[0])]
    for a, b in stretches:
        best = next((span for span in spans if span.tmin <= a and b <= span.tmax), None)
        if best is None:
            continue
        last = pieces[-1] if pieces else None
        if last is not None and last.entry.id == best.entry.id and last.side == best.side and last.tmax == a:
            pieces[-1] = replace(last, tmax=b)
        else:
            pieces.append(Piece(a, b, best.entry, best.equation or _equation(best.entry), best.side))
    pieces = _reaching(pieces, changes)
    splits = tuple(
        Split(a.tmax, _stated(a.tmax, transitions))
        for a, b in zip(pieces, pieces[1:], strict=False)
        if a.entry.id == b.entry.id and a.side != b.side and a.tmax == b.tmin
    )
    return Curve(
        species,
        phase,
        form,
        tuple(pieces),
        policy,
        splits=splits,
        boiling=boiling,
        critical=critical,
        extrapolate=extrapolate,
    )


def _reaching(pieces: list[Piece], changes: Sequence[float]) -> list[Piece]:
    """The pieces, the first and the last one as far as a phase change that lies just beyond."""
    low, high = pieces[0].tmin, pieces[-1].tmax
    if low == high:
        return pieces
    before = [t for t in changes if (1.0 - CHANGE_SLACK) * low <= t < low]
    after = [t for t in changes if high < t <= (1.0 + CHANGE_SLACK) * high]
    if before:
        pieces[0] = replace(pieces[0], tmin=min(before))
    if after:
        pieces[-1] = replace(pieces[-1], tmax=max(after))
    return pieces


def _sides(entry: Entry) -> list[Piece]:
    """The entry over its range; a table with doubled temperatures in its sides."""
    nodes = entry.params.get("T", ()) if entry.equation == "table" else ()
    if len(set(nodes)) < len(nodes):
        from propdb.cp.registry import build_heat_capacity

        table: Any = build_heat_capacity(entry.equation, entry.params)
        if table.unstated:
            return [Piece(part.tmin, part.tmax, entry, part, side) for side, part in enumerate(table.parts())]
    return [Piece(float(entry.tmin or 0.0), float(entry.tmax or 0.0), entry, None)]


def _stated(t: float, transitions: Sequence[Entry]) -> Entry | None:
    """The entry that states the enthalpy of the split at ``t`` [K]: the nearest in temperature, the best of these."""
    near = [
        (abs(e.temperature - t), place, e)
        for place, e in enumerate(transitions)
        if e.value is not None and e.temperature is not None and abs(e.temperature - t) <= SPLIT_SLACK
    ]
    return min(near, key=lambda item: item[:2])[2] if near else None


def _equation(entry: Entry) -> Any:
    from propdb.cp.registry import build_heat_capacity

    if entry.equation:
        return build_heat_capacity(entry.equation, entry.params)
    at = entry.temperature or 298.15
    return build_heat_capacity("constant", {"value": entry.value, "tmin": at, "tmax": at})


@dataclass(frozen=True)
class Formulation:
    """Water's liquid and real fluid by IAPWS-95. Positions are states (``l``, or ``fluid``), or the ideal gas ``g``."""

    species: str
    entry: Entry
    policy: Policy = field(repr=False)

    def h(self, state: State) -> float:
        """Enthalpy of a state on the formulation's own zero [J/mol]."""
        t = state.temperature
        if t is None:
            if state.pressure is None:
                raise TemperatureOutOfRange("the state of water has neither temperature nor pressure")
            t = water.saturation_temperature(pressure=state.pressure)
        if state.phase == "g":
            return water.gas_enthalpy(temperature=t)
        if state.phase == "l" and not state.saturated and state.pressure is None:
            return water.liquid_enthalpy(temperature=t)
        if state.phase == "l" and state.saturated != "liquid" and state.pressure is not None:
            return water.pressed_liquid_enthalpy(temperature=t, pressure=state.pressure, slack=BOILING_SLACK)
        return water.enthalpy(temperature=t, pressure=state.pressure, saturated=state.saturated)

    def legs(self, start: State, end: State) -> list[Leg]:
        """One leg, the difference of two values of the formulation."""
        if start == end:
            return []
        value = self.h(end) - self.h(start)
        size, unit, stated = self.policy.standard(self.entry)
        return [
            Leg(
                what="formulation",
                species=self.species,
                start=start.text(),
                end=end.text(),
                value=value,
                parts=(Part(self.entry.id, value if unit == "%" else 1.0, size, stated),),
                entry=self.entry.id,
                source=self.entry.source,
            )
        ]
