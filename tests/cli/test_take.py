"""Files taken in again, changed or in part, from the command line."""

from __future__ import annotations

import json

import openpyxl
import pytest

from sameline.cli import run

HEAD = "batch,characteristic,tested_at,analyst,replicate,value"
FIRST = [
    "B1,hardness,2026-02-21T09:00,ana,1,70.5",
    "B1,hardness,2026-02-21T09:00,ana,2,70.7",
    "B2,hardness,2026-02-21T10:00,ana,1,70.1",
]
NEXT = "B3,hardness,2026-02-22T09:00,ben,1,72.8"


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
def file(tmp_path):
    def write(name, *rows, head=HEAD):
        path = tmp_path / name
        path.write_text("\n".join([head, *rows]) + "\n", encoding="utf-8")
        return path

    return write


def taken_entry(said):
    return said.err.rsplit("entry ", 1)[1].split()[0]


def newest_run(call, batch):
    return json.loads(call("runs", "--batch", batch, "--last", "1", "--json").out)[-1]["run"]


def runs_recorded(call):
    return len(call("runs").out.splitlines())


def test_a_file_that_grew_brings_only_what_is_new(call, file):
    entry = taken_entry(call("take", file("day.csv", *FIRST)))
    before = runs_recorded(call)
    again = call("take", file("day.csv", *FIRST, NEXT))
    assert f"day.csv: passed over 2 runs recorded already, in entry {entry}" in again.err
    assert runs_recorded(call) == before + 1
    nothing = call("take", file("shuffled.csv", NEXT, *reversed(FIRST)), code=1)
    assert "nothing new" in nothing.err
    assert f"passed over 2 runs recorded already, in entry {entry}" in nothing.err
    assert runs_recorded(call) == before + 1


def test_a_changed_run_is_refused_and_the_entry_named(call, file):
    entry = taken_entry(call("take", file("day.csv", *FIRST)))
    before = runs_recorded(call)
    changed = [row.replace("70.7", "70.9") for row in FIRST]
    refused = call("take", file("day.csv", *changed, NEXT), code=1)
    assert f"in entry {entry}, with other values: replicate 2 70.7, now 70.9; amend" in refused.err
    assert runs_recorded(call) == before


def test_an_amended_run_is_known_by_its_first_values_and_by_its_new_ones(call, file):
    call("take", file("day.csv", *FIRST))
    run_number = newest_run(call, "B1")
    call("amend", "70.9", "--run", run_number, "--replicate", "2", "--reason", "misread")
    for text in ("70.7", "70.9"):
        rows = [row.replace("70.7", text) for row in FIRST]
        assert "passed over 2 runs" in call("take", "--check", file("day.csv", *rows, NEXT)).err
    rows = [row.replace("70.7", "71.0") for row in FIRST]
    assert "replicate 2 70.9, now 71.0" in call("take", file("day.csv", *rows), code=1).err


def test_a_run_whose_moment_was_restated_is_found_where_it_is_now(call, file):
    call("take", file("day.csv", *FIRST))
    run_number = newest_run(call, "B2")
    call("restate", "run", run_number, "--at", "2026-02-20T10:00", "--reason", "the day before")
    moved = FIRST[2].replace("02-21", "02-20")
    assert "passed over 1 run recorded" in call("take", "--check", file("moved.csv", moved)).err
    assert "passed over" not in call("take", "--check", file("old.csv", FIRST[2])).err


def test_a_run_that_looks_like_a_recorded_one_is_asked_about(call, file):
    call("take", file("day.csv", *FIRST))
    before = runs_recorded(call)
    alike = file("alike.csv", FIRST[2].replace("ana", "ben"))
    assert "is it another run?" in call("take", alike, code=1).err
    assert runs_recorded(call) == before
    call("take", "--as-they-stand", alike)
    assert runs_recorded(call) == before + 1


def test_two_files_of_one_name_are_not_mixed_up(call, file, tmp_path):
    (tmp_path / "other").mkdir()
    one, two = file("day.csv", *FIRST), file("other/day.csv", NEXT)
    assert "two of the files are named day.csv" in call("take", one, two, code=2).err


def test_the_good_runs_are_recorded_and_the_rest_is_mended_and_taken(call, file, tmp_path):
    before = runs_recorded(call)
    bad = "B9,hardness,2026-02-22T11:00,ben,1,72.8"
    said = call("take", "--good-runs", "mend", file("day.csv", *FIRST, bad))
    assert "'B9' is not registered" in said.err
    assert runs_recorded(call) == before + 2
    rest = tmp_path / "mend" / "day.rest.csv"
    lines = rest.read_text(encoding="utf-8-sig").splitlines()
    assert (len(lines), lines[1].startswith(bad)) == (2, True)
    rest.write_text(rest.read_text(encoding="utf-8-sig").replace("B9", "B3"), encoding="utf-8")
    call("take", rest)
    assert runs_recorded(call) == before + 3


def test_a_rest_never_overwrites_and_then_nothing_is_recorded(call, file, tmp_path):
    before = runs_recorded(call)
    rest = file("day.rest.csv", "something of yours")
    held = rest.read_bytes()
    bad = "B9,hardness,2026-02-22T11:00,ben,1,72.8"
    refused = call("take", "--good-runs", tmp_path, file("day.csv", *FIRST, bad), code=2)
    assert "nothing was recorded" in refused.err
    assert (rest.read_bytes(), runs_recorded(call)) == (held, before)


def test_a_file_without_any_good_run_is_refused_whole(call, file, tmp_path):
    bad = "B9,hardness,2026-02-22T11:00,ben,1,72.8"
    call("take", "--good-runs", "mend", file("day.csv", bad), code=1)
    assert not (tmp_path / "mend").exists()


def test_a_workbook_s_findings_are_marked_in_a_copy(call, tmp_path):
    book = openpyxl.Workbook()
    for row in (HEAD, FIRST[0], FIRST[1].replace("70.7", "strong")):
        book.active.append(row.split(","))
    path, out = tmp_path / "day.xlsx", tmp_path / "marked.xlsx"
    book.save(path)
    assert "1 finding marked" in call("take", "--mark", out, path, code=1).err
    sheet = openpyxl.load_workbook(out).worksheets[0]
    assert "'strong' is text" in sheet["F3"].comment.text
    assert sheet["F2"].comment is None
    assert "already" in call("take", "--mark", out, path, code=2).err
