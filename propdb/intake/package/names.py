"""Names: those that were misread, synonyms worth typing, and those that two species would share."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from typing import Any, Final

from propdb.store.rows import fold

__all__ = ["decoded", "is_code", "prune", "spoken", "wanted_synonyms"]

#: Brackets and Greek letters that were read as characters of another alphabet in one of the files.
_MISREAD: Final = str.maketrans(
    {"关": "[", "兴": "]", "共": "(", "兲": ")", "⫹": "+", "␣": "α", "␤": "β", "⬘": "'", "\u2429": "η"}
)
_CAPITALS: Final = re.compile(r"[A-Z][a-z]{2,}(?:,? [A-Z][a-z]{2,})*")
_LONGEST: Final = 60  # characters of a synonym: longer ones nobody types
_MOST: Final = 5
#: Registry numbers and catalogue codes are no names.
_CODE: Final = re.compile(
    r"[\d\W]+|.*-|agn-.*|[a-z]{1,3}\d{2,}|\d[a-z]{2}|[a-z]+\d+[a-z]+\d{3,}|\d{2,10}-\d\d-\d.*"
    r"|[a-z]{2,12}[-_ :]?\d{3,}[\w/ -]*|[a-z]{14}-[a-z]{10}-[a-z]"
    r"|(?:unii|einecs|nsc|hsdb|ccris|brn|caswell|epa|schembl|chembl|chebi|mfcd|ai3|un|wln|smr|cid)\b.*"
    r"|.*(?:\bcas\b|registry|inchi|\[(?:iso|ansi|bsi|hsdb|un\d|mi|inn|usan|who)).*",
    re.IGNORECASE,
)


def decoded(name: str) -> str:
    """A name as its file has it, without the blanks around it and with misread brackets put right."""
    if name.isascii() and name.isprintable():  # nearly all
        return " ".join(name.split()) if "  " in name else name.strip()
    plain = " ".join(name.translate(_MISREAD).split())
    return "".join(char for char in plain if char.isprintable())


def spoken(name: str) -> str:
    """A name as it stands in running text: small first letter where no other capital follows."""
    plain = decoded(name)
    if _CAPITALS.fullmatch(plain):
        return plain.lower()
    rest = plain[1:]
    return plain[:1].lower() + rest if rest and rest == rest.lower() and not rest.isdigit() else plain


def is_code(text: str) -> bool:
    """Is this a registry number or a catalogue code, and no name?"""
    return _CODE.fullmatch(text.strip()) is not None


def wanted_synonyms(file_names: Sequence[str], known: Any) -> list[str]:
    """Names worth typing, best first: those of the files, the systematic one, then short ones."""
    offered = list(file_names)
    if known is not None:
        offered.append(known.common_name)
        if known.iupac_name:
            offered.append(known.iupac_name)
        offered += sorted((text for text in known.synonyms[2:60] if 3 <= len(text) <= 40), key=len)
    chosen: dict[str, str] = {}
    for text in offered:
        plain = decoded(text)
        folded = plain.casefold()
        if 3 <= len(plain) <= _LONGEST and folded not in chosen and (plain.isalpha() or not _CODE.fullmatch(plain)):
            chosen[folded] = plain
            if len(chosen) == _MOST:
                break
    return list(chosen.values())


def prune(asked: Mapping[str, Sequence[str]], taken: Iterable[str]) -> list[list[str]]:
    """Synonyms of each species, without those that another has as a name, formula or synonym."""
    used = set(taken)
    folded = {name: [fold(text) for text in texts] for name, texts in asked.items()}
    shared = Counter(text for texts in folded.values() for text in set(texts))
    kept = []
    for name, texts in asked.items():
        kept.append(
            [
                text
                for text, plain in zip(texts, folded[name], strict=True)
                if plain and shared[plain] == 1 and plain not in used
            ]
        )
    return kept
