"""Generated command lines from the real verbs and options, with values right and odd: one line of complaint at most.

Three hundred in the normal run, twenty thousand with ``--full``.
"""

from __future__ import annotations

import io
import json
import shlex
import shutil
import sqlite3
import sys
import time
from collections import Counter
from collections.abc import Iterator
from contextlib import closing
from pathlib import Path
from typing import Any

import pytest
from fuel_samples import sample
from hypothesis import HealthCheck, Phase, given, settings
from hypothesis import strategies as st
from soak_samples import template_csv, template_toml
from thermoml_samples import curve, report
from verbs import commands

import propdb
from propdb.cli.convert_table import BAD_ROWS
from propdb.cli.main import run
from propdb.datum.writing import dump_toml
from propdb.store.backup import check

VERBS = commands()
#: Verbs and options that take long; seldom drawn.
SLOW = {
    "store rebuild": 300,
    "--without-open-data": 60,
    "store check": 6,
    "--verify": 6,
    "--coverage": 6,
    "--crosscheck": 3,
}
#: Options that are given in so many of 40 lines; 8 for the others.
OFTEN = {"temperature": 36, "store": 0, "as_of": 1, "source": 2, "form": 3, "saturated": 3, "pressure": 3}
#: A row that can be converted, and some that cannot.
TABLE = """\
species,phase,T [C],h [kJ/kg]
water,l,25,104.8
water,l,x,1
nobody,g,25,1
nitrogen,g,1e9,0
methane,g,,
"""
JSON = {verb for verb, command in VERBS.items() if any(param.name == "json" for param in command.params)}
#: What these print is no JSON, whatever else is asked for.
OTHER = ("--help", "--version", "--template", "--toml")
BUG = 70

FILES = ("mine.csv", "mine.toml", "bad.csv", "fuel.toml", "datum.toml", "paper.xml", "odd.bin", "empty", "folder", "no")
#: By option or argument, what makes sense there. @0 to @5 stand for ids of drafts.
SENSE: dict[str, tuple[str, ...]] = {
    "text": ("water", "C2H6O", "64-17-5", "eth", "H2O", "solvent", "XLYOFNOQVPJJNP-UHFFFAOYSA-N", "h", "α"),
    "species": ("water", "nitrogen", "methane", "carbon", "ammonia", "C2H6O", "7732-18-5", "solvent mine", "test wood"),
    "quantity": ("Hf", "Cp", "Hvap", "hf", "S"),
    "phase": ("g", "l", "cr", "am", "fluid", "aq", "cr:graphite", "steam"),
    "form": ("graphite", "diamond", "rhombic", "soot"),
    "datum": ("elements-298K", "gas-25C", "steam-triple-point", "elements-same-T", "elements-0K", "own:l@65C",
              "works", "own:g@60F", "own:l,saturated@0C=200kJ/kg", "combustion-net-25C", "oxides-298K", "own:q@1"),
    "temperature": ("25C", "298.15", "600C", "1000K", "1571.67R", "-40F", "0K", "50000K", "1e5K", "273.16K", "-300C"),
    "pressure": ("40bar", "1atm", "0.1MPa", "600psi", "1e9bar", "-1bar", "0bar", "101325"),
    "saturated": ("liquid", "vapour", "vapor"),
    "unit": ("kJ/mol", "kJ/kg", "BTU/lb", "cal/mol", "kcal_th/kmol", "kWh/Nm3", "kJ/mol/K", "J", "kJ//kg"),
    "value": ("2800.8", "-393.51", "2800.8 kJ/kg", "1,5", "1e400", "nan", "-.5e3", "on", "off"),
    "equation": ("CH4(g) + 2 O2(g) -> CO2(g) + 2 H2O(l)", "H2(g) + 1/2 O2(g) = H2O(g)", "H2O(l) -> H2O(g)",
                 "C(cr:graphite) + O2(g) -> CO2(g)", "H2O(l) <=> H+(aq) + OH-(aq)", "H2(g) -> H2O(g)", "-> H2O(g)",
                 "1/0 H2(g) -> H2(g)", "2 2 H2(g) -> x"),
    "key": ("codata-1989", "nbs-1982", "sheet-mine", "codata"),
    "source": ("codata-1989", "nbs-1982,codata-1989", "sheet-mine", "nobody-1900", ","),
    "format": ("text", "bibtex", "csl-json", "xml"),
    "id": ("e03c1457", "e", "@0", "@1", "ffffffffffffffffffff", "E03C"),
    "entries": ("e03c1457", "e", "@0", "@1", "@2", "@3", "@4", "@5", "1a9c3e67"),
    "comment": ("as printed", "it is so", "'; DROP TABLE entry; --", "x" * 5000, "\x1b[31m", " "),
    "finding": ("bounds", "", "replaced"),
    "name": ("gas-25C", "own:l@65C", "works", "self-review", "own:g@boiling"),
    "template": ("csv", "toml", "xlsx"),
    "basis": ("ar", "dry", "daf", "air-dried", "wet"),
    "fuel": ("test wood", "water", "coal"),
    "limit": ("1", "0", "-1", "1000000", "1.5", "99999999999999999999"),
    "last": ("1", "5", "0", "-2", "99999999999999999999", "x"),
    "as_of": ("2999-01-01", "1999-01-01", "2025-13-01", "today", "0001-01-01", "9999-12-31", "2025-01-01T00:00+99:00"),
    "store": ("no.db", "empty", "mine.csv", "folder", "", "new.db"),
    "file": FILES, "path": FILES, "values": FILES, "table": ("table.csv", "table.csv", *FILES),
    "out": ("out.csv", "out.tsv", "out.json", "out.xlsx", "out.parquet", "folder", "table.csv", "no/out.csv", "out"),
    "low": ("25C", "0K", "100K", "-40F", "-300C"), "high": ("1000C", "300K", "25C", "1e9K", "2000K"),
    "step": ("25K", "100K", "50F", "0K", "-5K", "1e-9K", "1e99K", "nan"),
    "column": ("enthalpy=h [kJ/kg]", "phase=phase", "flow=x", "x=y", "=", "species"),
    "units": ("temperature=C", "pressure=bar", "flow=kg/h", "flow=x", "enthalpy=kJ"),
    "composition": ("wet", "dry", "damp"), "decimal": ("point", "comma", "dot"), "digits": ("2", "0", "-1", "400"),
    "sheet": ("Sheet1", "no"), "scheduler": ("no", ""), "workers": ("1", "0", "-3", "x", "1000000"),
}  # fmt: skip
ODD = (
    "", " ", "-", "--", "---", "-1", "--json", "--help", "-h", "−5", "0", "NaN", "inf", "1e308", "1e-400", "9" * 400,
    "1_000", "0x10", "%s", "{}", "{0}", "[", "(", ")))", "((((", "\\", "'", '"', "\n", "\t", "\x00", "\x1b]0;x\x07",
    "\ufeff", "\u202e", "\ud800", "é", "💧", "Ω", "²", "٣", "H" * 300, "C1000000000000H2", "H2O" * 50, "=", "@", "@@",
    "own:", "own:@", "own:l@", "own:l@=", "=1kJ", "a/b", "..", ".", "*", "?", "::", "x:y:z", "null", "true", "None",
    "e-", "H+", "+", "e-(g)",
)  # fmt: skip
_TEXT = st.text(st.characters(exclude_characters="/\\"), max_size=12)  # no path that leads out of the directory
_ANY = st.sampled_from(sorted({value for values in SENSE.values() for value in values}))


@st.composite
def _word(draw: st.DrawFn, name: str) -> str:
    kind = draw(st.integers(0, 19))  # small numbers come more often
    if kind < 17 and name in SENSE:
        return draw(st.sampled_from(SENSE[name]))
    return draw((_ANY, st.sampled_from(ODD), _TEXT)[kind % 3])


def _kept(draw: st.DrawFn, what: str) -> bool:
    return what not in SLOW or draw(st.integers(0, SLOW[what])) == SLOW[what] // 2 + 1


@st.composite
def _lines(draw: st.DrawFn) -> list[str]:
    """A verb with its arguments and some of its options, most of those that it needs, and now and then a stray word."""
    verb = draw(st.sampled_from(sorted(VERBS)))
    if not _kept(draw, verb):
        verb = "find"
    parts: list[list[str]] = []
    for param in VERBS[verb].params:
        often = OFTEN.get(param.name, 20 if param.param_type_name == "argument" else 8)
        chance = draw(st.integers(0, 39))
        if (chance == 39 if param.required else chance < 40 - often) or not _kept(draw, param.opts[0]):
            continue
        if param.param_type_name == "argument":
            count = draw(st.integers(1, 3)) if param.nargs == -1 else 1
            parts += [[draw(_word(param.name))] for _ in range(count)]
        elif param.is_flag:
            parts.append([param.opts[0]])
        else:
            value = draw(_word(param.name))
            parts.append([f"{param.opts[0]}={value}"] if draw(st.booleans()) else [param.opts[0], value])
    stray = draw(st.integers(0, 30))
    if stray == 20:
        parts.append([draw(st.sampled_from(ODD))])
    elif stray == 21 and parts:
        parts.pop(draw(st.integers(0, len(parts) - 1)))
    elif stray == 22 and parts:
        parts.append(draw(st.sampled_from(parts)))
    words = verb.split()
    if stray == 23:
        words = draw(st.sampled_from([[], words[:1], [*words, "nothing"], ["--json", *words], [draw(_TEXT), *words]]))
    return words + [word for part in draw(st.permutations(parts)) for word in part]


class World:
    """A directory with files and a store, and what came of the command lines."""

    def __init__(self, folder: Path, store: Path, drafts: list[str], files: dict[Path, bytes]) -> None:
        self.folder, self.store, self.drafts, self.files = folder, store, drafts, files
        self.came: Counter[str] = Counter()
        self.codes: Counter[int] = Counter()
        self.slowest = (0.0, "")  # [s]

    def tidy(self) -> None:
        """Put everything back but the store."""
        for path in (*self.folder.iterdir(), *(self.folder / "folder").iterdir()):
            if path.name.startswith("store.db") or path.name == "folder" or path in self.files:
                continue
            if path.is_dir():
                shutil.rmtree(path)
            else:
                path.unlink()
        for path, content in self.files.items():
            if not path.exists() or path.read_bytes() != content:
                path.write_bytes(content)

    def counts(self) -> tuple[int, ...]:
        """Own rows of each kind, events, entries."""
        with closing(sqlite3.connect(self.store)) as conn:
            sql = ", ".join(f"(SELECT count(*) FROM {table} WHERE own)" for table in OWN)
            rest = "(SELECT count(*) FROM event), (SELECT count(*) FROM entry), (SELECT count(*) FROM carrier)"
            return tuple(conn.execute(f"SELECT {sql}, {rest}").fetchone())


OWN = ("base_entry", "species", "source", "datum", "policy", "lineage")


@pytest.fixture(scope="module")
def world(tmp_path_factory: pytest.TempPathFactory) -> Iterator[World]:
    folder = tmp_path_factory.mktemp("fuzz")
    path = folder / "store.db"
    (folder / "folder").mkdir()
    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(folder)
        patch.setenv("PROPDB_USER", "ada")
        with propdb.open() as base:
            base.store_backup(path)
            datum = dump_toml(base.datum_show("own:l@65C")).replace("own-l-65C", "works")
        patch.setenv("PROPDB_STORE", str(path))
        texts = {
            "mine.csv": template_csv("mine"),
            "mine.toml": template_toml("other"),
            "bad.csv": template_csv("bad").replace("48.2", "48,2"),
            "fuel.toml": _fuel(),
            "datum.toml": datum,
            "paper.xml": report(curve()),
            "empty": "",
            "table.csv": TABLE,
        }
        files = {folder / name: text.encode() for name, text in texts.items()} | {folder / "odd.bin": bytes(range(256))}
        for file, content in files.items():
            file.write_bytes(content)
        for tag in ("first", "second"):
            (folder / "new.csv").write_text(template_csv(tag), encoding="utf-8")
            with propdb.open(path) as store:
                store.add(folder / "new.csv")
        with propdb.open(path) as store:
            drafts = sorted(waiting.entry.id for waiting in store.review_list() if waiting.author == "ada")
        world = World(folder, path, drafts, files)
        world.tidy()
        patch.setenv("PROPDB_TRACEBACK", "1")  # a fault raises here
        yield world
    assert check(path) == []
    print(f"{world.codes.total()} command lines, by exit code: {dict(sorted(world.codes.items()))}")
    print(f"{len(world.came)} pairs of verb and exit code, the slowest line {world.slowest}")
    if world.codes.total() >= 300:  # else a failure was being narrowed down
        assert world.codes[0] > 60, "hardly anything gets beyond the parser"


def _fuel() -> str:
    """The sample as TOML."""
    data = sample()
    lines = [f"{key} = {json.dumps(value)}" for key, value in data.items() if not isinstance(value, dict)]
    for name, table in data.items():
        if isinstance(table, dict):
            lines += [f"[{name}]", *(f"{key} = {json.dumps(value)}" for key, value in table.items())]
    return "\n".join(lines) + "\n"


def _no_constant(text: str) -> None:
    raise AssertionError(f"{text} in JSON")


def typed(words: list[str], user: str) -> tuple[int, str, str]:
    """Run a command line as if typed, with nobody at the keyboard: exit code, what it printed, its messages."""
    out, err = (io.TextIOWrapper(io.BytesIO(), encoding="utf-8", newline="\n", errors="backslashreplace") for _ in "12")
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(sys, "stdout", out)
        patch.setattr(sys, "stderr", err)
        patch.setattr(sys, "stdin", io.StringIO())
        patch.setenv("PROPDB_USER", user)
        with pytest.raises(SystemExit) as stop:
            run(words)
    texts = []
    for stream in (out, err):
        stream.flush()
        texts.append(stream.buffer.getvalue().decode())  # type: ignore[attr-defined]
    assert isinstance(stop.value.code, int)
    return stop.value.code, *texts  # type: ignore[return-value]


def attempt(world: World, line: list[str], user: str) -> None:
    """Type one line, and look at what it printed and left."""
    words = [world.drafts[int(word[1])] if word[:1] == "@" and word[1:] in tuple("012345") else word for word in line]
    before = world.counts()
    began = time.perf_counter()
    code, out, err = typed(words, user)
    world.slowest = max(world.slowest, (round(time.perf_counter() - began, 1), shlex.join(words)))
    after = world.counts()
    world.tidy()
    verb = " ".join(line[:2]) if " ".join(line[:2]) in VERBS else line[0] if line and line[0] in VERBS else "-"
    world.came[f"{verb} {code}"] += 1
    world.codes[code] += 1
    shown = shlex.join(words)
    assert code != BUG, (shown, err)
    assert 0 <= code <= BAD_ROWS, (shown, code, err)
    assert "Traceback" not in err, (shown, err)
    assert not {"\x00", "\x07", "\x1b", "\u202e"} & {*out, *err}, shown
    if code not in (0, BAD_ROWS):
        last = err.splitlines()[-1]
        assert last.startswith("propdb: "), (shown, err)
        assert len(last) > len("propdb: x"), shown
        assert after == before, (shown, "refused, and something was written")
    elif "--json" in words and verb in JSON and not any(word.startswith(OTHER) for word in words):
        for text in _texts(out):
            json.loads(text, parse_constant=_no_constant)
    if sum(world.codes.values()) % 100 == 0:
        assert check(world.store) == [], shown


def _texts(out: str) -> list[str]:
    """One JSON text, or one on each line."""
    return [out] if out.startswith("{\n") else out.splitlines()


USERS = st.sampled_from(["ada", "ben", "ben", "cid", "", " ", "x" * 200, "\x1b[1m", "Ada"])
#: Explaining a failure traces every line, and takes minutes.
_PHASES = [phase for phase in Phase if phase is not Phase.explain]
_QUIET: dict[str, Any] = {"deadline": None, "suppress_health_check": list(HealthCheck), "phases": _PHASES}


@settings(max_examples=300, **_QUIET)
@given(line=_lines(), user=USERS)
def test_command_lines(world: World, line: list[str], user: str) -> None:
    attempt(world, line, user)


@pytest.mark.full
@settings(max_examples=20_000, **_QUIET)
@given(line=_lines(), user=USERS)
def test_many_command_lines(world: World, line: list[str], user: str) -> None:
    attempt(world, line, user)
