"""Which row of a table holds the headings, and by which map they are read: stated, never guessed."""

from __future__ import annotations

from collections.abc import Sequence

from sameline.intake.findings import FindingBook
from sameline.intake.headings import (
    FIELDS,
    KEY_FIELDS,
    HeadingMap,
    Layout,
    fold,
    layout_of,
    own_map,
    strange,
    trimmed,
)
from sameline.intake.nearest import Nearest, did_you_mean
from sameline.intake.tables import Row, Table, UnreadableError, head

Chosen = tuple[Table, Layout]
_NAMED = 50  # unknown columns that are named one by one


def choose_layout(ways: Sequence[Table], maps: Sequence[HeadingMap], book: FindingBook) -> Chosen | None:
    """The way of parting rows into cells, and the layout.

    None where there is none: with a finding, unless it is only that nothing fits (see `report_missing`).

    Args:
        ways: the same table, its rows parted into cells in different ways; the likeliest first.
        maps: the maps that a person has confirmed.
        book: where findings go.
    """
    heads: list[tuple[Table, list[Row]]] = []
    for table in ways:
        try:
            heads.append((table, head(table)))
        except UnreadableError as error:
            if table is ways[-1] and not heads:
                book.add(error.row, None, None, error.problem, error.suggestion)
                return None
    for table, rows in heads:
        if layout := _own(rows, book):
            return table, layout
    for table, rows in heads:
        fitting = _fitting(rows, maps)
        if len(fitting) == 1:
            form, number, headings = fitting[0]
            _ask_columns(book, number, form.unknown(headings), f"is not in the map {form.name!r}")
            return table, layout_of(form, number, headings, dict(rows).get(number + 1, ()))
        if fitting:
            names = ", ".join(repr(form.name) for form, _, _ in fitting)
            book.add(
                fitting[0][1],
                None,
                None,
                f"several maps fit these headings: {names}",
                "say which one is meant: --map NAME",
            )
            return None
    return None


def _own(rows: list[Row], book: FindingBook) -> Layout | None:
    """The layout of a table with our own headings."""
    for number, row in rows:
        headings = trimmed(row)
        form = own_map(headings)
        if form.missing():
            continue
        folded = [fold(column.heading) for column in form.columns]
        twice = next((heading for heading in folded if folded.count(heading) > 1), None)
        if twice is not None:
            book.add(number, twice, twice, f"the heading {twice!r} is there more than once", "keep one of them")
            return None
        _ask_columns(book, number, strange(headings), "is none of ours", Nearest(FIELDS[:-1]))
        return layout_of(form, number, headings)
    return None


def _ask_columns(
    book: FindingBook, row: int, columns: Sequence[str], says: str, nearest: Nearest | None = None
) -> None:
    """Ask about columns that would not be read; many more are counted only."""
    for heading in columns[:_NAMED]:
        near = did_you_mean(nearest.to(fold(heading))) if nearest else None
        book.add(row, heading, heading, f"the column {heading!r} {says}", near or "it would not be read", question=True)
    if len(columns) > _NAMED:
        problem = f"{len(columns) - _NAMED} further columns are as unknown"
        book.add(row, None, None, problem, "they would not be read", question=True)


def _fitting(rows: list[Row], maps: Sequence[HeadingMap]) -> list[tuple[HeadingMap, int, list[str]]]:
    fitting = []
    for form in maps:
        place = next(((number, row) for number, row in rows if form.fits(row)), None)
        if place is not None:
            fitting.append((form, place[0], trimmed(place[1])))
    most = max((len(form.columns) for form, _, _ in fitting), default=0)
    return [fit for fit in fitting if len(fit[0].columns) == most]


def report_missing(table: Table, book: FindingBook) -> None:
    """Say which headings are missing, and what stands in their place."""
    try:
        rows = head(table)
    except UnreadableError as error:
        book.add(error.row, None, None, error.problem, error.suggestion)
        return
    if not rows:
        book.add(None, None, None, "the table is empty", "write headings in the first row and the results below")
        return
    number, row = max(rows[:5], key=lambda numbered: len(own_map(numbered[1]).columns))
    missing = own_map(row).missing()
    if not missing:
        return
    unknown = [heading for heading in row if heading.strip() and heading in strange(row)]
    nearest = Nearest(fold(heading) for heading in unknown)
    ours = f"our headings are: {', '.join((*KEY_FIELDS, 'replicate', 'value'))}"
    for field in missing:
        near = nearest.to(field)
        stands = next((heading.strip() for heading in unknown if fold(heading) == near), None)
        advice = f"is it the column {stands!r}?" if stands else ours
        problem = f"the heading {field!r} is missing"
        book.add(number, None, None, problem, f"{advice} (or make a heading map for files like this)")
