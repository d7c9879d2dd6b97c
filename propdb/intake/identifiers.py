"""What the ``chemicals`` package knows of CAS RNs and names, read from its files of identifiers.

The package's own index takes two seconds and 300 MB, because it makes a record for each of 80,000 substances and files
it under each of a million names. Here lines stay text until they are asked for, and only names that will be asked for
are looked for. The answers are the package's: where its files are not as they were, its own index is used.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping
from functools import cache, cached_property
from importlib.util import find_spec
from pathlib import Path
from typing import Any, Final

__all__ = ["Identifiers", "Known", "identifiers"]

#: In the order in which the package reads them: what a later one says of a CAS RN or a name goes before.
_FILES: Final = (
    "chemical identifiers pubchem large.tsv",
    "chemical identifiers pubchem small.tsv",
    "chemical identifiers example user db.tsv",
    "Cation db.tsv",
    "Anion db.tsv",
    "Inorganic db.tsv",
)
_NAMES_FROM: Final = 7  # columns before those of the names: PubChem, CAS, formula, MW, SMILES, InChI, InChIKey


class Known:
    """One substance, with the attributes that the package's records have, too."""

    __slots__ = ("CAS", "InChI_key", "common_name", "formula", "iupac_name", "smiles", "synonyms")

    def __init__(self, cas: int, formula: str, smiles: str, key: str, synonyms: list[str]) -> None:
        self.CAS = cas
        self.formula = formula
        self.smiles = smiles
        self.InChI_key = key
        self.iupac_name, self.common_name = synonyms[:2]
        self.synonyms = synonyms  # with both names

    @property
    def charge(self) -> int:
        """The charge that the formula shows."""
        from chemicals.elements import charge_from_formula

        charge: int = charge_from_formula(self.formula)
        return charge


class Identifiers(Mapping[int, Any]):
    """CAS RN as a number to what is known of it.

    Parameters
    ----------
    folder : Path
        The directory of the files of identifiers.

    Raises
    ------
    ValueError, OSError
        A file is missing, or has another layout.
    """

    def __init__(self, folder: Path) -> None:
        lines: list[str] = []
        for name in _FILES:
            with (folder / name).open(encoding="utf-8") as file:
                lines += file.read().split("\n")
        self._lines = lines
        self._at: dict[int, int] = {}
        self._made: dict[int, Known] = {}
        for at, line in enumerate(lines):
            if line:
                if line.count("\t") <= _NAMES_FROM:
                    raise ValueError("another layout than the one that is read here")
                self._at[int(line.split("\t", 2)[1].replace("-", ""))] = at
        self._elements: dict[str, Known] = {}
        self._add_elements()

    def _known(self, at: int) -> Known:
        """The record of a line; the same one each time."""
        known = self._made.get(at)
        if known is None:
            _, cas, formula, _, smiles, _, key, *names = self._lines[at].split("\t")
            known = self._made[at] = Known(int(cas.replace("-", "")), formula, smiles, key, names)
        return known

    def _add_elements(self) -> None:
        """The elements of the periodic table, each under the names that the files have for its CAS RN."""
        from chemicals.elements import homonuclear_elements_CASs_set, periodic_table

        for element in periodic_table:
            if element.CAS in homonuclear_elements_CASs_set:
                continue
            cas, name = int(element.CAS.replace("-", "")), element.name.lower()
            old = self.get(cas)
            known = Known(cas, element.symbol, element.smiles, element.InChI_key, [name, name])
            known.synonyms = [name] if old is None else old.synonyms
            at = -1 - len(self._elements)  # of no line
            self._at[cas], self._made[at] = at, known
            self._elements.update((text, known) for text in known.synonyms if text == text.lower())

    def __getitem__(self, cas: int) -> Known:
        return self._known(self._at[cas])

    def __iter__(self) -> Iterator[int]:
        return iter(self._at)

    def __len__(self) -> int:
        return len(self._at)

    def by_name(self, names: Collection[str]) -> Mapping[str, Any]:
        """The same by name, in small letters: at hand for ``names``, found for others by a second, long look."""
        return _ByName(self, names)

    def _find(self, wanted: Collection[str] | None) -> dict[str, int]:
        """Name to its line; of all names where none are given."""
        found: dict[str, int] = {}
        among = None if wanted is None else frozenset(wanted)
        for at, line in enumerate(self._lines):
            if not line:
                continue
            names = line.split("\t", _NAMES_FROM)[_NAMES_FROM].lower().split("\t")
            if among is None:
                found.update(dict.fromkeys(names, at))
            elif not among.isdisjoint(names):
                found.update((name, at) for name in names if name in among)
        return found


class _ByName(Mapping[str, Any]):
    def __init__(self, all_of_them: Identifiers, names: Collection[str]) -> None:
        self._from = all_of_them
        self._asked = frozenset(names)
        self._few = all_of_them._find(self._asked)

    @cached_property
    def _all(self) -> dict[str, int]:
        return self._from._find(None)

    def __getitem__(self, name: str) -> Known:
        element = self._from._elements.get(name)
        if element is not None:
            return element
        return self._from._known((self._few if name in self._asked else self._all)[name])

    def __iter__(self) -> Iterator[str]:
        return iter({**self._all, **self._from._elements})

    def __len__(self) -> int:
        return len({**self._all, **self._from._elements})


class _Package(Mapping[int, Any]):
    """The package's own index."""

    def __init__(self) -> None:
        from chemicals.identifiers import pubchem_db

        pubchem_db.finish_loading()
        self._index: Mapping[int, Any] = pubchem_db.CAS_index
        self._names: Mapping[str, Any] = pubchem_db.name_index

    def __getitem__(self, cas: int) -> Any:
        return self._index[cas]

    def __iter__(self) -> Iterator[int]:
        return iter(self._index)

    def __len__(self) -> int:
        return len(self._index)

    def by_name(self, names: Collection[str]) -> Mapping[str, Any]:
        return self._names


@cache
def identifiers() -> Identifiers | _Package:
    """What the installed package knows, read once.

    Raises
    ------
    Exception
        Whatever a damaged package raises.
    """
    spec = find_spec("chemicals")
    if spec is not None and spec.origin is not None:
        try:
            return Identifiers(Path(spec.origin).parent / "Identifiers")
        except (OSError, ValueError, IndexError):
            pass
    return _Package()
