"""What a pair of JANAF tables, of the crystal and of its liquid, says of melting and of glass steps.

Beside the round temperatures these tables print a row at each transition. Their files carry the rows without the words,
so what a row is about follows from the pair: the melting point stands in both tables, with one heat capacity on both of
its sides, because neither the crystal nor the liquid changes there; at a glass step the liquid passes from the heat
capacity of the crystal to its own. A row that fits neither, or two that fit, decide nothing.
"""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Sequence
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from propdb.intake.package.registry import Draft
    from propdb.intake.package.sheet import Sheet

__all__ = ["glass_steps", "melting_point", "merged", "record"]

Points = Sequence[tuple[float, float]]  # temperature [K], heat capacity [J/mol/K]

#: Temperatures that every table prints below 500 K; above them come the full hundreds.
_ROUND: Final = (298.15, 250.0, 350.0, 450.0)

#: Below its glass step a liquid has the heat capacity of the crystal to within this [1].
_SAME: Final = 0.01


def melting_point(*, crystal: Points, liquid: Points) -> float | None:
    """Melting temperature [K] that both tables print, or one of them where the other prints no such row.

    None where there is none, or more than one.
    """
    crystals, liquids = _smooth_rows(crystal), _smooth_rows(liquid)
    found = crystals & liquids or crystals ^ liquids
    return found.pop() if len(found) == 1 else None


def glass_steps(*, crystal: Points, liquid: Points, melting: float | None) -> list[float]:
    """Temperatures [K] below melting at which the liquid leaves the heat capacity of the crystal, which has no step."""
    steps = []
    for (t, below), (other, above) in zip(liquid, liquid[1:], strict=False):
        if t != other or above == below or (melting is not None and t >= melting):
            continue
        expected = _at(crystal, t)
        if expected is not None and abs(below - expected) <= _SAME * expected and not _jumps(crystal, t):
            steps.append(t)
    return steps


def merged(points: Points, *, at: float | None) -> list[tuple[float, float]]:
    """The table with a temperature once where it is printed twice with one value.

    Of a crystal only its melting point (``at``) is such a row for certain: at another one a transition may have passed
    between forms of equal heat capacity. In a liquid (None) no row can be that.
    """
    kept: list[tuple[float, float]] = []
    for point in points:
        if kept and kept[-1] == point and (at is None or point[0] == at):
            continue
        kept.append(point)
    return kept


def record(
    sheet: Sheet, draft: Draft, name: str, form: str, *, crystal: Points, liquid: Points, melting: float | None
) -> None:
    """The entries: a melting point, and 0 as the enthalpy of each glass step."""
    if melting is not None:
        from propdb.intake.package.constants import crystal_form

        sheet.constant(
            draft,
            "Tm",
            "cr",
            "T",
            temperature=None,
            value=melting,
            carried=f"{melting:.10g}",
            form=crystal_form(sheet, draft, name, form, melting=True),
            note="the temperature beside the round ones at which the tables of crystal and liquid print a row, and "
            "where neither has a step",
        )
    for t in glass_steps(crystal=crystal, liquid=liquid, melting=melting):
        sheet.constant(
            draft,
            "Htr",
            "l",
            "T",
            temperature=t,
            value=0.0,
            carried="0",
            to="l",
            conditions="glass step of the liquid",
            note="the liquid passes here from the heat capacity of the crystal to its own: a step of second order, "
            "which has no latent heat",
        )


def _smooth_rows(points: Points) -> set[float]:
    """Temperatures that are not round, or printed twice, and have one heat capacity on both sides."""
    often = {t for (t, _), (other, _) in zip(points, points[1:], strict=False) if t == other}
    odd = {t for t, _ in points if t % 100.0 and t not in _ROUND and not (t < 200.0 and t % 20.0 == 0.0)}
    return {t for t in often | odd if not _jumps(points, t)}


def _jumps(points: Points, t: float) -> bool:
    values = [cp for other, cp in points if other == t]
    return max(values) > min(values) if values else False


def _at(points: Points, t: float) -> float | None:
    """Heat capacity of the table at ``t`` by linear interpolation [J/mol/K]."""
    temperatures = [other for other, _ in points]
    i = bisect_left(temperatures, t)
    if i == len(points) or (i == 0 and temperatures[0] != t):
        return None
    if temperatures[i] == t:
        return points[i][1]
    (t1, c1), (t2, c2) = points[i - 1], points[i]
    return c1 + (c2 - c1) * (t - t1) / (t2 - t1)
