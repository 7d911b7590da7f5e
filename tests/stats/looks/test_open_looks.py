"""One open comparison from look to look: what is kept, refused, amended and shared."""

import json
import math
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from sameline.errors import StatsError
from sameline.stats.looks import Contrasts, LooksState, UnitMeans, judge_open, judge_open_contrasts, restate, unit_means
from sameline.stats.looks.amendments import RESERVE, look_weight, version_share
from sameline.stats.looks.many import holm_from_log, log_pair_evidence
from sameline.stats.looks.open_looks import PHI, rule_of
from sameline.stats.looks.shares import FOUNDERS, interval_shares, joiner_part

LABELS = ("A", "B", "C", "D")
KEPT = 1 - RESERVE


def history(looks, shift=(0, 0, 0, 1.5), seed=1, offset=70.0):
    """The unit means at each look: two units a group and look."""
    rng = np.random.default_rng(seed)
    values, groups, seen = [], [], []
    for _ in range(looks):
        for label, by in zip(LABELS, shift, strict=True):
            values += (offset + by + rng.standard_normal(2)).tolist()
            groups += [label] * 2
        seen.append(unit_means(values, groups, LABELS))
    return seen


def follow(seen, **options):
    state, results = None, []
    for now in seen:
        results.append(judge_open(now, state=state, **options))
        state = results[-1].state
    return results


def test_a_stored_look_is_computed_again_to_the_last_digit():
    results = follow(history(6))
    state = None
    for now, was in zip(history(6), results, strict=True):
        again = judge_open(now, state=state)
        assert again == was
        state = LooksState.from_plain(json.loads(json.dumps(again.state.to_plain())))
        assert state == was.state


def test_the_order_of_rows_does_not_matter_to_the_last_bit():
    rng = np.random.default_rng(2)
    values = (1e6 + rng.standard_normal(40)).round(3)
    groups = np.repeat(LABELS, 10)
    turn = rng.permutation(40)
    assert judge_open(unit_means(values, groups, LABELS)) == judge_open(unit_means(values[turn], groups[turn], LABELS))


def test_a_claim_is_kept_and_the_look_alone_is_shown_beside_it():
    results = follow(history(25))
    for before, after in pairwise(results):
        for was, now in zip(before.pairs, after.pairs, strict=True):
            assert now.p_value <= was.p_value
            assert now.p_value == min(was.p_value, now.p_now)
    last = results[-1].pair("A", "D")
    assert last.differs
    assert last.verdict == "differs"
    assert not results[-1].pair("A", "B").differs


def test_evidence_that_goes_back_is_marked():
    up = UnitMeans(("A", "B"), (20, 20), (0.0, 2.0), 1.0, 38)
    first = judge_open(up)
    back = judge_open(UnitMeans(("A", "B"), (40, 40), (0.0, 0.2), 1.0, 78), state=first.state).pair("A", "B")
    assert back.differs
    assert back.receded
    assert back.lower < 0 < back.upper


def test_an_interval_of_a_pair_not_claimed_reaches_zero_and_a_margin_gives_its_verdict():
    for result in follow(history(30), margin=3.0):
        for row in result.pairs:
            assert row.differs or row.lower <= 0 <= row.upper
    assert result.pair("A", "B").verdict == "equivalent"
    assert follow(history(30, shift=(0, 0, 0, 6)), margin=3.0)[-1].pair("A", "D").verdict == "differs and matters"


def test_one_unit_a_group_is_judged_by_the_spread_of_the_others():
    seen = UnitMeans(("A", "B", "C"), (1, 6, 6), (0.0, 0.1, 0.2), 1.0, 10)
    assert judge_open(seen).not_estimable == {}
    none = judge_open(UnitMeans(("A", "B"), (1, 1), (0.0, 9.0), 0.0, 0))
    assert "spread" in none.not_estimable["A", "B"]
    assert none.pairs[0].p_value is None
    empty = judge_open(UnitMeans(("A", "B", "C"), (3, 0, 3), (0.0, 0.0, 1.0), 1.0, 4))
    assert set(empty.not_estimable) == {("A", "B"), ("B", "C")}
    flat = judge_open(UnitMeans(("A", "B"), (3, 3), (1.0, 1.0), 0.0, 4))
    assert "no spread" in flat.not_estimable["A", "B"]


def test_an_amendment_voids_the_claims_it_touches_and_draws_on_the_reserve():
    seen = history(12)
    results = follow(seen)
    assert results[-1].pair("A", "D").differs
    state = results[-1].state
    mended = judge_open(seen[-1], amended=["A"], state=state)
    touched, other = mended.pair("A", "D"), mended.pair("B", "D")
    plain = results[-1].pair("A", "D")
    assert touched.p_value == pytest.approx(plain.p_now * KEPT / (RESERVE / 2))
    assert other.p_value == results[-1].pair("B", "D").p_value
    assert "approximate" in mended.guarantee
    assert any("reserve" in note for note in mended.notes)
    second = judge_open(seen[-1], amended=["A"], state=mended.state).pair("A", "D")
    assert second.p_value == pytest.approx(plain.p_now * KEPT / (RESERVE / 6))
    descriptive = judge_open(seen[-1], amended=["A"], reserve=0.0, state=follow(seen, reserve=0.0)[-1].state)
    assert descriptive.pair("A", "D").p_value == 1.0
    assert any("descriptive" in note for note in descriptive.notes)
    assert judge_open(seen[0], amended=["A"]).guarantee.startswith("exact")  # nothing was looked at before


def test_an_amendment_can_turn_an_earlier_verdict():
    claimed = judge_open(UnitMeans(("A", "B"), (20, 20), (0.0, 2.0), 1.0, 38))
    assert claimed.pair("A", "B").differs
    turned = judge_open(UnitMeans(("A", "B"), (20, 20), (0.0, 0.1), 1.0, 38), amended=["B"], state=claimed.state)
    assert not turned.pair("A", "B").differs


def test_a_changed_rule_is_refused_and_a_restated_comparison_counts_the_looks():
    results = follow(history(5))
    with pytest.raises(StatsError, match="looks so far"):
        judge_open(history(6)[-1], phi=2.0, state=results[-1].state)
    state = restate(results[-1].state, "open", rule_of(2.0))
    after = judge_open(history(6)[-1], phi=2.0, state=state)
    assert after.look == 6
    assert after.state.restated == 1
    assert all(row.version == 1 for row in after.state.pairs)
    with pytest.raises(StatsError, match="groups changed"):
        judge_open(UnitMeans(("A", "B"), (3, 3), (0.0, 0.0), 1.0, 4), state=results[-1].state)


def test_groups_that_join_have_their_own_part_and_the_others_keep_theirs():
    seen = history(10)[-1]
    three = UnitMeans(LABELS[:3], seen.n[:3], seen.means[:3], seen.variance, 57.0)
    before = judge_open(three, founders=LABELS[:3])
    after = judge_open(seen, founders=LABELS[:3], state=before.state)
    alone = judge_open(three)
    for row, plain in zip(before.pairs, alone.pairs, strict=True):
        assert row.p_value == pytest.approx(min(1.0, plain.p_value / FOUNDERS))
    means, n, ss, df = seen.arrays()
    column = log_pair_evidence(means, n, ss, df, PHI)[[2, 4, 5]]
    joined = [after.pair(a, "D").p_value for a in "ABC"]
    assert joined == pytest.approx(np.minimum(1, holm_from_log(column) / joiner_part(1) / KEPT).tolist())
    with pytest.raises(StatsError):
        judge_open(seen, founders=["B", "A"])


@pytest.mark.parametrize("control", [False, True])
@pytest.mark.parametrize("founders", [None, 2, 5])
def test_the_shares_of_all_pairs_ever_formed_stay_within_one(founders, control):
    total = interval_shares(400 if founders else 12, founders, control=control).sum()
    assert total <= 1 + 1e-12
    if founders:
        few, more = (interval_shares(k, founders, control=True) for k in (20, 30))
        assert more[:19] == pytest.approx(few)  # what was given is not taken back


def test_reserve_and_look_shares_add_up_to_one():
    assert sum(version_share(RESERVE, v) for v in range(2000)) == pytest.approx(1.0, abs=1e-4)
    assert sum(look_weight(j) for j in range(1, 200_000)) == pytest.approx(1.0, abs=1e-5)


def test_against_a_control_only_its_pairs_are_asked_and_they_are_claimed_sooner():
    seen = history(8)[-1]
    against = judge_open(seen, control="A")
    everything = judge_open(seen)
    assert [(row.a, row.b) for row in against.pairs] == [("A", "B"), ("A", "C"), ("A", "D")]
    for row in against.pairs:
        assert row.p_value <= everything.pair(row.a, row.b).p_value
    with pytest.raises(StatsError, match="first group"):
        judge_open(seen, control="B")


@pytest.mark.parametrize("groups", [11, 16])
def test_many_groups_go_the_polynomial_way(groups):
    labels = tuple(f"lot {i}" for i in range(groups))
    means = tuple(2.0 if i == groups - 1 else 0.01 * i for i in range(groups))
    result = judge_open(UnitMeans(labels, (20,) * groups, means, 1.0, 19.0 * groups))
    assert [row.b for row in result.pairs if row.differs] == [labels[-1]] * (groups - 1)
    control = judge_open(UnitMeans(labels, (20,) * groups, means, 1.0, 19.0 * groups), control=labels[0])
    assert [row.b for row in control.pairs if row.differs] == [labels[-1]]


@given(st.floats(-1e6, 1e6), st.floats(0.01, 100))
def test_offset_and_unit_do_not_matter(offset, scale):
    base = UnitMeans(("A", "B", "C"), (5, 7, 4), (0.0, 1.2, -0.4), 1.0, 13)
    moved = UnitMeans(base.labels, base.n, tuple(offset + scale * m for m in base.means), scale**2, 13)
    for one, two in zip(judge_open(base).pairs, judge_open(moved).pairs, strict=True):
        assert two.p_value == pytest.approx(one.p_value, rel=1e-5)


def test_contrasts_of_simple_data_are_close_to_unit_means():
    seen = history(12)[-1]
    exact = judge_open(seen)
    contrasts = Contrasts(
        LABELS,
        tuple((row.a, row.b) for row in exact.pairs),
        tuple(row.difference for row in exact.pairs),
        tuple(row.standard_error for row in exact.pairs),
        (seen.df,) * 6,
        sum(seen.n),
    )
    found = judge_open_contrasts(contrasts, math.sqrt(seen.variance))
    assert found.guarantee.startswith("approximate")
    for one, two in zip(exact.pairs, found.pairs, strict=True):
        assert two.log_evidence == pytest.approx(one.log_evidence)
        assert two.differs == one.differs
    left_out = judge_open_contrasts(Contrasts(LABELS, (("A", "B"),), (0.1,), (0.3,), (20.0,), 20), 1.0)
    assert len(left_out.not_estimable) == 5


def test_bad_input_is_refused():
    for bad in (
        {"labels": ("A",), "n": (1,), "means": (0.0,)},
        {"labels": ("A", "A"), "n": (1, 1), "means": (0.0, 0.0)},
        {"labels": ("A", "B"), "n": (1,), "means": (0.0, 0.0)},
        {"labels": ("A", "B"), "n": (1, -1), "means": (0.0, 0.0)},
        {"labels": ("A", "B"), "n": (1, 1), "means": (0.0, math.nan)},
    ):
        with pytest.raises(StatsError):
            UnitMeans(**bad, variance=1.0, df=1.0)
    good = UnitMeans(("A", "B"), (3, 3), (0.0, 1.0), 1.0, 4)
    for options in ({"phi": 0.0}, {"reserve": 1.0}, {"alpha": 2.0}, {"margin": -1.0}, {"amended": ["Z"]}):
        with pytest.raises(StatsError):
            judge_open(good, **options)
    with pytest.raises(StatsError):
        unit_means([1.0], ["A", "B"])
    with pytest.raises(StatsError):
        unit_means([1.0, 2.0], ["A", "Z"], ["A", "B"])
    with pytest.raises(StatsError):
        LooksState.from_plain({"mode": "open"})
