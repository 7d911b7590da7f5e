"""What must be known of a workbook's sheets before they are read: extent, merged cells, percentages, shown decimals.

The reader of workbooks lays a sheet out as a full rectangle, so one cell far out costs the memory of all before it;
and it gives a cell shown as "12.5 %" or "12.50" as 0.125 or 12.5. Both are learned here from the workbook's own XML.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from xml.parsers import expat

from sameline.intake.tables import UnreadableError

MOST_CELLS = 10_000_000
"""Cells of a sheet's full rectangle, empty ones included."""
PERCENT = 64
"""In `SheetFacts.formats`: the cell is shown as a percentage; the rest of the figure is the decimals shown."""

Span = tuple[int, int, int, int]
Attributes = dict[str, str]
"""An XML element's attributes; names in a namespace come behind its address and a blank."""


@dataclass(slots=True)
class SheetFacts:
    """One sheet.

    Attributes:
        rows, columns: its extent, from the first row and column.
        merged: merged cells as first row (from 1), first place (from 0), last row, last place.
        formats: row (from 1) -> for each place the decimals shown, plus `PERCENT` for a percentage.
    """

    rows: int = 0
    columns: int = 0
    merged: list[Span] = field(default_factory=list)
    formats: dict[int, bytearray] = field(default_factory=dict)

    def reach(self, row: int, column: int) -> None:
        """The sheet has a cell in this row (from 1) and at this place (from 0).

        Raises:
            UnreadableError: the sheet's rectangle has too many cells.
        """
        self.rows = max(self.rows, row)
        self.columns = max(self.columns, column + 1)
        if self.rows * self.columns > MOST_CELLS:
            raise UnreadableError(
                f"a sheet reaches to row {self.rows} and column {self.columns}: too far to be read",
                "delete stray cells far out, or split the sheet",
            )

    def show(self, row: int, column: int, shown: int) -> None:
        """Note how a cell is shown."""
        if shown:
            cells = self.formats.setdefault(row, bytearray())
            cells.extend(bytes(max(column + 1 - len(cells), 0)))
            cells[column] = shown


def parse(content: bytes, start: Callable[[str, Attributes], None], text: Callable[[str], None] | None = None) -> None:
    """Walk through XML; names come without their namespace's prefix."""
    parser = expat.ParserCreate(namespace_separator=" ")
    parser.buffer_text = True
    parser.StartElementHandler = lambda name, attributes: start(name.rpartition(" ")[2], attributes)
    if text is not None:
        parser.CharacterDataHandler = text
    try:
        parser.Parse(content, True)  # noqa: FBT003 - the library's own signature
    except expat.ExpatError as error:
        raise UnreadableError(
            "the workbook is damaged", "open it in a spreadsheet program and save it again"
        ) from error


def whole(text: str | None) -> int:
    """A whole number of an attribute; 0 where it is none."""
    return int(text) if text and text.isascii() and text.isdigit() and len(text) < 8 else 0
