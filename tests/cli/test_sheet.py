"""Entry forms: written from the store, filled in by another library, and taken in without a map."""

from __future__ import annotations

import datetime as dt
import io
import json

import openpyxl
import pytest

from sameline.cli import run
from sameline.intake.forms import form_map, tagged_map
from sameline.intake.rawfiles import RawFile, load


@pytest.fixture
def call(sqlite_store, monkeypatch, capsys, tmp_path):
    monkeypatch.setenv("SAMELINE_STORE", sqlite_store)
    monkeypatch.setenv("SAMELINE_BY", "ben")
    monkeypatch.chdir(tmp_path)

    def called(*words, code=0):
        assert run([str(word) for word in words]) == code, capsys.readouterr()
        return capsys.readouterr()

    return called


@pytest.fixture
def form(call, tmp_path):
    """The form for two characteristics, two batches and two replicates."""
    call("restate", "characteristic", "set", "--note", "=the jig is hot", "--reason", "somebody was burnt")
    call("sheet", "hardness", "set", "-b", "B1", "-b", "B3", "--replicates", 2, "--rows", 6, "--out", "bench.xlsx")
    return tmp_path / "bench.xlsx"


def heading_row(sheet):
    return next(cell.row for cell in sheet["A"] if cell.value == "batch")


def fill(path, *rows):
    book = openpyxl.load_workbook(path)
    sheet = book["Results"]
    for place, row in enumerate(rows, heading_row(sheet) + 1):
        for column, value in enumerate(row, 1):
            sheet.cell(place, column).value = value
    book.save(path)


def test_a_form_that_was_filled_in_is_taken_without_a_map(call, form):
    morning, noon = dt.datetime(2026, 2, 21, 9, 30), dt.datetime(2026, 2, 21, 12, 0)  # noqa: DTZ001 - as workbooks keep
    fill(
        form,
        ("B1", morning, "ana", "DUR-1", "feb-21", 70.5, 71, 12, 12.5, "second drum"),
        (None,) * 10,
        ("B3", noon, "ben", None, None, 72.4, None, None, None, None),
    )
    call("take", form)
    found = json.loads(call("runs", "--last", "3", "--json").out)
    assert [(r["batch"], r["characteristic"], [m["text"] for m in r["replicates"]]) for r in found] == [
        ("B1", "hardness", ["70.5", "71.0"]),  # one decimal, as the cells show
        ("B1", "set", ["12", "12.5"]),
        ("B3", "hardness", ["72.4"]),
    ]
    assert (found[0]["analyst"], found[0]["instrument"], found[0]["session"]) == ("ana", "DUR-1", "feb-21")
    assert found[0]["tested_at"].startswith("2026-02-21T08:30")  # 09:30 in the laboratory's zone
    call("verify")


def test_a_form_holds_lists_checks_limits_and_cautions(form):
    book = openpyxl.load_workbook(form)
    sheet, hidden = book["Results"], book["Sameline"]
    top = heading_row(sheet)
    assert [cell.value for cell in sheet[top]] == [
        "batch", "tested_at", "analyst", "instrument", "session",
        "hardness 1 [degree]", "hardness 2 [degree]", "set 1 [%]", "set 2 [%]", "note",
    ]  # fmt: skip
    checks = {check.type: check for check in sheet.data_validations.dataValidation if check.type != "list"}
    assert str(checks["decimal"].sqref) == f"F{top + 1}:I{top + 6}"
    assert str(checks["date"].sqref) == f"B{top + 1}:B{top + 6}"
    lists = {str(c.sqref)[0]: c.formula1 for c in sheet.data_validations.dataValidation if c.type == "list"}
    assert lists == {"A": "'Sameline'!$A$2:$A$3", "C": "'Sameline'!$B$2:$B$3", "D": "'Sameline'!$C$2:$C$2"}
    assert [hidden.cell(row, 1).value for row in (2, 3)] == ["B1", "B3"]
    above = [str(row[0].value) for row in sheet.iter_rows(max_row=top - 1)]
    assert "Hardness (hardness) in degree; limits: 65 to 75; by in-house 4" in above
    assert any(line.startswith("SAFETY-CRITICAL") for line in above)
    assert "Caution: =the jig is hot" in above
    assert not any(cell.data_type == "f" for row in sheet.iter_rows() for cell in row)
    assert hidden.sheet_state == "hidden"
    assert (sheet.sheet_properties.pageSetUpPr.fitToPage, sheet.page_setup.fitToWidth) == (True, 1)
    assert sheet.page_setup.fitToHeight == 1


def test_a_form_is_checked_like_any_file(call, form):
    fill(form, ("B9", dt.date(2026, 2, 21), "ana", None, None, "strong", None, None, None, None))
    refused = call("take", form, code=1)
    assert "'B9' is not registered" in refused.err
    assert "'strong' is text" in refused.err


def test_an_empty_form_says_so(call, form):
    assert "no results below" in call("take", form, code=1).err


def test_the_rest_of_a_form_is_mended_as_a_file(call, form, tmp_path):
    day = dt.date(2026, 2, 21)
    fill(form, ("B1", day, "ana", None, None, 70.5), ("B3", day, "ana", None, None, "strong"))
    call("take", form, "--good-runs", "mend")
    (rest,) = (tmp_path / "mend").iterdir()
    assert "strong" in rest.read_text(encoding="utf-8-sig")


def test_a_file_that_is_there_is_not_overwritten(call, form):
    before = form.read_bytes()
    assert "already" in call("sheet", "set", "--out", form, code=2).err
    assert form.read_bytes() == before


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (("sett",), "did you mean"),
        (("set", "-b", "B77"), "no batch is registered"),
        (("set", "hardness", "--replicates", 100), "one form for each"),
        (("set", "--out", "none/x.xlsx"), "cannot be written"),
    ],
)
def test_what_cannot_be_meant_is_refused(call, words, says):
    assert says in call("sheet", *words, code=2).err


def test_only_our_forms_carry_a_map(form):
    assert tagged_map(load(form)) == form_map([("hardness", "degree"), ("set", "%")], 2)
    other = io.BytesIO()
    openpyxl.Workbook().save(other)
    for data in (other.getvalue(), b"PK\x03\x04broken", b"batch,value\n"):
        assert tagged_map(RawFile("other.xlsx", data)) is None
