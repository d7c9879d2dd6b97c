"""``propdb review list|check|approve|reject|dispute|waive|withdraw``."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated

import typer

from propdb.cli.app import Call, family, verb

if TYPE_CHECKING:
    from propdb.store.log import Event

app = family("Check and approve what others added; raise and settle doubts.")

Entries = Annotated[
    list[str],
    typer.Argument(metavar="ENTRY", help="Ids of entries, or their first characters.", show_default=False),
]
Comment = Annotated[str, typer.Option("--comment", metavar="TEXT", help="Why; it goes into the log.")]


@verb(app, "propdb review list", name="list")
def list_(call: Call) -> None:
    """List what waits: drafts, checked entries, doubts; who made them and what may be decided."""
    from propdb.cli.reviewtext import waiting_dict, waiting_text

    found = call.store.review_list()
    call.show(lambda: {"waiting": [waiting_dict(one) for one in found]}, lambda: waiting_text(found))


@verb(app, 'propdb review check e03c1457 --comment "compared with the printed table"', without=("as_of",))
def check(call: Call, entries: Entries, comment: Comment = "") -> None:
    """Say that entries agree with their source; from then on they are used. Not by who made them."""
    _decided(call, call.store.review_check(entries, comment=comment))


@verb(app, "propdb review approve e03c1457", without=("as_of",))
def approve(call: Call, entries: Entries, comment: Comment = "") -> None:
    """Approve checked entries: they go before those of the base. Not by who made them."""
    _decided(call, call.store.review_approve(entries, comment=comment))


@verb(app, 'propdb review reject e03c1457 --comment "another grade of the product"', without=("as_of",))
def reject(call: Call, entries: Entries, comment: Comment = "") -> None:
    """Refuse drafts or checked entries, with the reason; they are withdrawn."""
    _decided(call, call.store.review_reject(entries, comment=comment))


@verb(app, 'propdb review dispute e03c1457 --comment "2 kJ/mol below the later measurement"', without=("as_of",))
def dispute(call: Call, entries: Entries, comment: Comment = "") -> None:
    """Cast doubt on entries, with the reason; others go before them, and answers that use them say so."""
    _decided(call, call.store.review_dispute(entries, comment=comment))


@verb(app, 'propdb review waive e03c1457 --comment "the later measurement was corrected"', without=("as_of",))
def waive(
    call: Call,
    entries: Entries,
    comment: Comment = "",
    finding: Annotated[
        str | None,
        typer.Option(
            "--finding", metavar="NAME", help="Waive this finding only; the status stays.", show_default=False
        ),
    ] = None,
) -> None:
    """Lift a dispute or a quarantine, or waive a finding, with the reason. Not by who made the entry."""
    _decided(call, call.store.review_waive(entries, comment=comment, finding=finding))


@verb(app, 'propdb review withdraw e03c1457 --comment "typed from the wrong column"', without=("as_of",))
def withdraw(call: Call, entries: Entries, comment: Comment = "") -> None:
    """Take entries out of use for good, with the reason; they stay in the store."""
    _decided(call, call.store.review_withdraw(entries, comment=comment))


def _decided(call: Call, events: tuple[Event, ...]) -> None:
    from propdb.cli.reviewtext import decided_text, event_dict

    call.show_lines(
        lambda: [event_dict(event) for event in events],
        lambda: decided_text([(event, call.store.entry_show(event.entry)) for event in events]),
    )
