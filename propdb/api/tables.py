"""Whole tables: convert, evaluate and add them up; make them."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from functools import partial
from typing import TYPE_CHECKING

from propdb.api.core import Core
from propdb.errors import InvalidInput
from propdb.store.search import resolve

if TYPE_CHECKING:
    from datetime import date

    from propdb.tables.oracle import Basis
    from propdb.tables.record import TableReport

__all__ = ["Tables", "open_basis"]

Temperature = str | float
Pressure = str | float


def open_basis(path: str, as_of: str | date | None, source: str | None, extrapolate: bool) -> Basis:
    """Open a store for table work, in the thread or process that asks."""
    store = Core(path, as_of=as_of)
    return store_basis(store, source, extrapolate)


def store_basis(store: Core, source: str | None, extrapolate: bool) -> Basis:
    """What tables need of a store that is open."""
    from propdb.tables.oracle import Basis

    levels = store._engine(source, extrapolate)
    return Basis(
        species=lambda text: resolve(store._reader, text),
        datum=store.datum_show,
        levels=levels,
        stamp=store._stamp,
        datums=store.datum_list,
        close=store.close,
    )


class Tables(Core):
    """``convert-table``, ``tabulate``."""

    def convert_table(
        self,
        table: str | os.PathLike[str],
        out: str | os.PathLike[str],
        *,
        to: str,
        from_: str | None = None,
        species: str | None = None,
        phase: str | None = None,
        form: str | None = None,
        temperature: Temperature | None = None,
        pressure: Pressure | None = None,
        saturated: str | None = None,
        unit: str | None = None,
        column: Sequence[str] = (),
        units: Sequence[str] = (),
        composition: str = "wet",
        decimal: str = "point",
        digits: int | None = None,
        sheet: str | None = None,
        across: bool = False,
        overwrite: bool = False,
        source: str | None = None,
        extrapolate: bool = False,
        progress: Callable[[str], None] | None = None,
    ) -> TableReport:
        """Convert every enthalpy of a table to another datum, or compute them where it has none.

        The columns of the table stay as they are; added are the enthalpy on the datum wanted, its standard
        uncertainty, the shift, a flag (``ok``, ``extrapolated``, ``no data``, ``bad row``) and its reason. Beside the
        output a JSON file says where every number came from. The output appears whole or not at all.

        Parameters
        ----------
        table, out : path
            CSV, TSV, Excel, Parquet, or a directory of Parquet; the output has the same format.
        to : str
            Datum wanted, named or inline.
        from_ : str, optional
            Datum of the whole table, where no column says it.
        species, phase, form, temperature, pressure, saturated : optional
            Of the whole table, where no column says it. A number is in K, or Pa.
        unit : str, optional
            Of the enthalpies, where the header does not say it (``h [kJ/kg]``); of those computed, kJ/mol if left out.
        column : sequence of str
            ``ROLE=NAME``: which column is what, where the header words do not say it.
        units : sequence of str
            ``ROLE=UNIT``: units of temperature, pressure and flow that the header does not say.
        composition : str
            ``wet``: the fractions sum to 1. ``dry``: those beside water do, and water is a fraction of the whole.
        decimal : str
            ``point`` or ``comma``: the decimal sign of a text table.
        digits : int, optional
            Decimals of the enthalpies written to a text table; those of its column if left out.
        sheet : str, optional
            Sheet of a workbook.
        across : bool
            Sum streams across a reaction on any datum.
        overwrite : bool
            Replace an output that exists.
        source, extrapolate
            As in :meth:`propdb.api.Store.enthalpy`.
        progress : callable, optional
            Gets a line now and then: share, rows, rate [rows/s] and time left.

        Returns
        -------
        TableReport
            Rows by flag, reasons, kinds of rows with their entries, sources, hashes; enthalpy flows and duty [kW] for
            a table with a flow column. Rows that could not be converted are flagged, not raised.

        Raises
        ------
        InvalidInput, UnitError, NotFound
            Columns missing or doubled, units missing or contradicting, a file that cannot be read as what it is.
        DatumMismatch
            Streams that may not be summed on the datum.
        PropdbError
            A package that is not installed, an output that cannot be written.
        """
        from pathlib import Path

        from propdb.levels.typed import read_phase, read_temperature
        from propdb.tables.columns import pairs
        from propdb.tables.core import Settings
        from propdb.tables.oracle import Oracle
        from propdb.tables.run import Request, convert_table
        from propdb.units import parse_pressure, parse_unit

        _one_of("composition", composition, ("wet", "dry"))
        _one_of("decimal", decimal, ("point", "comma"))
        if saturated is not None:
            _one_of("saturated", saturated, ("liquid", "vapour"))
        if digits is not None and not 0 <= digits <= 15:
            raise InvalidInput(f"{digits} decimals", where="--digits", hint="give 0 to 15")
        given = {"species": species, "phase": phase, "form": form, "temperature": temperature, "pressure": pressure}
        given["datum"] = from_
        names = {role: "--from" if role == "datum" else f"--{role}" for role in given}
        if phase is not None:
            read_phase(phase)
        settings = Settings(
            to=self.datum_show(to).name,
            unit=parse_unit(unit or "kJ/mol"),
            species=species,
            datum=None if from_ is None else self.datum_show(from_).name,
            phase=phase or "",
            form=form or "",
            temperature=None if temperature is None else read_temperature(temperature),
            pressure=None if pressure is None else _pascal(pressure, parse_pressure),
            saturated=saturated or "",
            digits=digits,
            dry=composition == "dry",
        )
        request = Request(
            settings,
            unit=unit,
            columns=pairs(column, "--column"),
            units=pairs(units, "--units", ("temperature", "pressure", "flow")),
            fixed={role: names[role] for role, value in given.items() if value is not None},
            comma=decimal == "comma",
            sheet=sheet,
            across=across,
            overwrite=overwrite,
        )
        oracle = Oracle(partial(open_basis, str(self._path), self._as_of, source, extrapolate))
        try:
            return convert_table(oracle, request, Path(table), Path(out), progress)
        finally:
            oracle.close()


def _one_of(option: str, value: str, choices: tuple[str, ...]) -> None:
    if value not in choices:
        raise InvalidInput(f"{option} {value!r}", where=f"--{option}", hint=f"it is {' or '.join(choices)}")


def _pascal(pressure: Pressure, parse: Callable[[str], float]) -> float:
    return parse(pressure if isinstance(pressure, str) else f"{pressure!r} Pa")
