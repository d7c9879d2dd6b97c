"""Own entries coming in: typed values, filled templates, literature files. They are drafts until checked."""

from __future__ import annotations

import os
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from propdb.api.core import Core
from propdb.errors import InvalidInput, PropdbError

if TYPE_CHECKING:
    from propdb.intake.plan import Known, Plan, Refused, Report
    from propdb.model.records import Entry, Species

__all__ = ["Intake"]


class Intake(Core):
    """``add``, ``import``."""

    def add(
        self,
        values: str | os.PathLike[str] | Mapping[str, Any] | Sequence[Mapping[str, Any]],
        *,
        dry_run: bool = False,
    ) -> Report:
        """Add own entries as drafts: all of them, or none where one cannot be taken.

        Parameters
        ----------
        values : path, mapping or sequence of mappings
            A filled template (CSV or TOML), or values by the columns of the template: ``species``, ``quantity``,
            ``phase``, ``temperature`` [K, or a text with its unit], ``value``, ``unit``, ``source``, ``locator`` ...
        dry_run : bool
            Only say what would happen; what cannot be taken is then in ``refused`` of the report.

        Raises
        ------
        InvalidInput, NotFound
            Something that cannot be taken, with its place; ``fields["problems"]`` lists all. Nobody is named as author.
        StoreError, StoreBusy, StoreReadOnly
        """
        from propdb.intake.own import plan_values

        if isinstance(values, (str, os.PathLike)):
            return self._file(values, dry_run, ("csv", "toml"))
        rows = [values] if isinstance(values, Mapping) else list(values)
        if not rows or not all(isinstance(row, Mapping) for row in rows):
            raise InvalidInput("no value to add", hint="give a file, or a mapping such as {'species': 'ethanol', ...}")
        return self._take(plan_values(rows, self._known()), dry_run, "add")

    def import_file(self, path: str | os.PathLike[str], *, dry_run: bool = False) -> Report:
        """Bring in a file as drafts: a filled template (CSV or TOML) or ThermoML, told apart by what is in it.

        Parameters
        ----------
        path : path
        dry_run : bool
            As :meth:`add`.

        Raises
        ------
        InvalidInput, NotFound, StoreError
            As :meth:`add`; or ThermoML without the optional dependency that reads it safely.
        """
        return self._file(path, dry_run, ("csv", "toml", "xml"))

    def _file(self, path: str | os.PathLike[str], dry_run: bool, kinds: tuple[str, ...]) -> Report:
        from propdb.intake.files import read_file

        file = read_file(path)
        if file.kind not in kinds:
            raise InvalidInput("this is XML, not a template", where=file.name, hint=f"`propdb import {file.name}`")
        if file.kind == "xml":
            from propdb.intake.thermoml import plan_thermoml as plan_file
        else:
            from propdb.intake.own import plan_template as plan_file
        return self._take(plan_file(file, self._known()), dry_run, f"from {file.name}, SHA-256 {file.digest[:16]}")

    def _known(self) -> Known:
        from propdb.intake.plan import Known

        return Known(self._reader, self._all_datums())

    def _compared_with(self, entry: Entry, species: Species) -> Entry:
        """The entry with what other compilations say of it, as it will be stored."""
        return replace(entry, crosschecks=tuple(self._checker()(entry, species)))

    def _take(self, plan: Plan, dry_run: bool, comment: str) -> Report:
        """Write what a plan holds in one transaction, unless something in it cannot be taken."""
        from propdb.api.person import who
        from propdb.intake.plan import Report, summary, whole
        from propdb.store.own import add_own_all

        if plan.problems and not dry_run:
            raise summary(plan.problems, plan.file)
        if self._as_of is not None and not dry_run:
            raise InvalidInput("the past cannot be added to", hint="open the store without as_of")
        author = "" if dry_run else who()
        if plan.candidates and not dry_run:
            checker = self._checker()
            for one in plan.candidates:
                checker(one.entry, one.species)  # kept by the checker, so that no other writer waits for it
            add_own_all(
                self._path,
                [(one.entry, one.carrier) for one in plan.candidates],
                author,
                species=list(plan.species.values()),
                sources=list(plan.sources.values()),
                comment=comment,
                checker=checker,
            )
            self._forget()
        return Report(
            file=plan.file,
            kind=plan.kind,
            dry_run=dry_run,
            who=author,
            taken=tuple((one.place, self._compared_with(whole(one), one.species)) for one in plan.candidates),
            skipped=tuple(plan.skipped),
            refused=tuple(_refused(error, plan.file) for error in plan.problems),
            remarks=tuple(plan.remarks),
            species=tuple(plan.species),
            sources=tuple(plan.sources),
        )


def _refused(error: PropdbError, file: str) -> Refused:
    from propdb.intake.plan import Refused

    place = error.where.removeprefix(file).lstrip(", ") or file
    return Refused(place, str(error.fields.get("column", "")), error.problem, error.hint)
