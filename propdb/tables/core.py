"""The core of all table work: one plan, and one function on Arrow record batches.

::

    plan = Plan(oracle, settings, layout)          # or Store._plan
    out = convert_batch(batch, plan)               # any number of times, in any order, in any process

A plan can be pickled; where it arrives, the store is opened anew.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass
from threading import Lock
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from propdb.tables.columns import Layout
from propdb.tables.kinds import BAD_ROW, OK, Key, Kind, make_kind
from propdb.tables.oracle import Oracle
from propdb.tables.varying import FloatArray, Shared
from propdb.units import EnthalpyUnit

__all__ = ["Given", "Plan", "Rows", "Settings", "added_names", "compute", "convert_batch"]

Columns = tuple[int, FloatArray, FloatArray, FloatArray, NDArray[np.int32], NDArray[np.bool_]]

_MOST_REASONS = 10_000
_MOST_KINDS = 100_000


@dataclass(frozen=True)
class Settings:
    """What is asked of a table. Temperatures in K, pressures in Pa."""

    to: str
    unit: EnthalpyUnit
    evaluate: bool = False
    species: str | None = None
    datum: str | None = None
    phase: str = ""
    form: str = ""
    temperature: float | None = None
    pressure: float | None = None
    saturated: str = ""
    digits: int | None = None
    dry: bool = False


class Given(NamedTuple):
    """The columns of one batch that matter, read: what :func:`compute` starts from."""

    rows: int
    keys: dict[str, tuple[NDArray[np.int32], list[str | None]]]  # role -> (places, texts with None last)
    temperature: FloatArray | None = None  # [K], NaN where there is none
    pressure: FloatArray | None = None  # [Pa]
    fractions: FloatArray | None = None  # rows x components, as given
    flow: FloatArray | None = None  # in the unit of its column


class Rows(NamedTuple):
    """Per row: the shift (or, evaluating, the enthalpy) and its standard uncertainty, the scale, the verdict."""

    value: FloatArray  # [J/mol], NaN where there is none
    standard: FloatArray  # [J/mol], NaN where not stated
    scale: FloatArray | float  # one of the table's unit [J/mol]
    verdicts: NDArray[np.int32]
    kinds: NDArray[np.int32] | None  # None for mixtures
    constant: bool  # everything follows from the kind of row
    mix: tuple[FloatArray, NDArray[np.int32]] | None = None  # amount fractions and kinds of the components


class Plan:
    """Settings, columns and everything found out so far about the kinds of rows. May be used from several threads.

    Parameters
    ----------
    oracle : Oracle
        Answers about the store.
    settings : Settings
        What is asked.
    layout : Layout
        Which column is what.
    """

    def __init__(self, oracle: Oracle, settings: Settings, layout: Layout) -> None:
        self.oracle = oracle
        self.settings = settings
        self.layout = layout
        self.kinds: list[Kind] = []
        self.users: dict[int, int] = {}
        self.varies = settings.evaluate  # has a kind of row turned up that depends on T?
        self.verdicts: list[tuple[str, str]] = [(OK, "")]
        self._numbers: dict[tuple[str, str], int] = {(OK, ""): 0}
        self._index: dict[Key, int] = {}
        self._lock = Lock()
        empty = np.empty(0)
        self._arrays: Columns = (0, empty, empty, empty, np.empty(0, np.int32), np.empty(0, np.bool_))

    def __reduce__(self) -> tuple[type[Plan], tuple[Oracle, Settings, Layout]]:
        return (Plan, (self.oracle, self.settings, self.layout))

    @property
    def stamp(self) -> str:
        """Content hash and log head of the store."""
        return self.oracle.ask(lambda basis: basis.stamp)

    def run(self, question: Callable[[], Any]) -> Any:
        """Call a function in the thread of the oracle."""
        return self.oracle.ask(lambda _: question())

    def verdict(self, flag: str, reason: str = "") -> int:
        """The number of a flag with its reason."""
        pair = (flag, reason)
        number = self._numbers.get(pair)
        if number is None:
            with self._lock:
                if len(self.verdicts) > _MOST_REASONS and reason:
                    pair = (flag, "one of very many reasons")
                number = self._numbers.get(pair)
                if number is None:
                    self.verdicts.append(pair)
                    number = self._numbers[pair] = len(self.verdicts) - 1
        return number

    def kinds_of(self, keys: Sequence[Key]) -> NDArray[np.int32]:
        """Numbers of kinds of rows; those not seen before are resolved."""
        index = self._index
        missing = [key for key in dict.fromkeys(keys) if key not in index]
        if missing:
            self.oracle.ask(lambda basis: self._resolve(basis, missing))
        return np.array([index[key] for key in keys], np.int32)

    def adopt(self, kinds: Iterable[Kind]) -> None:
        """Take over kinds of rows that another plan on the same store has resolved."""
        for kind in kinds:
            if kind.key not in self._index:
                self.kinds.append(kind)
                self._index[kind.key] = len(self.kinds) - 1

    def _resolve(self, basis: Any, keys: Sequence[Key]) -> None:
        settings = self.settings
        has_t = self.layout.get("temperature") is not None or settings.temperature is not None
        for key in keys:
            if key in self._index:
                continue
            if len(self.kinds) >= _MOST_KINDS:
                kind = Kind(key, BAD_ROW, "too many different names in one table", unknown=True)
            else:
                kind = make_kind(
                    basis,
                    key,
                    to=settings.to,
                    unit=settings.unit,
                    evaluate=settings.evaluate,
                    saturated=settings.saturated,
                    has_t=has_t,
                )
            if kind.varying is not None:
                self.varies = True
                for equation in kind.varying.equations():
                    self.users[equation] = self.users.get(equation, 0) + 1
            self.kinds.append(kind)
            self._index[key] = len(self.kinds) - 1

    def arrays(self) -> Columns:
        """Over the kinds: their number, value, standard, scale [J/mol], verdict, and whether they vary with T."""
        kinds = self.kinds
        if self._arrays[0] < len(kinds):
            some = kinds[:]
            self._arrays = (
                len(some),
                np.array([k.value for k in some]),
                np.array([k.standard for k in some]),
                np.array([k.scale for k in some]),
                np.array([self.verdict(k.flag, k.reason) for k in some], np.int32),
                np.array([k.varying is not None for k in some], np.bool_),
            )
        return self._arrays

    def number(self, given: Given, species: str | None) -> tuple[NDArray[np.int32], list[Key]]:
        """For each row the place of its key in a list of distinct keys, with ``species`` for all where given."""
        settings = self.settings
        fixed = {"species": species or settings.species, "datum": settings.datum, "phase": settings.phase}
        fixed["form"] = settings.form
        codes: NDArray[Any] = np.zeros(given.rows, np.int32)
        lists: list[tuple[str, list[str | None]]] = []
        size = 1
        for role, (places, texts) in given.keys.items():
            if role not in fixed:
                continue
            size *= len(texts)
            if size > 2**31 - 1 and codes.dtype == np.int32:
                codes = codes.astype(np.int64)
            codes = codes * codes.dtype.type(len(texts)) + places if lists else places
            lists.append((role, texts))
        if size <= 4 * given.rows + 1000:
            present = np.flatnonzero(np.bincount(codes, minlength=1))
            table = np.zeros(size, np.int32)
            table[present] = np.arange(len(present), dtype=np.int32)
            numbers = table[codes]
        else:
            present, inverse = np.unique(codes, return_inverse=True)
            numbers = inverse.astype(np.int32)
        keys = []
        for code in present.tolist():
            parts = dict(fixed)
            for role, texts in reversed(lists):
                code, place = divmod(code, len(texts))
                parts[role] = texts[place]
            keys.append(Key(*((parts[role] or "").strip() for role in Key._fields)))
        return numbers, keys


def compute(plan: Plan, given: Given) -> Rows:
    """Shift or enthalpy of every row. Never raises for what stands in a row: that is its verdict."""
    from propdb.tables.mixtures import mixture_rows

    if plan.layout.components and plan.settings.species is None and "species" not in given.keys:
        return mixture_rows(plan, given)
    places, keys = plan.number(given, None)
    numbers = plan.kinds_of(keys)
    _, value, standard, scale, verdict, varies = plan.arrays()
    kinds = numbers[places]
    mine = scale[numbers]
    scales: FloatArray | float = float(mine[0]) if len(mine) and (mine == mine[0]).all() else scale[kinds]
    if not varies[numbers].any():
        return Rows(value[kinds], standard[kinds], scales, verdict[kinds], kinds, True)
    values, standards, verdicts = value[kinds], standard[kinds], verdict[kinds]
    vary(plan, given, kinds, numbers[varies[numbers]], values, standards, verdicts)
    return Rows(values, standards, scales, verdicts, kinds, False)


def conditions(plan: Plan, given: Given) -> tuple[FloatArray, FloatArray | None]:
    """Temperature [K] and pressure [Pa] of every row, by column or by option."""
    settings = plan.settings
    t, p = given.temperature, given.pressure
    if t is None:
        t = np.full(given.rows, math.nan if settings.temperature is None else settings.temperature)
    if p is None and settings.pressure is not None:
        p = np.full(given.rows, settings.pressure)
    return t, p


def vary(
    plan: Plan,
    given: Given,
    kinds: NDArray[np.int32],
    varying: NDArray[np.int32],
    values: FloatArray,
    standards: FloatArray,
    verdicts: NDArray[np.int32],
) -> None:
    """Fill in the rows whose kind depends on T."""
    t, p = conditions(plan, given)
    usable = (t > 0.0) & (t < math.inf)
    shared = Shared(np.where(usable & (t < 1e6) & (t > 1.0), t, 298.15), plan.users)
    whole = len(varying) == 1 and bool((kinds == varying[0]).all())
    order = None if whole else np.argsort(kinds.astype(np.int16) if len(plan.kinds) < 2**15 else kinds, kind="stable")
    sorted_kinds = kinds if order is None else kinds[order]

    for number in dict.fromkeys(varying.tolist()):
        if order is None:
            rows = np.arange(given.rows)
        else:
            rows = order[np.searchsorted(sorted_kinds, number) : np.searchsorted(sorted_kinds, number, side="right")]
        good = np.ones(len(rows), np.bool_)
        for bad, reason in _unusable(plan, plan.kinds[number], t[rows], None if p is None else p[rows]):
            verdicts[rows[good & bad]] = plan.verdict(BAD_ROW, reason)
            good &= ~bad
        if not good.all():
            values[rows[~good]] = standards[rows[~good]] = math.nan
            rows = rows[good]
        if not len(rows):
            continue
        varying_ = plan.kinds[number].varying
        assert varying_ is not None
        result = varying_.at(rows, t[rows], None if p is None else p[rows], shared, plan.run, plan.verdict)
        values[rows], standards[rows], verdicts[rows] = result


def needs_state(plan: Plan, rows: Rows) -> NDArray[np.bool_]:
    """Which rows depend on temperature and pressure: in the others those may be anything."""
    varies = plan.arrays()[5]
    if rows.mix is not None:
        return np.asarray(((rows.mix[0] > 0.0) & varies[rows.mix[1]]).any(axis=1), np.bool_)
    assert rows.kinds is not None
    return varies[rows.kinds]


def _unusable(plan: Plan, kind: Kind, t: FloatArray, p: FloatArray | None) -> Iterator[tuple[NDArray[np.bool_], str]]:
    """Which rows do not say a state, and why; temperatures in K, pressures in Pa."""
    cold = ~np.isnan(t) & ~((t > 0.0) & (t < math.inf))
    yield cold, "a temperature that is not above 0 K"
    evaluate = plan.settings.evaluate  # a shift depends on nothing but the temperature
    real, saturated = evaluate and kind.key.phase == "fluid", evaluate and bool(plan.settings.saturated)
    if saturated:
        lacks = np.isnan(t) if p is None else np.isnan(t) & np.isnan(p)
        yield lacks, "no temperature" if p is None else "neither a temperature nor a pressure"
        if p is not None:
            yield ~np.isnan(t) & ~np.isnan(p), "a saturated state has a temperature or a pressure, not both"
    else:
        yield np.isnan(t), "no temperature"
        if real:
            yield np.ones(len(t), np.bool_) if p is None else np.isnan(p), "no pressure, which the real fluid needs"
    if p is not None and (real or saturated or (evaluate and kind.key.phase == "l")):
        yield ~np.isnan(p) & ~((p > 0.0) & (p < math.inf)), "a pressure that is not above 0"


def added_names(plan: Plan) -> list[str]:
    """Names of the columns that are added, none of which the table has already."""
    unit, datum = plan.settings.unit.text, plan.settings.to
    names = [f"h on {datum} [{unit}]", f"uncertainty [{unit}]"]
    if not plan.settings.evaluate:
        names.append(f"shift [{unit}]")
    names += ["flag", "reason"]
    taken = {name.strip() for name in plan.layout.names}
    found = []
    for name in names:
        base, _, bracket = name.partition(" [")
        free, n = name, 2
        while free in taken:
            free, n = f"{base} ({n})" + (f" [{bracket}" if bracket else ""), n + 1
        taken.add(free)
        found.append(free)
    return found


def convert_batch(batch: Any, plan: Plan) -> Any:
    """Add the converted (or evaluated) enthalpy to an Arrow record batch.

    Parameters
    ----------
    batch : pyarrow.RecordBatch
        Columns in the order of ``plan.layout``. Temperatures and pressures in the units of their columns.
    plan : Plan
        What is asked.

    Returns
    -------
    pyarrow.RecordBatch
        The same columns, then the enthalpy on the datum wanted, its standard uncertainty and the shift [the table's
        unit], the flag (``ok``, ``extrapolated``, ``no data``, ``bad row``) and its reason.

    Notes
    -----
    Each row depends on itself alone, so any engine with Arrow user functions may cut a table as it likes.
    """
    from propdb.tables.batches import convert_arrow

    return convert_arrow(batch, plan)[0]
