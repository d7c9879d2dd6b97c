"""Answers as text an engineer can read and file."""

from __future__ import annotations

from typing import TYPE_CHECKING

from propdb.model.answer import CAUTION, Answer, ReactionAnswer, _Derived
from propdb.model.crosscheck import difference_text, value_text
from propdb.model.text import columns, wrapped
from propdb.units import enthalpy_decimals, format_number, parse_unit

if TYPE_CHECKING:
    from propdb.model.crosscheck import EntryCheck
    from propdb.model.records import Step

__all__ = ["explain", "headline", "reaction_headline"]


def _paragraph(title: str, text: str) -> list[str]:
    return wrapped(text, f"{title:<14}")


def _number(value: float, unit: str, *, sign: bool = False) -> str:
    text = format_number(value, decimals=enthalpy_decimals(parse_unit(unit)))
    return text if not sign or text.startswith("-") or not text.strip("0.") else f"+{text}"


def _value(answer: _Derived) -> str:
    if answer.uncertainty:
        decimals = enthalpy_decimals(parse_unit(answer.unit))
        if answer.uncertainty >= 0.5 * 10.0**-decimals:
            return f"{_number(answer.value, answer.unit)} ± {_number(answer.uncertainty, answer.unit)} {answer.unit}"
    return f"{_number(answer.value, answer.unit)} {answer.unit}"


def headline(answer: Answer) -> str:
    """One line: what, value, standard uncertainty where every entry states one, datum."""
    who = (
        f"{answer.species} ({answer.formula})"
        if answer.formula and answer.formula != answer.species
        else answer.species
    )
    if answer.given:
        return f"{who}: {answer.given} = {_value(answer)} on {answer.datum}"
    return f"{who}, {answer.state}: {_value(answer)} on {answer.datum}"


def reaction_headline(answer: ReactionAnswer) -> str:
    """One line: equation, temperature, enthalpy of reaction."""
    return f"{answer.equation} at {answer.temperature:.7g} K: {_value(answer)}"


def explain(answer: _Derived) -> str:
    """The whole derivation."""
    lines = [str(answer), ""]
    if isinstance(answer, ReactionAnswer):
        lines += _routes(answer)
    lines += _steps(answer)
    lines += ["", *_paragraph("Uncertainty", answer.uncertainty_note), *_paragraph("To be summed", answer.may_sum.why)]
    lines += _closures(answer)
    lines += _crosschecks(answer)
    if answer.warnings:
        lines += ["", "Mind"]
        lines += [line for w in answer.warnings for line in wrapped(w, "  - ")]
    if answer.sources:
        lines += ["", "Sources"]
        from propdb.model.cite import text

        for key in sorted(answer.sources):
            lines.append(f"  {key}")
            lines += wrapped(text(answer.sources[key]), "    ")
    lines += ["", f"Store: {answer.store}", *wrapped(CAUTION, "")]
    return "\n".join(lines)


#: Closures shown; what lies between the path and the rest is smaller than any of these.
_MOST_CLOSURES = 10


def _closures(answer: _Derived) -> list[str]:
    """Closures that show in the last digit, largest first; in one line each those that are smaller, and that agree."""
    if not answer.closures:
        return []
    last = 0.5 * 10.0 ** -enthalpy_decimals(parse_unit(answer.unit))
    telling = sorted((c for c in answer.closures if abs(c.difference) >= last), key=lambda c: -abs(c.difference))
    same: dict[tuple[str, str, str], list[str]] = {}  # a source that says the same twice says it once
    for c in telling:
        within = "uncertainty not stated"
        if c.uncertainty is not None:
            within = f"combined standard uncertainty {_number(c.uncertainty, answer.unit)}"
        entries = same.setdefault((c.via, _number(c.difference, answer.unit, sign=True), within), [])
        entries += [f"[{c.entry[:8]}]"] if c.entry else []
    rows = [(*key, " ".join(entries)) for key, entries in same.items()]
    shown = rows[:_MOST_CLOSURES] if len(rows) > _MOST_CLOSURES + 1 else rows
    lines = [
        "",
        f"Closures: what unused data say, less the path above [{answer.unit}]",
        *columns(shown, right=(1,), indent=2, headed=False),
    ]
    if len(rows) > len(shown):
        lines.append(
            f"  {len(rows) - len(shown)} more differ by {rows[len(shown)][1].lstrip('+-')} or less; --json lists them"
        )
    agree = len(answer.closures) - len(telling)
    if agree:
        lines.append(f"  {agree} {'more ' if rows else ''}agree{'s' if agree == 1 else ''} to the last digit shown")
    return lines


def _crosschecks(answer: _Derived) -> list[str]:
    """Of each entry and compilation the check that differs most, of the same chain only where nothing else is known or
    too much lies between them; checks at the state itself all."""
    worst: dict[tuple[str, str], EntryCheck] = {}
    at_state = []
    alone = {one.entry.id for one in answer.crosscheck} - {
        one.entry.id for one in answer.crosscheck if one.check.independent and one.start is None
    }
    for one in answer.crosscheck:
        if one.start is not None:
            at_state.append(one)
            continue
        if not (one.check.independent or one.check.beyond or one.entry.id in alone):
            continue
        key = (one.entry.id, one.check.compilation)
        if key not in worst or _share(one) > _share(worst[key]):
            worst[key] = one
    if not worst and not at_state:
        return []
    rows: list[tuple[str, ...]] = [("entry", "", "at", "compilation", "has", "entry less it", "", "")]
    rows += [_check_row(one) for one in (*worst.values(), *at_state)]
    return ["", "Cross-check: the entries against other compilations", *columns(rows, right=(4, 5), indent=2)]


def _share(one: EntryCheck) -> float:
    return abs(one.check.difference) / (one.check.allowed or abs(one.check.value) or 1.0)


def _check_row(one: EntryCheck) -> tuple[str, ...]:
    entry, check = one.entry, one.check
    phase = f"{entry.phase} ({entry.form})" if entry.form else entry.phase
    at = "" if check.temperature is None else f"{check.temperature:.6g} K"
    what = entry.quantity
    if one.start is not None:
        at, what = f"{one.start:.6g} to {at}", "heating"
    return (
        f"{entry.species} {what} {phase}, {entry.source}",
        f"[{entry.id[:8]}]",
        at,
        check.compilation,
        value_text(check.value, one.unit),
        difference_text(check, one.unit),
        check.relation(entry.source),
        "more than allowed" if check.beyond else "",
    )


def _routes(answer: ReactionAnswer) -> list[str]:
    unit = answer.unit
    head = ("", "species", "state", f"H at T [{unit}]", "Hf at 298.15 K", "sensible heat", "from")
    rows = [head]
    rows += [
        (
            t.coefficient,
            f"{t.species}",
            t.state,
            _number(t.formation, unit),
            _number(t.standard, unit),
            _number(t.sensible, unit, sign=True),
            t.start,
        )
        for t in answer.terms
    ]
    lines = columns(rows, right=(0, 3, 4, 5), indent=2)
    lines.append("")
    lines += columns(
        [
            (
                "Route 1, formation at T",
                f"sum of coefficient x H at T on {answer.datum}",
                _number(answer.formation_route, unit, sign=True),
            ),
            (
                "Route 2, by 298.15 K",
                "heat of reaction at 298.15 K",
                _number(answer.reaction_standard, unit, sign=True),
            ),
            ("", "+ sensible heats, products less reactants", _number(answer.sensible, unit, sign=True)),
            ("", "=", _number(answer.sensible_route, unit, sign=True)),
            ("The routes differ by", "", _number(answer.disagreement, unit)),
        ],
        right=(2,),
        indent=2,
        headed=False,
    )
    lines.append("")
    return lines


def _steps(answer: _Derived) -> list[str]:
    unit = answer.unit
    head = ("step", "from", "to", unit, "source", "entry")
    rows: list[tuple[str, ...]] = [head]
    several = len({s.species for s in answer.steps}) > 1
    for s in answer.steps:
        entry = f"[{s.entry[:8]}]" if s.entry else ""
        rows.append((_what(s, several), s.start, s.end, _number(s.value, unit, sign=True), s.source, entry))
    total = sum(s.value for s in answer.steps)
    rows.append(("sum", "", "", _number(total, unit), "", ""))
    lines = columns(rows, right=(3,), indent=2)
    notes = dict.fromkeys(f"{_what(s, several)}: {s.note}" for s in answer.steps if s.note)
    return lines + [line for note in notes for line in wrapped(note, "  * ")]


def _what(step: Step, several: bool) -> str:
    mark = " (extrapolated)" if step.extrapolated else ""
    return f"{step.species}: {step.what}{mark}" if several and step.species else f"{step.what}{mark}"
