"""What the latest base changed about an answer: its entries are not those that the base before gave."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from propdb.levels.policy import Policy, choose, order
from propdb.model.answer import Answer, ReactionAnswer
from propdb.model.records import Entry
from propdb.store.content import canonical
from propdb.store.read import Reader

__all__ = ["changes"]

_PLACE = ("quantity", "phase", "form", "to")
_CITED = ("source", "locator")
#: What tells several entries of one source and locator apart, the most telling first.
_DETAILS = ("equation", "temperature", "conditions", "tmin", "tmax", "datum")
#: Temperatures of one state differ by this much between sources [K].
_SLACK = 1.0


def changes(reader: Reader, answer: Answer | ReactionAnswer, policy: Policy) -> tuple[str, ...]:
    """A warning for each entry behind an answer that stands there only since the latest base.

    It replaced another at the same place of its source, it is new, or the base dropped one that came before it.

    Empty where the store has seen one base only.
    """
    base = reader.base
    if reader.base_before is None:
        return ()
    used = {step.entry for step in answer.steps} | {part.entry for part in answer.parts}
    found: list[str] = []
    for name in dict.fromkeys(step.species for step in answer.steps):
        now = {entry.id: entry for entry in reader.entries(name)}
        before = {entry.id: entry for entry in reader.entries_before(name)}
        for id in sorted(now.keys() & used):
            found += _changes(now[id], now, before, policy, base.utc[:10])
    return tuple(found)


def _changes(
    entry: Entry, now: Mapping[str, Entry], before: Mapping[str, Entry], policy: Policy, date: str
) -> Iterator[str]:
    said = f"{entry.species}: {entry.quantity} of {entry.source} [{entry.id[:8]}]"
    rivals = [old for old in choose(before.values(), policy) if old.id != entry.id and _same_state(old, entry)]
    if entry.id in before:
        key = order(policy)
        gone = [old for old in rivals if old.id not in now and key(old) < key(entry)]
        if gone and _number(gone[0]) != _number(entry):
            yield f"{said} comes first since the base of {date}, which no longer holds {_told(gone[0])}"
        return
    twin = _twin(entry, [old for old in before.values() if old.id not in now])
    if twin is not None:
        if _number(twin) != _number(entry):
            decided = f", which was {twin.status} here," if twin.decided else ""
            yield f"{said} replaced [{twin.id[:8]}]{decided} with the base of {date}: {_became(twin, entry)}"
    elif rivals and _number(rivals[0]) != _number(entry):
        yield f"{said} is new with the base of {date}; the one before would give {_told(rivals[0])}"


def _twin(entry: Entry, gone: Sequence[Entry]) -> Entry | None:
    """What stood at the same place of the same source."""
    twins = [old for old in gone if all(getattr(old, name) == getattr(entry, name) for name in (*_PLACE, *_CITED))]
    return min(twins, key=lambda old: ([getattr(old, n) != getattr(entry, n) for n in _DETAILS], old.id), default=None)


def _same_state(a: Entry, b: Entry) -> bool:
    """May one stand in for the other?"""
    if any(getattr(a, name) != getattr(b, name) for name in _PLACE):
        return False
    if None not in (a.tmin, a.tmax, b.tmin, b.tmax):
        return max(a.tmin or 0.0, b.tmin or 0.0) < min(a.tmax or 0.0, b.tmax or 0.0)
    return a.temperature is None or b.temperature is None or abs(a.temperature - b.temperature) <= _SLACK


def _number(entry: Entry) -> tuple[object, ...]:
    return entry.value, entry.temperature, entry.datum, entry.equation, canonical(entry.params)


def _value(entry: Entry) -> str:
    return "" if entry.value is None else f"{entry.carried} {entry.carried_unit}"


def _told(entry: Entry) -> str:
    value = _value(entry)
    return f"that of {entry.source} [{entry.id[:8]}]" + (f", {value}" if value else "")


def _became(old: Entry, new: Entry) -> str:
    if _value(old) != _value(new):
        return f"{_value(old) or 'an equation'} became {_value(new) or 'an equation'}"
    if old.value is None:
        return "another equation, coefficients or range"
    return "another temperature or datum"
