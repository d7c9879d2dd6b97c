"""What the open ``chemicals`` library carries as functions of temperature: heat capacities and latent heats.

The equations are those of the compilations, as the library computes them.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from math import isfinite
from typing import TYPE_CHECKING

from propdb.errors import EquationError, FormulaError
from propdb.model.formula import hill, parse_formula
from propdb.model.records import R_GAS

if TYPE_CHECKING:
    from propdb.model.records import Species
    from propdb.vetting.library import Library

__all__ = ["Function", "heat_capacities", "latent_heats", "same_formula"]

CALORIE = 4.184  # [J], thermochemical


@dataclass(frozen=True, slots=True)
class Function:
    """A quantity of a compilation over a range of temperature.

    Parameters
    ----------
    compilation : str
        Its key in ``lineage.toml``.
    tmin, tmax : float
        [K]
    at : callable
        Temperature [K] to the value [J/mol/K] or [J/mol].
    uncertainty : float, optional
        Expanded (95 %), a fraction.
    nodes : tuple of float
        Temperatures that a table prints, none that stands twice [K]; empty for an equation.
    splits : tuple of float
        Temperatures that stand twice: a transition whose enthalpy the table does not give [K].
    """

    compilation: str
    tmin: float
    tmax: float
    at: Callable[[float], float]
    uncertainty: float | None = None
    nodes: tuple[float, ...] = ()
    splits: tuple[float, ...] = ()

    def covers(self, t: float, *, slack: float = 0.155) -> bool:
        """Is it given at ``t`` [K]? A range printed as 298 K holds at 298.15 K."""
        return self.tmin - slack <= t <= self.tmax + slack

    def integral(self, a: float, b: float) -> float:
        """From ``a`` to ``b`` [K], by Gauss and Legendre's rule on 16 stretches."""
        from numpy.polynomial.legendre import leggauss

        points, weights = leggauss(6)
        step = (b - a) / 16
        total = 0.0
        for i in range(16):
            middle = a + (i + 0.5) * step
            total += sum(w * self.at(middle + 0.5 * step * x) for x, w in zip(points, weights, strict=True))
        return 0.5 * step * float(total)


def heat_capacities(library: Library, species: Species, *, phase: str, form: str, cas: str) -> Iterator[Function]:
    """Heat capacities of a phase [J/mol/K]; each compilation once."""
    if phase == "g":
        found = (*_trc(library, cas), *_poling(library, cas), *_janaf(library, cas, phase))
    elif phase == "l":
        found = (*_zabransky(library, cas), *_perry_liquid(library, cas), *_janaf(library, cas, phase))
    elif phase == "cr":
        found = (*_janaf(library, cas, phase), *_perry_solid(library, species, form), *_crc_solid(library, cas))
    else:
        found = ()
    seen = set()
    for function in found:
        if function.compilation not in seen:
            seen.add(function.compilation)
            yield function


def latent_heats(library: Library, *, cas: str) -> Iterator[Function]:
    """Enthalpies of vaporisation to the real vapour [J/mol]."""
    row = library.rows("phase_change.phase_change_data_Perrys2_150").get(cas)
    if row is not None:
        tc, c1, c2, c3, c4 = (row[name] for name in ("Tc", "C1", "C2", "C3", "C4"))

        def perry(t: float) -> float:
            tr = min(t / tc, 1.0)
            return float(c1 * (1.0 - tr) ** (c2 + c3 * tr + c4 * tr * tr))

        yield Function("perry-8", row["Tmin"], row["Tmax"], perry)
    row = library.rows("phase_change.phase_change_data_VDI_PPDS_4").get(cas)
    if row is not None:
        critical = row["Tc"]  # not tc: perry reads that when it is called
        a, b, c, d, e = (row[name] for name in "ABCDE")

        def vdi(t: float) -> float:
            x = max(1.0 - t / critical, 0.0)
            return float(R_GAS * critical * (a * x ** (1 / 3) + b * x ** (2 / 3) + c * x + d * x * x + e * x**6))

        yield Function("vdi-2010", 0.4 * critical, critical, vdi)


def _trc(library: Library, cas: str) -> Iterator[Function]:
    row = library.rows("heat_capacity.TRC_gas_data").get(cas)
    if row is None or not row["a6"]:  # of monatomic H and D, whose form divides by a6 + a7 = 0
        return
    from chemicals.heat_capacity import TRCCp

    numbers = [row[f"a{i}"] for i in range(8)]
    yield Function("trc-1994", row["Tmin"], row["Tmax"], lambda t: float(TRCCp(t, *numbers)))


def _poling(library: Library, cas: str) -> Iterator[Function]:
    row = library.rows("heat_capacity.Cp_data_Poling").get(cas)
    if row is None or not isfinite(row["a0"]) or not isfinite(row["Tmin"]):
        return
    from chemicals.heat_capacity import Poling

    numbers = [row[f"a{i}"] for i in range(5)]
    yield Function("poling-2001", row["Tmin"], row["Tmax"], lambda t: float(Poling(t, *numbers)))


def _janaf(library: Library, cas: str, phase: str) -> Iterator[Function]:
    table = library.janaf[phase].get(cas)
    if table is not None:
        yield from _table("chase-1998", *table)


def _crc_solid(library: Library, cas: str) -> Iterator[Function]:
    table = library.crc_solids.get(cas)
    if table is not None:
        yield from _table("crc-95", *table)


def _table(compilation: str, ts: tuple[float, ...], cps: tuple[float, ...]) -> Iterator[Function]:
    """A table; its value at 0 K, which is 0 by the third law or by custom, is left out."""
    from propdb.cp.table import Table

    points = [(t, cp) for t, cp in zip(ts, cps, strict=True) if t > 0.0]
    try:
        table = Table(tuple(t for t, _ in points), tuple(cp for _, cp in points))
    except EquationError:
        return
    twice = table.splits
    nodes = tuple(t for t, _ in points if t not in twice)
    yield Function(
        compilation, points[0][0], points[-1][0], lambda t: float(table.cp(t)), nodes=nodes, splits=tuple(twice)
    )


#: Uncertainty of Zábranský's classes of quality is not carried by the library's records.
_ZABRANSKY = ("iso", "sat", "const")


def _zabransky(library: Library, cas: str) -> Iterator[Function]:
    """Isobaric before along saturation before averaged heat capacities, splines before quasi-polynomials."""
    for kind in _ZABRANSKY:
        for shape in "sp":
            model = library.zabransky(kind, shape).get(cas)
            if model is not None:
                tmin = min(m.Tmin for m in model.models) if shape == "s" else model.Tmin
                tmax = max(m.Tmax for m in model.models) if shape == "s" else model.Tmax
                yield Function("zabransky-1996", tmin, tmax, lambda t, model=model: float(model.calculate(t)))  # type: ignore[misc]


def _perry_liquid(library: Library, cas: str) -> Iterator[Function]:
    row = library.rows("heat_capacity.Cp_data_Perry_Table_153_100").get(cas)
    if row is not None:
        powers = [row[name] / 1000.0 for name in "ABCDE"]
        yield Function(
            "perry-8", row["Tmin"], row["Tmax"], lambda t: float(sum(c * t**i for i, c in enumerate(powers)))
        )
        return
    row = library.rows("heat_capacity.Cp_data_Perry_Table_153_114").get(cas)
    heat = library.rows("phase_change.phase_change_data_Perrys2_150").get(cas)
    if row is None or heat is None:
        return
    a, b, c, d = (row[name] for name in "ABCD")
    tc = heat["Tc"]

    def cp(t: float) -> float:
        x = max(1.0 - t / tc, 1e-12)
        total = a * a / x + b - 2 * a * c * x - a * d * x * x - c * c * x**3 / 3 - c * d * x**4 / 2 - d * d * x**5 / 5
        return float(total / 1000.0)

    yield Function("perry-8", row["Tmin"], row["Tmax"], cp)


#: What table 2-151 calls a form, where our word is another.
_FORMS: Mapping[str, str] = {"α": "alpha", "β": "beta", "γ": "gamma", "δ": "delta", "quartz, α": "quartz"}


def _perry_solid(library: Library, species: Species, form: str) -> Iterator[Function]:
    """A row of table 2-151 with this formula: the one of this form, or the only one. Organic formulas have isomers."""
    elements = {element for element, _ in species.composition}
    if {"C", "H"} <= elements or species.charge:
        return
    rows = [
        row
        for row in library.perry_solids.get(species.formula, ())
        if row["main phase"] == "c" and row["Tmin"] and row["Tmax"] and row["Constant Term"]
    ]
    named = [row for row in rows if form and _FORMS.get(row["subphase"], row["subphase"]) == form]
    if not named and len(rows) != 1:
        return
    yield _perry_row((named or rows)[0])


def _perry_row(row: Mapping[str, str]) -> Function:
    a, b, c, d = (float(row[name] or 0.0) * CALORIE for name in ("Constant Term", "+*T term", "/T^2 term", "*T^2 term"))
    error = row["%error"]
    return Function(
        "perry-8-solids",
        float(row["Tmin"]),
        float(row["Tmax"]),
        lambda t: a + b * t + c / (t * t) + d * t * t,
        uncertainty=float(error) / 100.0 if error.replace(".", "", 1).isdigit() else None,
    )


def same_formula(text: str, species: Species) -> bool:
    """Does a compilation's formula name the atoms and the charge of a species? Texts that cannot be read pass."""
    try:
        parsed = parse_formula(text.partition(" (")[0])
    except FormulaError:
        return True
    return hill(parsed.counts) == species.formula and parsed.charge == species.charge
