"""ThermoML to entries: heat capacities, enthalpies of transition and of formation of pure species.

What is not one of these is skipped, with the reason. A file that contradicts itself or its schema is refused.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace

from propdb.errors import InvalidInput, PropdbError
from propdb.intake.common import SI_UNIT
from propdb.intake.files import UserFile
from propdb.intake.plan import Candidate, Known, Plan, Skipped, settle
from propdb.intake.points import Point, check_table, table_params
from propdb.intake.thermoml_records import DataSet, Document, Property, Value, stated
from propdb.intake.thermoml_refs import Left, References
from propdb.intake.thermoml_xml import read_xml
from propdb.intake.written import MAX_ROWS
from propdb.model.records import T_STANDARD, Carrier, Entry
from propdb.units import read_si

__all__ = ["plan_thermoml"]

_HEAT_CAPACITY = re.compile(r"(?:Molar|Specific) heat capacity at (constant|saturation) pressure")
_VAPORISATION = re.compile(r"(?:Molar|Specific) enthalpy of vaporization or sublimation")
_FUSION = re.compile(r"(?:Molar|Specific) enthalpy of transition or fusion")
_REACTION = re.compile(r"(?:Molar )?enthalpy of reaction", re.IGNORECASE)
_FORMATION = "Formation of a compound from elements"
_DIRECT = ("", "Direct value, X")
#: Above this a liquid or solid is no longer what its heat capacity at 1 bar or saturation says [kPa].
_HIGHEST = 1000.0


def plan_thermoml(file: UserFile, known: Known) -> Plan:
    """What a ThermoML file holds.

    Raises
    ------
    InvalidInput
        The file as a whole cannot be read; see :func:`propdb.intake.thermoml_xml.read_xml`.
    """
    document = read_xml(file)
    count = sum(len(data.values) for data in document.data)
    if count > MAX_ROWS:
        hint = "split it by data sets, and give the parts in turn"
        raise InvalidInput(f"{count} values, and {MAX_ROWS} are taken at once", where=file.name, hint=hint)
    plan = Plan(file.name, "thermoml")
    importer = _Importer(document, plan, known)
    for data in document.data:
        try:
            importer.take(data)
        except PropdbError as error:
            plan.problems.append(error)
    used = {one.entry.species for one in plan.candidates}
    plan.species = {name: one for name, one in importer.references.new_species.items() if name in used}
    source = importer.references.new_source
    if source is not None and plan.candidates:
        plan.sources = {source.key: source}
    settle(plan, known)
    if not (plan.candidates or plan.skipped or plan.problems):
        plan.skipped.append(Skipped("", "the file", "it holds a citation and compounds, and no data"))
    return plan


def _phase(text: str) -> tuple[str, str]:
    """Phase and form of a phase of ThermoML; ("", "") for one that has none here."""
    plain = text.lower()
    if plain.startswith(("crystal", "metastable crystal")) and "mixture" not in plain and "compound" not in plain:
        return "cr", "" if plain in ("crystal", "crystal of unknown type") else plain
    return {"liquid": "l", "gas": "gas", "ideal gas": "g", "glass": "am"}.get(plain, ""), ""


_Taker = Callable[[DataSet, Property, Sequence[Value], str], Iterator[Candidate]]


class _Importer:
    """Data sets in, candidates and skipped ones out."""

    def __init__(self, document: Document, plan: Plan, known: Known) -> None:
        self.document, self.plan, self.known = document, plan, known
        self.references = References(document, known)

    def _bad(self, place: str, problem: str, hint: str = "") -> InvalidInput:
        return InvalidInput(problem, where=f"{self.document.file}, {place}", hint=hint)

    # -- data sets ----------------------------------------------------------------------------------------------------

    def _skip(self, place: str, what: str, why: str) -> None:
        self.plan.skipped.append(Skipped(place, what, why))

    def take(self, data: DataSet) -> None:
        """Take what can be taken of a data set, property by property."""
        labels = [self.document.compounds[number].label for number, _, _ in data.members]
        if data.reaction or data.place.startswith("reaction"):
            self._each(data, labels, self._formation)
        elif len(data.members) > 1:
            self._skip(data.place, " + ".join(labels), "a mixture: only pure species are taken")
        else:
            self._each(data, labels, self._pure)

    def _each(self, data: DataSet, labels: Sequence[str], reader: _Taker) -> None:
        for one in data.properties:
            place = data.place if len(data.properties) == 1 else f"{data.place}, property {one.number}"
            what = f"{one.name} of {' + '.join(labels[:3])}"
            values = [value for value in data.values if value.prop == one.number]
            try:
                if one.presentation not in _DIRECT:
                    raise Left(f"not a direct value but {one.presentation!r}")
                made = list(reader(data, one, values, place))
                if not made:
                    raise Left("no value is given")
                self.plan.candidates.extend(made)
            except Left as reason:
                self._skip(place, what, str(reason))

    def _pure(self, data: DataSet, one: Property, values: Sequence[Value], place: str) -> Iterator[Candidate]:
        heat = _HEAT_CAPACITY.fullmatch(one.name)
        if heat:
            yield from self._heat_capacity(data, one, values, place, saturated=heat.group(1) == "saturation")
        elif _VAPORISATION.fullmatch(one.name) or _FUSION.fullmatch(one.name):
            yield from self._transition(data, one, values, place)
        else:
            raise Left("not a heat capacity at constant pressure or saturation, nor an enthalpy of transition")

    def _formation(self, data: DataSet, one: Property, values: Sequence[Value], place: str) -> Iterator[Candidate]:
        if not data.reaction.startswith(_FORMATION):
            raise Left(
                f"a reaction of another kind ({data.reaction or 'not said which'}): only formation from elements"
            )
        if not _REACTION.fullmatch(one.name):
            raise Left("not an enthalpy of reaction")
        products = [m for m in data.members if not m[1] or float(m[1]) > 0]
        if len(data.members) > 1:
            elements = [m for m in data.members if m not in products]
            odd = [m for m in elements if len(dict(self.references.of(m[0]).composition)) != 1]
            if odd:
                raise Left(f"{self.document.compounds[odd[0][0]].label} on the left is not an element")
        if len(products) != 1:
            raise Left(f"{len(products)} products: which of them is formed is not clear")
        number, count, phase_name = products[0]
        if count and float(count) != 1:
            raise Left(f"the enthalpy of forming {count} mol at once")
        phase, form = _phase(one.phase or phase_name)
        if not phase or phase == "gas":
            raise Left(
                f"formed as {one.phase or phase_name or 'an unnamed phase'!r}: solid, liquid, glass or ideal gas"
            )
        for value in values:
            kelvin, text = self._temperature(data, value, place)
            datum = "elements-298K" if abs(kelvin - T_STANDARD) < 0.02 else "elements-same-T"
            if datum not in self.known.datums:
                raise Left(f"the store has no datum {datum}")
            at = T_STANDARD if datum == "elements-298K" else kelvin
            words = self._conditions(data, value)
            yield self._constant(data, one, value, number, place, "Hf", phase, form, at, datum=datum, conditions=words)

    def _transition(self, data: DataSet, one: Property, values: Sequence[Value], place: str) -> Iterator[Candidate]:
        start, end = self._ends(data, one)
        (number, _, _) = data.members[0]
        conditions = to = ""
        if end[0] in ("gas", "g"):
            quantity = {"l": "Hvap", "cr": "Hsub"}.get(start[0], "")
            if not quantity:
                raise Left(f"from {start[0]} to the gas")
            conditions = "to the real vapour" if end[0] == "gas" else "to the ideal gas"
        elif end == ("l", "") and start[0] == "cr":
            quantity = "Hfus"
        else:
            quantity, to = "Htr", ":".join(filter(None, end))
        for value in values:
            kelvin, _ = self._temperature(data, value, place)
            words = "; ".join(filter(None, (conditions, self._conditions(data, value) if quantity != "Hvap" else "")))
            if quantity in ("Hvap", "Hsub") and not float(value.value) > 0:
                raise self._bad(place, f"{quantity} of {value.value} {one.unit} is not positive", "check the sign")
            yield self._constant(data, one, value, number, place, quantity, *start, kelvin, to=to, conditions=words)

    def _ends(self, data: DataSet, one: Property) -> tuple[tuple[str, str], tuple[str, str]]:
        """The phase below the transition and the one above it."""
        number = data.members[0][0]
        phases = _two_phases(data, one)
        order = self._order(number)
        ranks = [order.get(phase) for phase in phases]
        if None in ranks or ranks[0] == ranks[1]:
            names = " and ".join(":".join(filter(None, phase)) for phase in phases)
            raise Left(f"which of {names} is stable below the transition is not clear from the file")
        low, high = sorted(phases, key=lambda phase: -order[phase])
        return low, high

    def _order(self, number: str) -> dict[tuple[str, str], int]:
        """Steps from a phase up to the gas, for those that transitions of the file join to the liquid or the gas."""
        pairs: list[tuple[tuple[str, str], tuple[str, str]]] = []
        for data in self.document.data:
            if len(data.members) == 1 and data.members[0][0] == number and not data.reaction:
                for one in data.properties:
                    if _VAPORISATION.fullmatch(one.name) or _FUSION.fullmatch(one.name):
                        try:
                            pairs.append(_two_phases(data, one))
                        except Left:
                            continue
        order = {("g", ""): 0, ("gas", ""): 0, ("l", ""): 1, ("am", ""): 2}
        if not any({a[0], b[0]} == {"cr"} for a, b in pairs):
            order |= {phase: 3 for pair in pairs for phase in pair if phase[0] == "cr"}
        step = 2
        edge = {("l", "")}
        while edge:
            edge = {b for pair in pairs for a, b in (pair, pair[::-1]) if a in edge and b[0] == "cr" and b not in order}
            order |= dict.fromkeys(edge, step)
            step += 1
        return order

    def _heat_capacity(
        self, data: DataSet, one: Property, values: Sequence[Value], place: str, *, saturated: bool
    ) -> Iterator[Candidate]:
        (number, _, _) = data.members[0]
        phase, form = _phase(one.phase or next(iter(data.phases), ""))
        if not phase or phase == "gas":
            raise Left(f"the phase ({one.phase or 'not said'}) is not a solid, liquid, glass or ideal gas")
        groups: dict[str, list[Value]] = {}
        for value in values:
            groups.setdefault("saturated" if saturated else self._conditions(data, value), []).append(value)
        left: list[str] = []
        for conditions, members in groups.items():
            pressure = re.fullmatch(r"([^ ]+) kPa", conditions)
            if pressure and float(pressure.group(1)) > _HIGHEST and phase != "g":
                left.append(conditions)
                continue
            yield from self._curve(data, one, members, number, place, phase, form, conditions)
        if left and len(left) == len(groups):
            raise Left(f"at {', '.join(left[:5])}: phase {phase} stands for 1 bar or saturation")
        if left:
            why = f"phase {phase} stands for 1 bar or saturation"
            self._skip(place, f"{one.name} at {', '.join(left[:5])}", why)

    def _curve(
        self,
        data: DataSet,
        one: Property,
        values: Sequence[Value],
        number: str,
        place: str,
        phase: str,
        form: str,
        conditions: str,
    ) -> Iterator[Candidate]:
        """One table, or a point for each value where they do not make one."""
        points = []
        for value in values:
            kelvin, _ = self._temperature(data, value, place)
            points.append(
                self._constant(data, one, value, number, place, "Cp", phase, form, kelvin, conditions=conditions)
            )
        curve = [
            Point(
                point.entry.temperature or 0.0,
                point.entry.value or 0.0,
                f"{self._temperature(data, value, place)[1]} {value.value}",
                None if not point.entry.uncertainty else point.entry.uncertainty / abs(point.entry.value or 1.0),
            )
            for point, value in zip(points, values, strict=True)
        ]
        why = check_table(curve)
        if why:
            if len(points) > 1:
                told = f"taken as {len(points)} values at one temperature each, not as a curve: {why}"
                self.plan.remarks.append((place, told))
            yield from points
            return
        yield self._table(points, curve, place)

    def _table(self, points: Sequence[Candidate], curve: Sequence[Point], place: str) -> Candidate:
        params = table_params(curve)
        first = points[0].entry
        kinds = {point.entry.uncertainty_kind for point in points}
        relative = [point.relative for point in curve]
        kind, size, note = "", None, first.note
        if kinds == {first.uncertainty_kind} and first.uncertainty_kind and None not in relative:
            kind = first.uncertainty_kind
            size = max(r for r in relative if r is not None)
            if len({round(r, 6) for r in relative if r is not None}) > 1:
                note = "; ".join(filter(None, (note, "uncertainty: the largest stated for a point, relative")))
        elif kinds != {""}:
            note = "; ".join(filter(None, (note, "uncertainties are not stated alike for all points: left out")))
        entry = replace(
            first,
            equation="table",
            temperature=None,
            value=None,
            carried=" | ".join(point.carried for point in curve),
            params=params,
            tmin=params["T"][0],
            tmax=params["T"][-1],
            uncertainty=size,
            uncertainty_unit="%" if kind else "",
            uncertainty_kind=kind,
            note=note,
        )
        return Candidate(place, entry, points[0].species, points[0].carrier)

    # -- values -------------------------------------------------------------------------------------------------------

    def _at(self, data: DataSet, value: Value, what: str) -> str:
        """Value of a variable or constraint as carried, "" where there is none."""
        for one in data.conditions:
            if one.what.partition(",")[0] == what:
                found = value.variables.get(one.number, "") if one.number else one.value
                if found:
                    return found
        return ""

    def _temperature(self, data: DataSet, value: Value, place: str) -> tuple[float, str]:
        text = self._at(data, value, "Temperature")
        if not text:
            raise Left("no temperature is given")
        kelvin = float(text)
        if not 0 < kelvin < 1e5:
            where = f"{place}, NumValues {value.row}"
            raise self._bad(where, f"a temperature of {text} K", "temperatures are in K, above 0")
        return kelvin, text

    def _conditions(self, data: DataSet, value: Value) -> str:
        """The pressure, where one is given."""
        text = self._at(data, value, "Pressure")
        return f"{text} kPa" if text else ""

    def _constant(
        self,
        data: DataSet,
        one: Property,
        value: Value,
        number: str,
        place: str,
        quantity: str,
        phase: str,
        form: str,
        kelvin: float,
        *,
        to: str = "",
        datum: str = "",
        conditions: str = "",
    ) -> Candidate:
        """An entry of one value."""
        species = self.references.of(number)
        dimension = "heat capacity" if quantity == "Cp" else "enthalpy"
        where = f"{place}, NumValues {value.row}"
        size, kind, told = stated(value.uncertainties, one.uncertainties)
        try:
            si = read_si(value.value, one.unit, dimension=dimension, molar_mass=species.molar_mass)  # type: ignore[arg-type]
            error = read_si(size, one.unit, dimension=dimension, molar_mass=species.molar_mass) if size else None  # type: ignore[arg-type]
        except InvalidInput as problem:
            raise self._bad(where, problem.problem, problem.hint) from None
        if error is not None and error < 0:
            raise self._bad(where, f"the uncertainty {size} is negative", "it is a positive number")
        if quantity == "Cp" and not 0 < si < 1e5:
            raise self._bad(where, f"a heat capacity of {value.value} {one.unit}", "check the value and the unit")
        if not error:
            error, kind = None, ""
        method = f"method: {one.method}" if one.method else ""
        entry = Entry(
            id="",
            species=species.name,
            quantity=quantity,
            phase=phase,
            form=form,
            to=to,
            equation="",
            temperature=kelvin,
            value=si,
            unit=SI_UNIT[dimension],
            carried=value.value,
            carried_unit=one.unit,
            params={},
            tmin=None,
            tmax=None,
            uncertainty=error,
            uncertainty_unit="",
            uncertainty_kind=kind,
            datum=datum,
            conditions=conditions,
            source=self.references.source.key,
            locator=f"ThermoML {place}",
            status="draft",
            note="; ".join(filter(None, (method, told))),
        )
        carrier = Carrier("ThermoML", self.document.version, self.document.file, data.number, "read from the file")
        return Candidate(where, entry, species, carrier)


def _two_phases(data: DataSet, one: Property) -> tuple[tuple[str, str], tuple[str, str]]:
    """The two phases between which a property lies. Raises Left where the file does not say."""
    names = [*data.phases, one.phase]
    found = list(dict.fromkeys(_phase(name) for name in names if name and not name.startswith("Air")))
    if len(found) != 2 or ("", "") in found:
        told = ", ".join(dict.fromkeys(filter(None, names))) or "none"
        raise Left(f"two phases are needed, and the file names {told}")
    return found[0], found[1]
