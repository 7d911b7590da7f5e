"""Planned, single and union looks, windows and the price."""

import json

import numpy as np
import pytest

from sameline.errors import StatsError
from sameline.stats.looks import (
    Contrasts,
    LooksState,
    Plan,
    UnitMeans,
    judge_open,
    judge_planned,
    judge_single,
    judge_union,
    over_windows,
    price_of_looking,
    rate_of_look,
    window_alpha,
    window_of,
)
from sameline.stats.looks.amendments import RESERVE, look_weight
from sameline.stats.looks.price import Price
from sameline.stats.looks.windows import window_part
from sameline.stats.studentized_range import studentized_range_isf, studentized_range_sf

AB = ("A", "B", "C")
KEPT = 1 - RESERVE


def seen(n, last=0.0, labels=AB):
    means = (0.0,) * (len(labels) - 1) + (last,)
    return UnitMeans(labels, (n,) * len(labels), means, 1.0, float(len(labels) * (n - 1)))


def plan(units, **options):
    return Plan(units, draws=20_000, **options)


def test_a_plan_of_one_look_is_a_single_look_at_what_the_reserve_leaves():
    found = judge_planned(seen(10, 1.0), plan(30, spending="pocock")).pairs[1]
    assert found.upper - found.difference == pytest.approx(
        float(studentized_range_isf(0.05 * KEPT, 3, 27)) / np.sqrt(2) * np.sqrt(0.2), rel=0.02
    )
    assert found.p_value == pytest.approx(float(studentized_range_sf(np.sqrt(10), 3, 27)) / KEPT, rel=0.1)


def test_a_plan_goes_on_from_its_stored_state_to_the_last_digit():
    state, stored = None, None
    for n in (3, 6, 11, 20):
        result = judge_planned(seen(n, 0.8), plan(60), state=state)
        again = judge_planned(seen(n, 0.8), plan(60), state=None if stored is None else LooksState.from_plain(stored))
        assert again == result
        state = result.state
        stored = json.loads(json.dumps(state.to_plain()))
    assert state.planned[-1].fraction == 1.0
    edges = [look.boundaries[7] for look in state.planned]
    assert edges == sorted(edges, reverse=True)


@pytest.mark.parametrize("spending", ["obrien-fleming", "pocock"])
def test_p_and_interval_and_claim_of_a_plan_agree(spending):
    for last in np.linspace(0.0, 3.0, 16):
        state = None
        for n in (4, 9):
            result = judge_planned(seen(n, float(last)), plan(45, spending=spending), state=state)
            state = result.state
            for row in result.pairs:
                zero_outside = row.lower > 0 or row.upper < 0
                assert zero_outside <= row.differs
                assert (row.p_now <= 0.05) == zero_outside


def test_an_overrun_spends_what_is_left_and_later_looks_are_descriptive():
    first = judge_planned(seen(5), plan(60))
    over = judge_planned(seen(25), plan(60), state=first.state)
    assert any("overrun" in note for note in over.notes)
    assert over.state.planned[-1].fraction == 1.0
    later = judge_planned(seen(30, 5.0), plan(60), state=over.state)
    row = later.pair("A", "C")
    assert row.p_now is None
    assert not row.differs
    assert row.p_single < 1e-6
    assert any("descriptive" in note for note in later.notes)
    assert (row.lower, row.upper) == (over.pair("A", "C").lower, over.pair("A", "C").upper)


def test_a_look_with_no_more_data_spends_nothing():
    first = judge_planned(seen(10), plan(60))
    less = judge_planned(seen(9, 4.0), plan(60), state=first.state)
    assert less.state.planned == first.state.planned
    assert less.pair("A", "C").p_now is None
    assert any("no more data" in note for note in less.notes)
    shrunk = UnitMeans(AB, (8, 14, 14), (0.0, 0.0, 0.2), 1.0, 33.0)
    assert judge_planned(shrunk, plan(60), state=first.state).pair("A", "B").p_now is not None


def test_an_amended_pair_of_a_plan_is_judged_from_the_reserve():
    first = judge_planned(seen(10, 3.0), plan(60))
    assert first.pair("A", "C").differs
    mended = judge_planned(seen(10, 3.0), plan(60), amended=["C"], state=first.state)
    row = mended.pair("A", "C")
    alone = float(studentized_range_sf(3.0 / np.sqrt(0.1), 3, 27))
    assert row.p_value == pytest.approx(alone / (RESERVE / 2 * look_weight(1)))
    assert mended.pair("A", "B").p_value == first.pair("A", "B").p_value


def test_a_plan_that_changed_or_cannot_be_meant_is_refused():
    first = judge_planned(seen(5), plan(60))
    with pytest.raises(StatsError, match="looks so far"):
        judge_planned(seen(6), plan(90), state=first.state)
    for bad in (
        {"units": 1},
        {"units": 30, "spending": "even"},
        {"units": 30, "draws": 10},
        {"units": 30, "reserve": 2},
    ):
        with pytest.raises(StatsError):
            Plan(**bad)


def test_a_single_look_gives_verdicts_once():
    early = judge_single(seen(5, 3.0), 30)
    assert early.pair("A", "C").p_now is None
    assert early.pair("A", "C").verdict == "undecided"
    assert early.pair("A", "C").upper == np.inf
    late = judge_single(seen(12, 1.4), 30, state=early.state)
    row = late.pair("A", "C")
    assert row.p_value == pytest.approx(row.p_single / KEPT)
    assert any("stated at 30" in note for note in late.notes)
    half = float(studentized_range_isf(0.05 * KEPT, 3, 33)) / np.sqrt(2) * np.sqrt(1 / 6)
    assert row.upper == pytest.approx(1.4 + half)
    after = judge_single(seen(20, 0.0), 30, state=late.state).pair("A", "C")
    assert after.p_now is None
    assert (after.lower, after.upper, after.differs) == (row.lower, row.upper, row.differs)
    with_control = judge_single(seen(12, 1.4), 30, control="A").pair("A", "C")
    assert with_control.p_value < row.p_value
    mended = judge_single(seen(12, 1.4), 30, amended=["C"], state=late.state).pair("A", "C")
    assert mended.p_value == pytest.approx(min(1.0, row.p_single / (RESERVE / 2 * look_weight(1))))
    before_the_look = judge_single(seen(12, 1.4), 30, amended=["C"], state=early.state).pair("A", "C")
    assert before_the_look.p_value == row.p_value
    for bad in ({"units": 1}, {"units": 30, "control": "B"}):
        with pytest.raises(StatsError):
            judge_single(seen(5), **bad)


def contrasts(units, last, pairs=(("A", "B"), ("A", "C"), ("B", "C"))):
    estimate = {("A", "B"): 0.0, ("A", "C"): last, ("B", "C"): last}
    return Contrasts(AB, pairs, tuple(estimate[p] for p in pairs), (0.3,) * len(pairs), (12.5,) * len(pairs), units)


def test_union_gives_each_judged_look_its_share():
    first = judge_union(contrasts(10, 1.0))
    p = float(studentized_range_sf(1.0 / 0.3 * np.sqrt(2), 3, 12.5))
    assert first.pair("A", "C").p_value == pytest.approx(min(1, p / (KEPT * look_weight(1))))
    between = judge_union(contrasts(12, 2.0), state=first.state)
    assert between.pair("A", "C").p_now is None
    assert between.pair("A", "C").upper == first.pair("A", "C").upper
    assert rate_of_look(12, 0.05, first.state) is None
    second = judge_union(contrasts(13, 2.0), state=between.state)
    p = float(studentized_range_sf(2.0 / 0.3 * np.sqrt(2), 3, 12.5))
    assert second.pair("A", "C").p_value == pytest.approx(p / (KEPT * look_weight(2)))
    assert second.pair("A", "C").differs
    assert second.state.judged == 2
    assert rate_of_look(40, 0.05, second.state) == pytest.approx(0.05 * KEPT * look_weight(3))


def test_union_takes_any_procedure_and_says_when_a_pair_is_missing():
    own = judge_union(contrasts(10, 1.0), p_values=[0.9, 0.001, 0.02], half_widths=[0.5, 0.5, 0.5], procedure="ranks")
    assert own.pair("A", "C").differs
    assert own.pair("A", "C").lower == 0.5
    assert own.pair("A", "B").lower == -0.5
    part = judge_union(contrasts(10, 1.0, (("A", "B"),)))
    assert set(part.not_estimable) == {("A", "C"), ("B", "C")}
    for bad in ({"growth": 0.5}, {"p_values": [0.1]}, {"p_values": [0.1] * 3, "half_widths": [1.0]}):
        with pytest.raises(StatsError):
            judge_union(contrasts(10, 1.0), **bad)


def test_union_judges_an_amended_pair_apart():
    first = judge_union(contrasts(10, 2.0))
    mended = judge_union(contrasts(10, 2.0), amended=["C"], state=first.state)
    p = float(studentized_range_sf(2.0 / 0.3 * np.sqrt(2), 3, 12.5))
    assert mended.pair("A", "C").p_value == pytest.approx(p / (RESERVE / 2 * look_weight(1)))
    assert mended.pair("A", "B").p_now is None


def test_windows_share_alpha_and_the_best_counts():
    assert sum(window_part(w) for w in range(5000)) == pytest.approx(1.0, abs=1e-3)
    assert [window_of(u, 10) for u in (0, 9, 10, 25)] == [1, 1, 2, 3]
    whole = judge_open(seen(20, 0.3), alpha=window_alpha(0.05, 0))
    late = judge_open(seen(10, 2.5), alpha=window_alpha(0.05, 2))
    found = {(row.a, row.b): row for row in over_windows(0.05, {0: whole, 2: late})}
    assert found["A", "C"].window == 2
    assert found["A", "C"].differs
    assert found["A", "C"].p_value == pytest.approx(late.pair("A", "C").p_value * 12)
    assert not found["A", "B"].differs
    for call in (lambda: over_windows(0.05, {1: late}), lambda: window_part(-1), lambda: window_of(3, 0)):
        with pytest.raises(StatsError):
            call()


def test_the_price_of_looking_is_the_interval_at_the_margin():
    price = price_of_looking(5, 1.0, 1.0)
    assert isinstance(price, Price)
    assert price.extra == price.always - price.single > 0
    groups = tuple("ABCDE")
    for n, short in ((price.always, True), (price.always - 1, False)):
        # a difference far from 0 is claimed, so its interval is not drawn out to reach 0
        row = judge_open(UnitMeans(groups, (n,) * 5, (0.0, 9.0, 0.0, 0.0, 0.0), 1.0, 5.0 * (n - 1))).pair("A", "B")
        assert (row.upper - row.difference <= 1.0) == short
    q = [float(studentized_range_isf(0.05, 5, 5 * (n - 1))) / np.sqrt(n) for n in (price.single, price.single - 1)]
    assert q[0] <= 1.0 < q[1]
    for bad in ((1, 1.0, 1.0), (3, 0.0, 1.0), (3, 1e-6, 1.0)):
        with pytest.raises(StatsError):
            price_of_looking(*bad)
