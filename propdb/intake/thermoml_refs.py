"""What the data of a ThermoML file refer to: its source and its species, those of the store where it has them."""

from __future__ import annotations

import re
from collections.abc import Mapping
from functools import cached_property

from propdb.errors import Ambiguous, FormulaError, InvalidInput, SeedError
from propdb.intake.plan import Known, this_year
from propdb.intake.rows import Row, Table
from propdb.intake.species import merge_species
from propdb.intake.thermoml_records import Citation, Compound, Document
from propdb.model.formula import check_cas, parse_formula
from propdb.model.records import Source, Species

__all__ = ["Left", "References"]

_RESOLVER = re.compile(r"^(?:https?://(?:dx\.)?doi\.org/|doi:\s*)", re.IGNORECASE)
_KEY = re.compile(r"[^a-z0-9]+")


class Left(Exception):
    """Something is left out; the text says why."""


class References:
    """Source and species of a document; ``new_source`` and ``new_species`` are those that the store lacks.

    Raises
    ------
    InvalidInput
        The citation has no author, or no year up to now.
    """

    def __init__(self, document: Document, known: Known) -> None:
        self.document, self.known = document, known
        self.new_source: Source | None = None
        self.new_species: dict[str, Species] = {}
        self.species: dict[str, Species | str] = {}
        self.source = self._source(document.citation)

    def _bad(self, place: str, problem: str, hint: str = "") -> InvalidInput:
        return InvalidInput(problem, where=f"{self.document.file}, {place}", hint=hint)

    def _source(self, citation: Citation) -> Source:
        """The source of the file: one that the store has, by DOI or by title and year, or a new one."""
        if not re.fullmatch(r"[12][0-9]{3}", citation.year):
            raise self._bad("Citation", f"the year {citation.year[:20]!r} is none", "yrPubYr has four digits")
        year = int(citation.year)
        if year > this_year():
            raise self._bad("Citation", f"the year {year} is in the future", "yrPubYr is when it appeared")
        dated = re.match(r"([0-9]{4})(?![0-9])", citation.dated)
        if dated and int(dated.group(1)) > this_year():
            problem = f"the date {citation.dated[:20]} is in the future"
            raise self._bad("Citation", problem, "dateCit is when it appeared")
        if not citation.authors:
            raise self._bad("Citation", "there is no sAuthor", "a source has authors")
        fields = dict(citation.fields)
        fields["doi"] = _RESOLVER.sub("", fields.get("doi", ""))
        if not re.fullmatch(r"10\.[0-9]{4,9}/\S+", fields.get("doi", "")):
            fields.pop("doi", None)
        for other in self.known.sources.values():
            same_doi = fields.get("doi") and other.fields.get("doi", "").lower() == fields["doi"].lower()
            if same_doi or (other.year == year and other.title.casefold() == citation.title.casefold()):
                return other
        surname = _KEY.sub("-", citation.authors[0].partition(",")[0].lower()).strip("-") or "source"
        key = f"{surname[:40]}-{year}"
        letters = (f"{key}{letter}" for letter in "bcdefghijklmnopqrstuvwxyz")
        key = next((k for k in (key, *letters) if k not in self.known.sources), f"{key}-{len(self.known.sources)}")
        kinds = {"journal": "article", "book": "book"}
        source = Source(
            key=key,
            title=citation.title,
            authors=citation.authors,
            year=year,
            kind=kinds.get(citation.kind.lower(), "report"),
            cls="compilation",
            terms="Numerical facts; neither the publication nor the file is reproduced.",
            fields=fields,
            carrier=f"ThermoML {self.document.version}, {self.document.file}",
            note="Values as published, not critically evaluated here.",
        )
        self.new_source = source
        return source

    @cached_property
    def weights(self) -> Mapping[str, float]:
        """Atomic weights [g/mol]."""
        from propdb.intake.seeds import atomic_weights
        from propdb.intake.where import seed_root

        return atomic_weights(seed_root())

    def of(self, number: str) -> Species:
        """The species of a compound by its number in the file. Raises Left."""
        found = self.species.get(number)
        if found is None:
            try:
                found = self._resolved(self.document.compounds[number])
            except Left as reason:
                found = str(reason)
            self.species[number] = found
        if isinstance(found, str):
            raise Left(found)
        return found

    def _resolved(self, compound: Compound) -> Species:
        """The species of the store by CAS RN, InChIKey or name; else a new one by its formula."""
        found = self._looked_up(compound)
        try:
            counts = dict(parse_formula(compound.formula).counts) if compound.formula else {}
            cas = check_cas(compound.cas) if compound.cas else ""
        except FormulaError as error:
            raise Left(f"{compound.label}: {error.problem}") from None
        if found is not None:
            if counts and counts != dict(found.composition):
                raise Left(f"the file gives {compound.formula} for {compound.label}, the store {found.formula}")
            return found
        if not compound.names or not counts:
            raise Left(f"{compound.label} is not in the store, and the file does not give its name and formula")
        name = compound.names[0]
        cells = {
            "name": name,
            "formula": compound.formula,
            "charge": "0",
            "cas": cas,
            "inchikey": compound.inchikey,
            "synonyms": "; ".join(one for one in compound.names[1:] if ";" not in one),
        }
        row = Row(self.document.file, 0, cells)
        try:
            (species,) = merge_species([Table(row.file, (row,))], weights=self.weights).values()
        except SeedError as error:
            raise Left(f"{compound.label}: {error.problem}") from None
        self.new_species[species.name] = species
        return species

    def _looked_up(self, compound: Compound) -> Species | None:
        by_number = [self.known.species(text) for text in (compound.cas, compound.inchikey) if text]
        found = {one.name: one for one in by_number if one is not None}
        if len(found) > 1:
            raise Left(f"{compound.cas} is {' and its InChIKey '.join(found)} in the store")
        if found:
            return next(iter(found.values()))
        for name in compound.names:
            if name in self.new_species:
                return self.new_species[name]
            try:
                one = self.known.species(name)
            except Ambiguous as error:
                raise Left(error.problem) from None
            if one is not None:
                return one
        return None
