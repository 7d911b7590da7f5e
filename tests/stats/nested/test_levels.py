"""Levels that cannot be told apart, bad input, and what is said then."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from sameline.errors import StatsError
from sameline.stats.nested import NestedFit, fit_nested


def collapsed(fit: NestedFit) -> dict[str, str]:
    return {gone.level: gone.into for gone in fit.collapsed}


def codes(fit: NestedFit) -> set[str]:
    return {caution.code for caution in fit.cautions}


def test_every_batch_has_one_run():
    fit = fit_nested([1.0, 1.2, 1.6, 1.5, 2.0, 2.3, 2.9, 2.7], list("AAAABBBB"), list("xxyyxxyy"), ["r"] * 8)
    assert collapsed(fit) == {"run": "batch"}
    assert list(fit.components) == ["batch", "replicate"]
    assert "every batch has one run" in fit.collapsed[0].meaning


def test_every_run_has_one_replicate():
    fit = fit_nested([1.0, 1.2, 2.0, 2.3], list("AABB"), runs=list("1212"))
    assert collapsed(fit) == {"replicate": "run"}
    assert list(fit.components) == ["run"]
    assert fit.pairs().pairs[0].df == 2.0


def test_every_group_has_one_batch():
    fit = fit_nested([1.0, 1.2, 1.6, 1.5, 2.0, 2.3, 2.9, 2.7], list("AAAABBBB"), list("AAAABBBB"), list("11221122"))
    assert collapsed(fit) == {"batch": "group"}
    assert "about these batches" in fit.collapsed[0].meaning
    assert fit.unseen is None
    assert fit.pairs().pairs[0].df == 2.0


def test_one_run_a_group_is_undecided_with_the_reason():
    fit = fit_nested([1.0, 1.01, 9.0, 9.02, 5.0, 5.01], list("AABBCC"), runs=["r"] * 6)
    pairs = fit.pairs(margin=0.5)
    assert [pair.verdict for pair in pairs.pairs] == ["undecided"] * 3
    assert [pair.differs for pair in pairs.pairs] == [False] * 3
    assert pairs.pairs[0].difference == pytest.approx(8.005)
    assert pairs.pairs[0].p_value is None
    assert "one run" in pairs.not_estimable["A", "B"]
    assert pairs.lines == [["A", "C", "B"]]
    assert pairs.frame()["standard_error"].tolist() == [None] * 3
    assert fit.means().standard_error == (None,) * 3
    assert fit.replicates_as_units() is None


def test_replicates_all_alike_count_once():
    fit = fit_nested([1.0, 1.0, 1.5, 1.5, 2.0, 2.0, 2.2, 2.2], list("AAAABBBB"), runs=list("11221122"))
    assert collapsed(fit) == {"replicate": "nothing"}
    plain = fit_nested([1.0, 1.5, 2.0, 2.2], list("AABB"), runs=list("1212"))
    assert fit.pairs().pairs == plain.pairs().pairs


def test_replicates_nearly_alike_go_to_the_same_limit():
    fit = fit_nested([1.0, 1.0 + 1e-9, 1.5, 1.5, 2.0, 2.0, 2.2, 2.2], list("AAAABBBB"), runs=list("11221122"))
    plain = fit_nested([1.0, 1.5, 2.0, 2.2], list("AABB"), runs=list("1212"))
    assert fit.pairs().pairs[0].p_value == pytest.approx(plain.pairs().pairs[0].p_value, rel=1e-6)


def test_a_group_with_one_run_borrows_from_the_others_and_says_so():
    fit = fit_nested([1.0, 1.2, 1.6, 1.5, 2.0, 2.3], list("AAAABB"), runs=list("112211"))
    assert "one-run" in codes(fit)
    assert fit.pairs().pairs[0].standard_error is not None


def test_same_batch_label_in_two_groups_is_two_batches_and_said():
    y = [1.0, 1.2, 1.6, 1.5, 2.0, 2.3, 2.9, 2.7]
    same = fit_nested(y, list("AAAABBBB"), list("xxyyxxyy"))
    other = fit_nested(y, list("AAAABBBB"), list("xxyyvvww"))
    assert same.pairs().pairs == other.pairs().pairs
    assert "batch-in-two-groups" in codes(same)
    assert "batch-in-two-groups" not in codes(other)


@pytest.mark.parametrize(
    ("call", "part"),
    [
        ({"values": [], "groups": []}, "no values"),
        ({"values": [1.0, 2.0], "groups": ["A", "B"], "runs": ["1", "1"]}, "no replication at any level"),
        ({"values": [1.0], "groups": ["A"]}, "no replication at any level"),
        ({"values": [1.0, 1.0, 2.0, 2.0], "groups": list("AABB"), "runs": list("1212")}, "nothing varies"),
        ({"values": [1.0, float("nan")], "groups": ["A", "A"]}, "not finite"),
        ({"values": [1.0, 2.0], "groups": ["A"]}, "1 labels for 2 values"),
        ({"values": [1.0, 2.0], "groups": ["A", "A"], "runs": ["1", None]}, "missing"),
        ({"values": [1.0, 2.0], "groups": ["A", "A"], "df": "between-within"}, "not known"),
    ],
)
def test_refusals_carry_advice(call: dict[str, Any], part: str):
    with pytest.raises(StatsError, match=part) as refused:
        fit_nested(**call)
    assert refused.value.advice
    assert refused.value.where


def test_refused_pairs():
    fit = fit_nested([1.0, 1.2, 1.6, 2.0], ["A"] * 4, runs=list("1122"))
    with pytest.raises(StatsError, match="one group"):
        fit.pairs()
    fit = fit_nested([1.0, 1.2, 2.0, 2.3], list("AABB"), runs=list("1212"))
    for options in ({"adjust": "scheffe"}, {"adjust": "dunnett"}, {"control": "A"}, {"control": "Z"}):
        with pytest.raises(StatsError):
            fit.pairs(**options)
    with pytest.raises(StatsError, match="one-sided"):
        fit.pairs(adjust="none", alternative="less")


def test_a_thousand_groups():
    rng = np.random.default_rng(1)
    group = np.repeat(np.arange(1000), 4)
    y = rng.normal(size=4000) + np.repeat(rng.normal(size=2000), 2)
    fit = fit_nested(y, group, runs=np.tile([0, 0, 1, 1], 1000))
    assert fit.means().df[0] == 1000.0
    with pytest.raises(StatsError, match="499500 questions"):
        fit.pairs()
    assert len(fit.pairs(adjust="dunnett", control="0").pairs) == 999


def test_session_the_same_for_all_cancels():
    y, group, run = [1.0, 1.2, 1.6, 1.5, 2.0, 2.3, 2.9, 2.7], list("AAAABBBB"), list("11221122")
    fit = fit_nested(y, group, runs=run, sessions=["Monday"] * 8)
    assert collapsed(fit) == {"session": "nothing"}
    assert fit.pairs().pairs == fit_nested(y, group, runs=run).pairs().pairs


def test_a_session_for_each_group_leaves_the_pair_undecided():
    fit = fit_nested([1.0, 1.2, 1.6, 5.0, 5.2, 5.1], list("AAABBB"), runs=list("123123"), sessions=list("mmmttt"))
    assert collapsed(fit)["session"] == "group"
    assert fit.pairs().pairs[0].verdict == "undecided"


def test_a_session_for_each_run_is_the_run():
    y, group, run = [1.0, 1.2, 1.6, 1.5, 2.0, 2.3, 2.9, 2.7], list("AAAABBBB"), list("11223344")
    fit = fit_nested(y, group, sessions=run)
    assert collapsed(fit) == {"session": "run"}
    assert fit.pairs().pairs == fit_nested(y, group, runs=run).pairs().pairs


def test_groups_that_never_meet_in_a_session_are_refused():
    """A and B in one session, C and D in another: what sets the sessions apart is in A's difference from C."""
    y = [1.0, 1.2, 1.7, 2.0, 2.4, 2.1, 3.0, 3.3]
    with pytest.raises(StatsError, match="cannot be told apart") as refused:
        fit_nested(y, list("AABBCCDD"), runs=list("12121212"), sessions=list("ssssuuuu"))
    assert refused.value.advice


def test_what_a_session_adds_cancels_in_differences():
    """Batches tested side by side on very different days: only the crossed model sees that they differ."""
    rng = np.random.default_rng(8)
    day = np.repeat(np.arange(6), 4)
    group = np.tile(["A", "A", "B", "B"], 6)
    run = np.repeat(rng.normal(size=12), 2)
    y = 30.0 * rng.normal(size=6)[day] + 4.0 * (group == "B") + run + 0.3 * rng.normal(size=24)
    crossed = fit_nested(y, group, sessions=day).pairs().pairs[0]
    blind = fit_nested(y, group, runs=day).pairs().pairs[0]
    assert crossed.verdict == "differs"
    assert blind.verdict == "undecided"
    # Balanced blocks: the classical paired analysis on the differences of run means is the answer.
    means = np.array([[y[(day == d) & (group == g)].mean() for g in "AB"] for d in range(6)])
    difference = means[:, 1] - means[:, 0]
    assert crossed.difference == pytest.approx(difference.mean(), rel=1e-12)
    assert crossed.standard_error == pytest.approx(difference.std(ddof=1) / 6**0.5, rel=1e-6)
    assert crossed.df == pytest.approx(5.0, rel=1e-4)
