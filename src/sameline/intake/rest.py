"""The rows of a file that could not be taken, as a file to be mended and taken in like the first."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator, Sequence
from pathlib import PurePath

from sameline.errors import CallError
from sameline.intake.choose import choose_layout
from sameline.intake.figures import Figure, read_figure
from sameline.intake.files import Intake, Part
from sameline.intake.findings import Finding, FindingBook
from sameline.intake.headings import HeadingMap, fold
from sameline.intake.opening import open_tables
from sameline.intake.rawfiles import SIZE_LIMIT, RawFile
from sameline.intake.tables import Table, UnreadableError

PROBLEM = "problem"
"""Heading of the column that says what is wrong; `read_files` passes it over."""


def rest_files(raw: RawFile, intake: Intake, maps: Sequence[HeadingMap] = ()) -> tuple[RawFile, ...]:
    """The rows of a file that are in none of its good runs, one CSV file for each table that has any.

    Each has the table's own headings and rows, so that it can be mended and taken in as the file was, and one more
    column that says what is wrong. A file that could not be read at all has no rest: it is mended itself.

    Args:
        raw: the file.
        intake: what `read_files` gave for it (and perhaps others), with the same maps.
        maps: the heading maps.

    Raises:
        CallError: the file is not the one that was read.
    """
    parts = {part.sheet: part for part in intake.parts if part.file == raw.name and part.heading_row is not None}
    try:
        ways = open_tables(raw, maps, (), SIZE_LIMIT)
    except UnreadableError as error:
        raise CallError("the file is not the one that was read", where=raw.name) from error
    rests = []
    for tables in ways:
        part = parts.get(tables[0].sheet)
        chosen = choose_layout(tables, maps, FindingBook(raw.name)) if part else None
        if part is None or chosen is None or part.held == ():
            continue
        table, layout = chosen
        found = [finding for finding in intake.findings if (finding.file, finding.sheet) == (part.file, part.sheet)]
        rests.append(RawFile(_name(part), _written(table, part, found, layout.form)))
    return tuple(rests)


def _name(part: Part) -> str:
    stem = PurePath(part.file).stem
    return f"{stem}.rest.csv" if part.sheet is None else f"{stem}.{fold(part.sheet).replace('/', '_')}.rest.csv"


def _written(table: Table, part: Part, findings: Sequence[Finding], form: HeadingMap) -> bytes:
    stream = io.StringIO(newline="")
    writer = csv.writer(stream, delimiter=getattr(table, "delimiter", ";" if form.decimal == "," else ","))
    writer.writerows(_rest(table, part, _words(findings), form))
    return stream.getvalue().encode("utf-8-sig")


def _words(findings: Iterable[Finding]) -> dict[int, str]:
    """For each row what is wrong in it."""
    words: dict[int, list[str]] = {}
    for finding in findings:
        advice = f" ({finding.suggestion})" if finding.suggestion else ""
        where = f"in column {finding.column!r}: " if finding.column else ""
        for row in () if finding.row is None else (finding.row, *finding.more):
            words.setdefault(row, []).append(f"{where}{finding.problem}{advice}")
    return {row: "; ".join(said) for row, said in words.items()}


def _rest(table: Table, part: Part, words: dict[int, str], form: HeadingMap) -> Iterator[list[str]]:
    unit_row = int(form.unit_row)
    held = None if part.held is None else frozenset(part.held)
    width = 0
    covered = table.merged()
    above: dict[int, str] = {}
    for number, row in table.rows(form.decimal or "."):
        above |= {place: text for place, text in enumerate(row) if text.strip()}
        if number == part.heading_row:
            width = len(row)
            yield [*map(_harmless, row), PROBLEM]
        elif number == (part.heading_row or 0) + unit_row:
            yield row
        elif number > (part.heading_row or 0) + unit_row and (held is None or number in held):
            filled = [above.get(place, "") if (number, place) in covered else text for place, text in enumerate(row)]
            yield [
                *map(_harmless, filled),
                *[""] * (width - len(row)),
                words.get(number, "belongs to a run with a finding"),
            ]


def _harmless(text: str) -> str:
    """A cell that no spreadsheet runs as a formula: what begins like one and is no figure gets an apostrophe."""
    if text[:1] not in ("=", "+", "-", "@", "\t", "\r"):
        return text
    figure = read_figure(text)
    return text if isinstance(figure, Figure) or figure.stated or not text.strip() else f"'{text}"
