"""An entry form as a workbook: the columns that `sameline.intake.forms` says, made to be filled in at the bench."""

from __future__ import annotations

import io
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from openpyxl import Workbook
from openpyxl.styles import Alignment, Border, Font, PatternFill, Protection, Side
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.properties import PageSetupProperties

from sameline.errors import CallError
from sameline.intake.forms import OWN_FIELDS, TAG, TAG_LIMIT, TAG_SHEET, form_map
from sameline.reports.text import plain

if TYPE_CHECKING:
    from openpyxl.cell.cell import Cell, MergedCell
    from openpyxl.worksheet.worksheet import Worksheet

Row = dict[str, Any]
_LISTED = ("batch", "analyst", "instrument")
_WIDTHS = {"batch": 16.0, "tested_at": 17.0, "analyst": 12.0, "instrument": 12.0, "session": 12.0}
_LINE = Side(style="thin", color="FF888888")
_GRID = Border(left=_LINE, right=_LINE, top=_LINE, bottom=_LINE)
_RED, _SHADE = "FFB00020", PatternFill("solid", fgColor="FFE6E6E6")
_MOST_COLUMNS = 60  # more cannot be read on one printed page
_DATE_FROM = "36526"  # 2000-01-01 as workbooks count days
_FAR = "1000000000000000"


def entry_form(characteristics: Sequence[Row], lists: dict[str, Sequence[str]], replicates: int, rows: int) -> bytes:
    """A workbook to be filled in.

    Args:
        characteristics: as `Reads.listing` gives them; at least one.
        lists: the codes to choose from, under "batch", "analyst" and "instrument".
        replicates: columns of each characteristic.
        rows: how many runs it has room for.

    Raises:
        CallError: it would have too many columns.
    """
    form = form_map([(row["code"], row["unit"]) for row in characteristics], replicates)
    if len(form.columns) > _MOST_COLUMNS or len(form.to_json()) > TAG_LIMIT:
        raise CallError(
            f"the form would have {len(form.columns)} columns, too many for a page",
            advice="make one form for each characteristic, or ask for fewer replicates",
        )
    book = Workbook()
    sheet = book.worksheets[0]
    sheet.title = "Results"
    headings = [column.heading for column in form.columns]
    top = _explain(sheet, characteristics, len(headings))
    _head(sheet, headings, top)
    _entries(sheet, characteristics, replicates, range(top + 1, top + 1 + rows))
    _tag(book.create_sheet(TAG_SHEET), form.to_json(), lists)
    _choices(sheet, lists, top + 1, top + rows)
    _page(sheet, f"A1:{get_column_letter(len(headings))}{top + rows}", top)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def about(row: Row) -> str:
    """A characteristic in one line: name, unit, limits, method."""
    lower, upper = row["lower"], row["upper"]
    limits = {
        (True, True): "no limits",
        (False, True): f"at least {plain(lower)}",
        (True, False): f"at most {plain(upper)}",
        (False, False): f"{plain(lower)} to {plain(upper)}",
    }[lower is None, upper is None]
    method = f"; by {row['method']}" if row["method"] else ""
    return f"{row['name']} ({row['code']}) in {row['unit']}; limits: {limits}{method}"


def _explain(sheet: Worksheet, characteristics: Sequence[Row], width: int) -> int:
    """Write what is measured, and what to beware of; returns the row for the headings."""
    _write(sheet.cell(1, 1), "Entry form: a row for each run; leave rows and cells empty that are not needed")
    sheet.cell(1, 1).font = Font(bold=True, size=13)
    place = 2
    for row in characteristics:
        lines = [(about(row), Font(bold=True))]
        if row["safety_critical"]:
            lines.append(("SAFETY-CRITICAL: a wrong result can hurt somebody", Font(bold=True, color=_RED)))
        if row["note"]:
            lines.append((f"Caution: {row['note']}", Font(color=_RED)))
        for text, font in lines:
            _write(sheet.cell(place, 1), text)
            sheet.cell(place, 1).font = font
            sheet.merge_cells(start_row=place, end_row=place, start_column=1, end_column=width)
            place += 1
    return place + 1


def _head(sheet: Worksheet, headings: Sequence[str], top: int) -> None:
    for place, heading in enumerate(headings, 1):
        cell = sheet.cell(top, place)
        _write(cell, heading)
        cell.font, cell.fill, cell.border = Font(bold=True), _SHADE, _GRID
        cell.alignment = Alignment(wrap_text=True, vertical="top")
        sheet.column_dimensions[get_column_letter(place)].width = _WIDTHS.get(heading, max(10.0, len(heading) * 0.8))
    sheet.column_dimensions[get_column_letter(len(headings))].width = 24.0


def _entries(sheet: Worksheet, characteristics: Sequence[Row], replicates: int, rows: range) -> None:
    first = len(OWN_FIELDS) + 1
    numbers = DataValidation(type="decimal", operator="between", formula1=f"-{_FAR}", formula2=_FAR, allow_blank=True)
    numbers.error, numbers.errorTitle, numbers.showErrorMessage = "Write a number.", "Not a number", True
    dates = DataValidation(type="date", operator="greaterThan", formula1=_DATE_FROM, allow_blank=True)
    dates.error, dates.errorTitle, dates.showErrorMessage = "Write a date, or a date and a time.", "Not a date", True
    formats = [_shown(row["decimals"]) for row in characteristics for _ in range(replicates)]
    for row in rows:
        for place in range(1, first + len(formats) + 1):
            cell = sheet.cell(row, place)
            cell.border, cell.protection = _GRID, Protection(locked=False)
        sheet.cell(row, OWN_FIELDS.index("tested_at") + 1).number_format = "yyyy-mm-dd hh:mm"
        for place, shown in enumerate(formats, first):
            sheet.cell(row, place).number_format = shown
    date = get_column_letter(OWN_FIELDS.index("tested_at") + 1)
    dates.add(f"{date}{rows[0]}:{date}{rows[-1]}")
    low, high = get_column_letter(first), get_column_letter(first + len(formats) - 1)
    numbers.add(f"{low}{rows[0]}:{high}{rows[-1]}")
    sheet.add_data_validation(dates)
    sheet.add_data_validation(numbers)


def _shown(decimals: int | None) -> str:
    """The number format with so many decimals; any where none are stated."""
    return "General" if decimals is None else f"0.{'0' * decimals}".rstrip(".")


def _tag(sheet: Worksheet, form: str, lists: dict[str, Sequence[str]]) -> None:
    """Write how the form is read, and the lists to choose from, on a hidden sheet."""
    _write(sheet.cell(1, 1), TAG)
    _write(sheet.cell(1, 2), form)
    for place, name in enumerate(_LISTED, 1):
        for row, code in enumerate(lists[name], 2):
            _write(sheet.cell(row, place), code)
    sheet.sheet_state = "hidden"


def _choices(sheet: Worksheet, lists: dict[str, Sequence[str]], first: int, last: int) -> None:
    for place, name in enumerate(_LISTED, 1):
        if not lists[name]:
            continue
        source, own = get_column_letter(place), get_column_letter(OWN_FIELDS.index(name) + 1)
        choice = DataValidation(
            type="list", formula1=f"'{TAG_SHEET}'!${source}$2:${source}${len(lists[name]) + 1}", allow_blank=True
        )
        choice.error, choice.errorTitle = f"Choose one from the list: this {name} is not in it.", "Not in the list"
        choice.showErrorMessage = True
        choice.add(f"{own}{first}:{own}{last}")
        sheet.add_data_validation(choice)


def _page(sheet: Worksheet, area: str, top: int) -> None:
    """One page across and one down, and nothing but the entries to be written in."""
    sheet.page_setup.orientation = "landscape"
    sheet.page_setup.paperSize = 9  # A4
    sheet.sheet_properties.pageSetUpPr = PageSetupProperties(fitToPage=True)
    sheet.page_setup.fitToWidth = sheet.page_setup.fitToHeight = 1
    sheet.print_area = area
    sheet.freeze_panes = f"A{top + 1}"
    sheet.protection.sheet = True
    sheet.protection.formatColumns = sheet.protection.formatRows = False


def _write(cell: Cell | MergedCell, text: str) -> None:
    """Text that stays text, whatever it begins with."""
    cell.value = text
    cell.data_type = "s"
