"""What an ODS workbook says of its sheets (OpenDocument 1.3, part 3): extent, merged cells, how figures are shown."""

from __future__ import annotations

import math
import re

from sameline.intake.packed import Packed
from sameline.intake.sheetfacts import PERCENT, Attributes, SheetFacts, parse, whole


def ods_facts(packed: Packed) -> dict[str, SheetFacts]:
    """The sheets of an ODS workbook by name.

    Raises:
        UnreadableError: it is damaged, or a sheet is too large.
    """
    sheets: dict[str, SheetFacts] = {}
    walk = _OdsWalk(sheets)
    parse(packed.read("content.xml"), walk.start, walk.text)
    walk.end_row()
    return sheets


_SHOWN = re.compile(r"([-+]?[\d.,']*?)(?:[.,](\d{1,20}))?%?", re.ASCII)


def decimals_in(text: str, value: str) -> int:
    """The decimals with which a cell's text shows its value; 0 where the text is not simply the value."""
    found = _SHOWN.fullmatch(text.replace("\u2212", "-").replace(" ", "").strip())
    try:
        if found is None or not found[2] or not math.isfinite(float(value)):
            return 0
        shown = float(re.sub(r"[.,']", "", found[1] or "0") + "." + found[2]) / (100 if text.endswith("%") else 1)
    except ValueError:
        return 0
    return len(found[2]) if math.isclose(shown, float(value), rel_tol=1e-9, abs_tol=10.0 ** -len(found[2])) else 0


class _OdsWalk:
    """Counts repeated rows and cells, which a few bytes can make very many."""

    def __init__(self, sheets: dict[str, SheetFacts]) -> None:
        self._sheets = sheets
        self._facts = SheetFacts()
        self._row = self._times = self._place = self._filled = 0
        self._figure: range | None = None  # places of the cell being read, where it holds a figure
        self._text = self._value = ""
        self._percent = 0
        self._shown: dict[int, int] = {}

    def start(self, name: str, attributes: Attributes) -> None:
        plain = {key.rpartition(" ")[2]: value for key, value in attributes.items()}
        if name == "table":
            self.end_row()
            self._facts = self._sheets.setdefault(plain.get("name", ""), SheetFacts())
            self._row = 0
        elif name == "table-row":
            self.end_row()
            self._times = max(whole(plain.get("number-rows-repeated")), 1)
        elif name in ("table-cell", "covered-table-cell"):
            self._cell(plain)
        elif name == "p":  # a cell may hold text without stating a type
            self._filled = max(self._filled, self._place)

    def text(self, piece: str) -> None:
        if self._figure is not None and len(self._text) < 50:
            self._text += piece

    def _cell(self, plain: Attributes) -> None:
        self._end_cell()
        times = max(whole(plain.get("number-columns-repeated")), 1)
        down, across = whole(plain.get("number-rows-spanned")), whole(plain.get("number-columns-spanned"))
        if down > 1 or across > 1:
            first = self._row + 1
            self._facts.merged.append((first, self._place, first + max(down, 1) - 1, self._place + max(across, 1) - 1))
        if plain.get("value-type") in ("float", "percentage") and times < 1_000:
            self._figure = range(self._place, self._place + times)
            self._value = plain.get("value", "")
            self._percent = PERCENT if plain["value-type"] == "percentage" else 0
        self._place += times
        if "value-type" in plain or "formula" in plain:
            self._filled = self._place

    def _end_cell(self) -> None:
        """The cell is complete: note how it shows its figure."""
        if self._figure is not None:
            shown = decimals_in(self._text, self._value) + self._percent
            self._shown |= dict.fromkeys(self._figure, shown)
        self._figure, self._text = None, ""

    def end_row(self) -> None:
        """The row is complete: where it holds anything, the sheet reaches to its last repetition."""
        self._end_cell()
        if self._filled:
            self._facts.reach(self._row + self._times, self._filled - 1)
            for place, shown in self._shown.items():
                for row in range(self._row + 1, self._row + self._times + 1):
                    self._facts.show(row, place, shown)
        self._row += self._times
        self._times = self._place = self._filled = 0
        self._shown = {}
