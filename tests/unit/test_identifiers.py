"""The files of identifiers of the ``chemicals`` package, read by us, say what its own index says."""

from __future__ import annotations

from pathlib import Path

import pytest

from propdb.intake.identifiers import Identifiers, _Package, identifiers
from propdb.intake.species import contradiction

FIELDS = ("CAS", "formula", "smiles", "InChI_key", "iupac_name", "common_name", "synonyms", "charge")


def test_every_substance_and_name_as_the_package_has_them() -> None:
    ours, theirs = identifiers(), _Package()
    assert isinstance(ours, Identifiers)  # the files are as they were when this was written
    assert ours.keys() == theirs.keys()
    for cas in theirs:
        mine, known = ours[cas], theirs[cas]
        assert [getattr(mine, name) for name in FIELDS[:-1]] == [getattr(known, name) for name in FIELDS[:-1]]
    for cas in list(theirs)[::50]:
        assert ours[cas].charge == theirs[cas].charge
    by_name = {name: known for name, known in theirs.by_name(()).items() if name == name.lower()}
    asked = sorted(by_name)[::7]
    few = ours.by_name({*asked, "no such substance"})
    for name in asked:
        assert few[name].CAS == by_name[name].CAS
        # The same record by both ways, or by both ways another: the registry asks which.
        assert (few[name] is ours[few[name].CAS]) == (by_name[name] is theirs[by_name[name].CAS])
    assert few.get("no such substance") is None
    # A name that was not announced is found all the same.
    assert {name: known.CAS for name, known in ours.by_name(()).items()} == {n: k.CAS for n, k in by_name.items()}


def test_elements_have_their_symbol_and_the_names_of_the_files() -> None:
    iron = identifiers()[7439896]
    assert (iron.formula, iron.common_name) == ("Fe", "iron")
    assert identifiers().by_name({"iron"})["iron"] is iron


def test_another_layout_is_told(tmp_path: Path) -> None:
    with pytest.raises(OSError, match="chemical identifiers"):
        Identifiers(tmp_path)
    for name in ("large", "small"):
        (tmp_path / f"chemical identifiers pubchem {name}.tsv").write_text("962\t7732-18-5\tH2O\n", encoding="utf-8")
    for name in ("chemical identifiers example user db", "Cation db", "Anion db", "Inorganic db"):
        (tmp_path / f"{name}.tsv").write_text("", encoding="utf-8")
    with pytest.raises(ValueError, match="layout"):
        Identifiers(tmp_path)


def test_a_formula_that_is_another_substance() -> None:
    assert contradiction("7732-18-5", {"H": 2, "O": 1}, 0) == ""
    assert "listed for H2O" in contradiction("7732-18-5", {"C": 1, "O": 1}, 0)
