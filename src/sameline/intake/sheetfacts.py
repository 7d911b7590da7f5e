"""What must be known of a workbook's sheets before they are read: extent, merged cells, percentages, shown decimals.

The reader of workbooks lays a sheet out as a full rectangle, so one cell far out costs the memory of all before it;
and it gives a cell shown as "12.5 %" or "12.50" as 0.125 or 12.5. Both are learned here from the workbook's own XML.
"""

from __future__ import annotations

import posixpath
import re
from collections.abc import Callable
from dataclasses import dataclass, field
from xml.parsers import expat

from sameline.intake.packed import Packed
from sameline.intake.tables import UnreadableError

MOST_CELLS = 10_000_000
"""Cells of a sheet's full rectangle, empty ones included."""
_MOST_TEXT = 1_000_000_000
PERCENT = 64
"""In `SheetFacts.formats`: the cell is shown as a percentage; the rest of the figure is the decimals shown."""

Span = tuple[int, int, int, int]
Attributes = dict[str, str]


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


def _parse(content: bytes, start: Callable[[str, Attributes], None], text: Callable[[str], None] | None = None) -> None:
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


def xlsx_facts(packed: Packed) -> dict[str, SheetFacts]:
    """The worksheets of an XLSX workbook by name.

    Raises:
        UnreadableError: it is damaged, or a sheet is too large.
    """
    longest = _longest_text(packed)
    shown = _shown_by_style(packed)
    return {name: _worksheet(packed.read(part), shown, longest) for name, part in _worksheets(packed).items()}


def _worksheets(packed: Packed) -> dict[str, str]:
    """Sheet names and the parts of the package that hold them."""
    targets: dict[str, str] = {}
    sheets: dict[str, str] = {}

    def relation(name: str, attributes: Attributes) -> None:
        if name == "Relationship" and attributes.get("Type", "").endswith("/worksheet"):
            target = attributes.get("Target", "")
            part = target.lstrip("/") if target.startswith("/") else posixpath.normpath(f"xl/{target}")
            targets[attributes.get("Id", "")] = part

    def sheet(name: str, attributes: Attributes) -> None:
        if name == "sheet":
            identity = next((value for key, value in attributes.items() if key.endswith(" id")), "")
            if identity in targets:
                sheets[attributes.get("name", "")] = targets[identity]

    _parse(packed.read("xl/_rels/workbook.xml.rels"), relation)
    _parse(packed.read("xl/workbook.xml"), sheet)
    return sheets


def _longest_text(packed: Packed) -> int:
    """Characters of the longest text that cells share."""
    if "xl/sharedStrings.xml" not in packed.names:
        return 0
    longest = present = 0

    def start(name: str, _attributes: Attributes) -> None:
        nonlocal present
        if name == "si":
            present = 0

    def text(piece: str) -> None:
        nonlocal longest, present
        present += len(piece)
        longest = max(longest, present)

    _parse(packed.read("xl/sharedStrings.xml"), start, text)
    return longest


def _shown_by_style(packed: Packed) -> list[int]:
    """For each cell style how it shows figures."""
    if "xl/styles.xml" not in packed.names:
        return []
    codes = {9: "0%", 10: "0.00%", 2: "0.00", 4: "0.00", 39: "0.00", 40: "0.00"}  # ECMA-376 part 1, 18.8.30
    styles: list[int] = []
    inside = False

    def start(name: str, attributes: Attributes) -> None:
        nonlocal inside
        if name == "numFmt":
            codes[_whole(attributes.get("numFmtId"))] = attributes.get("formatCode", "")
        elif name in ("cellXfs", "cellStyleXfs", "cellStyles", "dxfs"):
            inside = name == "cellXfs"
        elif name == "xf" and inside:
            styles.append(_whole(attributes.get("numFmtId")))

    _parse(packed.read("xl/styles.xml"), start)
    return [shown_by(codes.get(style, "")) for style in styles]


def shown_by(code: str) -> int:
    """The decimals that a number format always shows, plus `PERCENT` where it shows percentages."""
    plain = re.sub(r'"[^"]*"|\\.|\[[^\]]*\]|_.|\*.', "", code).partition(";")[0]
    if re.search(r"[EeYyDdHhSs?/]", plain):
        return 0
    decimals = re.search(r"\.(0+)", plain)
    return min(len(decimals[1]) if decimals else 0, 30) + (PERCENT if "%" in plain else 0)


def _whole(text: str | None) -> int:
    return int(text) if text and text.isascii() and text.isdigit() and len(text) < 8 else 0


_REFERENCE = re.compile(r"\$?([A-Z]{1,3})\$?(\d{1,7})", re.ASCII)


def _place(reference: str) -> tuple[int, int] | None:
    """Row (from 1) and place (from 0) of a reference such as "B7"."""
    found = _REFERENCE.fullmatch(reference)
    if found is None:
        return None
    place = 0
    for letter in found[1]:
        place = place * 26 + ord(letter) - 64
    return int(found[2]), place - 1


def _worksheet(content: bytes, shown: list[int], longest: int) -> SheetFacts:
    facts = SheetFacts()
    row, place, texts = 0, -1, 0

    def start(name: str, attributes: Attributes) -> None:
        nonlocal row, place, texts
        if name == "c":
            row, place = _place(attributes.get("r", "")) or (max(row, 1), place + 1)
            facts.reach(row, place)
            style = _whole(attributes.get("s"))
            if style < len(shown):
                facts.show(row, place, shown[style])
            texts += attributes.get("t") == "s"
        elif name == "row":
            row, place = _whole(attributes.get("r")) or row + 1, -1
        elif name == "mergeCell":
            facts.merged.extend(_span(attributes.get("ref", "")))

    _parse(content, start)
    if texts * longest > _MOST_TEXT:
        raise UnreadableError("a sheet holds more text than can be read", "split it into smaller files")
    return facts


def _span(reference: str) -> list[Span]:
    first, _, last = reference.partition(":")
    start, end = _place(first), _place(last)
    return [(*start, *end)] if start and end else []


def ods_facts(packed: Packed) -> dict[str, SheetFacts]:
    """The sheets of an ODS workbook by name.

    Raises:
        UnreadableError: it is damaged, or a sheet is too large.
    """
    sheets: dict[str, SheetFacts] = {}
    walk = _OdsWalk(sheets)
    _parse(packed.read("content.xml"), walk.start)
    walk.end_row()
    return sheets


class _OdsWalk:
    """Counts repeated rows and cells, which a few bytes can make very many."""

    def __init__(self, sheets: dict[str, SheetFacts]) -> None:
        self._sheets = sheets
        self._facts = SheetFacts()
        self._row = self._times = self._place = self._filled = 0
        self._percent: list[int] = []

    def start(self, name: str, attributes: Attributes) -> None:
        plain = {key.rpartition(" ")[2]: value for key, value in attributes.items()}
        if name == "table":
            self.end_row()
            self._facts = self._sheets.setdefault(plain.get("name", ""), SheetFacts())
            self._row = 0
        elif name == "table-row":
            self.end_row()
            self._times = max(_whole(plain.get("number-rows-repeated")), 1)
        elif name in ("table-cell", "covered-table-cell"):
            self._cell(plain)
        elif name == "p":  # a cell may hold text without stating a type
            self._filled = max(self._filled, self._place)

    def _cell(self, plain: Attributes) -> None:
        times = max(_whole(plain.get("number-columns-repeated")), 1)
        down, across = _whole(plain.get("number-rows-spanned")), _whole(plain.get("number-columns-spanned"))
        if down > 1 or across > 1:
            first = self._row + 1
            self._facts.merged.append((first, self._place, first + max(down, 1) - 1, self._place + max(across, 1) - 1))
        if plain.get("value-type") == "percentage" and times < 1_000:
            self._percent.extend(range(self._place, self._place + times))
        self._place += times
        if "value-type" in plain or "formula" in plain:
            self._filled = self._place

    def end_row(self) -> None:
        """The row is complete: where it holds anything, the sheet reaches to its last repetition."""
        if self._filled:
            self._facts.reach(self._row + self._times, self._filled - 1)
            for place in self._percent:
                for row in range(self._row + 1, self._row + self._times + 1):
                    self._facts.show(row, place, PERCENT)
        self._row += self._times
        self._times = self._place = self._filled = 0
        self._percent = []
