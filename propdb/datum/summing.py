"""May enthalpies on these datums be summed, across what, and why not."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace

from propdb.model.records import SAME_T, Datum, MaySum

__all__ = ["may_sum", "same_meaning"]


def same_meaning(first: Datum, second: Datum) -> bool:
    """Whether two datums are one convention under two names (``gas-25C`` and ``own:g@25C``)."""
    blank = {"name": "", "sentence": "", "source": "", "note": "", "inline": False}
    return replace(first, **blank) == replace(second, **blank)  # type: ignore[arg-type]


def may_sum(datums: Datum | Iterable[Datum], *, temperatures: Iterable[float] | None = None) -> MaySum:
    """Verdict on summing enthalpies that stand on these datums.

    Parameters
    ----------
    datums : Datum or iterable of Datum
        One per term; one alone asks what may be done with values on it.
    temperatures : iterable of float, optional
        Temperatures [K] of the states, for same-temperature datums. Without them a same-temperature datum gets no.

    Returns
    -------
    MaySum
        ``streams``: across streams of one species; ``reaction``: across a reaction; ``why``: one sentence.
    """
    terms = [datums] if isinstance(datums, Datum) else list(datums)
    if not terms:
        return MaySum(streams=False, reaction=False, why="there is nothing to sum")
    first = terms[0]
    other = next((d for d in terms[1:] if not same_meaning(first, d)), None)
    if other is not None:
        return MaySum(
            streams=False,
            reaction=False,
            why=f"no: {first.name} and {other.name} have different zeros; convert all terms to one datum first",
        )
    if first.temperature == SAME_T:
        return _same_temperature(first, temperatures)
    if first.kind == "own":
        return MaySum(
            streams=True,
            reaction=False,
            why=f"across streams of one species yes; across a reaction no, until the heat of reaction is added: "
            f"{first.name} gives each species its own zero",
        )
    zero = "the elements" if first.kind == "elements" else "the basis species"
    return MaySum(
        streams=True,
        reaction=True,
        why=f"yes, across streams and reactions, with other values on {first.name}: {zero} have zero, and a reaction "
        "conserves them",
    )


def _same_temperature(datum: Datum, temperatures: Iterable[float] | None) -> MaySum:
    values = sorted(set(temperatures or ()))
    if len(values) == 1:
        return MaySum(
            streams=True,
            reaction=True,
            why=f"only with values on {datum.name} at the same temperature, here {values[0]:.7g} K",
        )
    if values:
        span = f"these run from {values[0]:.7g} to {values[-1]:.7g} K"
    else:
        span = "the temperatures of the terms are not given"
    return MaySum(
        streams=False,
        reaction=False,
        why=f"no: {datum.name} has another zero at each temperature, so all states must share one, and {span}; "
        "convert to elements-298K first",
    )
