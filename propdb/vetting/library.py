"""What the open ``chemicals`` library carries, by compilation: constants as numbers, the rest as functions of T.

Only the files whose publication is known and whose zero is where the column says: the ``Hfg`` column of the TRC tables
(at 0 K for most rows) and real-gas heat capacities are left out.
"""

from __future__ import annotations

import csv
import json
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cache, cached_property
from math import nan
from pathlib import Path
from typing import Any

from propdb._version import __version__
from propdb.errors import FormulaError
from propdb.model.formula import hill, parse_formula
from propdb.model.records import T_STANDARD

__all__ = ["Constant", "Library", "library", "library_version"]


@dataclass(frozen=True, slots=True)
class Constant:
    """One number of a compilation.

    Parameters
    ----------
    compilation : str
        Its key in ``lineage.toml``.
    value : float
        In SI, as the entries of its quantity.
    temperature : float, optional
        [K]
    uncertainty : float, optional
        Expanded (95 %), as ``value``.
    formula : str
        As the compilation writes it, where it does.
    """

    compilation: str
    value: float
    temperature: float | None = None
    uncertainty: float | None = None
    formula: str = ""


@cache
def library() -> Library:
    """The library, read once."""
    return Library()


def library_version() -> str:
    """``chemicals 1.5.2 by propdb 0.1.0``: what the numbers were read from, and by whom."""
    import chemicals

    return f"chemicals {chemicals.__version__} by propdb {__version__}"


@dataclass(frozen=True, slots=True)
class _Column:
    """A column of a table of the library."""

    compilation: str
    frame: str
    column: str
    temperature: float | str | None = None  # [K]; a text names the column that holds it
    uncertainty: str = ""
    formula: str = ""


#: (quantity, phase) to the columns that hold it. Temperatures in K, J/mol, J/mol/K, Pa.
_COLUMNS: Mapping[tuple[str, str], tuple[_Column, ...]] = {
    ("Hf", "g"): (
        _Column("atct-1.112", "reaction.Hfg_ATcT_data", "Hfg", T_STANDARD, "uncertainty", "Formula"),
        _Column("atct-1.112", "reaction.Hfg_ATcT_data", "Hfg_0K", 0.0, "uncertainty", "Formula"),
        _Column("chase-1998", "JANAF", "Hfg", T_STANDARD, formula="formula"),
        _Column("crc-95", "heat_capacity.CRC_standard_data", "Hfg", T_STANDARD),
        _Column("albahri-2013", "reaction.Hfg_API_TDB_data", "Hfg", T_STANDARD),
        _Column("yaws-2014", "reaction.Hfg_S0g_YAWS_data", "Hfg", T_STANDARD),
    ),
    ("Hf", "l"): (
        _Column("atct-1.112", "reaction.Hfl_ATcT_data", "Hfl", T_STANDARD, "uncertainty", "Formula"),
        _Column("chase-1998", "JANAF", "Hfl", T_STANDARD, formula="formula"),
        _Column("crc-95", "heat_capacity.CRC_standard_data", "Hfl", T_STANDARD),
    ),
    ("Hf", "cr"): (_Column("crc-95", "heat_capacity.CRC_standard_data", "Hfs", T_STANDARD),),
    ("Gf", "g"): (
        _Column("chase-1998", "JANAF", "Gfg", T_STANDARD, formula="formula"),
        _Column("crc-95", "heat_capacity.CRC_standard_data", "Gfg", T_STANDARD),
    ),
    ("Gf", "l"): (
        _Column("chase-1998", "JANAF", "Gfl", T_STANDARD, formula="formula"),
        _Column("crc-95", "heat_capacity.CRC_standard_data", "Gfl", T_STANDARD),
    ),
    ("Gf", "cr"): (_Column("crc-95", "heat_capacity.CRC_standard_data", "Gfs", T_STANDARD),),
    ("S", "g"): (
        _Column("chase-1998", "JANAF", "S0g", T_STANDARD, formula="formula"),
        _Column("crc-95", "heat_capacity.CRC_standard_data", "S0g", T_STANDARD),
        _Column("yaws-2014", "reaction.Hfg_S0g_YAWS_data", "S0g", T_STANDARD),
    ),
    ("S", "l"): (
        _Column("chase-1998", "JANAF", "S0l", T_STANDARD, formula="formula"),
        _Column("crc-95", "heat_capacity.CRC_standard_data", "S0l", T_STANDARD),
    ),
    ("S", "cr"): (_Column("crc-95", "heat_capacity.CRC_standard_data", "S0s", T_STANDARD),),
    ("Cp", "g"): (
        _Column("crc-95", "heat_capacity.CRC_standard_data", "Cpg", T_STANDARD),
        _Column("poling-2001", "heat_capacity.Cp_data_Poling", "Cpg", T_STANDARD),
    ),
    ("Cp", "l"): (
        _Column("crc-95", "heat_capacity.CRC_standard_data", "Cpl", T_STANDARD),
        _Column("poling-2001", "heat_capacity.Cp_data_Poling", "Cpl", T_STANDARD),
    ),
    ("Cp", "cr"): (_Column("crc-95", "heat_capacity.CRC_standard_data", "Cps", T_STANDARD),),
    ("Hf", "aq"): (_Column("crc-95", "ions", "Hf(aq)", T_STANDARD, formula="Formula"),),
    ("Gf", "aq"): (_Column("crc-95", "ions", "Gf(aq)", T_STANDARD, formula="Formula"),),
    ("S", "aq"): (_Column("crc-95", "ions", "S(aq)", T_STANDARD, formula="Formula"),),
    ("Cp", "aq"): (_Column("crc-95", "ions", "Cp(aq)", T_STANDARD, formula="Formula"),),
    ("Hvap", "l"): (
        _Column("crc-95", "phase_change.Hvap_data_CRC", "Hvap298", T_STANDARD),
        _Column("crc-95", "phase_change.Hvap_data_CRC", "HvapTb", "Tb"),
        _Column("gharagheizi-2013", "phase_change.Hvap_data_Gharagheizi", "Hvap298", T_STANDARD),
    ),
    ("Hfus", "cr"): (_Column("crc-95", "phase_change.Hfus_data_CRC", "Hfus"),),
    ("Hsub", "cr"): (_Column("gharagheizi-2013", "phase_change.Hsub_data_Gharagheizi", "Hsub", T_STANDARD, "error"),),
    ("Tb", "l"): (
        _Column("crc-95", "miscdata.CRC_organic_data", "Tb"),
        _Column("crc-95", "miscdata.CRC_inorganic_data", "Tb"),
        _Column("crc-95", "phase_change.Hvap_data_CRC", "Tb"),
    ),
    ("Tm", "cr"): (
        _Column("crc-95", "miscdata.CRC_organic_data", "Tm"),
        _Column("crc-95", "miscdata.CRC_inorganic_data", "Tm"),
        _Column("staveley-1981", "triple.triple_data_Staveley", "Tt"),
    ),
    ("Tc", "l"): (
        _Column("iupac-critical", "critical.critical_data_IUPAC", "Tc"),
        _Column("crc-95", "critical.critical_data_CRC", "Tc", uncertainty="Tc_error"),
        _Column("mathews-1972", "critical.critical_data_Matthews", "Tc"),
        _Column("psrk-2005", "critical.critical_data_PSRKR4", "Tc"),
    ),
    ("Pc", "l"): (
        _Column("iupac-critical", "critical.critical_data_IUPAC", "Pc"),
        _Column("crc-95", "critical.critical_data_CRC", "Pc", uncertainty="Pc_error"),
        _Column("mathews-1972", "critical.critical_data_Matthews", "Pc"),
        _Column("psrk-2005", "critical.critical_data_PSRKR4", "Pc"),
    ),
    ("omega", "l"): (_Column("psrk-2005", "critical.critical_data_PSRKR4", "omega"),),
}

COMPILATIONS = tuple(dict.fromkeys(column.compilation for columns in _COLUMNS.values() for column in columns))


#: Where the library keeps its tables. It would load them into data frames, with many more that are not asked for here.
_FILES: Mapping[str, str] = {
    "JANAF": "Reactions/JANAF_1998.tsv",
    "critical.critical_data_CRC": "Critical Properties/CRCCriticalOrganics.tsv",
    "critical.critical_data_IUPAC": "Critical Properties/IUPACOrganicCriticalProps.tsv",
    "critical.critical_data_Matthews": "Critical Properties/Mathews1972InorganicCriticalProps.tsv",
    "critical.critical_data_PSRKR4": "Critical Properties/Appendix to PSRK Revision 4.tsv",
    "heat_capacity.CRC_standard_data": "Heat Capacity/CRC Standard Thermodynamic Properties of Chemical Substances.tsv",
    "heat_capacity.Cp_data_Perry_Table_153_100": "Heat Capacity/Perry_Table_2-153_DIPPR_100.tsv",
    "heat_capacity.Cp_data_Perry_Table_153_114": "Heat Capacity/Perry_Table_2-153_DIPPR_114.tsv",
    "heat_capacity.Cp_data_Poling": "Heat Capacity/PolingDatabank.tsv",
    "heat_capacity.TRC_gas_data": "Heat Capacity/TRC Thermodynamics of Organic Compounds in the Gas State.tsv",
    "ions": "Electrolytes/CRC Thermodynamic Properties of Aqueous Ions.tsv",
    "miscdata.CRC_inorganic_data": "Misc/Physical Constants of Inorganic Compounds.csv",
    "miscdata.CRC_organic_data": "Misc/Physical Constants of Organic Compounds.csv",
    "phase_change.Hfus_data_CRC": "Phase Change/CRC Handbook Heat of Fusion.tsv",
    "phase_change.Hsub_data_Gharagheizi": "Phase Change/Ghazerati Appendix Sublimation Enthalpy.tsv",
    "phase_change.Hvap_data_CRC": "Phase Change/CRC Handbook Heat of Vaporization.tsv",
    "phase_change.Hvap_data_Gharagheizi": "Phase Change/Ghazerati Appendix Vaporization Enthalpy.tsv",
    "phase_change.phase_change_data_Perrys2_150": (
        "Phase Change/Table 2-150 Heats of Vaporization of Inorganic and Organic Liquids.tsv"
    ),
    "phase_change.phase_change_data_VDI_PPDS_4": "Phase Change/VDI PPDS Enthalpies of vaporization.tsv",
    "reaction.Hfg_API_TDB_data": "Reactions/API TDB Albahri Hf (g).tsv",
    "reaction.Hfg_ATcT_data": "Reactions/ATcT 1.112 (g).tsv",
    "reaction.Hfg_S0g_YAWS_data": "Reactions/Yaws Hf S0 (g).tsv",
    "reaction.Hfl_ATcT_data": "Reactions/ATcT 1.112 (l).tsv",
    "triple.triple_data_Staveley": "Triple Properties/Staveley 1981.tsv",
}
#: What stands in these tables where there is no number.
_BLANK = frozenset({"", "nan", "NaN", "NA", "N/A", "n/a", "None", "NULL", "null"})


@dataclass(frozen=True, slots=True)
class _Sheet:
    """A table as its file has it."""

    cas: tuple[str, ...]  # of each row
    columns: Mapping[str, tuple[Any, ...]]  # numbers where all cells are, else text; None for a blank cell


class Library:
    """The tables of the library, each read when it is first asked for."""

    def __init__(self) -> None:
        self._sheets: dict[str, _Sheet] = {}
        self._columns: dict[tuple[str, str], dict[str, Any]] = {}
        self._rows: dict[str, Mapping[str, Mapping[str, Any]]] = {}

    def constants(self, quantity: str, phase: str, cas: str) -> Iterator[Constant]:
        """What the compilations give for a quantity of one phase; each temperature of a compilation once."""
        seen: set[tuple[str, float | None]] = set()
        for column in _COLUMNS.get((quantity, phase), ()):
            value = self._column(column.frame, column.column).get(cas)
            if value is None:
                continue
            t = column.temperature
            if isinstance(t, str):
                t = self._column(column.frame, t).get(cas)
                if t is None:
                    continue
            if (column.compilation, t) in seen:
                continue
            seen.add((column.compilation, t))
            size = self._column(column.frame, column.uncertainty).get(cas) if column.uncertainty else None
            formula = self._column(column.frame, column.formula).get(cas, "") if column.formula else ""
            yield Constant(column.compilation, float(value), t, None if size is None else float(size), str(formula))

    def _column(self, frame: str, column: str) -> dict[str, Any]:
        """A column by CAS RN, without blanks and without numbers that stand for two rows which differ."""
        key = (frame, column)
        if key not in self._columns:
            sheet = self._sheet(frame)
            found: dict[str, Any] = {}
            twice = set()
            for cas, cell in zip(sheet.cas, sheet.columns[column], strict=True):
                if cell is not None and found.setdefault(cas, cell) != cell:
                    twice.add(cas)
            self._columns[key] = {cas: cell for cas, cell in found.items() if cas not in twice}
        return self._columns[key]

    def _sheet(self, name: str) -> _Sheet:
        if name not in self._sheets:
            folder, _, file = _FILES[name].partition("/")
            self._sheets[name] = _read(_folder(folder) / file)
        return self._sheets[name]

    @cached_property
    def janaf(self) -> Mapping[str, Mapping[str, tuple[tuple[float, ...], tuple[float, ...]]]]:
        """Phase to CAS RN to temperatures [K] and heat capacities [J/mol/K]."""
        found = {}
        for phase, part in (("g", "gas"), ("l", "liq"), ("cr", "solid")):
            with (_folder("Heat Capacity") / f"JANAF_1998_{part}_Cp.json").open(encoding="utf-8") as file:
                found[phase] = {cas.strip(): (tuple(ts), tuple(cps)) for cas, (ts, cps) in json.load(file).items()}
        return found

    @cached_property
    def perry_solids(self) -> Mapping[str, tuple[Mapping[str, str], ...]]:
        """Rows of Perry's table 2-151 by formula in Hill order: its CAS RNs come from a look-up of names."""
        found: dict[str, list[Mapping[str, str]]] = {}
        with (_folder("Heat Capacity") / "Perrys Table 2-151.tsv").open(encoding="utf-8") as file:
            for row in csv.DictReader(file, delimiter="\t"):
                cells = {key.strip(): (value or "").strip() for key, value in row.items() if key}
                try:
                    formula = hill(parse_formula(cells["Formula"]).counts)
                except FormulaError:
                    continue
                found.setdefault(formula, []).append(cells)
        return {formula: tuple(rows) for formula, rows in found.items()}

    def zabransky(self, kind: str, shape: str) -> Mapping[str, Any]:
        """CAS RN to heat capacity: ``iso``, ``sat`` or ``const``; ``s`` spline or ``p`` quasi-polynomial."""
        return self._zabransky[kind, shape]

    @cached_property
    def _zabransky(self) -> Mapping[tuple[str, str], Mapping[str, Any]]:
        """As the library makes them of the rows of its file."""
        from chemicals.heat_capacity import PiecewiseHeatCapacity, ZabranskyQuasipolynomial, ZabranskySpline

        kinds = {"C": "const", "sat": "sat", "p": "iso"}
        splines: dict[tuple[str, str], dict[str, list[Any]]] = {(kind, "s"): {} for kind in kinds.values()}
        quasi: dict[tuple[str, str], dict[str, Any]] = {(kind, "p"): {} for kind in kinds.values()}
        sheet = _read(_folder("Heat Capacity") / "Zabransky.tsv")
        names = ("Data Type", "Tmin", "Tmax", "Tc", *(f"A{i}-spline" for i in range(1, 5)))
        columns = [sheet.columns[name] for name in (*names, *(f"A{i}-quasi" for i in range(1, 7)))]
        for cas, kind, tmin, tmax, tc, *a in zip(sheet.cas, *columns, strict=True):
            if a[0]:
                model = ZabranskySpline(tuple(a[:4]), tmin, tmax)
                splines[kinds[kind], "s"].setdefault(cas, []).append(model)
            else:
                quasi[kinds[kind], "p"][cas] = ZabranskyQuasipolynomial(tuple(a[4:]), tc, tmin, tmax)
        joined = {
            key: {cas: PiecewiseHeatCapacity(models) for cas, models in found.items()} for key, found in splines.items()
        }
        return {**joined, **quasi}

    @cached_property
    def crc_solids(self) -> Mapping[str, tuple[tuple[float, ...], tuple[float, ...]]]:
        """CAS RN to temperatures [K] and heat capacities [J/mol/K]: the table of solids, 200 to 600 K."""
        found = {}
        with (_folder("Heat Capacity") / "CRCHeatCapacitySolids.tsv").open(encoding="utf-8") as file:
            rows = csv.reader(file, delimiter="\t")
            ts = [float(cell) for cell in next(rows)[2:]]
            for row in rows:
                points = [(t, float(cell)) for t, cell in zip(ts, row[2:], strict=False) if cell.strip()]
                if len(points) > 1:
                    found[row[0].strip()] = (tuple(t for t, _ in points), tuple(cp for _, cp in points))
        return found

    def rows(self, frame: str) -> Mapping[str, Mapping[str, Any]]:
        """Rows of a table by CAS RN, the first where there are several; NaN for a blank cell."""
        if frame not in self._rows:
            sheet = self._sheet(frame)
            found: dict[str, Mapping[str, Any]] = {}
            for cas, *cells in zip(sheet.cas, *sheet.columns.values(), strict=True):
                if cas not in found:
                    filled = (nan if cell is None else cell for cell in cells)
                    found[cas] = dict(zip(sheet.columns, filled, strict=True))
            self._rows[frame] = found
        return self._rows[frame]


def _read(path: Path) -> _Sheet:
    """A table whose first column is the CAS RN."""
    with path.open(encoding="utf-8", newline="") as file:
        lines = csv.reader(file, delimiter="\t")
        _, *titles = next(lines)
        rows = [row for row in lines if row]
    columns = zip(*rows, strict=True)
    cas = tuple(cell.strip() for cell in next(columns))
    return _Sheet(cas, {title: _cells(cells) for title, cells in zip(titles, columns, strict=True)})


def _cells(texts: tuple[str, ...]) -> tuple[Any, ...]:
    try:
        return tuple(None if text in _BLANK else float(text) for text in texts)
    except ValueError:
        return tuple(None if text in _BLANK else text for text in texts)


def _folder(name: str) -> Path:
    import chemicals

    return Path(chemicals.__file__).parent / name
