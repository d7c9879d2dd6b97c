"""Enthalpies of vaporisation from vapour pressures, where a species has nothing else: estimates, and marked so.

Clausius and Clapeyron: dh = R T^2 (d ln p/dT) dz, with dz the difference of the compressibility factors of vapour and
liquid; dz = (1 - Pr/Tr^3)^(1/2) after J. E. Haggenmacher, J. Am. Chem. Soc. 68 (1946) 1633, where the critical point is
known, else 1. It ends at the real vapour.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from typing import Final

from propdb.intake.package.constants import REAL
from propdb.intake.package.registry import Refused
from propdb.intake.package.sheet import Row, Sheet
from propdb.model.records import R_GAS, T_STANDARD, USABLE_STATUSES, Entry

__all__ = ["Estimator"]

#: (ln p, d ln p/dT) at T [Pa, K]
Pressure = Callable[[float], tuple[float, float]]

_HIGHEST: Final = 2e5  # above it the vapour is too far from ideal for dz by a rule [Pa]


class Estimator:
    """Remembers which species have a latent heat already, and gives one to the others.

    Parameters
    ----------
    entries : sequence of Entry
        Everything that the seed and the files before have given.
    """

    def __init__(self, entries: list[Entry]) -> None:
        self._known: set[str] = {entry.species for entry in entries}
        self._have: set[str] = set()
        critical: dict[str, dict[str, float]] = {}
        for entry in entries:
            if entry.status not in USABLE_STATUSES:
                continue
            if entry.quantity == "Hvap" or (entry.quantity, entry.equation) == ("Cp", "iapws95"):
                self._have.add(entry.species)
            if entry.quantity in ("Tc", "Pc") and entry.value is not None:
                critical.setdefault(entry.species, {}).setdefault(entry.quantity, entry.value)
        self._critical: Mapping[str, Mapping[str, float]] = critical

    def antoine(self, sheet: Sheet, row: Row) -> None:
        """log10 p = A - B/(T + C)."""
        self._antoine(sheet, row, "Chemical", math.log(10.0))

    def antoine_natural(self, sheet: Sheet, row: Row) -> None:
        """ln p = A - B/(T + C)."""
        self._antoine(sheet, row, "Name", 1.0)

    def _antoine(self, sheet: Sheet, row: Row, name: str, factor: float) -> None:
        a, b, c = sheet.numbers("A", "B", "C")

        def pressure(t: float) -> tuple[float, float]:
            return factor * (a - b / (t + c)), factor * b / (t + c) ** 2

        self._estimate(sheet, row, name, pressure, sheet.number("Tmin"), sheet.number("Tmax"))

    def perry(self, sheet: Sheet, row: Row) -> None:
        """ln p = C1 + C2/T + C3 ln T + C4 T^C5."""
        c1, c2, c3, c4, c5 = sheet.numbers("C1", "C2", "C3", "C4", "C5")

        def pressure(t: float) -> tuple[float, float]:
            value = c1 + c2 / t + c3 * math.log(t) + c4 * t**c5
            return value, -c2 / t**2 + c3 / t + c4 * c5 * t ** (c5 - 1.0)

        self._estimate(sheet, row, "Chemical", pressure, sheet.number("Tmin"), sheet.number("Tmax"))

    def wagner(self, powers: tuple[float, float, float, float]) -> Callable[[Sheet, Row], None]:
        """ln(p/Pc) = (A x^m + B x^n + ...)/Tr, x = 1 - Tr, in the given powers."""

        def read(sheet: Sheet, row: Row) -> None:
            tc, pc = sheet.numbers("Tc", "Pc")
            numbers = sheet.numbers("A", "B", "C", "D")
            if not (tc > 0.0 and pc > 0.0):
                raise Refused("no critical temperature", "the equation needs Tc and Pc")

            def pressure(t: float) -> tuple[float, float]:
                x, reduced = 1.0 - t / tc, t / tc
                top = sum(a * x**n for a, n in zip(numbers, powers, strict=True))
                slope = -sum(a * n * x ** (n - 1.0) for a, n in zip(numbers, powers, strict=True))
                return math.log(pc) + top / reduced, (slope * reduced - top) / reduced**2 / tc

            high = sheet.number("Tmax") if "Tmax" in row.cells else tc
            self._estimate(sheet, row, "Name", pressure, sheet.number("Tmin"), high)

        return read

    def _estimate(
        self, sheet: Sheet, row: Row, name: str, pressure: Pressure, low: float | None, high: float | None
    ) -> None:
        nothing = Refused(
            "nothing else known", "no other number of this species, so an estimated latent heat has no use"
        )
        if not sheet.context.registry.known_by(row.text("CAS")):
            raise nothing
        draft, _ = sheet.place(row.text("CAS"), row.text(name))
        if draft.name not in self._known:
            raise nothing
        if draft.name in self._have:
            raise Refused("not needed", "the species has an enthalpy of vaporisation of its own")
        if draft.vapour == "associating":
            raise Refused("associating vapour", "its vapour associates, and its compressibility is not known")
        if low is None or high is None or not 0.0 < low <= high:
            raise Refused("no range", "the file gives no range, and an equation without one is not used")
        at = min(max(T_STANDARD, low), high)
        if abs(at - T_STANDARD) <= 0.155:
            at = T_STANDARD
        try:
            logarithm, slope = pressure(at)
            p = math.exp(logarithm)
        except (ValueError, OverflowError, ZeroDivisionError):
            raise Refused("no pressure", f"the equation has no value at {at:g} K") from None
        if p > _HIGHEST:
            raise Refused("pressure too high", f"{p / 1e5:.3g} bar at {at:g} K, the nearest to 298.15 K")
        point = self._critical.get(draft.name, {})
        change, remark = 1.0, "vapour taken for ideal"
        if "Tc" in point and "Pc" in point and at < point["Tc"]:
            inside = 1.0 - (p / point["Pc"]) / (at / point["Tc"]) ** 3
            change, remark = math.sqrt(max(inside, 0.0)), "compressibility after Haggenmacher"
        value = R_GAS * at**2 * slope * change
        sheet.constant(
            draft,
            "Hvap",
            "l",
            "A" if "A" in row.cells else "C1",
            temperature=at,
            conditions=REAL,
            status="estimate",
            note=f"Clausius-Clapeyron from vapour pressures, {remark}; {p:.3g} Pa at {at:g} K",
            value=value,
            carried=f"{value:.6g}",
            unit="J/mol",
        )
        self._have.add(draft.name)
