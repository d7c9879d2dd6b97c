"""A small seed on disk, for the tests of its readers."""

from __future__ import annotations

from pathlib import Path

import pytest

from propdb.errors import SeedError
from propdb.intake.seeds import load_seed

HEADERS = {
    "species.csv": "name,formula,charge,cas,inchikey,synonyms,note",
    "entries.csv": (
        "species,quantity,phase,form,to,temperature,value,unit,uncertainty,uncertainty_kind,datum,conditions,locator,note"
    ),
    "curves.csv": (
        "species,phase,form,equation,tmin,tmax,unit,exponents,scales,coefficients,uncertainty,uncertainty_kind,conditions,"
        "locator,note"
    ),
    "nasa9.csv": "species,phase,form,tmin,tmax,a1,a2,a3,a4,a5,a6,a7,b1,b2,hf298,dh0,locator,note",
    "nasa7.csv": "species,phase,form,tmin,tmax,a1,a2,a3,a4,a5,a6,a7,hf298,dh0,locator,note",
}
SOURCE = """\
key = "book-1990"
title = "A book of invented numbers"
authors = ["Nobody, A."]
year = 1990
kind = "book"
class = "handbook"
terms = "Invented for this test."
carrier = "invented"
standard_pressure = 100000
"""
DATUMS = """\
[elements]
H.forms = [{ species = "hydrogen", phase = "g" }]
O.forms = [{ species = "oxygen", phase = "g" }]
[datum.elements-298K]
kind = "elements"
sentence = "Elements at 298.15 K."
source = "book-1990"
temperature = "298.15K"
"""
RANKS = 'class_order = ["handbook"]\n'
ELEMENTS = "symbol,name,atomic_number,atomic_weight,note\nH,hydrogen,1,1.008,\nO,oxygen,8,15.999,\nC,carbon,6,12.011,\n"
SPECIES = ["hydrogen,H2,0,1333-74-0,,,", "oxygen,O2,0,7782-44-7,,,", "water,H2O,0,7732-18-5,,steam,"]


class Seed:
    """A small seed on disk; the folder is ``book-1990``."""

    def __init__(self, root: Path) -> None:
        self.root = root
        self.folder = root / "book-1990"
        self.folder.mkdir()
        for name, text in {"datums.toml": DATUMS, "ranks.toml": RANKS, "elements.csv": ELEMENTS}.items():
            self.write(name, text)
        self.write("book-1990/source.toml", SOURCE)
        self.rows("species.csv", *SPECIES)

    def write(self, name: str, text: str) -> None:
        (self.root / name).write_bytes(text.encode())

    def rows(self, name: str, *rows: str) -> None:
        self.write(f"book-1990/{name}", "\n".join((HEADERS[name], *rows)) + "\n")

    def refuse(self, problem: str, where: str) -> SeedError:
        with pytest.raises(SeedError, match=problem) as error:
            load_seed(self.root)
        assert error.value.where.startswith(where), str(error.value)
        assert "\n" not in str(error.value)
        return error.value
