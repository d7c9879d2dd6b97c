"""What states a species can have: its constants, phases and forms, and what a datum's symbolic state means for it."""

from __future__ import annotations

from dataclasses import replace

from propdb.errors import Ambiguous, NoData, NoSuchState, NotFound
from propdb.levels.curves import Critical
from propdb.levels.edges import ROOT, Node
from propdb.levels.policy import Data, Policy, choose
from propdb.levels.tree import SpeciesTree
from propdb.model.records import BOILING, SAME_T, T_STANDARD, Entry, Species, State, ZeroState

__all__ = ["INTERNAL", "States"]

#: The datum whose zero states are the zero of the internal scale.
INTERNAL = "elements-298K"
#: The datum that says which form of an element is its reference form at each temperature.
FORMS = "elements-same-T"

#: A liquid is taken to exist down to this much below its melting point: tables differ by that.
MELTING_SLACK = 0.05


class States:
    """The part of :class:`~propdb.levels.engine.Levels` that decides whether a state can exist.

    Parameters
    ----------
    data : Data
        Species, entries, sources, datums and policy.
    policy : Policy
        Ranks, class defaults, pinned sources.
    extrapolate : bool
        Allow phases where they are not stable.
    """

    def __init__(self, data: Data, policy: Policy, *, extrapolate: bool = False) -> None:
        self.data = data
        self.policy = policy
        self.extrapolate = extrapolate
        self._points: dict[tuple[str, str], Entry | None] = {}

    def tree(self, species: str) -> SpeciesTree:
        """The tree of a species."""
        raise NotImplementedError

    # -- constants of a species -----------------------------------------------------------------------------------

    def point(self, species: str, quantity: str) -> Entry | None:
        """Best usable entry of a single-valued quantity (Tb, Tm, Tc, Pc, omega), or None."""
        key = (species, quantity)
        if key not in self._points:
            found = choose((e for e in self.data.entries(species) if e.quantity == quantity), self.policy)
            self._points[key] = found[0] if found else None
        return self._points[key]

    def value(self, species: str, quantity: str) -> float | None:
        """Its value in SI, or None."""
        entry = self.point(species, quantity)
        return None if entry is None else entry.value

    def critical(self, species: str) -> Critical | None:
        """Critical constants and acentric factor, where all three are known."""
        found = [self.point(species, q) for q in ("Tc", "Pc", "omega")]
        if any(e is None or e.value is None for e in found):
            return None
        entries = [e for e in found if e is not None]
        tc, pc, omega = (float(e.value) for e in entries if e.value is not None)
        return Critical(tc, pc, omega, tuple(e.id for e in entries), entries[0].source)

    def boiling(self, species: str) -> float | None:
        """Normal boiling point [K]; None where it is not known or the species sublimes."""
        entry = self.point(species, "Tb")
        return entry.value if entry is not None and entry.phase != "cr" else None

    def zero_nodes(self, record: Species) -> list[Node]:
        """Nodes of this species that have level 0 by definition: it is an element in its reference form."""
        nodes = []
        for stages in self.data.datum(INTERNAL).schedule.values():
            z = stages[0][1]
            if z.species == record.name:
                nodes.append(Node(z.phase, z.form, T_STANDARD))
        return nodes

    def reference_until(self, record: Species, phase: str) -> float:
        """Up to which temperature [K] a phase of this species is the reference form of its element; 0 if it is none."""
        try:
            schedule = self.data.datum(FORMS).schedule
        except (NotFound, KeyError):
            return 0.0
        ends = [
            end for stages in schedule.values() for end, z in stages if (z.species, z.phase) == (record.name, phase)
        ]
        return max(ends, default=0.0)

    # -- states ---------------------------------------------------------------------------------------------------

    def forms(self, species: str, phase: str) -> list[str]:
        """Forms of a phase that the data know."""
        tree = self.tree(species)
        known = {n.form for n in tree.nodes if n.phase == phase} | {f for p, f in tree.tracks if p == phase}
        return sorted(known)

    def phases(self, species: str) -> list[str]:
        """Phases that the data know, with forms in brackets."""
        tree = self.tree(species)
        pairs = {(n.phase, n.form) for n in tree.nodes if n != ROOT} | set(tree.tracks)
        return [f"{p} ({f})" if f else p for p, f in sorted(pairs)]

    def check(self, species: str, state: State) -> State:
        """The state with its form filled in, or an error that says why it cannot exist.

        Raises
        ------
        NotFound
            The data know no such phase or form.
        Ambiguous
            Several forms, none named.
        NoSuchState
            A liquid above its critical point or below its melting point, a crystal above it.
        """
        if state.phase == "fluid":
            return state
        forms = self.forms(species, state.phase)
        if not forms:
            known = [p for p in self.phases(species) if not p.startswith("fluid")]
            raise NotFound(
                f"no data for {species} as {state.phase}",
                hint=f"the store knows it as {', '.join(known) or 'nothing yet'}",
                phases=known,
            )
        if state.form not in forms:
            if state.form:
                raise NotFound(
                    f"no form {state.form!r} of {species} ({state.phase})",
                    hint=f"it has {', '.join(f or '(no form named)' for f in forms)}",
                    candidates=forms,
                )
            if len(forms) > 1:
                named = [f for f in forms if f]
                raise Ambiguous(
                    f"{species} has several forms as {state.phase}: {', '.join(named)}",
                    hint=f"name one, e.g. --form {named[0]}",
                    candidates=named,
                )
            state = replace(state, form=forms[0])
        t = state.temperature
        if t is not None:
            self._stable(species, state, t)
        return state

    def _stable(self, species: str, state: State, t: float) -> None:
        tc, tm = self.value(species, "Tc"), self.value(species, "Tm")
        if state.phase == "l" and tc is not None and t > tc:
            raise NoSuchState(
                f"{species} is no liquid at {t:.7g} K: its critical temperature is {tc:.7g} K",
                hint="use --phase g for the ideal gas, or --phase fluid with --pressure",
            )
        if tm is None or self.extrapolate:
            return
        if state.phase == "l" and t < tm - MELTING_SLACK:
            raise NoSuchState(
                f"{species} is solid at {t:.7g} K: it melts at {tm:.7g} K",
                hint="use --phase cr, or --extrapolate for the supercooled liquid",
            )

    def resolve(self, z: ZeroState, species: str, *, temperature: float | None = None) -> State:
        """A datum's symbolic state made definite for a species.

        Raises NoData where the boiling or melting point that decides it is missing, NoSuchState where it cannot exist.
        """
        t: float | None
        if z.temperature == SAME_T:
            t = temperature
        elif z.temperature == BOILING:
            t = self.boiling(species)
            if t is None:
                raise NoData(f"no boiling point of {species} in the store", hint="its zero on this datum needs one")
        else:
            t = float(z.temperature)
        if t is None:
            raise NoData("the datum has its zero at the temperature of the state", hint="give --temperature")
        phase, form = z.phase, z.form
        if phase == "stable":
            phase, form = self.stable_phase(species, t)
        saturated = z.saturated
        return State(phase, t, form, z.pressure, saturated)

    def stable_phase(self, species: str, t: float) -> tuple[str, str]:
        """Phase (and form) stable at a temperature [K] and 1 atm, by the melting and boiling points of the store."""
        tb = self.point(species, "Tb")
        if tb is not None and tb.value is not None and t >= tb.value:
            return "g", ""
        sublimes = tb is not None and tb.phase == "cr"
        tm = self.value(species, "Tm")
        if tb is None and tm is not None and t >= tm and self.forms(species, "l"):
            raise NoData(
                f"no boiling point of {species} in the store",
                hint=f"name the phase: e.g. own:l@{t:.7g}K or own:g@{t:.7g}K",
            )
        if tm is not None and t >= tm and not sublimes:
            return "l", ""
        if tm is not None or sublimes:
            forms = self.forms(species, "cr")
            zero_forms = [n.form for n in self.zero_nodes(self.data.species(species)) if n.phase == "cr"]
            if len(forms) == 1:
                return "cr", forms[0]
            if zero_forms:
                return "cr", zero_forms[0]
            if "" in forms and t == T_STANDARD:  # sources that name no form mean the one stable at 298.15 K
                named = [f for f in forms if f]
                return "cr", named[0] if len(named) == 1 else ""
            raise NoData(
                f"which crystal form of {species} is stable at {t:.7g} K is not stated in the store",
                hint=f"it knows {', '.join(f for f in forms if f) or 'no crystal'}; name one, e.g. own:cr:FORM@25C",
            )
        zeros = self.zero_nodes(self.data.species(species))
        if zeros and t == T_STANDARD:
            return zeros[0].phase, zeros[0].form
        raise NoData(
            f"which phase of {species} is stable at {t:.7g} K is not known: no melting or boiling point in the store",
            hint="name the phase: e.g. own:g@25C",
        )
