"""Which species a row is about: CAS RN and formula together, merged with the species that are there already.

A CAS RN alone is not believed. The formula comes from the row where its file has one, else from the identifiers of the
``chemicals`` package, else from the name; two that contradict each other send the row to the one species that has the
row's formula, or nowhere.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from functools import cache
from typing import Any, Final

from propdb.errors import FormulaError
from propdb.intake.package.names import decoded, is_code, prune, spoken, wanted_synonyms
from propdb.intake.package.systematic import formula_of_name
from propdb.model.formula import Formula, check_cas, hill, molar_mass, parse_formula
from propdb.model.records import Species
from propdb.store.content import identity, mark_of
from propdb.store.rows import fold

__all__ = ["Draft", "Refused", "Registry"]

Counts = tuple[tuple[str, int | Fraction], ...]
_HYDROGEN: Final = ("H", "D")
_PHASE: Final = re.compile(r"\s*\((?:g|l|cr|s|aq)\)\s*$")
_ION: Final = re.compile(r"^\[(.*)\]([+-]\d*)$")


class Refused(Exception):
    """Why a row cannot be placed. ``kind`` is one of a few, to count by."""

    def __init__(self, kind: str, reason: str) -> None:
        super().__init__(reason)
        self.kind = kind
        self.reason = reason


@dataclass(slots=True, eq=False)
class Draft:
    """A species while names and CAS RNs are being gathered. Name, formula and identifiers never change."""

    name: str
    counts: Counts
    charge: int
    cas: str
    inchikey: str
    molar_mass: float
    formula: str = ""  # in Hill order, without charge
    seed: Species | None = None
    mark: str = ""  # the identity that entries hash
    names: list[str] = field(default_factory=list)  # as the files call it
    called: set[str] = field(default_factory=set)  # every name that a row has given it
    known: Any = None  # what the identifiers have
    heard: set[str] = field(default_factory=set)  # names (small letters) that do not contradict the formula
    vapour: str = ""
    notes: list[str] = field(default_factory=list)

    def species(self, synonyms: Iterable[str]) -> Species:
        """The finished record."""
        if self.seed is not None:
            s = self.seed
            return Species(
                s.name,
                s.formula,
                s.charge,
                s.composition,
                s.molar_mass,
                s.cas,
                s.inchikey or (self.inchikey if s.cas else ""),
                (*s.synonyms, *(name for name in synonyms if name not in s.synonyms)),
                s.vapour,
                s.kind,
                s.note,
            )
        return Species(
            self.name,
            self.formula,
            self.charge,
            self.counts,
            self.molar_mass,
            self.cas,
            self.inchikey,
            tuple(synonyms),
            self.vapour,
            "species",
            "; ".join(self.notes),
        )


@cache
def read_formula(text: str) -> tuple[Counts, int] | None:
    """Atoms in Hill order and charge of a formula as files write it, or None."""
    plain = _ION.sub(r"\1\2", _PHASE.sub("", text.strip()).replace("[1H]", "D"))
    try:
        formula = parse_formula(plain)
    except FormulaError:
        return None
    return tuple(formula.counts.items()), formula.charge


class Registry:
    """Species by CAS RN, formula and name; starts with those of the seed.

    Parameters
    ----------
    seed : iterable of Species
    weights : mapping
        Atomic weights [g/mol].
    identifiers : mapping
        CAS RN as a number to what the package knows of it; names (small letters) to the same under ``by_name``.
    by_name : mapping
    aliases : mapping
        CAS RN to ``species``, ``form`` and perhaps ``formula``: what ``aliases.toml`` says.
    formulas : mapping
        CAS RN to (formula, name) where only the name tells the formula: what ``formulas.csv`` says.
    """

    def __init__(
        self,
        seed: Iterable[Species],
        *,
        weights: Mapping[str, float],
        identifiers: Mapping[int, Any],
        by_name: Mapping[str, Any],
        aliases: Mapping[str, Mapping[str, str]],
        formulas: Mapping[str, tuple[str, str]],
    ) -> None:
        self.weights = weights
        self.identifiers = identifiers
        self.by_name = by_name
        self.aliases = aliases
        self.formulas = formulas
        self._forms = {alias["form"]: (cas, alias) for cas, alias in aliases.items() if alias["form"]}
        self.drafts: dict[str, Draft] = {}
        self._by_cas: dict[str, Draft] = {}
        self._by_inchikey: dict[str, Draft] = {}
        self._by_formula: dict[tuple[Counts, int], list[Draft]] = {}
        self._folded: set[str] = set()
        self._claims: dict[str, tuple[Counts, int]] = {}  # CAS RN to the formula that a file gave for it
        for species in seed:
            draft = Draft(
                species.name,
                species.composition,
                species.charge,
                species.cas,
                species.inchikey,
                species.molar_mass,
                species.formula,
                seed=species,
                mark=identity(species),
                vapour=species.vapour,
            )
            if species.cas:
                draft.known = identifiers.get(_number(species.cas))
                if draft.known is not None and not draft.inchikey and self._same(draft):
                    draft.inchikey = draft.known.InChI_key
            self._file(draft)
            self._folded.update(fold(text) for text in species.synonyms)

    def _same(self, draft: Draft) -> bool:
        read = read_formula(draft.known.formula)
        return read is not None and dict(read[0]) == dict(draft.counts) and read[1] == draft.charge

    def _file(self, draft: Draft) -> None:
        self.drafts[draft.name] = draft
        self._folded.add(fold(draft.name))
        if draft.cas:
            self._by_cas[draft.cas] = draft
        if draft.inchikey:
            self._by_inchikey.setdefault(draft.inchikey, draft)
        self._by_formula.setdefault((draft.counts, draft.charge), []).append(draft)

    # -- rows -----------------------------------------------------------------------------------------------------

    def place(self, cas: str, name: str, formula: str = "") -> tuple[Draft, str, bool]:
        """The species of a row, the form its CAS RN stands for, and whether the CAS RN was set aside.

        Parameters
        ----------
        cas, name, formula : str
            As the file has them; formula "" where it has none.

        Raises
        ------
        Refused
            Nothing says what the row is about, or what says so contradicts itself.
        """
        number = cas.strip()
        name = decoded(name)
        alias = self.aliases.get(number)
        if alias is not None:
            return self._note(self._alias(number, alias), name), alias["form"], False
        if name.lower() in self._forms:  # "Graphite" under the CAS RN of methane
            cas, alias = self._forms[name.lower()]
            return self._note(self._alias(cas, alias), name), alias["form"], True
        number = self._checked(number)
        stated = read_formula(formula) if formula else self._claims.get(number)
        if formula and stated is None:
            raise Refused("formula not readable", f"the formula {formula.strip()!r} cannot be read")
        draft = self._by_cas.get(number) if number else None
        if draft is None and number:
            draft = self._new_by_cas(number, name, stated)
        if draft is not None:
            problem = self._contradiction(draft, name, stated)
            if not problem:
                if formula and stated:
                    self._claims.setdefault(number, stated)
                return self._note(draft, name), "", False
            return self._note(self._elsewhere(number, name, stated, problem), name), "", True
        return self._note(self._without_cas(number, name, stated), name), "", False

    def place_by_formula(self, cas: str, name: str, formula: str) -> tuple[Draft, str, bool]:
        """As :meth:`place`, for a file whose CAS RNs are not to be trusted: the formula goes first where it can."""
        number = cas.strip()
        stated = read_formula(formula)
        if stated is not None and number not in self.aliases and not _organic(stated[0]):
            among = self._by_formula.get(stated, [])
            listed = self._by_cas.get(number)
            if len(among) == 1 and among[0] is not listed:
                return self._note(among[0], decoded(name)), "", bool(number)
        return self.place(cas, name, formula)

    def known_by(self, cas: str) -> bool:
        """Has a species with this CAS RN been met?"""
        return cas.strip() in self._by_cas

    def _alias(self, number: str, alias: Mapping[str, str]) -> Draft:
        if not alias["species"]:
            raise Refused("formula in doubt", f"the formula listed for CAS RN {number} is in doubt")
        if number in self._by_cas:
            return self._by_cas[number]
        draft = self.drafts.get(alias["species"])
        if draft is None:
            read = read_formula(alias.get("formula", ""))
            if read is None:
                raise Refused("no formula known", f"nothing gives the formula of CAS RN {number}")
            among = self._by_formula.get(read, [])
            cas = "" if alias["form"] else number
            draft = among[0] if len(among) == 1 else self._make(alias["species"], read, cas, None, "", "")
        self._by_cas[number] = draft
        return draft

    def _checked(self, number: str) -> str:
        """The CAS RN, or "" for what is none (blank, "None", a number of the package's own)."""
        if number in self._by_cas:
            return number
        if number in ("", "None"):
            return ""
        try:
            return check_cas(number)
        except FormulaError:
            return ""

    @staticmethod
    def _note(draft: Draft, name: str) -> Draft:
        if name and name not in draft.called:
            draft.called.add(name)
            if fold(name) != fold(draft.name):
                draft.names.append(name)
        return draft

    def _new_by_cas(self, number: str, name: str, stated: tuple[Counts, int] | None) -> Draft | None:
        """A species for a CAS RN that is met for the first time; None where nothing gives its formula."""
        known: Any = self.identifiers.get(_number(number))
        listed = read_formula(known.formula) if known is not None else None
        exact = listed is not None
        note = ""
        shown = _formula_shown(known.common_name) if known is not None else None
        if listed and shown and shown != listed and {e for e, _ in shown[0]} == {e for e, _ in listed[0]}:
            note = f"formula by its name; the identifiers of the package list {known.formula}"
            listed, exact = shown, False
        if known is not None and stated is not None and listed != stated and _but_hydrogen(listed, stated):
            # The identifiers complete radicals with hydrogen, and call ions by the acid.
            listed, exact = stated, False
        if listed is None:
            listed, exact = stated, False
        if listed is None and number in self.formulas:
            formula, own = self.formulas[number]
            listed, note, name = read_formula(formula), "formula worked out from its name", name or own
        if listed is None:
            listed, note = self._by_its_name(name)
        if listed is None:
            return None
        if known is not None and exact and not any(e == "C" for e, _ in listed[0]) and not listed[1]:
            # The identifiers drop or add hydrogen of some inorganic compounds; a systematic name knows better.
            counts = formula_of_name(name)
            named = None if counts is None else (tuple(Formula(counts).counts.items()), 0)
            if named is not None and named != listed and _but_hydrogen(named, listed):
                note = f"formula by its systematic name; the identifiers of the package list {known.formula}"
                listed, exact = named, False
        if known is not None and not exact:
            known = None
        twin = self._twin(listed, known)
        if twin is not None:
            self._by_cas[number] = twin
            return twin
        title = known.common_name if known is not None and not is_code(known.common_name) else name
        if known is not None and stated is not None and listed != stated:
            name = ""  # the row is about another species than its CAS RN, and so is its name
        return self._make(title, listed, number, known, note, name)

    def _twin(self, listed: tuple[Counts, int], known: Any) -> Draft | None:
        """A species that must be this one: same InChIKey and formula, or an ion of one or two atoms without CAS RN."""
        if known is not None:
            draft = self._by_inchikey.get(known.InChI_key)
            if draft is not None and (dict(draft.counts), draft.charge) == (dict(listed[0]), listed[1]):
                return draft
        for draft in self._by_formula.get(listed, ()) if listed[1] else ():
            if not draft.cas and sum(n for _, n in draft.counts) <= 2:
                return draft
        return None

    def _by_its_name(self, name: str) -> tuple[tuple[Counts, int] | None, str]:
        """Formula by the name alone, and what to say about it."""
        for text in filter(None, (name.lower(), spoken(name).lower())):
            other = self.by_name.get(text)
            if other is not None and (read := read_formula(other.formula)) is not None:
                return read, "formula by its name"
        counts = formula_of_name(name)
        if counts is None:
            return None, ""
        return (tuple(Formula(counts).counts.items()), 0), "formula by its systematic name"

    def _contradiction(self, draft: Draft, name: str, stated: tuple[Counts, int] | None) -> str:
        """What the row says against the species that has its CAS RN, or ""."""
        mine = (draft.counts, draft.charge)
        if stated is not None:
            if dict(stated[0]) == dict(mine[0]) and stated[1] == mine[1]:
                return ""
            return hill(dict(stated[0]), stated[1])
        if draft.known is None and draft.seed is None:
            return ""
        folded = name.lower()
        if not draft.heard and draft.known is not None:
            draft.heard.update(text.lower() for text in draft.known.synonyms)
        if folded in draft.heard:
            return ""
        counts = formula_of_name(name)
        if counts is not None and dict(mine[0]) != counts and not mine[1]:
            return hill(counts)
        other = self.by_name.get(folded) if folded else None
        if other is None or draft.known is None or other is draft.known:
            draft.heard.add(folded)
            return ""
        read = read_formula(other.formula)
        if read is None or dict(read[0]) == dict(mine[0]):
            return ""
        if _but_hydrogen(read, mine) and any(e in _HYDROGEN for e, _ in read[0]):
            return ""
        return hill(dict(read[0]), read[1])

    def _elsewhere(self, number: str, name: str, stated: tuple[Counts, int] | None, problem: str) -> Draft:
        """The species that has the row's formula, where only one can have it: an organic formula needs the name too."""
        listed = self._by_cas[number]
        key = stated or read_formula(problem)
        among = self._by_formula.get(_sorted_key(key), []) if key else []
        named = [draft for draft in among if _has_name(draft, name)]
        if len(named) == 1:
            return named[0]
        if key is not None and not _organic(key[0]):
            if len(among) == 1:
                return among[0]
            if not among:
                note = f"its file lists it under the CAS RN of {listed.name}"
                return self._make(name, key, "", None, note, name)
        shown = hill(dict(listed.counts), listed.charge)
        others = "one species has" if len(among) == 1 else f"{len(among) or 'no'} species have"
        raise Refused(
            "formula contradicts CAS RN",
            f"{problem} contradicts CAS RN {number}, which is listed for {shown} ({listed.name}), and {others} the"
            " formula of the row but not its name",
        )

    def _without_cas(self, number: str, name: str, stated: tuple[Counts, int] | None) -> Draft:
        """The species of a row whose CAS RN tells nothing."""
        if stated is None:
            stated, _ = self._by_its_name(name)
        if stated is None:
            if number:
                raise Refused("no formula known", f"nothing gives the formula of CAS RN {number}")
            raise Refused("no formula known", "neither a CAS RN nor a formula")
        among = self._by_formula.get(_sorted_key(stated), [])
        same = [draft for draft in among if _has_name(draft, name)]
        if len(same) == 1:
            return same[0]
        if not number and len(among) == 1 and (not _organic(stated[0]) or sum(n for _, n in stated[0]) <= 3):
            return among[0]
        if not number and among:
            raise Refused(
                "several species have the formula",
                f"{len(among)} species have the formula {hill(dict(stated[0]), stated[1])}, and there is no CAS RN",
            )
        return self._make(name, stated, number, None, "", name)

    def _make(self, name: str, listed: tuple[Counts, int], cas: str, known: Any, note: str, file_name: str) -> Draft:
        counts, charge = listed
        try:
            mass = molar_mass(dict(counts), self.weights)
        except FormulaError as error:
            raise Refused("no atomic weight", error.problem) from error
        formula = hill(dict(counts)) if counts else ""
        title = self._free_name(name, known, file_name, cas, hill(dict(counts), charge) if charge else formula)
        inchikey = known.InChI_key if known is not None else ""
        draft = Draft(title, counts, charge, cas, inchikey, mass, formula, known=known)
        if note:
            draft.notes.append(note)
        if known is not None:
            draft.vapour = vapour_of(known.smiles)
        draft.mark = mark_of(cas or inchikey or title, formula, charge)
        self._file(draft)
        return draft

    def _free_name(self, name: str, known: Any, file_name: str, cas: str, formula: str) -> str:
        first = ""
        for offered in (name, file_name, known.iupac_name if known is not None else ""):
            text = spoken(offered)
            if not text or is_code(text):
                continue
            if fold(text) not in self._folded:
                return text
            first = first or text
        if not first:
            first = formula
            if fold(first) not in self._folded:
                return first
        for mark in (formula, cas, *(f"{n}" for n in range(2, 99))):
            text = f"{first} [{mark}]"
            if mark and fold(text) not in self._folded:
                return text
        raise Refused("no name", f"every name of {first} is taken")

    # -- the end --------------------------------------------------------------------------------------------------

    def finished(self, used: set[str]) -> list[Species]:
        """All species of the seed, and those that an entry names; synonyms that two would share are left out."""
        kept = [draft for draft in self.drafts.values() if draft.seed is not None or draft.name in used]
        asked = {draft.name: wanted_synonyms(draft.names, draft.known) for draft in kept}
        taken = {fold(text) for d in kept for text in (d.name, *(d.seed.synonyms if d.seed else ()))}
        taken |= {(hill(dict(d.counts), d.charge) if d.charge else d.formula).casefold() for d in kept if d.counts}
        return [draft.species(names) for draft, names in zip(kept, prune(asked, taken), strict=True)]


def _formula_shown(name: str) -> tuple[Counts, int] | None:
    """The formula that stands in brackets behind a name: "rhodium oxide (Rh2O3)"."""
    found = re.search(r" \(([A-Z][A-Za-z0-9()]*\d[A-Za-z0-9()]*)\)$", name)
    return read_formula(found.group(1)) if found else None


def _sorted_key(key: tuple[Counts, int]) -> tuple[Counts, int]:
    return tuple(Formula(dict(key[0]), key[1]).counts.items()), key[1]


def _number(cas: str) -> int:
    return int(cas.replace("-", ""))


def _but_hydrogen(a: tuple[Counts, int] | None, b: tuple[Counts, int]) -> bool:
    """Do two formulas differ by hydrogen only (or by the charge that goes with it)?"""
    if a is None:
        return False
    heavy = [{e: n for e, n in key[0] if e not in _HYDROGEN} for key in (a, b)]
    return heavy[0] == heavy[1] and bool(heavy[0])


_NONMETALS: Final = frozenset("H D C N O F P S Cl Se Br I B Si".split())


def _organic(counts: Counts) -> bool:
    """Carbon with hydrogen or more carbon, and no metal: a formula that isomers may share."""
    elements = dict(counts)
    return (
        elements.keys() <= _NONMETALS
        and "C" in elements
        and (len({"H", "D"} & elements.keys()) > 0 or elements["C"] > 1)
    )


def _has_name(draft: Draft, name: str) -> bool:
    folded = fold(name)
    if not folded:
        return False
    known = draft.known.synonyms if draft.known is not None else ()
    own = draft.seed.synonyms if draft.seed is not None else ()
    return any(fold(text) == folded for text in (draft.name, *draft.names, *own, *known))


_ACID: Final = re.compile(r"C\(=O\)O(?=$|\))|^OC\(=O\)")
_ALCOHOL: Final = re.compile(r"(?<![=\]O+])O(?=$|\))|^O(?=C)|(?<![=#\]])N(?=$|\))|^N(?=C)")


def vapour_of(smiles: str) -> str:
    """Does the vapour associate (carboxylic acids), or its molecules hold together by hydrogen bonds?"""
    if not smiles or "+" in smiles or "-]" in smiles:
        return ""
    if _ACID.search(smiles):
        return "associating"
    return "hydrogen-bonding" if _ALCOHOL.search(smiles) else ""
