from __future__ import annotations

import dataclasses
import datetime as dt
import io
import struct
import zipfile
import zlib
from collections.abc import Callable, Sequence
from pathlib import Path

import openpyxl
import pandas as pd
import pytest
import xlsxwriter

from sameline.intake import worksheets
from sameline.intake.files import Intake, read_files
from sameline.intake.odsfacts import decimals_in
from sameline.intake.rawfiles import RawFile
from sameline.intake.sheetfacts import PERCENT, SheetFacts
from sameline.intake.xlsxfacts import shown_by
from sameline.records.drafts import DraftMeasurement, Register

HEAD = ["batch", "characteristic", "tested_at", "analyst", "replicate", "value"]
WHEN = dt.datetime(2026, 3, 4, 8, 30, 15)  # noqa: DTZ001 - a workbook's moments have no zone
ROWS: list[list[object]] = [
    ["B-117", "TS", WHEN, "ana", 1, 12.5],
    ["B-117", "TS", WHEN, "ana", 2, 12.75],
    ["B-121", "SET", dt.date(2026, 3, 5), None, 1, 20.5],
]


def by_openpyxl(rows: Sequence[Sequence[object]], change: Callable[[openpyxl.Workbook], None] | None = None) -> bytes:
    book = openpyxl.Workbook()
    for row in rows:
        book.worksheets[0].append(list(row))
    if change is not None:
        change(book)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def by_xlsxwriter(rows: Sequence[Sequence[object]]) -> bytes:
    stream = io.BytesIO()
    with xlsxwriter.Workbook(stream, {"default_date_format": "dd.mm.yyyy hh:mm"}) as book:
        sheet = book.add_worksheet("Results")
        for number, row in enumerate(rows):
            sheet.write_row(number, 0, row)
    return stream.getvalue()


def by_pandas(rows: Sequence[Sequence[object]], engine: str) -> bytes:
    stream = io.BytesIO()
    pd.DataFrame(rows[1:], columns=list(rows[0])).to_excel(stream, engine=engine, index=False)
    return stream.getvalue()


WRITERS: dict[str, Callable[[Sequence[Sequence[object]]], bytes]] = {
    "openpyxl": by_openpyxl,
    "XlsxWriter": by_xlsxwriter,
    "pandas, openpyxl": lambda rows: by_pandas(rows, "openpyxl"),
    "pandas, XlsxWriter": lambda rows: by_pandas(rows, "xlsxwriter"),
    "pandas, odf": lambda rows: by_pandas(rows, "odf"),
}


@pytest.fixture
def read(register: Register) -> Callable[..., Intake]:
    return lambda data, **options: read_files([RawFile("book.xlsx", data)], register, **options)


Read = Callable[..., Intake]


@pytest.mark.parametrize("writer", WRITERS)
def test_workbooks_of_every_writer_give_the_runs_of_the_same_csv(read: Read, take: Read, writer: str):
    intake = read(WRITERS[writer]([HEAD, *ROWS]))
    text = "".join(",".join("" if cell is None else str(cell) for cell in row) + "\n" for row in [HEAD, *ROWS])
    assert intake.findings == ()
    assert intake.runs == take(text).runs
    assert intake.runs[0].tested_at == "2026-03-04T07:30:15.000000Z"
    assert intake.runs[1].measurements == (DraftMeasurement(1, "20.5", 20.5),)


def test_rows_and_columns_are_numbered_as_the_spreadsheet_shows_them(read: Read):
    rows = [
        [],
        ["", "", "Tensile tests"],
        [],
        [None, None, *HEAD],
        [None, None, *ROWS[0]],
        [None, None, "B-1l7", *ROWS[1][1:]],
    ]
    (finding,) = read(by_openpyxl(rows)).findings
    assert str(finding) == (
        "book.xlsx, sheet 'Sheet', row 6, column 'batch': batch 'B-1l7' is not registered; did you mean 'B-117'?"
    )


def test_figures_keep_the_zeros_and_the_percentages_that_their_cells_show(read: Read):
    def change(book: openpyxl.Workbook) -> None:
        sheet = book.worksheets[0]
        sheet["F2"].number_format = "0.00"
        sheet["F3"].number_format = "0.0"
        sheet["F4"].number_format = "0.0%"

    rows = [HEAD, *ROWS[:2], [*ROWS[2][:5], 0.125]]
    intake = read(by_openpyxl(rows, change))
    assert [[m.text for m in run.measurements] for run in intake.runs] == [["12.50", "12.75"], ["12.5"]]
    assert intake.runs[1].measurements[0] == DraftMeasurement(1, "12.5", 12.5)


# Codes as in ECMA-376 part 1, 18.8.31.
@pytest.mark.parametrize(
    ("code", "shown"),
    [
        ("0.00", 2),
        ("#,##0.000", 3),
        ("0%", PERCENT),
        ("0.0%", PERCENT + 1),
        ('0.0" %"', 1),
        ("General", 0),
        ("0.0##", 1),
        ("yyyy-mm-dd", 0),
        ("hh:mm:ss.00", 0),
        ("0.00E+00", 0),
        ("[Red]0.0;-0.000", 1),
        ("@", 0),
        ("0", 0),
        ("", 0),
    ],
)
def test_number_formats(code: str, shown: int):
    assert shown_by(code) == shown


@pytest.mark.parametrize(
    ("text", "value", "decimals"),
    [
        ("12.50", "12.5", 2),
        ("12,50", "12.5", 2),
        ("1,234.50", "1234.5", 2),
        ("1.234", "1234", 0),
        ("1,234", "1.234", 3),
        ("12.50%", "0.125", 2),
        ("60", "60", 0),
        ("12.50 MPa", "12.5", 0),
        ("1e5", "100000", 0),
        ("12.50", "broken", 0),
        ("", "", 0),
    ],
)
def test_decimals_that_a_cell_shows(text: str, value: str, decimals: int):
    assert decimals_in(text, value) == decimals


# Written by LibreOffice 7.4.7.2 with `soffice --headless --convert-to xlsx` (and `ods`) from a workbook with two lines
# above the headings, merged cells, cells shown as 0.00 and 0.0%, a formula, a hidden sheet and a sheet of notes.
@pytest.mark.parametrize("kind", ["xlsx", "ods"])
def test_workbooks_that_libreoffice_wrote(register: Register, take: Callable[..., Intake], kind: str):
    intake = read_files([Path(__file__).parent / "written_by_libreoffice" / f"results.{kind}"], register)
    same = take(
        "batch,characteristic,tested_at,analyst,replicate,value,unit\n,,,,,,\n,,,,,,\n"
        "B-117,TS,2026-03-04T08:30:15,ana,1,12.50,\n"
        "B-117,TS,2026-03-04T08:30:15,ana,2,12.75,\n"
        "B-117,TS,2026-03-04T08:30:15,ana,3,12.60,\n"
        "B-121,SET,2026-03-05,ben,1,12.5,\n"
        "B-130,TS,2026-03-06T23:59:59,,1,1813,psi\n"
        "B-130,SET,2026-03-06,,1,<0.5,\n"
        "B-130,HA,2026-03-06,,1,60,\n"
    )
    assert same.findings == ()
    assert [dataclasses.replace(run, row=None) for run in intake.runs] == [
        dataclasses.replace(run, row=None) for run in same.runs
    ]
    assert [(finding.sheet, finding.question) for finding in intake.findings] == [("Notes", True)]
    assert intake.runs[0].row == 4


def test_merged_cells_of_codes_hold_for_all_their_rows_and_merged_values_are_refused(read: Read):
    rows = [
        HEAD,
        ["B-117", "TS", WHEN, "ana", 1, 12.5],
        [None, None, None, None, 2, 12.6],
        [None, None, None, None, 3, 12.7],
    ]

    def merge(book: openpyxl.Workbook) -> None:
        for column in "ABCD":
            book.worksheets[0].merge_cells(f"{column}2:{column}4")

    (run,) = read(by_openpyxl(rows, merge)).runs
    assert [m.text for m in run.measurements] == ["12.5", "12.6", "12.7"]

    def merge_values(book: openpyxl.Workbook) -> None:
        merge(book)
        book.worksheets[0].merge_cells("F2:F3")

    intake = read(by_openpyxl(rows, merge_values))
    assert [(finding.row, finding.problem) for finding in intake.refusals] == [(3, "the value is empty")]


def test_without_merging_empty_cells_are_refused(read: Read):
    rows = [HEAD, ["B-117", "TS", WHEN, "ana", 1, 12.5], [None, None, None, None, 2, 12.6]]
    assert {finding.problem for finding in read(by_openpyxl(rows)).refusals} == {
        "the batch is empty",
        "the characteristic is empty",
        "the date is empty",
    }


def test_several_sheets_are_read_and_what_is_left_out_is_said(read: Read):
    def change(book: openpyxl.Workbook) -> None:
        book.create_sheet("More")
        for row in (HEAD, ["B-130", "HA", WHEN, "ben", 1, 60]):
            book["More"].append(row)
        book.create_sheet("Notes").append(["Remember the calibration"])
        book.create_sheet("Lists").append(["B-117"])
        book["Lists"].sheet_state = "hidden"
        book.create_sheet("Old")
        for row in (HEAD, ["B-121", "HA", WHEN, "ben", 1, 61]):
            book["Old"].append(row)
        book["Old"].sheet_state = "hidden"

    data = by_openpyxl([HEAD, ROWS[0]], change)
    intake = read(data)
    assert [run.batch for run in intake.runs] == ["B-117", "B-130"]
    assert [(f.sheet, f.problem, f.question) for f in intake.findings] == [
        ("Notes", "the sheet has no headings of ours and fits no map", True),
        ("Old", "the hidden sheet holds results", True),
    ]
    only = read(data, sheets=["Old"])
    assert ([run.batch for run in only.runs], only.findings) == (["B-121"], ())
    (finding,) = read(data, sheets=["New"]).findings
    assert finding.problem == "there is no sheet 'New'"


def test_a_date_that_is_a_bare_number_is_refused_with_the_day_it_would_be(read: Read):
    (finding,) = read(by_openpyxl([HEAD, ["B-117", "TS", 46085, "ana", 1, 12.5]])).findings
    assert "2026-03-04" in str(finding.suggestion)


def test_an_empty_workbook_is_a_finding(read: Read):
    assert [finding.problem for finding in read(by_openpyxl([])).refusals] == ["the table is empty"]


def repacked(data: bytes, changes: dict[str, Callable[[bytes], bytes]]) -> bytes:
    stream = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as old, zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as new:
        for name in old.namelist():
            new.writestr(name, changes.get(name, bytes)(old.read(name)))
    return stream.getvalue()


SHEET = "xl/worksheets/sheet1.xml"
GOOD = by_openpyxl([HEAD, *ROWS])


def test_a_packed_bomb_is_refused_by_size(read: Read):
    bomb = repacked(GOOD, {SHEET: lambda content: content + b" " * 20_000_000})
    assert len(bomb) < 100_000
    (finding,) = read(bomb, limit=10_000_000).findings
    assert finding.problem == "unpacked the workbook is larger than 10 MB"


def test_a_bomb_that_lies_about_its_size_is_refused(read: Read):
    bomb = bytearray(repacked(GOOD, {SHEET: lambda content: content + b" " * 5_000_000}))
    true = struct.pack("<I", len(zipfile.ZipFile(io.BytesIO(bomb)).read(SHEET)))
    assert bomb.count(true) >= 1
    lying = bytes(bomb).replace(true, struct.pack("<I", 2_000))
    (finding,) = read(lying).findings
    assert finding.problem == "the workbook is damaged: a part has another size than it says"


@pytest.mark.parametrize(
    "change",
    [
        lambda content: content.replace(b'r="A2"', b'r="XFD1048576"'),
        lambda content: content.replace(b"</sheetData>", b'<row r="1048576"><c r="XFD1048576"/></row></sheetData>'),
    ],
)
def test_a_cell_far_out_is_refused_before_the_sheet_is_laid_out(read: Read, change: Callable[[bytes], bytes]):
    (finding,) = read(repacked(GOOD, {SHEET: change})).findings
    assert finding.problem == "a sheet reaches to row 1048576 and column 16384: too far to be read"


def test_repeated_cells_of_an_ods_sheet_are_counted_before_they_are_laid_out(read: Read):
    ods = by_pandas([HEAD, *ROWS], "odf")
    blow = b'<table:table-row table:number-rows-repeated="1048576">'
    blow += b'<table:table-cell table:number-columns-repeated="16384" '

    def filled(content: bytes) -> bytes:
        cell = blow + b'office:value-type="float" office:value="1"/></table:table-row></table:table>'
        return content.replace(b"</table:table>", cell)

    def empty(content: bytes) -> bytes:
        return content.replace(b"</table:table>", blow + b"/></table:table-row></table:table>")

    (finding,) = read(repacked(ods, {"content.xml": filled})).findings
    assert finding.problem == "a sheet reaches to row 1048580 and column 16384: too far to be read"
    assert read(repacked(ods, {"content.xml": empty})).runs == read(ods).runs


def test_merged_cells_of_an_ods_sheet_hold_for_all_their_rows(read: Read):
    ods = by_pandas([HEAD, *ROWS[:2]], "odf")
    first = b'<table:table-cell office:value-type="string" office:string-value="B-117">'

    def merge(content: bytes) -> bytes:
        content = content.replace(first, first[:-1] + b' table:number-rows-spanned="2">', 1)
        start = content.index(first)
        end = content.index(b"</table:table-cell>", start) + len(b"</table:table-cell>")
        return content[:start] + b"<table:covered-table-cell/>" + content[end:]

    intake = read(repacked(ods, {"content.xml": merge}))
    assert intake.findings == ()
    assert intake.runs == read(ods).runs


@pytest.mark.parametrize(
    "data",
    [
        GOOD[:200],
        GOOD[: len(GOOD) // 2],
        b"PK\x03\x04" + b"\0" * 40,
        repacked(GOOD, {SHEET: lambda content: content[: len(content) // 2]}),
        repacked(GOOD, {"xl/workbook.xml": lambda _content: b"<workbook/>"}),
        repacked(GOOD, {"xl/styles.xml": lambda _content: b"<styleSheet>"}),
    ],
)
def test_a_damaged_workbook_is_a_finding(read: Read, data: bytes):
    intake = read(data)
    assert intake.runs == ()
    assert len(intake.refusals) == 1


def test_a_packed_file_that_is_no_workbook_is_a_finding(read: Read):
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w") as archive:
        archive.writestr("results.csv", "batch,value\n")
    (finding,) = read(stream.getvalue()).findings
    assert finding.problem == "this is a packed file and no workbook that can be read"


def test_texts_shared_by_very_many_cells_are_refused(read: Read):
    cells = "".join(f'<row r="{row}">' + '<c t="s"><v>0</v></c>' * 100 + "</row>" for row in range(5, 405))
    text = "<sst><si><t>" + "x" * 30_000 + "</t></si></sst>"
    stream = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(GOOD)) as old, zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as new:
        for name in old.namelist():
            content = old.read(name)
            new.writestr(
                name, content.replace(b"</sheetData>", cells.encode() + b"</sheetData>") if name == SHEET else content
            )
        new.writestr("xl/sharedStrings.xml", text)
    (finding,) = read(stream.getvalue()).findings
    assert finding.problem == "a sheet holds more text than can be read"


def test_the_checksum_of_a_part_is_held(read: Read):
    broken = bytearray(GOOD)
    checksum = struct.pack("<I", zlib.crc32(zipfile.ZipFile(io.BytesIO(GOOD)).read(SHEET)))
    place = broken.rindex(checksum)
    broken[place] ^= 0xFF
    assert len(read(bytes(broken)).refusals) == 1


@pytest.mark.parametrize("writer", [name for name in WRITERS if "odf" not in name])
def test_the_fast_look_at_a_worksheet_sees_what_an_xml_parser_sees(writer: str):
    rows = [[*HEAD, None, "x"], *ROWS, [], [None, 'a <c r="Z99"> in text & more', True, -1.5, "é"]]
    data = WRITERS[writer]([HEAD, *ROWS] if "pandas" in writer else rows)
    sheet = zipfile.ZipFile(io.BytesIO(data)).read(SHEET)
    shown = [0, 2, PERCENT, PERCENT + 1]
    fast, slow = SheetFacts(), SheetFacts()
    texts = worksheets._by_pattern(sheet, shown, fast)
    assert texts is not None
    assert texts == worksheets._by_parser(sheet, shown, slow)
    assert fast == slow
    assert fast.rows > 3


@pytest.mark.parametrize(
    "change",
    [
        lambda content: content.replace(b'<c r="A2"', b"<c r='A2'"),
        lambda content: content.replace(b'<c r="A2"', b'<c  r="A2"'),
        lambda content: content.replace(b'<c r="A2"', b'<c r="&#65;2"'),
        lambda content: content.replace(b"<sheetData>", b"<sheetData><!-- -->"),
        lambda content: content.replace(b'<c r="A2" ', b"<c "),
    ],
)
def test_a_worksheet_written_in_an_uncommon_way_is_parsed(read: Read, change: Callable[[bytes], bytes]):
    content = zipfile.ZipFile(io.BytesIO(GOOD)).read(SHEET)
    assert change(content) != content
    assert worksheets._by_pattern(change(content), [], SheetFacts()) is None
    intake = read(repacked(GOOD, {SHEET: change}))
    assert intake.runs == read(GOOD).runs or intake.refusals
