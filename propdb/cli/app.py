"""What every verb is made of: a command that starts fast, the options that all share, and the call it is given.

A verb module holds an ``app`` and one function for each verb, decorated with :func:`verb`. The function gets a
:class:`Call`; it calls one method of ``call.store`` and hands what it got to ``call.show``.
"""

from __future__ import annotations

import inspect
import re
import sys
from collections.abc import Callable, Iterable, Mapping
from typing import TYPE_CHECKING, Annotated, Any, cast

import typer
from typer.core import TyperCommand, TyperGroup

from propdb.errors import InvalidInput

if TYPE_CHECKING:
    from propdb.api import Store

MINUS = "\u2212"  # stands for the hyphen of a negative number while the arguments are parsed

StoreOption = Annotated[str | None, typer.Option("--store", metavar="FILE", help="Store to use.", show_default=False)]
AsOfOption = Annotated[
    str | None, typer.Option("--as-of", metavar="DATE", help="The store as it stood then.", show_default=False)
]
JsonOption = Annotated[bool, typer.Option("--json", help="Print JSON instead of text.")]
_SHARED = {"store": StoreOption, "as_of": AsOfOption, "json": JsonOption}


class PipeClosed(Exception):
    """Nobody reads standard output any more."""


_CONTROL = re.compile("[\x00-\x08\x0b-\x1f\x7f-\x9f\u061c\u200e\u200f\u2028-\u202e\u2066-\u2069\ud800-\udfff]")


def _harmless(text: str) -> str:
    """Control characters that got into a name or a comment as ``\\x1b``, so that they control nothing."""
    return _CONTROL.sub(lambda found: ascii(found[0])[1:-1], text)


def write(text: str) -> None:
    """Print a text on standard output, control characters escaped."""
    text = _harmless(text)
    try:
        sys.stdout.write(text if text.endswith("\n") else text + "\n")
    except BrokenPipeError as error:
        raise PipeClosed from error


def note(text: str) -> None:
    """Print a message on standard error."""
    print(_harmless(text), file=sys.stderr, flush=True)


class Call:
    """One use of a verb: the store it is about, and how to print what comes back."""

    def __init__(self, store: str | None, as_of: str | None, json: bool) -> None:
        self.path = store
        self.as_of = as_of
        self.json = json
        self._store: Store | None = None

    @property
    def store(self) -> Store:
        """The store, opened when first needed."""
        if self._store is None:
            import propdb

            self._store = propdb.open(self.path, as_of=self.as_of)
        return self._store

    @property
    def unopened(self) -> Store:
        """The store without a look at its file: for the verbs that make one, or say where it would be."""
        from propdb.api import Store
        from propdb.store.open import default_path

        return Store(self.path or default_path())

    def show(self, data: Callable[[], Any], text: Callable[[], str]) -> None:
        """Print ``data()`` as JSON if that was asked for, else ``text()``."""
        if self.json:
            from propdb.cli.jsontext import dumps

            write(dumps(data()))
        else:
            write(text())

    def show_lines(self, data: Callable[[], Iterable[Any]], text: Callable[[], str]) -> None:
        """Print each of ``data()`` as one line of JSON if JSON was asked for, else ``text()``."""
        if not self.json:
            write(text())
            return
        from propdb.cli.jsontext import dumps

        for one in data():
            write(dumps(one, indent=None))


class _Plain:
    """Coercion of an argument that is text, a flag or a whole number.

    Typer builds a pydantic validator for each argument, and loading pydantic takes longer than all else that a
    look-up does.
    """

    def __init__(self, annotation: Any) -> None:
        self._whole = annotation is int

    def coerce(self, value: Any, param: Any, ctx: Any) -> Any:
        if value is None:
            return () if param.multiple or param.nargs == -1 else None
        if isinstance(value, (list, tuple)):
            return [self._one(item, param, ctx) for item in value]
        return self._one(value, param, ctx)

    def _one(self, value: Any, param: Any, ctx: Any) -> Any:
        if isinstance(value, str) and value.startswith(MINUS):
            value = "-" + value[1:]
        if not self._whole or isinstance(value, int):
            return value
        try:
            return int(value)
        except ValueError:
            raise typer.BadParameter(f"{value!r} is not a whole number", ctx=ctx, param=param) from None


def _made_plain(params: list[Any]) -> list[Any]:
    """Give parameters of text, flags and whole numbers the coercion above, unless typer has changed beneath."""
    for param in params:
        annotation = getattr(getattr(param, "type_descriptor", None), "annotation", None)
        if annotation in (str, bool, int, list[str]) and hasattr(param, "_runtime_param"):
            param._runtime_param = _Plain(annotation)
    return params


class VerbCommand(TyperCommand):
    """A command without start-up cost, with examples at the end of its help."""

    def __init__(self, *args: Any, **attributes: Any) -> None:
        super().__init__(*args, **attributes)
        self.examples: tuple[str, ...] = getattr(self.callback, "examples", ())

    def get_params(self, ctx: Any) -> list[Any]:
        """Parameters, ``--help`` among them."""
        return _made_plain(super().get_params(ctx))

    def format_epilog(self, ctx: Any, formatter: Any) -> None:
        """Write the examples, one a line."""
        if self.examples:
            with formatter.section("Example" if len(self.examples) == 1 else "Examples"):
                for example in self.examples:
                    formatter.write(f"  {example}\n")


class VerbGroup(TyperGroup):
    """A group whose verbs are loaded when they are called.

    ``table`` maps each verb to the module that holds it and one line of help; a subclass fills it, or leaves it empty
    and lists its commands in the usual way.
    """

    table: Mapping[str, tuple[str, str]] = {}

    def get_params(self, ctx: Any) -> list[Any]:
        """Parameters, ``--help`` among them."""
        return _made_plain(super().get_params(ctx))

    def list_commands(self, ctx: Any) -> list[str]:
        """Verbs in the order of the table."""
        return [*self.table, *super().list_commands(ctx)]

    def get_command(self, ctx: Any, cmd_name: str) -> Any:
        """Load one verb."""
        if cmd_name in self.table and cmd_name not in self.commands:
            from importlib import import_module

            command = typer.main.get_command(import_module(self.table[cmd_name][0]).app)
            command.name = cmd_name
            return command
        return super().get_command(ctx, cmd_name)

    def format_commands(self, ctx: Any, formatter: Any) -> None:
        """List the verbs without loading them."""
        if not self.table:
            super().format_commands(ctx, formatter)
            return
        with formatter.section("Verbs"):
            formatter.write_dl([(name, line) for name, (_, line) in self.table.items()])

    def parse_args(self, ctx: Any, args: list[str]) -> list[str]:
        """Show the help when there is nothing to do."""
        if not args and not ctx.resilient_parsing:
            write(ctx.get_help())
            ctx.exit()
        return super().parse_args(ctx, args)

    def resolve_command(self, ctx: Any, args: list[str]) -> Any:
        """Name the verb that was probably meant."""
        name = args[0]
        known = self.list_commands(ctx)
        if name not in known and not name.startswith("-"):
            from difflib import get_close_matches

            near = get_close_matches(name, known, n=1)
            hint = f"did you mean {ctx.command_path} {near[0]}?" if near else f"type {ctx.command_path} --help"
            raise InvalidInput(f"there is no verb {name!r}", hint=hint)
        return super().resolve_command(ctx, args)


class _Typer(typer.Typer):
    """An app of ours: no markup in help, no completion options, no pretty tracebacks."""

    def __init__(self, **attributes: Any) -> None:
        super().__init__(
            add_completion=False, rich_markup_mode=None, pretty_exceptions_enable=False, cls=VerbGroup, **attributes
        )


def single() -> typer.Typer:
    """Make the app of a module that holds one verb."""
    return _Typer()


def family(text: str) -> typer.Typer:
    """Make the app of a module that holds several verbs (``datum list``, ``datum show`` ...)."""
    app = _Typer(help=text)

    @app.callback(help=text)
    def remember(
        ctx: typer.Context, store: StoreOption = None, as_of: AsOfOption = None, json: JsonOption = False
    ) -> None:
        merge(ctx, store, as_of, json)

    return app


def merge(ctx: typer.Context, store: str | None, as_of: str | None, json: bool) -> Call:
    """Combine the shared options given here with those given before the verb; what stands later wins."""
    before: Call | None = ctx.obj
    if before is not None:
        store, as_of, json = store or before.path, as_of or before.as_of, json or before.json
    ctx.obj = Call(store, as_of, json)
    return cast("Call", ctx.obj)


def verb(
    app: typer.Typer, *examples: str, name: str | None = None, without: Iterable[str] = ()
) -> Callable[[Callable[..., None]], Callable[..., None]]:
    """Register a function as a verb of ``app``, with the shared options and examples for its help.

    Parameters
    ----------
    app
        The app of the module.
    examples
        Command lines, each of which a test runs.
    name
        Name of the verb, where it is not that of the function.
    without
        Shared options that mean nothing for this verb: ``json``, ``as_of``.
    """

    def register(function: Callable[..., None]) -> Callable[..., None]:
        signature = inspect.signature(function, eval_str=True)
        own = list(signature.parameters.values())[1:]
        shared = {key: annotation for key, annotation in _SHARED.items() if key not in without}

        def run(ctx: typer.Context, **arguments: Any) -> None:
            given = {key: arguments.pop(key) for key in shared}
            call = merge(ctx, given.get("store"), given.get("as_of"), given.get("json", False))
            function(call, **arguments)

        keyword = inspect.Parameter.KEYWORD_ONLY
        parameters = [inspect.Parameter("ctx", inspect.Parameter.POSITIONAL_ONLY, annotation=typer.Context)]
        parameters += [parameter.replace(kind=keyword) for parameter in own]
        parameters += [
            inspect.Parameter(key, keyword, default=False if key == "json" else None, annotation=annotation)
            for key, annotation in shared.items()
        ]
        run.__signature__ = signature.replace(parameters=parameters)  # type: ignore[attr-defined]
        run.__annotations__ = {}
        run.__doc__ = function.__doc__
        run.__name__ = function.__name__
        run.examples = examples  # type: ignore[attr-defined]
        app.command(name or function.__name__.rstrip("_"), cls=VerbCommand)(run)
        return function

    return register
