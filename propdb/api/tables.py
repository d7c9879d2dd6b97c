"""Whole tables: convert, evaluate and add them up; make them."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from functools import partial
from typing import TYPE_CHECKING

from propdb.api.core import Core
from propdb.errors import InvalidInput, TemperatureError
from propdb.store.search import resolve

if TYPE_CHECKING:
    from datetime import date

    from propdb.tables.oracle import Basis
    from propdb.tables.record import TableReport
    from propdb.tables.tabulate import Tabulation

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
        scheduler: str | None = None,
        workers: int | None = None,
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
            Datum wanted, named or inline; ``suggest`` finds the one that serves the table best, says why, and takes it.
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
        scheduler : str, optional
            Address of a Dask scheduler, for a directory of Parquet: each task converts one file.
        workers : int, optional
            The same with so many processes on this machine; a script calls it under ``if __name__ == "__main__"``.
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
        from propdb.tables.run import SUGGEST, Request, convert_table
        from propdb.units import parse_pressure, parse_unit

        _one_of("composition", composition, ("wet", "dry"))
        _one_of("decimal", decimal, ("point", "comma"))
        if saturated is not None:
            _one_of("saturated", saturated, ("liquid", "vapour"))
        if digits is not None and not 0 <= digits <= 15:
            raise InvalidInput(f"{digits} decimals", where="--digits", hint="give 0 to 15")
        if workers is not None and not 1 <= workers <= 1000:
            raise InvalidInput(f"{workers} workers", where="--workers", hint="give 1 or more")
        given = {"species": species, "phase": phase, "form": form, "temperature": temperature, "pressure": pressure}
        given["datum"] = from_
        names = {role: "--from" if role == "datum" else f"--{role}" for role in given}
        if phase is not None:
            read_phase(phase)
        settings = Settings(
            to=SUGGEST if to == SUGGEST else self.datum_show(to).name,
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
            scheduler=scheduler,
            workers=workers,
        )
        oracle = Oracle(partial(open_basis, str(self._path), self._as_of, source, extrapolate))
        try:
            return convert_table(oracle, request, Path(table), Path(out), progress)
        finally:
            oracle.close()

    def tabulate(
        self,
        species: str | Sequence[str],
        *,
        datum: str,
        low: Temperature = "25C",
        high: Temperature = "1000C",
        step: str | float = "25K",
        phase: str | None = None,
        form: str | None = None,
        unit: str = "kJ/mol",
        out: str | os.PathLike[str] | None = None,
        overwrite: bool = False,
        source: str | None = None,
        extrapolate: bool = False,
    ) -> Tabulation:
        """Enthalpy and heat capacity over a range of temperature, across phases, each row with its entries.

        Parameters
        ----------
        species : str or sequence of str
            Names, synonyms, formulas, CAS RNs or InChIKeys.
        datum : str
            Named or inline.
        low, high : str or float
            Ends of the range: ``"25C"``, or a number in K. Temperatures are shown on the scale of ``low``.
        step : str or float
            ``"25K"``, ``"50F"``, or a number in K.
        phase, form : str, optional
            One phase; without it the stable ones at 1 atm, with two rows where one becomes the next.
        unit : str
            Of the enthalpies; that of the heat capacities follows: ``kJ/kg`` gives kJ/kg/K, ``kJ/mol`` J/mol/K.
        out : path, optional
            A file to write: .csv, .tsv, .xlsx, .parquet or .json.
        overwrite : bool
            Replace a file that exists.
        source, extrapolate
            As in :meth:`propdb.api.Store.enthalpy`.

        Raises
        ------
        PropdbError
            NotFound, Ambiguous, UnitError, InvalidInput; NoData where no row has an enthalpy, or where it is not known
            which phase is stable.
        """
        from pathlib import Path

        from propdb.levels.typed import read_phase, read_temperature
        from propdb.tables.files import check_target, write_tabulation
        from propdb.tables.tabulate import tabulate
        from propdb.units import parse_unit

        names = [species] if isinstance(species, str) else list(species)
        if out is not None:
            check_target(Path(out), overwrite=overwrite)
        records = [resolve(self._reader, name) for name in names]
        found = self.datum_show(datum)
        per = parse_unit(unit)
        first, last = read_temperature(low), read_temperature(high)
        table = tabulate(
            self._engine(source, extrapolate),
            records,
            low=first,
            high=last,
            step=_step(step),
            scale=_scale_of(low),
            datum=found,
            unit=per,
            phase=None if phase is None else read_phase(phase),
            form=form,
            stamp=self._stamp,
        )
        if out is not None:
            write_tabulation(table, Path(out), overwrite=overwrite)
        return table


def _scale_of(temperature: Temperature) -> str:
    from propdb.tables.scales import temperature_unit
    from propdb.units.numbers import split_number

    if not isinstance(temperature, str):
        return "K"
    _, unit = split_number(temperature, "a temperature", "600C", TemperatureError)
    return temperature_unit(unit, "")


def _step(step: str | float) -> float:
    """A difference of temperatures [K]."""
    from propdb.units import read_si
    from propdb.units.numbers import split_number

    if not isinstance(step, str):
        return float(step)
    number, unit = split_number(step, "a step", "25K", TemperatureError)
    if not unit:
        raise TemperatureError(f"the step {step!r} has no unit", where="--step", hint=f"did you mean {number}K?")
    return read_si(number, unit, dimension="temperature", difference=True)


def _one_of(option: str, value: str, choices: tuple[str, ...]) -> None:
    if value not in choices:
        raise InvalidInput(f"{option} {value!r}", where=f"--{option}", hint=f"it is {' or '.join(choices)}")


def _pascal(pressure: Pressure, parse: Callable[[str], float]) -> float:
    return parse(pressure if isinstance(pressure, str) else f"{pressure!r} Pa")
