"""How often the datum of a row of the TRC gas tables is decided right, with the referee withheld.

`python tests/bench/trc_decisions.py [--list]`. The package's files are read as a build reads them, and every row is
decided without hearing the referee and those that copy it. Then the referee judges: ATcT by its own values at 0 K and
at 298.15 K, JANAF by its value at 298.15 K and the row's own increment. It can judge a row if one reading agrees with
it and the other is three times as far, and 3 kJ/mol farther. If neither reading agrees, it contradicts the number
whatever its datum: these rows are counted apart, and in the last column as wrong. "Agrees" means within 10 kJ/mol, or
within 4.
"""

from __future__ import annotations

import sys
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

if __name__ == "__main__":
    sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from propdb.intake.package import load_package
from propdb.intake.seeds import load_seed
from propdb.intake.trc import AT_0, AT_298, NEITHER, Decision, resolve, undecided
from propdb.intake.where import seed_root
from propdb.model.records import T_STANDARD
from propdb.store.content import Content

REFEREES = {"ATcT": "atct-1.112", "JANAF": "chase-1998"}
TARGET = 0.95
FEWEST = 50  # rows judged, below which a share says nothing
AGREES = (10_000.0, 4_000.0)  # the first for the target
TIMES = 3.0
APART = 3_000.0
EQUAL = 150.0


@dataclass(frozen=True)
class Score:
    """Decisions without a referee, against that referee."""

    what: str
    verdicts: Counter[str]
    right: int
    wrong: tuple[tuple[Decision, str], ...]
    contradicted: tuple[Decision, ...]
    unjudged: int

    @property
    def share(self) -> float:
        """Right of the decided rows that the referee can judge [1]."""
        judged = self.right + len(self.wrong)
        return self.right / judged if judged else float("nan")

    @property
    def strict(self) -> float:
        """The same, counting as wrong also the rows whose number the referee contradicts at both temperatures [1]."""
        judged = self.right + len(self.wrong) + len(self.contradicted)
        return self.right / judged if judged else float("nan")


def content() -> Content:
    """What a build reads: the seed and the package's files, nothing decided."""
    root = seed_root()
    return undecided(load_package(load_seed(root, identifiers=False), root).content)


def truth(decision: Decision, at: dict[float, float], agrees: float) -> str:
    """What a referee says of a row: a temperature, ``neither``, or "" where it cannot tell."""
    value = decision.entry.value
    assert value is not None
    off_298 = abs(value - at[T_STANDARD])
    if 0.0 in at:
        off_0 = abs(value - at[0.0])
    elif decision.shift is not None:
        off_0 = abs(value + decision.shift - at[T_STANDARD])
    else:  # nothing to bring it from 0 K with: agreement as it stands is all that can be seen
        return AT_298 if off_298 <= APART else ""
    near, far = sorted((off_0, off_298))
    if near > agrees:
        return NEITHER
    return (AT_0 if off_0 < off_298 else AT_298) if far >= TIMES * near and far - near >= APART else ""


def known(data: Content, referee: str) -> dict[str, dict[float, float]]:
    """Species to temperature to enthalpy of formation of the gas, as the referee has it [J/mol]."""
    found: dict[str, dict[float, float]] = {}
    for entry in data.entries:
        usual = entry.datum in ("elements-0K", "elements-298K", "elements-298K-electron-stationary")
        fits = entry.source == referee and entry.quantity == "Hf" and entry.phase == "g" and usual
        if fits and entry.value is not None and entry.temperature is not None:
            found.setdefault(entry.species, {})[entry.temperature] = entry.value
    return {species: at for species, at in found.items() if T_STANDARD in at}


def score(
    data: Content, what: str, referees: Sequence[str], withheld: Sequence[str], agrees: float, alone: bool = False
) -> Score:
    """Decide without the witnesses withheld; the first referee that can judge a row does, else one contradicts it."""
    benches = [known(data, referee) for referee in referees]
    verdicts: Counter[str] = Counter()
    right = unjudged = 0
    wrong: list[tuple[Decision, str]] = []
    contradicted: list[Decision] = []
    for decision in resolve(data, withheld=withheld, alone=alone).decisions:
        verdicts[decision.verdict] += 1
        if decision.verdict not in (AT_0, AT_298):
            continue
        there = [bench[decision.entry.species] for bench in benches if decision.entry.species in bench]
        said = [truth(decision, at, agrees) for at in there]
        says = next((each for each in said if each in (AT_0, AT_298)), NEITHER if NEITHER in said else "")
        if says == decision.verdict:
            right += 1
        elif says == NEITHER:
            contradicted.append(decision)
        elif says:
            wrong.append((decision, says))
        elif there:
            unjudged += 1
    return Score(what, verdicts, right, tuple(wrong), tuple(contradicted), unjudged)


def scores(data: Content, agrees: float) -> Iterator[Score]:
    """Both referees, each of them, and the constants of integration with no witness at all."""
    both = list(REFEREES.values())
    for name, keys in (("ATcT or JANAF", both), *((name, [key]) for name, key in REFEREES.items())):
        copies = sorted(s.key for s in data.sources if any(key in dict(s.lineage) for key in keys))
        yield score(data, f"{name} withheld", keys, keys, agrees)
        if copies:
            yield score(data, f"{name} withheld, with what copies it", keys, [*keys, *copies], agrees)
    yield score(data, "both withheld, deciding also what stands alone", both, both, agrees, True)
    everyone = sorted({entry.source for entry in data.entries})
    yield score(data, "constants of integration, no witness", both, everyone, agrees, True)


def main() -> int:
    """Print the figures; 1 if less than the target is right where both referees are withheld."""
    data = content()
    full = resolve(data)
    print(f"TRC gas tables: {full.line()}")
    equal = [{h.says for h in d.heard if h.says and h.off <= EQUAL} for d in full.decisions]
    same = sum(found == {d.counted} for d, found in zip(full.decisions, equal, strict=True) if len(found) == 1)
    print(
        f"rows that another source copied at one of the temperatures: {sum(len(e) == 1 for e in equal)}; their constant"
    )
    print(f"of integration counts from that temperature in {same}")
    missed = False
    for agrees in AGREES:
        print()
        head = f"agreement: {agrees / 1000.0:g} kJ/mol"
        print(f"{head:<46}{'decided':>8}{'judged':>8}{'right':>7}{'share':>8}{'contradicted':>14}{'as wrong':>10}")
        for each in scores(data, agrees):
            decided = each.verdicts[AT_0] + each.verdicts[AT_298]
            judged = each.right + len(each.wrong)
            print(
                f"{each.what:<46}{decided:>8}{judged:>8}{each.right:>7}{each.share:>8.1%}"
                f"{len(each.contradicted):>14}{each.strict:>10.1%}"
            )
            aimed = agrees == AGREES[0] and each.what.startswith("ATcT or JANAF withheld")
            missed = missed or (aimed and not (each.share >= TARGET and judged >= FEWEST))
            if "--list" in sys.argv:
                for decision, says in each.wrong:
                    print(f"    {decision.entry.species}: decided {decision.verdict}, judged {says}; {decision.reason}")
                for decision in each.contradicted:
                    print(f"    {decision.entry.species}: contradicted; decided {decision.verdict}, {decision.reason}")
    print()
    verdict = "missed" if missed else "held"
    where = f"both withheld, at {AGREES[0] / 1e3:g} kJ/mol"
    print(f"target: {TARGET:.0%} of the rows that ATcT or JANAF can judge, {where}: {verdict}")
    return 1 if missed else 0


if __name__ == "__main__":
    sys.exit(main())
