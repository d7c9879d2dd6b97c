"""What every part of the API stands on: the reader, look-ups, datums, and the engine."""

from __future__ import annotations

import os
from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any, Self, TypeVar

from propdb.errors import DatumError, InvalidInput, NotFound, StoreError
from propdb.model.crosscheck import EntryCheck
from propdb.model.records import PHASES, QUANTITIES, USABLE_STATUSES, Datum, Entry, Source, Species
from propdb.model.sheet import SpeciesSheet
from propdb.store.read import Reader
from propdb.store.search import Match, find, resolve

if TYPE_CHECKING:
    from datetime import date

    from propdb.levels.engine import Levels
    from propdb.levels.policy import Policy
    from propdb.model.answer import Answer, ReactionAnswer
    from propdb.model.records import Step
    from propdb.vetting.crosscheck import Checker
    from propdb.vetting.lineage import Lineage

    _Answer = TypeVar("_Answer", Answer, ReactionAnswer)

__all__ = ["Core"]


class Core:
    """One store file. Reading is lazy; every method opens what it needs. One per thread.

    Parameters
    ----------
    path : path
        The store file. It is opened when first needed, and only :meth:`store_rebuild` makes one.
    as_of : date or str, optional
        See :func:`propdb.open`.
    """

    def __init__(self, path: str | os.PathLike[str], *, as_of: str | date | None = None) -> None:
        self._path = Path(path)
        self._as_of = as_of
        self._levels: dict[tuple[tuple[str, ...], bool], Levels] = {}
        self._stamp = ""
        self._datums: Mapping[str, Datum] = {}
        self._checks: Checker | None = None

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

    def _must_be_present(self) -> None:
        """Refuse to change a store that is looked at as it was."""
        if self._as_of is not None:
            raise InvalidInput(
                f"the store as of {self._as_of} cannot be changed", hint="leave --as-of out to change it as it is"
            )

    def __enter__(self) -> Self:
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
        """Every entry of a species, with its sources; of each quantity and phase what answers take first stands first.

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
        kept = tuple(sorted(kept, key=_by_use(self._policy())))
        return SpeciesSheet(record, kept, {key: self._reader.source(key) for key in sorted({e.source for e in kept})})

    def entry_show(self, id: str) -> Entry:
        """One entry by its id, or the first characters of it. Raises NotFound or Ambiguous."""
        return self._reader.entry(id)

    def source_list(self) -> list[Source]:
        """Every source, each with the chain of sources that it copies."""
        lineage = self._lineage()
        return [
            replace(source, chain=lineage.chain(source.key), copied_by=lineage.copied_by(source.key))
            for source in self._reader.sources()
        ]

    def source_show(self, key: str) -> Source:
        """One source, with the chain of sources that it copies. Raises NotFound, with the nearest keys."""
        try:
            lineage = self._lineage()
            source = lineage.compilation(key) or self._reader.source(key)
            return replace(source, chain=lineage.chain(key), copied_by=lineage.copied_by(key))
        except NotFound as error:
            from difflib import get_close_matches

            keys = [source.key for source in self._reader.sources()]
            near = [k for k in keys if key and k.startswith(key.lower())]
            near = near or get_close_matches(key, keys, n=3, cutoff=0.5)
            if near:
                error.hint = f"did you mean {' or '.join(near[:3])}? propdb source list shows all keys"
            raise

    def _lineage(self) -> Lineage:
        from propdb.vetting.lineage import Lineage

        return Lineage(self._reader.policy("lineage", {}), self._reader.sources())

    def _checker(self) -> Checker:
        """What compares entries with other compilations; loads the open library."""
        if self._checks is None:
            from propdb.vetting.crosscheck import Checker

            self._checks = Checker(self._reader.policy("lineage", {}), self._reader.sources())
        return self._checks

    def _with_changes(self, answer: _Answer, policy: Policy) -> _Answer:
        """The answer with a warning where the latest base changed an entry behind it."""
        if self._reader.base_before is None:
            return answer
        from propdb.api.changes import changes

        return replace(answer, warnings=(*answer.warnings, *changes(self._reader, answer, policy)))

    def _at_state(self, answer: _Answer) -> _Answer:
        """The answer with each of its heatings compared at the state itself, and entries that nobody compared yet."""
        return replace(answer, crosscheck=(*answer.crosscheck, *self._compared(answer.steps)))

    def _compared(self, steps: Sequence[Step]) -> list[EntryCheck]:
        checker = self._checker()
        found: dict[tuple[str, float, float], tuple[EntryCheck, ...]] = {}
        for step in steps:
            if not step.entry:
                continue
            entry, species = self._reader.entry(step.entry), self._reader.species(step.species)
            if not entry.crosschecks:
                found[entry.id, 0.0, 0.0] = tuple(EntryCheck(entry, check) for check in checker(entry, species))
            if step.span is not None:
                checks = checker.heating(entry, species, *step.span)
                found[entry.id, *step.span] = tuple(EntryCheck(entry, check, step.span[0]) for check in checks)
        return [check for checks in found.values() for check in checks]

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
        from propdb.api.person import who_if_named
        from propdb.datum.reading import parse_datums
        from propdb.datum.writing import datum_body
        from propdb.store.own import UNNAMED, put_own

        self._must_be_present()
        place = Path(file)
        data = _read_toml(place)
        elements = self._reader.policy("elements", {})
        found = parse_datums(data, where=place.name, composition=self._composition, elements=elements)
        if not found:
            raise DatumError("the file defines no datum", where=place.name, hint="write a [datum.NAME] table")
        for name, datum in found.items():
            if name in self._all_datums():
                raise DatumError(f"a datum named {name} exists", where=place.name, hint="choose another name")
            if datum.source != "common-practice":
                self._reader.source(datum.source)
        bodies = {name: datum_body(datum) for name, datum in found.items()}
        put_own(self._path, datums=bodies, who=who_if_named() or UNNAMED)
        self._forget()
        return list(found)

    def _composition(self, name: str) -> tuple[dict[str, Any], int]:
        record = self._reader.species(name)
        return dict(record.composition), record.charge

    # -- engine ---------------------------------------------------------------------------------------------------

    def _engine(self, source: str | None, extrapolate: bool) -> Levels:
        """The levels for a choice of sources, built once per state of the store."""
        from propdb.levels.engine import Levels

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
            self._levels[choice] = Levels(data, self._policy(pinned), extrapolate=extrapolate)
        return self._levels[choice]

    def _policy(self, pinned: tuple[str, ...] = ()) -> Policy:
        from propdb.levels.policy import Policy

        return Policy(self._reader.policy("ranks"), lambda key: self._reader.source(key).cls, pinned)

    def _forget(self) -> None:
        self._levels.clear()
        self._checks = None
        self._datums = {}


def _by_use(policy: Policy) -> Callable[[Entry], tuple[Any, ...]]:
    """Sort key: quantity, phase, form; then as answers choose, heat capacities over temperature before single ones,
    298.15 K before 0 K, and what they do not use last."""
    from propdb.levels.policy import order

    place = order(policy)

    def key(entry: Entry) -> tuple[Any, ...]:
        single = not entry.equation if entry.quantity == "Cp" else entry.temperature == 0.0
        usable = entry.status in USABLE_STATUSES
        own = place(entry) if usable else (entry.status, entry.source, entry.id)
        return (QUANTITIES.index(entry.quantity), PHASES.index(entry.phase), entry.form, not usable, single, own)

    return key


class _Data:
    """What the levels see of a store."""

    def __init__(self, store: Core) -> None:
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
