"""``propdb source list|show|cite``."""

from __future__ import annotations

from typing import Annotated

import typer

from propdb.cli.app import Call, family, verb, write

app = family("List, show and cite sources.")
Key = Annotated[str, typer.Argument(metavar="KEY", help="Key of the source; propdb source list shows them.")]


@verb(app, "propdb source list", name="list")
def list_(call: Call) -> None:
    """List the sources with their keys."""
    from propdb.cli.sourcetext import source_dict, sources_text

    found = call.store.source_list()
    call.show(lambda: {"sources": [source_dict(source) for source in found]}, lambda: sources_text(found))


@verb(app, "propdb source show codata-1989")
def show(call: Call, key: Key) -> None:
    """Show a source: what it is, its terms, how its numbers reached us, the chain of sources that it copies."""
    from propdb.cli.sourcetext import source_dict, source_text

    source = call.store.source_show(key)
    call.show(lambda: source_dict(source), lambda: source_text(source))


@verb(
    app,
    "propdb source cite codata-1989",
    "propdb source cite codata-1989 --format bibtex",
    without=("json",),
)
def cite(
    call: Call,
    key: Key,
    format: Annotated[str, typer.Option("--format", metavar="FORMAT", help="text, bibtex or csl-json.")] = "text",
) -> None:
    """Cite a source as text, BibTeX or CSL-JSON."""
    write(call.store.source_cite(key, format=format))
