"""From the rows of one file to entries: each row gives entries or a refusal, and both are counted."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any, Final

from propdb.cp.registry import build
from propdb.errors import EquationError
from propdb.intake.common import DIMENSION, SI_UNIT
from propdb.intake.package.files import Loaded
from propdb.intake.package.names import decoded
from propdb.intake.package.registry import Draft, Refused, Registry
from propdb.intake.package.report import FileReport, Refusal
from propdb.model.records import Carrier, Entry
from propdb.store.content import canonical, row_id

__all__ = ["NO_RANGE", "Context", "Row", "Sheet"]

NO_RANGE: Final = "no range stated"
_POSITIVE: Final = ("Hvap", "Hsub", "Hfus", "Cp", "Tb", "Tm", "Tc", "Pc")


@dataclass(frozen=True, slots=True)
class Row:
    """One line or record of a file."""

    number: int
    cells: Mapping[str, Any]

    def text(self, column: str) -> str:
        """A cell without the blanks around it."""
        return str(self.cells[column]).strip()


@dataclass
class Context:
    """What the readers of all files share."""

    registry: Registry
    elements: Mapping[str, Any]  # table of reference forms, as ``datums.toml`` has it
    standard_pressure: Mapping[str, float]  # by source key [Pa]
    entries: list[Entry] = field(default_factory=list)
    janaf: dict[str, tuple[str, str]] = field(default_factory=dict)  # CAS RN to name and formula
    critical: dict[str, tuple[str, float]] = field(default_factory=dict)  # CAS RN to Tc [K] of Perry's table 2-150
    #: CAS RN to the points of JANAF's table of the liquid [K, J/mol/K], as the file has them.
    liquids: dict[str, list[tuple[float, float]]] = field(default_factory=dict)
    #: Entry id, which hashes them, to the heat capacity that its equation and params make.
    built: dict[str, Any] = field(default_factory=dict)


class Sheet:
    """Makes the entries of one file."""

    def __init__(self, loaded: Loaded, context: Context) -> None:
        self.loaded = loaded
        self.context = context
        self.source = loaded.spec.source
        self.title = loaded.spec.title
        self.report = FileReport(
            loaded.spec.key,
            loaded.file,
            loaded.spec.source,
            loaded.version,
            loaded.sha256,
            trouble=loaded.trouble,
            remark=loaded.remark,
        )
        self._how = f"sha256 {loaded.sha256[:16]}" + (f"; {loaded.remark}" if loaded.remark else "")
        self._row = Row(0, {})
        self._name = ""
        self._carrier: Carrier | None = None
        self._made: set[str] = set()

    def run(self, reader: Callable[[Sheet, Row], None], name_column: str) -> FileReport:
        """Read every row. One that gives neither an entry nor a refusal is refused as empty."""
        report = self.report
        report.rows = len(self.loaded.rows) + len(self.loaded.ragged)
        for number, found in self.loaded.ragged:
            wanted = len(self.loaded.spec.columns) or 2
            report.refusals.append(
                Refusal(number, "", "cut off", f"{found} cells where there are {wanted} columns: the row is cut off")
            )
        for number, cells in self.loaded.rows:
            self._row, self._carrier = Row(number, cells), None
            self._name = decoded(str(cells.get(name_column, "")))
            before, refused = len(self.context.entries), len(report.refusals)
            try:
                reader(self, self._row)
            except Refused as refusal:
                self.refuse(refusal.kind, refusal.reason)
            if len(self.context.entries) > before:
                report.used += 1
            elif len(report.refusals) == refused:
                self.refuse("no number", "the row holds no number that is read")
        report.entries = len(self._made)
        return report

    def refuse(self, kind: str, reason: str, column: str = "") -> None:
        """Set down why the row, or a cell of it, became no entry."""
        cells = self._row.cells
        cas = str(next((cells[c] for c in ("CAS", "CASRN", "Ful CAS") if c in cells), "")).strip()
        what = " ".join(filter(None, (cas, self._name)))
        self.report.refusals.append(Refusal(self._row.number, what, kind, reason, column))

    # -- species --------------------------------------------------------------------------------------------------

    def place(self, cas: str, name: str, formula: str = "", *, trust: str = "cas") -> tuple[Draft, str]:
        """Species and form of the row; see :meth:`Registry.place`, and :meth:`Registry.place_by_formula`."""
        registry = self.context.registry
        way = registry.place_by_formula if trust == "formula" else registry.place
        draft, form, moved = way(cas, name, formula)
        self._name = decoded(name) or draft.name
        if moved:
            self.report.moves.append((self._row.number, f"{cas.strip()} {self._name}", draft.name))
        return draft, form

    # -- numbers --------------------------------------------------------------------------------------------------

    def number(self, column: str) -> float | None:
        """A cell as a number; None where it is blank.

        Raises
        ------
        Refused
            It is no finite number.
        """
        text = self._row.text(column)
        if not text:
            return None
        try:
            value = float(text)
        except ValueError:
            value = math.nan
        if not math.isfinite(value):
            raise Refused("not a number", f"{column} holds {text!r}")
        return value

    def numbers(self, *columns: str) -> list[float]:
        """Cells as numbers, blank ones as 0."""
        return [self.number(column) or 0.0 for column in columns]

    # -- entries --------------------------------------------------------------------------------------------------

    def constant(
        self,
        draft: Draft,
        quantity: str,
        phase: str,
        column: str,
        *,
        unit: str = "",
        factor: float = 1.0,
        temperature: float | None = 298.15,
        datum: str = "",
        conditions: str = "",
        form: str = "",
        status: str = "base",
        note: str = "",
        uncertainty: float | None = None,
        kind: str = "",
        value: float | None = None,
        carried: str = "",
        to: str = "",
    ) -> None:
        """An entry for a cell, if it is not blank; a refusal if it cannot be one.

        ``value`` is in ``unit``, which is ``factor`` times the SI unit; the cell of ``column`` gives both where they
        are not given.
        """
        if value is None:
            try:
                value = self.number(column)
            except Refused as refusal:
                self.refuse(refusal.kind, refusal.reason, column)
                return
            if value is None:
                return
            carried = self._row.text(column)
        if quantity in _POSITIVE and phase != "aq" and not value > 0:
            self.refuse("not positive", f"{quantity} is {carried}", column)
            return
        si = SI_UNIT[DIMENSION[quantity]]
        if quantity in ("S", "Gf") and phase == "g" and self.context.standard_pressure.get(self.source) == 101325.0:
            conditions = "; ".join(filter(None, (conditions, "standard pressure 1 atm")))
        self._add(
            draft,
            (
                quantity,
                phase,
                form,
                to,
                "",
                temperature,
                value * factor + 0.0,
                si,
                carried,
                unit or si,
                "{}",
                None,
                None,
                None if uncertainty is None else uncertainty * factor,
                "",
                kind if uncertainty is not None else "",
                datum,
                conditions,
                self.source,
                self.locator,
            ),
            {},
            status,
            note,
        )

    def curve(
        self,
        draft: Draft,
        quantity: str,
        phase: str,
        equation: str,
        params: Mapping[str, Any],
        *,
        carried: str,
        carried_unit: str,
        tmin: float | None,
        tmax: float | None,
        form: str = "",
        conditions: str = "",
        status: str = "base",
        note: str = "",
        uncertainty: float | None = None,
        kind: str = "",
        check: bool = True,
    ) -> None:
        """An entry for an equation or a table; ``uncertainty`` is a fraction."""
        made = None
        if check:
            try:
                made = build(equation, params)
            except EquationError as error:
                self.refuse("no equation", error.problem)
                return
        number = self._add(
            draft,
            (
                quantity,
                phase,
                form,
                "",
                equation,
                None,
                None,
                SI_UNIT[DIMENSION[quantity]],
                carried,
                carried_unit,
                canonical(params),
                tmin,
                tmax,
                uncertainty,
                "%" if uncertainty is not None else "",
                kind if uncertainty is not None else "",
                "",
                conditions,
                self.source,
                self.locator,
            ),
            params,
            status,
            note,
        )
        if quantity == "Cp" and number and made is not None:
            self.context.built[number] = made

    @property
    def locator(self) -> str:
        """Table and name, as the file lists them."""
        return f"{self.title}: {self._name}"

    def _add(self, draft: Draft, row: tuple[Any, ...], params: Mapping[str, Any], status: str, note: str) -> str:
        """The id of the entry; "" where it is refused."""
        if draft.charge and row[1] not in ("g", "aq"):
            self.refuse("ion in a condensed phase", f"{row[0]} of an ion as {row[1]}: another species must be meant")
            return ""
        number = row_id(draft.mark, row)
        carrier = self._carrier
        if carrier is None:  # one for all entries of the row
            carrier = Carrier("chemicals", self.loaded.version, self.loaded.file, self._row.number, self._how)
            self._carrier = carrier
        self._made.add(number)
        self.context.entries.append(
            Entry(number, draft.name, *row[:10], params, *row[11:], False, status, note, (carrier,))  # type: ignore[call-arg]
        )
        return number
