"""Review: drafts checked and approved by a second person, doubts raised and settled, and the log of it all."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import asdict, dataclass
from typing import TYPE_CHECKING

from propdb.api.core import Core
from propdb.errors import IntegrityError, InvalidInput

if TYPE_CHECKING:
    from propdb.store.history import Happening
    from propdb.store.log import Event
    from propdb.store.review import Waiting
    from propdb.store.verify import Problem

__all__ = ["LogLine", "Review", "StoreLog"]


@dataclass(frozen=True, slots=True)
class LogLine:
    """One event, and the species, quantity and phase of the entry that it is about."""

    event: Event
    species: str = ""
    quantity: str = ""
    phase: str = ""


@dataclass(frozen=True, slots=True)
class StoreLog:
    """The log, or the end of it."""

    lines: tuple[LogLine, ...]
    head: str  # hash of the last event
    events: int  # how many there are


class Review(Core):
    """``review ...``, ``entry history``, ``store log``, ``store setting``.

    Whoever decides is named by ``PROPDB_USER`` or the configuration file; see :func:`propdb.api.person.who`.
    """

    def review_list(self) -> tuple[Waiting, ...]:
        """Drafts, checked entries, and entries in doubt, with who made them and what may be decided; oldest first."""
        from propdb.store.review import waiting

        return waiting(self._reader)

    def review_check(self, entries: str | Iterable[str], *, comment: str = "") -> tuple[Event, ...]:
        """Say that drafts (or base entries) agree with their source. From then on they are used.

        Parameters
        ----------
        entries : str or iterable of str
            Ids, or their first characters; all are decided or none.
        comment : str

        Raises
        ------
        InvalidInput
            Nobody is named; the entry is of who decides; its status does not allow it.
        NotFound, Ambiguous, StoreError
        """
        return self._decide("check", entries, comment)

    def review_approve(self, entries: str | Iterable[str], *, comment: str = "") -> tuple[Event, ...]:
        """Approve checked entries: they go before those of the base. As :meth:`review_check`."""
        return self._decide("approve", entries, comment)

    def review_reject(self, entries: str | Iterable[str], *, comment: str = "") -> tuple[Event, ...]:
        """Refuse drafts or checked entries, with a reason: they are withdrawn. As :meth:`review_check`."""
        return self._decide("reject", entries, comment)

    def review_dispute(self, entries: str | Iterable[str], *, comment: str = "") -> tuple[Event, ...]:
        """Cast doubt on entries, with a reason: others go before them. As :meth:`review_check`."""
        return self._decide("dispute", entries, comment)

    def review_waive(
        self, entries: str | Iterable[str], *, comment: str = "", finding: str | None = None
    ) -> tuple[Event, ...]:
        """Lift a dispute or a quarantine, or waive a finding, with a reason. As :meth:`review_check`.

        Parameters
        ----------
        entries, comment
            As in :meth:`review_check`.
        finding : str, optional
            Name of a finding to waive; the status stays. Without it the status before the doubt comes back.
        """
        return self._decide("waive", entries, comment, finding or "")

    def review_withdraw(self, entries: str | Iterable[str], *, comment: str = "") -> tuple[Event, ...]:
        """Take entries out of use for good, with a reason. They stay in the store. As :meth:`review_check`."""
        return self._decide("withdraw", entries, comment)

    def _decide(self, verb: str, entries: str | Iterable[str], comment: str, finding: str = "") -> tuple[Event, ...]:
        from propdb.api.person import who
        from propdb.store.review import decide

        self._must_be_present()
        ids = [entries] if isinstance(entries, str) else list(entries)
        return decide(self._path, verb, ids, who=who(), comment=comment, finding=finding)

    # -- the record -----------------------------------------------------------------------------------------------

    def entry_history(self, id: str) -> tuple[Happening, ...]:
        """What happened to an entry, by its id or the first characters of it. Raises NotFound or Ambiguous."""
        from propdb.store.history import history

        return history(self._reader, id)

    def store_log(self, *, last: int | None = None, verify: bool = False) -> StoreLog:
        """Every event of the log in order, and its head.

        Parameters
        ----------
        last : int, optional
            Only so many, the latest.
        verify : bool
            First check that everything in the store is as it was written.

        Raises
        ------
        IntegrityError
            Something was changed by hand; ``fields["problems"]`` lists it all.
        """
        from propdb.store.history import about

        if last is not None and last < 1:
            raise InvalidInput(f"the last {last} events", hint="ask for 1 or more")
        if verify and (problems := self._problems()):
            count = f"{len(problems)} finding{'s' if len(problems) > 1 else ''}"
            raise IntegrityError(
                f"{count}: the store is not as propdb wrote it",
                where=f"store {self._path}",
                hint="put a backup in its place",
                problems=[str(problem) for problem in problems],
                findings=[asdict(problem) for problem in problems],
            )
        events = self._reader.events()
        shown = events if last is None else events[-last:]
        known = about(self._reader, {event.entry for event in shown if event.entry})
        lines = tuple(LogLine(event, *known.get(event.entry, ())) for event in shown)
        return StoreLog(lines, events[-1].hash, len(events))  # there is always a base

    def _problems(self) -> list[Problem]:
        from propdb.store.backup import check

        return check(self._path)

    def store_setting(self, name: str | None = None, value: str | None = None) -> Mapping[str, str]:
        """Settings of the store with their values; with a value, change one, which the log records.

        ``self-review`` (``off``, ``on``): may people check, approve and waive what they made themselves. For a store
        of one person.

        Raises
        ------
        NotFound, InvalidInput
            No such setting or value; nobody is named who changes it.
        """
        from propdb.api.person import who
        from propdb.store import review

        if name is not None:
            review.check_setting(name, value)
        if name is not None and value is not None:
            self._must_be_present()
            review.set_setting(self._path, name, value, who=who())
        found = review.settings_of(self._reader)
        return {name: found[name]} if name is not None else found
