from __future__ import annotations

import csv
import io
from collections.abc import Callable

import openpyxl
import pytest

from sameline.errors import CallError
from sameline.intake.files import Intake, read_files
from sameline.intake.headings import HeadingMap, MapColumn
from sameline.intake.marked import marked_copy
from sameline.intake.rawfiles import RawFile
from sameline.intake.rest import rest_files
from sameline.records.drafts import Register

Take = Callable[..., Intake]
TEXT = (
    "batch;characteristic;tested_at;replicate;value\n"
    "B-117;TS;2026-03-04;1;12,5\n"
    "B-1l7;TS;2026-03-05;1;12,25\n"
    "B-121;TS;2026-03-04;1;12,4\n"
    "B-121;TS;2026-03-04;2;x\n"
    "B-121;TS;2026-03-06;1\n"
)


def read_rows(raw: RawFile, delimiter: str) -> list[list[str]]:
    return list(csv.reader(io.StringIO(raw.data.decode("utf-8-sig"), newline=""), delimiter=delimiter))


def test_the_rest_of_a_text_file_holds_the_other_rows_and_says_why(register: Register):
    raw = RawFile("results.csv", TEXT.encode())
    intake = read_files([raw], register)
    assert [run.batch for run in intake.runs] == ["B-117"]
    (rest,) = rest_files(raw, intake)
    assert rest.name == "results.rest.csv"
    assert read_rows(rest, ";") == [
        ["batch", "characteristic", "tested_at", "replicate", "value", "problem"],
        [
            "B-1l7",
            "TS",
            "2026-03-05",
            "1",
            "12,25",
            "in column 'batch': batch 'B-1l7' is not registered (did you mean 'B-117'?)",
        ],
        ["B-121", "TS", "2026-03-04", "1", "12,4", "belongs to a run with a finding"],
        ["B-121", "TS", "2026-03-04", "2", "x", "in column 'value': 'x' is text, not a figure"],
        ["B-121", "TS", "2026-03-06", "1", "", "the row has 4 cells and there are 5 headings (is a cell missing?)"],
    ]


def test_good_runs_and_the_mended_rest_are_all_runs_of_the_mended_file(register: Register):
    raw = RawFile("results.csv", TEXT.encode())
    first = read_files([raw], register)
    (rest,) = rest_files(raw, first)

    def mend(text: str) -> bytes:
        return text.replace("B-1l7", "B-117").replace(";x", ";12,6").replace("06;1;;", "06;1;12,7;").encode()

    second = read_files([RawFile(rest.name, mend(rest.data.decode()))], register)
    whole = read_files([RawFile("w.csv", mend(TEXT).replace(b"06;1\n", b"06;1;12,7\n"))], register)
    assert second.findings == whole.findings == ()
    key = [(run.batch, run.tested_at, run.measurements) for run in (*first.runs, *second.runs)]
    assert sorted(key) == sorted((run.batch, run.tested_at, run.measurements) for run in whole.runs)


def test_a_file_without_faults_has_no_rest(register: Register):
    raw = RawFile("results.csv", TEXT.splitlines(keepends=True)[0].encode() + b"B-117;TS;2026-03-04;1;12,5\n")
    assert rest_files(raw, read_files([raw], register)) == ()


def book(rows: list[list[object]]) -> RawFile:
    workbook = openpyxl.Workbook()
    for row in rows:
        workbook.worksheets[0].append(row)
    stream = io.BytesIO()
    workbook.save(stream)
    return RawFile("book.xlsx", stream.getvalue())


ROWS: list[list[object]] = [
    ["batch", "characteristic", "tested_at", "value"],
    ["B-117", "TS", "2026-03-04", 12.5],
    ["B-1l7", "TS", "2026-03-04", 12.5],
    ["B-1l7", "TS", "2026-03-04", 1.255],
]


def test_the_rest_of_a_sheet_is_written_with_the_decimal_sign_of_its_map(register: Register):
    columns = [("Lot", "batch"), ("characteristic", "characteristic"), ("tested_at", "tested_at"), ("value", "value")]
    maps = [HeadingMap("rig", tuple(MapColumn(*column) for column in columns), decimal=",")]
    raw = book([["Lot", *ROWS[0][1:]], *ROWS[1:]])
    intake = read_files([raw], register, maps=maps)
    (rest,) = rest_files(raw, intake, maps)
    assert rest.name == "book.sheet.rest.csv"
    assert [row[3] for row in read_rows(rest, ";")] == ["value", "12,5", "1,255"]
    mended = RawFile("mended.csv", rest.data.replace(b"B-1l7", b"B-117").replace(b"1,255", b"12,55"))
    (run,) = read_files([mended], register, maps=maps).runs
    assert [m.value for m in run.measurements] == [12.5, 12.55]


def test_a_marked_copy_colours_and_comments_the_cells_and_lists_the_findings(register: Register):
    raw = book([*ROWS, ["B-121", "TS", "2026-03-04", 125], ["B-121", "=1+1", "2026-03-04", 12]])
    intake = read_files([raw], register)
    marked = openpyxl.load_workbook(io.BytesIO(marked_copy(raw, intake)))
    sheet = marked["Sheet"]
    for row in (3, 4):
        assert sheet.cell(row, 1).comment.text == "batch 'B-1l7' is not registered; did you mean 'B-117'?"
        assert sheet.cell(row, 1).fill.fgColor.rgb == "FFF4B6B6"
    assert "was 12.5 meant?" in sheet["D5"].comment.text
    assert sheet["D5"].fill.fgColor.rgb == "FFFFE9A8"
    assert sheet["A2"].comment is None
    assert [sheet.cell(row, 4).value for row in (2, 3, 5)] == [12.5, 12.5, 125]
    listed = list(marked["Findings"].iter_rows(values_only=True))
    assert len(listed) == 1 + len(intake.findings)
    assert listed[1][:5] == ("Sheet", 3, "batch", "B-1l7", "batch 'B-1l7' is not registered")
    assert all(cell.data_type != "f" for row in marked["Findings"] for cell in row)


def test_text_that_a_spreadsheet_would_run_stays_text_in_the_list_of_findings(register: Register):
    raw = RawFile("t.csv", b"")
    workbook = book([ROWS[0], ["=cmd|' /C calc'!A0", "TS", "2026-03-04", 12.5]])
    shown = openpyxl.load_workbook(io.BytesIO(workbook.data))
    shown["Sheet"]["A2"].data_type = "s"
    stream = io.BytesIO()
    shown.save(stream)
    raw = RawFile("book.xlsx", stream.getvalue())
    marked = openpyxl.load_workbook(io.BytesIO(marked_copy(raw, read_files([raw], register))))
    assert marked["Findings"]["D2"].value == "=cmd|' /C calc'!A0"
    assert marked["Findings"]["D2"].data_type == "s"


def test_only_workbooks_are_marked(register: Register):
    for raw in (RawFile("results.csv", TEXT.encode()), RawFile("x.xlsx", b"PK\x03\x04 broken")):
        with pytest.raises(CallError):
            marked_copy(raw, read_files([raw], register))


# The characters that OWASP's page "CSV Injection" names: = + - @, tab, carriage return.
@pytest.mark.parametrize("start", ["=", "+", "-", "@", "\t", "\r"])
def test_text_that_a_spreadsheet_would_run_stays_text_in_the_rest(register: Register, start: str):
    text = f'batch,characteristic,tested_at,value\n"{start}cmd|0",TS,2026-03-04,-3.2\n'
    raw = RawFile("results.csv", text.encode())
    (rest,) = rest_files(raw, read_files([raw], register))
    row = read_rows(rest, ",")[1]
    assert row[0] == f"'{start}cmd|0"
    assert row[3] == "-3.2"
    assert all(cell[:1] not in ("=", "+", "@", "\t", "\r") for cell in row)
