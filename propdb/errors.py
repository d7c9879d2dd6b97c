"""Every error that propdb raises, in one tree.

::

    PropdbError                       exit code
    ├── InvalidInput                      2   something typed cannot be understood
    │   ├── UnitError                         a unit unknown or of the wrong dimension
    │   ├── TemperatureError                  a temperature that is not one
    │   ├── PressureError
    │   ├── FormulaError                      a formula, CAS RN or reaction equation that cannot be read
    │   ├── EquationError                     coefficients that do not make a heat-capacity or latent-heat equation
    │   └── DatumError                        a datum definition that contradicts itself
    ├── NotFound                          3   no such species, source, entry, datum, phase, form
    ├── Ambiguous                         4   more than one species answers to the name
    ├── OutOfRange                        5   a state outside every range, or a phase that cannot exist there
    │   ├── TemperatureOutOfRange
    │   ├── NoSuchState
    │   └── SplitError                        an enthalpy across a transition whose enthalpy nobody states
    ├── NoData                            6   an entry or leg that is needed and missing
    ├── DatumMismatch                     7   values on unlike datums, or on own states, in a sum
    │   └── Unbalanced                        a reaction equation that does not balance
    ├── StoreError                        8   a store that cannot be opened, read or written
    │   ├── StoreBusy                         another process holds the write lock
    │   └── StoreReadOnly
    ├── SeedError                         9   a row of seed data that cannot be taken (file, row, column)
    └── IntegrityError                   10   content that does not match its hash

An error holds fields and builds its text from them, so it can be pickled, logged and tested without parsing prose.
"""

from __future__ import annotations

from typing import Any, ClassVar

__all__ = [
    "Ambiguous",
    "DatumError",
    "DatumMismatch",
    "EquationError",
    "FormulaError",
    "IntegrityError",
    "InvalidInput",
    "NoData",
    "NoSuchState",
    "NotFound",
    "OutOfRange",
    "PressureError",
    "PropdbError",
    "SeedError",
    "SplitError",
    "StoreBusy",
    "StoreError",
    "StoreReadOnly",
    "TemperatureError",
    "TemperatureOutOfRange",
    "Unbalanced",
    "UnitError",
]


class PropdbError(Exception):
    """Root of the tree.

    Parameters
    ----------
    problem : str
        What is wrong, in one line.
    hint : str, optional
        What would be right, or the next thing to type.
    where : str, optional
        The place: a file, row and column, or the part of the input.
    fields
        Further facts, kept in ``fields`` for programs.
    """

    exit_code: ClassVar[int] = 1

    def __init__(self, problem: str, *, hint: str = "", where: str = "", **fields: Any) -> None:
        super().__init__(problem)
        self.problem = problem
        self.hint = hint
        self.where = where
        self.fields = fields

    def __str__(self) -> str:
        text = f"{self.where}: {self.problem}" if self.where else self.problem
        return f"{text}; {self.hint}" if self.hint else text

    def __reduce__(self) -> tuple[Any, ...]:
        return (_rebuild, (type(self), self.problem, self.hint, self.where, self.fields))


def _rebuild(cls: type[PropdbError], problem: str, hint: str, where: str, fields: dict[str, Any]) -> PropdbError:
    return cls(problem, hint=hint, where=where, **fields)


class InvalidInput(PropdbError):
    """Something typed that cannot be understood."""

    exit_code = 2


class UnitError(InvalidInput):
    """A unit that is unknown, or of the wrong dimension."""


class TemperatureError(InvalidInput, ValueError):
    """A temperature that is not one: not a number, at or below 0 K, without a unit."""


class PressureError(InvalidInput):
    """A pressure that is not one: not a number, not positive, gauge without its atmosphere."""


class FormulaError(InvalidInput):
    """A formula, CAS RN or reaction equation that cannot be read."""


class EquationError(InvalidInput):
    """Coefficients that do not make a heat-capacity or latent-heat equation."""


class DatumError(InvalidInput):
    """A datum definition that contradicts itself."""


class NotFound(PropdbError):
    """No species, source, entry, datum, phase or form answers to the name."""

    exit_code = 3


class Ambiguous(PropdbError):
    """More than one species (or form) answers to the name; ``fields['candidates']`` lists them."""

    exit_code = 4


class OutOfRange(PropdbError):
    """A state that the data do not reach."""

    exit_code = 5


class TemperatureOutOfRange(OutOfRange):
    """A temperature outside every range; ``fields['ranges']`` lists them [K]."""


class NoSuchState(OutOfRange):
    """A phase that cannot exist there, e.g. a liquid above the critical temperature."""


class SplitError(OutOfRange):
    """An enthalpy across a doubled temperature whose transition enthalpy no entry states."""


class NoData(PropdbError):
    """A quantity that is needed and that no usable entry gives."""

    exit_code = 6


class DatumMismatch(PropdbError):
    """Values that may not be summed as they stand."""

    exit_code = 7


class Unbalanced(DatumMismatch):
    """A reaction equation that does not balance; ``fields['imbalance']`` says by how much."""


class StoreError(PropdbError):
    """A store that cannot be opened, read or written."""

    exit_code = 8


class StoreBusy(StoreError):
    """Another process holds the write lock."""


class StoreReadOnly(StoreError):
    """A store, or its directory, that cannot be written."""


class SeedError(PropdbError):
    """A row of seed data that cannot be taken; ``where`` names file, row and column."""

    exit_code = 9


class IntegrityError(PropdbError):
    """Content that does not match its recorded hash."""

    exit_code = 10
