"""What users call: ``propdb.open()`` and the methods of :class:`Store`. Verb ``a-b`` is method ``a_b``.

This is the only place that triggers a build, and the only one that ties reading to computing.
"""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Mapping
from dataclasses import asdict
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any

from propdb._version import __version__
from propdb.errors import DatumError, IntegrityError, InvalidInput, NotFound, StoreError, Unbalanced
from propdb.model.records import QUANTITIES, Datum, Entry, Source, Species, State
from propdb.model.sheet import SpeciesSheet
from propdb.store.open import default_path
from propdb.store.read import Reader
from propdb.store.search import Match, find, resolve

if TYPE_CHECKING:
    from datetime import date

    from propdb.levels.engine import Levels
    from propdb.model.answer import Answer, ReactionAnswer

__all__ = ["Store", "open"]

Temperature = str | float
Pressure = str | float


def open(path: str | os.PathLike[str] | None = None, *, as_of: str | date | None = None) -> Store:
    """Open a store; the default one is built when it does not exist yet.

    Parameters
    ----------
    path : path, optional
        A store file, which must exist. Without it ``PROPDB_STORE``, else the user-data directory; a missing one is
        built, with progress on standard error.
    as_of : date or str, optional
        The store as it stood at the end of that day (UTC), or at that moment.

    Raises
    ------
    StoreError
        No such file, not a store, damaged, of a newer schema, or not writable where it must be built.
    """
    if path is None:
        place = default_path()
        if not place.exists():
            _build(place, _to_stderr)
    else:
        place = Path(path)
    store = Store(place, as_of=as_of)
    store._reader.head  # noqa: B018  (a file that is none must be refused here)
    return store


def _to_stderr(text: str) -> None:
    print(text, file=sys.stderr, flush=True)


def _build(path: Path, progress: Callable[[str], None] | None) -> Any:
    """Bring the seed of this version into a store, in one transaction."""
    import sqlite3

    from propdb.intake.seeds import load_seed
    from propdb.intake.where import seed_root
    from propdb.store.write import build

    if progress is not None:
        progress(f"propdb: building the store {path}")
    content = load_seed(seed_root())
    versions = {"propdb": __version__, "python": sys.version.split()[0], "sqlite": sqlite3.sqlite_version}
    tell = None if progress is None else lambda text: progress(f"propdb: {text}")
    return build(path, content, versions=versions, progress=tell)


class Store:
    """One store file. Reading is lazy; every method opens what it needs. One per thread.

    Parameters
    ----------
    path : path
        The store file. It is opened when first needed, and only :meth:`store_rebuild` makes one.
    as_of : date or str, optional
        See :func:`open`.
    """

    def __init__(self, path: str | os.PathLike[str], *, as_of: str | date | None = None) -> None:
        self._path = Path(path)
        self._as_of = as_of
        self._levels: dict[tuple[tuple[str, ...], bool], Levels] = {}
        self._stamp = ""
        self._datums: Mapping[str, Datum] = {}

    def __repr__(self) -> str:
        return f"<propdb store {self._path}>"

    @cached_property
    def _reader(self) -> Reader:
        return Reader(self._path, as_of=self._as_of)

    def close(self) -> None:
        """Close the file."""
        reader = self.__dict__.pop("_reader", None)
        if reader is not None:
            reader.close()

    def __enter__(self) -> Store:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    # -- look up --------------------------------------------------------------------------------------------------

    def find(self, text: str, *, limit: int = 10) -> list[Match]:
        """Species by name, synonym, formula in any order of atoms, CAS RN or InChIKey, best match first."""
        if limit < 1:
            raise InvalidInput(f"a limit of {limit} matches", hint="ask for 1 or more")
        return find(self._reader, text, limit=limit)

    def show(
        self, species: str, *, quantity: str | None = None, phase: str | None = None, source: str | None = None
    ) -> SpeciesSheet:
        """Every entry of a species, with its sources.

        Raises
        ------
        NotFound, Ambiguous
            No species, or several, answer to the name; no such quantity, phase or source.
        """
        record = resolve(self._reader, species)
        if quantity is not None and quantity not in QUANTITIES:
            known = {q.lower(): q for q in QUANTITIES}
            near = known.get(quantity.lower())
            hint = f"did you mean {near}?" if near else f"quantities are {' '.join(QUANTITIES)}"
            raise NotFound(f"no quantity {quantity!r}", hint=hint)
        if phase is not None:
            from propdb.levels.typed import read_phase

            read_phase(phase)
        entries = self._reader.entries(record.name)
        keys = {e.source for e in entries}
        if source is not None and source not in keys:
            self._reader.source(source)  # an unknown key is the better complaint
            raise NotFound(f"{source} has no entry for {record.name}", hint=f"sources are {', '.join(sorted(keys))}")
        kept = tuple(
            e
            for e in entries
            if (quantity is None or e.quantity == quantity)
            and (phase is None or e.phase == phase)
            and (source is None or e.source == source)
        )
        return SpeciesSheet(record, kept, {key: self._reader.source(key) for key in sorted({e.source for e in kept})})

    def entry_show(self, id: str) -> Entry:
        """One entry by its id, or the first characters of it. Raises NotFound or Ambiguous."""
        return self._reader.entry(id)

    def source_list(self) -> list[Source]:
        """Every source."""
        return list(self._reader.sources())

    def source_show(self, key: str) -> Source:
        """One source. Raises NotFound, with the nearest keys."""
        try:
            return self._reader.source(key)
        except NotFound as error:
            from difflib import get_close_matches

            keys = [source.key for source in self._reader.sources()]
            near = [k for k in keys if key and k.startswith(key.lower())]
            near = near or get_close_matches(key, keys, n=3, cutoff=0.5)
            if near:
                error.hint = f"did you mean {' or '.join(near[:3])}? propdb source list shows all keys"
            raise

    def source_cite(self, key: str, format: str = "text") -> str:
        """A citation as ``text``, ``bibtex`` or ``csl-json``. Raises NotFound or InvalidInput."""
        from propdb.model import cite

        writers: dict[str, Callable[[Source], str]] = {
            "text": cite.text,
            "bibtex": cite.bibtex,
            "csl-json": cite.csl_json,
        }
        if format not in writers:
            raise InvalidInput(f"no citation format {format!r}", hint=f"formats are {', '.join(writers)}")
        return writers[format](self.source_show(key))

    # -- datums ---------------------------------------------------------------------------------------------------

    def _all_datums(self) -> Mapping[str, Datum]:
        if not self._datums:
            from propdb.datum.reading import read_body

            self._datums = {name: read_body(name, body) for name, body in self._reader.datum_rows().items()}
        return self._datums

    def datum_list(self) -> list[Datum]:
        """Every named datum: own-state, elements, basis species."""
        return list(self._all_datums().values())

    def datum_show(self, name: str) -> Datum:
        """A named datum, or an inline one such as ``own:l@65C``. Raises NotFound, with the nearest names."""
        from propdb.datum import resolve as resolve_datum

        return resolve_datum(name, self._all_datums())

    def datum_add(self, file: str | os.PathLike[str]) -> list[str]:
        """Add datums of your own from a TOML file, as ``datum show`` prints it. Returns their names.

        Raises
        ------
        DatumError
            The file contradicts itself, or a name is taken.
        """
        from propdb.datum.reading import parse_datums
        from propdb.datum.writing import datum_body
        from propdb.store.own import put_own

        place = Path(file)
        data = _read_toml(place)
        elements = self._reader.policies().get("elements", {})
        found = parse_datums(data, where=place.name, composition=self._composition, elements=elements)
        if not found:
            raise DatumError("the file defines no datum", where=place.name, hint="write a [datum.NAME] table")
        for name, datum in found.items():
            if name in self._all_datums():
                raise DatumError(f"a datum named {name} exists", where=place.name, hint="choose another name")
            if datum.source != "common-practice":
                self._reader.source(datum.source)
        put_own(self._path, datums={name: datum_body(d) for name, d in found.items()})
        self._forget()
        return list(found)

    def _composition(self, name: str) -> tuple[dict[str, Any], int]:
        record = self._reader.species(name)
        return dict(record.composition), record.charge

    # -- enthalpies -----------------------------------------------------------------------------------------------

    def enthalpy(
        self,
        species: str,
        *,
        phase: str,
        form: str | None = None,
        temperature: Temperature | None = None,
        pressure: Pressure | None = None,
        saturated: str | None = None,
        datum: str,
        unit: str = "kJ/mol",
        source: str | None = None,
        extrapolate: bool = False,
    ) -> Answer:
        """Enthalpy of a state on a datum.

        Parameters
        ----------
        species : str
            Name, synonym, formula, CAS RN or InChIKey.
        phase : str
            ``cr``, ``am``, ``l``, ``g`` (ideal gas), ``fluid`` (real fluid) or ``aq``.
        form : str, optional
            Of a crystal: ``graphite``.
        temperature : str or float
            ``"600C"``, or a number in K.
        pressure : str or float, optional
            Absolute: ``"40bar"``, or a number in Pa.
        saturated : str, optional
            ``liquid`` or ``vapour``.
        datum : str
            Named or inline.
        unit : str
            Of the answer: ``kJ/mol``, ``kJ/kg``, ``BTU/lb`` ...
        source : str, optional
            Key of a source, or several with commas, to prefer; what they cannot supply is named in the answer.
        extrapolate : bool
            Go beyond the ranges; marked in the answer.

        Raises
        ------
        PropdbError
            NotFound, Ambiguous, OutOfRange, NoData, InvalidInput: one line each, with the next thing to type.
        """
        from propdb.levels.answers import enthalpy
        from propdb.levels.typed import read_state
        from propdb.units import parse_unit

        record = resolve(self._reader, species)
        per = parse_unit(unit)
        levels = self._engine(source, extrapolate)
        state = read_state(record, phase, form, temperature, pressure, saturated)
        return enthalpy(levels, species=record, state=state, datum=self.datum_show(datum), unit=per, stamp=self._stamp)

    def convert(
        self,
        value: str | float,
        unit: str | None = None,
        *,
        species: str,
        from_: str,
        to: str,
        phase: str | None = None,
        form: str | None = None,
        temperature: Temperature | None = None,
        to_unit: str | None = None,
        source: str | None = None,
        extrapolate: bool = False,
    ) -> Answer:
        """A tabulated enthalpy moved from one datum to another: H_B = H_A + Z_A - Z_B.

        Parameters
        ----------
        value, unit : str or float, str
            ``"2800.8 kJ/kg"``, or ``2800.8, "kJ/kg"``.
        species, source, extrapolate
            As in :meth:`enthalpy`.
        from_, to : str
            Datums, named or inline.
        phase, form, temperature : optional
            Of the state; needed only where a datum depends on it (same temperature; aqueous ions).
        to_unit : str, optional
            Of the answer; as given if left out.

        Raises
        ------
        PropdbError
            As :meth:`enthalpy`; NoData names the formation enthalpy or latent heat that is missing.
        """
        from propdb.levels.answers import convert
        from propdb.levels.typed import read_phase, read_temperature
        from propdb.units import parse_quantity, parse_unit

        text = f"{value} {unit}" if unit else str(value)
        quantity = parse_quantity(text)
        record = resolve(self._reader, species)
        per = parse_unit(to_unit) if to_unit else quantity.unit
        levels = self._engine(source, extrapolate)
        return convert(
            levels,
            species=record,
            value=quantity.unit.to_si(quantity.value, molar_mass=record.molar_mass),
            given=f"{quantity.text} {quantity.unit.text}",
            source_datum=self.datum_show(from_),
            target_datum=self.datum_show(to),
            unit=per,
            stamp=self._stamp,
            phase=read_phase(phase) if phase else "g",
            temperature=None if temperature is None else read_temperature(temperature),
        )

    def reaction(
        self,
        equation: str,
        *,
        temperature: Temperature,
        datum: str = "elements-298K",
        unit: str = "kJ/mol",
        source: str | None = None,
        extrapolate: bool = False,
    ) -> ReactionAnswer:
        """Enthalpy of a reaction by the formation route and by sensible heats plus heat of reaction.

        Parameters
        ----------
        equation : str
            Balanced, each species with its phase: ``CO(g) + 1/2 O2(g) -> CO2(g)``.
        temperature : str or float
            Of all species; a number is in K.
        datum : str
            An elements or basis-species datum; the heat of reaction is the same on each.
        unit : str
            Per mole of reaction as written: ``kJ/mol``.

        Raises
        ------
        DatumMismatch
            An own-state datum, on which enthalpies may not be summed across a reaction.
        Unbalanced
            With the imbalance of each element and of charge.
        FormulaError
            An equation that cannot be read.
        PropdbError
            As :meth:`enthalpy`.
        """
        from propdb.levels.reactions import Participant, reaction
        from propdb.levels.typed import read_phase, read_temperature
        from propdb.model.equation import imbalance, parse_equation
        from propdb.units import parse_unit

        parsed = parse_equation(equation)
        t = read_temperature(temperature)
        per = parse_unit(unit)
        if per.basis == "mass":
            raise InvalidInput(f"a heat of reaction in {per.text}", hint="it is per mole of reaction: use kJ/mol")
        participants = []
        for coefficient, term in parsed.signed:
            record = resolve(self._reader, term.name)
            if not term.phase:
                raise InvalidInput(
                    f"{term.name} has no phase in the equation", hint=f"write e.g. {term.name}(g) or {term.name}(l)"
                )
            participants.append(Participant(coefficient, record, State(read_phase(term.phase), t, term.form)))
        excess = imbalance((p.coefficient, dict(p.species.composition), p.species.charge) for p in participants)
        if excess:
            shown = ", ".join(f"{what} {'+' if n > 0 else ''}{n}" for what, n in sorted(excess.items()))
            raise Unbalanced(
                f"the equation does not balance: products less reactants {shown}",
                hint="correct the coefficients",
                imbalance={what: str(n) for what, n in excess.items()},
            )
        levels = self._engine(source, extrapolate)
        return reaction(
            levels,
            equation=str(parsed),
            participants=participants,
            temperature=t,
            datum=self.datum_show(datum),
            unit=per,
            stamp=self._stamp,
        )

    def _engine(self, source: str | None, extrapolate: bool) -> Levels:
        """The levels for a choice of sources, built once per state of the store."""
        from propdb.levels.engine import Levels
        from propdb.levels.policy import Policy

        stamp = f"content {self._reader.content_hash[:16]}, log {self._reader.head[:16]}"
        if stamp != self._stamp:
            self._forget()
            self._stamp = stamp
        pinned = tuple(key.strip() for key in source.split(",")) if source else ()
        for key in pinned:
            self.source_show(key)
        choice = (pinned, extrapolate)
        if choice not in self._levels:
            data = _Data(self)
            policy = Policy(self._reader.policy("ranks"), lambda key: self._reader.source(key).cls, pinned)
            self._levels[choice] = Levels(data, policy, extrapolate=extrapolate)
        return self._levels[choice]

    def _forget(self) -> None:
        self._levels.clear()
        self._datums = {}

    # -- the store itself -----------------------------------------------------------------------------------------

    def store_info(self, *, coverage: bool = False) -> dict[str, Any]:
        """What the store holds: counts, content hash, log head, versions; with ``coverage`` by quantity and source."""
        info = dict(self._reader.info())
        if coverage:
            info.update(self._reader.coverage())
            info["paths"] = self._paths()
        return info

    def _paths(self) -> dict[str, int]:
        """Species whose phases are connected by data: liquid to ideal gas, solid to ideal gas."""
        from propdb.errors import PropdbError
        from propdb.levels.edges import ROOT

        levels = self._engine(None, False)
        counts = {"liquid_to_gas": 0, "solid_to_gas": 0, "elements-298K": 0}
        for record in self._reader.all_species():
            name = record.name
            try:
                tree = levels.tree(name)
            except PropdbError:
                continue
            by_phase: dict[str, set[int]] = {}
            for node, component in tree.component.items():
                if node != ROOT:
                    by_phase.setdefault(node.phase, set()).add(component)
            gas = by_phase.get("g", set())
            counts["liquid_to_gas"] += bool(gas & by_phase.get("l", set()))
            counts["solid_to_gas"] += bool(gas & by_phase.get("cr", set()))
            counts["elements-298K"] += any(tree.rooted(n) for n in tree.nodes if n != ROOT)
        return counts

    def store_check(self) -> dict[str, Any]:
        """Check the file, its content hash and the chain of its log. Raises IntegrityError with the first problems."""
        from propdb.store.backup import check

        problems = check(self._path)
        if problems:
            more = f"; and {len(problems) - 3} more" if len(problems) > 3 else ""
            raise IntegrityError(
                "; ".join(str(p) for p in problems[:3]) + more,
                where=f"store {self._path}",
                hint="restore a backup; propdb store backup makes one",
                problems=[str(p) for p in problems],
            )
        info = self._reader.info()
        return {
            "path": info["path"],
            "verdict": "sound: pages, references, entries, log",
            **{key: info[key] for key in ("content_hash", "head", "events", "entries")},
        }

    def store_path(self) -> Path:
        """Where the store is."""
        return self._path

    def store_rebuild(self, progress: Callable[[str], None] | None = None) -> dict[str, Any]:
        """Bring in the seed of this version again; own entries, datums and decisions stay."""
        report = _build(self._path, progress)
        self.close()
        self._forget()
        return asdict(report)

    def store_backup(self, file: str | os.PathLike[str]) -> None:
        """Copy the whole store, log included, to a new file. Raises StoreError where that exists."""
        from propdb.store.backup import backup

        backup(self._path, Path(file))


class _Data:
    """What the levels see of a store."""

    def __init__(self, store: Store) -> None:
        self._store = store
        self._entries: dict[str, tuple[Entry, ...]] = {}
        self._species: dict[str, Species] = {}

    def species(self, name: str) -> Species:
        if name not in self._species:
            self._species[name] = self._store._reader.species(name)
        return self._species[name]

    def entries(self, species_name: str) -> tuple[Entry, ...]:
        if species_name not in self._entries:
            self._entries[species_name] = self._store._reader.entries(species_name)
        return self._entries[species_name]

    def source(self, key: str) -> Source:
        return self._store._reader.source(key)

    def datum(self, name: str) -> Datum:
        return self._store.datum_show(name)

    def policy(self, key: str) -> Any:
        return self._store._reader.policy(key)


def _read_toml(place: Path) -> dict[str, Any]:
    import tomllib

    try:
        return tomllib.loads(place.read_text(encoding="utf-8-sig"))
    except OSError as error:
        raise StoreError(f"cannot be read: {error.strerror or error}", where=str(place)) from None
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise InvalidInput(f"is not TOML in UTF-8: {error}", where=str(place)) from None
