"""Pairs by t tests with adjusted p-values: Bonferroni, Šidák and Holm on one common variance, Holm on Welch's pairs.

With m pairs asked and p the p-value of one pair:

* Bonferroni: min(1, m p); intervals with t at alpha / m. Holds whatever the dependence.
* Šidák: 1 - (1 - p)^m; intervals with t at 1 - (1 - alpha)^(1/m). Holds for these t statistics (Šidák 1967) and is
  slightly sharper than Bonferroni.
* Holm: step-down, the i-th smallest p times (m - i + 1), made monotone. Never less sharp than Bonferroni in its
  p-values; no simple simultaneous intervals belong to it, so none are given.
* Welch-Holm: each pair by Welch's t test with its own variances and degrees of freedom, then Holm.

The first three assume one variance in all groups and allow groups of one value; Welch's pairs need two values and a
spread in at least one of the two groups, else that pair is not estimable. All assume independent values and normal
scatter. With a control the pairs are those with the control, and the alternative may be one-sided.

References: Dunn, O. J. (1961), J. Am. Stat. Assoc. 56:52-64 (Bonferroni's inequality); Šidák, Z. (1967), J. Am. Stat.
Assoc. 62:626-633; Holm, S. (1979), Scand. J. Statist. 6:65-70; Welch, B. L. (1947), Biometrika 34:28-35.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from sameline.stats.columns import Columns, Question, interval
from sameline.stats.distributions import t_isf, t_sf, t_two_sided
from sameline.stats.values import Floats
from sameline.stats.welch_pairs import welch_pairs


def bonferroni(question: Question) -> Columns:
    """Pooled t tests, p times the number of pairs.

    Raises:
        StatsError: no group has a spread, or every group has one value.
    """
    m = question.m
    return _pooled(question, lambda p: np.minimum(1.0, m * p), each=question.alpha / m)


def sidak(question: Question) -> Columns:
    """Pooled t tests, p by Šidák's inequality; errors as `bonferroni`."""
    m = question.m
    each = -np.expm1(np.log1p(-question.alpha) / m)
    return _pooled(question, lambda p: _sidak(p, m), each=float(each))


def holm(question: Question) -> Columns:
    """Pooled t tests, p by Holm's step-down rule; no intervals; errors as `bonferroni`."""
    return _pooled(question, holm_adjusted, each=None)


def welch_holm(question: Question) -> Columns:
    """Welch's t test for each pair, p by Holm's rule over the pairs asked; no intervals.

    Raises:
        StatsError: no pair is estimable.
    """
    pairs = welch_pairs(question)
    t = pairs.difference / pairs.standard_error
    p_raw = _tail(t, pairs.df, question.alternative)
    p = holm_adjusted(p_raw)
    none = np.full(question.m, np.nan)
    return Columns(
        difference=pairs.difference,
        standard_error=pairs.standard_error,
        df=pairs.df,
        statistic=t,
        p_value=p,
        lower=none,
        upper=none,
        critical=none,
        p_raw=p_raw,
        estimable=pairs.estimable,
        reasons=pairs.reasons,
    )


def holm_adjusted(p: Floats) -> Floats:
    """Holm's adjusted p-values, shape (m,); NaN entries count among the m pairs asked and stay NaN."""
    order = np.argsort(p, kind="stable")
    steps = np.maximum.accumulate((p.size - np.arange(p.size)) * p[order])
    adjusted = np.empty_like(p)
    adjusted[order] = np.minimum(1.0, steps)
    return adjusted


def _sidak(p: Floats, m: int) -> Floats:
    certain = p >= 1.0
    return np.where(certain, 1.0, -np.expm1(m * np.log1p(-np.where(certain, 0.0, p))))


def _tail(t: Floats, df: Floats, alternative: str) -> Floats:
    if alternative == "two-sided":
        return t_two_sided(t, df)
    return t_sf(t if alternative == "greater" else -t, df)


def _pooled(question: Question, adjust: Callable[[Floats], Floats], each: float | None) -> Columns:
    samples = question.samples
    samples.require_spread()
    n = samples.n
    difference = question.difference
    se = np.sqrt(samples.ms_within * (1.0 / n[question.first] + 1.0 / n[question.second]))
    df = np.full(question.m, float(samples.df_within))
    t = difference / se
    p_raw = _tail(t, df, question.alternative)
    p = adjust(p_raw)
    none = np.full(question.m, np.nan)
    lower, upper, critical = none, none, none
    if each is not None:
        tail = each / 2 if question.alternative == "two-sided" else each
        critical = np.full(question.m, float(t_isf(tail, samples.df_within)))
        lower, upper = interval(difference, critical * se, p < question.alpha, question.alternative)
    return Columns(
        difference=difference,
        standard_error=se,
        df=df,
        statistic=t,
        p_value=p,
        lower=lower,
        upper=upper,
        critical=critical,
        p_raw=p_raw,
        estimable=np.ones(question.m, bool),
    )
