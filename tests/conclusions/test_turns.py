"""Which verdicts turned, and why."""

from __future__ import annotations

import pytest

from sameline.conclusions.turns import because, turns
from sameline.lab import WAKES
from sameline.records.answers import Answer, PairAnswer, Turn


def pair(a: str, b: str, verdict: str) -> PairAnswer:
    return PairAnswer(a, b, 0.0, None, None, None, None, None, None, None, verdict)


def answer(*pairs: PairAnswer) -> Answer:
    return Answer(b"", "answered", None, 0, 0, 0, "matrix", (), pairs, (), (), None, None, "")


def test_a_verdict_that_stays_is_no_turn():
    before = answer(pair("B1", "B2", "undecided"), pair("B1", "B3", "differs"))
    assert turns(before, before, "new runs") == ()


def test_a_verdict_that_changes_is_a_turn():
    before, after = answer(pair("B1", "B2", "undecided")), answer(pair("B1", "B2", "differs"))
    assert turns(before, after, "new runs") == (Turn("B1", "B2", "undecided", "differs", "new runs"),)
    assert turns(after, before, "an amendment") == (Turn("B1", "B2", "differs", "undecided", "an amendment"),)


def test_the_order_within_a_pair_does_not_matter():
    before, after = answer(pair("B1", "B2", "equivalent")), answer(pair("B2", "B1", "equivalent"))
    assert turns(before, after, "x") == ()


def test_a_new_pair_is_a_turn_only_where_it_is_decided():
    before = answer(pair("B1", "B2", "undecided"))
    after = answer(pair("B1", "B2", "undecided"), pair("B1", "B3", "undecided"), pair("B2", "B3", "differs"))
    assert turns(before, after, "x") == (Turn("B2", "B3", None, "differs", "x"),)
    assert turns(None, after, "x") == (Turn("B2", "B3", None, "differs", "x"),)


def test_a_pair_that_is_gone_is_no_turn():
    assert turns(answer(pair("B1", "B2", "differs")), answer(), "x") == ()


def test_why():
    assert because(["log", "take"]) == "new runs"
    assert because(["log", "amend", "exclude"]) == "an amendment and new runs"
    assert because(["restate characteristic", "compare"]) == (
        "a changed comparison and a restated characteristic or batch"
    )


@pytest.mark.parametrize("act", [act for act, what in WAKES.items() if what != "nothing"])
def test_every_act_that_awakens_has_a_why(act: str):
    assert because([act])
