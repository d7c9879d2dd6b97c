"""Species, entries, sources and datums as text to read and as data for ``--json``."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from types import MappingProxyType
from typing import TYPE_CHECKING, Any, Final

from propdb.cli.text import columns, pairs
from propdb.errors import UnitError
from propdb.model.cite import text as reference
from propdb.units import format_number, format_pressure, format_temperature, parse_heat_capacity_unit, parse_unit

if TYPE_CHECKING:
    from propdb.model.records import Datum, Entry, Source, Species, ZeroState
    from propdb.model.sheet import SpeciesSheet
    from propdb.store.search import Match

#: What each quantity is called.
QUANTITY_WORDS: Final[Mapping[str, str]] = MappingProxyType(
    {
        "Hf": "enthalpy of formation",
        "Gf": "Gibbs energy of formation",
        "S": "standard entropy",
        "Cp": "heat capacity",
        "Hvap": "enthalpy of vaporisation",
        "Hfus": "enthalpy of fusion",
        "Hsub": "enthalpy of sublimation",
        "Htr": "enthalpy of transition",
        "dH0": "H(298.15 K) − H(0 K)",
        "Tb": "boiling point",
        "Tm": "melting point",
        "Tc": "critical temperature",
        "Pc": "critical pressure",
        "omega": "acentric factor",
    }
)
_KINDS: Final = {"expanded-95": "95 %", "standard": "standard", "maximum": "maximum", "class": "class default"}
NOT_STATED: Final = "not stated"


def match_dict(match: Match) -> dict[str, Any]:
    """A match as data: ``name, formula, cas, inchikey, score``."""
    return {
        "name": match.name,
        "formula": match.formula,
        "cas": match.cas,
        "inchikey": match.inchikey,
        "score": match.score,
    }


def matches_text(matches: Sequence[Match]) -> str:
    """Matches, the best first."""
    rows = [("name", "formula", "CAS RN", "InChIKey", "score")]
    rows += [(m.name, m.formula, m.cas, m.inchikey, f"{m.score:.0f}") for m in matches]
    return "\n".join(columns(rows, right=(4,)))


def species_lines(species: Species) -> list[str]:
    """Head of a sheet: name, formula, molar mass, identifiers, synonyms."""
    head = (
        f"{species.name}   {species.display_formula}   {format_number(species.molar_mass * 1e3, significant=7)} g/mol"
    )
    identity = [
        f"CAS RN {species.cas}" if species.cas else "",
        f"InChIKey {species.inchikey}" if species.inchikey else "",
    ]
    lines = [head, "   ".join(part for part in identity if part)]
    if species.synonyms:
        lines.append("also " + "; ".join(species.synonyms))
    if species.kind == "pseudo":
        lines.append("a pseudo-species with a stated composition")
    if species.vapour:
        lines.append(f"vapour: {species.vapour}")
    if species.note:
        lines.append(species.note)
    return [line for line in lines if line]


def sheet_text(sheet: SpeciesSheet) -> str:
    """A species with all its entries, by quantity, then the sources they come from."""
    lines = species_lines(sheet.species)
    body = [_row(entry) for entry in sheet.entries]
    heading = ("", "phase", "at", "value", "", "uncertainty", "datum, conditions", "source", "status", "entry")
    aligned = columns([heading, *body], right=(3,), indent=0)
    shown = ""
    if body:
        lines += ["", aligned[0]]
    for entry, line in zip(sheet.entries, aligned[1:], strict=True):
        if entry.quantity != shown:
            shown = entry.quantity
            lines += ["", f"{shown}: {QUANTITY_WORDS.get(shown, shown)}"]
        lines.append(line)
        lines += [f"      {text}" for text in coefficient_lines(entry)]
    used = {entry.source for entry in sheet.entries}
    cited = [source for source in sheet.sources.values() if source.key in used]
    if cited:
        lines += ["", "Sources", *pairs(((source.key, reference(source)) for source in cited), indent=2)]
    return "\n".join(lines)


def _row(entry: Entry) -> tuple[str, ...]:
    value, unit = (entry.carried, entry.carried_unit) if not entry.equation else (entry.equation, "")
    about = ", ".join(part for part in (entry.datum, entry.conditions) if part)
    return (
        " ",
        phase_text(entry),
        at_text(entry),
        value,
        unit if unit != "1" else "",
        uncertainty_text(entry),
        about,
        entry.source,
        entry.status,
        entry.id,
    )


def phase_text(entry: Entry) -> str:
    """Phase and form, and where a transition leads to."""
    phase = f"{entry.phase} ({entry.form})" if entry.form else entry.phase
    return f"{phase} to {entry.to}" if entry.to else phase


def at_text(entry: Entry) -> str:
    """Temperature of a constant, range of an equation."""
    if entry.equation and entry.tmin is not None and entry.tmax is not None:
        return f"{_kelvin(entry.tmin)} to {_kelvin(entry.tmax)} K"
    if entry.temperature is not None:
        return f"{_kelvin(entry.temperature)} K"
    return ""


def _kelvin(temperature: float) -> str:
    return format_temperature(temperature, decimals=3).removesuffix(" K")


def uncertainty_text(entry: Entry) -> str:
    """Uncertainty in the unit of the number as carried, with its kind; or that none is stated."""
    if entry.uncertainty is None:
        return NOT_STATED
    kind = _KINDS.get(entry.uncertainty_kind, entry.uncertainty_kind)
    if entry.uncertainty_unit == "%":
        size = f"{entry.uncertainty * 100:.3g} %"
    else:
        size = _like_carried(entry)
    return f"± {size} ({kind})" if kind else f"± {size}"


def _like_carried(entry: Entry) -> str:
    """The uncertainty with as many decimals as the number beside it, where these suffice."""
    size = entry.uncertainty or 0.0
    factor = _factor(entry)
    if factor is None:
        return f"{size:.3g} {entry.unit}"
    size /= factor
    decimals = len(entry.carried.partition(".")[2]) if "e" not in entry.carried.lower() else 0
    text = f"{size:.{decimals}f}"
    return text if abs(float(text) - size) <= 1e-6 * abs(size) else f"{size:.3g}"


def _factor(entry: Entry) -> float | None:
    """SI value of one unit of the number as carried; None where a temperature scale or a molar mass is in between."""
    if entry.carried_unit in (entry.unit, "1", "K", "C"):
        return 1.0
    for parse in (parse_unit, parse_heat_capacity_unit):
        try:
            unit = parse(entry.carried_unit)
        except UnitError:
            continue
        return unit.factor if unit.basis == "amount" else None
    return None


def coefficient_lines(entry: Entry) -> list[str]:
    """The coefficients of an equation, as they stand in the store."""
    if not entry.equation:
        return []
    return [f"{name}: {_value(value)}" for name, value in entry.params.items()]


def _value(value: Any) -> str:
    if isinstance(value, float):
        return f"{value:.12g}"
    if isinstance(value, Mapping):
        return ", ".join(f"{key} {_value(item)}" for key, item in value.items())
    if isinstance(value, (list, tuple)):
        return " ".join(_value(item) for item in value)
    return str(value)


def entry_dict(entry: Entry) -> dict[str, Any]:
    """An entry as data; the keys are a contract (``show --json``)."""
    return {
        "id": entry.id,
        "species": entry.species,
        "quantity": entry.quantity,
        "phase": entry.phase,
        "form": entry.form,
        "to": entry.to,
        "equation": entry.equation or None,
        "params": entry.params,
        "temperature": entry.temperature,
        "value": entry.value,
        "unit": entry.unit,
        "carried": {"number": entry.carried, "unit": entry.carried_unit, "as_printed": entry.printed},
        "tmin": entry.tmin,
        "tmax": entry.tmax,
        "uncertainty": None
        if entry.uncertainty is None
        else {
            "value": entry.uncertainty,
            "unit": "fraction" if entry.uncertainty_unit == "%" else entry.unit,
            "kind": entry.uncertainty_kind,
        },
        "datum": entry.datum or None,
        "conditions": entry.conditions,
        "status": entry.status,
        "source": entry.source,
        "locator": entry.locator,
        "note": entry.note,
        "carriers": entry.carriers,
        "crosscheck": None,
    }


def sheet_dict(sheet: SpeciesSheet) -> dict[str, Any]:
    """A species with all its entries as data."""
    return {"species": species_dict(sheet.species), "entries": [entry_dict(entry) for entry in sheet.entries]}


def species_dict(species: Species) -> dict[str, Any]:
    """A species as data; the molar mass in kg/mol."""
    return {
        "name": species.name,
        "formula": species.formula,
        "charge": species.charge,
        "cas": species.cas,
        "inchikey": species.inchikey,
        "molar_mass": species.molar_mass,
        "synonyms": species.synonyms,
        "kind": species.kind,
        "vapour": species.vapour,
        "note": species.note,
    }


def entry_text(entry: Entry) -> str:
    """One entry in full."""
    carried = f"{entry.carried} {entry.carried_unit if entry.carried_unit != '1' else ''}".strip()
    value = f"{entry.value:.10g} {entry.unit if entry.unit != '1' else ''}".strip() if entry.value is not None else ""
    carriers = "\n".join(
        ", ".join(
            part
            for part in (
                f"{carrier.package} {carrier.version}".strip(),
                carrier.file,
                f"row {carrier.row}" if carrier.row is not None else "",
                carrier.how,
            )
            if part
        )
        for carrier in entry.carriers
    )
    rows = [
        ("entry", entry.id),
        ("species", entry.species),
        ("quantity", f"{entry.quantity}: {QUANTITY_WORDS.get(entry.quantity, '')}"),
        ("phase", phase_text(entry)),
        ("equation", entry.equation),
        ("at", at_text(entry)),
        ("as printed" if entry.printed else "as carried", carried),
        ("value", value),
        ("coefficients", "\n".join(coefficient_lines(entry))),
        ("uncertainty", uncertainty_text(entry)),
        ("datum", entry.datum),
        ("conditions", entry.conditions),
        ("source", entry.source),
        ("locator", entry.locator),
        ("carried by", carriers),
        ("status", entry.status),
        ("note", entry.note),
    ]
    return "\n".join(pairs(rows))


def source_dict(source: Source) -> dict[str, Any]:
    """A source as data."""
    return {
        "key": source.key,
        "title": source.title,
        "authors": source.authors,
        "year": source.year,
        "kind": source.kind,
        "class": source.cls,
        **{name: text for name, text in source.fields.items() if text},
        "terms": source.terms,
        "carrier": source.carrier,
        "standard_pressure": source.standard_pressure,
        "note": source.note,
        "lineage": [{"copies": copies, "evidence": evidence} for copies, evidence in source.lineage],
    }


def sources_text(sources: Iterable[Source]) -> str:
    """Sources, one a line."""
    rows = [("key", "class", "year", "title")]
    rows += [(source.key, source.cls, str(source.year or ""), source.title) for source in sources]
    return "\n".join(columns(rows))


def source_text(source: Source) -> str:
    """One source in full."""
    rows = [
        ("source", source.key),
        ("reference", reference(source)),
        ("kind", source.kind),
        ("class", source.cls),
        ("standard pressure", format_pressure(source.standard_pressure)),
        ("terms", source.terms),
        ("carrier", source.carrier),
        ("copies", "\n".join(f"{copies}: {evidence}" for copies, evidence in source.lineage)),
        ("note", source.note),
    ]
    return "\n".join(pairs(rows))


def datum_dict(datum: Datum) -> dict[str, Any]:
    """A datum as data."""
    own = datum.kind == "own"
    found: dict[str, Any] = {
        "name": datum.name,
        "kind": datum.kind,
        "sentence": datum.sentence,
        "source": datum.source,
        "temperature": datum.temperature,
        "standard_pressure": datum.standard_pressure,
        "inline": datum.inline,
        "note": datum.note,
    }
    if own:
        found |= {
            "zero": datum.zero,
            "species": datum.per_species,
            "only_these_species": datum.only,
            "h0": datum.h0,
            "h0_unit": datum.h0_unit,
            "internal_energy": datum.internal_energy,
        }
    elif datum.kind == "elements":
        found["forms"] = {
            element: [{"up_to": None if upper == float("inf") else upper, "zero": zero} for upper, zero in schedule]
            for element, schedule in datum.schedule.items()
        }
    else:
        found["basis"] = datum.basis
    return found


_KIND_WORDS: Final = {
    "own": "own state: the species itself is zero",
    "elements": "elements: each element is zero",
    "basis": "basis species: each of them is zero",
}


def datums_text(datums: Iterable[Datum]) -> str:
    """Datums by kind, one a line with its sentence."""
    found = list(datums)
    lines: list[str] = []
    for kind, words in _KIND_WORDS.items():
        members = [(datum.name, datum.sentence) for datum in found if datum.kind == kind]
        if members:
            lines += ["", words, *pairs(members, indent=2)]
    return "\n".join(lines[1:])


def datum_text(datum: Datum) -> str:
    """One datum in full."""
    fixed = "internal energy" if datum.internal_energy else "enthalpy"
    own = datum.kind == "own"
    rows = [
        ("datum", datum.name),
        ("says", datum.sentence),
        ("kind", _KIND_WORDS[datum.kind]),
        ("zero", zero_text(datum.zero) if datum.zero is not None and not datum.only else ""),
        (fixed if own else "", f"{datum.h0:g} {datum.h0_unit} in that state" if own else ""),
        ("only for" if datum.only else "except", _zeros((name, zero) for name, zero in datum.per_species.items())),
        ("forms", "\n".join(_schedule(datum)) if datum.kind == "elements" else ""),
        ("basis species", _zeros((zero.species, zero) for zero in datum.basis)),
        ("standard pressure", "" if own else format_pressure(datum.standard_pressure)),
        ("source", datum.source),
        ("note", datum.note),
    ]
    return "\n".join(pairs(rows))


def _zeros(states: Iterable[tuple[str, ZeroState]]) -> str:
    return "\n".join(f"{name}: {zero_text(zero)}" for name, zero in states)


def _schedule(datum: Datum) -> list[str]:
    lines = []
    for element, schedule in datum.schedule.items():
        spans = []
        for upper, zero in schedule:
            where = f" up to {_kelvin(upper)} K" if upper != float("inf") else ""
            spans.append(f"{zero.species} {zero.phase}{f' ({zero.form})' if zero.form else ''}{where}")
        lines.append(f"{element}: {', then '.join(spans)}")
    return lines


def zero_text(zero: ZeroState) -> str:
    """A state named by a datum in words."""
    parts = [f"{zero.phase} ({zero.form})" if zero.form else zero.phase]
    if zero.saturated:
        parts.append(f"saturated {zero.saturated}")
    if zero.temperature == "same":
        parts.append("the temperature of the state")
    elif zero.temperature == "boiling":
        parts.append("its normal boiling point")
    else:
        parts.append(f"{_kelvin(zero.temperature)} K")
    if zero.pressure is not None:
        parts.append(format_pressure(zero.pressure))
    return ", ".join(parts)
