"""Every example in a help text runs, and the start of a look-up loads nothing heavy."""

from __future__ import annotations

import shlex
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest
from table_samples import write_samples
from verbs import commands

from propdb.cli.main import VERBS

COMMANDS = commands()
EXAMPLES = [example for command in COMMANDS.values() for example in command.examples]


@pytest.mark.parametrize("verb", COMMANDS)
def test_every_verb_has_help_and_an_example_of_itself(line: Any, verb: str) -> None:
    command = COMMANDS[verb]
    result = line(f"{verb} --help")
    assert result.code == 0
    assert command.help
    assert command.examples
    for example in command.examples:
        assert example in result.out
        assert example.startswith(f"propdb {verb}")
    for param in command.params:
        assert param.help, f"{verb} {param.name} is not explained"


#: What must have happened before the example of a verb.
BEFORE = {
    "review approve": ("review check e03c1457",),
    "review reject": ("review check e03c1457",),
    "review waive": ("review dispute e03c1457 --comment why",),
}


@pytest.mark.parametrize("example", EXAMPLES)
def test_example_runs(
    line: Any, example: str, own_store: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("PROPDB_STORE", str(own_store))
    monkeypatch.setenv("PROPDB_USER", "ada")
    for first in BEFORE.get(" ".join(example.split()[1:3]), ()):
        assert line(first).code == 0
    if "my-datums.toml" in example:
        (tmp_path / "my-datums.toml").write_text(line("datum show own:g@50C --toml").out, encoding="utf-8")
    if example.startswith("propdb fuel "):
        monkeypatch.setenv("PROPDB_USER", "Example")
        (tmp_path / "my-fuel.toml").write_text(line("fuel template").out, encoding="utf-8")
        if example.startswith("propdb fuel show "):
            line("fuel add my-fuel.toml")
    if "my-values.csv" in example:
        text = line("add --template csv").out.replace("\n# ethanol,", "\nethanol,")
        (tmp_path / "my-values.csv").write_text(text, encoding="utf-8")
    if "convert-table" in example:
        pytest.importorskip("pyarrow")
        write_samples(tmp_path)
    result = line(*shlex.split(example))
    assert result.code == 0, result.err
    assert result.out or result.err


def test_help_wraps_nothing_away(line: Any) -> None:
    text = line("--help").out
    for verb, (_, words) in VERBS.items():
        assert verb in text
        assert words.split()[0] in text


HEAVY = """
numpy pandas scipy chemicals thermo fluids sqlite_utils rich pydantic platformdirs rapidfuzz importlib.metadata pyarrow
jinja2 matplotlib
""".split()


@pytest.mark.parametrize(
    "words", ["find water", "show water", "show water --json", "source list", "--help", "--version"]
)
def test_a_look_up_loads_nothing_heavy(default_store: Path, words: str) -> None:
    code = (
        "import sys\n"
        f"sys.argv = ['propdb', *{shlex.split(words)!r}]\n"
        "from propdb.cli import main\n"
        "try:\n    main()\n"
        "finally:\n"
        f"    print('loaded', [name for name in {HEAVY!r} if name in sys.modules], file=sys.stderr)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, encoding="utf-8", check=True)
    assert done.stderr == "loaded []\n"


def test_help_loads_no_verb() -> None:
    code = (
        "import sys\n"
        "sys.argv = ['propdb', '--help']\n"
        "from propdb.cli import main\n"
        "try:\n    main()\n"
        "finally:\n"
        "    print(*(name for name in sys.modules if name.startswith('propdb')), file=sys.stderr)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    loaded = set(done.stderr.split())
    assert not loaded & {module for module, _ in VERBS.values()}
    assert "propdb.api" not in loaded


def test_python_m_propdb(default_store: Path) -> None:
    done = subprocess.run([sys.executable, "-m", "propdb", "store", "path"], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == str(default_store)
