"""Finding a species by what people type: a name, a synonym, a formula, a CAS RN, an InChIKey."""

# ruff: noqa: S608 - what is put into SQL texts here are constants of this package; every value is bound
from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

from propdb.errors import Ambiguous, FormulaError, NotFound
from propdb.model.records import Species
from propdb.store.read import SEEN
from propdb.store.rows import fold

if TYPE_CHECKING:
    from propdb.store.read import Reader

__all__ = ["Match", "find", "resolve"]

_FUZZY_CUTOFF: Final = 70.0  # of 100: below it a match is chance
_Row = tuple[int, str, str, int, str, str]
_AFTER_ALL: Final = "\U0010ffff"
#: More than there are species; SQLite takes no number above 2**63.
_MOST: Final = 1_000_000
#: Where more species than this have one formula, none of them goes without saying.
_MOST_COMPARED: Final = 12


@dataclass(frozen=True, slots=True)
class Match:
    """A species that may be meant. ``score``: 97 to 100 exact, 60 to 90 a beginning, 40 to 60 a part, less is alike."""

    name: str
    formula: str  # with charge
    cas: str
    inchikey: str
    score: float


def _formula(text: str) -> str:
    """The key of a formula; "" if it is not one."""
    from propdb.model.formula import normal

    try:
        return normal(text)
    except FormulaError:
        return ""


def _visible(reader: Reader, numbers: Iterable[int]) -> dict[int, _Row]:
    """Row of ``species`` to (id, name, formula, charge, CAS RN, InChIKey) of the species that stands for it, if any."""
    found: dict[int, _Row] = {}
    sql = (
        "SELECT id, name, formula, charge, cas, inchikey FROM species"
        f" WHERE id = (SELECT canon FROM species WHERE id = :row) AND {SEEN}"
    )
    for number in numbers:
        for row in reader.conn.execute(sql, reader._view | {"row": number}):
            found[number] = row
    return found


def find(reader: Reader, text: str, limit: int = 10) -> list[Match]:
    """The species that ``text`` may mean, best first.

    Exact matches and beginnings through an index; parts of names (three characters or more) through a trigram index;
    names that are merely alike only when all that gives nothing.

    Parameters
    ----------
    reader : Reader
    text : str
        A name or synonym (case, dashes and Greek letters do not matter), a formula in any order, a CAS RN, an InChIKey
        or its first block.
    limit : int
        At most so many.
    """
    wanted = fold(text)
    if not wanted or limit < 1:
        return []
    limit = min(limit, _MOST)
    scores: dict[int, float] = {}

    def note(rows: Iterable[tuple[int, str]], low: float, span: float) -> None:
        for number, folded in rows:
            score = low + span * len(wanted) / max(len(folded), len(wanted))
            scores[number] = max(score, scores.get(number, 0.0))

    with reader._snapshot():
        execute = reader.conn.execute
        for number, kind in _exact(reader, text):
            scores[number] = max({"synonym": 99.0}.get(kind, 100.0), scores.get(number, 0.0))
        other_case = "SELECT species FROM name WHERE kind = 'formula' AND folded = ? COLLATE NOCASE"
        for (number,) in execute(other_case, (text.strip(),)).fetchall():
            scores[number] = max(97.0, scores.get(number, 0.0))
        if len(wanted) == 14 and wanted.isalpha():
            block = wanted.upper()
            rows = execute(
                "SELECT species FROM name WHERE kind = 'inchikey' AND folded >= ? AND folded < ?",
                (f"{block}-", f"{block}."),
            )
            for (number,) in rows.fetchall():
                scores[number] = max(98.0, scores.get(number, 0.0))
        note(
            execute(
                "SELECT species, folded FROM name WHERE folded >= ? AND folded < ? AND kind IN ('name', 'synonym')"
                " ORDER BY length(folded) LIMIT ?",
                (wanted, wanted + _AFTER_ALL, 20 * limit),
            ).fetchall(),
            60.0,
            30.0,
        )
        if len(wanted) >= 3 and len(scores) < limit:
            note(_containing(reader, wanted, 20 * limit), 40.0, 20.0)
        if not scores:
            scores.update(_alike(reader, wanted, limit))
        seen = _visible(reader, scores)
    best: dict[int, tuple[float, _Row]] = {}
    for number, row in seen.items():
        if row[0] not in best or best[row[0]][0] < scores[number]:
            best[row[0]] = (scores[number], row)
    ordered = sorted(best.values(), key=lambda item: (-item[0], len(item[1][1]), item[1][1]))
    return [_match(score, row) for score, row in ordered[:limit]]


def _match(score: float, row: _Row) -> Match:
    _, name, formula, charge, cas, inchikey = row
    return Match(name, _display(formula, charge), cas, inchikey, round(score, 1))


def _display(formula: str, charge: int) -> str:
    return Species("", formula, charge, (), 0.0).display_formula


def _exact(reader: Reader, text: str) -> list[tuple[int, str]]:
    """(row of species, kind of name) for everything that ``text`` is exactly."""
    wanted, plain = fold(text), text.strip()
    keys = {(wanted, "name"), (wanted, "synonym"), (plain, "cas"), (plain.upper(), "inchikey")}
    formula = _formula(plain)
    if formula:
        keys.add((formula, "formula"))
    sql = "SELECT species, kind FROM name WHERE folded = ? AND kind = ?"
    return [row for key in sorted(keys) for row in reader.conn.execute(sql, key).fetchall()]


def _containing(reader: Reader, wanted: str, limit: int) -> list[tuple[int, str]]:
    """(row of species, folded name) for the shortest names that contain ``wanted``."""
    if "\0" in wanted:  # no name holds one, and a query ends at it
        return []
    trigrams = sorted({wanted[i : i + 3] for i in range(len(wanted) - 2)})
    query = " AND ".join('"' + trigram.replace('"', '""') + '"' for trigram in trigrams)
    sql = (
        "SELECT n.species, n.folded FROM name_trigram t JOIN name n ON n.num = t.rowid"
        " WHERE name_trigram MATCH ? AND instr(n.folded, ?) ORDER BY length(n.folded), n.folded LIMIT ?"
    )
    return reader.conn.execute(sql, (query, wanted, limit)).fetchall()


def _alike(reader: Reader, wanted: str, limit: int) -> dict[int, float]:
    """Row of species to score, for names that are merely alike."""
    from rapidfuzz import fuzz, process

    # The score is twice the common characters over those of both, so one of them cannot be much longer.
    ends = _FUZZY_CUTOFF / (200.0 - _FUZZY_CUTOFF)
    sql = "SELECT species, folded FROM name WHERE kind IN ('name', 'synonym') AND length(folded) BETWEEN ? AND ?"
    rows = reader.conn.execute(sql, (int(ends * len(wanted)), int(len(wanted) / ends) + 1)).fetchall()
    names = [folded for _, folded in rows]
    hits = process.extract(wanted, names, scorer=fuzz.ratio, score_cutoff=_FUZZY_CUTOFF, limit=4 * limit)
    scores: dict[int, float] = {}
    for _, score, index in hits:
        number = rows[index][0]
        scores[number] = max(0.39 * score, scores.get(number, 0.0))
    return scores


def _known(reader: Reader, names: list[str]) -> list[str]:
    """The one of several species that is well known, the others being curiosities; else all, the best known first."""
    sources = {name: len({entry.source for entry in reader.entries(name)}) for name in names}
    ordered = sorted(names, key=lambda name: (-sources[name], name))
    first, second = ordered[:2]
    return [first] if sources[first] >= 3 and sources[second] <= 1 else ordered


def resolve(reader: Reader, text: str) -> Species:
    """The one species that ``text`` is exactly.

    A CAS RN or InChIKey; then a primary name; then a formula, or a synonym as it is written; then either in another
    case. The first of these that any species answers to decides: ``Co`` is cobalt, even where carbon monoxide has the
    synonym ``CO``, and ``co`` may be both. Of several, the one that three sources or more know, where none of the
    others is known to more than one: ``CO2`` is carbon dioxide, though somebody computed dioxiranylidene.

    Raises
    ------
    NotFound
        None; the hint gives the nearest names.
    Ambiguous
        Several answer equally, as ethanol and dimethyl ether to C2H6O; ``fields["candidates"]`` lists them.
    """
    wanted, plain = fold(text), text.strip()
    if not wanted:
        raise NotFound("no species: the name is empty", hint="type a name, formula or CAS RN")
    with reader._snapshot():
        execute = reader.conn.execute

        def rows(sql: str, *values: str) -> list[int]:
            return [number for (number,) in execute(f"SELECT species FROM name WHERE {sql}", values).fetchall()]

        tiers: list[Callable[[], list[int]]] = [
            lambda: rows("(folded = ? AND kind = 'cas') OR (folded = ? AND kind = 'inchikey')", plain, plain.upper()),
            lambda: rows("folded = ? AND kind = 'name' AND text = ?", wanted, plain),
            lambda: rows("folded = ? AND kind = 'name'", wanted),
            lambda: [
                *rows("folded = ? AND kind = 'synonym' AND text = ?", wanted, plain),
                *((rows("folded = ? AND kind = 'formula'", formula)) if (formula := _formula(plain)) else []),
            ],
            lambda: [
                *rows("folded = ? AND kind = 'synonym'", wanted),
                *rows("folded = ? COLLATE NOCASE AND kind = 'formula'", plain),
            ],
        ]
        for tier in tiers:
            names = sorted({row[1] for row in _visible(reader, tier()).values()})
            if names:
                break
        if 1 < len(names) <= _MOST_COMPARED:
            names = _known(reader, names)
    if len(names) == 1:
        return reader.species(names[0])
    if names:
        shown = ", ".join(names[:8]) + (f" and {len(names) - 8} more" if len(names) > 8 else "")
        raise Ambiguous(f"{plain!r} may be {shown}", hint="type one of the names", candidates=names)
    near = [match.name for match in find(reader, plain, 4)]
    hint = f"did you mean {', '.join(near)}?" if near else "`propdb find` looks for names, formulas and CAS RNs"
    raise NotFound(f"no species {plain!r}", hint=hint, candidates=near)
