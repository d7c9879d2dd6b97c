"""The spanning tree over a species' anchor nodes: it gives each state exactly one level.

The tree is Kruskal's minimum spanning forest on the edge ranking of :mod:`propdb.levels.edges`. Levels of two states
are differences of sums along it, so A to B to C equals A to C by construction. Edges left out are closures.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from typing import Any

from propdb.levels.curves import Track
from propdb.levels.edges import ROOT, Edge, Node, heating_edges
from propdb.levels.parts import Leg, scale

__all__ = ["Move", "SpeciesTree", "expand", "join"]


@dataclass(frozen=True, slots=True)
class Move:
    """One move on the way: across an edge of the tree, or along a track between two of its positions."""

    edge: Edge | None = None
    forward: bool = True
    track: Track | None = None
    start: Any = None
    end: Any = None

    def reversed(self) -> Move:
        return Move(self.edge, not self.forward, self.track, self.end, self.start)

    def legs(self) -> list[Leg]:
        if self.track is not None:
            return self.track.legs(self.start, self.end)
        assert self.edge is not None
        return [self.edge.leg if self.forward else scale(self.edge.leg, -1.0)]


def join(moves: Iterable[Move]) -> list[Move]:
    """Shorten a way: opposite moves cancel, moves along one track merge."""
    way: list[Move] = []
    for move in moves:
        last = way[-1] if way else None
        if last is not None and move.track is not None and last.track is move.track:
            way.pop()
            if last.start != move.end:
                way.append(Move(track=move.track, start=last.start, end=move.end))
        elif last is not None and move.edge is not None and last.edge is move.edge and last.forward != move.forward:
            way.pop()
        elif move.track is None or move.start != move.end:
            way.append(move)
    return way


def expand(moves: Iterable[Move]) -> list[Leg]:
    """The legs of a way."""
    return [leg for move in moves for leg in move.legs()]


@dataclass
class SpeciesTree:
    """Nodes, tree and closures of one species. Built once per species, policy and extrapolation."""

    nodes: set[Node] = field(default_factory=set)
    links: dict[Node, list[tuple[Node, Edge, bool]]] = field(default_factory=dict)
    unused: list[Edge] = field(default_factory=list)
    component: dict[Node, int] = field(default_factory=dict)
    tracks: dict[tuple[str, str], Track] = field(default_factory=dict)
    position: Callable[[Node], Any] = lambda node: node.temperature

    def grow(self, edges: list[Edge], *, extrapolate: bool) -> None:
        """Take the best edges until every node that can be reached is."""
        for edge in edges:
            self.nodes.update((edge.start, edge.end))
        for (phase, form), track in self.tracks.items():
            chain = [n for n in self.nodes if (n.phase, n.form) == (phase, form) and not n.saturated]
            edges = edges + heating_edges(chain, track, extrapolate, self.position)  # type: ignore[arg-type]
        group = {node: node for node in self.nodes}

        def find(node: Node) -> Node:
            while group[node] is not node:
                group[node] = group[group[node]]
                node = group[node]
            return node

        for edge in self._one_per_pair(edges):
            a, b = find(edge.start), find(edge.end)
            if a is b:
                self.unused.append(edge)
                continue
            group[a] = b
            self.links.setdefault(edge.start, []).append((edge.end, edge, True))
            self.links.setdefault(edge.end, []).append((edge.start, edge, False))
        self._walk()

    def graft(self, edge: Edge) -> None:
        """Add a leaf: one edge to a node that is not in the tree yet."""
        for node in (edge.start, edge.end):
            if node not in self.component:
                self.nodes.add(node)
                self.component[node] = max(self.component.values(), default=-1) + 1
        self.component[edge.end] = self.component[edge.start]
        self.links.setdefault(edge.start, []).append((edge.end, edge, True))
        self.links.setdefault(edge.end, []).append((edge.start, edge, False))

    def _one_per_pair(self, edges: list[Edge]) -> list[Edge]:
        """Among entries for one quantity between the same two nodes the chosen one leads; the rest are closures."""
        seen: set[tuple[Node, Node, str]] = set()
        winners: list[Edge] = []
        losers: list[Edge] = []
        for edge in edges:  # entries come best first
            pair = (edge.start, edge.end, edge.what)
            (losers if pair in seen else winners).append(edge)
            seen.add(pair)
        return sorted(winners, key=Edge.key) + losers

    def _walk(self) -> None:
        order = sorted(self.nodes, key=lambda n: (n != ROOT, n))
        for number, root in enumerate(order):
            if root in self.component:
                continue
            self.component[root] = number
            queue = deque([root])
            while queue:
                node = queue.popleft()
                for other, _, _ in self.links.get(node, ()):
                    if other not in self.component:
                        self.component[other] = number
                        queue.append(other)

    def rooted(self, node: Node) -> bool:
        """Is the node tied to the elements?"""
        return ROOT in self.component and self.component.get(node) == self.component[ROOT]

    def way(self, start: Node, end: Node) -> list[Move] | None:
        """The way through the tree between two nodes; None where they are not connected."""
        if start == end:
            return []
        if start not in self.component or self.component.get(start) != self.component.get(end):
            return None
        came: dict[Node, tuple[Node, Edge, bool]] = {}
        queue = deque([start])
        while queue:
            node = queue.popleft()
            if node == end:
                break
            for other, edge, forward in self.links.get(node, ()):
                if other not in came and other != start:
                    came[other] = (node, edge, forward)
                    queue.append(other)
        moves: list[Move] = []
        node = end
        while node != start:
            previous, edge, forward = came[node]
            moves.append(self._move(previous, node, edge, forward))
            node = previous
        return list(reversed(moves))

    def _move(self, start: Node, end: Node, edge: Edge, forward: bool) -> Move:
        if edge.kind == "heating":
            track = self.tracks[(start.phase, start.form)]
            return Move(track=track, start=self.position(start), end=self.position(end))
        return Move(edge=edge, forward=forward)

    def anchor(self, phase: str, form: str, temperature: float) -> Node | None:
        """The node from which a track of this phase and form is measured: 298.15 K if it is one, else the nearest.

        The same for every temperature, so that each state has one level. Nodes tied to the elements come first.
        """
        track = self.tracks.get((phase, form))
        chain = [n for n in self.nodes if (n.phase, n.form) == (phase, form) and not n.saturated]
        if not chain:
            return None
        covers = getattr(track, "covers", None)
        reachable = [n for n in chain if covers is None or covers(n.temperature, temperature)] or chain
        return min(reachable, key=lambda n: (not self.rooted(n), abs(n.temperature - 298.15), n))
