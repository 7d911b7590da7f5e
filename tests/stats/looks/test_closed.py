"""Closed testing: the fast search and the bound against every partition written out."""

from itertools import combinations

import literal
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from sameline.stats.looks.blocks import block_parts, log_block_evidence
from sameline.stats.looks.closed import close_against_control, close_over_partitions, closed_p_few
from sameline.stats.looks.evidence import log_evidence, p_from_log
from sameline.stats.looks.many import (
    LEAD,
    closed_p_from_pairs,
    closed_p_many,
    holm_from_log,
    log_lead_bounds,
    log_pair_evidence,
    pair_indices,
)


def members(mask):
    return tuple(i for i in range(12) if mask >> i & 1)


@pytest.mark.parametrize("groups", [2, 3, 4, 5, 6, 7])
def test_the_search_is_every_partition_written_out(groups):
    rng = np.random.default_rng(groups)
    masks = block_parts(groups).masks.tolist()
    for _ in range(15):
        logs = rng.normal(3.0, 3.0, len(masks))
        evidence = {members(mask): len(members(mask)) * np.exp(log) for mask, log in zip(masks, logs, strict=True)}
        assert p_from_log(close_over_partitions(logs, groups)) == pytest.approx(literal.closed_p(evidence, groups))


def test_against_a_control_every_set_that_holds_it_is_asked():
    logs = np.random.default_rng(1).normal(3.0, 2.0, 11)
    masks = block_parts(4).masks.tolist()
    expected = [min(log for log, m in zip(logs, masks, strict=True) if {0, j} <= set(members(m))) for j in (1, 2, 3)]
    assert close_against_control(logs, 4) == pytest.approx(expected)


def data(rng, groups, n, shift):
    means = rng.standard_normal(groups) / np.sqrt(n) + shift
    df = float(n.sum() - groups)
    return means, n, np.array(rng.chisquare(df)), np.array(df)


def literal_many(means, n, ss, df, lead):
    """The local tests of `many`, block by block, over every partition."""
    groups = len(means)
    a, b = pair_indices(groups)
    pair = dict(zip(zip(a.tolist(), b.tolist(), strict=True), log_pair_evidence(means, n, ss, df, 1.0), strict=True))
    evidence = {}
    for size in range(2, groups + 1):
        for block in combinations(range(groups), size):
            strongest = max(pair[p] for p in combinations(block, 2))
            if size == 2:
                evidence[block] = 2 * np.exp(strongest)
                continue
            apart = []
            for i in block:
                rest = [j for j in block if j != i]
                units = 1 / (1 / n[i] + sum(1 / n[j] for j in rest) / len(rest) ** 2)
                explained = units * (means[i] - np.mean([means[j] for j in rest])) ** 2
                apart.append(float(log_evidence(explained, ss + explained, df + 1, units, 1.0)))
            evidence[block] = max(2 * (1 - lead) / (size - 1) * np.exp(strongest), lead * np.exp(max(apart)))
    return literal.closed_p(evidence, groups)


@pytest.mark.parametrize("groups", [3, 4, 5, 6])
@pytest.mark.parametrize("balanced", [True, False])
@pytest.mark.parametrize("lead", [0.0, LEAD, 0.8])
def test_the_bound_for_many_groups_is_never_below_the_literal_p(groups, balanced, lead):
    rng = np.random.default_rng(groups)
    close = 0
    for _ in range(25):
        n = np.full(groups, 12.0) if balanced else rng.integers(1, 30, groups).astype(float)
        case = data(rng, groups, n, np.where(np.arange(groups) == groups - 1, 1.5, 0.0))
        fast, slow = closed_p_many(*case, 1.0, lead), np.array(literal_many(*case, lead))
        assert (fast >= slow * (1 - 1e-9)).all()
        close += np.isclose(fast, slow, rtol=1e-9).mean()
    assert close / 25 > (0.8 if balanced else 0.6)


@given(arrays(float, st.sampled_from([1, 3, 6, 10, 45]), elements=st.floats(-3, 60)))
def test_with_pairs_alone_it_dominates_bonferroni_at_every_look(logs):
    groups = {1: 2, 3: 3, 6: 4, 10: 5, 45: 10}[logs.size]
    bonferroni = p_from_log(logs - np.log(logs.size))
    assert (closed_p_from_pairs(logs, groups) <= bonferroni * (1 + 1e-12)).all()
    assert (holm_from_log(logs) <= bonferroni * (1 + 1e-12)).all()


@pytest.mark.parametrize("groups", [4, 11, 20])
def test_with_a_lead_it_dominates_bonferroni_up_to_the_pairs_part(groups):
    rng = np.random.default_rng(groups)
    for _ in range(20):
        case = data(rng, groups, rng.integers(1, 30, groups).astype(float), rng.normal(0, 0.7, groups))
        bonferroni = p_from_log(log_pair_evidence(*case, 1.0) - np.log(groups * (groups - 1) / 2))
        assert (closed_p_many(*case, 1.0, LEAD) <= np.minimum(1, bonferroni / (1 - LEAD)) * (1 + 1e-12)).all()


@pytest.mark.parametrize("shift", [(0, 0, 0, 0, 1), (0, 0, 0, 1, 1), (0, 0.4, 0.8, 1.2, 1.6)])
def test_few_groups_hardly_ever_say_less_than_bonferroni(shift):
    # block evidence has its own filtration, so no pathwise bound is claimed; measured: below 1 in 1000
    rng = np.random.default_rng(5)
    paths, looks, groups = 300, 30, 5
    n = 3.0 * np.arange(1, looks + 1)
    values = rng.standard_normal((paths, looks, groups, 3)) + np.array(shift)[:, None]
    means = np.cumsum(values.sum(-1), 1) / n[:, None]
    ss = (np.cumsum((values**2).sum(-1), 1) - n[:, None] * means**2).sum(-1)
    case = (means, np.broadcast_to(n[:, None], means.shape), ss, np.broadcast_to(groups * (n - 1), ss.shape))
    closed = closed_p_few(*case, 1.0) <= 0.05
    bonferroni = log_pair_evidence(*case, 1.0) >= np.log(10 / 0.05)
    assert np.mean(bonferroni & ~closed) < 1e-3
    assert closed.mean() > bonferroni.mean() + 0.01


def test_lead_bounds_are_below_every_block_that_holds_the_pair():
    rng = np.random.default_rng(8)
    groups = 6
    n = rng.integers(1, 20, groups).astype(float)
    means, n, ss, df = data(rng, groups, n, rng.normal(0, 1, groups))
    bounds = log_lead_bounds(means, n, ss, df, 1.0)
    for at, pair in enumerate(combinations(range(groups), 2)):
        for block in combinations(range(groups), 4):
            if not set(pair) <= set(block):
                continue
            best = -np.inf
            for i in pair:
                rest = [j for j in block if j != i]
                units = 1 / (1 / n[i] + sum(1 / n[j] for j in rest) / 9)
                explained = units * (means[i] - means[rest].mean()) ** 2
                best = max(best, float(log_evidence(explained, ss + explained, df + 1, units, 1.0)))
            assert bounds[at, 1] <= best + 1e-9


def test_the_order_of_the_groups_does_not_matter():
    rng = np.random.default_rng(9)
    for groups, judge in ((6, closed_p_few), (14, closed_p_many)):
        means, n, ss, df = data(rng, groups, rng.integers(2, 20, groups).astype(float), rng.normal(0, 1, groups))
        turn = rng.permutation(groups)
        plain, turned = judge(means, n, ss, df, 1.0), judge(means[turn], n[turn], ss, df, 1.0)
        pairs = list(combinations(range(groups), 2))
        for at, (a, b) in enumerate(pairs):
            was = pairs.index((min(turn[a], turn[b]), max(turn[a], turn[b])))
            assert turned[at] == pytest.approx(plain[was], rel=1e-9)


def test_a_stated_group_without_units_is_allowed_for():
    rng = np.random.default_rng(10)
    means, n, ss, df = data(rng, 12, np.full(12, 8.0), np.where(np.arange(12) == 0, 4.0, 0.0))
    n[5], means[5] = 0.0, 0.0
    p = closed_p_many(means, n, ss, df, 1.0)
    assert p[4] == 1.0  # pair (0, 5)
    assert p[0] < 0.05
    assert log_block_evidence(means[:4], n[:4] * 0, ss, np.array(0.0), 1.0) == pytest.approx(np.zeros(11))
