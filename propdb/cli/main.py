"""``propdb``: the table of verbs, and what stands between a verb and the person who typed it.

A new verb is one module with an ``app`` and one line in :data:`VERBS`.
"""

from __future__ import annotations

import errno
import io
import os
import re
import sys
from collections.abc import Mapping, Sequence
from types import MappingProxyType
from typing import Annotated

import typer

from propdb._version import __version__
from propdb.cli.app import MINUS, AsOfOption, JsonOption, PipeClosed, StoreOption, VerbGroup, merge, note, write
from propdb.errors import InvalidInput, PropdbError

#: Verb -> module that holds it, one line of help.
VERBS: Mapping[str, tuple[str, str]] = MappingProxyType(
    {
        "find": ("propdb.cli.find", "Find species by name, formula, CAS RN or InChIKey."),
        "show": ("propdb.cli.show", "Show every entry of a species with source, range and datum."),
        "enthalpy": ("propdb.cli.enthalpy", "Give the enthalpy of a state on a datum, step by step."),
        "convert": ("propdb.cli.convert", "Move a tabulated enthalpy from one datum to another."),
        "convert-table": ("propdb.cli.convert_table", "Convert or compute the enthalpies of a whole table."),
        "tabulate": ("propdb.cli.tabulate", "Tabulate enthalpy and heat capacity over temperature."),
        "reaction": ("propdb.cli.reaction", "Give the enthalpy of a reaction by two routes."),
        "datum": ("propdb.cli.datum", "List, show and add datums."),
        "source": ("propdb.cli.source", "List, show and cite sources."),
        "entry": ("propdb.cli.entry", "Show one entry with all that is known about it, and its history."),
        "add": ("propdb.cli.add", "Add values of your own as drafts, from a template or asked for one by one."),
        "import": ("propdb.cli.import_", "Bring in a file as drafts: a filled template or ThermoML."),
        "review": ("propdb.cli.review", "Check and approve what others added; raise and settle doubts."),
        "fuel": ("propdb.cli.fuel", "Add fuels from an ultimate analysis and a calorific value, and show them."),
        "store": ("propdb.cli.store", "Look after the store: info, check, path, log, setting, rebuild, backup."),
    }
)

CAUTION = (
    "Values are for engineering judgement. They do not replace local codes or licensed practice;\n"
    "verify every value used for design against its source."
)
_NEGATIVE = re.compile(r"-(?=\.?[0-9])")
_INTERRUPTED = 130
_PIPE_CLOSED = 141
_BUG = 70


class _Verbs(VerbGroup):
    """The verbs of propdb."""

    table = VERBS


_app = typer.Typer(cls=_Verbs, rich_markup_mode=None, pretty_exceptions_enable=False)


def _version(wanted: bool) -> None:
    if wanted:
        write(f"propdb {__version__}\n{CAUTION}")
        raise typer.Exit


@_app.callback(
    help="Thermochemical data with source, range and zero attached; enthalpies moved from one datum to another.",
    epilog=CAUTION.replace("\n", " "),
)
def _root(
    ctx: typer.Context,
    version: Annotated[
        bool, typer.Option("--version", callback=_version, is_eager=True, help="Print the version and a caution.")
    ] = False,
    store: StoreOption = None,
    as_of: AsOfOption = None,
    json: JsonOption = False,
) -> None:
    merge(ctx, store, as_of, json)


def run(arguments: Sequence[str] | None = None) -> None:
    """Run one command line (default: that of the process) and exit with its code."""
    for name in ("stdout", "stderr"):
        if getattr(sys, name) is None:  # closed by the shell
            setattr(sys, name, io.StringIO())
        _prepare(getattr(sys, name))
    words = [_NEGATIVE.sub(MINUS, word, count=1) if _NEGATIVE.match(word) else word for word in _words(arguments)]
    try:
        code = _run(words)
        sys.stdout.flush()
    except (PipeClosed, BrokenPipeError):
        code = _close_pipe()
    except KeyboardInterrupt:
        code = _INTERRUPTED
    except OSError as error:
        note(_line(f"the output cannot be written: {error.strerror or error}"))
        _close_pipe()
        code = 1
    sys.exit(code)


def _words(arguments: Sequence[str] | None) -> list[str]:
    return list(sys.argv[1:] if arguments is None else arguments)


def _run(words: list[str]) -> int:
    try:
        code = typer.main.get_command(_app).main(words, prog_name="propdb", standalone_mode=False)
    except PropdbError as error:
        note(_line(str(error)))
        return error.exit_code
    except typer.TyperException as error:
        context = getattr(error, "ctx", None)
        where = context.command_path if context is not None else "propdb"
        note(_line(f"{error.format_message().rstrip('.')}; type {where} --help".replace(MINUS, "-")))
        return error.exit_code
    except typer.Abort:
        return _INTERRUPTED
    except (PipeClosed, BrokenPipeError):
        raise
    except UnicodeError as error:
        note(_line(f"{getattr(error, 'object', 'an argument')!r} is not text in UTF-8; type it again"))
        return InvalidInput.exit_code
    except OSError as error:
        if error.errno == errno.EPIPE:
            raise
        if error.filename is None:
            raise
        note(_line(f"{error.filename}: {error.strerror or error}"))
        return 1
    except Exception as error:
        if os.environ.get("PROPDB_TRACEBACK"):
            raise
        kind = type(error).__name__
        note(_line(f"a fault in propdb itself: {kind}: {error}; set PROPDB_TRACEBACK=1 to see where, and report it"))
        return _BUG
    return code if isinstance(code, int) else 0


def _line(text: str) -> str:
    return "propdb: " + " ".join(text.split())


def _prepare(stream: object) -> None:
    """Let a stream that cannot write a character write something like it."""
    encoding = (getattr(stream, "encoding", None) or "").lower().replace("-", "")
    if encoding not in ("utf8", "utf16", "utf32"):
        from propdb.cli.plain import use_plain_characters

        use_plain_characters(stream)


def _close_pipe() -> int:
    """Point standard output nowhere, so that the interpreter does not complain when it flushes at exit."""
    try:
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, sys.stdout.fileno())
    except (OSError, ValueError):
        pass
    return _PIPE_CLOSED
