"""Which column of a table is what, and in which unit: by option, or by the words of its header."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from difflib import get_close_matches
from types import MappingProxyType

from propdb.errors import InvalidInput, NotFound, PropdbError, UnitError

__all__ = ["ROLES", "Column", "Component", "Layout", "bind", "pairs", "split_unit"]

#: What a column can be, and the header words that say so.
ROLES: Mapping[str, tuple[str, ...]] = MappingProxyType(
    {
        "species": ("species", "substance", "component", "compound"),
        "datum": ("datum", "from", "from datum"),
        "phase": ("phase",),
        "form": ("form",),
        "temperature": ("t", "temperature", "temp", "temp."),
        "pressure": ("p", "pressure", "press", "press."),
        "enthalpy": ("h", "enthalpy"),
        "flow": ("flow", "flow rate", "mass flow", "molar flow"),
        "stream": ("stream", "stream name"),
        "side": ("side", "direction", "in/out"),
        "vapour": ("vapour fraction", "vapor fraction", "vf"),
    }
)
_SAME_CASE = {"T", "temperature", "temp", "temp."}  # a bare t may be a time
_UNIT = re.compile(r"(?P<name>.*?)\s*(?:\[(?P<square>[^\[\]]*)\]|\((?P<round>[^()]*)\))\s*")
_COMPONENT = re.compile(r"\s*(?P<kind>[xyw])\s*\[(?P<species>[^\[\]]+)\]\s*(?:[\[(](?P<unit>[^\[\]()]*)[\])])?\s*")


@dataclass(frozen=True, slots=True)
class Column:
    """One column in its role: where it stands, what its header says, and the unit (text, "" where there is none)."""

    role: str
    index: int
    name: str
    unit: str = ""


@dataclass(frozen=True, slots=True)
class Component:
    """A composition column: ``x[nitrogen]`` (amount) or ``w[water]`` (mass); ``scale`` 0.01 for per cent."""

    index: int
    name: str
    species: str
    mass: bool
    scale: float = 1.0


@dataclass(frozen=True)
class Layout:
    """The columns of a table that have a role."""

    names: tuple[str, ...]
    columns: Mapping[str, Column] = field(default_factory=dict)
    components: tuple[Component, ...] = ()

    def get(self, role: str) -> Column | None:
        return self.columns.get(role)

    def index(self, role: str) -> int | None:
        column = self.columns.get(role)
        return None if column is None else column.index

    def used(self) -> list[int]:
        """Places of the columns that are read."""
        return sorted({c.index for c in self.columns.values()} | {c.index for c in self.components})


def _two_units(header: str) -> bool:
    name, second = split_unit(header)
    name, first = split_unit(name)
    return bool(name and first and second)


def split_unit(header: str) -> tuple[str, str]:
    """``h [kJ/kg]`` or ``T (°C)`` into name and unit; the unit is "" where none is written."""
    found = _UNIT.fullmatch(header)
    if found is None or not found["name"]:
        return header.strip(), ""
    return found["name"].strip(), (found["square"] or found["round"] or "").strip()


def pairs(texts: Iterable[str], option: str, roles: Iterable[str] = ROLES) -> dict[str, str]:
    """``ROLE=TEXT`` options as a mapping. Raises InvalidInput for anything else, or a role given twice."""
    known = list(roles)
    found: dict[str, str] = {}
    for text in texts:
        role, equals, value = text.partition("=")
        role = role.strip().lower()
        role = {"t": "temperature", "p": "pressure", "h": "enthalpy", "from": "datum"}.get(role, role)
        if not equals or not value.strip():
            raise InvalidInput(f"{text!r} is not ROLE=TEXT", where=option, hint=f"roles are {', '.join(known)}")
        if role not in known:
            near = get_close_matches(role, known, n=1)
            hint = f"did you mean {near[0]}?" if near else f"roles are {', '.join(known)}"
            raise InvalidInput(f"no role {role!r} of a column", where=option, hint=hint)
        if role in found:
            raise InvalidInput(f"{role} is given twice", where=option, hint="leave one out")
        found[role] = value.strip()
    return found


def bind(
    names: Sequence[str],
    *,
    chosen: Mapping[str, str] = MappingProxyType({}),
    units: Mapping[str, str] = MappingProxyType({}),
    fixed: Mapping[str, str] = MappingProxyType({}),
    where: str = "",
) -> Layout:
    """Find the columns of a table.

    Parameters
    ----------
    names : sequence of str
        The header, in order.
    chosen : mapping
        Role -> header, as options say; wins over the words of the header.
    units : mapping
        Role -> unit, for headers that carry none.
    fixed : mapping
        Role -> the option that gives one value for the whole table; a column of that role contradicts it.

    Raises
    ------
    NotFound
        A column that an option names is not there.
    InvalidInput
        Two columns for one role, a name that stands twice, two units for one column, a column and an option for one
        thing.
    """
    columns: dict[str, Column] = {}
    taken: set[int] = set()
    for role, name in chosen.items():
        index = _place(names, name, where)
        columns[role] = _column(role, index, names[index], units, where)
        taken.add(index)
    components = tuple(c for i, name in enumerate(names) if i not in taken and (c := _component(i, name, where)))
    taken |= {c.index for c in components}
    for role, words in ROLES.items():
        if role in columns:
            continue
        found = [i for i, name in enumerate(names) if i not in taken and _answers(name, role, words)]
        if not found:
            continue
        if len(found) > 1:
            shown = " and ".join(f"{names[i]!r} (column {i + 1})" for i in found)
            raise InvalidInput(
                f"{len(found)} columns for the {role}: {shown}",
                where=where,
                hint=f"choose one with --column {role}=NAME, or rename the other",
            )
        if role in fixed:
            raise InvalidInput(
                f"the {role} is given by {fixed[role]} and by the column {names[found[0]]!r}",
                where=where,
                hint=f"leave {fixed[role]} out, or rename the column",
            )
        columns[role] = _column(role, found[0], names[found[0]], units, where)
    for role in units:
        if role not in columns:
            raise InvalidInput(f"a unit for {role}, and no such column", where=where, hint="leave it out of --units")
    doubled = {c.species.casefold() for c in components if sum(d.species == c.species for d in components) > 1}
    if doubled:
        raise InvalidInput(f"two composition columns for {', '.join(sorted(doubled))}", where=where, hint="rename one")
    return Layout(tuple(names), columns, components)


def check_header(rows: Iterable[Sequence[str]], where: str) -> None:
    """Refuse a first row that names no columns where a later one does. Raises InvalidInput."""
    for number, names in enumerate(rows, start=1):
        if looks_like_header(names):
            if number == 1:
                return
            raise InvalidInput(
                f"its first row names no columns, and row {number} does", where=where, hint="delete the rows above it"
            )


def looks_like_header(names: Sequence[str]) -> bool:
    """Do two or more names of a row say what their columns are?"""
    roles = [role for role, words in ROLES.items() if any(_answers(name, role, words) for name in names)]
    return len(roles) + any(_COMPONENT.fullmatch(name) is not None for name in names) >= 2


def _answers(header: str, role: str, words: tuple[str, ...]) -> bool:
    name, _ = split_unit(header)
    if _two_units(header):
        name, _ = split_unit(name)
    if role == "temperature" and name not in _SAME_CASE and name.lower() == "t":
        return False
    return name.lower() in words


def _place(names: Sequence[str], name: str, where: str) -> int:
    found = [i for i, n in enumerate(names) if n.strip() == name] or [
        i for i, n in enumerate(names) if split_unit(n)[0] == name
    ]
    if len(found) > 1:
        places = " and ".join(str(i + 1) for i in found)
        raise InvalidInput(f"the column {name!r} stands twice ({places})", where=where, hint="rename one of them")
    if not found:
        near = get_close_matches(name, names, n=1, cutoff=0.5)
        hint = f"did you mean {near[0]!r}?" if near else f"the columns are {listed(names)}"
        raise NotFound(f"no column {name!r}", where=where, hint=hint)
    return found[0]


def listed(names: Sequence[str]) -> str:
    """Names for a message, not more than twelve."""
    shown = ", ".join(repr(n) for n in names[:12])
    return f"{shown} and {len(names) - 12} more" if len(names) > 12 else shown


def _column(role: str, index: int, header: str, units: Mapping[str, str], where: str) -> Column:
    if _two_units(header):
        raise InvalidInput(f"two units for the {role} in the header {header!r}", where=where, hint="leave one out")
    _, unit = split_unit(header)
    given = units.get(role, "")
    if unit and given and not _same_unit(role, unit, given):
        raise InvalidInput(
            f"two units for the {role}: {unit!r} in the header {header!r} and {given!r} by option",
            where=where,
            hint="leave the option out, or correct the header",
        )
    return Column(role, index, header, given or unit)


def _same_unit(role: str, first: str, second: str) -> bool:
    if first == second:
        return True
    from propdb.units import parse_unit

    try:
        if role == "pressure" and second.partition("+")[0].strip() == first:
            return True  # p [barg] and --units pressure=barg+1.01325bar
        return role == "enthalpy" and parse_unit(first) == parse_unit(second)
    except PropdbError:
        return False


def _component(index: int, header: str, where: str) -> Component | None:
    found = _COMPONENT.fullmatch(header)
    if found is None:
        return None
    unit = (found["unit"] or "1").strip().lower()
    scales = {"1": 1.0, "-": 1.0, "": 1.0, "%": 0.01, "mol%": 0.01, "mol %": 0.01, "wt%": 0.01, "wt %": 0.01}
    scales |= {"mol/mol": 1.0, "kg/kg": 1.0, "vol%": 0.01, "vol %": 0.01}
    if unit not in scales:
        raise UnitError(f"{unit!r} is no unit of a fraction", where=f"{where}, column {header!r}", hint="write 1 or %")
    return Component(index, header, found["species"].strip(), found["kind"] == "w", scales[unit])
