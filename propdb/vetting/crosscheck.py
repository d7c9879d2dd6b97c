"""The cross-check: what other compilations say of an entry, and whether that makes it disputed.

An entry is compared where both have the quantity: a constant at its own temperature, a heat capacity at 298.15 K and at
both ends of the range that entry and compilation share. The difference may be the sum of the two expanded (95 %)
uncertainties; where a side states none, the limit of ``lineage.toml`` or the larger stated one.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import replace
from typing import Any

from propdb.cp.registry import build_heat_capacity, build_latent_heat
from propdb.errors import EquationError, PropdbError
from propdb.model.crosscheck import Crosscheck
from propdb.model.records import QUANTITIES, T_STANDARD, Entry, Source, Species
from propdb.store.content import Content
from propdb.units import format_number
from propdb.vetting.functions import Function, heat_capacities, latent_heats, same_formula
from propdb.vetting.library import library, library_version
from propdb.vetting.lineage import Lineage

__all__ = ["Checker", "disputing", "settle"]

#: H(298.15 K) - H(0 K) of the ideal electron gas [J/mol]: entries count it, ATcT has the electron at rest.
ELECTRON = 6197.0
#: What a table rounded to its last digit may differ by from the same table: enthalpies [J/mol], all else a fraction.
ROUNDING_ENTHALPY, ROUNDING = 60.0, 0.001
#: Printed temperatures of one state differ by this much [K].
SLACK = 1.0
#: Compilations that give carboxylic acids and HF to the monomer ideal gas; the others to the real vapour.
MONOMER = ("gharagheizi-2013",)
ENTHALPIES = ("Hf", "Gf", "Hvap", "Hfus", "Hsub")


class Checker:
    """Compares entries with the compilations of the open library; each entry once.

    Parameters
    ----------
    policy : mapping
        The policy ``lineage``, as ``lineage.toml`` has it.
    sources : iterable of Source
        For their own lineage.
    """

    def __init__(self, policy: Mapping[str, Any], sources: Iterable[Source] = ()) -> None:
        self.lineage = Lineage(policy, sources)
        self.package = library_version()
        self._library = library()
        self._decides = {row["key"]: bool(row["decides"]) for row in policy.get("compilation", ())}
        self._forms = {
            (row["species"], row["form"], quantity): row["cas"]
            for row in policy.get("form", ())
            for quantity in row.get("quantities", QUANTITIES)
        }
        self._limits = {quantity: row for row in policy.get("limit", ()) for quantity in row["quantities"]}
        self._done: dict[str, tuple[Crosscheck, ...]] = {}
        self._functions: dict[tuple[str, ...], tuple[Function, ...]] = {}

    def __call__(self, entry: Entry, species: Species) -> tuple[Crosscheck, ...]:
        """What the compilations say of an entry: independent ones first. Empty where none has the quantity."""
        if not entry.id:
            return self._ordered(entry, species)
        if entry.id not in self._done:
            self._done[entry.id] = self._ordered(entry, species)
        return self._done[entry.id]

    def _ordered(self, entry: Entry, species: Species) -> tuple[Crosscheck, ...]:
        found: dict[tuple[str, float | None], Crosscheck] = {}
        for check in self._checks(entry, species):
            found.setdefault((check.compilation, check.temperature), check)
        return tuple(sorted(found.values(), key=_order))

    # -- what there is to compare with ----------------------------------------------------------------------------

    def cas(self, entry: Entry, species: Species) -> str:
        """The CAS RN under which compilations list the phase and form of an entry; "" where they do not."""
        if species.kind != "species" or entry.phase not in ("cr", "l", "g", "aq"):
            return ""
        listed: str = self._forms.get((species.name, entry.form, entry.quantity), species.cas)
        return listed

    def functions(self, entry: Entry, species: Species) -> tuple[Function, ...]:
        """Functions of temperature that stand beside an entry."""
        cas = self.cas(entry, species)
        if cas and entry.quantity == "Cp":
            # Several entries of a species have the same beside them, and a table is made into a curve once.
            key = (cas, entry.phase, entry.form, species.name, species.formula)
            if key not in self._functions:
                found = heat_capacities(self._library, species, phase=entry.phase, form=entry.form, cas=cas)
                self._functions[key] = tuple(found)
            return self._functions[key]
        if cas and entry.quantity == "Hvap" and not _to_ideal_gas(entry):
            return tuple(latent_heats(self._library, cas=cas))
        return ()

    def _checks(self, entry: Entry, species: Species) -> Iterator[Crosscheck]:
        if not self.cas(entry, species):  # no compilation lists it, and the library need not be read
            return
        if entry.equation:
            yield from self._of_equation(entry, species)
        elif entry.value is not None:
            yield from self._of_constant(entry, species, entry.value)

    def _of_constant(self, entry: Entry, species: Species, value: float) -> Iterator[Crosscheck]:
        if entry.datum not in ("", "elements-298K", "elements-298K-1atm"):
            return
        t = entry.temperature
        for function in self.functions(entry, species):
            if t is not None and function.covers(t) and t not in function.splits:
                yield self._check(entry, function.compilation, t, value, function.at(t), function.uncertainty, True)
        for constant in self._library.constants(entry.quantity, entry.phase, self.cas(entry, species)):
            if constant.temperature is not None and (t is None or abs(constant.temperature - t) > SLACK):
                continue
            if constant.formula and not same_formula(constant.formula, species):
                continue
            if entry.quantity == "Hvap" and _to_ideal_gas(entry, species) != _monomer(constant.compilation, species):
                continue
            other = constant.value
            if constant.compilation == "atct-1.112" and species.charge and t:
                other += ELECTRON * species.charge
            yield self._check(entry, constant.compilation, t, value, other, constant.uncertainty, False)

    def _of_equation(self, entry: Entry, species: Species) -> Iterator[Crosscheck]:
        own = evaluator(entry)
        if own is None:
            return
        for function in self.functions(entry, species):
            for t in _temperatures(entry, function):
                try:
                    value = own(t)
                except PropdbError:
                    continue
                yield self._check(entry, function.compilation, t, value, function.at(t), function.uncertainty, True)
        if entry.tmin is not None and entry.tmax is not None and _within(entry, T_STANDARD):
            cas = self.cas(entry, species)
            for constant in self._library.constants(entry.quantity, entry.phase, cas):
                if constant.temperature == T_STANDARD:
                    other, size = constant.value, constant.uncertainty
                    yield self._check(entry, constant.compilation, T_STANDARD, own(T_STANDARD), other, size, False)

    def heating(self, entry: Entry, species: Species, start: float, end: float) -> tuple[Crosscheck, ...]:
        """The enthalpy of heating from ``start`` to ``end`` [K] by an entry's heat capacity, against the compilations.

        Values in J/mol, at ``end``; compilations that cover both ends and state no transition between them.
        """
        if entry.quantity != "Cp" or not entry.equation or entry.equation == "iapws95" or start == end:
            return ()
        value = float(build_heat_capacity(entry.equation, entry.params).dh(start, end))
        low, high = min(start, end), max(start, end)
        found = []
        for function in self.functions(entry, species):
            if function.covers(low) and function.covers(high) and not any(low < t < high for t in function.splits):
                other = function.integral(start, end)
                found.append(self._check(entry, function.compilation, end, value, other, function.uncertainty, True))
        return tuple(sorted(found, key=_order))

    # -- how far they may differ ----------------------------------------------------------------------------------

    def _check(
        self,
        entry: Entry,
        compilation: str,
        t: float | None,
        value: float,
        other: float,
        uncertainty: float | None,
        fraction: bool,
    ) -> Crosscheck:
        size = uncertainty * abs(other) if uncertainty is not None and fraction else uncertainty
        return Crosscheck(
            compilation=compilation,
            temperature=t,
            value=other,
            difference=value - other,
            allowed=self.allowed(entry, compilation, value, size) if self._decides.get(compilation) else None,
            independent=self.lineage.independent(entry.source, compilation),
            package=self.package,
        )

    def allowed(self, entry: Entry, compilation: str, value: float, uncertainty: float | None) -> float | None:
        """What the difference may be, in the unit of the entry; None for a quantity without a limit.

        ``uncertainty`` is the compilation's, expanded (95 %), as the value.
        """
        limit = self._limits.get(entry.quantity)
        if limit is None:
            return None
        if compilation == entry.source and entry.quantity not in ("Tb", "Tm"):
            return ROUNDING_ENTHALPY if entry.quantity in ENTHALPIES else ROUNDING * abs(value)
        standard = entry.standard_uncertainty()
        mine = None
        if standard is not None:
            mine = 2.0 * standard * (abs(value) if entry.uncertainty_unit == "%" else 1.0)
        if mine is not None and uncertainty is not None:
            return mine + uncertainty
        sizes = [float(limit[key]) * scale for key, scale in _scales(value) if key in limit]
        return max(min(sizes), mine or 0.0, uncertainty or 0.0)


def _order(check: Crosscheck) -> tuple[bool, bool, str, float]:
    """As a store lists them: independent ones first, those shown only last."""
    at = -1.0 if check.temperature is None else check.temperature
    return (not check.independent, check.allowed is None, check.compilation, at)


def _scales(value: float) -> tuple[tuple[str, float], ...]:
    return (("standard", 1.0), ("percent", abs(value) / 100.0))


def evaluator(entry: Entry) -> Any:
    """The value of an entry's equation as a function of temperature [K]; None where it has none of its own."""
    if entry.equation == "iapws95":
        return None
    try:
        if entry.quantity == "Cp":
            curve = build_heat_capacity(entry.equation, entry.params)
            return lambda t: float(curve.cp(t))
        heat = build_latent_heat(entry.equation, entry.params)
    except (EquationError, KeyError):
        return None
    return lambda t: float(heat.dh(t))


def _within(entry: Entry, t: float) -> bool:
    return entry.tmin is not None and entry.tmax is not None and entry.tmin - 0.155 <= t <= entry.tmax + 0.155


def _temperatures(entry: Entry, function: Function) -> list[float]:
    """298.15 K and both ends of the range that they share; of a table, printed temperatures that stand once."""
    if entry.tmin is None or entry.tmax is None:
        return []
    low, high = max(entry.tmin, function.tmin), min(entry.tmax, function.tmax)
    found = [T_STANDARD] if _within(entry, T_STANDARD) and function.covers(T_STANDARD) else []
    if function.nodes:
        inside = [t for t in function.nodes if low - 0.155 <= t <= high + 0.155]
        ends = [min(inside), max(inside)] if inside else []
    else:
        ends = [low, high] if low < high else []
    found += [t for t in ends if all(abs(t - other) > SLACK for other in found)]
    return sorted(set(found))


def _to_ideal_gas(entry: Entry, species: Species | None = None) -> bool:
    """Does a latent heat end at the ideal gas, of a species for which that makes a difference?"""
    if species is not None and species.vapour != "associating":
        return False
    return any(word in entry.conditions for word in ("ideal gas", "monomer"))


def _monomer(compilation: str, species: Species) -> bool:
    return species.vapour == "associating" and compilation in MONOMER


# -- verdict --------------------------------------------------------------------------------------------------------


def disputing(entry: Entry, checks: Iterable[Crosscheck]) -> tuple[Crosscheck, ...]:
    """The checks that make an entry disputed: the worst of each compilation.

    Independent compilations decide; where there is none, those of the same chain do, since a difference there is a slip
    in one of them or another edition. The same publication always does: its number has been copied wrongly.
    """
    known = [c for c in checks if c.allowed is not None]
    same = [c for c in known if c.compilation == entry.source]
    independent = [c for c in known if c.independent]
    chain = [c for c in known if not c.independent and c.compilation != entry.source]
    worst: dict[str, Crosscheck] = {}
    for check in (*same, *(independent or chain)):
        if check.beyond:
            held = worst.get(check.compilation)
            if held is None or _excess(check) > _excess(held):
                worst[check.compilation] = check
    return tuple(worst.values())


def _excess(check: Crosscheck) -> float:
    return abs(check.difference) / (check.allowed or 1e-300)


def settle(content: Content, checker: Checker) -> Content:
    """The content with base status ``disputed`` where compilations contradict an entry, the numbers in its note.

    Entries of another status than ``base`` keep it. What the seed says in the note stays, behind the numbers.
    """
    species = {one.name: one for one in content.species}
    statuses, notes = dict(content.statuses), dict(content.notes)
    for entry in content.entries:
        if statuses.get(entry.id, entry.status) != "base":
            continue
        against = disputing(entry, checker(entry, species[entry.species]))
        if not against:
            continue
        statuses[entry.id] = "disputed"
        said = "; ".join(against_text(entry, check) for check in against)
        note = notes.get(entry.id, entry.note)
        notes[entry.id] = f"{said}; {note}" if note else said
    return replace(content, statuses=statuses, notes=notes)


def against_text(entry: Entry, check: Crosscheck) -> str:
    """``crc-95 has -207.4 kJ/mol, here 207.4``; a heat capacity with its temperature and the difference in percent."""
    scale, unit = (1e-3, "kJ/mol") if entry.unit == "J/mol" else (1.0, entry.unit)
    if entry.unit == "Pa":
        scale, unit = 1e-5, "bar"
    if entry.unit == "1":
        unit = ""
    theirs, ours = check.value * scale, (check.value + check.difference) * scale
    digits = 5 if entry.quantity in ("Hf", "Gf") else 4
    at = f" at {check.temperature:.6g} K" if entry.equation and check.temperature is not None else ""
    texts = [format_number(number, significant=max(digits, _places(number))) for number in (theirs, ours)]
    return f"{check.compilation} has {texts[0]}{' ' + unit if unit else ''}{at}, here {texts[1]}"


def _places(number: float) -> int:
    """Significant digits that show one decimal."""
    return len(str(int(abs(number)))) + 1
