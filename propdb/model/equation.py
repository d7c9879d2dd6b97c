"""Reaction equations as text: ``CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)``."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Final

from propdb.errors import FormulaError
from propdb.model.formula import Count, parse_formula
from propdb.model.records import PHASES

#: Phases as people write them -> as propdb does. IUPAC's s is a solid of unstated structure, here its crystal.
_PHASES: Final[Mapping[str, str]] = {**{phase: phase for phase in PHASES}, "s": "cr"}
_MEANT: Final[Mapping[str, str]] = {
    "gas": "g",
    "v": "g",
    "vap": "g",
    "vapor": "g",
    "vapour": "g",
    "liq": "l",
    "liquid": "l",
    "sol": "cr",
    "solid": "cr",
    "c": "cr",
    "cryst": "cr",
    "crystal": "cr",
    "ao": "aq",
    "ai": "aq",
    "glass": "am",
    "vit": "am",
    "fl": "fluid",
}
_EXAMPLE: Final = "CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)"
_LONGEST: Final = 2000  # characters of an equation

_ARROW: Final = re.compile(r"->|=>|=|→")
_ARROW_LIKE: Final = re.compile(r"[-=<>→←↔⇌⇄⟶]+")
_PLUS: Final = re.compile(r"(?:(?<=\s)|^)\+(?=\s|$)")
_JOINED: Final = re.compile(r"\+\s*[0-9./]*\s*[A-Za-z(\[]")
_COEFFICIENT: Final = re.compile(r"([0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:\s*/\s*([0-9]+))?")
_VULGAR: Final[Mapping[str, Fraction]] = {
    "½": Fraction(1, 2),
    "⅓": Fraction(1, 3),
    "⅔": Fraction(2, 3),
    "¼": Fraction(1, 4),
    "¾": Fraction(3, 4),
}
_GROUP: Final = re.compile(r"\(([^()]*)\)$")
_WORD: Final = re.compile(r"[a-z]+")


@dataclass(frozen=True, slots=True)
class ReactionTerm:
    """One species of a reaction equation, as written.

    coefficient
        Positive, on either side [-].
    name
        Name, formula or identifier of the species, without phase.
    phase
        One of :data:`~propdb.model.records.PHASES`, or "" where none is written.
    form
        Such as ``graphite``, or "".
    position
        Where the term begins in the equation, counted from 1; not compared.
    """

    coefficient: Fraction
    name: str
    phase: str = ""
    form: str = ""
    position: int = field(default=1, compare=False)

    def __str__(self) -> str:
        inside = f"{self.phase},{self.form}" if self.form else self.phase
        times = "" if self.coefficient == 1 else f"{self.coefficient} "
        return f"{times}{self.name}({inside})" if inside else f"{times}{self.name}"


@dataclass(frozen=True, slots=True)
class ReactionEquation:
    """A reaction equation: what is consumed and what is formed."""

    reactants: tuple[ReactionTerm, ...]
    products: tuple[ReactionTerm, ...]

    @property
    def signed(self) -> tuple[tuple[Fraction, ReactionTerm], ...]:
        """Stoichiometric numbers with their terms: negative for reactants, positive for products."""
        return (
            *((-term.coefficient, term) for term in self.reactants),
            *((term.coefficient, term) for term in self.products),
        )

    def __str__(self) -> str:
        return " -> ".join(" + ".join(map(str, side)) for side in (self.reactants, self.products))


def parse_equation(text: str) -> ReactionEquation:
    """Read a reaction equation.

    Each term is a coefficient (``2``, ``1/2``, ``0.5``, or none), a name or formula, and a phase with an optional form:
    ``2 carbon dioxide(g)``, ``C(cr,graphite)``, ``Na+(aq)``. ``2H2O`` is read as ``2 H2O``, while the digit of
    ``2-butanol`` belongs to the name. A plus between terms has blanks around it, so that a charge is never one.
    Arrows: ``->``, ``=>``, ``=``, ``→``. The phase ``s`` is read as ``cr``.

    Parameters
    ----------
    text : str
        The equation.

    Raises
    ------
    FormulaError
        Not a reaction equation; the message gives the position, counted from 1. Whether the species exist and the
        equation balances is not looked at: see :func:`imbalance`.
    """
    if len(text) > _LONGEST:
        raise FormulaError(f"an equation of {len(text)} characters is too long", hint=f"at most {_LONGEST}")
    start, end = _arrow(text)
    return ReactionEquation(_side(text, 0, start), _side(text, end, len(text)))


def imbalance(terms: Iterable[tuple[Count, Mapping[str, Count], int]]) -> dict[str, Fraction]:
    """What a reaction makes from nothing (positive) or loses (negative); empty when it balances.

    Parameters
    ----------
    terms : iterable of (stoichiometric number, counts, charge)
        Number negative for reactants [-]; atoms of each element [-]; charge [e].

    Returns
    -------
    dict of str to Fraction
        Element symbol, or ``charge``, to the excess of products over reactants [-].
    """
    total: dict[str, Fraction] = {}
    for number, counts, charge in terms:
        for element, count in counts.items():
            total[element] = total.get(element, Fraction(0)) + Fraction(number) * count
        total["charge"] = total.get("charge", Fraction(0)) + Fraction(number) * charge
    return {what: excess for what, excess in total.items() if excess}


def _error(problem: str, text: str, at: int, hint: str) -> FormulaError:
    """An error at a place in the equation, counted from 0."""
    shown = repr(text if len(text) <= 80 else text[:77] + "...")
    return FormulaError(
        f"{problem} at position {at + 1} of equation {shown}", hint=hint, equation=text, position=at + 1
    )


def _arrow(text: str) -> tuple[int, int]:
    arrows = list(_ARROW.finditer(text))
    if not arrows:
        raise FormulaError(f"{text[:80]!r} has no arrow", hint=f"write -> as in {_EXAMPLE}", equation=text)
    if len(arrows) > 1:
        raise _error("a second arrow", text, arrows[1].start(), "write one arrow, ->")
    (arrow,) = arrows
    for run in _ARROW_LIKE.finditer(text):
        if run.start() <= arrow.start() < run.end() and run.group() != arrow.group():
            # `-->` and `<=>`; also `Cl-->`, where a charge touches the arrow
            raise _error(f"{run.group()!r} is not an arrow", text, run.start(), "write -> with blanks around it")
    return arrow.start(), arrow.end()


def _side(text: str, start: int, end: int) -> tuple[ReactionTerm, ...]:
    """The terms of one side; `start` and `end` are places in the whole text."""
    part = text[start:end]
    if not part.strip():
        raise _error("one side is empty", text, start, f"write e.g. {_EXAMPLE}")
    terms: list[ReactionTerm] = []
    at = 0
    for plus in (*_PLUS.finditer(part), None):
        stop = plus.start() if plus else len(part)
        piece = part[at:stop]
        begin = start + at + len(piece) - len(piece.lstrip())
        if not piece.strip():
            raise _error("a term is missing", text, min(begin, len(text) - 1), f"write e.g. {_EXAMPLE}")
        terms.append(_term(piece.strip(), text, begin))
        at = plus.end() if plus else stop
    return tuple(terms)


def _term(piece: str, text: str, at: int) -> ReactionTerm:
    body, phase, form = _phase(piece, text, at)
    coefficient, name = _coefficient(body, text, at)
    if not name:
        raise _error("a species is missing", text, at, "write e.g. 2 H2O(l)")
    joined = _JOINED.search(body)
    if joined:
        raise _error("a plus without blanks", text, at + joined.start(), "put blanks around a + between species")
    return ReactionTerm(coefficient, name, phase, form, at + 1)


def _phase(piece: str, text: str, at: int) -> tuple[str, str, str]:
    """Split ``C (cr, graphite)`` into ``C``, ``cr``, ``graphite``. Brackets that hold no phase belong to the name."""
    found = _GROUP.search(piece)
    if found is None:
        return piece, "", ""
    place = at + found.start()
    body = piece[: found.start()].rstrip()
    phase, comma, form = (part.strip() for part in found.group(1).partition(","))
    if phase in _PHASES and body:
        if comma and not form:
            raise _error("a form is missing", text, place, f"write ({phase}) or e.g. (cr,graphite)")
        if form and _PHASES[phase] != "cr":
            raise _error(f"{phase!r} has no forms", text, place, f"write ({phase}); only cr has forms")
        return body, _PHASES[phase], form
    if phase in _PHASES:
        raise _error("a species is missing", text, at, "write e.g. 2 H2O(l)")
    meant = _MEANT.get(phase, phase.lower() if phase.lower() in _PHASES else "")
    if meant and body:
        raise _error(f"{phase!r} is not a phase", text, place, f"did you mean ({meant}{',' if form else ''}{form})?")
    times = _COEFFICIENT.match(body)
    bare = body[times.end() :].strip() if times else body
    if _WORD.fullmatch(phase) and (comma or _is_formula(bare)):
        hint = f"phases are {', '.join(PHASES)}"
        if not comma:
            hint = f"did you mean {bare[:40]}(cr,{phase})? {hint}"
        raise _error(f"{phase!r} is not a phase", text, place, hint)
    return piece, "", ""


def _coefficient(body: str, text: str, at: int) -> tuple[Fraction, str]:
    if body[:1] in _VULGAR:
        return _VULGAR[body[0]], body[1:].lstrip()
    found = _COEFFICIENT.match(body)
    if found is None:
        if body[:1] == "-" and body[1:2].isdigit():
            raise _error("a coefficient is negative", text, at, "put the species on the other side")
        return Fraction(1), body
    rest = body[found.end() :]
    name = rest.lstrip()
    if name and rest == name and not _is_formula(name):
        return Fraction(1), body  # the digits are part of the name: 2-butanol, 1,3-butadiene
    number, under = found.groups()
    if len(number) > 12 or len(under or "") > 12:
        raise _error("a coefficient is too long", text, at, "write at most twelve digits")
    if not float(number) or (under and not int(under)):
        raise _error("a coefficient is zero", text, at, "leave the species out, or write its coefficient")
    return Fraction(number) / int(under or 1), name


def _is_formula(text: str) -> bool:
    try:
        parse_formula(text)
    except FormulaError:
        return False
    return True
