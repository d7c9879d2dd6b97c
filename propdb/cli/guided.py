"""``propdb add`` in a terminal: one question after the other, each answer checked before the next."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING, Final

import typer

from propdb.api.person import who
from propdb.cli.app import Call, note
from propdb.cli.intaketext import report_text, show_report
from propdb.intake.templates import COLUMN_HELP

if TYPE_CHECKING:
    from propdb.intake.plan import Refused, Report

_NEW_SOURCE: Final = (
    ("source_kind", "book article report standard practice; a data sheet is a report"),
    ("source_class", "evaluated handbook compilation practice estimate; a data sheet is a compilation"),
    ("source_year", "four digits"),
    ("source_authors", "names, or the body that issued it; several are parted by ;"),
    ("source_title", "title of the new source"),
    ("source_publisher", "publisher; may stay blank"),
    ("source_doi", "DOI; may stay blank"),
)
_NEW_SPECIES: Final = (
    ("species_formula", "formula of the new species, without charge; blank to type another name"),
    ("species_charge", "charge; blank for a neutral one"),
    ("species_cas", "CAS RN; may stay blank"),
)
_NEEDED: Final = ("species", "quantity", "phase", "value", "unit", "source", "locator")


def ask_entry(call: Call, *, dry_run: bool) -> None:
    """Ask for one entry and add it.

    The answers so far are tried as a whole after each question: what they lack is asked for later, and what is wrong
    with the last answer is said and asked for again.
    """
    if not dry_run:
        who()  # not after a dozen answers
    dialogue = _Dialogue(call)
    note("One value of your own; Ctrl-C leaves without a trace. A blank answer leaves a field blank.")
    try:
        cells = dialogue.run()
        report = call.store.add(cells, dry_run=True)
        if dry_run or report.refused or not report.taken:
            show_report(call, report)
            return
        note("\n" + report_text(report))
        if dialogue.line("add it as a draft? (y/n)").lower() not in ("y", "yes"):
            note("nothing was added")
            return
    except EOFError:
        note("nothing was added")
        raise typer.Abort from None
    show_report(call, call.store.add(cells))


def _told(wrong: Refused) -> str:
    return f"  {wrong.problem}; {wrong.hint}" if wrong.hint else f"  {wrong.problem}"


class _Dialogue:
    """Answers by column."""

    def __init__(self, call: Call) -> None:
        self.store = call.store
        self.cells: dict[str, str] = {}
        self.placeholder = self.store.source_list()[0].key

    def line(self, question: str) -> str:
        """One answer. Raises EOFError at the end of the input."""
        print(f"{question}: ", end="", file=sys.stderr, flush=True)
        answer = sys.stdin.readline()
        if not answer:
            raise EOFError
        return answer.strip()

    def run(self) -> dict[str, str]:
        """Ask for all that the quantity needs."""
        for column in ("species", "quantity", "phase"):
            self.ask(column)
        quantity, phase = self.cells["quantity"], self.cells["phase"]
        if phase == "cr":
            self.ask("form")
        if quantity == "Htr":
            self.ask("to")
        if quantity == "Cp":
            self.ask("equation", "polynomial, shomate or constant over a range; blank for a value at one temperature")
        if self.cells.get("equation"):
            self.equation()
        else:
            if quantity not in ("Tb", "Tm", "Tc", "Pc", "omega"):
                self.ask("temperature")
            self.ask("unit")
            self.ask("value")
        self.ask("uncertainty")
        if self.cells.get("uncertainty"):
            self.ask("uncertainty_kind")
        if quantity in ("Hf", "Gf"):
            self.ask("datum")
        for column in ("conditions", "source", "locator", "note"):
            self.ask(column)
        return self.cells

    def equation(self) -> None:
        """Ask for a heat capacity over a range."""
        for column in ("tmin", "tmax", "unit"):
            self.ask(column)
        if self.cells["equation"] == "polynomial":
            self.ask("exponents")
        self.ask("coefficients")
        if self.cells["equation"] == "polynomial":
            self.ask("scales")

    def ask(self, column: str, words: str = "") -> None:
        """Ask until the answer may stand."""
        while True:
            answer = self.line(f"{column} ({words or COLUMN_HELP[column]})")
            if not answer and column in _NEEDED:
                note(f"  {column} is needed")
                continue
            self.cells[column] = answer
            wrong = self.wrong(column)
            if wrong is None:
                return
            note(_told(wrong))
            if column in ("source", "species") and wrong.problem.startswith("unknown") and self.define(column):
                return
            self.cells.pop(column, None)

    def define(self, column: str) -> bool:
        """Ask for a new species or source; False to ask for the name again."""
        fields = _NEW_SOURCE if column == "source" else _NEW_SPECIES
        if self.line("  is it new, to be added with this value? (y/n)").lower() not in ("y", "yes"):
            return False
        for name, words in fields:
            while True:
                self.cells[name] = self.line(f"  {name} ({words})")
                if name == "species_formula" and not self.cells[name]:
                    self._drop(column, fields)
                    return False
                odd = self.wrong(name)
                if odd is None:
                    break
                note(_told(odd))
        odd = self.wrong(*(name for name, _ in fields), column)
        if odd is not None:
            note(_told(odd))
            self._drop(column, fields)
            return False
        return True

    def _drop(self, column: str, fields: tuple[tuple[str, str], ...]) -> None:
        for name in (column, *(name for name, _ in fields)):
            self.cells.pop(name, None)

    def wrong(self, *asked: str) -> Refused | None:
        """What is wrong with the answers to these questions, if the reader of templates comes that far."""
        trial = {name: text for name, text in self.cells.items() if text}
        trial.setdefault("source", self.placeholder)
        if trial.get("equation"):
            trial.setdefault("coefficients", "1")
        else:
            trial.setdefault("value", "1")
        report: Report = self.store.add(trial, dry_run=True)
        return next((one for one in report.refused if one.column in asked), None)
