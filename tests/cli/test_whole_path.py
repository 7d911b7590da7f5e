"""The main job from the command line: from an empty folder to an answer that verifies."""

from __future__ import annotations

import contextlib
import re
import sqlite3
from typing import TYPE_CHECKING

import pytest

if TYPE_CHECKING:
    from pathlib import Path

ROWS = [
    *(f"B-1,TS,2026-01-0{day}T08:00,{rep},{value}" for day, pair in ((5, (12.1, 12.3)), (6, (12.4, 12.2)))
      for rep, value in enumerate(pair, 1)),
    *(f"B-2,TS,2026-01-0{day}T09:00,{rep},{value}" for day, pair in ((5, (16.0, 15.8)), (6, (15.9, 16.2)))
      for rep, value in enumerate(pair, 1)),
]  # fmt: skip


def test_from_an_empty_folder_to_an_answer_that_verifies(bench):
    # 2. what is registered is shown
    listed = bench.done("list", "batches", "--json").document
    assert [row["code"] for row in listed] == ["B-1", "B-2", "B-3"]
    assert {row["material"] for row in listed} == {"SEAL"}

    # 4. a comparison, stated before its data
    once = ("--looks", "single", "--units", 4)
    stated = bench.done("compare", "pair", "B-1", "B-2", "--characteristic", "TS", *once)
    assert "pair v1: not computed: no results have been recorded in its scope so far" in stated.out

    # 3 and 5. a file of runs: each against its limits, and what it changed in one line
    taken = bench.done("take", bench.file("january.csv", ROWS))
    assert "run 1: TS of B-1, 2 values, mean 12.20 MPa, sd 0.14; all within limits (at least 10 MPa)" in taken.out
    assert "pair v2: B-1 and B-2 now differ by more than the margin" in taken.out

    # 3. one run typed
    logged = bench.done("log", "-b", "B-3", "-c", "TS", "9.5", "10.2", "--at", "2026-01-07")
    assert "OUTSIDE LIMITS (at least 10 MPa): 9.5" in logged.out
    assert "pair" not in logged.out

    # 6. which differ?
    told = bench.done("differ", "pair").out
    assert re.search(r"B-2 minus B-1 +3\.73 .* DIFFERS AND MATTERS", told)
    assert "pair" in bench.done("differ").out

    # 7 and 8. how it came about, and who did what
    history = bench.done("history", "pair").out
    assert "v1, no look: " in history
    assert "v2, look 1: " in history
    assert "B-1 and B-2 now differ by more than the margin, because of new runs" in history
    acts = [entry["act"] for entry in bench.done("trail", "--json").document]
    assert acts[-5:] == ["compare", "conclude", "take", "conclude", "log"]

    # 9. the records are as they were recorded
    verified = bench.done("verify")
    assert verified.out.count(": good") >= 9
    assert bench.done("verify", "--json").document["good"] is True


def test_a_restated_comparison_is_a_new_revision_and_the_old_answer_stays(bench):
    bench.done("take", bench.file("january.csv", ROWS))
    bench.done("compare", "pair", "B-1", "B-2", "-c", "TS")
    first = bench.answer("pair")
    bench.done("compare", "pair", "B-1", "B-2", "-c", "TS", "--alpha", "0.01", "--reason", "a stricter rate was agreed")
    again, second = bench.answer("pair", "--version", "1"), bench.answer("pair")
    assert again == first
    assert (first["question"]["revision"], first["question"]["alpha"]) == (1, 0.05)
    assert (second["question"]["revision"], second["question"]["alpha"]) == (2, 0.01)
    assert "a stricter rate was agreed" in bench.done("trail").out


def test_a_question_asked_after_its_data_says_so(bench):
    bench.done("take", bench.file("january.csv", ROWS))
    bench.done("compare", "pair", "B-1", "B-2", "-c", "TS")
    assert bench.answer("pair")["runs_before_statement"] == 4
    assert "4 of its 4 runs had been recorded before this comparison was stated" in bench.done("differ", "pair").out


def test_groups_chosen_by_a_filter_take_in_what_arrives_later(bench):
    bench.done("compare", "all seals", "-c", "TS", "--material", "SEAL")
    bench.done("take", bench.file("january.csv", ROWS))
    assert [group["label"] for group in bench.answer("all seals")["groups"]] == ["B-1", "B-2"]
    bench.done("log", "-b", "B-3", "-c", "TS", "12.5", "--at", "2026-01-08")
    assert [group["label"] for group in bench.answer("all seals")["groups"]] == ["B-1", "B-2", "B-3"]
    assert "groups: all batches with results of SEAL" in bench.done("differ", "all seals").out


def test_a_slip_is_amended_and_the_original_stays_readable(bench):
    bench.done("compare", "pair", "B-1", "B-2", "-c", "TS")
    bench.done("take", bench.file("january.csv", [*ROWS[:-1], "B-2,TS,2026-01-06T09:00,2,26.2"]), "--as-they-stand")
    before = bench.answer("pair")
    run = bench.done("runs", "-b", "B-2", "--json").document[-1]
    assert [m["text"] for m in run["replicates"]] == ["15.9", "26.2"]
    why = "typing slip, see print-out"
    amended = bench.done("amend", "16.2", "--run", run["run"], "--replicate", 2, "--reason", why)
    assert "26.2 amended to 16.2" in amended.err
    assert "16.2 (amended)" in bench.done("runs", "-b", "B-2").out
    was = bench.done("runs", "-b", "B-2", "--as-of", before["entry"], "--json").document[-1]
    assert [m["text"] for m in was["replicates"]] == ["15.9", "26.2"]
    assert bench.answer("pair", "--version", before["version"])["groups"] == before["groups"]
    assert bench.answer("pair")["groups"] != before["groups"]
    assert why in bench.done("trail", "--batch", "B-2").out
    bench.done("verify")


def test_what_is_set_aside_leaves_the_answer_and_returns_to_it(bench):
    bench.done("compare", "pair", "B-1", "B-2", "-c", "TS")
    bench.done("take", bench.file("january.csv", ROWS))
    full = bench.answer("pair")
    bench.done("exclude", "--run", 3, "--cause", "specimen damaged", "--reason", "nick at the grip")
    less = bench.answer("pair")
    assert (less["runs"], full["runs"]) == (3, 4)
    assert any(caution["code"] == "set aside" for caution in less["cautions"])
    assert "set aside: specimen damaged" in bench.done("runs").out
    bench.done("restore", "--run", 3, "--reason", "it was another specimen")
    assert bench.answer("pair")["groups"] == full["groups"]
    bench.done("verify")


def test_values_below_zero_can_be_typed(bench):
    bench.done("add", "characteristic", "BT", "--name", "Brittleness temperature", "--unit", "degC", "--upper", "-30")
    logged = bench.done("log", "-b", "B-1", "-c", "BT", "--at", "2026-01-05", "-42", "-29.5")
    assert "OUTSIDE LIMITS (at most −30 degC): -29.5" in logged.out
    bench.done("amend", "-43", "--run", 1, "--replicate", 1, "--reason", "misread")
    assert bench.done("runs", "--json").document[0]["replicates"][0]["value"] == -43


def test_the_store_and_the_person_come_from_the_environment_or_the_call(bench, monkeypatch):
    monkeypatch.setenv("SAMELINE_STORE", "other.db")
    bench.done("init", "--by", "otto")
    bench.done("add", "supplier", "WEST", "--by", "otto")
    assert [entry["person"] for entry in bench.done("trail", "--json").document] == ["otto", "otto"]
    assert len(bench.done("list", "supplier", "--json", "--store", "lab.db").document) == 1
    assert bench.done("list", "supplier", "--json").document[0]["code"] == "WEST"


def test_data_go_to_standard_output_and_messages_to_standard_error(bench):
    added = bench.done("add", "supplier", "WEST", "--name", "West Mixing")
    assert (added.out, added.err) == ("", "supplier WEST registered, entry 8\n")
    listed = bench.done("list", "supplier")
    assert "West Mixing" in listed.out
    assert listed.err == ""
    refused = bench("add", "supplier", "WEST")
    assert refused.out == ""
    assert refused.err != ""


CHANGES = {
    "a measurement": ("measurement", "UPDATE measurement SET text = '13.1', value = 13.1 WHERE id = 2"),
    "an entry": ("entry", "UPDATE entry SET reason = 'nothing to see' WHERE number = 3"),
    "a pair of a conclusion": ("conclusion_pair", "UPDATE conclusion_pair SET verdict = 'equivalent' WHERE id = 1"),
    "a removed run": ("run", "DELETE FROM run WHERE id = 4"),
}


@pytest.mark.parametrize("change", CHANGES)
def test_a_change_behind_the_ledgers_back_is_found_and_named(bench, change):
    table, statement = CHANGES[change]
    bench.done("compare", "pair", "B-1", "B-2", "-c", "TS")
    bench.done("take", bench.file("january.csv", ROWS))
    with contextlib.closing(sqlite3.connect(bench.folder / "lab.db")) as connection:
        triggers = connection.execute("SELECT name, sql FROM sqlite_master WHERE type = 'trigger'").fetchall()
        for name, _ in triggers:
            connection.execute(f'DROP TRIGGER "{name}"')
        assert connection.execute(statement).rowcount == 1
        for _, sql in triggers:
            connection.execute(sql)
        connection.commit()
    verified = bench("verify")
    assert verified.code == 1
    assert re.search(rf"^ +.*\b{table}\b", verified.out, re.MULTILINE), verified.out
    assert "not as they were recorded" in verified.err
    assert bench("verify", "--json").document["good"] is False


def test_the_tour_plays_to_its_end_and_leaves_a_store_that_verifies(tool, tmp_path: Path):
    told = tool.done("tour", "demo")
    assert "All names and numbers are invented" in told.err
    assert re.search(r"-- 41 of 41 ", told.out)
    assert tool.done("verify", "--store", "demo/lab.db", "--json").document["good"] is True
    names = {row["comparison"] for row in tool.done("differ", "--json", "--store", "demo/lab.db").document}
    assert "quellimara set" in names
    again = tool("tour", "demo")
    assert (again.code, again.err) == (2, "sameline: demo: the folder is not empty\n  name a new one\n")
    assert sorted(path.name for path in tmp_path.iterdir()) == ["demo"]
