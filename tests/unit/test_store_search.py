"""What people type finds the species that they mean, or says why not."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest
from store_samples import BOOK, SODIUM_ION, WATER, content, entry

from propdb.errors import Ambiguous, NotFound
from propdb.model.records import Species
from propdb.store.read import Reader
from propdb.store.rows import fold
from propdb.store.search import Match, find, resolve
from propdb.store.write import build

MORE = (
    Species("carbon monoxide", "CO", 0, (("C", 1), ("O", 1)), 0.028, "630-08-0", synonyms=("CO",)),
    Species("cobalt", "Co", 0, (("Co", 1),), 0.059, "7440-48-4"),
    Species("alpha-pinene", "C10H16", 0, (("C", 10), ("H", 16)), 0.136, "80-56-8", synonyms=("2,6,6-trimethyl…",)),
    Species("o'brien's \"salt\"; DROP TABLE name; --", "NaCl", 0, (("Na", 1), ("Cl", 1)), 0.058),
    Species("electron", "", -1, (), 5.5e-7),
    Species("sulfate ion", "O4S", -2, (("O", 4), ("S", 1)), 0.096, "14808-79-8", synonyms=("sulphate",)),
    Species(
        "l-lactic acid", "C3H6O3", 0, (("C", 3), ("H", 6), ("O", 3)), 0.09, "79-33-4", "JVTAAEKCZFNVCJ-REOHCLBHSA-N"
    ),
    Species(
        "d-lactic acid", "C3H6O3", 0, (("C", 3), ("H", 6), ("O", 3)), 0.09, "10326-41-7", "JVTAAEKCZFNVCJ-UWTATZPHSA-N"
    ),
    Species(
        "100% spirit_x", "CH4O", 0, (("C", 1), ("H", 4), ("O", 1)), 0.032, synonyms=("Spirit", "spirit", "sulphate")
    ),
)


@pytest.fixture(scope="module")
def reader(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Reader]:
    path: Path = tmp_path_factory.mktemp("search") / "store.db"
    build(path, content(species=(*content().species, *MORE)), versions={})
    with Reader(path) as opened:
        yield opened


@pytest.mark.parametrize(
    "text, name",
    [
        ("water", "water"),
        ("  WATER ", "water"),
        ("Steam", "water"),
        ("H2O", "water"),
        ("OH2", "water"),
        ("h2o", "water"),
        ("7732-18-5", "water"),
        ("XLYOFNOQVPJJNP-UHFFFAOYSA-N", "water"),
        ("xlyofnoqvpjjnp-uhfffaoysa-n", "water"),
        ("Na", "sodium"),
        ("Na+", "sodium ion"),
        ("Na^+", "sodium ion"),
        ("CO", "carbon monoxide"),
        ("Co", "cobalt"),
        ("α-pinene", "alpha-pinene"),
        ("alpha–Pinene", "alpha-pinene"),
        ("H16C10", "alpha-pinene"),
        ("e-", "electron"),
        ("SO4-2", "sulfate ion"),
        ("SO4(2-)", "sulfate ion"),
        ("o'brien's \"salt\"; DROP TABLE name; --", "o'brien's \"salt\"; DROP TABLE name; --"),
        ("100% Spirit_X", "100% spirit_x"),
        ("SPIRIT", "100% spirit_x"),
    ],
)
def test_resolve(reader: Reader, text: str, name: str) -> None:
    assert resolve(reader, text).name == name
    assert find(reader, text)[0].name == name
    assert find(reader, text)[0].score >= 97


def test_resolve_gives_the_record(reader: Reader) -> None:
    assert resolve(reader, "steam") == WATER


def test_several_answer(reader: Reader) -> None:
    for text, names in (
        ("C2H6O", ["ethanol", "dimethyl ether"]),  # the better known first
        ("C2H5OH", ["ethanol", "dimethyl ether"]),
        ("co", ["carbon monoxide", "cobalt"]),
        ("sulphate", ["100% spirit_x", "sulfate ion"]),
    ):
        with pytest.raises(Ambiguous) as caught:
            resolve(reader, text)
        assert caught.value.fields["candidates"] == names
        assert ", ".join(names) in str(caught.value)
        assert "\n" not in str(caught.value)


@pytest.mark.parametrize("known, rivals, clear", [(3, 1, True), (3, 0, True), (2, 1, False), (5, 2, False)])
def test_a_curiosity_does_not_stand_in_the_way(tmp_path: Path, known: int, rivals: int, clear: bool) -> None:
    """CO2 is carbon dioxide, though one source computed an isomer of it; but two well known isomers are told apart."""
    common = Species("carbon dioxide", "CO2", 0, (("C", 1), ("O", 2)), 0.044, "124-38-9")
    rare = Species("dioxiranylidene", "CO2", 0, (("C", 1), ("O", 2)), 0.044)
    sources = [replace(BOOK, key=f"book-{n}") for n in range(5)]
    entries = [entry(common, source=source.key) for source in sources[:known]]
    entries += [entry(rare, value=-1.0, source=source.key) for source in sources[:rivals]]
    path = tmp_path / "store.db"
    build(path, content(species=(common, rare), sources=tuple(sources), entries=tuple(entries)), versions={})
    with Reader(path) as reader:
        if clear:
            assert resolve(reader, "O2C") == common
        else:
            with pytest.raises(Ambiguous, match="carbon dioxide, dioxiranylidene"):
                resolve(reader, "CO2")
        assert [match.name for match in find(reader, "CO2")] == ["carbon dioxide", "dioxiranylidene"]


def test_a_part_of_a_name_is_not_the_name(reader: Reader) -> None:
    for text, near in (("wate", "water"), ("ethanl", "ethanol"), ("sodium io", "sodium ion")):
        with pytest.raises(NotFound, match=f"did you mean .*{near}"):
            resolve(reader, text)
    for text in ("XLYOFNOQVPJJNP", "7732-18-4", "%", "_", "qqqqqqq", "''"):
        with pytest.raises(NotFound):
            resolve(reader, text)
    with pytest.raises(NotFound, match="empty"):
        resolve(reader, "  ")


def names(matches: list[Match]) -> list[str]:
    return [match.name for match in matches]


def test_find_by_beginning_and_part(reader: Reader) -> None:
    assert names(find(reader, "sod")) == ["sodium", "sodium ion"]
    assert names(find(reader, "hyl")) == ["ethanol", "dimethyl ether", "alpha-pinene"]  # by synonym, the shortest first
    assert names(find(reader, "lactic")) == ["d-lactic acid", "l-lactic acid"]
    assert names(find(reader, "JVTAAEKCZFNVCJ")) == ["d-lactic acid", "l-lactic acid"]
    assert names(find(reader, "jvtaaekczfnvcj")) == ["d-lactic acid", "l-lactic acid"]
    assert names(find(reader, "0% spirit")) == ["100% spirit_x"]
    assert names(find(reader, '"salt"; drop')) == [MORE[3].name]
    assert names(find(reader, "C2H6O")) == ["ethanol", "dimethyl ether"]
    assert find(reader, "sod")[1] == Match("sodium ion", "Na^+", SODIUM_ION.cas, "", 69.0)


def test_find_what_is_merely_alike(reader: Reader) -> None:
    (match,) = find(reader, "etanol")
    assert match.name == "ethanol"
    assert match.score < 40
    assert find(reader, "qqqqqqq") == []
    assert find(reader, "") == []
    assert find(reader, "water", 0) == []


def test_limit(reader: Reader) -> None:
    assert len(find(reader, "a", 3)) <= 3
    assert len(find(reader, "ate")) > 1
    assert len(find(reader, "ate", 1)) == 1


@pytest.mark.parametrize(
    "text", ['"', "'", 'ab"', '""""', "AND", "a AND b", "NOT x", "a*", "^abc", "name:x", "\0\0\0", "a" * 10_000]
)
def test_nothing_typed_is_a_query(reader: Reader, text: str) -> None:
    find(reader, text)


def test_fold() -> None:
    assert fold("  Β-Pinene\t(+) ") == "beta-pinene (+)"
    assert fold("2′-x") == fold("2’-x") == "2'-x"
    assert fold("ＣＯ₂") == "co2"
    assert fold("STRASSE") == fold("straße")
