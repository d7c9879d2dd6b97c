"""Heat capacities given at temperatures, joined to one entry with the equation ``table``."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from propdb.cp.registry import build_heat_capacity
from propdb.errors import InvalidInput

__all__ = ["Point", "check_table", "table_params"]

#: Closer than this, measured points show their scatter rather than a slope [K].
CLOSEST = 0.5
#: No heat capacity of a mole of anything in a store reaches this [J/mol/K].
LARGEST = 1e5


@dataclass(frozen=True, slots=True)
class Point:
    """A heat capacity at one temperature, as carried and in SI."""

    temperature: float  # [K]
    value: float  # [J/mol/K]
    carried: str
    relative: float | None = None  # uncertainty as a fraction of the value


def check_table(points: Sequence[Point]) -> str:
    """Why points cannot be joined to one curve; "" where they can."""
    if len(points) < 2:
        return "one temperature does not make a curve"
    ordered = sorted(points, key=lambda p: p.temperature)
    for a, b in zip(ordered, ordered[1:], strict=False):
        if b.temperature == a.temperature:
            return f"{b.temperature:g} K stands twice"
        if b.temperature - a.temperature < CLOSEST:
            return f"{a.temperature:g} K and {b.temperature:g} K are closer than {CLOSEST:g} K"
    odd = next((p for p in ordered if not 0.0 < p.value < LARGEST), None)
    return f"{odd.value:.4g} J/mol/K at {odd.temperature:g} K is no heat capacity" if odd else ""


def table_params(points: Sequence[Point]) -> dict[str, list[float]]:
    """Stored parameters of the equation ``table``.

    Raises
    ------
    InvalidInput
        The points do not make a curve.
    """
    problem = check_table(points)
    if problem:
        raise InvalidInput(problem, hint="give each temperature once, at least two")
    ordered = sorted(points, key=lambda p: p.temperature)
    params = {"T": [p.temperature for p in ordered], "cp": [p.value for p in ordered]}
    build_heat_capacity("table", params)
    return params
