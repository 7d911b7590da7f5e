"""Tukey-Kramer: all pairs of means, one common variance.

q = |mean_b - mean_a| / sqrt(MS_within / 2 (1/n_a + 1/n_b)) against the studentized range of k means with N - k degrees
of freedom; intervals difference ± q_crit sqrt(MS_within / 2 (1/n_a + 1/n_b)) hold together with confidence 1 - alpha:
exactly for equal n, at least that for unequal n (Hayter 1984). With two groups it is the t test.

Assumes independent values, one variance in all groups, normal scatter. With unequal spreads and unequal n together the
stated error rate does not hold; a caution says so, and `games-howell` is the procedure that does not assume it.
Groups of one value are allowed as long as some group has more. Refuses data in which no group has a spread.

References: Tukey, J. W. (1953), The problem of multiple comparisons; Kramer, C. Y. (1956), Biometrics 12:307-310;
Hayter, A. J. (1984), Ann. Statist. 12:61-75.
"""

from __future__ import annotations

import math

import numpy as np

from sameline.stats.columns import Columns, Question, interval
from sameline.stats.studentized_range import studentized_range_isf, studentized_range_sf


def tukey_kramer(question: Question) -> Columns:
    """All pairs by Tukey-Kramer; `statistic` is the studentized range q.

    Raises:
        StatsError: no group has a spread, or every group has one value.
    """
    samples = question.samples
    samples.require_spread()
    df, n = samples.df_within, samples.n
    difference = question.difference
    se = np.sqrt(samples.ms_within * (1.0 / n[question.first] + 1.0 / n[question.second]))
    q = np.abs(difference) / (se / math.sqrt(2.0))
    p = np.asarray(studentized_range_sf(q, samples.k, df))
    critical = float(studentized_range_isf(question.alpha, samples.k, df))
    lower, upper = interval(difference, critical * (se / math.sqrt(2.0)), p < question.alpha)
    same = np.ones(question.m)
    return Columns(
        difference=difference,
        standard_error=se,
        df=same * df,
        statistic=q,
        p_value=p,
        lower=lower,
        upper=upper,
        critical=same * critical,
        p_raw=same * np.nan,
        estimable=np.ones(question.m, bool),
    )
