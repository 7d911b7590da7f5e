"""How an unknown table writes dates and figures, closes, and leaves out what repeats."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from sameline.intake.columns import Column
from sameline.intake.dates import DateOrder, DateReader
from sameline.intake.figures import DecimalSign, Figure, read_figure
from sameline.intake.headings import KEY_FIELDS
from sameline.intake.lines import looks_like_footer
from sameline.records.drafts import Register


@dataclass(frozen=True, slots=True)
class Conventions:
    """What was concluded, and how it is said to the person."""

    date_order: DateOrder | None
    decimal: DecimalSign | None
    fill_down: tuple[str, ...]
    footers: tuple[str, ...]
    notes: tuple[str, ...]


def conventions(columns: Sequence[Column], rows: Sequence[Sequence[str]], register: Register) -> Conventions:
    """Conclude a table's conventions from its rows."""
    footers, body = _footers(rows)
    order, order_note = _order(_cells(columns, body, "tested_at"), register)
    decimal, decimal_note = _decimal(_cells(columns, body, "value"))
    fill_down = _fill_down(columns, body)
    notes = [order_note, decimal_note]
    if footers:
        notes.append(f"rows that begin with {', '.join(map(repr, footers))} sum up and are left out")
    if fill_down:
        notes.append(f"empty cells repeat the one above in: {', '.join(fill_down)}")
    return Conventions(order, decimal, fill_down, footers, tuple(note for note in notes if note))


def _cells(columns: Sequence[Column], rows: Sequence[Sequence[str]], field: str) -> list[str]:
    places = [column.place for column in columns if column.proposed.field == field]
    return [row[place].strip() for row in rows for place in places if place < len(row) and row[place].strip()]


def _footers(rows: Sequence[Sequence[str]]) -> tuple[tuple[str, ...], list[Sequence[str]]]:
    """First cells of rows that sum up, and the other rows."""
    first = [next((cell.strip() for cell in row if cell.strip()), "") for row in rows]
    footers = dict.fromkeys(text for text in first if looks_like_footer(text))
    return tuple(footers), [row for row, text in zip(rows, first, strict=True) if text not in footers]


def _order(cells: list[str], register: Register) -> tuple[DateOrder | None, str | None]:
    """The order of day, month and year that all dates fit, where there is only one."""
    plain = DateReader(register.zone, register.now)
    if all((moment := plain.read(cell)).utc is not None or "could be" not in (moment.problem or "") for cell in cells):
        return None, None
    orders: tuple[DateOrder, ...] = ("dmy", "mdy", "ymd")
    fitting = [
        order
        for order in orders
        if all(DateReader(register.zone, register.now, order).read(cell).utc for cell in cells)
    ]
    if len(fitting) == 1:
        return fitting[0], f"all dates fit only the order {fitting[0]}"
    return None, f"the order of day and month is not clear from {cells[0]!r}: say dmy, mdy or ymd"


def _decimal(cells: list[str]) -> tuple[DecimalSign | None, str | None]:
    figures = [figure for cell in cells if isinstance(figure := read_figure(cell), Figure)]
    shown = {figure.shows for figure in figures if figure.shows}
    doubtful = {figure.doubtful for figure in figures if figure.doubtful}
    if shown == {","}:
        return ",", "the decimal sign is a comma"
    if shown == {"."}:
        return ".", None
    if len(shown) == 2:
        return None, "figures with a decimal point stand beside figures with a decimal comma"
    if "," in doubtful:
        return None, "the comma may be a decimal sign or part thousands: say which sign decimals have"
    return None, None


def _fill_down(columns: Sequence[Column], rows: Sequence[Sequence[str]]) -> tuple[str, ...]:
    """Fields that are empty in rows which hold a value, below rows where they are not.

    Those that a run can do without are filled only where the batch or the date is empty too: the row continues a run.
    """
    values = [column.place for column in columns if column.proposed.field == "value"]
    held = [row for row in rows if any(_filled(row, place) for place in values)]
    empty = {
        column.proposed.field: {number for number, row in enumerate(held) if not _filled(row, column.place)}
        for column in columns
        if column.samples
    }
    continued = set().union(*(empty.get(field, set()) for field in ("batch", "characteristic", "tested_at")))
    return tuple(
        field
        for field in (*KEY_FIELDS, "time")
        if empty.get(field) and 0 not in empty[field] and empty[field] <= continued
    )


def _filled(row: Sequence[str], place: int) -> bool:
    return place < len(row) and bool(row[place].strip())
