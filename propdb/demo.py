"""A worked scenario: the heat balance of a fired boiler whose enthalpies come from tables with three different zeros.

The plant, its flows and temperatures are invented. The enthalpies are not: each comes from the store, with its source.

Run with ``python -m propdb.demo``; it uses the default store and builds it if there is none.
"""

from __future__ import annotations

import sys
from dataclasses import dataclass
from textwrap import wrap

from propdb.api import Store
from propdb.api import open as open_store
from propdb.errors import DatumMismatch, PropdbError
from propdb.model.answer import Answer
from propdb.model.text import WIDTH, columns

COMMON = "elements-298K"


@dataclass(frozen=True)
class Stream:
    """One line of the balance. ``flow`` in kmol/h, or t/h where the table is per mass; in is positive."""

    name: str
    species: str
    flow: float
    per_mass: bool
    table: str  # the enthalpy as the engineer has it
    datum: str
    into: bool


def _gas(store: Store, species: str, temperature: str) -> str:
    """What an ideal-gas table with zero at 25 C gives."""
    answer = store.enthalpy(species, phase="g", temperature=temperature, datum="gas-25C")
    return f"{answer.value:.3f} kJ/mol"


def streams(store: Store) -> list[Stream]:
    """The streams of the Harrow Lane boiler house (invented)."""
    fuel = store.enthalpy("methane", phase="g", temperature="25C", datum=COMMON)
    flue = [("carbon dioxide", 100.0), ("water", 200.0), ("oxygen", 30.0), ("nitrogen", 865.2)]
    return [
        Stream("fuel, 25 C", "methane", 100.0, False, f"{fuel.value:.3f} kJ/mol", COMMON, True),
        Stream("air: oxygen, 25 C", "oxygen", 230.0, False, _gas(store, "oxygen", "25C"), "gas-25C", True),
        Stream("air: nitrogen, 25 C", "nitrogen", 865.2, False, _gas(store, "nitrogen", "25C"), "gas-25C", True),
        Stream("feed water, 105 C", "water", 30.9, True, "440.2 kJ/kg", "steam-triple-point", True),
        *(
            Stream(f"flue gas: {name}, 180 C", name, flow, False, _gas(store, name, "180C"), "gas-25C", False)
            for name, flow in flue
        ),
        Stream("steam, 40 bar saturated", "water", 30.9, True, "2800.8 kJ/kg", "steam-triple-point", False),
    ]


def _duty(stream: Stream, value: float) -> float:
    """Enthalpy flow in MW; kmol/h x kJ/mol = MJ/h, t/h x kJ/kg = MJ/h."""
    return (1.0 if stream.into else -1.0) * stream.flow * value / 3600.0


def _tables(rows: list[Stream]) -> list[str]:
    head = ("stream", "flow", "", "as tabulated", "zero of that table")
    body = [(s.name, f"{s.flow:g}", "t/h" if s.per_mass else "kmol/h", s.table, s.datum) for s in rows]
    return columns([head, *body], right=(1, 3), indent=2)


def _converted(store: Store, stream: Stream) -> Answer:
    unit = "kJ/kg" if stream.per_mass else "kJ/mol"
    return store.convert(stream.table, species=stream.species, from_=stream.datum, to=COMMON, to_unit=unit)


def run(store: Store) -> list[str]:
    """The scenario as lines of text."""
    rows = streams(store)
    lines = [
        "HEAT BALANCE OF A FIRED BOILER (invented plant; enthalpies from the store)",
        "",
        "1. What is on the desk: nine enthalpies, three different zeros",
        "",
        *_tables(rows),
        "",
        "2. Added as they stand",
        "",
    ]
    raw = sum(_duty(s, float(s.table.split()[0])) for s in rows)
    lines += [
        f"  in less out = {raw:+.3f} MW. That number means nothing: the zeros differ. propdb refuses the like:",
        "",
    ]
    try:
        store.reaction("CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(g)", temperature="180C", datum="gas-25C")
    except DatumMismatch as error:
        lines += [*wrap(str(error), WIDTH, initial_indent="  ", subsequent_indent="  "), ""]
    answers = [_converted(store, s) for s in rows]
    head = ("stream", f"on {COMMON}", "", "enthalpy flow [MW]", "what was added")
    body = []
    for stream, answer in zip(rows, answers, strict=True):
        shift = answer.value - float(stream.table.split()[0])
        body.append(
            (
                stream.name,
                f"{answer.value:.3f}",
                answer.unit,
                f"{_duty(stream, answer.value):+.3f}",
                f"{shift:+.3f} {answer.unit}" if abs(shift) > 5e-13 else "nothing: it is on that datum",
            )
        )
    balance = sum(_duty(s, a.value) for s, a in zip(rows, answers, strict=True))
    lines += [f"3. All on one datum, {COMMON}, and added up", "", *columns([head, *body], right=(1, 3), indent=2), ""]
    fired = _duty(rows[0], store.enthalpy("methane", phase="g", temperature="25C", datum="combustion-net-25C").value)
    steam, feed = rows[-1], rows[3]
    duty = -_duty(steam, answers[-1].value) - _duty(feed, answers[3].value)
    rest = balance / fired
    lines += columns(
        [
            ("in less out: loss through walls and blowdown", f"{balance:.3f} MW", f"{100 * rest:.1f} % of the fuel"),
            ("fuel, net at 25 C (combustion-net-25C)", f"{fired:.3f} MW", ""),
            ("heat into steam", f"{duty:.3f} MW", f"{100 * duty / fired:.1f} % of the fuel"),
        ],
        right=(1,),
        indent=2,
        headed=False,
    )
    lines += ["", "4. How one of them was moved: the steam, step by step", "", answers[-1].explain()]
    return lines


def main() -> int:
    """Print the scenario; return the exit code."""
    try:
        with open_store() as store:
            text = "\n".join(run(store))
    except PropdbError as error:
        print(f"propdb: {error}", file=sys.stderr)
        return error.exit_code
    print(text)
    return 0


if __name__ == "__main__":
    sys.exit(main())
