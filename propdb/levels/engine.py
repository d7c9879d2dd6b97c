"""The level of a state, the difference of two, and what a datum calls zero.

``Levels`` holds one tree per species for one store, policy and choice of extrapolation.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import replace
from fractions import Fraction

from propdb.datum import may_sum, zero
from propdb.errors import (
    DatumError,
    NoData,
    NoSuchState,
    PropdbError,
    TemperatureOutOfRange,
)
from propdb.levels import residual, water
from propdb.levels.curves import Curve, Formulation, build_curve, range_text
from propdb.levels.edges import ROOT, Edge, Node, collect, leg_edge
from propdb.levels.parts import Leg, add_parts, scale
from propdb.levels.policy import Data, Policy, choose
from propdb.levels.states import INTERNAL, States
from propdb.levels.tables import Tabulated, attach, graft, tables_of
from propdb.levels.tree import Move, SpeciesTree, expand, join
from propdb.model.records import (
    T_STANDARD,
    Datum,
    Entry,
    Part,
    Source,
    Species,
    State,
    Zero,
)

__all__ = ["INTERNAL", "Levels", "Way", "may_sum"]

#: Compounds of these evaporate as the molecules of their formula.
NONMETALS = frozenset(("H", "D", "B", "C", "N", "O", "F", "Si", "P", "S", "Cl", "Se", "Br", "I"))

Way = list[tuple[float, str, list[Move]]]  # (coefficient, species, moves)


def passes(moves: Iterable[Move]) -> frozenset[int]:
    """The edges and curves that a way goes along, by their ids: what two ways have in common."""
    return frozenset(id(x) for m in moves for x in (m.edge, m.track) if x is not None)


class Levels(States):
    """Levels of every species of a store. Not thread-safe; build one per thread.

    Parameters
    ----------
    data : Data
        Species, entries, sources, datums and policy.
    policy : Policy
        Ranks, class defaults, pinned sources.
    extrapolate : bool
        Allow heat capacities beyond their ranges, and phases where they are not stable; marked in each leg.
    """

    def __init__(self, data: Data, policy: Policy, *, extrapolate: bool = False) -> None:
        super().__init__(data, policy, extrapolate=extrapolate)
        self._trees: dict[str, SpeciesTree] = {}
        self._tables: dict[str, list[Tabulated]] = {}
        self._loops: dict[int, frozenset[int] | None] = {}
        self._errors: dict[int, tuple[float, list[Part]] | None] = {}

    # -- trees ----------------------------------------------------------------------------------------------------

    def tree(self, species: str) -> SpeciesTree:
        """The tree of a species, built once."""
        if species not in self._trees:
            tree = self._trees[species] = self._build(species)
            pinned = tables_of(self.data.entries(species), self.policy, pinned=True)
            for track in pinned:
                graft(self, tree, track)
            self._tables[species] = pinned
        return self._trees[species]

    def _build(self, species: str) -> SpeciesTree:
        record = self.data.species(species)
        entries = self.data.entries(species)
        boiling, critical = self.boiling(species), self.critical(species)
        # The reference form of an element is its liquid at 1 bar, also where that boils: no pressure along saturation.
        followed = boiling if self.reference_until(record, "l") <= (boiling or 0.0) else None
        found = [e for e in choose(entries, self.policy) if e.quantity == "Cp" and e.equation == "iapws95"]
        formulation = Formulation(species, found[0], self.policy) if found else None
        tree = SpeciesTree()
        for phase, form in sorted({(e.phase, e.form) for e in entries if e.quantity == "Cp"}):
            if phase == "fluid" or (phase == "l" and formulation is not None):
                continue
            mine = [e for e in entries if e.quantity == "Cp" and (e.phase, e.form) == (phase, form)]
            curve = build_curve(
                species,
                phase,
                form,
                mine,
                self.policy,
                extrapolate=self.extrapolate,
                boiling=followed if phase == "l" else None,
                critical=critical if phase == "l" else None,
                transitions=self._transitions(entries, phase, form),
                changes=self._changes(species, entries, phase),
            )
            if curve is not None:
                tree.tracks[(phase, form)] = curve
        if formulation is not None:
            tree.tracks[("l", "")] = formulation
            tree.position = lambda node: State("l", node.temperature) if node.phase == "l" else node.temperature
        liquid = tree.tracks.get(("l", ""))
        edges = collect(
            species=species,
            entries=entries,
            policy=self.policy,
            zero_nodes=self.zero_nodes(record),
            foreign_zero=self._foreign_zero(record),
            boiling=boiling,
            melting=self.value(species, "Tm"),
            critical=critical,
            vapour=record.vapour,
            formulation=formulation,
            liquid=liquid.ranges() if isinstance(liquid, Curve) else (),
            tc=self.value(species, "Tc"),
            molecular=len(record.composition) > 1 and all(symbol in NONMETALS for symbol, _ in record.composition),
        )
        tree.grow(edges, extrapolate=self.extrapolate)
        return tree

    def _changes(self, species: str, entries: Sequence[Entry], phase: str) -> list[float]:
        """Temperatures [K] at which this phase melts, boils or passes into another form."""
        quantities = {"cr": ("Hfus", "Htr", "Tm"), "l": ("Hfus", "Tm", "Tb", "Hvap")}.get(phase, ())
        found = [
            e.value if e.quantity in ("Tm", "Tb") else e.temperature
            for e in choose(entries, self.policy)
            if e.quantity in quantities and (e.quantity != "Hvap" or e.temperature != T_STANDARD)
        ]
        return [t for t in found if t is not None]

    def _transitions(self, entries: Sequence[Entry], phase: str, form: str) -> list[Entry]:
        """Entries that may state the enthalpy of a split in a table of this phase and form, best first.

        A crystal's table goes through its forms; a table of one named form through transitions of that form within
        itself only, and a liquid's through its glass step.
        """
        return [
            e
            for e in choose(entries, self.policy)
            if e.quantity == "Htr"
            and (
                (phase == "cr" and e.phase == "cr" and e.to.partition(":")[0] == "cr" and form in ("", e.form))
                or (phase == "l" and e.phase == "am" and e.to.partition(":")[0] == "l")
                or (phase == "l" and e.phase == "l" and e.to.partition(":")[0] == "l")
            )
        ]

    def _foreign_zero(self, record: Species) -> Callable[[Entry, Node], tuple[float, tuple[Part, ...]]]:
        def shift(entry: Entry, node: Node) -> tuple[float, tuple[Part, ...]]:
            if entry.datum in ("", INTERNAL):
                return 0.0, ()
            z = self.zero_of(self.data.datum(entry.datum), record, phase=node.phase, temperature=node.temperature)
            internal = {(n.phase, n.form, n.temperature) for n in self.zero_nodes(record)}
            total = 0.0
            parts: list[Part] = []
            for term in z.terms:
                state = self.resolve(term.zero, term.species, temperature=node.temperature)
                if term.species == record.name and (state.phase, state.form, state.temperature) not in internal:
                    raise DatumError(f"the zero of {entry.datum} would be measured by itself")
                for leg in self.level(term.species, state):
                    total += float(term.coefficient) * leg.value
                    parts += scale(leg, float(term.coefficient)).parts
            return total, add_parts(parts)

        return shift

    # -- ways -----------------------------------------------------------------------------------------------------

    def attach(self, species: str, state: State) -> tuple[Node, list[Move]]:
        """The anchor node of a state, and the moves from it to the state.

        Raises
        ------
        TemperatureOutOfRange
            Outside every range; names the ranges.
        NoData
            No entry leads to this phase.
        """
        tree = self.tree(species)
        tabulated = attach(self._tables.get(species, ()), state)
        if tabulated is not None:
            return tabulated
        formulation = tree.tracks.get(("l", ""))
        if isinstance(formulation, Formulation) and state.phase in ("l", "fluid"):
            start = State("l", T_STANDARD)
            return Node("l", "", T_STANDARD), [Move(track=formulation, start=start, end=state)]
        if state.phase == "fluid":
            return self._attach_fluid(species, state)
        t = state.temperature
        if t is None:
            raise NoData(f"the temperature of {species} is missing", hint="give --temperature")
        node = Node(state.phase, state.form, t)
        track = tree.tracks.get((state.phase, state.form))
        anchor = tree.anchor(state.phase, state.form, t)
        if track is None or anchor is None:
            if node in tree.nodes:
                return node, []
            if anchor is None:
                raise NoData(
                    f"no entry ties {species} as {state.phase} to anything else",
                    hint="it needs a formation enthalpy, a latent heat or an increment to 0 K",
                )
            raise TemperatureOutOfRange(
                f"{species}, {state.phase}: no heat capacity in the store, so {t:.7g} K cannot be reached",
                hint=f"known at {', '.join(f'{x:.7g} K' for x in self._temperatures(tree, state))} only",
                ranges=[],
            )
        if isinstance(track, Curve) and not track.covers(t, anchor.temperature):
            if node in tree.nodes:
                return node, []
            low, high = sorted((t, anchor.temperature))
            unknown = next((split for split in track.between(low, high) if split.stated is None), None)
            if unknown is not None:
                raise track.split_error(unknown.temperature)
            if not track.extrapolate:
                if not track.covers(t):
                    raise track.out_of_range(t)
                raise TemperatureOutOfRange(
                    f"{species}, {state.phase}: {t:.7g} K lies in a range that no anchor reaches",
                    hint=f"the heat capacity covers {range_text(track.ranges())}, the anchor is at "
                    f"{anchor.temperature:.7g} K; --extrapolate bridges the gap, and marks it",
                    ranges=track.ranges(),
                )
        return anchor, [Move(track=track, start=anchor.temperature, end=t)]

    @staticmethod
    def _temperatures(tree: SpeciesTree, state: State) -> list[float]:
        return sorted(n.temperature for n in tree.nodes if (n.phase, n.form) == (state.phase, state.form))

    def _attach_fluid(self, species: str, state: State) -> tuple[Node, list[Move]]:
        """The real fluid of a species without a formulation: ideal gas plus the residual by an equation of state."""
        critical = self.critical(species)
        if critical is None:
            missing = [q for q in ("Tc", "Pc", "omega") if self.value(species, q) is None]
            raise NoData(
                f"the real fluid of {species} needs {', '.join(missing)}, which the store does not hold",
                hint="use --phase g for the ideal gas",
            )
        if self.data.species(species).vapour == "associating":
            raise NoData(
                f"the vapour of {species} associates, and no cubic equation of state describes that",
                hint="use --phase g for the monomer ideal gas",
            )
        c, t, p = critical, state.temperature, state.pressure
        if t is None:
            if p is None:
                raise NoSuchState(f"the real fluid of {species} needs a temperature or a pressure", hint="give one")
            t = residual.saturation_temperature(pressure=p, tc=c.tc, pc=c.pc, omega=c.omega)
        if state.saturated == "liquid":
            return self.attach(species, State("l", t))
        if not state.saturated and p is None:
            raise NoSuchState(
                f"the real fluid of {species} needs a pressure", hint="give --pressure, or --saturated liquid|vapour"
            )
        value, p_used, root = residual.enthalpy(
            temperature=t,
            pressure=None if state.saturated else p,
            tc=c.tc,
            pc=c.pc,
            omega=c.omega,
            root="vapour" if state.saturated else "stable",
        )
        if root == "liquid":
            return self.attach(species, State("l", t, pressure=p))
        node, moves = self.attach(species, State("g", t))
        shown = replace(state, temperature=t, pressure=p_used)
        kind = self.data.species(species).vapour
        size = residual.standard(value, vapour=kind) / max(abs(value), 1e-9)
        part = Part(f"model:residual:{species}", value, size, True)
        leg = Leg(
            what="residual enthalpy",
            species=species,
            start=f"g, {t:.7g} K",
            end=shown.text(),
            value=value,
            parts=(part,),
            source=c.source,
            note=residual.note(kind),
        )
        edge = leg_edge(leg, Node("g", "", t), Node("fluid", "", t, "vapour"), "residual")
        return node, [*moves, Move(edge=edge)]

    def way(self, species: str, start: State, end: State) -> list[Move]:
        """The way from one state of a species to another, shortened.

        Raises NoData where nothing connects them.
        """
        node_a, moves_a = self.attach(species, start)
        node_b, moves_b = self.attach(species, end)
        between = self.tree(species).way(node_a, node_b)
        if between is None:
            raise NoData(
                f"nothing in the store connects {species} {node_a.text()} with {node_b.text()}",
                hint=self._what_would_connect(node_a, node_b),
            )
        return join([*(m.reversed() for m in reversed(moves_a)), *between, *moves_b])

    @staticmethod
    def _what_would_connect(a: Node, b: Node) -> str:
        pair = {a.phase, b.phase}
        need = {
            frozenset(("l", "g")): "a latent heat (Hvap) or Hf of both phases",
            frozenset(("cr", "l")): "an enthalpy of fusion (Hfus) or Hf of both phases",
            frozenset(("cr", "g")): "an enthalpy of sublimation (Hsub), Hfus with Hvap, or Hf of both phases",
        }.get(frozenset(pair), "a formation enthalpy or a heat capacity that spans both")
        return f"it needs {need}"

    def level_way(self, species: str, state: State) -> list[Move]:
        """The way from the elements at 298.15 K to a state.

        Raises NoData, naming the missing formation enthalpy, where the species is not tied to the elements.
        """
        node, moves = self.attach(species, state)
        between = self.tree(species).way(ROOT, node) if ROOT in self.tree(species).nodes else None
        if between is None:
            raise NoData(
                f"no formation enthalpy of {species} in the store",
                hint="elements and basis datums need one; an own-state datum such as gas-25C or own:l@25C does not",
                species=species,
                quantity="Hf",
            )
        return join([*between, *moves])

    def level(self, species: str, state: State) -> list[Leg]:
        """Legs from the elements at 298.15 K to a state; their sum is its level [J/mol]."""
        return expand(self.level_way(species, state))

    # -- datums ---------------------------------------------------------------------------------------------------

    def zero_of(self, datum: Datum, species: Species, *, phase: str, temperature: float | None) -> Zero:
        """What a datum calls zero for a species (see :func:`propdb.datum.zero`)."""
        return zero(datum, species, phase=phase, composition=self._composition, temperature=temperature)

    def _composition(self, name: str) -> tuple[Mapping[str, int | Fraction], int]:
        record = self.data.species(name)
        return dict(record.composition), record.charge

    def source(self, key: str) -> Source:
        return self.data.source(key)

    def offset(self, z: Zero, species: Species, *, temperature: float | None) -> float:
        """h0 of a zero in J/mol, with p v where the convention fixes the internal energy."""
        h0 = z.h0 * (species.molar_mass if z.h0_unit == "J/kg" else 1.0)
        if not z.internal_energy:
            return h0
        state = self.resolve(z.terms[0].zero, species.name, temperature=temperature)
        track = self.tree(species.name).tracks.get(("l", ""))
        if not isinstance(track, Formulation) or state.temperature is None or not state.saturated:
            raise NoData(
                f"this datum fixes the internal energy of {species.name}, and its molar volume is not known",
                hint="use a datum that fixes the enthalpy, e.g. own:l@0C",
            )
        kind = "liquid" if state.saturated == "liquid" else "vapour"
        p = water.saturation(temperature=state.temperature)[0]
        return h0 + p * water.volume(temperature=state.temperature, saturated=kind)  # type: ignore[arg-type]

    def closures_of(self, species: str) -> list[Edge]:
        """Edges that the tree of a species does not use."""
        return self.tree(species).unused

    def loop(self, species: str, edge: Edge) -> frozenset[int] | None:
        """What the tree passes between the ends of an unused edge (:func:`passes`); None where they are not joined."""
        if id(edge) not in self._loops:
            moves = self.tree(species).way(edge.start, edge.end)
            self._loops[id(edge)] = None if moves is None else passes(moves)
        return self._loops[id(edge)]

    def closure_error(self, species: str, edge: Edge) -> tuple[float, list[Part]] | None:
        """What an unused edge says less what the tree says [J/mol], with the sensitivities of both."""
        if id(edge) not in self._errors:
            self._errors[id(edge)] = self._closure_error(species, edge)
        return self._errors[id(edge)]

    def _closure_error(self, species: str, edge: Edge) -> tuple[float, list[Part]] | None:
        moves = self.tree(species).way(edge.start, edge.end)
        if moves is None:
            return None
        try:
            legs = expand(moves)
        except PropdbError:
            return None
        parts = list(edge.leg.parts) + [p for leg in legs for p in scale(leg, -1.0).parts]
        return edge.leg.value - sum(leg.value for leg in legs), parts
