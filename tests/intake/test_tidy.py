from __future__ import annotations

import dataclasses
import io
import random
from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.errors import CallError
from sameline.intake.files import Intake, read_files
from sameline.intake.rawfiles import RawFile, load, load_stream
from sameline.records.drafts import CharacteristicFacts, DraftMeasurement, DraftRun, Register

Take = Callable[..., Intake]

HEAD = "batch,characteristic,tested_at,analyst,instrument,session,replicate,value\n"


def said(intake: Intake) -> list[str]:
    return [str(finding) for finding in intake.findings]


def test_a_run_is_the_rows_that_agree_in_six_columns(take: Take):
    intake = take(
        HEAD
        + "B-117,TS,2026-03-04T08:30,ana,RIG-1,week 10,1,12.50\n"
        + "B-117,TS,2026-03-04T08:30,ana,RIG-1,week 10,2,12.7\n"
        + "B-117,TS,2026-03-04T08:30,ben,RIG-1,week 10,1,12.4\n"
    )
    assert intake.findings == ()
    assert intake.runs == (
        DraftRun(
            batch="B-117",
            characteristic="TS",
            tested_at="2026-03-04T07:30:00.000000Z",
            measurements=(DraftMeasurement(1, "12.50", 12.5), DraftMeasurement(2, "12.7", 12.7)),
            analyst="ana",
            instrument="RIG-1",
            session="week 10",
            row=2,
        ),
        DraftRun(
            batch="B-117",
            characteristic="TS",
            tested_at="2026-03-04T07:30:00.000000Z",
            measurements=(DraftMeasurement(1, "12.4", 12.4),),
            analyst="ben",
            instrument="RIG-1",
            session="week 10",
            row=4,
        ),
    )


def test_the_source_is_named_with_its_digest_and_size(take: Take):
    (source,) = take(HEAD + "B-117,TS,2026-03-04,,,,1,12.5\n").sources
    assert (source.name, source.size) == ("results1.csv", len(HEAD) + 30)
    # the digest of nothing is published in NIST's example values for SHA-256
    assert RawFile("x", b"").source().sha256 == "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855"


def test_only_four_columns_are_needed_in_any_order_and_case(take: Take):
    intake = take("VALUE, Tested At ,Batch,characteristic\n12.5,2026-03-04,B-117,TS\n12.6,2026-03-04,B-117,TS\n")
    (run,) = intake.runs
    assert intake.findings == ()
    assert [(m.replicate, m.text) for m in run.measurements] == [(1, "12.5"), (2, "12.6")]
    assert (run.analyst, run.instrument, run.session, run.note) == (None, None, None, None)


def test_runs_keep_the_order_in_which_they_begin_and_replicates_that_of_their_numbers(take: Take):
    intake = take(
        HEAD + "B-121,TS,2026-03-04,,,,2,12.2\n" + "B-117,TS,2026-03-04,,,,1,12.5\n" + "B-121,TS,2026-03-04,,,,1,12.1\n"
    )
    assert intake.findings == ()
    assert [(run.batch, run.row, [m.text for m in run.measurements]) for run in intake.runs] == [
        ("B-121", 2, ["12.1", "12.2"]),
        ("B-117", 3, ["12.5"]),
    ]


def test_two_ways_of_writing_one_moment_are_one_run(take: Take):
    intake = take(
        "batch,characteristic,tested_at,value\n"
        "B-117,TS,2026-03-04T08:30Z,12.5\nB-117,TS,2026-03-04 09:30+01:00,12.6\n B-117 ,TS,2026-03-04T09:30,12.7\n"
    )
    (run,) = intake.runs
    assert [m.text for m in run.measurements] == ["12.5", "12.6", "12.7"]


def test_a_note_and_a_unit_column_are_read(take: Take):
    intake = take(
        "batch,characteristic,tested_at,value,unit,note\n"
        "B-117,TS,2026-03-04,1813,psi,first\nB-117,TS,2026-03-04,12.6,N/mm²,\nB-117,TS,2026-03-04,12.4,MPa,late\n"
    )
    (run,) = intake.runs
    assert run.note == "first; late"
    assert [(m.text, m.unit) for m in run.measurements] == [("1813", "psi"), ("12.6", "N/mm²"), ("12.4", None)]
    assert run.measurements[0].value == pytest.approx(1813 * 6.894757e-3, rel=1e-6)  # NIST SP 811, B.8: psi


def test_censored_results_keep_their_qualifier(take: Take):
    (run,) = take(HEAD + "B-117,SET,2026-03-04,,,,1,<0.5\nB-117,SET,2026-03-04,,,,2,> 100 %\n").runs
    assert run.measurements == (DraftMeasurement(1, "<0.5", 0.5, "<"), DraftMeasurement(2, "> 100", 100.0, ">"))


def test_everything_wrong_in_a_file_is_listed_with_its_place_and_the_nearest_right_thing(take: Take):
    intake = take(
        HEAD
        + "B-1l7,TS,2026-03-04,ana,RIG-1,,1,12.5\n"
        + "B-1l7,TS,2026-03-04,ana,RIG-1,,2,12.6\n"
        + "B-121,T5,2026-03-04,anna,RIG-I,,1,12.5\n"
        + "B-121,TS,2027-03-04,ana,RIG-1,,1,12.5\n"
        + "B-121,TS,03/04/2026,ana,RIG-1,,1,12.5\n"
        + "B-121,TS,2026-03-05,ana,RIG-1,,1,l2.5\n"
        + "B-121,TS,2026-03-06,ana,RIG-1,,1,12.5\n"
        + "B-121,TS,2026-03-06,ana,RIG-1,,1,12.6\n"
        + "B-121,TS,2026-03-07,ana,RIG-1,,1,\n"
        + ",TS,2026-03-07,ana,RIG-1,,1,12.5\n"
        + "B-121,TS,2026-03-08,ana,RIG-1,,first,12.5\n"
        + "B-121,TS\n"
        + "B-121,TS,2026-03-09,ana,RIG-1,,1,12.5,extra\n"
    )
    assert intake.runs == ()
    assert all(not finding.question for finding in intake.findings)
    found = [(f.row, f.column, f.text, f.problem, f.suggestion, f.more) for f in intake.findings]
    assert found[:5] == [
        (2, "batch", "B-1l7", "batch 'B-1l7' is not registered", "did you mean 'B-117'?", (3,)),
        (4, "characteristic", "T5", "characteristic 'T5' is not registered", "did you mean 'TS'?", ()),
        (4, "analyst", "anna", "person 'anna' is not registered", "did you mean 'ana'?", ()),
        (4, "instrument", "RIG-I", "instrument 'RIG-I' is not registered", "did you mean 'RIG-1'?", ()),
        (5, "tested_at", "2027-03-04", "'2027-03-04' is in the future (it is now 2026-12-01T00:00Z)",
         "give the day it was tested", ()),
    ]  # fmt: skip
    assert [(row, column, problem) for row, column, _, problem, _, _ in found[5:]] == [
        (6, "tested_at", "'03/04/2026' could be 2026-03-04 or 2026-04-03"),
        (7, "value", "'l2.5' is text, not a figure"),
        (9, "replicate", "replicate 1 of this run (from row 8) is there already"),
        (10, "value", "the value is empty"),
        (11, "batch", "the batch is empty"),
        (12, "replicate", "'first' is no replicate number"),
        (13, None, "the row has 2 cells and there are 8 headings"),
        (14, None, "the row has 9 cells and there are 8 headings"),
    ]
    assert said(intake)[0] == (
        "results1.csv, row 2, column 'batch': batch 'B-1l7' is not registered; did you mean 'B-117'? (also row 3)"
    )
    assert intake.parts[0].held == tuple(range(2, 15))


def test_a_good_run_beside_a_bad_one_is_kept_apart(take: Take):
    intake = take(HEAD + "B-117,TS,2026-03-04,,,,1,12.5\nB-121,TS,2026-03-04,,,,1,12.5\nB-121,TS,2026-03-04,,,,2,x\n")
    assert [run.batch for run in intake.runs] == ["B-117"]
    assert [str(finding.row) for finding in intake.refusals] == ["4"]
    assert intake.parts[0].held == (3, 4)


def test_what_can_be_answered_is_a_question(take: Take):
    intake = take(
        HEAD
        + "B-117,TS,2026-03-04,,,,1,125\n"
        + "B-117,TS,2026-03-04,,,,2,15.2\n"
        + "B-117,TS,2026-03-04,,,,4,21.6\n"
        + "B-121,SET,2026-03-04,,,,1,n/a\n"
        + "B-121,SET,2026-03-04,,,,2,12\n"
        + "B-121,HA,1926-03-04,,,,1,60\n"
        + ",,,,,,,\n"
        + "Mean,,,,,,,12.5\n"
    )
    assert intake.refusals == ()
    assert [(f.row, f.problem.partition(" is")[0].partition(" (")[0], f.suggestion) for f in intake.questions] == [
        (2, "replicate 3 of this run", "was it lost, or are the numbers wrong?"),
        (2, "125", "a slipped decimal point: was 12.5 meant?"),
        (3, "15.2", "two digits swapped: was 12.5 meant?"),
        (4, "21.6", "two digits swapped: was 12.6 meant?"),
        (5, "'n/a' states no figure", "this replicate would be left out"),
        (7, "'1926-03-04'", "is the year right?"),
        (9, "'Mean' looks like a row that sums up the others", "it would be left out"),
    ]
    assert [[m.replicate for m in run.measurements] for run in intake.runs] == [[1, 2, 4], [2], [1]]


def test_a_far_value_has_no_slip_where_none_explains_it(take: Take):
    (finding,) = take(HEAD + "B-117,TS,2026-03-04,,,,1,19.9\n").findings
    assert (
        finding.problem
        == "19.9 is far from all that is recorded (mean 12.5, standard deviation 0.3 MPa; 25 of these away)"
    )
    assert (finding.question, finding.suggestion) == (True, "is it meant?")


def test_a_run_that_is_recorded_already_is_refused(take: Take, register: Register):
    known = dataclasses.replace(register, runs=frozenset({("B-117", "TS", "2026-03-04T07:30:00.000000Z")}))
    intake = take(HEAD + "B-117,TS,2026-03-04T08:30,,,,1,12.5\n", register=known)
    assert intake.runs == ()
    assert said(intake) == [
        (
            "results1.csv, row 2: a run of B-117, TS, 2026-03-04T07:30:00.000000Z is recorded already; "
            "amend the recorded run, or leave this one out"
        )
    ]


def test_a_run_pasted_twice_is_asked_about_where_no_numbers_show_it(take: Take):
    block = "B-117,TS,2026-03-04,12.1\nB-117,TS,2026-03-04,12.3\n"
    (finding,) = take("batch,characteristic,tested_at,value\n" + block * 2).findings
    assert finding.question
    assert finding.problem == "this run holds the same 2 values twice, the second time in rows 4-5"
    assert take("batch,characteristic,tested_at,value\n" + "B-117,TS,2026-03-04,12.1\n" * 4).findings == ()


def test_the_same_file_or_the_same_run_in_two_files_is_refused(take: Take):
    text = HEAD + "B-117,TS,2026-03-04,,,,1,12.5\n"
    assert said(take(text, text)) == ["results2.csv: the file has the same content as results1.csv; name it once"]
    intake = take(text, text + "B-121,TS,2026-03-04,,,,1,12.5\n")
    assert said(intake) == ["results2.csv, row 2: this run is already in results1.csv, row 2; leave one of them out"]
    assert [run.batch for run in intake.runs] == ["B-117", "B-121"]


def test_columns_that_are_not_ours_are_asked_about(take: Take):
    intake = take("batch,characteristic,tested_at,value,Analist,\nB-117,TS,2026-03-04,12.5,ana,\n")
    assert [(f.column, f.suggestion, f.question) for f in intake.findings] == [
        ("Analist", "did you mean 'analyst'?", True)
    ]


@pytest.mark.parametrize(
    ("content", "problem"),
    [
        ("", "the file is empty"),
        ("\n\n ,,\n", "the file is empty"),
        (HEAD, "there are headings and no results below them"),
        ("batch,value\nB-117,12\n", "the heading 'characteristic' is missing"),
        ("batch,batch,characteristic,tested_at,value\n1,2,3,4,5\n", "the heading 'batch' is there more than once"),
        (b"batch\0,value\n", "there is a NUL byte in line 1: the file is damaged or not text"),
        (
            HEAD.encode() + "B-117,TS,2026-03-04,Zoë,,,1,12".encode("cp1252"),
            "the file is not UTF-8: byte 0xeb in line 2",
        ),
        (HEAD.encode("utf-16-le"), "there is a NUL byte in line 1: the file is damaged or not text"),
        (b"\xff\xfe\x00\xd8", "the file begins as UTF-16 and is not"),
        (HEAD + '"B-117,TS,2026-03-04,,,,1,12\n', "line 2 cannot be taken apart into cells: unexpected end of data"),
        (HEAD + "B" * 200_000, "line 2 cannot be taken apart into cells: field larger than field limit (131072)"),
        (HEAD + "," * 3_000_000, "a line is longer than 1,048,576 bytes"),
        (b"%PDF-1.7\n", "this is a PDF document, not a table"),
        (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "this is an old or a password-protected workbook, not a table"),
    ],
)
def test_a_file_that_cannot_be_read_is_a_finding(take: Take, content: str | bytes, problem: str):
    intake = take(content)
    assert intake.runs == ()
    assert problem in [finding.problem for finding in intake.refusals]


def test_a_file_in_another_encoding_shows_how_it_would_read(take: Take):
    (finding,) = take("batch,characteristic,tested_at,value\nB-117,TS,2026-03-04,12 N/mm²\n".encode("cp1252")).findings
    assert "N/mm²" in finding.suggestion


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16"])
def test_unicode_with_its_mark_is_read(take: Take, encoding: str):
    intake = take("batch,characteristic,tested_at,value\r\nB-117,TS,2026-03-04,12.6 N/mm²\r\n".encode(encoding))
    assert intake.findings == ()
    assert intake.runs[0].measurements == (DraftMeasurement(1, "12.6", 12.6, None, "N/mm²"),)


def test_text_that_is_invalid_far_inside_is_placed_right(take: Take):
    row = b"B-117,TS,2026-03-04,,,,,12.5\n"
    data = HEAD.encode() + row * 60_000 + b"B-117,TS,2026-03-04,\xe9,,,,12.5\n"
    (finding,) = take(data).findings
    assert finding.row == 60_002


def test_a_file_above_the_limit_is_refused_unread(register: Register, tmp_path: Path):
    path = tmp_path / "large.csv"
    path.write_text(HEAD + "B-117,TS,2026-03-04,,,,1,12.5\n")
    (finding,) = read_files([path], register, limit=50).findings
    assert finding.problem == "the file is larger than 5e-05 MB"
    assert load(path, limit=50).data == b""
    assert load_stream(io.BytesIO(b"12345"), limit=4).too_large


@pytest.mark.parametrize("name", ["missing.csv", ".", "nul\0.csv"])
def test_a_path_that_is_no_file_is_a_wrong_call(register: Register, tmp_path: Path, name: str):
    with pytest.raises(CallError):
        read_files([tmp_path / name], register)


def test_more_findings_than_anyone_reads_end_the_reading(take: Take):
    intake = take(HEAD + "".join(f"B-117,TS,2026-03-04,,,,{i},x{i}\n" for i in range(1, 10_050)))
    assert len(intake.findings) == 10_001
    assert intake.runs == ()
    assert intake.findings[0].problem == "there are more than 10000 findings; the rest was not checked"


@given(
    st.lists(
        st.tuples(st.sampled_from(["B-117", "B-121"]), st.integers(1, 3), st.decimals(11, 14, places=2)),
        min_size=1,
        max_size=30,
    ),
    st.randoms(use_true_random=False),
)
@settings(max_examples=60, deadline=None)
def test_the_order_of_rows_changes_no_run(rows: list[tuple[str, int, object]], shuffler: random.Random):
    register = Register(
        {"B-117": "M", "B-121": "M"},
        {"TS": CharacteristicFacts("TS", "MPa")},
        frozenset(),
        frozenset(),
        "UTC",
        "2026-12-01T00:00:00.000000Z",
    )
    counted: dict[tuple[str, int], int] = {}
    lines = []
    for batch, day, value in rows:
        counted[batch, day] = counted.get((batch, day), 0) + 1
        lines.append(f"{batch},TS,2026-03-0{day},,,,{counted[batch, day]},{value}\n")
    shuffled = list(lines)
    shuffler.shuffle(shuffled)
    first, second = (
        read_files([RawFile("x.csv", (HEAD + "".join(some)).encode())], register) for some in (lines, shuffled)
    )
    assert first.findings == second.findings == ()
    as_set = [{(run.batch, run.tested_at, run.measurements) for run in intake.runs} for intake in (first, second)]
    assert as_set[0] == as_set[1]
    assert sum(len(run.measurements) for run in second.runs) == len(rows)


def test_very_many_unknown_columns_are_counted(take: Take):
    strange = ",".join(f"strange {number}" for number in range(12_000))
    intake = take(f"batch,characteristic,tested_at,value,{strange}\nB-117,TS,2026-03-04,12.5{',' * 12_000}\n")
    assert len(intake.runs) == 1
    assert len(intake.questions) == 51
    assert "11950 further columns are as unknown" in {finding.problem for finding in intake.questions}
