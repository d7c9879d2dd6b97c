"""Who copies whom: independence of two sources, and the chain of one as a tree."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

from propdb.model.records import Source

__all__ = ["Ancestor", "Lineage"]


@dataclass(frozen=True, slots=True)
class Ancestor:
    """A source that another takes values from, with its own ancestors."""

    key: str
    evidence: str
    copies: tuple[Ancestor, ...] = ()


class Lineage:
    """The graph of copies.

    Parameters
    ----------
    policy : mapping
        The policy ``lineage``: ``compilation`` and ``copies``, as ``lineage.toml`` has them.
    sources : iterable of Source
        Their records list copies of their own.
    """

    def __init__(self, policy: Mapping[str, Any], sources: Iterable[Source] = ()) -> None:
        self._copies: dict[str, dict[str, str]] = {}
        self.titles: dict[str, str] = {}
        for row in policy.get("compilation", ()):
            self.titles[row["key"]] = row["title"]
            for copied in row.get("copies", ()):
                self._add(row["key"], copied["of"], copied["evidence"])
        for row in policy.get("copies", ()):
            self._add(row["source"], row["of"], row["evidence"])
        for source in sources:
            self.titles.setdefault(source.key, source.title)
            for copied, evidence in source.lineage:
                self._add(source.key, copied, evidence)
        self._closures: dict[str, frozenset[str]] = {}

    def _add(self, key: str, of: str, evidence: str) -> None:
        self._copies.setdefault(key, {}).setdefault(of, evidence)

    def ancestors(self, key: str) -> frozenset[str]:
        """A source and all that it descends from."""
        if key not in self._closures:
            found = {key}
            todo = [key]
            while todo:
                new = set(self._copies.get(todo.pop(), ())) - found
                found |= new
                todo += new
            self._closures[key] = frozenset(found)
        return self._closures[key]

    def independent(self, one: str, other: str) -> bool:
        """Do two sources share no ancestor, themselves included?"""
        return not self.ancestors(one) & self.ancestors(other)

    def chain(self, key: str) -> tuple[Ancestor, ...]:
        """What a source copies, what those copy in turn, and so on; a source that stands higher up is not repeated."""
        return self._chain(key, {key})

    def _chain(self, key: str, above: set[str]) -> tuple[Ancestor, ...]:
        return tuple(
            Ancestor(of, evidence, self._chain(of, above | {of}))
            for of, evidence in self._copies.get(key, {}).items()
            if of not in above
        )

    def copied_by(self, key: str) -> tuple[str, ...]:
        """Sources that take values from this one, directly."""
        return tuple(sorted(other for other, copied in self._copies.items() if key in copied))
