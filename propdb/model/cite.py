"""Citations of a source as text, BibTeX and CSL-JSON. Writers only: no file is touched."""

from __future__ import annotations

import json
from typing import Any, Final

from propdb.errors import InvalidInput
from propdb.model.records import Source

__all__ = ["FORMATS", "bibtex", "cite", "csl", "csl_json", "text"]

FORMATS: Final = ("text", "bibtex", "csl-json")

# BibTeX entry type; CSL type (CSL 1.0.2, appendix III)
_TYPES: Final = {
    "article": ("article", "article-journal"),
    "book": ("book", "book"),
    "report": ("techreport", "report"),
    "standard": ("misc", "standard"),
    "practice": ("misc", "document"),
}
_LATEX: Final = str.maketrans(
    {
        "\\": r"\textbackslash{}", "{": r"\{", "}": r"\}", "&": r"\&", "%": r"\%", "$": r"\$", "#": r"\#", "_": r"\_",
        "~": r"\textasciitilde{}", "^": r"\textasciicircum{}", "–": "--", "—": "---",
    }
)  # fmt: skip
_CSL_FIELDS: Final = {
    "journal": "container-title",
    "volume": "volume",
    "issue": "issue",
    "number": "number",
    "pages": "page",
    "edition": "edition",
    "publisher": "publisher",
    "place": "publisher-place",
    "doi": "DOI",
    "isbn": "ISBN",
    "url": "URL",
}


def cite(source: Source, format: str = "text") -> str:
    """Write the citation of a source.

    Parameters
    ----------
    source
        The bibliographic record.
    format
        One of :data:`FORMATS`.

    Raises
    ------
    InvalidInput
        Another format is asked for.
    """
    if format == "text":
        return text(source)
    if format == "bibtex":
        return bibtex(source)
    if format == "csl-json":
        return csl_json(source)
    raise InvalidInput(f"there is no citation format {format!r}", hint=f"choose one of {', '.join(FORMATS)}")


def text(source: Source) -> str:
    """Write a reference as one line: authors, year, title, where it appeared."""
    fields = source.fields
    authors = "; ".join(source.authors)
    head = f"{authors} ({source.year})" if authors and source.year else authors or str(source.year or "")
    place = ", ".join(part for part in (fields.get("publisher", ""), fields.get("place", "")) if part)
    volume = fields.get("volume", "")
    if volume and fields.get("issue"):
        volume += f"({fields['issue']})"
    journal = " ".join(part for part in (fields.get("journal", ""), volume) if part)
    if journal and fields.get("pages"):
        journal += f", {fields['pages']}"
    edition = fields.get("edition", "")
    parts = [
        head,
        source.title,
        f"{edition} edition" if edition and "ed" not in edition else edition,
        fields.get("number", ""),
        journal,
        place,
        f"doi:{fields['doi']}" if fields.get("doi") else "",
        f"ISBN {fields['isbn']}" if fields.get("isbn") else "",
    ]
    return ". ".join(part.rstrip(".") for part in parts if part) + "."


def bibtex(source: Source) -> str:
    """Write a BibTeX entry under the key of the source; names without a comma are taken for institutions."""
    fields = source.fields
    kind = _TYPES.get(source.kind, _TYPES["practice"])[0]
    publisher = "institution" if kind == "techreport" else "publisher"
    pages = fields.get("pages", "").replace("–", "--")
    rows = {
        "author": " and ".join(_latex(name) if "," in name else f"{{{_latex(name)}}}" for name in source.authors),
        "title": f"{{{_latex(source.title)}}}",
        "year": str(source.year or ""),
        "journal": _latex(fields.get("journal", "")),
        "volume": _latex(fields.get("volume", "")),
        "number": _latex(fields.get("issue", "") or fields.get("number", "")),
        "pages": pages if "--" in pages else pages.replace("-", "--"),
        "edition": _latex(fields.get("edition", "")),
        publisher: _latex(fields.get("publisher", "")),
        "address": _latex(fields.get("place", "")),
        "doi": fields.get("doi", ""),
        "isbn": fields.get("isbn", ""),
        "url": fields.get("url", ""),
    }
    body = "".join(f"  {key} = {{{value}}},\n" for key, value in rows.items() if value)
    return f"@{kind}{{{source.key},\n{body}}}"


def csl_json(source: Source) -> str:
    """Write a CSL-JSON bibliography of one item."""
    return json.dumps([csl(source)], indent=2, ensure_ascii=False)


def csl(source: Source) -> dict[str, Any]:
    """Return a CSL-JSON item (CSL 1.0.2)."""
    item: dict[str, Any] = {
        "id": source.key,
        "type": _TYPES.get(source.kind, _TYPES["practice"])[1],
        "title": source.title,
    }
    if source.authors:
        item["author"] = [_name(name) for name in source.authors]
    if source.year:
        item["issued"] = {"date-parts": [[source.year]]}
    item.update((_CSL_FIELDS[key], value) for key, value in source.fields.items() if value and key in _CSL_FIELDS)
    return item


def _name(name: str) -> dict[str, str]:
    family, comma, given = name.partition(",")
    return {"family": family.strip(), "given": given.strip()} if comma else {"literal": name}


def _latex(words: str) -> str:
    return words.translate(_LATEX)
