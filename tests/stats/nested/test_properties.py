"""What must hold whatever the data: balanced data, order of rows, shifts and scales, relabelling."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.stats import compare_pairs
from sameline.stats.nested import NestedFit, fit_nested, nested_anova

SEEDS = st.integers(0, 2**32 - 1)


def numbers(fit: NestedFit) -> list[object]:
    """Every figure of a fit, pairs by name."""
    means, pairs = fit.means(), sorted(fit.pairs().pairs, key=lambda pair: sorted((pair.a, pair.b)))
    order = sorted(range(len(means.group)), key=means.group.__getitem__)
    found: list[object] = [*fit.components.values(), fit.reml_criterion]
    for column in (means.mean, means.standard_error, means.df, means.lower):
        found += [column[at] for at in order]
    return found + [(abs(pair.difference), pair.standard_error, pair.df, pair.p_value) for pair in pairs]


def design(seed: int, *, balanced: bool) -> tuple[np.ndarray, list[str], list[str], list[str]]:
    rng = np.random.default_rng(seed)
    k, b, r, n = rng.integers(2, 5), rng.integers(2, 4), rng.integers(2, 4), rng.integers(2, 4)

    def some(most: int) -> int:
        return int(most) if balanced else int(rng.integers(1, most + 2))

    rows = [(g, x, z) for g in range(k) for x in range(max(2, some(b))) for z in range(some(r)) for _ in range(some(n))]
    group, batch, run = np.array(rows).T
    cell = np.unique(group * 100 + batch, return_inverse=True)[1]
    run_cell = np.unique((group * 100 + batch) * 100 + run, return_inverse=True)[1]
    spread = rng.choice([0.0, 0.7, 2.0], 2)
    y = spread[0] * rng.normal(size=cell.max() + 1)[cell] + spread[1] * rng.normal(size=run_cell.max() + 1)[run_cell]
    y = np.round(y + rng.normal(size=y.size) + 10.0, 3)
    return y, [f"G{g}" for g in group], [f"B{b}" for b in batch], [f"r{z}" for z in run]


@given(SEEDS)
@settings(max_examples=25, deadline=None)
def test_row_order_does_not_move_a_bit(seed: int):
    y, *labels = design(seed, balanced=False)
    order = np.random.default_rng(seed).permutation(y.size)
    one = fit_nested(y, *labels)
    other = fit_nested(y[order], *([column[at] for at in order] for column in labels))
    assert numbers(one) == numbers(other)


@given(SEEDS)
@settings(max_examples=15, deadline=None)
def test_row_order_does_not_move_a_bit_in_sessions(seed: int):
    rng = np.random.default_rng(seed)
    session = np.repeat(np.arange(5), 8)
    group = np.tile(np.repeat(np.arange(4), 2), 5)
    y = np.round(rng.normal(size=40) + 2.0 * rng.normal(size=5)[session], 3)
    order = rng.permutation(40)
    one = fit_nested(y, group, sessions=session)
    other = fit_nested(y[order], group[order], sessions=session[order])
    assert numbers(one) == numbers(other)


@given(SEEDS)
@settings(max_examples=25, deadline=None)
def test_balanced_data_give_the_expected_mean_squares_answer(seed: int):
    """Interior: components are (MS - MS below)/n and the group's F denominator gives standard errors and df."""
    y, group, batch, run = design(seed, balanced=True)
    fit = fit_nested(y, group, batch, run)
    table = nested_anova(y, group, batch, run)
    raw = [line.variance_raw for line in table.lines[1:]]
    if min(raw) <= 0.0:
        assert fit.at_zero
        return
    np.testing.assert_allclose(list(fit.components.values()), raw, rtol=1e-9, atol=1e-12 * max(raw))
    batches = table.lines[1]
    each = len(y) / len(fit.groups)
    for pair in fit.pairs().pairs:
        assert pair.df == batches.df
        assert pair.standard_error == pytest.approx((2.0 * batches.ms / each) ** 0.5, rel=1e-12)


@given(SEEDS)
@settings(max_examples=25, deadline=None)
def test_one_run_a_replicate_is_exactly_tukey(seed: int):
    rng = np.random.default_rng(seed)
    sizes = rng.integers(2, 7, rng.integers(2, 6))
    group = np.repeat([f"G{at}" for at in range(sizes.size)], sizes)
    y = np.round(rng.normal(10.0, 1.0, group.size), 2)
    nested = fit_nested(y, group, runs=np.arange(y.size)).pairs(margin=1.0)
    plain = compare_pairs(y, group, procedure="tukey-kramer", margin=1.0)
    for ours, theirs in zip(nested.pairs, plain.pairs, strict=True):
        assert (ours.a, ours.b, ours.verdict, ours.differs) == (theirs.a, theirs.b, theirs.verdict, theirs.differs)
        for name in ("difference", "standard_error", "df", "p_value", "lower", "upper"):
            assert getattr(ours, name) == pytest.approx(getattr(theirs, name), rel=1e-11, abs=1e-12)
    # As sets: means that are equal but for rounding may stand in either order.
    assert set(map(frozenset, nested.lines)) == set(map(frozenset, plain.lines))


@given(SEEDS)
@settings(max_examples=15, deadline=None)
def test_shift_and_scale(seed: int):
    """Binary scales and shifts that are exact move the figures exactly as they should."""
    y, *labels = design(seed, balanced=False)
    y = np.round(y * 1024) / 1024
    one, other = fit_nested(y, *labels), fit_nested(4.0 * y + 4096.0, *labels)
    for left, right in zip(one.pairs().pairs, other.pairs().pairs, strict=True):
        assert right.difference == pytest.approx(4.0 * left.difference, rel=1e-8, abs=1e-9)
        assert right.standard_error == pytest.approx(4.0 * left.standard_error, rel=1e-8)
        assert right.df == pytest.approx(left.df, rel=1e-6)


def test_degrees_of_freedom_do_not_jump_at_zero():
    """A component sliding through zero: Kenward-Roger moves smoothly, Satterthwaite jumps, so it is no default."""
    rng = np.random.default_rng(5)
    group, run = np.repeat(np.arange(4), 9), np.tile(np.repeat(np.arange(3), 3), 4)
    cell = group * 3 + run
    inner = rng.normal(size=36)
    inner -= (np.bincount(cell, inner) / 3)[cell]
    between = rng.normal(size=12)
    between -= (np.bincount(np.arange(12) // 3, between) / 3)[np.arange(12) // 3]
    unit = np.sqrt(np.sum(inner**2) / 24 / (3.0 * np.sum(between**2) / 8))
    found = {}
    for step in (0.999, 1.0, 1.001):
        y = inner + step * unit * between[cell]
        for method in ("kenward-roger", "satterthwaite"):
            found[method, step] = fit_nested(y, group, runs=run, df=method).pairs().pairs[0].df
    assert found["kenward-roger", 0.999] == pytest.approx(found["kenward-roger", 1.001], rel=0.01)
    assert found["satterthwaite", 0.999] > 3.0 * found["satterthwaite", 1.001]


def test_a_common_offset_costs_nothing():
    y, *labels = design(12, balanced=False)
    near, far = fit_nested(y, *labels), fit_nested(y + 2.0**30, *labels)
    for left, right in zip(near.pairs().pairs, far.pairs().pairs, strict=True):
        assert right.difference == pytest.approx(left.difference, abs=1e-6)
        assert right.standard_error == pytest.approx(left.standard_error, rel=1e-5)
