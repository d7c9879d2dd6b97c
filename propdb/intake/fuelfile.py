"""The TOML file of a fuel, or values by the same keys: tables, words and numbers, each complaint with its place."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from decimal import Decimal
from typing import Any, Final

from propdb.errors import InvalidInput, PropdbError
from propdb.intake.files import UserFile
from propdb.intake.plan import as_invalid, control_character
from propdb.intake.rows import near
from propdb.intake.sources import parse_source
from propdb.model.fuel import BASES, ELEMENTS, MOIST
from propdb.model.records import KIND_TO_STANDARD, Source
from propdb.units import parse_quantity
from propdb.units.numbers import split_number

__all__ = ["BY_DIFFERENCE", "PARTS", "TEMPLATE", "FuelReader", "parse_fuel_file", "read_basis"]

PHASES: Final = {"cr": "solid", "am": "amorphous", "l": "liquid"}
BY_DIFFERENCE: Final = "by difference"
PARTS: Final = (*ELEMENTS, "ash", "moisture")
_TABLES: Final = {
    "analysis": ("basis", *PARTS),
    "moisture": MOIST,
    "ash": ("dry",),
    "calorific-value": ("value", "kind", "at", "basis", "uncertainty", "uncertainty-kind"),
}
#: Nothing of these elements burns with more than hydrogen: 285.83 kJ/mol (CODATA 1989) over 2.016 g/mol [J/kg].
_HIGHEST: Final = 141.8e6
_KEYS: Final = ("name", "phase", "source", "locator", "note", *_TABLES)
_UNCERTAINTIES: Final = tuple(kind for kind in KIND_TO_STANDARD if kind)
_WORDS: Final = {symbol: basis for basis, symbol in BASES.items()} | {basis: basis for basis in BASES}
_ONE_OF_BASES: Final = "as-received, air-dried, dry or dry-ash-free"

TEMPLATE: Final = """\
# A fuel. Every number and name in this template is invented: replace them by those of your certificate.
name = "wood chips, example"
phase = "cr"                    # cr solid, l liquid
locator = "sample 1"            # where the numbers stand in the source
source = "own-fuel-example"     # key of a source in the store, or that of the table [new-source] below

[analysis]                      # ultimate analysis, mass %; it adds up to 100
basis = "dry"                   # as-received, air-dried, dry or dry-ash-free
C = 50.2
H = 6.1                         # hydrogen and oxygen without those of the moisture
N = 0.2
S = 0.02
# Cl = 0.01                     # burns to gaseous hydrogen chloride
O = "by difference"             # or a number
ash = 0.8                       # inert; not part of a dry ash-free analysis
# moisture = 7.5                # part of an analysis as received or air dried

[moisture]                      # mass %, to change to or from these bases
as-received = 35.0
# air-dried = 7.5

# [ash]                         # mass %, where the analysis is dry ash-free
# dry = 0.8

[calorific-value]               # at 25 C
value = "20.2 MJ/kg"
kind = "gross"                  # gross or net
at = "constant volume"          # constant volume (as from a bomb) or constant pressure
basis = "dry"
uncertainty = "0.12 MJ/kg"      # leave both out where none is stated
uncertainty-kind = "expanded-95"

[new-source]                    # leave the table out where the store has the source
title = "Fuel certificate, an invented example"
authors = ["Example laboratory"]
year = 2024
"""


def parse_fuel_file(file: UserFile) -> dict[str, Any]:
    """The tables of a TOML file, numbers as they were typed.

    Raises
    ------
    InvalidInput
        Another kind of file, or not TOML.
    """
    if file.kind != "toml":
        hint = "`propdb fuel template` writes one"
        raise InvalidInput(f"this is {file.kind.upper()}, and a fuel is a TOML file", where=file.name, hint=hint)
    try:
        return tomllib.loads(file.text, parse_float=str)
    except (tomllib.TOMLDecodeError, RecursionError) as error:
        raise InvalidInput(f"is not TOML: {error}", where=file.name, hint="numbers with '.', texts in quotes") from None


def read_basis(text: str, *, where: str = "") -> str:
    """A basis by its name, or by its subscript in ISO 1928: ``ar``, ``ad``, ``d``, ``daf``. Raises InvalidInput."""
    word = text.strip().lower().replace(" ", "-").replace("_", "-")
    if word not in _WORDS:
        raise InvalidInput(f"unknown basis {text!r}", where=where, hint=near(word, BASES) or f"write {_ONE_OF_BASES}")
    return _WORDS[word]


class FuelReader:
    """The tables of one fuel, and errors that name the place."""

    def __init__(self, data: Mapping[str, Any], where: str) -> None:
        self.place = where
        self.data = {str(key).replace("_", "-"): value for key, value in data.items()}
        self.tables: dict[str, dict[str, Any]] = {}
        for key in self.data:
            if key not in (*_KEYS, "new-source"):
                raise InvalidInput(
                    f"unknown key {key!r}", where=where, hint=near(key, _KEYS) or f"keys are {_list(_KEYS)}"
                )
        for name, keys in _TABLES.items():
            self.tables[name] = self._table(name, keys)

    def _table(self, name: str, keys: tuple[str, ...]) -> dict[str, Any]:
        table = self.data.get(name, {})
        if not isinstance(table, Mapping):
            raise InvalidInput(f"{name} is not a table", where=self.place, hint=f"write [{name}] and its keys below")
        tidy = {str(key) if key in keys else str(key).replace("_", "-"): value for key, value in table.items()}
        for key in tidy:
            if key not in keys:
                meant = next((f"did you mean {known}?" for known in keys if known.lower() == key.lower()), "")
                if name == "analysis":  # an element of a near name is another one
                    problem, hint = f"{key!r} is no part of an ultimate analysis here", meant
                else:
                    problem, hint = f"unknown key {key!r}", meant or near(key, keys)
                raise self.error(name, key, problem, hint or f"keys are {_list(keys)}")
        return tidy

    def error(self, table: str, key: str, problem: str, hint: str = "") -> InvalidInput:
        """An error with its place."""
        return InvalidInput(problem, where=f"{self.place}, [{table}] {key}", hint=hint)

    def text(self, key: str) -> str:
        """A text at the top, "" where it is missing."""
        value = self.data.get(key, "")
        if not isinstance(value, str):
            raise InvalidInput(f"{key} is not a text", where=self.place, hint=f'write {key} = "..."')
        odd = control_character(value)
        if odd or len(value) > 1000:
            problem = f"{key} holds the control character {odd}" if odd else f"{key} is {len(value)} characters long"
            raise InvalidInput(problem, where=self.place, hint="leave it out" if odd else "shorten it")
        return " ".join(value.split())

    def name(self) -> str:
        name = self.text("name")
        if not name:
            raise InvalidInput("name is missing", where=self.place, hint='write e.g. name = "wood chips, June"')
        return name

    def phase(self) -> str:
        phase = self.text("phase")
        if phase not in PHASES:
            problem = f"phase {phase!r}" if phase else "phase is missing"
            hint = (
                "a gas needs no analysis: add it by formula"
                if phase == "g"
                else 'write phase = "cr" for a solid, "l" for a liquid'
            )
            raise InvalidInput(problem, where=self.place, hint=hint)
        return phase

    def source(self) -> tuple[str, Source | None]:
        key = self.text("source")
        if not key:
            raise InvalidInput(
                "source is missing", where=self.place, hint="give the key of a source, and [new-source] where it is new"
            )
        table = self.data.get("new-source")
        if table is None:
            return key, None
        if not isinstance(table, Mapping):
            raise InvalidInput(
                "new-source is not a table", where=self.place, hint="write [new-source] and its keys below"
            )
        given = {"kind": "report", "class": "practice", "terms": "Own data.", "carrier": "typed", **table, "key": key}
        try:
            return key, parse_source(given, file=f"{self.place}, [new-source]")
        except PropdbError as error:
            raise as_invalid(error) from None

    def word(self, table: str, key: str, among: tuple[str, ...]) -> str:
        """One of a few words that must be there."""
        value = self.tables[table].get(key, "")
        word = str(value).strip().lower().replace("-", " ").replace("_", " ") if isinstance(value, str) else str(value)
        if word not in among:
            problem = f"unknown {key} {value!r}" if value != "" else f"{key} is missing"
            raise self.error(table, key, problem, f"write {' or '.join(among)}")
        return word

    def basis(self, table: str) -> str:
        value = self.tables[table].get("basis", "")
        if value == "":
            raise self.error(table, "basis", "basis is missing", f"write {_ONE_OF_BASES}")
        return read_basis(str(value), where=f"{self.place}, [{table}] basis")

    def number(self, table: str, key: str) -> Decimal | None:
        """A mass percentage, as typed; None where it is missing."""
        value = self.tables[table].get(key)
        if value is None:
            return None
        text = value if isinstance(value, str) else repr(value)
        if isinstance(value, bool) or not isinstance(value, (str, int, float)):
            raise self.error(table, key, f"{text} is not a number", "write mass %, e.g. 50.2")
        try:
            digits, rest = split_number(text, "a mass percentage", "50.2", InvalidInput)
        except InvalidInput as error:
            raise self.error(table, key, error.problem, error.hint) from None
        if rest.strip() not in ("", "%"):
            raise self.error(table, key, f"{text!r} is not a mass percentage", f"write {digits}")
        percent = Decimal(digits)
        if not 0 <= percent <= 100:
            problem = "is negative" if percent < 0 else "is above 100 %"
            raise self.error(table, key, f"{digits} {problem}", "write mass %, from 0 to 100")
        return percent

    def below(self, table: str, key: str) -> float | None:
        """A mass percentage below 100 as a fraction."""
        percent = self.number(table, key)
        if percent is not None and percent >= 100:
            raise self.error(table, key, f"{percent} leaves no fuel", "write mass %, below 100")
        return None if percent is None else float(percent) / 100.0

    def calorific_value(self) -> tuple[str, float]:
        """As typed, and in J/kg."""
        return self._energy("value", "20.2 MJ/kg")

    def _energy(self, key: str, example: str) -> tuple[str, float]:
        table = "calorific-value"
        value = self.tables[table].get(key, "")
        if value == "":
            raise self.error(table, key, f"{key} is missing", f'write e.g. {key} = "{example}"')
        if not isinstance(value, str):
            raise self.error(table, key, f"{value!r} has no unit", f'write e.g. {key} = "{example}"')
        try:
            quantity = parse_quantity(value)
        except InvalidInput as error:
            raise self.error(table, key, error.problem, error.hint) from None
        if quantity.unit.basis != "mass":
            raise self.error(table, key, f"{value!r} is not per mass", f'write e.g. {key} = "{example}"')
        if not quantity.value > 0:
            raise self.error(table, key, f"{value!r} is not positive", "the heat that combustion gives off is positive")
        joule = quantity.unit.factor * quantity.value
        if joule > _HIGHEST:
            raise self.error(
                table, key, f"{value!r} is above that of hydrogen, 141.8 MJ/kg", "check its number and unit"
            )
        return f"{quantity.text} {quantity.unit.text}", joule

    def uncertainty(self) -> tuple[float | None, str]:
        """Of the calorific value [J/kg], and its kind; neither without the other."""
        table = self.tables["calorific-value"]
        kind = table.get("uncertainty-kind", "")
        if table.get("uncertainty", "") == "":
            if kind:
                raise self.error("calorific-value", "uncertainty", f"kind {kind!r} without an uncertainty", "give it")
            return None, ""
        if kind not in _UNCERTAINTIES:
            problem = f"unknown kind {kind!r}" if kind else "an uncertainty without its kind"
            raise self.error("calorific-value", "uncertainty-kind", problem, f"one of {', '.join(_UNCERTAINTIES)}")
        return self._energy("uncertainty", "0.12 MJ/kg")[1], kind

    def typed(self) -> dict[str, dict[str, str]]:
        """The tables as texts."""
        return {
            name: {key: value if isinstance(value, str) else repr(value) for key, value in table.items()}
            for name, table in self.tables.items()
            if table
        }


def _list(words: tuple[str, ...]) -> str:
    return ", ".join(words)
