"""Tabulated enthalpies of a group's own: a source of levels where pinned, else compared with the composite curve."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from propdb.cp.tabulated import EnthalpyTable
from propdb.errors import NoData
from propdb.levels.edges import ROOT, Node, leg_edge
from propdb.levels.parts import Leg, add_parts, scale
from propdb.levels.policy import Policy, choose
from propdb.levels.tree import Move, SpeciesTree, expand
from propdb.model.records import T_STANDARD, Entry, Part, State, ZeroState

if TYPE_CHECKING:
    from propdb.levels.engine import Levels

__all__ = ["TABULATED", "Tabulated", "attach", "graft", "matches", "tables_of"]

#: The name under which a table of enthalpies is stored as an equation.
TABULATED = "tabulated"

#: Two pressures are one when they agree to this [1].
SAME_PRESSURE = 1e-6


@dataclass(frozen=True)
class Tabulated:
    """A track along one table. Positions are temperatures [K]."""

    entry: Entry
    table: EnthalpyTable
    policy: Policy = field(repr=False)

    @property
    def anchor(self) -> float:
        """The row nearest to 298.15 K [K]."""
        return min(self.table.temperatures, key=lambda t: abs(t - T_STANDARD))

    @property
    def node(self) -> Node:
        """The node of the anchor: of this table, and of no other."""
        return Node(self.entry.phase, self.entry.form, self.anchor, f"table {self.entry.id[:8]}")

    def text(self, temperature: float) -> str:
        """A state of the table, for a step."""
        return f"{_conditions(self.entry)}, {temperature:.7g} K"

    def legs(self, start: float, end: float) -> list[Leg]:
        """One leg: the difference of two interpolated rows."""
        if start == end:
            return []
        size, unit, stated = self.policy.standard(self.entry)
        value = self.table.h(end) - self.table.h(start)
        return [
            Leg(
                what="tabulated",
                species=self.entry.species,
                start=self.text(start),
                end=self.text(end),
                value=value,
                parts=(Part(self.entry.id, value if unit == "%" else 1.0, size, stated),),
                entry=self.entry.id,
                source=self.entry.source,
            )
        ]


def _conditions(entry: Entry) -> str:
    phase = f"{entry.phase} ({entry.form})" if entry.form else entry.phase
    return f"{phase}, {entry.conditions}" if entry.conditions else phase


def tables_of(entries: Iterable[Entry], policy: Policy, *, pinned: bool) -> list[Tabulated]:
    """Usable tables of enthalpies among entries, best first: those of pinned sources, or the others."""
    found = [e for e in choose(entries, policy) if e.quantity == "H" and (e.source in policy.pinned) == pinned]
    return [Tabulated(e, EnthalpyTable.from_params(e.params), policy) for e in found]


def matches(entry: Entry, state: State) -> bool:
    """Does a table hold states like this one? Phase, form, and for the real fluid pressure or saturation."""
    if entry.phase != state.phase or (state.form and state.form != entry.form):
        return False
    saturated, pressure = entry.params.get("saturated", ""), entry.params.get("pressure")
    if state.phase != "fluid":
        return True
    if saturated or state.saturated:
        return bool(saturated == state.saturated)
    return (
        pressure is not None
        and state.pressure is not None
        and abs(pressure - state.pressure) <= SAME_PRESSURE * pressure
    )


def attach(tables: Sequence[Tabulated], state: State) -> tuple[Node, list[Move]] | None:
    """The anchor of a pinned table that holds the state, and the move from it; None where no table does."""
    t = state.temperature
    if t is None:
        return None
    for track in tables:
        if matches(track.entry, state) and track.table.tmin <= t <= track.table.tmax:
            return track.node, [Move(track=track, start=track.anchor, end=t)]
    return None


def graft(levels: Levels, tree: SpeciesTree, track: Tabulated) -> None:
    """Tie a table to the tree of its species by the zero of its datum. It becomes a leaf, so the tree stays one.

    The leg is h(anchor) less h0 of the datum, from what the datum calls zero.
    """
    entry = track.entry
    datum = levels.data.datum(entry.datum)
    species = levels.data.species(entry.species)
    z = levels.zero_of(datum, species, phase=entry.phase, temperature=track.anchor)
    value = track.table.h(track.anchor) - levels.offset(z, species, temperature=track.anchor)
    parts: list[Part] = []
    start = ROOT
    if len(z.terms) == 1 and z.terms[0].species == species.name:
        state = levels.check(species.name, levels.resolve(z.terms[0].zero, species.name, temperature=track.anchor))
        start, moves = levels.attach(species.name, state)
        legs = expand(moves)
        value += sum(leg.value for leg in legs)
        parts += [p for leg in legs for p in leg.parts]
    else:
        for term in z.terms:
            state = _definite(levels, term.zero, term.species, track.anchor)
            for leg in levels.level(term.species, state):
                scaled = scale(leg, float(term.coefficient))
                value += scaled.value
                parts += scaled.parts
    if start not in tree.nodes and start != ROOT:
        raise NoData(f"the zero of {datum.name} is no state that the store knows of {species.name}")
    size, unit, stated = levels.policy.standard(entry)
    parts.append(Part(entry.id, value if unit == "%" else 1.0, size, stated))
    leg = Leg(
        what="tabulated",
        species=species.name,
        start=start.text(),
        end=track.text(track.anchor),
        value=value,
        parts=add_parts(parts),
        entry=entry.id,
        source=entry.source,
        note=f"own table on {datum.name}",
    )
    tree.graft(leg_edge(leg, start, track.node, "tabulated"))


def _definite(levels: Levels, zero: ZeroState, species: str, temperature: float) -> State:
    return levels.check(species, levels.resolve(zero, species, temperature=temperature))
