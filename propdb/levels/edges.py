"""Anchor nodes of one species, and the edges that its entries draw between them."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, replace
from math import hypot, log
from typing import NamedTuple

from propdb.errors import PropdbError
from propdb.levels import residual
from propdb.levels.curves import Critical, Curve, Formulation, celsius
from propdb.levels.parts import Leg, add_parts, ranking_uncertainty
from propdb.levels.policy import Policy, choose
from propdb.model.records import T_STANDARD, USABLE_STATUSES, Entry, Part, State

__all__ = ["ROOT", "Edge", "Node", "collect", "heating_edges", "leg_edge", "vapour_of"]


class Node(NamedTuple):
    """A state that entries refer to.

    ``saturated`` is "vapour" for the real vapour (phase ``fluid``), the name of a table for its anchor, else "".
    """

    phase: str
    form: str
    temperature: float
    saturated: str = ""

    def text(self) -> str:
        if self == ROOT:
            return "elements at 298.15 K"
        phase = f"{self.phase} ({self.form})" if self.form else self.phase
        if self.saturated == "vapour":
            phase = "saturated vapour"
        return f"{phase}, {celsius(self.temperature)}"


#: The elements in their reference forms at 298.15 K, 1 bar: zero of the internal scale.
ROOT = Node("elements", "", T_STANDARD)

_PHASE_ORDER = ("elements", "cr", "am", "l", "fluid", "g", "aq")


@dataclass(eq=False, slots=True)
class Edge:
    """H(end) - H(start), with the leg that says it.

    ``source`` is the leg, or a function that makes it when it is first walked: an equation of state is not loaded for a
    path that does not need it. ``size`` is the standard uncertainty for ranking [J/mol].
    """

    start: Node
    end: Node
    source: Leg | Callable[[], Leg]
    kind: str  # definition | heating | formation | transition | increment | residual | formulation
    size: float = 0.0
    status: int = 0  # Entry.place
    pin: int = 0
    rank: int = 0
    what: str = ""
    extrapolated: bool = False
    entry: str = ""

    @property
    def leg(self) -> Leg:
        """The leg, made on first use."""
        if not isinstance(self.source, Leg):
            self.source = self.source()
        return self.source

    def key(self) -> tuple[object, ...]:
        """Best first. Heating over a covered range and water's formulation always lead, so that a level is continuous.

        Then pinned sources, status, and the variance (class defaults where none is stated).
        """
        return (
            self.extrapolated,
            self.kind not in ("definition", "heating", "formulation"),
            self.pin,
            self.status,
            round(self.size, 9),
            self.rank,
            _PHASE_ORDER.index(self.end.phase),
            self.end,
            self.entry,
        )


def leg_edge(leg: Leg, start: Node, end: Node, kind: str, *, status: int = 0, pin: int = 0, rank: int = 0) -> Edge:
    """An edge whose leg is at hand."""
    return Edge(
        start,
        end,
        leg,
        kind,
        size=ranking_uncertainty(leg.parts),
        status=status,
        pin=pin,
        rank=rank,
        what=leg.what,
        extrapolated=leg.extrapolated,
        entry=leg.entry,
    )


def entry_edge(entry: Entry, start: Node, end: Node, value: float, what: str, kind: str, policy: Policy) -> Edge:
    """An edge that one constant states; ``value`` = H(end) - H(start) [J/mol]."""
    size, unit, stated = policy.standard(entry)
    part = Part(entry.id, value if unit == "%" else 1.0, size, stated)
    leg = Leg(
        what=what,
        species=entry.species,
        start=start.text(),
        end=end.text(),
        value=value,
        parts=(part,),
        entry=entry.id,
        source=entry.source,
    )
    pin = 0 if not policy.pinned or entry.source in policy.pinned else 1
    edge = leg_edge(leg, start, end, kind, status=entry.place, pin=pin, rank=policy.rank(entry))
    return replace(edge, size=max(edge.size, policy.trust(entry)))


def vapour_of(entry: Entry, temperature: float) -> Node:
    """Where a latent heat ends: at the real vapour, unless it says that it means the ideal gas."""
    if "ideal gas" in entry.conditions or "standard" in entry.conditions or "monomer" in entry.conditions:
        return Node("g", "", temperature)
    return Node("fluid", "", temperature, "vapour")


def collect(
    *,
    species: str,
    entries: Iterable[Entry],
    policy: Policy,
    zero_nodes: Iterable[Node],
    foreign_zero: Callable[[Entry, Node], tuple[float, tuple[Part, ...]]],
    boiling: float | None,
    melting: float | None,
    critical: Critical | None,
    vapour: str,
    formulation: Formulation | None,
    liquid: Sequence[tuple[float, float]] = (),
    tc: float | None = None,
    molecular: bool = False,
) -> list[Edge]:
    """All edges of a species but the heating ones, the chosen entry of each pair of nodes first.

    ``foreign_zero`` gives the level of zero of an entry's datum where that is not the internal scale. ``liquid`` are
    the ranges of the liquid's heat capacity [K], ``tc`` its critical temperature [K]. ``molecular``: the vapour is made
    of the molecules of the formula, as that of an element or a salt need not be.
    """
    by_quantity: dict[str, list[Entry]] = {}
    for e in choose(entries, policy):
        by_quantity.setdefault(e.quantity, []).append(e)
    edges: list[Edge] = []
    for node in zero_nodes:
        leg = Leg(
            "definition", species, ROOT.text(), node.text(), 0.0, note="element in its reference form: 0 by definition"
        )
        edges.append(leg_edge(leg, ROOT, node, "definition"))
    for e in by_quantity.get("Hf", ()):
        if e.value is None:
            continue
        node = Node(e.phase, e.form, e.temperature if e.temperature is not None else T_STANDARD)
        if any(edge.kind == "definition" and edge.end == node for edge in edges):
            continue
        edge = entry_edge(e, ROOT, node, e.value, "formation", "formation", policy)
        try:
            shift, parts = foreign_zero(e, node)
        except PropdbError:
            continue
        if shift or parts:
            parts = add_parts(edge.leg.parts + parts)
            leg = replace(edge.leg, value=e.value + shift, parts=parts, note=f"given on {e.datum}")
            edge = replace(edge, source=leg, size=ranking_uncertainty(parts))
        edges.append(edge)
    _direct_first(edges)
    for e in by_quantity.get("dH0", ()):
        if e.value is not None:
            # What is liquid at 298.15 K (bromine, mercury, water) is counted from its crystal at 0 K.
            start = Node("cr" if e.phase == "l" else e.phase, e.form, 0.0)
            end = Node(e.phase, e.form, T_STANDARD)
            edges.append(entry_edge(e, start, end, e.value, "increment H(298.15) - H(0)", "increment", policy))
    edges += _latent_edges(by_quantity, policy, boiling, melting, liquid)
    latent = [edge for edge in edges if edge.what == "vaporisation"]
    if latent and tc is not None and not any(a <= edge.start.temperature <= b for edge in latent for a, b in liquid):
        edges += _moved(latent[0], liquid, tc)
    vapours = {n for edge in edges for n in (edge.start, edge.end) if n.saturated}
    if formulation is not None:
        edges += _formulation_edges(formulation, vapours)
    elif critical is not None and vapour != "associating":
        links = {n: _residual_edge(species, n, critical, vapour) for n in vapours if n.temperature < critical.tc}
        edges = [_burdened(edge, links.get(edge.end)) for edge in edges]
        edges += [links[n] for n in sorted(links)]
    elif critical is None and molecular and vapour != "associating":
        # Latent heats estimated from vapour pressures are taken where the pressure is low.
        estimated = USABLE_STATUSES.index("estimate")
        thin = {edge.end for edge in edges if edge.what == "vaporisation" and edge.status == estimated}
        thin |= {n for n in vapours if n.temperature <= max(boiling or 0.0, T_STANDARD)}
        edges += [_ideal_edge(species, n) for n in sorted(thin & vapours)]
    return edges


def _direct_first(edges: list[Edge]) -> None:
    """A formation enthalpy at 0 K goes behind those at 298.15 K of its own source and of better ones.

    Between the same two states the rank of the source decides; a value at 0 K must not go round it, and of one
    source's two values, which are one measurement, the direct one is read more easily.
    """
    formation = [edge for edge in edges if edge.kind == "formation"]
    for edge in formation:
        if edge.end.temperature == T_STANDARD:
            continue
        direct = edge.end._replace(temperature=T_STANDARD)
        place = (edge.pin, edge.status, edge.rank)
        better = [o.size for o in formation if o.end == direct and (o.pin, o.status, o.rank) <= place]
        edge.size = max([edge.size, *(size + 1e-6 for size in better)])


#: Taking a latent heat to another temperature costs the uncertainty of two heat capacities: about 1 % of 250 J/mol/K.
PER_KELVIN = 2.5


def _burdened(edge: Edge, link: Edge | None) -> Edge:
    """A latent heat to the real vapour ranks with the residual enthalpy behind it and its distance from 298.15 K."""
    if link is None:
        return edge
    away = PER_KELVIN * (edge.end.temperature - T_STANDARD)
    return replace(edge, size=hypot(edge.size, link.size, away))


def _within(liquid: Sequence[tuple[float, float]], low: float, high: float) -> list[float]:
    """The temperature next to 298.15 K at which the liquid's heat capacity and an equation from low to high hold."""
    shared = [(max(a, low), min(b, high)) for a, b in liquid]
    clamped = [min(max(T_STANDARD, a), b) for a, b in shared if a < b]
    return sorted(clamped, key=lambda t: abs(t - T_STANDARD))[:1]


#: Standard uncertainty of the exponent of Watson's equation.
WATSON_DOUBT = 0.05


def _moved(edge: Edge, liquid: Sequence[tuple[float, float]], tc: float) -> list[Edge]:
    """A latent heat brought to where the liquid's heat capacity holds: K. M. Watson, Ind. Eng. Chem. 35 (1943)."""
    at = edge.start.temperature
    ends = sorted((min(max(at, a), b) for a, b in liquid), key=lambda t: abs(t - at))
    if not ends or not max(at, ends[0]) < 0.95 * tc:
        return []
    t, value = ends[0], edge.leg.value
    ratio = (tc - t) / (tc - at)
    factor = ratio**0.38
    doubt = Part(f"model:watson:{edge.leg.species}", 1.0, abs(WATSON_DOUBT * log(ratio) * factor * value), True)
    start, end = edge.start._replace(temperature=t), edge.end._replace(temperature=t)
    leg = replace(
        edge.leg,
        start=start.text(),
        end=end.text(),
        value=factor * value,
        parts=(*(replace(p, coefficient=factor * p.coefficient) for p in edge.leg.parts), doubt),
        note=f"brought from {at:.7g} K by Watson's equation, exponent 0.38: a model",
    )
    return [leg_edge(leg, start, end, "transition", status=edge.status, pin=edge.pin, rank=edge.rank)]


def _latent_edges(
    by_quantity: dict[str, list[Entry]],
    policy: Policy,
    boiling: float | None,
    melting: float | None,
    liquid: Sequence[tuple[float, float]],
) -> list[Edge]:
    edges: list[Edge] = []
    for e in by_quantity.get("Hvap", ()):
        if e.equation:
            from propdb.cp.registry import build_latent_heat

            equation = build_latent_heat(e.equation, e.params)
            low = e.tmin if e.tmin is not None else 0.0
            high = e.tmax if e.tmax is not None else float("inf")
            at = [t for t in (T_STANDARD, boiling) if t is not None and low <= t <= high]
            if not any(a <= t <= b for t in at for a, b in liquid):
                at += _within(liquid, low, high)
            if not at and low > 0.0:  # no temperature lies in the range: its lower end, where the vapour is thin
                at = [low]
            points = [(t, float(equation.dh(t))) for t in at]
        elif e.value is not None:
            t_v = e.temperature if e.temperature is not None else boiling
            points = [] if t_v is None else [(t_v, e.value)]
        else:  # pragma: no cover - the store refuses such an entry
            points = []
        for t, value in points:
            edges.append(entry_edge(e, Node("l", "", t), vapour_of(e, t), value, "vaporisation", "transition", policy))
    for e in by_quantity.get("Hsub", ()):
        if e.value is not None:
            t = e.temperature if e.temperature is not None else T_STANDARD
            edges.append(
                entry_edge(e, Node("cr", e.form, t), vapour_of(e, t), e.value, "sublimation", "transition", policy)
            )
    for e in by_quantity.get("Hfus", ()):
        t_m = e.temperature if e.temperature is not None else melting
        if e.value is not None and t_m is not None:
            edge = entry_edge(e, Node("cr", e.form, t_m), Node("l", "", t_m), e.value, "fusion", "transition", policy)
            edges.append(replace(edge, size=hypot(edge.size, PER_KELVIN * (t_m - T_STANDARD))))
    for e in by_quantity.get("Htr", ()):
        if e.value is not None and e.temperature is not None and e.to:
            phase, _, form = e.to.partition(":")
            if (phase, form) == (e.phase, e.form):
                continue  # within one track: the curve crosses its split with it
            edges.append(
                entry_edge(
                    e,
                    Node(e.phase, e.form, e.temperature),
                    Node(phase, form, e.temperature),
                    e.value,
                    "transition",
                    "transition",
                    policy,
                )
            )
    return edges


def _residual_edge(species: str, node: Node, c: Critical, vapour: str) -> Edge:
    """Real saturated vapour to ideal gas, ranked by a quick estimate and computed when it is walked."""
    gas = Node("g", "", node.temperature)

    def leg() -> Leg:
        value, pressure, _ = residual.enthalpy(temperature=node.temperature, tc=c.tc, pc=c.pc, omega=c.omega)
        size = residual.standard(value, vapour=vapour) / max(abs(value), 1e-9)
        return Leg(
            what="residual enthalpy",
            species=species,
            start=node.text(),
            end=gas.text(),
            value=-value,
            parts=(Part(f"model:residual:{species}", -value, size, True),),
            source=c.source,
            note=f"{residual.note(vapour)}; saturated at {pressure / 1e5:.4g} bar",
        )

    size = residual.standard(residual.estimate(temperature=node.temperature, tc=c.tc, omega=c.omega), vapour=vapour)
    return Edge(node, gas, leg, "residual", size, USABLE_STATUSES.index("base"), what="residual enthalpy")


#: Standard uncertainty of taking a saturated vapour as ideal [J/mol]. Of 250 fluids whose critical constants are known,
#: 95 % have less residual enthalpy than 0.15 kJ/mol at 298.15 K and 0.85 kJ/mol at the normal boiling point by the
#: Peng-Robinson equation, which gives half of it or less.
IDEAL_AT_STANDARD, IDEAL_AT_BOILING = 500.0, 1000.0


def _ideal_edge(species: str, node: Node) -> Edge:
    """Saturated vapour taken as ideal, where the critical constants are not known: not beyond the boiling point."""
    gas = Node("g", "", node.temperature)
    size = IDEAL_AT_STANDARD if node.temperature <= T_STANDARD else IDEAL_AT_BOILING
    leg = Leg(
        what="residual enthalpy",
        species=species,
        start=node.text(),
        end=gas.text(),
        value=0.0,
        parts=(Part(f"model:residual:{species}", 1.0, size, True),),
        note="the store lacks Tc, Pc or omega: the vapour is taken as ideal, a model; standard uncertainty "
        f"{size / 1e3:.2g} kJ/mol",
    )
    return replace(leg_edge(leg, node, gas, "residual"), status=USABLE_STATUSES.index("base"))


def _formulation_edges(formulation: Formulation, vapours: set[Node]) -> list[Edge]:
    """Real liquid to ideal gas at zero density, at 298.15 K; and to the real vapour wherever a latent heat meets it."""
    liquid, gas = Node("l", "", T_STANDARD), Node("g", "", T_STANDARD)
    pairs = [(liquid, gas, State("g", T_STANDARD))]
    pairs += [(liquid, n, State("fluid", n.temperature, saturated="vapour")) for n in sorted(vapours)]
    edges = []
    for start, end, state in pairs:
        leg = formulation.legs(State("l", T_STANDARD), state)[0]
        if end.phase == "g":
            leg = replace(leg, end=f"{end.text()} (zero density)")
        status = formulation.entry.place
        edges.append(leg_edge(leg, start, end, "formulation", status=status))
    return edges


def heating_edges(
    nodes: Iterable[Node], curve: Curve | Formulation, extrapolate: bool, position: Callable[[Node], object]
) -> list[Edge]:
    """Edges along a track between consecutive nodes of one phase and form."""
    chain = sorted(nodes, key=lambda n: n.temperature)
    edges = []
    for a, b in zip(chain, chain[1:], strict=False):
        try:
            legs = curve.legs(position(a), position(b))  # type: ignore[arg-type]
        except PropdbError:
            continue
        if not legs:
            continue
        outside = any(leg.extrapolated for leg in legs)
        if outside and not extrapolate:
            continue
        total = sum(leg.value for leg in legs)
        parts = add_parts(p for leg in legs for p in leg.parts)
        leg = Leg("heating", legs[0].species, a.text(), b.text(), total, parts, legs[0].entry, legs[0].source, outside)
        edges.append(leg_edge(leg, a, b, "heating"))
    return edges
