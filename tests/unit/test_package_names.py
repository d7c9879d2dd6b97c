"""Formulas by systematic names, and which species a row is about."""

from __future__ import annotations

from types import SimpleNamespace
from typing import Any

import pytest

from propdb.intake.package.names import decoded, is_code, prune, spoken, wanted_synonyms
from propdb.intake.package.registry import Refused, Registry, read_formula, vapour_of
from propdb.intake.package.systematic import formula_of_name
from propdb.model.formula import hill
from propdb.model.records import Species

WEIGHTS = {"H": 1.008, "C": 12.011, "O": 15.999, "N": 14.007, "S": 32.06, "Cl": 35.45, "Fe": 55.845, "V": 50.942}


@pytest.mark.parametrize(
    ("name", "formula"),
    [
        ("eicosane", "C20H42"),
        ("2,2,4-trimethylpentane", "C8H18"),
        ("cis-1-fluoro-1-eicosene", "C20H39F"),
        ("1,1-diiodotetradecane", "C14H28I2"),
        ("methyltetratriacontylamine", "C35H73N"),
        ("tetradecylcyclohexane", "C20H40"),
        ("(Z) 9-tridecenyl acetate", "C15H28O2"),
        ("2-Heptadecanethiol", "C17H36S"),
        ("methyl nonadecyl sulfide", "C20H42S"),
        ("4-Thianonadecane", "C18H38S"),
        ("diisopropyl glutarate", "C11H20O4"),
        ("2-methylpropanoic acid, 1,1,2-trimethylpropyl ester", "C10H20O2"),
        ("(3RS),4,(5RS)-Trimethylheptane", "C10H22"),
        ("1,1,1,2,4,4-hexafluoro-2-(trifluoromethoxy)butane", "C5H3F9O"),
        ("2-Fluoroethyl radical", "C2H4F"),
        ("Pyridine-3,5-d2", "C5D2H3N"),
        ("3-hydroxycoumarin", ""),  # not a name that it knows
        ("potassium hexanoate", ""),
        ("", ""),
    ],
)
def test_a_systematic_name(name: str, formula: str) -> None:
    found = formula_of_name(name)
    assert (hill(found) if found else "") == (hill(dict(read_formula(formula)[0])) if formula else "")  # type: ignore[index]


def test_names_agree_with_the_identifiers_of_the_package() -> None:
    """On every seventh species that the package knows, the reader is right or silent: one in a thousand may differ.

    The identifiers themselves are wrong about some: what is counted is how often the two differ.
    """
    from chemicals.identifiers import pubchem_db

    pubchem_db.finish_loading()
    said = differ = 0
    for known in list(pubchem_db.CAS_index.values())[::7]:
        read, counts = read_formula(known.formula), formula_of_name(known.common_name)
        if counts is None or read is None or read[1]:
            continue
        said += 1
        differ += dict(read[0]) != counts
    assert said > 500
    assert differ <= 0.02 * said


def _known(name: str, formula: str, key: str = "", smiles: str = "") -> Any:
    return SimpleNamespace(
        common_name=name, iupac_name=name, formula=formula, InChI_key=key, smiles=smiles, synonyms=[name, name]
    )


IDENTIFIERS = {
    64175: _known("ethanol", "C2H6O", "LFQSCWFLJHTTHZ-UHFFFAOYSA-N", "CCO"),
    115106: _known("dimethyl ether", "C2H6O", "LCGLNKUTAGEVQW-UHFFFAOYSA-N", "COC"),
    7439896: _known("iron", "Fe", "XEEYBQQBJWHFJM-UHFFFAOYSA-N"),
    7783064: _known("hydrogen sulfide", "H2S", "RWSOTUBLDIXVET-UHFFFAOYSA-N"),
    2025561: _known("ethane", "C2H6", "OTMSDBZUPAUEDD-UHFFFAOYSA-N", "CC"),  # a radical, completed with hydrogen
    72184: _known("l-valine", "C5H11NO2", "KZSNJWFQEVHDMF-BYPYZUCNSA-N"),
}
BY_NAME = {known.common_name: known for known in IDENTIFIERS.values()}


def _registry(*seed: Species) -> Registry:
    return Registry(seed, weights=WEIGHTS, identifiers=IDENTIFIERS, by_name=BY_NAME, aliases={}, formulas={})


def test_a_species_of_the_seed_keeps_its_name() -> None:
    ethanol = Species("spirit", "C2H6O", 0, (("C", 2), ("H", 6), ("O", 1)), 0.046069, cas="64-17-5")
    registry = _registry(ethanol)
    draft, form, moved = registry.place("64-17-5 ", "Ethanol")
    assert (draft.name, form, moved) == ("spirit", "", False)
    (species,) = registry.finished({"spirit"})
    assert species.inchikey == "LFQSCWFLJHTTHZ-UHFFFAOYSA-N"
    assert species.synonyms == ("Ethanol",)


def test_a_radical_is_not_completed() -> None:
    draft, _, _ = _registry().place("2025-56-1", "Ethyl", "CH3CH2 (g)")
    assert (dict(draft.counts), draft.inchikey) == ({"C": 2, "H": 5}, "")


def test_an_ion_keeps_its_charge() -> None:
    registry = _registry(Species("nitrosyl ion", "NO", 1, (("N", 1), ("O", 1)), 0.030006))
    oxide, _, _ = registry.place("14967-78-3", "Oxonitrate anion", "[NO]- (g)")
    assert oxide.charge == -1
    cation, _, moved = registry.place("14967-78-3", "Nitrogen Oxide, Ion", "NO+")
    assert (cation.name, moved) == ("nitrosyl ion", True)


def test_a_formula_that_contradicts_its_cas_rn() -> None:
    registry = _registry()
    sulfide, _, _ = registry.place("7783-06-4", "hydrogen sulfide")
    assert registry.place("7439-89-6", "H2S", "H2S")[:1] == (sulfide,)
    registry.place("64-17-5", "ethanol")
    registry.place("115-10-6", "dimethyl ether")
    with pytest.raises(Refused, match="contradicts CAS RN 7439-89-6, which is listed for Fe"):
        registry.place("7439-89-6", "something", "C2H6O")


def test_an_organic_formula_alone_moves_no_row() -> None:
    registry = _registry()
    registry.place("64-17-5", "ethanol")
    with pytest.raises(Refused, match="one species has the formula of the row but not its name"):
        registry.place("7439-89-6", "methoxymethane", "C2H6O")


def test_elements_under_amino_acids_go_by_their_formula() -> None:
    registry = _registry()
    iron, _, _ = registry.place("7439-89-6", "iron")
    assert registry.place_by_formula("72-18-4", "Fe", "Fe") == (iron, "", True)
    assert registry.place_by_formula("", "Fe", "Fe") == (iron, "", False)


def test_what_cannot_be_placed() -> None:
    registry = _registry()
    for cas, name, formula, kind in (
        ("99-99-9", "nobody knows", "", "no formula known"),
        ("None", "Pentaethoxyuranium", "", "no formula known"),
        ("", "", "Xx2", "formula not readable"),
    ):
        with pytest.raises(Refused) as refused:
            registry.place(cas, name, formula)
        assert refused.value.kind == kind


def test_two_species_never_share_a_name_or_a_synonym() -> None:
    registry = _registry()
    one, _, _ = registry.place("", "vanadium oxide", "VO")
    two, _, _ = registry.place("", "vanadium oxide", "VO2")
    assert (one.name, two.name) == ("vanadium oxide", "vanadium oxide [O2V]")
    assert prune({"a": ["spirit", "wine"], "b": ["Spirit", "beer"]}, {"beer"}) == [["wine"], []]


def test_names() -> None:
    assert decoded("Benzo关a兴pyrene ") == "Benzo[a]pyrene"
    assert spoken("Potassium Borate") == "potassium borate"
    assert spoken("N,N-Dimethyl aniline") == "N,N-Dimethyl aniline"
    assert [is_code(text) for text in ("cbmicro_042138", "64-17-5", "unii-t1fad4ss2m", "ethanol", "dmso")] == [
        True,
        True,
        True,
        False,
        False,
    ]
    known = SimpleNamespace(
        common_name="ethanol", iupac_name="ethanol", synonyms=["ethanol", "ethanol", "64-17-5", "etoh"]
    )
    assert wanted_synonyms(["Ethyl alcohol"], known) == ["Ethyl alcohol", "ethanol", "etoh"]


def test_which_vapour() -> None:
    assert [vapour_of(smiles) for smiles in ("CC(=O)O", "CC(=O)OC", "CCO", "COC", "CCN", "[NH4+]")] == [
        "associating",
        "",
        "hydrogen-bonding",
        "",
        "hydrogen-bonding",
        "",
    ]
