"""Choosing among entries: one function and one rank table (data, ``ranks.toml``)."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from typing import Any, Protocol

from propdb.model.records import USABLE_STATUSES, Datum, Entry, Source, Species

__all__ = ["Data", "Policy", "choose", "order"]


class Data(Protocol):
    """What the levels need to know of a store."""

    def species(self, name: str) -> Species: ...

    def entries(self, species_name: str) -> tuple[Entry, ...]: ...

    def source(self, key: str) -> Source: ...

    def datum(self, name: str) -> Datum: ...

    def policy(self, key: str) -> Any: ...


@dataclass(frozen=True)
class Policy:
    """Source ranks and class defaults, and the sources a user pinned."""

    ranks: Mapping[str, Any]
    source_class: Callable[[str], str]
    pinned: tuple[str, ...] = ()
    _ranks_of: dict[tuple[str, str], int] = field(default_factory=dict, repr=False)
    _defaults_of: dict[tuple[str, str, bool], tuple[float, str]] = field(default_factory=dict, repr=False)

    def rank(self, entry: Entry) -> int:
        """Place of the entry's source for its quantity; smaller is better."""
        key = (entry.source, entry.quantity)
        if key not in self._ranks_of:
            self._ranks_of[key] = self._lookup(*key)
        return self._ranks_of[key]

    def _lookup(self, source: str, quantity: str) -> int:
        table = self.ranks.get("rank", {})
        for group in table:
            if quantity in group["quantities"] and source in group["sources"]:
                return int(group["sources"].index(source))
        classes = self.ranks.get("class_order", ["evaluated", "handbook", "compilation", "practice", "estimate"])
        cls = self.source_class(source)
        return 1000 + (classes.index(cls) if cls in classes else len(classes))

    def default_standard(self, entry: Entry) -> tuple[float, str]:
        """Class default of a standard uncertainty: ``(value, unit)``, unit "" (SI of the entry) or "%" (a fraction).

        For ranking only; never shown as stated.
        """
        key = (entry.source, entry.quantity, entry.equation == "iapws95")
        if key not in self._defaults_of:
            self._defaults_of[key] = self._default(*key)
        return self._defaults_of[key]

    def _default(self, source: str, quantity: str, formulation: bool) -> tuple[float, str]:
        cls = "formulation" if formulation else self.source_class(source)
        for row in self.ranks.get("class_default", ()):
            named = source in row.get("sources", ()) or cls in row.get("classes", ())
            if quantity in row["quantities"] and named:
                if "percent" in row:
                    return float(row["percent"]) / 100.0, "%"
                return float(row["standard"]), ""
        return 0.05, "%"

    def standard(self, entry: Entry) -> tuple[float, str, bool]:
        """``(standard uncertainty, unit, stated)`` of an entry; a fraction where unit is "%"."""
        stated = entry.standard_uncertainty()
        if stated is not None:
            return stated, entry.uncertainty_unit, True
        value, unit = self.default_standard(entry)
        return value, unit, False

    def trust(self, entry: Entry) -> float:
        """Standard uncertainty for ranking where sources differ, SI units: of a compilation no less than its class has.

        The errors that a compilation states are those of the measurements; its own slips come on top.
        """
        size = self.standard_si(entry)
        if self.source_class(entry.source) not in ("compilation", "estimate"):
            return size
        value, unit = self.default_standard(entry)
        return max(size, value * abs(entry.value or 1.0) if unit == "%" else value)

    def standard_si(self, entry: Entry) -> float:
        """Standard uncertainty in the entry's SI unit (stated or class default), for ranking."""
        value, unit, _ = self.standard(entry)
        return value * abs(entry.value or 1.0) if unit == "%" else value


def order(policy: Policy) -> Callable[[Entry], tuple[Any, ...]]:
    """Sort key: pinned sources, status, source rank, uncertainty, id."""

    def key(entry: Entry) -> tuple[Any, ...]:
        pin = policy.pinned.index(entry.source) if entry.source in policy.pinned else len(policy.pinned)
        return (
            pin,
            entry.place,
            policy.rank(entry),
            policy.standard_si(entry),
            entry.id,
        )

    return key


def choose(entries: Iterable[Entry], policy: Policy) -> list[Entry]:
    """Usable entries, best first. Quarantined, datum-unknown, draft, superseded and withdrawn ones never appear."""
    return sorted((e for e in entries if e.status in USABLE_STATUSES), key=order(policy))
