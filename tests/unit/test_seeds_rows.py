"""Each kind of bad row in a seed is named with file, row and column, and what would be right."""

from __future__ import annotations

from pathlib import Path

import pytest
from seed_samples import DATUMS, ELEMENTS, HEADERS, SOURCE, SPECIES, Seed

from propdb.errors import SeedError
from propdb.intake.seeds import load_seed


@pytest.fixture
def seed(tmp_path: Path) -> Seed:
    return Seed(tmp_path)


def test_the_small_seed_itself_is_taken(seed: Seed) -> None:
    content = load_seed(seed.root)
    assert [s.name for s in content.species] == ["hydrogen", "oxygen", "water"]
    assert list(content.datums) == ["elements-298K"]
    assert content.policy["ranks"] == {"class_order": ["handbook"]}
    assert content.policy["elements"]["H"]["forms"][0]["species"] == "hydrogen"


# -- constants ---------------------------------------------------------------------------------------------------------

GOOD = "water,Hf,l,,,298.15,-285.83,kJ/mol,0.04,expanded-95,elements-298K,,H2O (l),"


def changed(row: str, **cells: str) -> str:
    values = row.split(",")
    columns = HEADERS["entries.csv" if row.count(",") == 13 else "curves.csv"].split(",")
    for column, value in cells.items():
        values[columns.index(column)] = value
    return ",".join(values)


@pytest.mark.parametrize(
    "cells, problem, column",
    [
        ({"species": "watre"}, "unknown species 'watre'; did you mean 'water'", "species"),
        ({"species": ""}, "species is blank", "species"),
        ({"quantity": "dHf"}, "unknown quantity 'dHf'; did you mean 'Hf'", "quantity"),
        ({"quantity": ""}, "quantity is blank", "quantity"),
        ({"phase": "liq"}, "unknown phase 'liq'", "phase"),
        ({"form": "alpha"}, "form 'alpha' of phase l", "form"),
        ({"to": "cr"}, "Hf with a target", "to"),
        ({"temperature": ""}, "Hf without a temperature", "temperature"),
        ({"temperature": "25 C"}, "'25 C' is not a number", "temperature"),
        ({"temperature": "-5"}, "is not positive", "temperature"),
        ({"value": ""}, "value is blank", "value"),
        ({"value": "about 5"}, "is not a number", "value"),
        ({"value": "nan"}, "is not a number", "value"),
        ({"value": "1e999"}, "too large", "value"),
        ({"value": '"-285,83"'}, "has a comma; the decimal point is '.': -285.83", "value"),
        ({"value": '"1,285.83"'}, "has a thousands separator; write 1285.83", "value"),
        ({"unit": "kJmol"}, "unknown unit", "unit"),
        ({"unit": "J/mol/K"}, "is an energy per amount per temperature", "unit"),
        ({"unit": "kcal/mol"}, "kcal has two meanings", "unit"),
        ({"unit": ""}, "unit is blank", "unit"),
        ({"uncertainty_kind": ""}, "an uncertainty without its kind", "uncertainty_kind"),
        ({"uncertainty_kind": "2s"}, "unknown uncertainty_kind '2s'", "uncertainty_kind"),
        ({"uncertainty": ""}, "without an uncertainty", "uncertainty"),
        ({"uncertainty": "-0.04"}, "is negative", "uncertainty"),
        ({"datum": ""}, "Hf without its datum", "datum"),
        ({"datum": "elements-298"}, "unknown datum 'elements-298'; did you mean 'elements-298K'", "datum"),
        ({"quantity": "S", "unit": "J/mol/K"}, "S with datum", "datum"),
        ({"locator": ""}, "locator is blank", "locator"),
        ({"quantity": "Hvap", "datum": ""}, "-285.83 kJ/mol is not positive", "value"),
        ({"quantity": "Hvap", "datum": "", "value": "44"}, "does not say to which vapour", "conditions"),
        ({"quantity": "Hvap", "datum": "", "phase": "g"}, "Hvap stands under phase g", "phase"),
        ({"quantity": "Htr", "datum": "", "phase": "cr"}, "Htr without its target", "to"),
        ({"quantity": "Htr", "datum": "", "phase": "cr", "to": "beta"}, "not a phase and form", "to"),
        ({"quantity": "Htr", "datum": "", "phase": "cr", "to": "cr"}, "is where it starts", "to"),
        ({"quantity": "dH0", "datum": "", "temperature": "300"}, "dH0 at 300 K", "temperature"),
        ({"quantity": "Tb", "datum": ""}, "Tb with a temperature", "temperature"),
    ],
)
def test_a_bad_constant(seed: Seed, cells: dict[str, str], problem: str, column: str) -> None:
    seed.rows("entries.csv", changed(GOOD, phase="g", species="hydrogen"), changed(GOOD, **cells))
    error = seed.refuse(problem, f"book-1990/entries.csv, row 3, column {column}")
    assert (error.fields["row"], error.fields["column"]) == (3, column)


def test_one_value_twice(seed: Seed) -> None:
    seed.rows("entries.csv", GOOD, changed(GOOD, value="-285.84"))
    seed.refuse("Hf of water .l. stands in book-1990/entries.csv, row 2 already", "book-1990/entries.csv, row 3")


def test_a_constant_in_si_with_the_number_as_carried(seed: Seed) -> None:
    seed.rows(
        "entries.csv",
        GOOD,
        "water,Cp,l,,,298.15,1.000,cal_th/g/K,,,,1 bar,water,",
        "water,Tb,l,,,,212,F,0.1,maximum,,at 101.325 kPa,water,",
    )
    hf, cp, tb = load_seed(seed.root).entries
    assert (hf.value, hf.unit, hf.carried, hf.carried_unit) == (-285830.0, "J/mol", "-285.83", "kJ/mol")
    assert (hf.uncertainty, hf.standard_uncertainty()) == (pytest.approx(40.0), pytest.approx(20.0))
    assert (hf.datum, hf.locator, hf.source, hf.status) == ("elements-298K", "H2O (l)", "book-1990", "base")
    assert hf.carriers[0].file == "book-1990/entries.csv"
    assert (hf.carriers[0].row, hf.carriers[0].how) == (2, "invented")
    assert cp.value == pytest.approx(4184.0 * 0.018015)
    assert tb.value == pytest.approx(373.15)
    assert tb.uncertainty == pytest.approx(0.1 / 1.8)


def test_an_estimate_is_not_base(seed: Seed) -> None:
    seed.write("book-1990/source.toml", SOURCE.replace('"handbook"', '"estimate"'))
    seed.rows("entries.csv", GOOD)
    assert load_seed(seed.root).entries[0].status == "estimate"


def test_gas_entropies_of_an_atmosphere_say_so(seed: Seed) -> None:
    seed.write("book-1990/source.toml", SOURCE.replace("100000", "101325"))
    seed.rows("entries.csv", "oxygen,S,g,,,298.15,205.03,J/mol/K,,,,,O2,")
    assert load_seed(seed.root).entries[0].conditions == "standard pressure 1 atm"


# -- files -------------------------------------------------------------------------------------------------------------


def test_encodings(seed: Seed) -> None:
    path = seed.folder / "entries.csv"
    path.write_bytes(b"\xef\xbb\xbf" + HEADERS["entries.csv"].encode())
    seed.refuse("begins with a byte order mark", "book-1990/entries.csv")
    path.write_bytes((HEADERS["entries.csv"] + "\n" + GOOD).encode("utf-16"))
    seed.refuse("begins with UTF-16", "book-1990/entries.csv")
    path.write_bytes((HEADERS["entries.csv"] + "\n" + changed(GOOD, note="café")).encode("latin-1"))
    seed.refuse("byte 0xe9 is not UTF-8", "book-1990/entries.csv, line 2")
    path.write_bytes(b"")
    seed.refuse("the file is empty", "book-1990/entries.csv")


@pytest.mark.parametrize(
    "text, problem, where",
    [
        (HEADERS["entries.csv"].replace("value", "vlaue"), "unknown column 'vlaue'; did you mean 'value'", ", row 1"),
        (HEADERS["entries.csv"].replace(",unit", ""), "column 'unit' is missing", ", row 1"),
        (HEADERS["entries.csv"] + ",note", "column 'note' stands there twice", ", row 1"),
        (HEADERS["entries.csv"].replace(",", ";"), "separate the columns with commas", ", row 1"),
        (HEADERS["entries.csv"] + "\nwater,Hf", "2 cells, and the header has 14", ", row 2"),
        (HEADERS["entries.csv"] + "\n" + GOOD.replace("-285.83", "-285,83"), "15 cells", ", row 2"),
        (HEADERS["entries.csv"] + "\n\n" + GOOD, "the row is empty", ", row 2"),
        (HEADERS["entries.csv"] + '\n"water,Hf', "quoting is broken", ", line"),
    ],
)
def test_a_bad_table(seed: Seed, text: str, problem: str, where: str) -> None:
    seed.write("book-1990/entries.csv", text)
    seed.refuse(problem, f"book-1990/entries.csv{where}")


def test_a_file_that_nobody_reads(seed: Seed) -> None:
    seed.write("book-1990/entreis.csv", "")
    seed.refuse("did you mean 'entries.csv'", "book-1990/entreis.csv")


def test_a_missing_file(seed: Seed) -> None:
    (seed.folder / "source.toml").unlink()
    seed.refuse("the file is missing", "book-1990/source.toml")


@pytest.mark.parametrize("name", ["datums.toml", "ranks.toml", "elements.csv"])
def test_a_missing_part(seed: Seed, name: str) -> None:
    (seed.root / name).unlink()
    seed.refuse("the file is missing", name)


def test_no_directory(tmp_path: Path) -> None:
    with pytest.raises(SeedError, match="no such directory"):
        load_seed(tmp_path / "nowhere")


@pytest.mark.parametrize(
    "old, new, problem",
    [
        ('key = "book-1990"', 'key = "book-1991"', "is not the name of the folder"),
        ('title = "A book of invented numbers"', "", "title is missing"),
        ('kind = "book"', 'kind = "bok"', "did you mean 'book'"),
        ('class = "handbook"', 'class = "good"', "unknown class 'good'"),
        ("year = 1990", 'year = "1990"', "year '1990' is not one"),
        ("year = 1990", "", "year None is not one"),
        ('authors = ["Nobody, A."]', "authors = []", "authors is empty"),
        ('authors = ["Nobody, A."]', 'authors = "Nobody"', "not a list of names"),
        ("standard_pressure = 100000", "standard_pressure = 1", "standard_pressure 1 is neither"),
        ('terms = "Invented for this test."', "", "terms is missing"),
        ('carrier = "invented"', 'carier = "invented"', "did you mean 'carrier'"),
        ("year = 1990", 'year = 1990\ndoi = "doi.org/x"', "doi 'doi.org/x' is not one"),
        ("year = 1990", 'year = 1990\nlineage = ["x"]', "not a list of tables"),
        ("year = 1990", "year = ", "is not TOML"),
    ],
)
def test_a_bad_source(seed: Seed, old: str, new: str, problem: str) -> None:
    assert old in SOURCE
    seed.write("book-1990/source.toml", SOURCE.replace(old, new))
    seed.refuse(problem, "book-1990/source.toml")


def test_a_bad_datum_and_bad_ranks(seed: Seed) -> None:
    seed.write("datums.toml", DATUMS.replace("298.15K", "298.15"))
    seed.refuse("has no unit", "datums.toml: datum 'elements-298K'")
    seed.write("datums.toml", DATUMS.replace("book-1990", "book-1991"))
    seed.refuse("unknown source 'book-1991'; did you mean 'book-1990'", "datums.toml: datum 'elements-298K'")
    seed.write("datums.toml", DATUMS.replace('"hydrogen"', '"hydrogne"'))
    seed.refuse("unknown species 'hydrogne'; did you mean 'hydrogen'", "datums.toml: datum 'elements-298K'")
    seed.write("datums.toml", DATUMS)
    rank = '[[rank]]\nquantities = ["Hf"]\nsources = ["a", "b"]\n[rank.reasons]\na = "first"\n'
    seed.write("ranks.toml", rank)
    seed.refuse("no reason for b", "ranks.toml: rank 1")
    seed.write("ranks.toml", rank.replace('"Hf"', '"dHf"') + 'b = "second"\n')
    seed.refuse("unknown quantity 'dHf'", "ranks.toml: rank 1")
    default = '[[class_default]]\nquantities = ["Hf"]\nclasses = ["handbook"]\nreason = "x"\n'
    seed.write("ranks.toml", default)
    seed.refuse("one of percent and standard", "ranks.toml: class_default 1")


def test_a_dependent_basis(seed: Seed) -> None:
    basis = "\n".join(
        (
            '[datum.b]\nkind = "basis"\nsentence = "s."\nsource = "book-1990"\ntemperature = "25C"\nbasis = [',
            *(f'{{ species = "{n}", phase = "g" }},' for n in ("hydrogen", "oxygen", "water")),
            "]\n",
        )
    )
    seed.write("datums.toml", DATUMS + basis)
    seed.refuse("'water' can be made of hydrogen, oxygen", "datums.toml: datum 'b'")
    seed.write("datums.toml", DATUMS + basis.replace('"water"', '"watre"'))
    seed.refuse("unknown species 'watre'", "datums.toml")


# -- species -----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "row, problem, column",
    [
        (",H2O2,0,,,,", "name is blank", "name"),
        ("water,H2O,0,,,,", "'water' stands in row 4 already", "name"),
        ("x,H2Q,0,,,,", "is not an element", "formula"),
        ("x,,0,,,,", "formula is blank", "formula"),
        ("x,HO-,-1,,,,", "holds a charge", "formula"),
        ("x,HO,,,,,", "charge is blank", "charge"),
        ("x,HO,+-1,,,,", "is not an integer", "charge"),
        ("x,H2O2,0,7722-84-2,,,", "check digit 2, and its other digits give 1", "cas"),
        ("x,H2O2,0,7722841,,,", "is not a CAS RN", "cas"),
        ("x,H2O2,0,7732-18-5,,,", "7732-18-5 is given to 'x' here and to 'water'", "cas"),
        ("x,H2O2,0,,MHAJPDPJQMAIIY,,", "is not an InChIKey", "inchikey"),
        ("x,N2,0,,,,", "no atomic weight for N", "formula"),
        ("ethanol,C2H6O2,0,64-17-5,,,", "ethanol: formula C2H6O2 contradicts CAS RN 64-17-5", "formula"),
    ],
)
def test_a_bad_species(seed: Seed, row: str, problem: str, column: str) -> None:
    seed.rows("species.csv", *SPECIES, row)
    seed.refuse(problem, f"book-1990/species.csv, row 5, column {column}")


@pytest.mark.parametrize(
    "row, problem, column",
    [
        ("water,HO,0,,,,", "'water' is HO here and H2O in species.csv, row 2", "formula"),
        ("water,H2O,1,,,,", "'water' has charge 1 here and 0 in species.csv, row 2", "charge"),
        ("water,H2O,0,7789-20-0,,,", "'water' has cas 7789-20-0 here and 7732-18-5 in species.csv, row 2", "cas"),
    ],
)
def test_a_row_that_contradicts_another_file(seed: Seed, row: str, problem: str, column: str) -> None:
    seed.write("species.csv", HEADERS["species.csv"] + "\nwater,H2O,0,7732-18-5,,,\n")
    seed.rows("species.csv", *SPECIES[:2], row)
    seed.refuse(problem, f"book-1990/species.csv, row 4, column {column}")


def test_rows_of_one_name_fill_each_other(seed: Seed) -> None:
    header = HEADERS["species.csv"] + ",kind,vapour,molar_mass"
    seed.write("species.csv", f"{header}\nwater,OH2,0,,,ice;dihydrogen oxide,first,,associating,18.015268\n")
    (water,) = (s for s in load_seed(seed.root).species if s.name == "water")
    assert (water.cas, water.vapour, water.note) == ("7732-18-5", "associating", "first")
    assert water.synonyms == ("ice", "dihydrogen oxide", "steam")
    assert water.molar_mass == pytest.approx(0.018015268, abs=1e-15)
    assert (water.formula, water.composition) == ("H2O", (("H", 2), ("O", 1)))


def test_radicals_and_ions_are_not_corrected(seed: Seed) -> None:
    """The library lists methyl as CH4 and the ions by other formulas; hydrogen and ions are not compared."""
    seed.rows("species.csv", *SPECIES, "methyl,CH3,0,2229-07-4,,,", "hydroxide ion,OH,-1,14280-30-9,,,")
    assert len(load_seed(seed.root).species) == 5


def test_thirds_written_out_as_decimals(seed: Seed) -> None:
    seed.rows("species.csv", *SPECIES, "x,CH5.3333333O6.6666667,0,,,,")
    assert [s.composition for s in load_seed(seed.root).species if s.name == "x"] == [
        (("C", 1), ("H", pytest.approx(16 / 3)), ("O", pytest.approx(20 / 3)))
    ]


@pytest.mark.parametrize(
    "row, problem",
    [
        ("H,hydrogen,1,1.008,", "stands there twice"),
        ("N,nitrogen,7,-14,", "not positive"),
        ("N,nitrogen,7,,", "is blank"),
    ],
)
def test_a_bad_element(seed: Seed, row: str, problem: str) -> None:
    seed.write("elements.csv", ELEMENTS + row + "\n")
    seed.refuse(problem, "elements.csv, row 5")
