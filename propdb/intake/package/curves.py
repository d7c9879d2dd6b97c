"""Readers of heat-capacity equations and tables, and of enthalpies of vaporisation over temperature."""

from __future__ import annotations

from typing import Any, Final

from propdb.cp.registry import build_heat_capacity
from propdb.intake.package import transitions
from propdb.intake.package.constants import REAL, crystal_form, form_in
from propdb.intake.package.registry import Refused
from propdb.intake.package.sheet import NO_RANGE, Row, Sheet
from propdb.model.records import R_GAS

__all__ = [
    "crc_solids",
    "janaf_table",
    "perry_liquid",
    "perry_liquid_reduced",
    "perry_mixed",
    "perry_vaporisation",
    "poling_gas",
    "trc_gas",
    "vdi_vaporisation",
    "zabransky",
]

_CALORIE: Final = 4.184  # the thermochemical calorie [J]
_CLASSES: Final = {"I": 0.001, "II": 0.0025, "III": 0.005, "IV": 0.01, "V": 0.03}
_TYPES: Final = {"p": "isobaric", "sat": "along saturation", "C": "averaged over isobaric and saturation values"}


def _carried(row: Row, *columns: str) -> str:
    return " ".join(row.text(column) or "0" for column in columns)


def _range(sheet: Sheet) -> tuple[float, float]:
    low, high = sheet.number("Tmin"), sheet.number("Tmax")
    if low is None or high is None:
        raise Refused("no range", "the file gives no range, and an equation without one is not used")
    if low > high:
        raise Refused("range the wrong way round", f"Tmin {low:g} K is above Tmax {high:g} K")
    return low, high


def janaf_table(phase: str) -> Any:
    """JANAF: a table of heat capacities of one phase. Points at 0 K are no data of a gas, and are left out."""

    def read(sheet: Sheet, row: Row) -> None:
        cas = row.text("CAS")
        name, formula = sheet.context.janaf.get(cas, ("", ""))
        draft, form = sheet.place(cas, name, formula)
        if phase == "cr":
            form = crystal_form(sheet, draft, name, form)
        else:
            form = ""
        printed = list(zip(row.cells["T"], row.cells["cp"], strict=True))
        melting = None
        if phase == "l":
            sheet.context.liquids[cas] = printed
        elif phase == "cr" and cas in sheet.context.liquids:
            liquid = sheet.context.liquids[cas]
            melting = transitions.melting_point(crystal=printed, liquid=liquid)
            transitions.record(sheet, draft, name, form, crystal=printed, liquid=liquid, melting=melting)
        points, notes = tidy_points(transitions.merged(printed, at=None if phase == "l" else melting))
        sheet.report.points_left_out += len(row.cells["T"]) - len(points)
        if len(points) < 2:
            raise Refused("no table", "fewer than two points are left")
        _table(sheet, draft, phase, form, points, notes)

    return read


def tidy_points(points: list[tuple[float, float]]) -> tuple[list[tuple[float, float]], list[str]]:
    """Points that make a table: going up, a temperature at most twice, two or more on each side of a doubled one.

    Returns them with what to say about those left out.
    """
    notes = []
    kept = [(float(t), float(cp)) for t, cp in points]
    if kept and kept[0][0] == 0.0:
        notes.append("the point at 0 K is left out: a limit, or a blank printed as 0, through which no curve goes")
        kept = kept[1:]
    if any(b[0] < a[0] for a, b in zip(kept, kept[1:], strict=False)):
        raise Refused("temperatures go down", "the temperatures of the table do not go up")
    if any(not cp > 0.0 for _, cp in kept):
        raise Refused("not positive", "a heat capacity of the table is not positive")
    inner = range(1, len(kept) - 1)
    middle = {i for i in inner if kept[i - 1][0] == kept[i][0] == kept[i + 1][0]}
    single = [point for i, point in enumerate(kept) if i not in middle]
    if len(single) < len(kept):
        notes.append("a temperature printed three times or more keeps its first and last value")
    sides: list[list[tuple[float, float]]] = []
    for point in single:
        if not sides or sides[-1][-1][0] == point[0]:
            sides.append([])
        sides[-1].append(point)
    long = [side for side in sides if len(side) > 1]
    if len(long) < len(sides):
        notes.append("a side of a doubled temperature that has one point only is left out")
    joined: list[tuple[float, float]] = []
    for side in long:
        if joined and joined[-1][0] != side[0][0]:
            break  # a side between two others is gone: what lies beyond is not joined to what lies before
        joined += side
    if sum(map(len, long)) > len(joined):
        notes.append("points beyond a side that was left out are left out too")
    return joined, notes


def _table(
    sheet: Sheet, draft: Any, phase: str, form: str, points: list[tuple[float, float]], notes: list[str]
) -> None:
    temperatures, values = zip(*points, strict=True)
    doubled = [a for a, b in zip(temperatures, temperatures[1:], strict=False) if a == b]
    if doubled:
        notes = [*notes, f"split at {', '.join(f'{t:g} K' for t in doubled)}: the file states no enthalpy for it"]
    sheet.curve(
        draft,
        "Cp",
        phase,
        "table",
        {"T": list(temperatures), "cp": list(values)},
        carried=f"{len(points)} points",
        carried_unit="J/mol/K",
        tmin=temperatures[0],
        tmax=temperatures[-1],
        form=form,
        note="; ".join(notes),
        check=False,  # as tidy_points leaves it a table is one; its spline would be made for nothing
    )


def crc_solids(sheet: Sheet, row: Row) -> None:
    """CRC: heat capacities of solids at seven temperatures."""
    columns = [column for column in row.cells if column.isdigit()]
    name = row.text("NAME/T(K) J/mol/K")
    draft, form = sheet.place(row.text("CASRN"), name)
    form = crystal_form(sheet, draft, name, form) or form_in(draft, name)
    points = [(float(column), value) for column in columns if (value := sheet.number(column)) is not None]
    points, notes = tidy_points(points)
    if len(points) < 2:
        raise Refused("no table", "fewer than two values")
    _table(sheet, draft, "cr", form, points, notes)


def poling_gas(sheet: Sheet, row: Row) -> None:
    """Poling: cp/R of the ideal gas as a polynomial, and cp of gas and liquid at 298.15 K."""
    draft, _ = sheet.place(row.text("CAS"), row.text("Chemical"))
    names = ("a0", "a1", "a2", "a3", "a4")
    if row.text("a0"):
        try:
            low, high = _range(sheet)
        except Refused as refusal:
            sheet.refuse(refusal.kind, refusal.reason, "a0")
        else:
            _polynomial(sheet, draft, "g", sheet.numbers(*names), R_GAS, low, high, _carried(row, *names), "R")
    sheet.constant(draft, "Cp", "g", "Cpg")
    sheet.constant(draft, "Cp", "l", "Cpl")


def _polynomial(
    sheet: Sheet,
    draft: Any,
    phase: str,
    numbers: list[float],
    factor: float,
    low: float,
    high: float,
    carried: str,
    unit: str,
    *,
    exponents: tuple[int, ...] = (0, 1, 2, 3, 4),
    **more: Any,
) -> None:
    terms = [(n, c * factor) for n, c in zip(exponents, numbers, strict=True) if c] or [(0, 0.0)]
    params = {
        "exponents": [n for n, _ in terms],
        "coefficients": [c for _, c in terms],
        "tmin": low,
        "tmax": high,
    }
    sheet.curve(
        draft, "Cp", phase, "polynomial", params, carried=carried, carried_unit=unit, tmin=low, tmax=high, **more
    )


def perry_liquid(sheet: Sheet, row: Row) -> None:
    """Perry, table 2-153: cp of liquids as a polynomial, J/kmol/K."""
    draft, _ = sheet.place(row.text("CAS"), row.text("Chemical"))
    low, high = _range(sheet)
    names = ("A", "B", "C", "D", "E")
    if low == high:
        value = sum(c * low**n for n, c in enumerate(sheet.numbers(*names)))
        sheet.constant(
            draft,
            "Cp",
            "l",
            "A",
            unit="J/kmol/K",
            factor=1e-3,
            temperature=low,
            value=value,
            carried=_carried(row, *names),
            note="the range is one temperature: the value of the equation there",
        )
        return
    _polynomial(sheet, draft, "l", sheet.numbers(*names), 1e-3, low, high, _carried(row, *names), "J/kmol/K")


def perry_vaporisation(sheet: Sheet, row: Row) -> None:
    """Perry, table 2-150: enthalpies of vaporisation to the real vapour."""
    critical = sheet.number("Tc")
    if critical is not None:
        sheet.context.critical[row.text("CAS")] = (row.text("Tc"), critical)
    draft, _ = sheet.place(row.text("CAS"), row.text("Chemical"))
    low, high = _range(sheet)
    names = ("C1", "C2", "C3", "C4")
    params = {"coefficients": sheet.numbers(*names), "Tc": critical, "tmin": low, "tmax": high}
    sheet.curve(
        draft,
        "Hvap",
        "l",
        "perry-vaporisation",
        params,
        carried=f"{_carried(row, *names)}; Tc {row.text('Tc')} K",
        carried_unit="J/mol",
        tmin=low,
        tmax=high,
        conditions=REAL,
    )


def perry_liquid_reduced(sheet: Sheet, row: Row) -> None:
    """Perry, table 2-153, the equation in reduced temperature; its Tc stands in table 2-150."""
    cas = row.text("CAS")
    draft, _ = sheet.place(cas, row.text("Name"))
    low, high = _range(sheet)
    if cas not in sheet.context.critical:
        raise Refused("no critical temperature", "the equation needs Tc, and table 2-150 does not list the compound")
    text, critical = sheet.context.critical[cas]
    names = ("A", "B", "C", "D")
    if sheet.number("E"):
        raise Refused("no equation", "the equation has four coefficients, and the fifth is not 0")
    params = {
        "coefficients": sheet.numbers(*names),
        "Tc": critical,
        "tmin": low,
        "tmax": high,
        "scale": 1e-3,
    }
    sheet.curve(
        draft,
        "Cp",
        "l",
        "perry-liquid",
        params,
        carried=f"{_carried(row, *names)}; Tc {text} K (table 2-150)",
        carried_unit="J/kmol/K",
        tmin=low,
        tmax=high,
    )


def vdi_vaporisation(sheet: Sheet, row: Row) -> None:
    """VDI: enthalpies of vaporisation to the real vapour; no range but the critical temperature."""
    draft, _ = sheet.place(row.text("CAS"), row.text("Chemical"))
    critical = sheet.number("Tc")
    names = ("A", "B", "C", "D", "E")
    sheet.curve(
        draft,
        "Hvap",
        "l",
        "vdi-vaporisation",
        {"coefficients": sheet.numbers(*names), "Tc": critical},
        carried=f"{_carried(row, *names)}; Tc {row.text('Tc')} K",
        carried_unit="R Tc",
        tmin=None,
        tmax=critical,
        conditions=REAL,
        note=f"{NO_RANGE}: the equation ends at the critical temperature and has no lower end",
    )


def zabransky(sheet: Sheet, row: Row) -> None:
    """Zábranský: cp of liquids as a cubic or a quasi-polynomial, with a class of uncertainty."""
    draft, _ = sheet.place(row.text("CASRN"), row.text("Name"))
    low, high = _range(sheet)
    cubic, quasi = [f"A{i}-spline" for i in range(1, 5)], [f"A{i}-quasi" for i in range(1, 7)]
    given = [names for names in (cubic, quasi) if any(sheet.numbers(*names))]
    if len(given) != 1:
        raise Refused("no equation", "neither or both of its equations have coefficients")
    names = given[0]
    params: dict[str, Any] = {"a": sheet.numbers(*names), "tmin": low, "tmax": high}
    equation = "zabransky-cubic"
    carried = _carried(row, *names)
    if names is quasi:
        equation = "zabransky-quasi"
        params["Tc"] = sheet.number("Tc")
        carried += f"; Tc {row.text('Tc')} K"
        if params["Tc"] is None:
            raise Refused("no critical temperature", "the equation needs Tc, and the row gives none")
    letter = row.text("Data Type")
    if letter not in _TYPES:
        raise Refused("unknown type", f"{letter!r} is none of p, sat, C")
    mark = row.text("Uncertainty")
    doubt, kind = _CLASSES.get(mark), "class"
    note = f"class {mark}" + (": above 3 %, no limit is stated" if mark == "VI" else "")
    if low == high:
        params |= {"tmin": low - 1.0, "tmax": high + 1.0}
        value = float(build_heat_capacity(equation, params).cp(low)) / R_GAS
        sheet.constant(
            draft,
            "Cp",
            "l",
            names[0],
            temperature=low,
            conditions=_TYPES[letter],
            value=value,
            carried=carried,
            unit="R",
            factor=R_GAS,
            note=f"{note}; the range is one temperature: the value of the equation there",
            uncertainty=None if doubt is None else doubt * value,
            kind=kind,
        )
        return
    sheet.curve(
        draft,
        "Cp",
        "l",
        equation,
        params,
        carried=carried,
        carried_unit="R",
        tmin=low,
        tmax=high,
        conditions=_TYPES[letter],
        note=note,
        uncertainty=doubt,
        kind=kind,
    )


def trc_gas(sheet: Sheet, row: Row) -> None:
    """TRC: cp of the ideal gas with its constants of integration, and a formation enthalpy of unknown temperature."""
    draft, _ = sheet.place(row.text("CAS"), row.text("Chemical"))
    low, high = _range(sheet)
    names = [f"a{i}" for i in range(8)]
    params: dict[str, Any] = {"a": sheet.numbers(*names), "tmin": low, "tmax": high}
    for constant in ("I", "J"):
        number = sheet.number(constant)
        if number is not None:
            params[constant] = number
    sheet.curve(
        draft,
        "Cp",
        "g",
        "trc-gas",
        params,
        carried=_carried(row, *names, "I", "J"),
        carried_unit="R",
        tmin=low,
        tmax=high,
    )
    sheet.constant(
        draft,
        "Hf",
        "g",
        "Hfg",
        temperature=None,
        datum="",
        conditions="at 0 K or at 298.15 K: the file does not say",
        status="datum-unknown",
    )


def perry_mixed(sheet: Sheet, row: Row) -> None:
    """Perry, table 2-151: crystals, glasses, liquids and gases, in calories; trusted by its formula."""
    formula = row.text("Formula")
    main, sub = row.text("main phase"), row.text("subphase")
    phase = {"c": "cr", "gls": "am", "l": "l", "g": "g"}.get(main)
    if phase is None:
        raise Refused("unknown phase", f"{main!r} is none of c, gls, l, g")
    draft, form = sheet.place(row.text("Ful CAS"), formula, formula, trust="formula")
    if phase == "cr":
        form = form_in(draft, sub) or (sub.lower() if sub else "") or crystal_form(sheet, draft, "", form)
    else:
        form = ""
    glass = f"glass of {sub}" if phase == "am" and sub else ""
    names = ("Constant Term", "+*T term", "/T^2 term", "*T^2 term")
    numbers = sheet.numbers(*names)
    text = row.text("%error").rstrip("a").strip()
    percent = float(text) if text else 0.0
    note = "" if not row.text("%error").endswith("a") else "error printed with a footnote a"
    doubt = percent / 100.0 or None
    carried, unit = _carried(row, *names), "cal_th/mol/K"
    low, high = sheet.number("Tmin"), sheet.number("Tmax")
    if low is not None and high is not None and low < high:
        more = {"form": form, "conditions": glass, "uncertainty": doubt, "kind": "maximum", "note": note}
        _polynomial(sheet, draft, phase, numbers, _CALORIE, low, high, carried, unit, exponents=(0, 1, -2, 2), **more)
        return
    if any(numbers[1:]):
        raise Refused("no range", "the file gives no range, and an equation without one is not used")
    if low is not None and high is not None and low > high:
        raise Refused("range the wrong way round", f"Tmin {low:g} K is above Tmax {high:g} K")
    remark = "" if low is not None else f"{NO_RANGE}: the file gives no temperature for this value"
    sheet.constant(
        draft,
        "Cp",
        phase,
        "Constant Term",
        unit=unit,
        factor=_CALORIE,
        temperature=low,
        form=form,
        conditions=glass,
        note="; ".join(filter(None, (note, remark))),
        uncertainty=None if doubt is None else doubt * numbers[0],
        kind="maximum",
    )
