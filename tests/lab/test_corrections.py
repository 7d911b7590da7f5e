"""Corrections of more than one value: a run's particulars, and whole entries reversed."""

from __future__ import annotations

import pytest

from laboratory import moment, replicate, run, source, statement
from sameline.errors import CallError
from sameline.lab import Lab
from sameline.records.run_particulars import read_run
from sameline.records.runs import read_measurements


@pytest.fixture
def tested(lab: Lab) -> Lab:
    """Runs 1 and 2 logged, 3 to 5 taken in; three comparisons."""
    lab.compare(statement("all"))
    lab.compare(statement("alder", of_supplier="ALDER"))
    lab.compare(statement("later", tested_from=moment(10)))
    lab.record([run("B1", 1, "70.1", "70.2")])
    lab.record([run("B3", 2, "71.1", "71.2")])
    lab.record([run(f"B{n}", 2 + n, f"7{n}.0", f"7{n}.4") for n in (1, 2, 4)], source("day.csv"))
    return lab


def held(lab: Lab) -> list[tuple[object, ...]]:
    with lab.reading() as reading:
        return [(m.run, m.batch, m.tested_at, m.text, m.excluded) for m in read_measurements(reading)]


def awoken(outcome) -> list[str]:
    assert outcome.behind == ()
    return [conclusion.name for conclusion in outcome.conclusions]


def last_entry(lab: Lab, act: str) -> int:
    return [entry.number for entry in lab.trail() if entry.act == act][-1]


def test_a_run_moves_to_another_batch(tested: Lab):
    outcome = tested.amend_run(2, batch="B1", note="the label was read wrong", reason="the label")
    assert awoken(outcome) == ["all", "alder"]
    assert [row[1] for row in held(tested) if row[0] == 2] == [1, 1]
    assert [g.label for g in tested.conclusion("all").answer.groups] == ["B1", "B2", "B4"]
    outcome = tested.amend_run(2, batch="B3", reason="it was right")
    assert awoken(outcome) == ["all", "alder"]
    with tested.reading() as reading:
        assert read_run(reading, 2).note == "the label was read wrong"
    with tested.reading(outcome.entry - 1) as then:
        assert read_run(then, 2).batch == 1
    assert tested.verify().findings == ()


def test_a_run_moves_in_time_in_and_out_of_scope(tested: Lab):
    assert awoken(tested.amend_run(2, tested_at=moment(20), reason="the date")) == ["all", "later"]
    assert tested.conclusion("later").answer.runs == 1
    assert awoken(tested.amend_run(2, tested_at=moment(3), reason="no")) == ["all", "later"]
    assert tested.conclusion("later").answer.runs == 0
    assert tested.verify().findings == ()


def test_a_restated_batch_awakens_what_its_amended_runs_touch(tested: Lab):
    tested.amend_run(2, batch="B4", reason="the label")
    outcome = tested.restate("batch", "B4", supplier="ALDER", reason="the note")
    assert awoken(outcome) == ["all", "alder"]
    assert tested.verify().findings == ()


def test_other_particulars(tested: Lab):
    tested.amend_run(1, analyst="ben", instrument="DUR-1", session="noon", reason="x")
    with tested.reading() as reading:
        amended = read_run(reading, 1)
    assert (amended.analyst, amended.instrument, amended.session) == (2, 1, "noon")
    tested.amend_run(1, analyst=None, session=None, reason="x")
    with tested.reading() as reading:
        assert read_run(reading, 1).analyst is None


@pytest.mark.parametrize(
    ("number", "changes", "words"),
    [
        (77, {"note": "x"}, "no run 77"),
        (1, {"batch": "B77"}, "no batch is registered"),
        (1, {"batch": "B1"}, "says so already"),
        (1, {"batch": None}, "cannot be without"),
        (1, {"colour": "red"}, "has no colour"),
    ],
)
def test_amendments_of_runs_that_are_refused(tested: Lab, number: int, changes: dict[str, str], words: str):
    before = tested.trail()
    with pytest.raises(CallError, match=words):
        tested.amend_run(number, reason="x", **changes)
    assert tested.trail() == before


# -- reversal -------------------------------------------------------------------------------------------------------


def test_a_file_taken_in_is_reversed(tested: Lab):
    before = held(tested)
    entry = last_entry(tested, "take")
    outcome = tested.reverse(entry, reason="the file of another laboratory", cause="wrong specimen")
    assert awoken(outcome) == ["all", "alder"]
    assert outcome.conclusions[0].causes == (outcome.entry,)
    assert [row[4] for row in held(tested)] == [None] * 4 + ["wrong specimen"] * 6
    with pytest.raises(CallError, match="no longer holds"):
        tested.reverse(entry, reason="again")
    again = tested.reverse(outcome.entry, reason="it was ours")
    assert awoken(again) == ["all", "alder"]
    assert held(tested) == before
    assert tested.verify().findings == ()


def test_a_reversed_file_leaves_alone_what_was_set_aside_before(tested: Lab):
    tested.exclude("specimen damaged", run=4, reason="cut")
    outcome = tested.reverse(last_entry(tested, "take"), reason="x")
    tested.reverse(outcome.entry, reason="y")
    assert {row[0]: row[4] for row in held(tested)} == {1: None, 2: None, 3: None, 4: "specimen damaged", 5: None}


@pytest.mark.parametrize(
    "do",
    [
        lambda lab: lab.amend(lab.find_measurements(1, 1)[0], replicate(1, "75.0"), reason="x"),
        lambda lab: lab.amend_run(2, batch="B1", reason="x"),
        lambda lab: lab.exclude("specimen damaged", run=1, reason="x"),
        lambda lab: lab.exclude("specimen damaged", batch=1, reason="x"),
        lambda lab: lab.exclude("specimen damaged", measurement=3, reason="x"),
        lambda lab: lab.restate("batch", "B1", supplier="BIRCH", reason="x"),
        lambda lab: lab.restate("characteristic", "hardness", margin=0.1, reason="x"),
        lambda lab: lab.restate("supplier", "ALDER", name="A", reason="x"),
    ],
)
def test_what_was_done_is_undone_and_done_again(tested: Lab, do):
    def state() -> tuple[object, ...]:
        return held(tested), [tested.listing(kind) for kind in ("batch", "characteristic", "supplier")]

    before = state()
    done = do(tested)
    after = state()
    assert after != before
    undone = tested.reverse(done.entry, reason="a mistake")
    assert state() == before
    assert set(awoken(undone)) == set(awoken(done))
    redone = tested.reverse(undone.entry, reason="no mistake")
    assert state() == after
    assert set(awoken(redone)) == set(awoken(done))
    assert tested.verify().findings == ()


def test_an_amendment_amended_since_is_not_reversed(tested: Lab):
    first = tested.amend(tested.find_measurements(1, 1)[0], replicate(1, "75.0"), reason="x").entry
    second = tested.amend(tested.find_measurements(1, 1)[0], replicate(1, "76.0"), reason="x").entry
    with pytest.raises(CallError, match=f"entry {second} changed the same measurement again"):
        tested.reverse(first, reason="x")
    tested.reverse(second, reason="x")
    assert tested.find_measurements(1, 1)[0].text == "75.0"


def test_what_cannot_be_reversed(tested: Lab):
    for entry, words in (
        (1, "cannot be reversed"),
        (9999, "no entry 9999"),
        (last_entry(tested, "conclude"), "conclude"),
    ):
        with pytest.raises(CallError, match=words):
            tested.reverse(entry, reason="x")
