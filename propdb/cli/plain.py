"""Characters for a terminal or a file that cannot hold all of them."""

from __future__ import annotations

import codecs
import unicodedata

_LIKE = {
    "−": "-", "–": "-", "—": "-", "→": "->", "←": "<-", "⇌": "<=>", "±": "+/-", "·": "*", "⋅": "*", "×": "x",
    "≤": "<=", "≥": ">=", "≈": "~", "°": "deg ", "Δ": "d", "∑": "sum", "Σ": "sum", "∫": "int", "ν": "nu", "α": "alpha",
    "σ": "sat", "…": "...", "‘": "'", "’": "'", "“": '"', "”": '"', "\u00a0": " ", "\u2009": " ", "\u202f": " ",
}  # fmt: skip


def like(character: str) -> str:
    """Something in ASCII that reads like a character; ``?`` if there is nothing."""
    if character in _LIKE:
        return _LIKE[character]
    plain = unicodedata.normalize("NFKD", character).encode("ascii", "ignore").decode("ascii")
    return plain or "?"


def _replace(error: UnicodeError) -> tuple[str | bytes, int]:
    if not isinstance(error, UnicodeEncodeError):
        raise error
    return "".join(like(character) for character in error.object[error.start : error.end]), error.end


def use_plain_characters(stream: object) -> None:
    """Make a text stream replace what its encoding lacks by something alike."""
    codecs.register_error("propdb-plain", _replace)
    reconfigure = getattr(stream, "reconfigure", None)
    if reconfigure is not None:
        reconfigure(errors="propdb-plain")
