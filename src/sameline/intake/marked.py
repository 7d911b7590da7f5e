"""A copy of a workbook with the cells of its findings marked."""

from __future__ import annotations

import io
from collections.abc import Sequence
from typing import TYPE_CHECKING

from sameline.errors import CallError
from sameline.intake.files import Intake
from sameline.intake.findings import Finding
from sameline.intake.headings import fold
from sameline.intake.rawfiles import SIZE_LIMIT, RawFile

if TYPE_CHECKING:
    from openpyxl.worksheet.worksheet import Worksheet

_MARKED_CELLS = 500_000
_MARKS = 5_000
_REFUSED, _ASKED = "FFF4B6B6", "FFFFE9A8"


def marked_copy(raw: RawFile, intake: Intake) -> bytes:
    """A copy of an XLSX workbook with the cells of findings coloured and commented, and a sheet that lists them.

    Refusals are red, questions yellow. The copy is for reading: take in the mended original.

    Args:
        raw: the workbook.
        intake: what `read_files` gave for it.

    Raises:
        CallError: it is no XLSX workbook, or too large to be marked.
    """
    try:
        _refuse_large(raw)
        return _marked(raw, intake)
    except CallError:
        raise
    except Exception as error:  # the library raises whatever its parsers and its types raise
        raise CallError(
            "only an XLSX workbook can be marked", where=raw.name, advice="see the list of findings"
        ) from error


def _refuse_large(raw: RawFile) -> None:
    from sameline.intake.workbooks import sheet_tables

    if sum(table.size for table in sheet_tables(raw, SIZE_LIMIT)) > _MARKED_CELLS:
        raise CallError("the workbook is too large to be marked", where=raw.name, advice="see the list of findings")


def _marked(raw: RawFile, intake: Intake) -> bytes:
    import openpyxl

    book = openpyxl.load_workbook(io.BytesIO(raw.data))
    findings = [finding for finding in intake.findings if finding.file == raw.name]
    rows = {part.sheet: part.heading_row for part in intake.parts if part.file == raw.name}
    for finding in findings[:_MARKS]:
        if finding.row is not None and finding.sheet in book.sheetnames:
            _mark(book[finding.sheet], finding, rows.get(finding.sheet))
    _list(book.create_sheet("Findings"), findings)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def _mark(sheet: Worksheet, finding: Finding, heading_row: int | None) -> None:
    from openpyxl.comments import Comment
    from openpyxl.styles import PatternFill

    fill = PatternFill("solid", fgColor=_ASKED if finding.question else _REFUSED)
    column = _column(sheet, finding.column, heading_row)
    for row in (finding.row, *finding.more[:_MARKS]):
        cell = sheet.cell(row or 1, column)
        if type(cell).__name__ == "MergedCell":  # covered by a merged one: it can hold no comment
            continue
        cell.fill = fill
        said = f"{finding.problem}{'; ' + finding.suggestion if finding.suggestion else ''}"
        before = f"{cell.comment.text}\n" if cell.comment else ""
        cell.comment = Comment(f"{before}{said}", "Sameline", height=120, width=320)


def _column(sheet: Worksheet, heading: str | None, heading_row: int | None) -> int:
    """The column (from 1) with this heading; the first one where there is none."""
    if heading is None or heading_row is None:
        return 1
    wanted = fold(heading)
    headings = enumerate(sheet[heading_row], 1)
    return next((place for place, cell in headings if fold(str(cell.value or "")) == wanted), 1)


def _list(sheet: Worksheet, findings: Sequence[Finding]) -> None:
    sheet.append(["sheet", "row", "column", "as it stands", "problem", "suggestion", "kind"])
    for finding in findings:
        kind = "question" if finding.question else "refusal"
        sheet.append([finding.sheet, finding.row, None, None, None, None, kind])
        for place, text in enumerate((finding.column, finding.text, finding.problem, finding.suggestion), 3):
            cell = sheet.cell(sheet.max_row, place)
            cell.value = text
            if text is not None:
                cell.data_type = "s"  # text that begins with = stays text
