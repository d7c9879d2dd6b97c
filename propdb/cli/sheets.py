"""Species, entries, sources and datums as text to read and as data for ``--json``."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from decimal import Decimal
from types import MappingProxyType
from typing import TYPE_CHECKING, Any, Final

from propdb.cli.equationtext import equation_lines
from propdb.errors import UnitError
from propdb.model.cite import text as reference
from propdb.model.crosscheck import difference_text, telling, value_text
from propdb.model.records import QUANTITIES
from propdb.model.text import columns, kelvin, pairs
from propdb.units import format_number, parse_heat_capacity_unit, parse_unit

if TYPE_CHECKING:
    from propdb.model.records import Entry, Species
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
        "H": "tabulated enthalpy",
    }
)
_KINDS: Final = {"expanded-95": "95 %", "standard": "standard", "maximum": "maximum", "class": "class default"}
#: How the units of seed files are shown.
_UNITS: Final = {"1": "", "C": "°C"}
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
        f"{species.name}   {species.display_formula}   {format_number(species.molar_mass * 1e3, significant=6)} g/mol"
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
    entries = sorted(sheet.entries, key=lambda entry: QUANTITIES.index(entry.quantity))
    body = [_row(entry) for entry in entries]
    heading = (
        *("", "phase", "at", "value", "", "uncertainty", "datum, conditions", "source", "status"),
        *("cross-check", "", "entry"),
    )
    aligned = columns([heading, *body], right=(3,), indent=0)
    shown = ""
    if body:
        lines += ["", aligned[0]]
    for entry, line in zip(entries, aligned[1:], strict=True):
        if entry.quantity != shown:
            shown = entry.quantity
            lines += ["", f"{shown}: {QUANTITY_WORDS.get(shown, shown)}"]
        lines.append(line)
        lines += [f"      {text}" for text in _equation(entry)]
    used = {entry.source for entry in entries}
    cited = [source for source in sheet.sources.values() if source.key in used]
    if cited:
        lines += ["", "Sources", *pairs(((source.key, reference(source)) for source in cited), indent=2)]
    return "\n".join(lines)


def _row(entry: Entry) -> tuple[str, ...]:
    value, unit = comparable(entry) if not entry.equation else (entry.equation, "")
    about = ", ".join(part for part in (entry.datum, entry.conditions) if part)
    return (
        " ",
        phase_text(entry),
        at_text(entry),
        value,
        _UNITS.get(unit, unit),
        uncertainty_text(entry, listed=True),
        about,
        entry.source,
        entry.status,
        *_telling(entry),
        entry.id,
    )


def _telling(entry: Entry) -> tuple[str, str]:
    """The most telling cross-check: difference with its compilation, and how they are related."""
    check = telling(entry.crosschecks)
    if check is None:
        return "", ""
    return f"{difference_text(check, entry.unit)} {check.compilation}", check.relation(entry.source)


def crosscheck_lines(entry: Entry) -> list[str]:
    """Every cross-check of an entry, one a line."""
    rows = []
    for check in entry.crosschecks:
        at = f"at {kelvin(check.temperature)} K" if check.temperature is not None else ""
        within = "shown only" if check.allowed is None else f"allowed {value_text(check.allowed, entry.unit)}"
        rows.append(
            (
                check.compilation,
                at,
                value_text(check.value, entry.unit),
                difference_text(check, entry.unit),
                check.relation(entry.source),
                f"beyond {within}" if check.beyond else within,
            )
        )
    return columns(rows, right=(2, 3))


def comparable(entry: Entry) -> tuple[str, str]:
    """A constant in the unit that all entries of its quantity are listed in, digit by digit: kJ/mol, K.

    The number as carried stands in ``propdb entry show``.
    """
    if entry.carried_unit == "J/mol":
        return _exact(Decimal(entry.carried).scaleb(-3)), "kJ/mol"
    if entry.carried_unit == "C":
        return _exact(Decimal(entry.carried) + Decimal("273.15")), "K"
    return entry.carried, entry.carried_unit


def _exact(number: Decimal) -> str:
    text = f"{number:f}"
    whole, point, decimals = text.partition(".")
    return f"{whole}{point}{decimals.rstrip('0').ljust(min(len(decimals), 3), '0')}" if point else text


def phase_text(entry: Entry) -> str:
    """Phase and form, and where a transition leads to."""
    phase = f"{entry.phase} ({entry.form})" if entry.form else entry.phase
    return f"{phase} to {entry.to}" if entry.to else phase


def at_text(entry: Entry) -> str:
    """Temperature of a constant, range of an equation."""
    if entry.equation and entry.tmin is not None and entry.tmax is not None:
        return f"{kelvin(entry.tmin)} to {kelvin(entry.tmax)} K"
    if entry.temperature is not None:
        return f"{kelvin(entry.temperature)} K"
    return ""


def uncertainty_text(entry: Entry, *, listed: bool = False) -> str:
    """Uncertainty with its kind, or that none is stated; in the unit as carried, or as :func:`comparable` lists it."""
    if entry.uncertainty is None:
        return NOT_STATED
    kind = _KINDS.get(entry.uncertainty_kind, entry.uncertainty_kind)
    if entry.uncertainty_unit == "%":
        size = f"{entry.uncertainty * 100:.3g} %"
    elif listed and entry.carried_unit == "J/mol":
        size = f"{entry.uncertainty / 1e3:.4g}"
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


def _equation(entry: Entry, *, full: bool = False) -> list[str]:
    return equation_lines(entry.equation, entry.params, full=full) if entry.equation else []


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
        "crosscheck": [check.as_dict(entry.source) for check in entry.crosschecks],
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
    carried = f"{entry.carried} {_UNITS.get(entry.carried_unit, entry.carried_unit)}".strip()
    value = f"{entry.value:.10g} {_UNITS.get(entry.unit, entry.unit)}".strip() if entry.value is not None else ""
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
        ("coefficients", "\n".join(_equation(entry, full=True))),
        ("uncertainty", uncertainty_text(entry)),
        ("datum", entry.datum),
        ("conditions", entry.conditions),
        ("source", entry.source),
        ("locator", entry.locator),
        ("carried by", carriers),
        ("status", entry.status),
        ("note", entry.note),
    ]
    lines = pairs(rows)
    if entry.crosschecks:
        lines += ["", f"Cross-check, the entry less what others have ({entry.crosschecks[0].package})"]
        lines += [f"  {line}" for line in crosscheck_lines(entry)]
    return "\n".join(lines)
