"""Who copies whom: independence of two sources, and the chain of one as a tree."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

from propdb.model.records import Ancestor, Source

__all__ = ["Lineage"]


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
        held = tuple(sources)
        self._copies: dict[str, dict[str, str]] = {}
        self.titles: dict[str, str] = {}
        for row in policy.get("compilation", ()):
            self.titles[row["key"]] = row["title"]
            for copied in row.get("copies", ()):
                self._add(row["key"], copied["of"], copied["evidence"])
        for row in policy.get("copies", ()):
            self._add(row["source"], row["of"], row["evidence"])
        for source in held:
            self.titles.setdefault(source.key, source.title)
            for copied, evidence in source.lineage:
                self._add(source.key, copied, evidence)
        self._only_compared = {
            row["key"]: row for row in policy.get("compilation", ()) if row["key"] not in {s.key for s in held}
        }
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

    def compilation(self, key: str) -> Source | None:
        """The record of a compilation that entries are compared with and none comes from; None for any other key."""
        row = self._only_compared.get(key)
        if row is None:
            return None
        return Source(
            key=key,
            title=row["title"],
            authors=(),
            year=None,
            kind="compilation",
            cls="compared with, not held",
            terms="No entry comes from it; entries are compared with it.",
            carrier="chemicals library",
            note=row["reason"],
        )

    def chain(self, key: str) -> tuple[Ancestor, ...]:
        """What a source copies, what those copy in turn, and so on; a source that stands higher up is not repeated."""
        return self._chain(key, {key})

    def _chain(self, key: str, above: set[str]) -> tuple[Ancestor, ...]:
        return tuple(
            Ancestor(of, self.titles.get(of, ""), evidence, self._chain(of, above | {of}))
            for of, evidence in self._copies.get(key, {}).items()
            if of not in above
        )

    def copied_by(self, key: str) -> tuple[str, ...]:
        """Sources that take values from this one, directly."""
        return tuple(sorted(other for other, copied in self._copies.items() if key in copied))
