"""The formula of a compound from its systematic name, where the name says it without doubt.

The package's identifiers do not know every CAS RN of its files, and most of those files give no formula. The names they
do give are mostly members of homologous series ("cis-1-fluoro-1-eicosene", "methyl nonadecyl sulfide"). Atoms are
counted by substitutive nomenclature (IUPAC, Nomenclature of Organic Chemistry): each substituent takes the place of one
hydrogen atom of its parent. Where a stem could be read in two ways that give two formulas, there is no answer; a name
with anything unknown in it has none either. Locants and stereodescriptors do not change a formula and are left out.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from functools import lru_cache
from typing import Any, Final

__all__ = ["formula_of_name"]

_Atoms = tuple[tuple[str, int], ...]  # sorted (element, count); counts may be negative while a name is read

_STEMS: Final = dict(zip("meth eth prop but pent hex hept oct non dec".split(), range(1, 11), strict=True))
_UNITS: Final = {
    "hen": 1,
    "un": 1,
    "do": 2,
    "tri": 3,
    "tetra": 4,
    "penta": 5,
    "hexa": 6,
    "hepta": 7,
    "octa": 8,
    "nona": 9,
}
_TENS: Final = {"triacont": 30, "tetracont": 40, "pentacont": 50, "hexacont": 60, "heptacont": 70, "octacont": 80}
_TENS_MORE: Final = {"nonacont": 90, "hect": 100}
_MULTIPLES: Final = {
    "di": 2,
    "bis": 2,
    "tri": 3,
    "tris": 3,
    "tetra": 4,
    "tetrakis": 4,
    "penta": 5,
    "hexa": 6,
    "hepta": 7,
    "octa": 8,
    "nona": 9,
    "deca": 10,
    "undeca": 11,
    "dodeca": 12,
    "trideca": 13,
    "tetradeca": 14,
    "pentadeca": 15,
    "hexadeca": 16,
    "heptadeca": 17,
    "octadeca": 18,
}


def _chains() -> dict[str, int]:
    chains = dict(_STEMS)
    chains |= {f"{unit}dec": 10 + n for unit, n in _UNITS.items()}
    chains |= {"eicos": 20, "icos": 20, "heneicos": 21, "henicos": 21, "docos": 22}
    chains |= {f"{unit}cos": 20 + n for unit, n in _UNITS.items() if n > 2}
    for tens, size in (_TENS | _TENS_MORE).items():
        chains[tens] = size
        chains |= {f"{unit}{tens}": size + n for unit, n in _UNITS.items()}
    return chains


CHAINS: Final = _chains()
_LONG: Final = tuple(stem for stem, n in CHAINS.items() if n >= 10)


def _atoms(text: str) -> _Atoms:
    found = re.findall(r"([A-Z][a-z]?)(-?\d*)", text)
    return _tidy({element: int(count or 1) for element, count in found})


def _tidy(counts: dict[str, int]) -> _Atoms:
    return tuple(sorted((element, n) for element, n in counts.items() if n))


def _plus(a: _Atoms, b: _Atoms, times: int = 1) -> _Atoms:
    counts = dict(a)
    for element, n in b:
        counts[element] = counts.get(element, 0) + n * times
    return _tidy(counts)


_H: Final = _atoms("H")

#: Groups with one free valence, as they stand; in place of a hydrogen atom each adds itself less H.
_GROUPS: Final = {
    name: _atoms(text)
    for name, text in {
        "fluoro": "F",
        "chloro": "Cl",
        "bromo": "Br",
        "iodo": "I",
        "nitro": "NO2",
        "nitroso": "NO",
        "amino": "NH2",
        "cyano": "CN",
        "hydroxy": "OH",
        "mercapto": "SH",
        "methoxy": "CH3O",
        "ethoxy": "C2H5O",
        "propoxy": "C3H7O",
        "butoxy": "C4H9O",
        "phenoxy": "C6H5O",
        "phenyl": "C6H5",
        "benzyl": "C7H7",
        "phenylmethyl": "C7H7",
        "naphthyl": "C10H7",
        "tolyl": "C7H7",
        "allyl": "C3H5",
        "vinyl": "C2H3",
        "acetyl": "C2H3O",
        "benzoyl": "C7H5O",
        "neopentyl": "C5H11",
    }.items()
}
#: Parents whose name is not made of a chain.
_PARENTS: Final = {
    name: _atoms(text)
    for name, text in {
        "benzene": "C6H6",
        "toluene": "C7H8",
        "naphthalene": "C10H8",
        "anthracene": "C14H10",
        "phenanthrene": "C14H10",
        "biphenyl": "C12H10",
        "indene": "C9H8",
        "indane": "C9H10",
        "azulene": "C10H8",
        "styrene": "C8H8",
        "pyridine": "C5H5N",
        "pyrrole": "C4H5N",
        "pyrazole": "C3H4N2",
        "imidazole": "C3H4N2",
        "benzimidazole": "C7H6N2",
        "quinoline": "C9H7N",
        "thiophene": "C4H4S",
        "furan": "C4H4O",
        "phenol": "C6H6O",
        "aniline": "C6H7N",
        "anisole": "C7H8O",
        "adamantane": "C10H16",
        "hydrazine": "H4N2",
        "urea": "CH4N2O",
        "piperidine": "C5H11N",
        "pyrrolidine": "C4H9N",
        "oxirane": "C2H4O",
        "oxetane": "C3H6O",
        "thiirane": "C2H4S",
        "aziridine": "C2H5N",
        "silane": "H4Si",
        "amine": "H3N",
        "benzaldehyde": "C7H6O",
        "acetamide": "C2H5NO",
        "formamide": "CH3NO",
        "benzamide": "C7H7NO",
        "benzonitrile": "C7H5N",
    }.items()
}
#: What an ending does to the saturated chain CnH2n+2; each ending may follow "di" or "tri".
_ENDINGS: Final = {
    name: _atoms(text)
    for name, text in {
        "ol": "O",
        "thiol": "S",
        "al": "H-2O",
        "one": "H-2O",
        "amine": "HN",
        "nitrile": "H-3N",
        "oicacid": "H-2O2",
        "amide": "H-1NO",
    }.items()
}
_ACIDS: Final = {
    "formate": "CH2O2",
    "acetate": "C2H4O2",
    "propionate": "C3H6O2",
    "isobutyrate": "C4H8O2",
    "isovalerate": "C5H10O2",
    "pivalate": "C5H10O2",
    "butyrate": "C4H8O2",
    "valerate": "C5H10O2",
    "benzoate": "C7H6O2",
    "acrylate": "C3H4O2",
    "methacrylate": "C4H6O2",
    "caproate": "C6H12O2",
    "laurate": "C12H24O2",
    "stearate": "C18H36O2",
    "palmitate": "C16H32O2",
    "oleate": "C18H34O2",
}
_DIACIDS: Final = {
    "oxalate": "C2H2O4",
    "malonate": "C3H4O4",
    "succinate": "C4H6O4",
    "glutarate": "C5H8O4",
    "adipate": "C6H10O4",
    "phthalate": "C8H6O4",
    "maleate": "C4H4O4",
    "fumarate": "C4H4O4",
    "sebacate": "C10H18O4",
}
_LINKS: Final = {
    "ether": _atoms("O"),
    "sulfide": _atoms("S"),
    "disulfide": _atoms("S2"),
    "sulfone": _atoms("SO2"),
    "sulfoxide": _atoms("SO"),
    "ketone": _atoms("CO"),
}

#: Replacement nomenclature: an atom of the chain, with its hydrogen, becomes another.
_REPLACEMENTS: Final = {"oxa": _atoms("OC-1H-2"), "thia": _atoms("SC-1H-2"), "aza": _atoms("NC-1H-1")}


def _by_start(table: dict[str, Any]) -> dict[str, list[tuple[str, Any]]]:
    """The table by the first two letters of its keys: most words begin with none of them."""
    found: dict[str, list[tuple[str, Any]]] = {}
    for key, value in table.items():
        found.setdefault(key[:2], []).append((key, value))
    return found


_CHAINS_BY: Final = _by_start(CHAINS)
_GROUPS_BY: Final = _by_start(_GROUPS)
_MULTIPLES_BY: Final = _by_start(_MULTIPLES)

_STEREO: Final = re.compile(
    r"\((?:[0-9]*(?:rs|sr|[rsez*])|[+\-±]|d|l|dl)(?:,(?:[0-9]*(?:rs|sr|[rsez*])|[+\-±]))*\)-?"
    r"|(?<![a-z])(?:cis|trans|[ezrs]|d|l|dl|n|t|sec|s|tert|meso|erythro|threo|endo|exo|syn|anti|o|m|p|alpha|beta|gamma)"
    r"(?=[-, )])",
)
_UNREAD: Final = re.compile(r"radical|ion\b|\bsalt|hydrate|\bd\d|-d\d|polymer|[^a-z0-9 (),'’±+\-]")
_OIC_ACID: Final = re.compile(r"(?<=[a-z])oic acid(?=$| )")
_DEUTERIUM: Final = re.compile(r"-(?:\d+(?:,\d+)*-)?d(\d*)$")
_LOCANTS: Final = re.compile(r"(?<![a-z])[nosp]['’]*(?=[-,])|\d+[a-z]?['’]*(?![a-z])|\d+(?=h-)|['’\-,±+]")


def formula_of_name(name: str) -> dict[str, int] | None:
    """Atoms of a compound by its systematic name, or None where the name does not say it without doubt.

    Parameters
    ----------
    name : str
        In English, of a neutral compound. "N-methylbutan-1-amine", "methyl decyl ether", "(Z)-9-tridecenyl acetate".
    """
    text = " ".join(name.casefold().split()).replace("[", "(").replace("]", ")").removesuffix(" radical")
    labelled = _DEUTERIUM.search(text)
    if labelled:
        text = text[: labelled.start()]
    if _UNREAD.search(text):
        return None
    text = _LOCANTS.sub("", _STEREO.sub("", text)).strip()
    text = _OIC_ACID.sub("oicacid", text)
    found = set(_whole(text))
    if len(found) != 1:
        return None
    atoms = dict(found.pop())
    if labelled:
        heavy = int(labelled.group(1) or 1)
        atoms |= {"H": atoms.get("H", 0) - heavy, "D": heavy}
        if not atoms["H"]:
            del atoms["H"]
    return atoms if atoms and all(n > 0 for n in atoms.values()) else None


def _whole(text: str) -> Iterator[_Atoms]:
    words = text.split()
    if not words:
        return
    if len(words) == 1:
        yield from _compound(words[0])
        if text.endswith("yl"):
            yield from _radical(text)
        return
    *groups, last = words
    if last in _LINKS:
        link = _LINKS[last]
        if len(groups) == 2:
            yield from (_plus(_plus(a, b), link) for a in _radical(groups[0]) for b in _radical(groups[1]))
        elif len(groups) == 1 and groups[0].startswith("di"):
            yield from (_plus(_plus(a, a), link) for a in _radical(groups[0][2:]))
        return
    if last == "ester" and len(groups) == 2 and groups[0].endswith("oicacid"):
        for acid in _compound(groups[0]):
            yield from (_plus(_plus(acid, _H, -1), a) for a in _radical(groups[1]))
        return
    if len(groups) == 1:
        for acid in _acid(last):
            yield from (_plus(_plus(acid, _H, -1), a) for a in _radical(groups[0]))
        if last in _DIACIDS and groups[0].startswith("di"):
            acid = _atoms(_DIACIDS[last])
            yield from (_plus(_plus(acid, _H, -2), a, 2) for a in _radical(groups[0][2:]))
    # "1 methyl 2 propyl ...": blanks in place of hyphens
    yield from _compound("".join(words))


def _acid(text: str) -> Iterator[_Atoms]:
    """The acid of an ester's last word."""
    if text in _ACIDS:
        yield _atoms(_ACIDS[text])
    if text.endswith("oate"):
        yield from _compound(f"{text[:-4]}oicacid")


def _radical(text: str) -> Iterator[_Atoms]:
    """A group with one free valence, with its own substituents: "2,2-difluoroethyl"."""
    for atoms, rest in _substituted(text):
        yield from (_plus(atoms, group) for group, left in _group(rest) if not left)


def _compound(text: str) -> Iterator[_Atoms]:
    for atoms, rest in _substituted(text):
        yield from (_plus(atoms, parent) for parent in _parent(rest))


@lru_cache(maxsize=4096)
def _substituted(text: str) -> tuple[tuple[_Atoms, str], ...]:
    """Every way to read substituents off the front: (what they add to the parent, the rest)."""
    ways: list[tuple[_Atoms, str]] = [((), text)]
    for times, rest in _multiple(text):
        for group, left in _group(rest):
            if not left:
                continue
            added = _plus((), _plus(group, _H, -1), times)
            ways += [(_plus(added, more), last) for more, last in _substituted(left)]
        for word, change in _REPLACEMENTS.items():
            if rest.startswith(word):
                added = _plus((), change, times)
                ways += [(_plus(added, more), last) for more, last in _substituted(rest[len(word) :])]
    return tuple(dict.fromkeys(ways))


def _multiple(text: str) -> Iterator[tuple[int, str]]:
    yield 1, text
    for word, times in _MULTIPLES_BY.get(text[:2], ()):
        rest = text[len(word) :]
        # "tetradecyl" and "hexatriacontyl" are chains; of ten groups one would say tetrakis(decyl)
        if text.startswith(word) and not (times > 2 and rest.startswith(_LONG)):
            yield times, rest


def _group(text: str) -> Iterator[tuple[_Atoms, str]]:
    """A group off the front, and the rest."""
    if text.startswith("("):
        depth = 0
        for at, char in enumerate(text):
            depth += (char == "(") - (char == ")")
            if depth == 0:
                inside, rest = text[1:at], text[at + 1 :]
                yield from ((atoms, rest) for atoms in _radical(inside))
                return
        return
    for name, atoms in _GROUPS_BY.get(text[:2], ()):
        if text.startswith(name):
            yield atoms, text[len(name) :]
    start = text.removeprefix("iso")
    cyclic = start.startswith("cyclo")
    body = start[5:] if cyclic else start
    for stem, n in _CHAINS_BY.get(body[:2], ()):
        if not body.startswith(stem):
            continue
        left = body[len(stem) :]
        for ending, missing in (("yl", 0), ("enyl", 2), ("en", 2), ("ynyl", 4), ("adienyl", 4), ("yloxy", 0)):
            if ending != "en" and left.startswith(ending):
                hydrogen = 2 * n + 1 - missing - 2 * cyclic
                atoms = _tidy({"C": n, "H": hydrogen, "O": int(ending == "yloxy")})
                yield atoms, left[len(ending) :]
        if left.startswith("oxy") and n < 5:
            yield _tidy({"C": n, "H": 2 * n + 1 - 2 * cyclic, "O": 1}), left[3:]


def _parent(text: str) -> Iterator[_Atoms]:
    if text in _PARENTS:
        yield _PARENTS[text]
    for name in ("hydrazine", "amine", "urea"):  # "decylamine": groups in place of H; the groups were read already
        if text == name:
            return
    cyclic = text.startswith("cyclo")
    body = text[5:] if cyclic else text
    for stem, n in _CHAINS_BY.get(body[:2], ()):
        if not body.startswith(stem):
            continue
        chain = _tidy({"C": n, "H": 2 * n + 2 - 2 * cyclic})
        for bonds, rest in _bonds(body[len(stem) :]):
            yield from (_plus(_plus(chain, bonds), suffix) for suffix in _suffix(rest))


def _bonds(text: str) -> Iterator[tuple[_Atoms, str]]:
    """Double and triple bonds: what they take away, and what follows; "ane", "an", "ene", "adien", "yne" ..."""
    for ending, hydrogen in (
        ("an", 0),
        ("en", 2),
        ("yn", 4),
        ("adien", 4),
        ("atrien", 6),
        ("adiyn", 8),
        ("enyn", 6),
    ):
        if text.startswith(ending):
            rest = text[len(ending) :]
            atoms = _tidy({"H": -hydrogen})
            if rest == "e":
                yield atoms, ""
            elif rest:
                yield atoms, rest
                if rest.startswith("e"):
                    yield atoms, rest[1:]


def _suffix(text: str) -> Iterator[_Atoms]:
    if not text:
        yield ()
    for ending, atoms in _ENDINGS.items():
        if text == ending:
            yield atoms
    for word, times in (("di", 2), ("tri", 3)):
        for ending in ("ol", "one", "thiol", "amine", "al", "nitrile", "oicacid"):
            if text == word + ending:
                yield _plus((), _ENDINGS[ending], times)
