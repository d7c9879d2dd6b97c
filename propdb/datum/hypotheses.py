"""What happens to enthalpies on their way into a table: one table of named, reversible changes.

Each :class:`Hypothesis` says how a number that stands in a table comes from the enthalpy of formation that is meant, by
a factor and a shift, from the :class:`Facts` of the species. A hypothesis whose facts are missing, or that would change
nothing, gives no :class:`Change` and is never confirmed by default.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from fractions import Fraction
from types import MappingProxyType
from typing import Final

from propdb.model.records import T_STANDARD

__all__ = ["BY_NAME", "HYPOTHESES", "Change", "Facts", "Fit", "Hypothesis", "elements_increment", "fitting", "to_298"]

CALORIE: Final = 4.184  # thermochemical [J]
CALORIE_IT: Final = 4.1868  # International Table [J]
BTU_PER_LB: Final = 2326.0  # [J/kg], exact; BTU/lbmol is 2.326 J/mol
#: H(298.15 K) - H(0 K) of the electron gas [J/mol]: Boltzmann, and Fermi-Dirac, statistics.
ELECTRON_BOLTZMANN: Final = 6197.0
ELECTRON_FERMI_DIRAC: Final = 3145.0


def _unknown(*_: str) -> float | None:
    return None


@dataclass(frozen=True, slots=True)
class Facts:
    """What is known of a species beside the number in question. None, or a callable that gives None: not known.

    composition
        Atoms per formula unit.
    electron_increment
        H(298.15 K) - H(0 K) of the electron gas in the convention of the number [J/mol].
    molar_mass
        [kg/mol]
    increment
        H(298.15 K) - H(0 K) of the species in the phase in question [J/mol].
    element_increment
        Element symbol to H(298.15 K) - H(0 K) of its reference form, per atom [J/mol].
    form_enthalpy
        (element symbol, form) to the enthalpy of another form of the element over its reference form, per atom at
        298.15 K [J/mol]: ``("P", "red")``, ``("S", "S2 gas")``.
    vaporisation, sublimation
        At 298.15 K [J/mol].
    products
        Enthalpy of formation of the products of complete combustion with liquid water, per formula unit [J/mol].
    water
        Moles of water among these products times its enthalpy of vaporisation at 298.15 K [J/mol].
    formation_entropy
        At 298.15 K [J/mol/K].
    """

    composition: Mapping[str, Fraction | int] = field(default_factory=lambda: MappingProxyType({}))
    charge: int = 0
    electron_increment: float = ELECTRON_BOLTZMANN
    molar_mass: float | None = None
    increment: float | None = None
    element_increment: Callable[[str], float | None] = _unknown
    form_enthalpy: Callable[[str, str], float | None] = _unknown
    vaporisation: float | None = None
    sublimation: float | None = None
    products: float | None = None
    water: float | None = None
    formation_entropy: float | None = None


@dataclass(frozen=True, slots=True)
class Change:
    """``stands = factor * meant + shift`` [J/mol]."""

    factor: float = 1.0
    shift: float = 0.0

    def forward(self, meant: float) -> float:
        """What then stands in the table."""
        return self.factor * meant + self.shift

    def inverse(self, stands: float) -> float:
        """What was meant by what stands in the table."""
        return (stands - self.shift) / self.factor


@dataclass(frozen=True, slots=True)
class Hypothesis:
    """One line of the table.

    name
        Short, e.g. ``at-0K``.
    sentence
        What has happened, to be read after "the value fits if".
    needs
        Fields of :class:`Facts` that it takes.
    of
        The change, None where a fact is missing.
    """

    name: str
    sentence: str
    needs: tuple[str, ...]
    of: Callable[[Facts], Change | None]

    def change(self, facts: Facts) -> Change | None:
        """The change for one species; None where a fact is missing, or where there is nothing to change."""
        found = self.of(facts)
        return None if found is None or found == Change() else found


def elements_increment(facts: Facts) -> float | None:
    """Sum of H(298.15 K) - H(0 K) over the elements of one formula unit [J/mol]; None where one is not known."""
    total = -facts.charge * facts.electron_increment
    for element, count in facts.composition.items():
        one = facts.element_increment(element) if count else 0.0
        if one is None:
            return None
        total += float(count) * one
    return total if facts.composition else None


def to_298(facts: Facts) -> float | None:
    """Enthalpy of formation at 298.15 K less that at 0 K [J/mol]; None where an increment is not known."""
    elements = elements_increment(facts)
    return None if elements is None or facts.increment is None else facts.increment - elements


def _scaled(name: str, sentence: str, factor: float) -> Hypothesis:
    change = Change(factor)
    return Hypothesis(name, sentence, (), lambda facts: change)


def _shifted(name: str, sentence: str, needs: Sequence[str], of: Callable[[Facts], float | None]) -> Hypothesis:
    def change(facts: Facts) -> Change | None:
        shift = of(facts)
        return None if shift is None else Change(1.0, shift)

    return Hypothesis(name, sentence, tuple(needs), change)


def _per_mass(unit: float) -> Callable[[Facts], Change | None]:
    return lambda facts: Change(1.0 / (unit * facts.molar_mass)) if facts.molar_mass else None


def _per_atom(facts: Facts) -> Change | None:
    atoms = float(sum(facts.composition.values()))
    return Change(1.0 / atoms) if atoms else None


def _other_form(element: str, form: str) -> Callable[[Facts], float | None]:
    """Counted from another form of the element, whose enthalpy each of its atoms then lacks."""

    def shift(facts: Facts) -> float | None:
        count = float(facts.composition.get(element, 0))
        above = facts.form_enthalpy(element, form) if count else None
        return None if above is None else -count * above

    return shift


def _less(value: float | None) -> float | None:
    return None if value is None else -value


def _negative_to_298(facts: Facts) -> float | None:
    return _less(to_298(facts))


def _combustion(facts: Facts) -> Change | None:
    # dcH = products - H
    return None if facts.products is None else Change(-1.0, facts.products)


def _combustion_net(facts: Facts) -> Change | None:
    return None if facts.products is None or facts.water is None else Change(-1.0, facts.products + facts.water)


def _combustion_positive(facts: Facts) -> Change | None:
    return None if facts.products is None else Change(1.0, -facts.products)


def _electron(enthalpy: float) -> Callable[[Facts], float | None]:
    return lambda facts: facts.charge * enthalpy if facts.charge else None


_NAMED_FACTORS: Final = (("2", 2.0), ("3", 3.0), ("4", 4.0), ("1/2", 0.5), ("1/3", 1.0 / 3.0), ("1/4", 0.25))

_ELEMENT_FORMS: Final = (
    ("red-phosphorus", "P", "red", "it is counted from red phosphorus instead of white"),
    ("S2-gas", "S", "S2 gas", "it is counted from S2 gas instead of rhombic sulfur"),
    ("bromine-gas", "Br", "Br2 gas", "it is counted from Br2 gas instead of the liquid"),
    ("iodine-gas", "I", "I2 gas", "it is counted from I2 gas instead of the crystal"),
    ("mercury-gas", "Hg", "gas", "it is counted from mercury gas instead of the liquid"),
    ("grey-tin", "Sn", "grey", "it is counted from grey tin instead of white"),
    ("diamond", "C", "diamond", "it is counted from diamond instead of graphite"),
)


def _table() -> Iterator[Hypothesis]:
    yield _scaled("sign", "its sign is reversed", -1.0)
    yield _scaled("in-cal", "it is in calories, not joules", 1.0 / CALORIE)
    yield _scaled("in-cal-IT", "it is in International Table calories, not joules", 1.0 / CALORIE_IT)
    yield _scaled("twice-from-cal", "it was taken for calories and converted to joules once too often", CALORIE)
    yield _scaled("in-btu-per-lbmol", "it is in BTU/lbmol, not J/mol", 1000.0 / BTU_PER_LB)
    yield _scaled("in-kcal", "it is in kilocalories, not joules", 1.0 / (1000.0 * CALORIE))
    yield _scaled("in-kJ", "it is in kilojoules, not joules", 1e-3)
    yield _scaled("per-kmol", "it is per kmol, not per mol", 1e3)
    yield _scaled("point-right", "its decimal point is one place too far right", 10.0)
    yield _scaled("point-left", "its decimal point is one place too far left", 0.1)
    yield Hypothesis("per-kg", "it is per kilogram, not per mole", ("molar_mass",), _per_mass(1.0))
    yield Hypothesis("per-g", "it is per gram, not per mole", ("molar_mass",), _per_mass(1000.0))
    yield Hypothesis("in-btu-per-lb", "it is in BTU/lb, not J/mol", ("molar_mass",), _per_mass(BTU_PER_LB))
    for text, factor in _NAMED_FACTORS:
        yield _scaled(f"per-{text}-formulas", f"it is per {text} formula unit{'s' * (factor > 1.0)}", factor)
    yield Hypothesis("per-atom", "it is per mole of atoms", ("composition",), _per_atom)
    increments = ("composition", "increment", "element_increment")
    yield _shifted("at-0K", "it is the enthalpy of formation at 0 K, not at 298.15 K", increments, _negative_to_298)
    yield _shifted("at-298K", "it is the enthalpy of formation at 298.15 K, not at 0 K", increments, to_298)
    yield _shifted(
        "elements-at-0K",
        "it is the enthalpy at 298.15 K counted from the elements at 0 K",
        ("composition", "element_increment"),
        elements_increment,
    )
    yield _shifted(
        "with-increment",
        "H(298.15 K) - H(0 K) of the species itself has been added",
        ("increment",),
        lambda facts: facts.increment,
    )
    for name, element, form, sentence in _ELEMENT_FORMS:
        yield _shifted(name, sentence, ("composition", "form_enthalpy"), _other_form(element, form))
    yield _shifted(
        "electron-stationary",
        "the electron has no heat capacity (stationary) instead of that of an ideal gas",
        ("charge",),
        _electron(-ELECTRON_BOLTZMANN),
    )
    yield _shifted(
        "electron-gas",
        "the electron has the heat capacity of an ideal gas instead of none (stationary)",
        ("charge",),
        _electron(ELECTRON_BOLTZMANN),
    )
    yield _shifted(
        "electron-fermi-dirac",
        "the electron follows Fermi-Dirac instead of Boltzmann statistics",
        ("charge",),
        _electron(ELECTRON_FERMI_DIRAC - ELECTRON_BOLTZMANN),
    )
    yield _shifted(
        "of-the-liquid", "it is of the liquid, not of the gas", ("vaporisation",), lambda f: _less(f.vaporisation)
    )
    yield _shifted("of-the-gas", "it is of the gas, not of the liquid", ("vaporisation",), lambda f: f.vaporisation)
    yield _shifted(
        "of-the-crystal", "it is of the crystal, not of the gas", ("sublimation",), lambda f: _less(f.sublimation)
    )
    yield _shifted("of-the-sublimed", "it is of the gas, not of the crystal", ("sublimation",), lambda f: f.sublimation)
    yield Hypothesis("combustion", "it is the enthalpy of combustion", ("products",), _combustion)
    yield Hypothesis(
        "combustion-net", "it is the enthalpy of combustion to water vapour", ("products", "water"), _combustion_net
    )
    yield Hypothesis(
        "heating-value", "it is the gross heat of combustion, counted positive", ("products",), _combustion_positive
    )
    yield _shifted(
        "gibbs",
        "it is the Gibbs energy of formation",
        ("formation_entropy",),
        lambda f: None if f.formation_entropy is None else -T_STANDARD * f.formation_entropy,
    )


#: The table, in the order in which ties are reported.
HYPOTHESES: Final[tuple[Hypothesis, ...]] = tuple(_table())
BY_NAME: Final[Mapping[str, Hypothesis]] = MappingProxyType({each.name: each for each in HYPOTHESES})


@dataclass(frozen=True, slots=True)
class Fit:
    """A hypothesis that makes two values agree; ``remaining`` is what it leaves [J/mol]."""

    hypothesis: Hypothesis
    change: Change
    remaining: float


def fitting(
    *,
    stands: float,
    expected: float,
    facts: Facts,
    within: float,
    hypotheses: Sequence[Hypothesis] = HYPOTHESES,
) -> list[Fit]:
    """Hypotheses under which ``stands`` means ``expected`` to ``within`` [J/mol], the closest first.

    ``remaining`` and ``within`` are in terms of what is meant: a value per kilogram is first brought to the mole. A
    hypothesis that changes the value by no more than ``within`` explains nothing and is left out.
    """
    found: list[Fit] = []
    for each in hypotheses:
        change = each.change(facts)
        if change is None:
            continue
        meant = change.inverse(stands)
        if abs(meant - expected) <= within < abs(meant - stands):
            found.append(Fit(each, change, meant - expected))
    return sorted(found, key=lambda fit: abs(fit.remaining))
