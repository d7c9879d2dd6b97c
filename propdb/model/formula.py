"""Chemical formulas, and the identifiers that stand beside them (CAS RN, InChIKey)."""

from __future__ import annotations

import math
import re
from collections.abc import Collection, Mapping
from dataclasses import dataclass
from fractions import Fraction
from types import MappingProxyType
from typing import Any, Final

from propdb.errors import FormulaError

#: The element symbols of IUPAC, by atomic number; deuterium is an element of its own here.
ELEMENTS: Final = (
    *("H", "He", "Li", "Be", "B", "C", "N", "O", "F", "Ne", "Na", "Mg", "Al", "Si", "P", "S", "Cl", "Ar", "K", "Ca"),
    *("Sc", "Ti", "V", "Cr", "Mn", "Fe", "Co", "Ni", "Cu", "Zn", "Ga", "Ge", "As", "Se", "Br", "Kr", "Rb", "Sr", "Y"),
    *("Zr", "Nb", "Mo", "Tc", "Ru", "Rh", "Pd", "Ag", "Cd", "In", "Sn", "Sb", "Te", "I", "Xe", "Cs", "Ba", "La", "Ce"),
    *("Pr", "Nd", "Pm", "Sm", "Eu", "Gd", "Tb", "Dy", "Ho", "Er", "Tm", "Yb", "Lu", "Hf", "Ta", "W", "Re", "Os", "Ir"),
    *("Pt", "Au", "Hg", "Tl", "Pb", "Bi", "Po", "At", "Rn", "Fr", "Ra", "Ac", "Th", "Pa", "U", "Np", "Pu", "Am", "Cm"),
    *("Bk", "Cf", "Es", "Fm", "Md", "No", "Lr", "Rf", "Db", "Sg", "Bh", "Hs", "Mt", "Ds", "Rg", "Cn", "Nh", "Fl", "Mc"),
    *("Lv", "Ts", "Og", "D"),
)

Count = int | Fraction

_KNOWN: Final = frozenset(ELEMENTS)
_LONGEST: Final = 400  # characters of a formula
_LARGEST: Final = 10**9 - 1  # atoms of one element (numerator and denominator), charges

_SUBSCRIPTS: Final = str.maketrans("₀₁₂₃₄₅₆₇₈₉", "0123456789")
_DOTS: Final = ".·⋅•∙*"
_SYMBOL: Final = re.compile(r"[A-Z][a-z]?")
_PLAIN: Final = re.compile(r"(?:[A-Z][a-z]?[0-9]{0,9})+")
_ATOMS: Final = re.compile(r"([A-Z][a-z]?)([0-9]*)")
_COUNT: Final = re.compile(r"([0-9]+)(?:/([0-9]+)|\.([0-9]+))?")
_SOLVATE: Final = re.compile(r"\.[0-9]*(?:[./][0-9]+)?(?:H2O|D2O|NH3)(?![a-z0-9])")
_CHARGE: Final = re.compile(
    r"""\((?P<size_a>[0-9]*)(?P<sign_a>[+-])\)       # SO4(2-)
      | \^(?P<size_b>[0-9]*)(?P<sign_b>[+-])(?![0-9]) # SO4^2-
      | (?<=\])(?P<size_c>[0-9]*)(?P<sign_c>[+-])    # [Fe(CN)6]4-
      | \^?(?P<sign_d>[+-])(?P<size_d>[0-9]+)        # SO4-2, SO4^-2
      | (?P<run>\++|-+)                              # NH4+, Ca++
    """,
    re.VERBOSE,
)
_RAISED: Final = re.compile(r"[⁰¹²³⁴-⁹]*[⁺⁻]$")
_RAISED_TO_PLAIN: Final = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻", "0123456789+-")
_CAS: Final = re.compile(r"([0-9]{2,7})-([0-9]{2})-([0-9])")
_INCHIKEY: Final = re.compile(r"[A-Z]{14}-[A-Z]{8}[SN]A-[A-Z]")


@dataclass(frozen=True, slots=True)
class Formula:
    """Atoms of each element and the charge, whatever the order they were written in.

    Parameters
    ----------
    counts : mapping of str to int or Fraction
        Atoms per formula unit [-]; kept in Hill order, read-only. Empty for the electron.
    charge : int
        In elementary charges [e].

    Raises
    ------
    FormulaError
        An unknown element, a count that is not positive, or neither atoms nor charge.
    """

    counts: Mapping[str, Count]
    charge: int = 0

    def __post_init__(self) -> None:
        if not self.counts and not self.charge:
            raise FormulaError("a formula has neither atoms nor charge", hint="write e.g. H2O, Na+ or e-")
        if abs(self.charge) > _LARGEST:
            raise FormulaError("a charge is too large to be one")
        tidy: dict[str, Count] = {}
        for element in _in_hill_order(self.counts):
            count = self.counts[element]
            if type(count) is int and 0 < count <= _LARGEST and element in _KNOWN:  # nearly always
                tidy[element] = count
                continue
            count = Fraction(count)
            if element not in _KNOWN:
                raise FormulaError(f"{element!r} is not an element", hint=_element_hint(element))
            if not (0 < count.numerator <= _LARGEST and count.denominator <= _LARGEST):
                raise FormulaError(f"the count of {element} is not positive or too large", hint="write e.g. H2O")
            tidy[element] = count.numerator if count.denominator == 1 else count
        object.__setattr__(self, "counts", MappingProxyType(tidy))

    def __hash__(self) -> int:
        return hash((tuple(self.counts.items()), self.charge))

    def __reduce__(self) -> tuple[Any, ...]:
        return (Formula, (dict(self.counts), self.charge))

    def __str__(self) -> str:
        return hill(self.counts, self.charge)


def parse_formula(text: str) -> Formula:
    """Read a formula: ``Ca(OH)2``, ``CuSO4.5H2O``, ``Fe0.947O``, ``NH4+``, ``SO4-2``, ``SO4(2-)``, ``SO4^2-``.

    A number before a sign counts atoms unless brackets or a caret set it apart: ``NH4+`` is four hydrogens and one
    charge, and so ``Ca2+`` is two calciums and one charge; the calcium ion is ``Ca+2``, ``Ca++``, ``Ca(2+)``,
    ``Ca^2+`` or ``Ca²⁺``. A point between digits is a decimal point after 0 or 1 (``Fe0.947O``) and at the end
    (``UO2.12``), a dot before crystal water or ammonia (``CuSO4.5H2O``), and refused otherwise. D is deuterium;
    ``e-`` is the electron.

    Raises
    ------
    FormulaError
        Not a formula; the message gives the position, counted from 1.
    """
    plain = text.strip().translate(_SUBSCRIPTS).replace("\u2212", "-")
    if len(plain) > _LONGEST:
        raise FormulaError(f"a formula of {len(plain)} characters is too long", hint=f"at most {_LONGEST}")
    raised = _RAISED.search(plain)
    if raised:
        plain = f"{plain[: raised.start()]}^{raised.group().translate(_RAISED_TO_PLAIN)}"
    counts = _plain(plain)
    if counts:
        return Formula(counts)
    offset = len(text) - len(text.lstrip())
    charge, end = _charge(plain)
    if plain[:end] == "e" and charge == -1:
        return Formula({}, -1)
    reader = _Reader(text, plain[:end], offset)
    return Formula(reader.read(), charge)


def _plain(text: str) -> dict[str, Count]:
    """Atoms of a formula that is symbols and whole numbers only, as most are; empty for any other."""
    if _PLAIN.fullmatch(text) is None:
        return {}
    counts: dict[str, Count] = {}
    for symbol, digits in _ATOMS.findall(text):
        count = int(digits or 1)
        if symbol not in _KNOWN or not count:  # what is wrong, and where, the reader says
            return {}
        counts[symbol] = counts.get(symbol, 0) + count
    return counts


def _charge(plain: str) -> tuple[int, int]:
    """Charge, and where the text before it ends. The first match that reaches the end is the longest."""
    for found in _CHARGE.finditer(plain):
        if found.end() != len(plain):
            continue
        named = found.groupdict()
        if named["run"]:
            size, sign = len(named["run"]), named["run"][0]
        else:
            key = next(k for k in "abcd" if named[f"sign_{k}"])
            digits, sign = named[f"size_{key}"], named[f"sign_{key}"]
            size = int(digits or 1) if len(digits) < 10 else _LARGEST + 1
            if size == 0:
                raise FormulaError(f"formula {plain!r} has a charge of zero", hint="leave the charge out")
        return (size if sign == "+" else -size), found.start()
    return 0, len(plain)


class _Reader:
    """Reads the atoms of one formula, left to right, brackets on a stack."""

    def __init__(self, typed: str, plain: str, offset: int) -> None:
        self.typed = typed
        self.plain = plain
        self.offset = offset  # of `plain` in what was typed
        self.at = 0

    def error(self, problem: str, hint: str, at: int | None = None) -> FormulaError:
        position = self.offset + (self.at if at is None else at) + 1
        shown = repr(self.typed if len(self.typed) <= 60 else self.typed[:57] + "...")
        return FormulaError(
            f"{problem} at position {position} of formula {shown}", hint=hint, formula=self.typed, position=position
        )

    def read(self) -> dict[str, Count]:
        """The whole formula: parts between dots, each with its own multiplier."""
        total: dict[str, Count] = {}
        while True:
            multiplier = self.count(leading=True)
            part, start = self.part(), self.at
            if not part:
                raise self.error("an element is missing", "write e.g. H2O", start)
            _add(total, part, multiplier)
            if self.at == len(self.plain):
                return total
            self.at += 1  # the dot

    def part(self) -> dict[str, Count]:
        """Up to a dot or the end."""
        stack: list[tuple[dict[str, Count], str, int]] = [({}, "", 0)]
        while self.at < len(self.plain):
            here, char = self.at, self.plain[self.at]
            if char in _DOTS:
                break
            if char in "([":
                stack.append(({}, char, here))
                self.at += 1
            elif char in ")]":
                group, opening, _ = stack.pop()
                if opening != {")": "(", "]": "["}[char]:
                    raise self.error(f"{char!r} closes nothing", "balance the brackets")
                if not group:
                    raise self.error("empty brackets", "write e.g. Ca(OH)2")
                self.at += 1
                _add(stack[-1][0], group, self.count())
            else:
                _add(stack[-1][0], {self.element(): 1}, self.count())
        if len(stack) > 1:
            raise self.error(f"{stack[-1][1]!r} is not closed", "balance the brackets", stack[-1][2])
        return stack[0][0]

    def element(self) -> str:
        found = _SYMBOL.match(self.plain, self.at)
        if found is None:
            char = self.plain[self.at]
            hint = "element symbols begin with a capital" if char.isalpha() else "write e.g. Ca(OH)2 or CuSO4.5H2O"
            if char.isdigit() and self.plain[self.at - 1 : self.at] == "[":
                hint = "isotopes are not told apart, except D"
            raise self.error(f"{char!r} is not expected", hint)
        symbol = found.group()
        if symbol not in _KNOWN:
            raise self.error(f"{symbol!r} is not an element", _element_hint(symbol))
        self.at = found.end()
        return symbol

    def count(self, *, leading: bool = False) -> Count:
        """The number here, or 1. Decides whether a point in it is a decimal point."""
        found = _COUNT.match(self.plain, self.at)
        if found is None:
            return 1
        whole, under, decimals = found.groups()
        end = found.end()
        if decimals is not None and not leading and whole not in ("0", "1"):
            if _SOLVATE.match(self.plain, found.end(1)):
                under, decimals, end = None, None, found.end(1)
            elif self.plain[end : end + 1] not in ("", ")", "]"):
                tail = self.plain[found.end(1) + 1 :]
                raise self.error(
                    "a point may be a decimal point or a dot",
                    f"write {self.plain[: found.end(1)]}·{tail} for the dot, a fraction for the count",
                    found.end(1),
                )
        if max(map(len, (whole, under or "", decimals or ""))) > 9:
            raise self.error("a count is too long", "write at most nine digits")
        value = Fraction(int(whole), int(under or 1) or 1) + (Fraction(f"0.{decimals}") if decimals else 0)
        if value == 0 or (under is not None and not int(under)):
            raise self.error("a count is zero", "leave the element out, or write its count")
        self.at = end
        return value.numerator if value.denominator == 1 else value


def _add(total: dict[str, Count], part: Mapping[str, Count], times: Count) -> None:
    for element, count in part.items():
        total[element] = total.get(element, 0) + count * times


def _element_hint(symbol: str) -> str:
    folded = symbol[:1].upper() + symbol[1:].lower()
    if folded != symbol and folded in _KNOWN:
        return f"did you mean {folded}?"
    if symbol == "T":
        return "tritium is not among the elements here"
    if symbol[:1] in _KNOWN and symbol[1:].upper() in _KNOWN:
        return f"did you mean {symbol[:1]}{symbol[1:].upper()}?"
    return "symbols are those of the periodic table, and D"


def _in_hill_order(elements: Collection[str]) -> list[str]:
    """With carbon C, H, then the alphabet; without, the alphabet (Hill, J. Am. Chem. Soc. 1900, 22, 478)."""
    found = sorted(elements)
    if "C" in elements:
        found.remove("C")
        found.insert(0, "C")
        if "H" in elements:
            found.remove("H")
            found.insert(1, "H")
    return found


def hill(counts: Mapping[str, Count], charge: int = 0) -> str:
    """The formula in Hill order, with its charge: ``C2H6O``, ``O4S^2-``, ``e^-``; :func:`parse_formula` reads it back.

    Parameters
    ----------
    counts : mapping of str to int or Fraction
        Atoms per formula unit [-].
    charge : int
        In elementary charges [e]; 0 gives the formula as :class:`~propdb.model.records.Species` keeps it.
    """
    body = "".join(f"{e}{'' if (n := counts[e]) == 1 else _count_text(n)}" for e in _in_hill_order(counts))
    if not charge:
        return body
    size = abs(charge)
    return f"{body or 'e'}^{size if size > 1 else ''}{'+' if charge > 0 else '-'}"


def _count_text(count: Count) -> str:
    if count == 1:
        return ""
    if isinstance(count, int) or count.denominator == 1:
        return str(int(count))
    rest = count.denominator
    for prime in (2, 5):
        while rest % prime == 0:
            rest //= prime
    if rest == 1 and count < 2:
        for places in range(1, 10):
            if count.numerator * 10**places % count.denominator == 0:
                digits = str(count.numerator * 10**places // count.denominator).rjust(places + 1, "0")
                return f"{digits[:-places]}.{digits[-places:]}"
    return f"{count.numerator}/{count.denominator}"


def normal(text: str) -> str:
    """The key under which a formula is looked up, the same for any order of its atoms: ``H6C2O`` gives ``C2H6O``.

    Raises FormulaError as :func:`parse_formula`.
    """
    formula = parse_formula(text)
    return hill(formula.counts, formula.charge)


def molar_mass(counts: Mapping[str, Count], atomic_weights: Mapping[str, float]) -> float:
    """Mass of one mole of atoms [kg/mol]; the mass of the electrons of a charge is left out.

    Parameters
    ----------
    counts : mapping of str to int or Fraction
        Atoms per formula unit [-].
    atomic_weights : mapping of str to float
        Standard atomic weights [g/mol].

    Raises
    ------
    FormulaError
        An element has no atomic weight.
    """
    missing = [element for element in counts if element not in atomic_weights]
    if missing:
        raise FormulaError(f"no atomic weight for {', '.join(missing)}", hint="give the molar mass", elements=missing)
    return math.fsum(float(count) * atomic_weights[element] for element, count in counts.items()) / 1000


def is_cas(text: str) -> bool:
    """Is this written like a CAS RN (``7732-18-5``)? Whether its check digit is right, :func:`check_cas` says."""
    return _CAS.fullmatch(text) is not None


def check_cas(text: str) -> str:
    """A CAS RN, without surrounding blanks, once its check digit has been found right.

    The check digit is the sum of the digits before it, weighted 1, 2, 3 ... from the right, modulo 10.

    Raises
    ------
    FormulaError
        Not written like a CAS RN, or a check digit that does not fit; the message gives the one that would.
    """
    number = text.strip()
    found = _CAS.fullmatch(number)
    if found is None:
        raise FormulaError(f"{number[:40]!r} is not a CAS RN", hint="write e.g. 7732-18-5")
    digits = found.group(1) + found.group(2)
    right = sum(weight * int(digit) for weight, digit in enumerate(reversed(digits), start=1)) % 10
    if int(found.group(3)) != right:
        raise FormulaError(
            f"CAS RN {number} has check digit {found.group(3)}, and its other digits give {right}",
            hint=f"did you mean {number[:-1]}{right}, or is another digit wrong?",
            cas=number,
            expected=right,
        )
    return number


def is_inchikey(text: str) -> bool:
    """Is this written like a standard or non-standard InChIKey (``XLYOFNOQVPJJNP-UHFFFAOYSA-N``)?"""
    return _INCHIKEY.fullmatch(text) is not None
