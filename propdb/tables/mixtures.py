"""Rows that carry a composition: the shift is the sum of x_i (Z_A,i - Z_B,i); a mixing enthalpy stays untouched."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from propdb.errors import InvalidInput, PropdbError
from propdb.tables.kinds import BAD_ROW, EXTRAPOLATED, OK, Key

if TYPE_CHECKING:
    from propdb.tables.core import Given, Plan, Rows
    from propdb.tables.oracle import Basis

__all__ = ["amounts", "check_components", "mixture_rows"]

#: Fractions that sum to one within this are rounded, and are divided by their sum [1].
ROUNDING = 0.002


def check_components(plan: Plan) -> None:
    """Refuse compositions that contradict themselves or a species, and a dry basis without sense.

    Raises InvalidInput.
    """
    components = plan.layout.components
    shown = ", ".join(repr(c.name) for c in components[:4])
    if not components:
        if plan.settings.dry:
            raise InvalidInput("a dry composition, and no column of one", hint="leave --composition out")
        return
    if len({c.mass for c in components}) > 1:
        raise InvalidInput("composition columns by amount (x) and by mass (w)", hint="give one kind")
    column = plan.layout.get("species")
    if column is not None or plan.settings.species is not None:
        other = "--species" if column is None else f"the column {column.name!r}"
        raise InvalidInput(
            f"the species is given by {other} and by the composition {shown}",
            hint="leave --species out" if column is None else "rename the columns that do not count",
        )
    names = component_names(plan)
    for i, name in enumerate(names):
        if name is not None and name in names[:i]:
            first = components[names.index(name)].name
            raise InvalidInput(
                f"two composition columns for {name}: {first!r} and {components[i].name!r}", hint="rename one"
            )
    if plan.settings.dry and "water" not in names:
        raise InvalidInput("a dry composition, and no column of water beside it", hint="leave --composition out")


def component_names(plan: Plan) -> list[str | None]:
    """The species of the composition columns; None where it is not known."""

    def find(basis: Basis) -> list[str | None]:
        names: list[str | None] = []
        for component in plan.layout.components:
            try:
                names.append(basis.species(component.species).name)
            except PropdbError:  # its rows are flagged
                names.append(None)
        return names

    return plan.oracle.ask(find)


def amounts(
    plan: Plan, given: Given, rows: NDArray[np.intp], molar: NDArray[np.float64], wet: NDArray[np.bool_]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Amount fractions of some rows, and what they sum to as given (NaN: one is negative; -inf: too much water).

    ``molar`` are the molar masses of the components [kg/mol]; ``wet`` says which is water beside a dry composition.
    """
    components = plan.layout.components
    assert given.fractions is not None
    given_x = given.fractions[rows] * np.array([c.scale for c in components])
    x = np.where(np.isnan(given_x), 0.0, given_x)  # an empty cell is none of it
    total = x[:, ~wet].sum(axis=1)
    with np.errstate(divide="ignore", invalid="ignore"):
        if wet.any():
            water = x[:, wet].sum(axis=1)
            alone = (total == 0.0) & (water == 1.0)  # steam has no dry part
            x = np.where(wet, x, x / np.where(alone, 1.0, total)[:, None] * (1.0 - water)[:, None])
            total = np.where(alone, 1.0, np.where(water > 1.0, -math.inf, total))
        else:
            x = x / total[:, None]
        if components[0].mass:
            x = x / molar
            x = x / x.sum(axis=1)[:, None]
    return x, np.where((given_x < 0.0).any(axis=1), math.nan, total)


def mixture_rows(plan: Plan, given: Given) -> Rows:
    """See :func:`propdb.tables.core.compute`, for rows with a composition."""
    from propdb.tables.core import Rows

    components = plan.layout.components
    places, keys = plan.number(given, "*")
    size = given.rows
    value, standard = np.full(size, math.nan), np.full(size, math.nan)
    scale = np.full(size, plan.settings.unit.factor)
    verdicts = np.zeros(size, np.int32)
    fractions = np.zeros((size, len(components)))
    kinds = np.zeros((size, len(components)), np.int32)
    for place, key in enumerate(keys):
        rows = np.flatnonzero(places == place)
        numbers = plan.kinds_of([Key(c.species, key.datum, key.phase, key.form) for c in components])
        species = [plan.kinds[n].species for n in numbers]
        molar = np.array([1.0 if s is None else s.molar_mass for s in species])
        wet = np.array([plan.settings.dry and s is not None and s.name == "water" for s in species])
        x, total = amounts(plan, given, rows, molar, wet)
        good = np.abs(total - 1.0) <= ROUNDING
        for row, sum_ in zip(rows[~good][:1000].tolist(), total[~good].tolist(), strict=False):
            shown = f"the fractions sum to {sum_:.4g}, not to 1"
            if math.isnan(sum_) or sum_ == -math.inf:
                shown = "a negative fraction" if math.isnan(sum_) else "more water than the whole"
            verdicts[row] = plan.verdict(BAD_ROW, shown)
        if np.count_nonzero(~good) > 1000:
            verdicts[rows[~good][1000:]] = plan.verdict(BAD_ROW, "the fractions do not sum to 1")
        kinds[rows] = numbers
        rows, x = rows[good], x[good]
        fractions[rows] = x
        if plan.settings.unit.basis == "mass":
            scale[rows] *= x @ molar
        value[rows], standard[rows], verdicts[rows] = _sum(plan, given, rows, x, numbers)
    return Rows(value, standard, scale, verdicts, None, False, (fractions, kinds))


def _sum(
    plan: Plan, given: Given, rows: NDArray[np.intp], x: NDArray[np.float64], numbers: NDArray[np.int32]
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.int32]]:
    """Values, standard uncertainties [J/mol] and verdicts of rows of one key.

    Sensitivities are added entry by entry, so what two components share is fully correlated.
    """
    from propdb.tables.core import conditions, vary

    _, all_value, all_standard, _, all_verdict, varies = plan.arrays()
    size = len(rows)
    value, square = np.zeros(size), np.zeros(size)
    t, p = (None if a is None else a[rows] for a in conditions(plan, given))
    lacking = np.zeros(size, np.bool_)
    verdicts = np.zeros(size, np.int32)
    entries: dict[str, NDArray[np.float64]] = {}  # sensitivity x standard error of each row [J/mol]
    for place, number in enumerate(numbers.tolist()):
        present = x[:, place] > 0.0
        if varies[number]:
            whole = [np.full(given.rows, math.nan), np.full(given.rows, math.nan)]
            verdict = np.zeros(given.rows, np.int32)
            kinds = np.full(given.rows, -1, np.int32)
            kinds[rows] = number
            vary(plan, given, kinds, np.array([number], np.int32), whole[0], whole[1], verdict)
            mine, standards, verdict = whole[0][rows], whole[1][rows], verdict[rows]
            varying = plan.kinds[number].varying
            here = np.flatnonzero(present & ~np.isnan(mine))
            if varying is not None and len(here):
                assert t is not None
                its = varying.sensitivities(t[here], None if p is None else p[here], plan.run)
                for entry, (part, coefficients) in its.items():
                    if part.stated:
                        vector = entries.setdefault(entry, np.zeros(size))
                        vector[here] += x[here, place] * coefficients * part.standard
        else:
            mine = np.full(size, all_value[number])
            standards = np.full(size, all_standard[number])
            verdict = np.full(size, all_verdict[number], np.int32)
            for part in plan.kinds[number].parts:
                if part.stated:
                    vector = entries.setdefault(part.entry, np.zeros(size))
                    vector += x[:, place] * (part.coefficient * part.standard)
        value += np.where(present, x[:, place] * mine, 0.0)
        lacking |= present & np.isnan(standards)
        verdicts = _worse(plan, verdicts, np.where(present, verdict, 0).astype(np.int32))
    for vector in entries.values():
        square += vector**2
    return value, np.where(lacking, math.nan, np.sqrt(square)), verdicts


def _worse(plan: Plan, old: NDArray[np.int32], new: NDArray[np.int32]) -> NDArray[np.int32]:
    """The worse of two verdicts of each row: no data and bad rows before extrapolated before ok."""
    order = (OK, EXTRAPOLATED)
    ranks = np.array([order.index(flag) if flag in order else 2 for flag, _ in plan.verdicts])
    return np.where(ranks[new] > ranks[old], new, old).astype(np.int32)
