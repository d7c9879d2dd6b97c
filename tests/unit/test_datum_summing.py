"""May enthalpies be summed: the verdict and its sentence."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest

from propdb.datum import may_sum, parse_datums, parse_inline
from propdb.model.records import Datum

SEED = Path(__file__).resolve().parents[2] / "seeds_data"


@pytest.fixture(scope="module")
def datums() -> dict[str, Datum]:
    return parse_datums(tomllib.loads((SEED / "datums.toml").read_text(encoding="utf-8")), where="datums.toml")


@pytest.mark.parametrize("name", ["elements-298K", "elements-0K", "combustion-net-15C", "oxides-298K"])
def test_elements_and_basis_datums_sum_across_reactions(datums: dict[str, Datum], name: str) -> None:
    verdict = may_sum([datums[name], datums[name]])
    assert (verdict.streams, verdict.reaction) == (True, True)
    assert name in verdict.why


@pytest.mark.parametrize("name", ["gas-25C", "stable-0C", "steam-triple-point", "humid-air-0C"])
def test_own_state_datums_sum_across_streams_only(datums: dict[str, Datum], name: str) -> None:
    verdict = may_sum(datums[name])
    assert (verdict.streams, verdict.reaction) == (True, False)
    assert "until the heat of reaction is added" in verdict.why


def test_same_temperature_sums_at_one_temperature(datums: dict[str, Datum]) -> None:
    datum = datums["elements-same-T"]
    assert may_sum([datum, datum], temperatures=[900.0, 900.0]).reaction
    refused = may_sum([datum, datum], temperatures=[900.0, 1000.0])
    assert (refused.streams, refused.reaction) == (False, False)
    assert "900 to 1000 K" in refused.why
    assert not may_sum(datum).reaction


def test_mixed_datums_never(datums: dict[str, Datum]) -> None:
    verdict = may_sum([datums["elements-298K"], datums["elements-0K"], datums["elements-298K"]])
    assert (verdict.streams, verdict.reaction) == (False, False)
    assert "elements-298K and elements-0K" in verdict.why
    assert "convert" in verdict.why


def test_one_convention_under_two_names_is_one_datum(datums: dict[str, Datum]) -> None:
    assert may_sum([datums["gas-25C"], parse_inline("own:g@25C")]).streams
    assert not may_sum([datums["gas-25C"], parse_inline("own:g@26C")]).streams


def test_nothing_to_sum() -> None:
    assert not may_sum([]).streams
