"""What came in, as text and as data."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import typer

from propdb.cli.sheets import at_text, comparable, entry_dict, phase_text, uncertainty_text
from propdb.model.text import columns

if TYPE_CHECKING:
    from propdb.cli.app import Call
    from propdb.intake.plan import Report

#: Exit code of a dry run that found something wrong: that of the error which the run itself would end with.
_WRONG = 2


def show_report(call: Call, report: Report) -> None:
    """Print a report; a dry run that found something wrong ends as the run itself would."""
    call.show(lambda: report_dict(report), lambda: report_text(report))
    if report.refused:
        from propdb.cli.app import note

        count = len(report.refused)
        note(f"propdb: {report.file}: {count} {'thing is' if count == 1 else 'things are'} wrong; nothing would go in")
        raise typer.Exit(_WRONG)


def report_dict(report: Report) -> dict[str, Any]:
    """A report as data; the keys are a contract."""
    return {
        "file": report.file,
        "kind": report.kind,
        "dry_run": report.dry_run,
        "who": report.who or None,
        "taken": [{"place": place, **entry_dict(entry)} for place, entry in report.taken],
        "skipped": [{"place": one.place, "what": one.what, "why": one.why} for one in report.skipped],
        "refused": [
            {"place": one.place, "column": one.column, "problem": one.problem, "hint": one.hint}
            for one in report.refused
        ],
        "remarks": [{"place": place, "text": text} for place, text in report.remarks],
        "new_species": list(report.species),
        "new_sources": list(report.sources),
    }


def report_text(report: Report) -> str:
    """A report to read."""
    count = len(report.taken)
    noun = "entry" if count == 1 else "entries"
    if report.refused:
        head = f"{report.file}: nothing would be taken"
    elif report.dry_run:
        head = f"{report.file}: {count} {noun} would be taken as drafts"
    else:
        head = (
            f"{report.file}: {count} {noun} taken as drafts, by {report.who}"
            if count
            else f"{report.file}: nothing taken"
        )
    lines = [head]
    if report.taken:
        rows = [("place", "species", "", "phase", "at", "value", "", "uncertainty", "source", "entry")]
        for place, entry in report.taken:
            value, unit = comparable(entry) if not entry.equation else (entry.equation, "")
            rows.append(
                (place, entry.species, entry.quantity, phase_text(entry), at_text(entry), value, unit,
                 uncertainty_text(entry, listed=True), entry.source, entry.id)
            )  # fmt: skip
        title = "in order" if report.refused else "would be taken" if report.dry_run else "taken"
        lines += ["", title, *columns(rows, indent=2, right=(5,))]
    if report.refused:
        rows_wrong = [(one.place, "; ".join(filter(None, (one.problem, one.hint)))) for one in report.refused]
        lines += ["", "wrong", *columns([("", ""), *rows_wrong], indent=2)[1:]]
    if report.skipped:
        rows_left = [(one.place, one.what, one.why) for one in report.skipped]
        lines += ["", "skipped", *columns([("", "", ""), *rows_left], indent=2)[1:]]
    if report.remarks:
        lines += ["", "mind", *columns([("", ""), *report.remarks], indent=2)[1:]]
    for title, names in (("new species", report.species), ("new sources", report.sources)):
        if names and not report.refused:
            lines += ["", f"{title}: {', '.join(names)}"]
    if report.taken and not report.dry_run:
        lines += ["", "Drafts enter no computation until somebody else has checked them: propdb review list"]
    return "\n".join(lines)
