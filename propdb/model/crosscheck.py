"""What another compilation says of an entry."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["Crosscheck"]


@dataclass(frozen=True, slots=True)
class Crosscheck:
    """One comparison of an entry with a compilation of the open library.

    Parameters
    ----------
    compilation : str
        Its key in the policy ``lineage``; that of the entry's source where it is the same publication.
    temperature : float or None
        Where they are compared [K].
    value : float
        What the compilation gives, in the entry's unit.
    difference : float
        The entry less that.
    allowed : float or None
        What the difference may be; None where the compilation is shown only.
    independent : bool
        Neither copies the other, and they share no ancestor.
    package : str
        What the number was read from, with its version.
    """

    compilation: str
    temperature: float | None
    value: float
    difference: float
    allowed: float | None
    independent: bool
    package: str

    @property
    def beyond(self) -> bool:
        """Do they differ by more than they may?"""
        return self.allowed is not None and abs(self.difference) > self.allowed

    def relation(self, source: str) -> str:
        """How the compilation is related to a source: ``independent``, ``same chain``, ``same publication``."""
        if self.compilation == source:
            return "same publication"
        return "independent" if self.independent else "same chain"
