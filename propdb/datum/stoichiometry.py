"""Express a species in basis species: exact rational elimination, charge being one more row.

The matrix has one row per element and one for charge, one column per basis species; :func:`solve` finds the
coefficients that make up the species.
:func:`check_independent` refuses a basis in which one member can be made of the others.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from fractions import Fraction
from typing import TypeAlias

from propdb.errors import DatumError
from propdb.model.records import ZeroState

__all__ = ["CHARGE", "Composition", "basis_for_phase", "check_independent", "solve"]

#: ``composition(species_name) -> ({element: count per formula unit}, charge)``
Composition: TypeAlias = Callable[[str], tuple[Mapping[str, Fraction | int], int]]

CHARGE = "charge"


def basis_for_phase(basis: Sequence[ZeroState], *, phase: str, composition: Composition) -> tuple[ZeroState, ...]:
    """Members of a basis that count for a species in ``phase``.

    A member with a charge carries charge in its own kind of phase only: H+(aq) for aqueous species, the electron gas
    for all others. That is how one basis serves both without being linearly dependent.
    """
    aqueous = phase == "aq"
    return tuple(z for z in basis if not composition(z.species)[1] or (z.phase == "aq") is aqueous)


def _column(species: str, composition: Composition) -> dict[str, Fraction]:
    atoms, charge = composition(species)
    column = {element: Fraction(count) for element, count in atoms.items() if count}
    if charge:
        column[CHARGE] = Fraction(charge)
    return column


def _reduce(matrix: list[list[Fraction]], columns: int) -> list[int]:
    """Gauss-Jordan elimination in place on the first ``columns`` columns; the pivot column of each leading row."""
    pivots: list[int] = []
    for column in range(columns):
        top = len(pivots)
        row = next((i for i in range(top, len(matrix)) if matrix[i][column]), None)
        if row is None:
            continue
        matrix[top], matrix[row] = matrix[row], matrix[top]
        lead = matrix[top][column]
        matrix[top] = [x / lead for x in matrix[top]]
        for i, other in enumerate(matrix):
            if i != top and other[column]:
                factor = other[column]
                matrix[i] = [x - factor * y for x, y in zip(other, matrix[top], strict=True)]
        pivots.append(column)
    return pivots


def check_independent(basis: Sequence[str], *, composition: Composition, where: str = "") -> None:
    """Refuse a basis in which one species can be made of the others.

    Parameters
    ----------
    basis : sequence of str
        Names of the basis species.

    Raises
    ------
    DatumError
        Naming the species that is one too many, or listed twice.
    """
    columns = [_column(name, composition) for name in basis]
    rows = sorted({row for column in columns for row in column})
    matrix = [[column.get(row, Fraction(0)) for column in columns] for row in rows]
    pivots = _reduce(matrix, len(columns))
    if len(pivots) == len(columns):
        return
    extra = next(i for i in range(len(columns)) if i not in pivots)
    if basis[extra] in basis[:extra]:
        raise DatumError(f"basis species {basis[extra]!r} is listed twice", where=where, hint="list each species once")
    made_of = [basis[pivot] for i, pivot in enumerate(pivots) if matrix[i][extra]]
    raise DatumError(
        f"basis species {basis[extra]!r} can be made of {', '.join(made_of)}, so the zero would be set twice",
        where=where,
        hint=f"leave {basis[extra]!r} or one of the others out",
    )


def solve(
    target: Mapping[str, Fraction | int],
    charge: int,
    *,
    basis: Sequence[str],
    composition: Composition,
    what: str,
    datum: str,
) -> tuple[Fraction, ...]:
    """Coefficients of the basis species that make up one formula unit of a species.

    Parameters
    ----------
    target : mapping
        Atoms per formula unit of the species.
    charge : int
        Its charge.
    basis : sequence of str
        Names of the basis species, linearly independent.
    what, datum : str
        Names of the species and the datum, for messages.

    Raises
    ------
    DatumError
        An element (or charge) of the species that the basis cannot express; the element is named.
    """
    columns = [_column(name, composition) for name in basis]
    wanted = {element: Fraction(count) for element, count in target.items() if count}
    if charge:
        wanted[CHARGE] = Fraction(charge)
    covered = {row for column in columns for row in column}
    missing = [row for row in wanted if row not in covered]
    if missing:
        lacks = " and ".join("charge" if row == CHARGE else row for row in missing)
        verb = "is" if len(missing) == 1 else "are"
        raise DatumError(
            f"{what} has no zero on {datum}: {lacks} {verb} not among the elements of its basis species",
            hint="use an elements datum such as elements-298K, or an own-state one such as gas-25C",
            elements=tuple(missing),
        )
    rows = sorted(covered)
    matrix = [[*(column.get(row, Fraction(0)) for column in columns), wanted.get(row, Fraction(0))] for row in rows]
    pivots = _reduce(matrix, len(columns))
    if len(pivots) < len(columns):
        raise DatumError(f"the basis species of {datum} are not independent", hint="see propdb datum show")
    if any(row[-1] for row in matrix[len(pivots) :]):
        raise DatumError(
            f"{what} has no zero on {datum}: its basis species do not add up to {what} in any proportion",
            hint="use an elements datum such as elements-298K",
            elements=tuple(wanted),
        )
    return tuple(row[-1] for row in matrix[: len(pivots)])
