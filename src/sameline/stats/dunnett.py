"""Dunnett: every group against a control, one common variance.

t_i = (mean_i - mean_0) / sqrt(MS_within (1/n_i + 1/n_0)), i = 1 .. k - 1. The t's share the control and the variance;
their correlation is l_i l_j with l_i = sqrt(n_i / (n_i + n_0)). The p-value of a pair is the probability that the
largest of them is at least as extreme (single step), and intervals difference ± c sqrt(MS_within (1/n_i + 1/n_0)) hold
together. One-sided alternatives give intervals open on one side. Computed by quadrature, so the same on every run.

Assumes independent values, one variance in all groups, normal scatter. Groups of one value are allowed as long as some
group has more. Refuses data in which no group has a spread.

References: Dunnett, C. W. (1955), J. Am. Stat. Assoc. 50:1096-1121; Dunnett, C. W. (1964), Biometrics 20:482-491.
"""

from __future__ import annotations

from typing import Literal, cast

import numpy as np

from sameline.stats.columns import Columns, Question, interval
from sameline.stats.dunnett_distribution import dunnett_isf, dunnett_sf


def dunnett(question: Question) -> Columns:
    """The pairs with the control; `statistic` is t, `critical` its bound in absolute value.

    Raises:
        StatsError: no group has a spread, or every group has one value.
    """
    samples = question.samples
    samples.require_spread()
    df, n = float(samples.df_within), samples.n.astype(float)
    weights = np.sqrt(n[question.second] / (n[question.second] + n[question.first]))
    se = np.sqrt(samples.ms_within * (1.0 / n[question.first] + 1.0 / n[question.second]))
    difference = question.difference
    t = difference / se
    alternative = cast("Literal['two-sided', 'less', 'greater']", question.alternative)
    p = np.asarray(dunnett_sf(t, weights, df, alternative))
    critical = abs(dunnett_isf(question.alpha, weights, df, alternative))
    lower, upper = interval(difference, critical * se, p < question.alpha, question.alternative)
    same = np.ones(question.m)
    return Columns(
        difference=difference,
        standard_error=se,
        df=same * df,
        statistic=t,
        p_value=p,
        lower=lower,
        upper=upper,
        critical=same * critical,
        p_raw=same * np.nan,
        estimable=np.ones(question.m, bool),
    )
