"""Rows of a table, long or wide, as a stream of single results."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping
from operator import itemgetter

from sameline.intake.findings import FindingBook
from sameline.intake.headings import KEY_FIELDS, Layout, ValueColumn, fold
from sameline.intake.tables import Row

Key = tuple[str, ...]
"""The texts of `KEY_FIELDS` as they stand; empty where there is no such column."""
Line = tuple[int, Key, str, str, ValueColumn]
"""Row, key, replicate, value (texts as they stand) and the column of the value."""

_FOOTERS = frozenset(
    [
        "mean",
        "average",
        "avg",
        "total",
        "sum",
        "sd",
        "s.d.",
        "std",
        "stdev",
        "std_dev",
        "standard_deviation",
        "min",
        "max",
        "minimum",
        "maximum",
        "median",
        "count",
        "n",
        "range",
        "cv",
        "mean_value",
        "variance",
    ]
)


def looks_like_footer(text: str) -> bool:
    """Whether a row that begins so sums up the rows above it."""
    return fold(text).rstrip(":").strip("_") in _FOOTERS


class Lines:
    """Takes a table's rows apart.

    Args:
        layout: which column is what.
        book: where findings go.
        merged: cells covered by merged ones (see `Table.merged`).
    """

    def __init__(
        self, layout: Layout, book: FindingBook, merged: Mapping[tuple[int, int], tuple[int, int]] | None = None
    ) -> None:
        self.layout = layout
        self.loose: list[int] = []
        """Rows that could not be read as part of any run."""
        self.notes: dict[Key, list[str]] = {}
        self._book = book
        self._merged = merged or {}
        self._width = len(layout.headings)
        self._constants = dict(layout.form.constants)
        self._footers = frozenset(fold(text) for text in layout.form.footers)
        self._above: dict[int, str] = {}
        self._units: dict[tuple[int, str], ValueColumn] = {}

    def read(self, rows: Iterable[Row]) -> Iterator[Line]:
        """The single results of these rows (those below the headings)."""
        return self._long(rows) if self._is_plain() else self._any(rows)

    def _is_plain(self) -> bool:
        """Whether each row is one result, with nothing to be filled in or joined."""
        form, fields, values = self.layout.form, self.layout.fields, self.layout.values
        needs_more = form.constants or form.fill_down or form.footers or self._merged
        return (
            not needs_more
            and len(values) == 1
            and values[0].replicate is None
            and values[0].characteristic is None
            and not {"unit", "time", "note"} & set(fields)
        )

    def _long(self, rows: Iterable[Row]) -> Iterator[Line]:
        fields, width = self.layout.fields, self._width
        column = self.layout.values[0]
        # A cell is put behind each row, empty; columns that the table does not have point to it.
        get = itemgetter(*(fields.get(field, width) for field in KEY_FIELDS))
        batch, replicate, value = fields["batch"], fields.get("replicate", width), column.index
        for number, cells in rows:
            row = cells
            if len(row) != width or not row[batch]:
                if self._passed_over(number, row):
                    continue
                row = row[:width]
            row.append("")
            yield number, get(row), row[replicate], row[value], column

    def _any(self, rows: Iterable[Row]) -> Iterator[Line]:
        sources = [self._source(field) for field in KEY_FIELDS]
        wide = len(self.layout.values) > 1
        for number, cells in rows:
            if self._passed_over(number, cells):
                continue
            row = self._filled(number, cells[: self._width])
            key = tuple(source(row) for source in sources)
            lines = [self._line(number, row, key, value) for value in self.layout.values]
            written = [line for line in lines if not wide or line[3].strip()]
            if note := self._cell(row, "note").strip():
                for noted in dict.fromkeys(line[1] for line in written):
                    self.notes.setdefault(noted, []).append(note)
            if not written:
                self._book.add(number, None, None, "the row holds no values", "write them, or leave the row out")
                self.loose.append(number)
            yield from written

    def _line(self, number: int, row: list[str], key: Key, value: ValueColumn) -> Line:
        if value.characteristic is not None:
            key = (key[0], value.characteristic, *key[2:])
        replicate = self._cell(row, "replicate") if value.replicate is None else str(value.replicate)
        return number, key, replicate, row[value.index], self._with_unit(value, self._cell(row, "unit").strip())

    def _with_unit(self, value: ValueColumn, unit: str) -> ValueColumn:
        """The column as it is in a row that states its unit."""
        if not unit:
            return value
        known = self._units.get((value.index, unit))
        if known is None:
            known = ValueColumn(value.index, value.heading, value.characteristic, unit, value.replicate)
            self._units[value.index, unit] = known
        return known

    def _source(self, field: str) -> Callable[[list[str]], str]:
        """What gives a field its text in a row: its column, a constant, or nothing."""
        place, constant = self.layout.fields.get(field), self._constants.get(field, "")
        time = self.layout.fields.get("time")
        if place is None:
            return lambda _row: constant
        if field == "tested_at" and time is not None:
            return lambda row: f"{row[place].strip()} {row[time].strip()}".strip()
        return itemgetter(place)

    def _cell(self, row: list[str], field: str) -> str:
        place = self.layout.fields.get(field)
        return self._constants.get(field, "") if place is None else row[place]

    def _filled(self, number: int, row: list[str]) -> list[str]:
        """The row with the cells that merged cells cover, or that the map says repeat the one above."""
        for field, place in self.layout.fields.items():
            origin = self._merged.get((number, place))
            if not row[place].strip() and (origin is not None or field in self.layout.form.fill_down):
                if origin is None or origin[1] == place:
                    row[place] = self._above.get(place, "")
            else:
                self._above[place] = row[place]
        return row

    def _passed_over(self, number: int, row: list[str]) -> bool:
        """Whether the row is blank, sums up, or has cells too few or too many; what is wrong is noted."""
        if not any(cell.strip() for cell in row):
            return True
        first = next(cell.strip() for cell in row if cell.strip())
        if fold(first) in self._footers:
            return True
        if len(row) >= self._width and not any(cell.strip() for cell in row[self._width :]):
            return False
        self.loose.append(number)
        problem = f"the row has {len(row)} cells and there are {self._width} headings"
        advice = "is a cell missing?" if len(row) < self._width else "does a cell hold the sign that parts the cells?"
        self._book.add(number, None, None, problem, advice)
        return True
