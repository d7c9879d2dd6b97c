"""Formation enthalpies of the package that other sources convict: a slip of sign, or another species.

Only gross contradictions count, and only where two who do not copy one another agree against the entry. One of the two
may be a cycle: a gas from its liquid and the enthalpy of vaporisation at 298.15 K.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from typing import Final

from propdb.intake.package.contradictions import set_aside
from propdb.model.records import T_STANDARD, USABLE_STATUSES, Entry

__all__ = ["contradiction", "quarantine_enthalpies"]

#: Two witnesses agree within this [J/mol].
_AGREE: Final = 10_000.0
#: What is further than this from them is no measurement of the same substance [J/mol].
_GROSS: Final = 25_000.0
#: A number with the wrong sign is the right one otherwise [J/mol].
_SAME: Final = 2_000.0
#: These mix in estimates and copies, and bear no witness.
_SILENT: Final = ("yaws-2014", "trc-1994")
#: Sources that are convicted by any two. Evaluated ones may know better than those who copy one another, and need the
#: cycle, or a typed entry, or the wrong sign, against them.
_COMPILATIONS: Final = ("albahri-2013", "crc-95")
#: What a network of measurements says may overthrow all that older tables agree on; a cycle is a measurement too.
_NETWORKS: Final = ("atct-1.112",)
#: Of the nine gases where these two differ by more than 15 kJ/mol and a third source decides, the first is off in all.
_WORSE, _BETTER = "albahri-2013", "yaws-2014"


def contradiction(entry: Entry, others: Sequence[tuple[str, float]], *, strong: Iterable[str] = ()) -> str:
    """Why the value cannot be right; "" where nobody convicts it.

    Parameters
    ----------
    entry : Entry
        A formation enthalpy at 298.15 K [J/mol].
    others : sequence of (str, float)
        Who else says what of the same state [J/mol].
    strong : iterable of str
        Those of ``others`` who count against an evaluated source: typed ones, and cycles.
    """
    value = entry.value
    if value is None:
        return ""
    if any(abs(other - value) <= _GROSS for _, other in others):
        return ""
    pairs = [
        (a, b) for i, a in enumerate(others) for b in others[i + 1 :] if a[0] != b[0] and abs(a[1] - b[1]) <= _AGREE
    ]
    known = set(strong)
    for pair in sorted(pairs, key=lambda pair: not any(name in known for name, _ in pair)):
        mirrored = any(abs(other + value) <= _SAME for _, other in pair)
        if mirrored or entry.source in _COMPILATIONS or any(name in known for name, _ in pair):
            said = ", ".join(f"{name} {other / 1e3:.6g} kJ/mol" for name, other in pair)
            return f"{'the sign is wrong' if mirrored else 'contradicted'}: {said}"
    for name, other in others:
        if entry.source in _COMPILATIONS and name not in _COMPILATIONS and abs(other + value) <= _SAME:
            return f"the sign is wrong: {name} {other / 1e3:.6g} kJ/mol"
    return ""


def quarantine_enthalpies(entries: list[Entry], seed: Iterable[Entry]) -> int:
    """Set aside, in place, formation enthalpies that the others convict. Returns how many were."""
    typed = list(seed)
    said: dict[tuple[str, str], dict[str, float]] = defaultdict(dict)
    vaporising: dict[str, float] = {}
    for e in (*typed, *entries):
        if e.value is None or e.temperature != T_STANDARD or e.status not in USABLE_STATUSES:
            continue
        if e.quantity == "Hf" and e.source not in _SILENT and (e.phase != "cr" or not e.form):
            said[e.species, e.phase].setdefault(e.source, e.value)
        elif e.quantity == "Hvap" and "monomer" not in e.conditions:
            vaporising.setdefault(e.species, e.value)
    curated: dict[tuple[str, str], set[str]] = defaultdict(set)
    for e in typed:
        curated[e.species, e.phase].add(e.source)
    better = {e.species: e.value for e in entries if e.source == _BETTER and e.quantity == "Hf" and e.phase == "g"}
    count = 0
    for place, entry in enumerate(entries):
        if entry.quantity != "Hf" or entry.temperature != T_STANDARD or entry.status not in USABLE_STATUSES:
            continue
        if entry.phase == "cr" and entry.form:
            continue
        others, strong = _witnesses(entry, said, vaporising)
        if entry.source not in _NETWORKS:
            strong |= curated[entry.species, entry.phase]
        reason = contradiction(entry, others, strong=strong)
        rival = better.get(entry.species) if entry.source == _WORSE and not others else None
        if not reason and rival is not None and abs((entry.value or 0.0) - rival) > _GROSS:
            reason = f"{_BETTER} has {rival / 1e3:.6g} kJ/mol; where a third source decides, it is nearer"
        if reason:
            entries[place] = set_aside(entry, reason)
            count += 1
    return count


def _witnesses(
    entry: Entry, said: Mapping[tuple[str, str], Mapping[str, float]], vaporising: Mapping[str, float]
) -> tuple[list[tuple[str, float]], set[str]]:
    others = [(s, v) for s, v in said.get((entry.species, entry.phase), {}).items() if s != entry.source]
    latent = vaporising.get(entry.species)
    cycles: set[str] = set()
    liquid, gas = said.get((entry.species, "l"), {}), said.get((entry.species, "g"), {})
    for source in liquid.keys() & gas.keys() if latent is not None else ():
        if latent is not None and abs(gas[source] - liquid[source] - latent) > _GROSS:
            latent = None  # the vapour of this liquid is made of other molecules, as that of phosphorus is
    if latent is not None and entry.phase in ("g", "l"):
        other, sign = ("l", 1.0) if entry.phase == "g" else ("g", -1.0)
        for source, value in said.get((entry.species, other), {}).items():
            if source != entry.source:
                name = f"{source} ({other} and vaporisation)"
                others.append((name, value + sign * latent))
                cycles.add(name)
    return others, cycles
