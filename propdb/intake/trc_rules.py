"""What a row of the TRC gas tables says of its temperature, what other sources say of it, and the verdict."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Final

from propdb.model.records import R_GAS, T_STANDARD

__all__ = [
    "ALONE",
    "AT_0",
    "AT_298",
    "NEITHER",
    "UNKNOWN",
    "Heard",
    "Witness",
    "counted_from",
    "decide",
    "hear",
]

AT_0: Final = "0 K"
AT_298: Final = "298.15 K"
NEITHER: Final = "neither"
UNKNOWN: Final = "unknown"
#: What :func:`decide` says where the constant stands alone; the verdict is then ``unknown``.
ALONE: Final = "alone"

#: No gas has less than the translation and p V of its molecules, 5/2 R T; tables are rounded.
_LEAST_INCREMENT: Final = 2.5 * R_GAS * T_STANDARD - 50.0
#: A table that counts from 298.15 K has H(298.15 K) = 0 but for the fit [J/mol].
_FIT: Final = 1000.0
#: Numbers printed to 0.1 kJ/mol, and an increment as exact, agree within this if one was copied from the other [J/mol].
_EQUAL: Final = 150.0
#: Beyond this two sources contradict each other [J/mol]: nine of ten pairs of sources differ by less than 8.8 kJ/mol.
_CONTRADICTS: Final = 10_000.0
#: A witness tells two readings apart if the farther is this many times as far, and by this much [J/mol].
_TIMES: Final = 3.0
_APART: Final = 3000.0
#: A source that is no estimate confirms a number within this [J/mol], about 1 kcal/mol.
_CLOSE: Final = 4000.0


@dataclass(frozen=True, slots=True)
class Witness:
    """Another source's enthalpy of formation of the gas at 298.15 K.

    source
        Its key, or two joined by "+" where the value is a sum (liquid and vaporisation).
    value
        [J/mol]
    estimate
        Whether the source estimates it: then it testifies by being equal only.
    """

    source: str
    value: float
    estimate: bool = False


@dataclass(frozen=True, slots=True)
class Heard:
    """What a witness said.

    says
        ``0 K``, ``298.15 K``, ``neither``, or "" where it cannot tell the temperatures apart.
    off
        Its distance from the number at that temperature, or from the nearer of both [J/mol].
    estimate
        As of the witness.
    """

    source: str
    says: str
    off: float
    estimate: bool = False


def counted_from(increment: float | None) -> str:
    """From where a table counts H(T), by its H(298.15 K) [J/mol]: ``0 K``, ``298.15 K``, "" where it does not tell."""
    if increment is None:
        return ""
    if abs(increment) <= _FIT:
        return AT_298
    return AT_0 if increment >= _LEAST_INCREMENT else ""


def hear(value: float, shift: float | None, witness: Witness) -> Heard:
    """What a witness says of a number.

    Parameters
    ----------
    value : float
        The number as it stands [J/mol].
    shift : float or None
        Brings it from 0 K to 298.15 K [J/mol]; None where that is not known.
    """

    def said(says: str, off: float) -> Heard:
        return Heard(witness.source, says, off, witness.estimate)

    off = abs(value - witness.value)
    if shift is None:
        # What it would be from 0 K is not known: agreement as it stands, or contradiction, is all that shows.
        if off <= (_EQUAL if witness.estimate else _CLOSE):
            return said(AT_298, off)
        return said(NEITHER if off > _CONTRADICTS and not witness.estimate else "", off)
    off_0 = abs(value + shift - witness.value)
    near, far = sorted((off_0, off))
    reading = AT_0 if off_0 < off else AT_298
    if near <= _EQUAL < far - near:
        return said(reading, near)
    if witness.estimate:
        return said("", near)
    if near > _CONTRADICTS:
        return said(NEITHER, near)
    return said(reading if far >= _TIMES * near and far - near >= _APART else "", near)


def decide(
    value: float, *, increment: float | None, elements: float | None, witnesses: Sequence[Witness]
) -> tuple[str, str, tuple[Heard, ...]]:
    """Verdict and reason for one number, and what each witness said.

    Parameters
    ----------
    value : float
        The number as it stands [J/mol].
    increment : float or None
        H(298.15 K) of the row's own equation with its constant of integration [J/mol].
    elements : float or None
        Sum of H(298.15 K) - H(0 K) over the elements of the compound [J/mol].
    witnesses : sequence of Witness
    """
    counted = counted_from(increment)
    if not counted:
        if increment is None:
            return UNKNOWN, "the table has no constant of integration", ()
        return UNKNOWN, f"the table's H(298.15 K), {increment:.0f} J/mol, counts neither from 0 K nor from 298.15 K", ()
    shift = None
    if counted == AT_0:
        if elements is None or increment is None:
            return UNKNOWN, "H(298.15 K) - H(0 K) of an element is not known", ()
        shift = increment - elements
    heard = tuple(hear(value, shift, witness) for witness in witnesses)
    other = AT_298 if counted == AT_0 else AT_0
    base = f"its H(T) counts from {counted}"
    voices = Counter(each.says for each in heard if each.says)
    equal = {each.says for each in heard if each.says and each.off <= _EQUAL}
    if voices[other] > voices[counted] or (other in equal and counted not in equal):
        return UNKNOWN, f"{base}, but the number at {other} is that of {_named(heard, other)}", heard
    if any(each.says == counted and (each.off <= _CLOSE and not each.estimate) for each in heard):
        return counted, f"{base}; confirmed by {_named(heard, counted)}", heard
    # Estimates that equal it are copies: they tell the temperature, but not that the number is right.
    doubted = [each for each in heard if not each.estimate and each.off > _CLOSE]
    if voices[counted] and not doubted:
        return counted, f"{base}; the same number as {_named(heard, counted)}", heard
    if doubted and all(each.says == NEITHER for each in doubted):
        return NEITHER, f"{base}; contradicted by {_named(heard, NEITHER)} both at 0 K and at 298.15 K", heard
    if doubted:
        away = ", ".join(f"{each.source} is {each.off / 1000.0:.1f} kJ/mol away" for each in doubted)
        return UNKNOWN, f"{base}, but {away}", heard
    return ALONE, f"{base}, and no other source tells the temperatures apart", heard


def _named(heard: Iterable[Heard], says: str) -> str:
    return ", ".join(each.source for each in heard if each.says == says)
