"""Fuels of your own: from an ultimate analysis and a calorific value to a species that stands on any datum."""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

from propdb.api.core import Core
from propdb.errors import Ambiguous, InvalidInput, NotFound
from propdb.model.records import STATUSES, T_STANDARD, Source, State
from propdb.store.search import resolve

if TYPE_CHECKING:
    from propdb.intake.fuel import GivenFuel
    from propdb.levels.engine import Levels
    from propdb.model.fuel import Analysis, FuelSheet
    from propdb.model.records import Species

__all__ = ["Fuels"]

GROSS = "combustion-gross-25C"
GROSS_WITH_CHLORINE = "combustion-gross-25C-HClgas"
#: Worth a remark: further from the value that the analysis suggests than the worst tenth of real fuels.
_ODD = 0.05
#: Worth a remark: the share of the calorific value that hangs on what chlorine burns to.
_TELLS = 1e-3


class Fuels(Core):
    """``fuel template|add|show``."""

    def fuel_template(self) -> str:
        """A TOML file to fill in: name, ultimate analysis, moisture, calorific value, source."""
        from propdb.intake.fuelfile import TEMPLATE

        return TEMPLATE

    def fuel_add(
        self, file: str | os.PathLike[str] | Mapping[str, Any], *, basis: str | None = None, dry_run: bool = False
    ) -> FuelSheet:
        """Add a fuel: a pseudo-species, and its calorific value as a draft entry on a combustion datum.

        Combustion is to gaseous carbon dioxide, sulfur dioxide, nitrogen and (from chlorine) hydrogen chloride. Between
        gross and net, constant volume and constant pressure, and the bases, the relations of ISO 1928 and ISO 1170
        hold, with molar masses and the enthalpy of vaporisation of the store in place of rounded coefficients.

        Parameters
        ----------
        file : path or mapping
            TOML as :meth:`fuel_template` writes it, or values by its keys.
        basis : str, optional
            On which the species stands: ``as-received``, ``air-dried``, ``dry``, ``dry-ash-free`` (or ``ar``, ``ad``,
            ``d``, ``daf``). As received where that moisture is known, else the basis of the analysis.
        dry_run : bool
            Only say what would be added.

        Raises
        ------
        InvalidInput
            A calorific value without its basis, an analysis that does not add up, a missing moisture, a name that
            another species has; with the place. Nobody is named as author.
        NotFound
            No such file or source.
        StoreError, StoreBusy, StoreReadOnly
        """
        from propdb.intake.files import read_file
        from propdb.intake.fuel import entry_of, species_of
        from propdb.intake.fuelfile import parse_fuel_file, read_basis
        from propdb.store.content import with_id

        if isinstance(file, Mapping):
            data, where, how = file, "fuel", "given by a program"
        else:
            read = read_file(Path(file))
            data, where = parse_fuel_file(read), read.name
            how = f"from {read.name}, SHA-256 {read.digest[:16]}"
        given = self._read(data, where)
        stands = _stands(given, None if basis is None else read_basis(basis, where="--basis"))
        species = species_of(given.fuel, stands)
        known = self._same_species(species, where)
        datum = self.datum_show(_datum(given.fuel.analysis))
        entry = with_id(entry_of(given, stands, datum=datum.name), species)
        source = self._new_source(given, where)
        if not dry_run:
            self._write(entry, species if known is None else None, source, where, how)
        status = next((e.status for e in self._entries(known, dry_run, entry.species) if e.id == entry.id), "")
        return self._sheet(given, stands, entry.id, status)

    def fuel_show(self, fuel: str) -> FuelSheet:
        """A fuel of the store: its analysis, calorific values and formation enthalpy on each basis.

        Raises
        ------
        NotFound, Ambiguous
            No species, or several, answer to the name; or it was not added as a fuel.
        """
        record = resolve(self._reader, fuel)
        found = [e for e in self._reader.entries(record.name) if e.quantity == "Hf" and "fuel" in e.params]
        if not found:
            hint = "propdb show lists what the store has of it; propdb fuel add FILE adds a fuel"
            raise NotFound(f"{record.name} was not added as a fuel", hint=hint)
        entry = min(found, key=lambda e: (STATUSES.index(e.status), e.id))
        typed = {key: value for key, value in entry.params["fuel"].items() if key != "basis"}
        given = self._read({**typed, "name": record.name, "phase": entry.phase, "source": entry.source}, record.name)
        return self._sheet(given, str(entry.params["fuel"]["basis"]), entry.id, entry.status)

    # -- parts --------------------------------------------------------------------------------------------------------

    def _read(self, data: Mapping[str, Any], where: str) -> GivenFuel:
        from propdb.intake.fuel import read_fuel
        from propdb.model.fuel import ELEMENTS

        levels = self._engine(None, False)
        forms = self._reader.policy("elements")
        weights = {}
        for element in ELEMENTS:
            record = self._reader.species(forms[element]["forms"][0]["species"])
            weights[element] = record.molar_mass / float(dict(record.composition)[element])
        vaporisation = _level(levels, "water", "g") - _level(levels, "water", "l")
        return read_fuel(data, where=where, weights=weights, vaporisation=vaporisation)

    def _same_species(self, species: Species, where: str) -> Species | None:
        """The species of the store that this one is already, None where its name is free."""
        try:
            found = resolve(self._reader, species.name)
        except NotFound:
            return None
        except Ambiguous:
            raise InvalidInput(
                f"the name {species.name!r} means several species", where=where, hint="choose another name"
            ) from None
        if (found.name, found.composition, found.note) == (species.name, species.composition, species.note):
            return found
        raise InvalidInput(
            f"{species.name!r} is a species of the store already, of another composition",
            where=where,
            hint="choose another name, e.g. with a date",
        )

    def _new_source(self, given: GivenFuel, where: str) -> Source | None:
        """The source to be added, None where the store has it."""
        if given.new_source is None:
            self.source_show(given.source)
            return None
        try:
            found = self._reader.source(given.source)
        except NotFound:
            return given.new_source
        if (found.title, found.year) == (given.new_source.title, given.new_source.year):
            return None
        raise InvalidInput(
            f"source {given.source!r} is in the store with the title {found.title!r}",
            where=f"{where}, [new-source]",
            hint="leave the table out, or choose another key",
        )

    def _write(self, entry: Any, species: Species | None, source: Source | None, where: str, how: str) -> None:
        from propdb._version import __version__
        from propdb.api.person import who
        from propdb.model.records import Carrier
        from propdb.store.own import add_own_all

        if self._as_of is not None:
            raise InvalidInput("the past cannot be added to", hint="open the store without as_of")
        carrier = Carrier("own", __version__, where, None, how)
        add_own_all(
            self._path,
            [(entry, carrier)],
            who(),
            species=[] if species is None else [species],
            sources=[] if source is None else [source],
            comment=f"fuel, {how}",
        )
        self._forget()

    def _entries(self, known: Species | None, dry_run: bool, name: str) -> tuple[Any, ...]:
        return () if known is None and dry_run else self._reader.entries(name)

    def _sheet(self, given: GivenFuel, stands: str, entry: str, status: str) -> FuelSheet:
        from propdb.intake.fuel import species_of
        from propdb.model.fuel import FORMULA_UNIT, KINDS, PLACES, FuelSheet, estimate

        fuel, levels = given.fuel, self._engine(None, False)
        bases = fuel.analysis.bases()
        datum = self.datum_show(_datum(fuel.analysis))
        values = {
            basis: {f"{kind} {at}": fuel.calorific_value(kind, at, basis) for kind in KINDS for at in PLACES}
            for basis in bases
        }
        formation = {}
        for basis in bases:
            zero = levels.zero_of(datum, species_of(fuel, basis), phase=fuel.phase, temperature=T_STANDARD)
            products = sum(
                float(term.coefficient) * _level(levels, term.species, term.zero.phase) for term in zero.terms
            )
            formation[basis] = values[basis]["gross constant pressure"] + products / FORMULA_UNIT
        guess = estimate(fuel.analysis.fractions("dry")) if "dry" in bases else None
        return FuelSheet(
            name=fuel.name,
            formula=species_of(fuel, stands).formula,
            phase=fuel.phase,
            basis=stands,
            datum=datum.name,
            given=given.given,
            source=given.source,
            fractions={basis: fuel.analysis.fractions(basis) for basis in bases},
            values=values,
            formation=formation,
            estimate=guess,
            remarks=(*given.remarks, *self._remarks(given, values, guess)),
            entry=entry,
            status=status,
        )

    def _remarks(
        self, given: GivenFuel, values: Mapping[str, Mapping[str, float]], guess: float | None
    ) -> tuple[str, ...]:
        found = []
        analysis = given.fuel.analysis
        if analysis.elements.get("Cl"):
            levels = self._engine(None, False)
            heat = _level(levels, "hydrogen chloride", "g") - _level(levels, "chloride ion", "aq")
            excess = heat * analysis.elements["Cl"] / analysis.weights["Cl"]
            if excess > _TELLS * given.fuel.gross:
                shown = excess * analysis.dry_ash_free(given.value_basis) / 1e6
                found.append(
                    "chlorine burns to gaseous hydrogen chloride here; if the laboratory left it as aqueous acid, the "
                    f"value given is {shown:.2g} MJ/kg too high"
                )
        if guess:
            share = values["dry"]["gross constant volume"] / guess - 1.0
            if abs(share) > _ODD:
                found.append(
                    f"the calorific value is {100 * abs(share):.3g} % {'above' if share > 0 else 'below'} the one that "
                    "the analysis suggests: check its unit, kind and basis"
                )
        return tuple(found)


def _level(levels: Levels, species: str, phase: str) -> float:
    """Level of a species at 298.15 K [J/mol]."""
    return float(sum(leg.value for leg in levels.level(species, State(phase, T_STANDARD))))


def _datum(analysis: Analysis) -> str:
    return GROSS_WITH_CHLORINE if analysis.elements.get("Cl") else GROSS


def _stands(given: GivenFuel, basis: str | None) -> str:
    """The basis on which the fuel stands in the store."""
    analysis = given.fuel.analysis
    if basis is None:
        return "as-received" if "as-received" in analysis.bases() else given.analysis_basis
    analysis.dry_ash_free(basis)  # says what is missing
    return basis
