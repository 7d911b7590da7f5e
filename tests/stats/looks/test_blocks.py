"""Block evidence against the likelihoods written out unit by unit."""

import literal
import numpy as np
import pytest
from scipy import integrate, stats

from sameline.stats.looks.blocks import block_parts, log_block_evidence
from sameline.stats.looks.evidence import log_evidence


def summaries(values, groups, k):
    n = np.bincount(groups, minlength=k).astype(float)
    means = np.bincount(groups, values, minlength=k) / np.maximum(n, 1)
    return means, n, np.array(((values - means[groups]) ** 2).sum()), np.array(float(len(values) - (n > 0).sum()))


@pytest.mark.parametrize("sizes", [(3, 3, 3), (1, 4, 2, 6), (1, 1, 1, 2), (5, 1, 3)])
@pytest.mark.parametrize("phi", [0.5, 2.0])
def test_every_block_is_the_ratio_of_its_likelihoods(sizes, phi):
    rng = np.random.default_rng(sum(sizes))
    groups = np.repeat(np.arange(len(sizes)), sizes)
    values = rng.normal(20 + groups, 2.0)
    found = log_block_evidence(*summaries(values, groups, len(sizes)), phi)
    parts = block_parts(len(sizes))
    for at, inside in enumerate(parts.members):
        block = np.flatnonzero(inside).tolist()
        assert found[at] == pytest.approx(literal.log_block(values, groups, block, phi), rel=1e-9, abs=1e-9)


def test_a_group_without_units_changes_nothing():
    groups = np.repeat([0, 1, 2], [3, 4, 2])
    values = np.random.default_rng(3).normal(groups, 1.0)
    three, four = (log_block_evidence(*summaries(values, groups, k), 1.0) for k in (3, 4))
    # the pairs of 0, 1, 2 stand as they were; with the empty group a pair says nothing
    masks = block_parts(4).masks.tolist()
    assert [four[masks.index(m)] for m in (3, 5, 6)] == pytest.approx([three[0], three[1], three[2]])
    assert four[masks.index(0b1001)] == pytest.approx(0.0)


def test_shifts_and_scale_do_not_matter():
    groups = np.repeat([0, 1, 2, 3], [3, 4, 2, 3])
    values = np.random.default_rng(4).normal(groups, 1.0)
    plain = log_block_evidence(*summaries(values, groups, 4), 1.0)
    moved = log_block_evidence(*summaries(2.5 * values + 40, groups, 4), 1.0)
    assert moved == pytest.approx(plain, rel=1e-9)


@pytest.mark.parametrize(("c", "n", "others"), [(3, 4, 0), (4, 2, 3), (6, 5, 0)])
def test_scatter_has_expectation_one(c, n, others):
    # under the null SS between / SS total of the block is Beta((c-1)/2, df/2)
    df, phi = c * (n - 1) + others, 1.0
    shrink = 2 * phi / (2 * phi + n)

    def weighted(part):
        log_e = 0.5 * (c - 1) * np.log(shrink) - 0.5 * (df + c - 1) * np.log1p(-(1 - shrink) * part)
        return stats.beta((c - 1) / 2, df / 2).pdf(part) * np.exp(log_e)

    assert integrate.quad(weighted, 0, 1, epsabs=1e-12, limit=400)[0] == pytest.approx(1.0, abs=1e-7)


def test_every_mixture_has_expectation_one_by_simulation():
    rng = np.random.default_rng(11)
    repeats, n = 60_000, np.array([2.0, 3.0, 1.0, 4.0])
    means = rng.standard_normal((repeats, 4)) / np.sqrt(n)
    ss, df = rng.chisquare(6, repeats), np.full(repeats, 6.0)
    e = np.exp(log_block_evidence(means, np.broadcast_to(n, means.shape), ss, df, 1.0))
    error = e.std(axis=0) / np.sqrt(repeats)
    assert (np.abs(e.mean(axis=0) - 1) < 4 * error).all()
    assert (error < 0.05).all()


def test_part_of_one_apart_is_a_beta_with_expectation_one():
    df0, n, phi = 14.0, 2.2, 1.0

    def weighted(part):
        e = np.exp(log_evidence(part, 1.0, df0, n, phi))
        return stats.beta(0.5, (df0 - 1) / 2).pdf(part) * e

    assert integrate.quad(weighted, 0, 1, epsabs=1e-12, limit=400)[0] == pytest.approx(1.0, abs=1e-6)
