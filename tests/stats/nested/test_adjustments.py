"""Adjustments on top of a fit, where the one-way procedures are the answer, and by their definitions."""

from __future__ import annotations

import numpy as np
import pytest

from sameline.stats import compare_pairs
from sameline.stats.distributions import t_isf, t_two_sided
from sameline.stats.dunnett_distribution import dunnett_sf
from sameline.stats.nested import NestedFit, fit_nested
from sameline.stats.nested.adjustments import holm


def one_way() -> tuple[np.ndarray, list[str]]:
    rng = np.random.default_rng(2)
    group = np.repeat(list("ABCD"), [5, 7, 4, 6])
    return rng.normal(size=22) + 0.8 * (group == "C"), group.tolist()


def nested() -> NestedFit:
    rng = np.random.default_rng(9)
    group, run = np.repeat(np.arange(5), 8), np.tile(np.repeat(np.arange(4), 2), 5)
    y = rng.normal(size=20)[group * 4 + run] + 0.4 * rng.normal(size=40) + 0.9 * group
    return fit_nested(y[3:], group[3:], runs=run[3:])


@pytest.mark.parametrize(
    ("adjust", "procedure", "control", "alternative"),
    [
        ("tukey", "tukey-kramer", None, "two-sided"),
        ("bonferroni", "bonferroni", None, "two-sided"),
        ("holm", "holm", None, "two-sided"),
        ("dunnett", "dunnett", "B", "two-sided"),
        ("dunnett", "dunnett", "B", "greater"),
        ("dunnett", "dunnett", "B", "less"),
    ],
)
def test_single_values_give_the_one_way_procedure(adjust: str, procedure: str, control: str | None, alternative: str):
    y, group = one_way()
    ours = fit_nested(y, group).pairs(adjust=adjust, control=control, alternative=alternative).pairs
    theirs = compare_pairs(y, group, procedure=procedure, control=control, alternative=alternative).pairs
    for left, right in zip(ours, theirs, strict=True):
        assert (left.a, left.b, left.differs) == (right.a, right.b, right.differs)
        for name in ("difference", "standard_error", "df", "p_value", "lower", "upper"):
            found, wanted = getattr(left, name), getattr(right, name)
            assert found == wanted if wanted is None else found == pytest.approx(wanted, rel=1e-8, abs=1e-9)


def test_bonferroni_and_none_on_a_nested_fit():
    fit = nested()
    raw, adjusted = fit.pairs(adjust="none").pairs, fit.pairs(adjust="bonferroni").pairs
    for left, right in zip(raw, adjusted, strict=True):
        assert left.p_value == pytest.approx(float(t_two_sided(left.statistic, left.df)), rel=1e-12)
        assert right.p_value == pytest.approx(min(1.0, 10 * left.p_value), rel=1e-12)
        half = float(t_isf(0.0025, right.df)) * right.standard_error
        assert right.upper - right.difference == pytest.approx(half, rel=1e-10)


def test_interval_and_p_value_agree():
    fit = nested()
    for adjust, control in (("tukey", None), ("dunnett", "2"), ("bonferroni", None), ("none", None)):
        for pair in fit.pairs(adjust=adjust, control=control).pairs:
            assert pair.differs == (pair.lower > 0 or pair.upper < 0)


def test_holm_steps_down():
    """Holm (1979): 0.01 × 4, 0.02 × 3, 0.03 × 2, then 0.04 is held at the largest before it."""
    np.testing.assert_allclose(holm(np.array([0.04, 0.01, 0.03, 0.02]), 4), [0.06, 0.04, 0.06, 0.06], rtol=1e-14)


def test_dunnett_is_sharper_than_bonferroni_with_the_control():
    fit = nested()
    sharp = fit.pairs(adjust="dunnett", control="0").pairs
    blunt = fit.pairs(adjust="bonferroni", control="0").pairs
    assert all(left.p_value < right.p_value for left, right in zip(sharp, blunt, strict=True))
    assert all(left.a == "0" for left in sharp)


def test_margin_verdicts():
    fit = nested()
    words = {pair.verdict for margin in (0.1, 1.0, 100.0) for pair in fit.pairs(margin=margin).pairs}
    assert words == {"differs and matters", "differs", "equivalent", "undecided"}


def test_replicates_as_units_says_how_much_too_narrow():
    """Balanced: the nested half-width over the naive one, from the two mean squares by hand."""
    rng = np.random.default_rng(4)
    group, run = np.repeat(np.arange(3), 12), np.tile(np.repeat(np.arange(3), 4), 3)
    y = 1.5 * rng.normal(size=9)[group * 3 + run] + rng.normal(size=36)
    fit = fit_nested(y, group, runs=run)
    found = fit.replicates_as_units()
    cells = y.reshape(3, 3, 4)
    ms_run = 4 * np.sum((cells.mean(2) - cells.mean((1, 2))[:, None]) ** 2) / 6
    ms_rep = np.sum((cells - cells.mean(2)[:, :, None]) ** 2) / 27
    naive = (6 * ms_run + 27 * ms_rep) / 33
    assert found.spread_ratio == pytest.approx(((ms_run - ms_rep) / 4 / ms_rep) ** 0.5, rel=1e-10)
    assert found.error_ratio == pytest.approx((ms_run / naive) ** 0.5, rel=1e-10)
    wide = (ms_run / naive) ** 0.5 * float(t_isf(0.025, 6)) / float(t_isf(0.025, 33))
    assert found.width_ratio == pytest.approx(wide, rel=1e-10)
    assert found.text.startswith(f"run-to-run spread is {found.spread_ratio:.2g} times the replicate spread")
    assert fit_nested(y, group).replicates_as_units() is None


def test_dunnett_in_complete_sessions_is_the_procedure_of_randomised_blocks():
    """Every batch once in every session: Dunnett (1955) on the residual mean square, correlation one half."""
    rng = np.random.default_rng(12)
    session, group = np.repeat(np.arange(7), 4), np.tile(np.arange(4), 7)
    y = 5.0 * rng.normal(size=7)[session] + rng.normal(size=28) + group
    found = fit_nested(y, group, sessions=session).pairs(adjust="dunnett", control="0").pairs
    table = y.reshape(7, 4)
    rest = table - table.mean(1, keepdims=True) - table.mean(0) + table.mean()
    error = (2 * np.sum(rest**2) / 18 / 7) ** 0.5
    for at, pair in enumerate(found, start=1):
        t = (table.mean(0)[at] - table.mean(0)[0]) / error
        assert pair.statistic == pytest.approx(t, rel=1e-8)
        assert pair.df == pytest.approx(18.0, rel=1e-6)
        assert pair.p_value == pytest.approx(float(dunnett_sf(abs(t), np.full(3, 0.5**0.5), 18.0)), rel=1e-5)


def test_dunnett_in_incomplete_sessions_errs_on_the_safe_side():
    rng = np.random.default_rng(13)
    session = np.repeat(np.arange(9), 3)
    group = np.concatenate([rng.choice(5, 3, replace=False) for _ in range(9)])
    y = 5.0 * rng.normal(size=9)[session] + rng.normal(size=27) + 0.5 * group
    fit = fit_nested(y, group, sessions=session)
    sharp, raw, blunt = (fit.pairs(adjust=adjust, control="0").pairs for adjust in ("dunnett", "none", "bonferroni"))
    for left, middle, right in zip(raw, sharp, blunt, strict=True):
        assert left.p_value < middle.p_value <= right.p_value * (1 + 1e-9)
