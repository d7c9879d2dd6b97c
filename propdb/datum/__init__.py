"""Datums: conventions that say which state has which enthalpy. Data, a parser, exact stoichiometry; no evaluation.

* :func:`parse_datums`, :func:`dump_toml`: a datums file, read and written; :func:`datum_body`, :func:`read_body`: the
  same as plain values, for a store
* :func:`parse_inline`: ``own:l@65C``
* :func:`resolve`: a name or an inline text
* :func:`zero`: what a datum calls zero for one species
* :func:`may_sum`: whether values on it may be summed
"""

from __future__ import annotations

from propdb.datum.inline import parse_inline
from propdb.datum.names import resolve
from propdb.datum.reading import parse_datums, read_body
from propdb.datum.stoichiometry import Composition, check_independent, solve
from propdb.datum.summing import may_sum, same_meaning
from propdb.datum.writing import datum_body, dump_toml
from propdb.datum.zeros import ELECTRON, PROTON, zero

__all__ = [
    "ELECTRON",
    "PROTON",
    "Composition",
    "check_independent",
    "datum_body",
    "dump_toml",
    "may_sum",
    "parse_datums",
    "parse_inline",
    "read_body",
    "resolve",
    "same_meaning",
    "solve",
    "zero",
]
