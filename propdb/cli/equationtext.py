"""Equations with their coefficients, as lines to read, from the stored form: nothing that computes is loaded."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from typing import Any, Final

from propdb.model.text import columns

Params = Mapping[str, Any]


def equation_lines(name: str, params: Params, *, full: bool = False) -> list[str]:
    """Formula and coefficients of an equation.

    Parameters
    ----------
    name, params
        As an entry holds them; SI: J/mol/K and J/mol, T in K.
    full
        Every row of a table; otherwise the first and last few.
    """
    if name == "table":
        return _table(params, "cp", "cp [J/mol/K]", full=full)
    if name == "tabulated":
        return _table(params, "h", "h [J/mol]", full=full)
    writer = _WRITERS.get(name)
    return writer(params) if writer is not None else [f"{key} = {value}" for key, value in params.items()]


def _number(value: float) -> str:
    return f"{value:.12g}"


def _span(row: Params) -> str:
    return f"{_number(row['tmin'])} to {_number(row['tmax'])} K"


def _sum(coefficients: Sequence[float], exponents: Sequence[int]) -> str:
    text = ""
    for coefficient, exponent in zip(coefficients, exponents, strict=True):
        size = _number(abs(coefficient))
        power = "" if exponent == 0 else " T" if exponent == 1 else f" T^{exponent}"
        sign = ("-" if coefficient < 0 else "") if not text else (" - " if coefficient < 0 else " + ")
        text += f"{sign}{size}{power}"
    return text


def _constant(params: Params) -> list[str]:
    return [f"cp = {_number(params['value'])} J/mol/K"]


def _polynomial(params: Params) -> list[str]:
    return [f"cp = {_sum(params['coefficients'], params['exponents'])}   [J/mol/K]"]


def _intervals(head: str, names: Iterable[str], rows: Iterable[tuple[str, Sequence[float]]]) -> list[str]:
    """One column for each interval, one line for each coefficient."""
    columns_of = list(rows)
    table = [("", *(span for span, _ in columns_of))]
    table += [
        (name, *(_number(values[index]) if index < len(values) else "" for _, values in columns_of))
        for index, name in enumerate(names)
    ]
    table = [row for row in table if any(row[1:])]
    return [head, *columns(table, right=range(1, len(columns_of) + 1), indent=2)]


def _nasa(head: str, constants: Sequence[str], count: int) -> Callable[[Params], list[str]]:
    def write(params: Params) -> list[str]:
        names = [*(f"a{number}" for number in range(1, count + 1)), *constants]
        rows = [(_span(row), [*row["a"], *row["b"]]) for row in params["intervals"]]
        gas_constant = f", R = {_number(params['gas_constant'])} J/mol/K" if "gas_constant" in params else ""
        return _intervals(head + gas_constant, names, rows)

    return write


def _shomate(params: Params) -> list[str]:
    rows = [(_span(row), row["coefficients"]) for row in params["intervals"]]
    return _intervals("cp = A + B t + C t^2 + D t^3 + E/t^2, t = T/1000   [J/mol/K]", "ABCDEFGH", rows)


def _table(params: Params, key: str, head: str, *, full: bool) -> list[str]:
    pairs = list(zip(params["T"], params[key], strict=True))
    shown = pairs if full or len(pairs) <= 8 else [*pairs[:3], *pairs[-3:]]
    rows = [("T [K]", *(_number(t) for t, _ in shown)), (head, *(_number(y) for _, y in shown))]
    lines = [f"{len(pairs)} points, monotone cubics between them"]
    if full:
        lines += columns([("T [K]", head), *((_number(t), _number(y)) for t, y in pairs)], right=(0, 1), indent=2)
    else:
        if len(shown) < len(pairs):
            rows = [(*row[:4], "...", *row[4:]) for row in rows]
        lines += columns(rows, right=range(1, len(rows[0])), indent=2)
    lines += [
        f"transition at {_number(row['T'])} K: {_number(row['dh'])} J/mol" for row in params.get("transitions", ())
    ]
    return lines


def _union(params: Params) -> list[str]:
    lines = []
    for piece in params["pieces"]:
        own = {key: value for key, value in piece.items() if key != "equation"}
        span = f"{_span(own)}: " if "tmin" in own else ""
        first, *more = equation_lines(piece["equation"], own)
        lines += [f"{span}{first}", *more]
    return lines


def _constant_latent(params: Params) -> list[str]:
    return [f"{_number(params['dh'])} J/mol at {_number(params['T'])} K"]


def _watson(params: Params) -> list[str]:
    exponent = _number(params.get("exponent", 0.38))
    known = f"T1 = {_number(params['T1'])} K, Tc = {_number(params['Tc'])} K"
    return [f"dh = {_number(params['dh'])} ((Tc - T)/(Tc - T1))^{exponent}   [J/mol], {known}"]


def _named(head: str, unit: str, names: Sequence[str], key: str) -> Callable[[Params], list[str]]:
    """The formula, what it needs beside its coefficients, and a line with these."""

    def write(params: Params) -> list[str]:
        more = "".join(
            f", {name} = {_number(params[name])} {unit_}".rstrip() for name, unit_ in _BESIDE if name in params
        )
        line = ", ".join(f"{name} = {_number(value)}" for name, value in zip(names, params[key], strict=False))
        return [f"{head}   [{unit}]{more}", f"  {line}"]

    return write


#: Parameters of an equation beside its coefficients, with their units.
_BESIDE: Final = (
    ("Tc", "K"),
    ("I", "K"),
    ("J", ""),
    ("scale", ""),
    ("gas_constant", "J/mol/K"),
)


_WRITERS: Final[Mapping[str, Callable[[Params], list[str]]]] = {
    "aly-lee": _named("cp = A + B [(C/T)/sinh(C/T)]^2 + D [(E/T)/cosh(E/T)]^2", "J/mol/K", "ABCDE", "coefficients"),
    "constant": _constant,
    "constant-latent": _constant_latent,
    "nasa7": _nasa("cp/R = a1 + a2 T + a3 T^2 + a4 T^3 + a5 T^4", ("a6", "a7"), 5),
    "nasa9": _nasa("cp/R = a1/T^2 + a2/T + a3 + a4 T + a5 T^2 + a6 T^3 + a7 T^4", ("b1", "b2"), 7),
    "perry-liquid": _named(
        "cp = scale (A^2/t + B - 2AC t - AD t^2 - C^2 t^3/3 - CD t^4/2 - D^2 t^5/5), t = 1 - T/Tc",
        "J/mol/K",
        "ABCD",
        "coefficients",
    ),
    "perry-vaporisation": _named("dh = A (1 - Tr)^(B + C Tr + D Tr^2)", "J/mol", "ABCD", "coefficients"),
    "polynomial": _polynomial,
    "shomate": _shomate,
    "trc-gas": _named(
        "cp/R = a0 + (a1/T^2) exp(-a2/T) + a3 y^2 + (a4 - a5/(T - a7)^2) y^8, y = (T - a7)/(T + a6), 0 below a7",
        "1",
        [f"a{number}" for number in range(8)],
        "a",
    ),
    "union": _union,
    "vdi-vaporisation": _named(
        "dh = R Tc (A t^(1/3) + B t^(2/3) + C t + D t^2 + E t^6), t = 1 - T/Tc", "J/mol", "ABCDE", "coefficients"
    ),
    "watson": _watson,
    "zabransky-cubic": _named(
        "c/R = A1 + A2 (T/100) + A3 (T/100)^2 + A4 (T/100)^3", "1", ("A1", "A2", "A3", "A4"), "a"
    ),
    "zabransky-quasi": _named(
        "c/R = A1 ln(1 - Tr) + A2/(1 - Tr) + A3 + A4 Tr + A5 Tr^2 + A6 Tr^3",
        "1",
        [f"A{number}" for number in range(1, 7)],
        "a",
    ),
}
#: Equations that have a text of their own; a test compares them with the registered ones.
KNOWN: Final = frozenset(_WRITERS) | {"table"}
