"""XLSX and ODS workbooks as tables of text.

A figure in a workbook is kept as a binary number: its text here is the shortest that means the same, with the zeros
that its cell shows at the end ("12.50"), and with its sign for a percentage ("12.5%" of a cell that holds 0.125).
"""

from __future__ import annotations

import datetime as dt
import io
from collections.abc import Iterator, Mapping
from decimal import Decimal
from typing import TYPE_CHECKING

from sameline.intake.figures import DecimalSign
from sameline.intake.odsfacts import ods_facts
from sameline.intake.packed import Packed
from sameline.intake.rawfiles import RawFile
from sameline.intake.sheetfacts import MOST_CELLS, PERCENT, SheetFacts
from sameline.intake.tables import Row, UnreadableError
from sameline.intake.xlsxfacts import xlsx_facts

if TYPE_CHECKING:
    from python_calamine import CalamineSheet

Value = int | float | str | bool | dt.date | dt.time | dt.timedelta
_DAMAGED = "the workbook is damaged"
_SAVE_AGAIN = "open it in a spreadsheet program and save it again"
_MOST_COVERED = 1_000_000


class SheetTable:
    """One sheet of a workbook.

    Args:
        file: the workbook's name without folders.
        sheet: the sheet's name.
        cells: the sheet as read.
        facts: what is known of it besides.
        hidden: whether the workbook hides it.
    """

    point_is_usual = True

    def __init__(self, file: str, sheet: str, cells: CalamineSheet, facts: SheetFacts, *, hidden: bool) -> None:
        self.file = file
        self.sheet: str | None = sheet
        self.hidden = hidden
        self._cells = cells
        self._facts = facts

    @property
    def size(self) -> int:
        """Cells of its full rectangle."""
        return self._facts.rows * self._facts.columns

    def rows(self, decimal: DecimalSign = ".") -> Iterator[Row]:
        """All rows with their numbers; the workbook's numbers are written with this decimal sign."""
        if self._cells.start is None:
            return
        first = self._cells.start[1]  # the reader begins at the first column in use
        for number, row in enumerate(self._cells.iter_rows(), 1):
            shown = self._facts.formats.get(number, b"")[first:].ljust(len(row), b"\0")
            texts = [
                value if isinstance(value, str) else as_text(value, how, decimal)
                for value, how in zip(row, shown, strict=False)
            ]
            yield number, [""] * first + texts

    def merged(self) -> Mapping[tuple[int, int], tuple[int, int]]:
        """Cells covered by merged ones.

        Raises:
            UnreadableError: they are too many.
        """
        covered: dict[tuple[int, int], tuple[int, int]] = {}
        for top, left, bottom, right in self._facts.merged:
            low, far = min(bottom, self._facts.rows), min(right, self._facts.columns - 1)
            if (low - top + 1) * (far - left + 1) + len(covered) > _MOST_COVERED:
                raise UnreadableError("a sheet has too many merged cells", "split them and fill in their values")
            covered |= {
                (row, place): (top, left)
                for row in range(top, low + 1)
                for place in range(left, far + 1)
                if (row, place) != (top, left)
            }
        return covered

    def explained(self, error: Exception) -> UnreadableError | None:
        """A sheet that the reader cannot read on."""
        from python_calamine import CalamineError

        return UnreadableError(_DAMAGED, _SAVE_AGAIN) if isinstance(error, CalamineError) else None


def as_text(value: Value, shown: int = 0, decimal: DecimalSign = ".") -> str:
    """A cell's value as text.

    Args:
        value: the value.
        shown: decimals that the cell shows, plus `PERCENT` for a percentage.
        decimal: the decimal sign to write numbers with.
    """
    if isinstance(value, str):
        return value
    if isinstance(value, bool):
        return str(value).upper()
    if isinstance(value, int | float):
        return _figure(value, shown).replace(".", decimal)
    if isinstance(value, dt.datetime):
        return _whole_milliseconds(value).isoformat(timespec="auto")
    return value.isoformat() if isinstance(value, dt.date | dt.time) else str(value)


def _figure(value: float, shown: int) -> str:
    if not shown and (plain := repr(value)).replace(".", "", 1).isdigit():
        return plain.removesuffix(".0")
    exact = Decimal(repr(value)) if isinstance(value, float) else Decimal(value)
    if not exact.is_finite():
        return repr(value)
    percent, decimals = shown >= PERCENT, shown % PERCENT
    exact = (exact.scaleb(2) if percent else exact).normalize()
    if not -15 <= exact.adjusted() <= 15:
        return f"{exact}%" if percent else repr(value)
    text = f"{exact:f}"
    whole, _, rest = text.partition(".")
    rest = rest.ljust(decimals, "0")
    return f"{whole}.{rest}".rstrip(".") + ("%" if percent else "")


def _whole_milliseconds(moment: dt.datetime) -> dt.datetime:
    """Workbooks keep moments as fractions of a day, so that the last microseconds are noise."""
    noise = moment.microsecond % 1000
    return moment + dt.timedelta(microseconds=(1000 if noise >= 500 else 0) - noise)


def sheet_tables(raw: RawFile, limit: int) -> list[SheetTable]:
    """The sheets of a workbook.

    Raises:
        UnreadableError: it is damaged, protected, too large or of another kind.
    """
    packed = Packed(raw.data, limit)
    if "xl/workbook.xml" in packed.names:
        facts = xlsx_facts(packed)
    elif "content.xml" in packed.names:
        facts = ods_facts(packed)
    else:
        raise UnreadableError("this is a packed file and no workbook that can be read", "save it as XLSX, ODS or CSV")
    if sum(sheet.rows * sheet.columns for sheet in facts.values()) > MOST_CELLS:
        raise UnreadableError(f"the sheets have more than {MOST_CELLS:,} cells together", "split the workbook")
    try:
        return _read(raw, facts)
    except BaseException as error:
        # A panic of the reader's is no Exception; anything else that is none (an interrupt) must pass.
        if isinstance(error, UnreadableError | MemoryError) or not _is_readers(error):
            raise
        raise UnreadableError(_DAMAGED, _SAVE_AGAIN) from error


def _is_readers(error: BaseException) -> bool:
    return isinstance(error, Exception) or type(error).__name__ == "PanicException"


def _read(raw: RawFile, facts: dict[str, SheetFacts]) -> list[SheetTable]:
    from python_calamine import SheetTypeEnum, SheetVisibleEnum, load_workbook

    workbook = load_workbook(io.BytesIO(raw.data))
    tables = []
    for sheet in workbook.sheets_metadata:
        if sheet.typ == SheetTypeEnum.WorkSheet:
            if sheet.name not in facts:
                raise UnreadableError(f"the sheet {sheet.name!r} is damaged", _SAVE_AGAIN)
            cells = workbook.get_sheet_by_name(sheet.name)
            hidden = sheet.visible != SheetVisibleEnum.Visible
            tables.append(SheetTable(raw.name, sheet.name, cells, facts[sheet.name], hidden=hidden))
    if not tables:
        raise UnreadableError("the workbook has no sheet that can be read", _SAVE_AGAIN)
    return tables
