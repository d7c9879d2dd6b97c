"""Streams: enthalpy flows, their total, and the duty between inlets and outlets."""

from __future__ import annotations

import math
from collections import defaultdict
from dataclasses import dataclass, field, replace
from threading import Lock
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from propdb.datum import may_sum
from propdb.errors import DatumMismatch
from propdb.levels.parts import add_parts, combined
from propdb.model.records import Part
from propdb.model.text import columns, visible, wrapped
from propdb.tables.scales import flow_unit
from propdb.units import format_number

if TYPE_CHECKING:
    from propdb.tables.core import Given, Plan, Rows

__all__ = ["IN", "OUT", "Streams", "flows_of", "reaction_between"]

IN, OUT = "in", "out"
_SIDES = {
    **dict.fromkeys(("in", "inlet", "input", "feed", "i"), IN),
    **dict.fromkeys(("out", "outlet", "output", "product", "o"), OUT),
}
#: A species whose flow differs by more than this between inlets and outlets has reacted [1].
REACTED = 1e-3
#: What is not below this is no flow, in any unit [1].
LARGEST = 1e18
#: A sensitivity that cancels to this share of its terms is rounding [1].
ROUNDING = 1e-9

_SIGNS = {IN: -1.0, OUT: 1.0}


@dataclass
class _Stream:
    name: str
    side: str
    watts: float = 0.0
    moles: float = 0.0  # [mol/s]
    mass: float = 0.0  # [kg/s]
    rows: int = 0
    lost: int = 0  # rows without an enthalpy or a flow


@dataclass
class _Sum:
    """The sensitivity of the duty to one entry, added up."""

    part: Part
    coefficient: float = 0.0  # out less in [mol/s x J/mol]
    size: float = 0.0  # the same without signs, to tell what cancels from rounding


@dataclass
class Streams:
    """Sums over all batches of a run.

    Parameters
    ----------
    plan : Plan
        A table with a flow column.
    across : bool
        Sum across a reaction whatever the datum.
    """

    plan: Plan
    across: bool = False
    found: dict[tuple[str, str], _Stream] = field(default_factory=dict)
    moles: dict[tuple[int, str], float] = field(default_factory=lambda: defaultdict(float))
    varying: dict[str, _Sum] = field(default_factory=dict)  # by entry, over the rows that vary with T
    negative: int = 0  # rows
    low: float = math.inf  # of the temperatures [K]
    high: float = -math.inf
    _lock: Lock = field(default_factory=Lock)

    def add(self, given: Given, rows: Rows, h: NDArray[np.float64]) -> None:
        """Add a batch; ``h`` on the datum wanted [the table's unit]."""
        flows, molar = flows_of(self.plan, given, rows)
        watts = flows * molar_enthalpy(self.plan, rows, h)
        lost = np.isnan(watts)
        names, name_texts = _texts(given, "stream", "all")
        sides, side_texts = _texts(given, "side", "")
        read = [_SIDES.get(text.strip().lower(), text.strip().lower()) for text in side_texts]
        codes = names * len(side_texts) + sides
        size = len(name_texts) * len(side_texts)
        sums = [
            np.bincount(codes, weights=np.where(lost, 0.0, w), minlength=size)
            for w in (watts, flows, flows * molar, np.ones(given.rows), lost)
        ]
        lost_count = np.bincount(codes, weights=lost, minlength=size)
        with self._lock:
            for code in np.flatnonzero(np.bincount(codes, minlength=size)).tolist():
                name, side = divmod(code, len(side_texts))
                key = (name_texts[name].strip(), read[side])
                stream = self.found.setdefault(key, _Stream(*key))
                stream.watts += float(sums[0][code])
                stream.moles += float(sums[1][code])
                stream.mass += float(sums[2][code])
                stream.rows += int(sums[3][code]) + int(lost_count[code])
                stream.lost += int(lost_count[code])
            self._by_species(given, rows, np.where(np.isnan(flows), 0.0, flows), lost, sides, read)
            self.negative += int(np.count_nonzero(flows < 0.0))
            t = given.temperature
            if t is not None and not np.isnan(t).all():
                self.low = min(self.low, float(np.nanmin(t)))
                self.high = max(self.high, float(np.nanmax(t)))

    def _by_species(
        self,
        given: Given,
        rows: Rows,
        flows: NDArray[np.float64],
        lost: NDArray[np.bool_],
        sides: NDArray[np.int32],
        read: list[str],
    ) -> None:
        """Amounts by kind of row and side, and the sensitivities of rows that vary with T."""
        if rows.mix is not None:
            x, numbers = rows.mix
        else:
            assert rows.kinds is not None
            x, numbers = np.ones((len(flows), 1)), rows.kinds[:, None]
        for place, side in enumerate(read):
            here = sides == place
            if not here.any():
                continue
            for column in range(x.shape[1]):
                weights = flows[here] * x[here, column]
                sums = np.bincount(numbers[here, column], weights=weights)
                for number in np.flatnonzero(sums).tolist():
                    self.moles[(number, side)] += float(sums[number])
        from propdb.tables.core import conditions

        signs = np.array([_SIGNS.get(side, 0.0) for side in read])[sides]
        weights = np.where(lost, 0.0, signs * flows)[:, None] * x
        varies = self.plan.arrays()[5]
        if not varies[numbers].any():
            return
        t, p = conditions(self.plan, given)
        for column in range(x.shape[1]):
            for number in np.unique(numbers[:, column]).tolist():
                varying = self.plan.kinds[number].varying
                here = np.flatnonzero((numbers[:, column] == number) & (weights[:, column] != 0.0))
                if varying is None or not len(here):
                    continue
                found = varying.sensitivities(t[here], None if p is None else p[here], self.plan.run)
                for entry, (part, coefficients) in found.items():
                    terms = weights[here, column] * coefficients
                    total = self.varying.setdefault(entry, _Sum(part))
                    total.coefficient += float(terms.sum())
                    total.size += float(np.abs(terms).sum())

    # -- results --------------------------------------------------------------------------------------------------

    def summary(self) -> dict[str, Any]:
        """Enthalpy flow of each stream, their totals and the duty [kW].

        Raises
        ------
        DatumMismatch
            A datum on which these enthalpies may not be summed, unless that was asked for.
        """
        plan = self.plan
        datum = plan.oracle.ask(lambda basis: basis.datum(plan.settings.to))
        temperatures = [self.low, self.high] if self.low <= self.high else None
        verdict = may_sum(datum, temperatures=temperatures)
        per_side: dict[str, dict[str, float]] = {IN: defaultdict(float), OUT: defaultdict(float)}
        for (number, side), moles in self.moles.items():
            species = plan.kinds[number].species
            if species is not None and side in per_side:
                per_side[side][species.name] += moles
        both = bool(per_side[IN]) and bool(per_side[OUT])
        changed = reaction_between(per_side[IN], per_side[OUT]) if both else []
        notes = []
        if both and changed and not verdict.reaction:
            if not self.across:
                own = f"{datum.name} gives each species its own zero, so its values add up only without one"
                raise DatumMismatch(
                    f"inlets and outlets differ in {', '.join(changed[:4])}: there is a reaction, and "
                    f"{own if datum.kind == 'own' else verdict.why}",
                    hint="convert --to elements-298K or a basis datum; --across sums all the same",
                )
            notes.append(f"summed across a reaction on request; {verdict.why}")
        elif not verdict.streams and not self.across:
            raise DatumMismatch(verdict.why, hint="convert --to elements-298K; --across sums all the same")
        totals = {side: sum(s.watts for s in self.found.values() if s.side == side) for side in (IN, OUT)}
        lost = sum(s.lost for s in self.found.values())
        strange = sorted({s.side for s in self.found.values()} - {IN, OUT, ""})
        if both and strange:
            notes.append(f"neither in nor out, and in no total: side {', '.join(map(repr, strange[:4]))}")
        if both and any(not s.side for s in self.found.values()):
            notes.append("streams without a side are in no total")
        if self.negative:
            rows = (
                "1 row has a negative flow, which is"
                if self.negative == 1
                else f"{self.negative} rows have negative flows, which are"
            )
            notes.append(f"{rows} added up with the sign")
        if lost:
            rows = "1 row" if lost == 1 else f"{lost} rows"
            notes.append(f"{rows} without an enthalpy or a flow left out, so totals and duty are incomplete")
        if changed:
            notes.append(f"a reaction: inlets and outlets differ in {', '.join(changed[:8])}")
            notes += self._unbalanced(per_side)
        found: dict[str, Any] = {
            "datum": plan.settings.to,
            "may_sum": verdict.why,
            "streams": [
                {
                    "stream": s.name,
                    "side": s.side or None,
                    "enthalpy_flow": s.watts / 1e3,
                    "flow_amount": s.moles,
                    "flow_mass": s.mass,
                    "rows": s.rows,
                    "rows_left_out": s.lost,
                }
                for s in self.found.values()
            ],
            "units": {"enthalpy_flow": "kW", "flow_amount": "mol/s", "flow_mass": "kg/s", "duty": "kW"},
            "total": sum(s.watts for s in self.found.values()) / 1e3,
            "reaction": bool(changed),
            "notes": notes,
        }
        if both:
            standard, missing = self._duty_uncertainty()
            rest = f"; the other entries make standard {format_number(standard / 1e3, significant=2)} kW"
            given = "flows and temperatures" if plan.settings.evaluate else "flows and given enthalpies"
            found |= {
                "total_in": totals[IN] / 1e3,
                "total_out": totals[OUT] / 1e3,
                "duty": (totals[OUT] - totals[IN]) / 1e3,
                "duty_uncertainty": None if missing else standard / 1e3,
                "duty_uncertainty_note": f"not stated by {', '.join(missing)}{rest if standard else ''}"
                if missing
                else f"standard, of the data alone; that of {given} is not in it",
            }
        return found

    def _duty_uncertainty(self) -> tuple[float, list[str]]:
        """Standard uncertainty of the duty [W], entry by entry, and the sources that state none, with the entries."""
        parts = [
            Part(p.entry, p.coefficient * _SIGNS[side] * moles, p.standard, p.stated)
            for (number, side), moles in self.moles.items()
            if side in _SIGNS
            for p in self.plan.kinds[number].parts
        ]
        parts += [
            replace(total.part, coefficient=total.coefficient)
            for total in self.varying.values()
            if abs(total.coefficient) > ROUNDING * total.size
        ]
        standard, missing = combined(add_parts(parts))
        origins: dict[str, str] = {}
        for kind in self.plan.kinds:
            origins |= kind.used().origins
        by_source: dict[str, list[str]] = {}
        for entry in missing:
            by_source.setdefault(origins.get(entry, "entry"), []).append(entry[:8])
        return standard, [f"{key} [{_few(ids)}]" for key, ids in by_source.items()]

    def _unbalanced(self, per_side: dict[str, dict[str, float]]) -> list[str]:
        """Elements whose flows differ between inlets and outlets."""
        composition = {k.species.name: k.species.composition for k in self.plan.kinds if k.species is not None}
        flows: dict[str, dict[str, float]] = {IN: defaultdict(float), OUT: defaultdict(float)}
        for side, species in per_side.items():
            for name, moles in species.items():
                for element, count in composition[name]:
                    flows[side][element] += moles * float(count)
        off = [
            f"{element} {flows[IN][element]:.5g} in, {flows[OUT][element]:.5g} out mol/s"
            for element in sorted({*flows[IN], *flows[OUT]})
            if abs(flows[IN][element] - flows[OUT][element]) > REACTED * max(flows[IN][element], flows[OUT][element])
        ]
        return [f"the elements do not balance: {'; '.join(off)}"] if off else []


def _few(ids: list[str]) -> str:
    return " ".join(ids) if len(ids) <= 8 else f"{' '.join(ids[:6])} and {len(ids) - 6} more"


def reaction_between(inlets: dict[str, float], outlets: dict[str, float]) -> list[str]:
    """Species whose flows [mol/s] differ between inlets and outlets."""
    biggest = max((*inlets.values(), *outlets.values()), default=0.0)
    return [
        name
        for name in dict.fromkeys((*inlets, *outlets))
        if abs(inlets.get(name, 0.0) - outlets.get(name, 0.0))
        > REACTED * max(inlets.get(name, 0.0), outlets.get(name, 0.0), 1e-3 * biggest)
    ]


def flows_of(plan: Plan, given: Given, rows: Rows) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Amount flows [mol/s] and molar masses [kg/mol] of rows."""
    column = plan.layout.get("flow")
    assert column is not None
    assert given.flow is not None
    unit = flow_unit(column.unit, column.name)
    if rows.mix is not None:
        x, numbers = rows.mix
        molar = (x * _molar(plan)[numbers]).sum(axis=1)
    else:
        assert rows.kinds is not None
        molar = _molar(plan)[rows.kinds]
    flows = np.where(np.abs(given.flow) < LARGEST, given.flow, math.nan) * unit.factor
    return (flows / molar if unit.mass else flows), molar


def _molar(plan: Plan) -> NDArray[np.float64]:
    return np.array([math.nan if k.species is None else k.species.molar_mass for k in plan.kinds])


def molar_enthalpy(plan: Plan, rows: Rows, h: NDArray[np.float64]) -> NDArray[np.float64]:
    """Enthalpies in J/mol, from the table's unit."""
    found: NDArray[np.float64] = h * rows.scale
    return found


def _texts(given: Given, role: str, none: str) -> tuple[NDArray[np.int32], list[str]]:
    if role not in given.keys:
        return np.zeros(given.rows, np.int32), [none]
    codes, texts = given.keys[role]
    return codes, [none if text is None else text for text in texts]


def lines(found: dict[str, Any]) -> list[str]:
    """The summary for a person."""
    shown = [f"enthalpy flows on {found['datum']}"]
    rows = [
        (visible(s["stream"]), visible(s["side"] or ""), f"{s['enthalpy_flow']:.3f}", "kW") for s in found["streams"]
    ]
    if "duty" not in found:
        rows.append(("total", "", f"{found['total']:.3f}", "kW"))
    else:
        uncertainty = found["duty_uncertainty"]
        size = f"kW ± {uncertainty:.2g} (standard)" if uncertainty is not None else "kW"
        rows += [("total", side, f"{found[f'total_{side}']:.3f}", "kW") for side in (IN, OUT)]
        rows.append(("duty, out less in", "", f"{found['duty']:.3f}", size))
    shown += columns(rows, right=(2,), indent=2, headed=False)
    notes = list(found["notes"])
    if found.get("duty_uncertainty", 0.0) is None:
        notes.insert(0, f"the uncertainty of the duty is {found['duty_uncertainty_note']}")
    return shown + [line for note in notes for line in wrapped(note, "  ", "    ")]
