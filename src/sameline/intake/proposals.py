"""A heading map proposed on first sight of a file, for a person to confirm and name; it is never applied unseen.

What a column is, is concluded from what stands in it (registered codes, dates, figures) before what stands over it.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import islice
from pathlib import Path

from sameline.errors import CallError
from sameline.intake.columns import Column, Known, describe
from sameline.intake.conventions import conventions
from sameline.intake.headings import HeadingMap, MapColumn, fold, trimmed
from sameline.intake.opening import open_tables
from sameline.intake.rawfiles import SIZE_LIMIT, RawFile, load
from sameline.intake.tables import HEAD, Row, Table, UnreadableError, explaining
from sameline.intake.units import is_unit
from sameline.intake.words import heading_words
from sameline.records.drafts import Register

_SEEN, _LAST = 400, 20  # rows that a proposal looks at: the first and the last


@dataclass(frozen=True, slots=True)
class Guess:
    """What one column is taken for.

    Attributes:
        column: the heading with its field, characteristic, unit and replicate.
        reason: why, in words.
        samples: what stands in its first cells.
    """

    column: MapColumn
    reason: str
    samples: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Proposal:
    """A map to be looked at, changed and confirmed.

    Attributes:
        map: the map as proposed; `map.missing()` names what it does not say.
        file, sheet, row: the table it was made from, and the row of its headings.
        guesses: what each column of the table is taken for.
        notes: what was concluded of dates, decimal signs, footers and empty cells, and what is left to be said.
    """

    map: HeadingMap
    file: str
    sheet: str | None
    row: int
    guesses: tuple[Guess, ...]
    notes: tuple[str, ...]


def propose_map(
    source: Path | str | RawFile, register: Register, *, name: str = "", sheet: str | None = None
) -> Proposal:
    """Propose how to read files like this one.

    Args:
        source: the file.
        register: what is registered.
        name: the map's name.
        sheet: the sheet to look at; None for the first that holds a table.

    Raises:
        CallError: the file cannot be read, or holds no table with headings.
    """
    raw = source if isinstance(source, RawFile) else load(source)
    encoding, ways = _opened(raw, sheet)
    tables = [table for way in ways for table in way if not table.hidden or sheet]
    best = max(
        (seen for table in tables if (seen := _seen(table, register))), key=lambda seen: seen.score, default=None
    )
    if best is None or best.score <= 0:
        raise CallError("no row of the file looks like headings", where=raw.name, advice="give each column a heading")
    unit_row = _is_unit_row(best)
    body = [row for _, row in best.body[unit_row:]]
    columns = describe(best.headings, body, Known(register))
    found = conventions(columns, body, register)
    form = HeadingMap(
        name,
        tuple(column.proposed for column in columns if column.heading.strip()),
        _constants(columns, register),
        found.date_order,
        found.decimal,
        encoding=encoding,
        fill_down=found.fill_down,
        footers=found.footers,
        unit_row=unit_row,
    )
    guesses = tuple(
        Guess(column.proposed, column.reason, column.samples) for column in columns if column.heading.strip()
    )
    units = ["the row below the headings holds units"] if unit_row else []
    notes = (
        *units,
        *found.notes,
        *_missing(form),
        *([f"the file's encoding is taken for {encoding}"] if encoding else []),
    )
    return Proposal(form, raw.name, best.table.sheet, best.row, guesses, notes)


def renamed(proposal: Proposal, name: str) -> HeadingMap:
    """The proposed map under the name that the person gives, checked.

    Raises:
        CallError: the map does not yet say all that is needed.
    """
    form = replace(proposal.map, name=name)
    form.check()
    return form


def _opened(raw: RawFile, sheet: str | None) -> tuple[str | None, list[list[Table]]]:
    """The file's tables, and an encoding where it is not UTF-8."""
    names = (sheet,) if sheet else ()
    for encoding in (None, "cp1252"):
        maps = () if encoding is None else (HeadingMap("", (), encoding=encoding),)
        try:
            return encoding, open_tables(raw, maps, names, SIZE_LIMIT)
        except UnreadableError as error:
            last = error
    raise CallError(last.problem, where=raw.name, advice=last.suggestion)


@dataclass(frozen=True, slots=True)
class _Seen:
    """A table with the row that looks most like headings."""

    table: Table
    row: int
    headings: list[str]
    body: list[Row]
    score: float


def _seen(table: Table, register: Register) -> _Seen | None:
    try:
        with explaining(table):
            every = table.rows()
            some = [*islice(every, _SEEN), *deque(every, maxlen=_LAST)]
    except UnreadableError:
        return None
    rows = [row for row in some if any(cell.strip() for cell in row[1])]
    words = heading_words(register)
    scored = [(_likeness(row, words), -number, row) for number, row in rows[:HEAD]]
    if not scored:
        return None
    score, number, headings = max(scored, key=lambda one: one[:2])
    body = [(place, row) for place, row in rows if place > -number]
    return _Seen(table, -number, trimmed(headings), body, score) if body else None


def _is_unit_row(seen: _Seen) -> bool:
    """Whether the row right below the headings holds units and nothing else."""
    number, row = seen.body[0]
    cells = [cell.strip(" []()") for cell in row if cell.strip()]
    return number == seen.row + 1 and len(seen.body) > 1 and bool(cells) and all(map(is_unit, cells))


def _likeness(row: Sequence[str], words: frozenset[str]) -> float:
    """How much a row looks like headings: words that are known as such count most, figures count against."""
    filled = [cell.strip() for cell in row if cell.strip()]
    known = sum(any(part in words for part in _parts(cell)) for cell in filled)
    figures = sum(cell.replace(".", "").replace(",", "").isdigit() for cell in filled)
    return known + 0.1 * len(filled) - figures if len(filled) > 1 else 0.0


def _parts(heading: str) -> list[str]:
    folded = fold(heading)
    return [folded, *folded.replace("/", "_").replace("(", "_").replace("[", "_").split("_")]


def _constants(columns: Sequence[Column], register: Register) -> tuple[tuple[str, str], ...]:
    """The characteristic, where only one is registered and no column or heading says it."""
    said = any(column.proposed.field == "characteristic" or column.proposed.characteristic for column in columns)
    only = list(register.characteristics)
    return (("characteristic", only[0]),) if not said and len(only) == 1 else ()


def _missing(form: HeadingMap) -> list[str]:
    return [f"no column is taken for {field!r}: say which column or which constant it is" for field in form.missing()]
