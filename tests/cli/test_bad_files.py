"""Every fault of a file by name, and data from which no answer can come: nothing is stored half, nothing is hidden."""

from __future__ import annotations

import pytest

HEAD = "batch,characteristic,tested_at,replicate,value"
FILES = {
    "an unknown batch": (
        f"{HEAD}\nB-7,TS,2026-02-01,1,12.5\n",
        ("row 2", "'B-7' is not registered", "did you mean 'B-"),
    ),
    "a unit that is not the characteristic's": (
        f"{HEAD},unit\nB-1,TS,2026-02-01,1,12.5,%\n",
        ("row 2", "'%' cannot be turned into 'MPa'", "give the figure in MPa"),
    ),
    "text in a value column": (f"{HEAD}\nB-1,TS,2026-02-01,1,strong\n", ("row 2, column 'value'", "'strong' is text")),
    "a date in the future": (f"{HEAD}\nB-1,TS,2999-02-01,1,12.5\n", ("row 2, column 'tested_at'", "is in the future")),
    "a duplicate replicate number": (
        f"{HEAD}\nB-1,TS,2026-02-01,1,12.5\nB-1,TS,2026-02-01,1,12.6\n",
        ("row 3, column 'replicate'", "there already"),
    ),
    "an empty file": ("", ("the file is empty", "headings in the first row")),
    "headings only": (f"{HEAD}\n", ("no results below them",)),
    "a wrong encoding": (
        f"{HEAD},note\nB-1,TS,2026-02-01,1,12.5,gro\xdf\n".encode("latin-1"),
        ("not UTF-8", "save it as CSV UTF-8"),
    ),
    "no column of values": ("batch,characteristic,tested_at\nB-1,TS,2026-02-01\n", ("value",)),
    "bytes that are no table": (bytes(range(256)) * 8, ("noise.csv",)),
}


@pytest.mark.parametrize("case", FILES)
def test_a_file_with_a_fault_is_refused_whole(unchanged, refused, case):
    content, words = FILES[case]
    path = unchanged.folder / "noise.csv"
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    refused(unchanged("take", path), 1, *words)


def test_every_fault_of_a_file_is_listed_and_the_good_rows_wait(unchanged, refused):
    rows = ["B-1,TS,2026-02-01,1,12.5", "B-7,TS,2026-02-01,1,1", "B-1,TS,2026-02-02,1,x", "B-2,TS,2999-02-01,1,12"]
    refused(unchanged("take", unchanged.file("mixed.csv", rows)), 1, "row 3", "row 4", "row 5")


def test_one_bad_file_keeps_back_the_good_one_beside_it(unchanged, refused):
    good = unchanged.file("good.csv", ["B-1,TS,2026-02-01,1,12.5"])
    bad = unchanged.file("bad.csv", ["B-1,TS,2026-02-02,1,x"])
    refused(unchanged("take", good, bad), 1, "bad.csv, row 2")


def test_a_file_is_not_taken_in_twice(answered, refused):
    path = answered.file("more.csv", ["B-1,TS,2026-02-01,1,12.5"])
    answered.done("take", path)
    before = answered.state()
    refused(answered("take", path), 1, "already")
    path.rename(answered.folder / "renamed.csv")
    refused(answered("take", answered.folder / "renamed.csv"), 1, "already")
    assert answered.state() == before


def test_checking_a_file_records_nothing(unchanged):
    ran = unchanged("take", "--check", unchanged.file("fine.csv", ["B-1,TS,2026-02-01,1,12.5"]))
    assert (ran.code, ran.out) == (0, "")


UNANSWERED = {
    "one group with results": (["B-1,TS,2026-02-01,1,12.5"], "only one group has results so far: B-1"),
    "groups with one value": (["B-1,TS,2026-02-01,1,12.5", "B-2,TS,2026-02-01,1,14.5"], "one value"),
    "all values identical": (
        [f"B-{batch},TS,2026-02-0{day},1,12.5" for batch in (1, 2) for day in (1, 2)],
        "identical|nothing varies",
    ),
}


@pytest.mark.parametrize("case", UNANSWERED)
def test_an_answer_that_cannot_be_had_is_recorded_with_its_reason(bench, case):
    rows, words = UNANSWERED[case]
    bench.done("compare", "pair", "B-1", "B-2", "-c", "TS")
    bench.done("take", bench.file("runs.csv", rows))
    document = bench.answer("pair")
    told = bench.done("differ", "pair").out
    assert not any(pair["differs"] for pair in document["pairs"])
    reasons = [document["reason"], *(pair["reason"] for pair in document["pairs"])]
    texts = [caution["text"] for caution in document["cautions"]]
    assert any(word in (text or "") for text in (*reasons, *texts) for word in words.split("|")), document
    assert "nan" not in told.lower()
    bench.done("verify")
