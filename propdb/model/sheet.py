"""A species with its entries and their sources."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from propdb.model.records import Entry, Source, Species

__all__ = ["SpeciesSheet"]


@dataclass(frozen=True, slots=True)
class SpeciesSheet:
    """What ``show`` gives: entries in a fixed order, sources by key."""

    species: Species
    entries: tuple[Entry, ...]
    sources: Mapping[str, Source]
