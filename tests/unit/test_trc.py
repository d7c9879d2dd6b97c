"""The datum of the TRC formation enthalpies: what a row says of itself, what others say, and what becomes of it."""

from __future__ import annotations

from collections import Counter
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from propdb.api import Store
from propdb.intake.package import load_package
from propdb.intake.seeds import load_seed
from propdb.intake.trc import (
    ALONE,
    AT_0,
    AT_298,
    NEITHER,
    UNKNOWN,
    Witness,
    counted_from,
    decide,
    element_increments,
    hear,
    resolve,
    undecided,
)
from propdb.intake.where import seed_root
from propdb.model.records import USABLE_STATUSES, Entry, Source, Species
from propdb.store.content import Content, entry_id, with_id
from propdb.store.write import build

# Rows of Frenkel et al. (1994) and of the other tables as the chemicals library 1.5.2 carries them [J/mol]: the number,
# H(298.15 K) by its constant of integration, that of the elements, other sources' enthalpies of formation at 298.15 K.
CRC, JANAF, YAWS = "crc-95", "chase-1998", "yaws-2014"
ROWS: list[tuple[str, float, float | None, float | None, list[Witness], str]] = [
    ("methanal", -104700.0, 10024.4, 13857.0, [Witness(YAWS, -108600.0, True), Witness(CRC, -108600.0)], AT_0),
    (
        "1,1-difluoroethene",
        -329700.0,
        12321.0,
        19392.0,
        [Witness(CRC, -335000.0), Witness(YAWS, -336800.0, True)],
        AT_0,
    ),
    ("trimethylamine", -23700.0, 40.0, 45586.0, [Witness(CRC, -23600.0), Witness(YAWS, -23700.0, True)], AT_298),
    ("carbonyl fluoride", -640100.0, 43.0, 14215.0, [Witness(JANAF, -638897.0)], AT_298),
    # one source equals the number at 0 K, but what is no estimate is 7 kJ/mol away
    ("tribromomethane", 42900.0, 15908.0, 42063.5, [Witness(YAWS, 16700.0, True), Witness(CRC, 23800.0)], UNKNOWN),
    ("tribromomethane, by an estimate", 42900.0, 15908.0, 42063.5, [Witness(YAWS, 16700.0, True)], AT_0),
    ("hydrogen bromide", -144400.0, 8646.0, 16493.5, [Witness(JANAF, -36443.0), Witness(CRC, -36300.0)], NEITHER),
    ("octafluorocyclobutane", -1528000.0, 0.0, 39500.0, [Witness(CRC, -1542600.0)], NEITHER),
    # nobody tells: an estimate that differs says nothing
    ("2-chloro-1,1-difluoroethane", -495900.0, 16157.0, 28216.0, [Witness(YAWS, -480000.0, True)], ALONE),
    ("without a witness", -495900.0, 16157.0, 28216.0, [], ALONE),
    # two readings that a witness cannot tell apart
    ("hydrogen fluoride", -273300.0, 8596.0, 8646.0, [Witness(CRC, -273300.0)], ALONE),
    # others have the number at the other temperature
    ("ethanenitrile", 71500.0, 12093.0, 19135.0, [Witness(CRC, 74000.0), Witness("albahri-2013", 74040.0)], UNKNOWN),
    # the constant says nothing, or is not there, or an element's increment is not known
    ("between", 1000.0, 3500.0, 10000.0, [Witness(CRC, 1000.0)], UNKNOWN),
    ("no constant", 1000.0, None, 10000.0, [Witness(CRC, 1000.0)], UNKNOWN),
    ("unknown element", 1000.0, 9000.0, None, [Witness(CRC, 1000.0)], UNKNOWN),
]


@pytest.mark.parametrize("name, value, increment, elements, witnesses, verdict", ROWS, ids=[row[0] for row in ROWS])
def test_rows(
    name: str, value: float, increment: float | None, elements: float | None, witnesses: list[Witness], verdict: str
) -> None:
    found, reason, heard = decide(value, increment=increment, elements=elements, witnesses=witnesses)
    assert found == verdict, reason
    assert reason
    assert "\n" not in reason
    # whoever is heard first makes no difference
    assert decide(value, increment=increment, elements=elements, witnesses=witnesses[::-1])[0] == verdict
    assert [each.source for each in heard] == [each.source for each in witnesses][: len(heard)]


def test_an_unconfirmed_constant_names_the_temperature_in_its_reason() -> None:
    assert "counts from 0 K" in decide(-1.0, increment=16157.0, elements=28216.0, witnesses=[])[1]
    assert "counts from 298.15 K" in decide(-1.0, increment=12.0, elements=28216.0, witnesses=[])[1]


@pytest.mark.parametrize(
    "increment, counted",
    [(0.0, AT_298), (-174.0, AT_298), (552.0, AT_298), (6197.4, AT_0), (40000.0, AT_0), (2000.0, ""), (None, "")],
)
def test_where_a_table_counts_from(increment: float | None, counted: str) -> None:
    assert counted_from(increment) == counted


def test_testimony() -> None:
    def said(witness: float, *, estimate: bool = False, shift: float | None = -20000.0) -> str:
        return hear(0.0, shift, Witness("x", witness, estimate)).says

    assert [said(0.0), said(-20000.0), said(-10000.0), said(12000.0)] == [AT_298, AT_0, "", NEITHER]
    assert [said(-19900.0, estimate=True), said(-19000.0, estimate=True), said(50000.0, estimate=True)] == [
        AT_0,
        "",
        "",
    ]
    assert [said(3000.0, shift=None), said(7000.0, shift=None), said(12000.0, shift=None)] == [AT_298, "", NEITHER]
    assert [said(100.0, estimate=True, shift=None), said(3000.0, estimate=True, shift=None)] == [AT_298, ""]


# --- in a content -----------------------------------------------------------------------------------------------------
TRC = Source("trc-1994", "Thermodynamics of Organic Compounds in the Gas State", (), 1994, "book", "evaluated", "facts")
TEST = Source("test-1", "Another table", (), 1999, "book", "evaluated", "facts")
ALKANE = Species("2,2,3-trimethylhexane", "C9H20", 0, (("C", 9), ("H", 20)), 0.128255, "16747-25-4")
IODIDE = Species("2-iodopropane", "C3H7I", 0, (("C", 3), ("H", 7), ("I", 1)), 0.169993, "75-30-9")
METHYL = Species("bromomethane", "CH3Br", 0, (("C", 1), ("H", 3), ("Br", 1)), 0.094939, "74-83-9")
# a0 to a7, I, as carried; the enthalpies below are made up but for their size.
CURVES: dict[str, tuple[list[float], float]] = {
    "bromomethane": ([4.0, 1106000.0, 1205.0, 9.566, -0.937, -6190000.0, 246.0, 149.0], 0.0),
    "2,2,3-trimethylhexane": ([4.0, 0.0, 0.0, 90.0, -10.0, 0.0, 120.0, 60.0], 0.0),
    "2-iodopropane": ([4.0, 0.0, 0.0, 40.0, -5.0, 0.0, 200.0, 60.0], 0.0),
}


def _entry(species: Species, quantity: str, value: float | None, **fields: Any) -> Entry:
    blank = Entry(
        "", species.name, quantity, "g", "", "", "", 298.15, value, "J/mol", str(value), "J/mol", {}, None, None, None,
        "", "", "elements-298K", "", "test-1", species.name,
    )  # fmt: skip
    return with_id(replace(blank, **fields), species)


def _row(species: Species, value: float, *, from_298: bool = False) -> list[Entry]:
    a, i = CURVES[species.name]
    params: dict[str, Any] = {"a": a, "tmin": 50.0, "tmax": 1000.0, "I": i}
    if from_298:
        from propdb.cp import TrcGas

        whole = TrcGas.from_params(params).increment
        assert whole is not None
        params["I"] = i - whole / 8.31446261815324
    own: dict[str, Any] = {"source": "trc-1994", "locator": f"table of the compound: {species.name}", "datum": ""}
    curve = _entry(
        species, "Cp", None, equation="trc-gas", params=params, temperature=None, tmin=50.0, tmax=1000.0,
        unit="J/mol/K", carried_unit="R", **own,
    )  # fmt: skip
    return [curve, _entry(species, "Hf", value, temperature=None, status="datum-unknown", conditions="?", **own)]


@pytest.fixture(scope="module")
def seed() -> Content:
    return load_seed(seed_root(), identifiers=False)


def _content(seed: Content, *entries: Entry) -> Content:
    species = [*seed.species, ALKANE, IODIDE, METHYL]
    return replace(seed, species=species, sources=[*seed.sources, TRC, TEST], entries=[*seed.entries, *entries])


def _trc(content: Content, species: Species, quantity: str) -> Entry:
    (found,) = [e for e in content.entries if (e.species, e.source, e.quantity) == (species.name, "trc-1994", quantity)]
    assert found.id == entry_id(found, species)
    return found


def test_increments_of_the_elements(seed: Content) -> None:
    # Cox, Wagman and Medvedev (1989), CODATA Key Values for Thermodynamics, half of H2, O2, N2, Cl2, Br2(l) and so on
    found = element_increments(seed)
    expected = {
        "C": 1050.0,
        "H": 4233.5,
        "O": 4340.0,
        "N": 4335.0,
        "Cl": 4590.5,
        "Br": 12260.0,
        "S": 4412.0,
        "I": 6598.0,
    }
    assert {element: found[element] for element in expected} == pytest.approx(expected)


def test_what_becomes_of_decided_and_undecided_rows(seed: Content, tmp_path: Path) -> None:
    content = _content(
        seed,
        *_row(METHYL, -20000.0),
        _entry(METHYL, "Hf", -35700.0),
        *_row(IODIDE, -23700.0, from_298=True),
        _entry(IODIDE, "Hf", -23600.0),
        *_row(ALKANE, -193000.0),
    )
    resolution = resolve(content)
    assert [decision.verdict for decision in resolution.decisions] == [AT_0, AT_298, UNKNOWN]
    assert "1 are at 0 K, 1 at 298.15 K, 0 fit neither, 1 stay unknown (1 of them" in resolution.line()

    methyl = _trc(resolution.content, METHYL, "Hf")
    assert (methyl.temperature, methyl.datum, methyl.status, methyl.conditions) == (0.0, "elements-0K", "base", "")
    assert (methyl.value, methyl.carried) == (-20000.0, "-20000.0")
    assert "confirmed by test-1" in methyl.note
    increment = _trc(resolution.content, METHYL, "dH0")
    assert increment.temperature == 298.15
    assert increment.value == pytest.approx(resolution.decisions[0].increment)
    assert increment.carried_unit == "J/mol"

    iodide = _trc(resolution.content, IODIDE, "Hf")
    assert (iodide.temperature, iodide.datum, iodide.status, iodide.value) == (
        298.15,
        "elements-298K",
        "base",
        -23700.0,
    )
    assert not [e for e in resolution.content.entries if e.quantity == "dH0" and e.species == IODIDE.name]

    alkane = _trc(resolution.content, ALKANE, "Hf")
    before = next(e for e in content.entries if e.species == ALKANE.name and e.quantity == "Hf")
    assert alkane.id == before.id
    assert alkane.status not in USABLE_STATUSES
    assert "no other source" in alkane.note
    assert resolution.decisions[2].at_298 is None

    # a second pass finds the rest still waiting and changes nothing else
    again = resolve(resolution.content)
    assert [d.entry.species for d in again.decisions] == [ALKANE.name]
    assert {e.id for e in again.content.entries} == {e.id for e in resolution.content.entries}

    # back to where it was
    back = undecided(resolution.content)
    assert [decision.verdict for decision in resolve(back).decisions] == [AT_0, AT_298, UNKNOWN]
    assert len(back.entries) == len(content.entries)

    # deciding also where the constant stands alone
    bold = resolve(content, alone=True)
    assert [decision.verdict for decision in bold.decisions] == [AT_0, AT_298, AT_0]
    assert [decision.alone for decision in bold.decisions] == [False, False, True]

    # the levels bring it to 298.15 K; bromine is crystalline at 0 K and liquid at 298.15 K
    path = tmp_path / "trc.db"
    build(path, resolution.content, versions={})
    with Store(path) as store:
        answer = store.enthalpy(METHYL.name, phase="g", temperature="298.15K", datum="elements-298K", source="trc-1994")
        assert [step.what for step in answer.steps] == ["formation", "increment H(298.15) - H(0)"]
        at_298 = resolution.decisions[0].at_298
        assert at_298 is not None
        # the graphite of the levels may come from another increment than CODATA's
        assert answer.value == pytest.approx(at_298 / 1000.0, abs=0.01)


def test_a_withheld_witness_is_not_heard(seed: Content) -> None:
    content = _content(seed, *_row(METHYL, -20000.0), _entry(METHYL, "Hf", -35700.0))
    assert [d.verdict for d in resolve(content, withheld=["test-1"]).decisions] == [UNKNOWN]
    quarantined = _content(seed, *_row(METHYL, -20000.0), _entry(METHYL, "Hf", -35700.0, status="quarantined"))
    assert [d.verdict for d in resolve(quarantined).decisions] == [UNKNOWN]
    red = _content(seed, *_row(METHYL, -20000.0), _entry(METHYL, "Hf", -35700.0, datum="elements-298K-red-P"))
    assert [d.verdict for d in resolve(red).decisions] == [UNKNOWN]


def test_a_liquid_with_its_latent_heat_is_a_witness(seed: Content) -> None:
    liquid = _entry(METHYL, "Hf", -59000.0, phase="l")
    heat = _entry(METHYL, "Hvap", 23000.0, phase="l", datum="", conditions="standard")
    content = _content(seed, *_row(METHYL, -20000.0), liquid, heat)
    (decision,) = resolve(content).decisions
    assert decision.verdict == AT_0
    assert [each.source for each in decision.heard] == ["test-1+test-1"]


# --- on the package's rows --------------------------------------------------------------------------------------------
def test_with_the_referees_withheld(seed: Content, root: Path) -> None:
    data = undecided(load_package(seed, seed_root()).content)
    full = resolve(data)
    usable = [e for e in full.content.entries if e.source == "trc-1994" and e.quantity == "Hf" and e.status == "base"]
    verdicts = Counter(decision.verdict for decision in full.decisions)
    assert len(usable) == verdicts[AT_0] + verdicts[AT_298]
    assert all(entry.datum and entry.temperature is not None for entry in usable)
    waiting = [e for e in full.content.entries if e.status == "datum-unknown"]
    assert len(waiting) == verdicts[NEITHER] + verdicts[UNKNOWN]
    # where another table copied a row, its constant of integration counts from the temperature of the copy
    copied = [(d.counted, {h.says for h in d.heard if h.says and h.off <= 150.0}) for d in full.decisions]
    told = [(counted, says) for counted, says in copied if len(says) == 1]
    assert len(told) > 500
    assert all(says == {counted} for counted, says in told)

    import sys

    sys.path.insert(0, str(root / "tests" / "bench"))
    try:
        import trc_decisions
    finally:
        sys.path.remove(str(root / "tests" / "bench"))
    both = list(trc_decisions.REFEREES.values())
    score = trc_decisions.score(data, "", both, both, trc_decisions.AGREES[0])
    assert score.right + len(score.wrong) > 80
    assert score.share >= trc_decisions.TARGET
    # a resolver that exchanges the temperatures would be found out
    exchanged = [
        trc_decisions.truth(replace(d, verdict=AT_298), {298.15: d.at_298}, 1e4) for d in full.decisions if d.at_298
    ]
    assert Counter(exchanged)[AT_0] > 600
