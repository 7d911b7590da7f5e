"""Games-Howell: all pairs of means, each with its own variances.

For each pair q = |mean_b - mean_a| / sqrt((v_a/n_a + v_b/n_b) / 2) against the studentized range of k means with
Welch-Satterthwaite degrees of freedom of that pair; intervals difference ± q_crit sqrt((v_a/n_a + v_b/n_b) / 2).

Assumes independent values and normal scatter, not one variance. It holds its error rate approximately: with few values
in many groups it claims falsely more often than stated (ten groups of three: 10 % at a nominal 5 %); a caution says so
below six values a group, with the figure.
A pair is not estimable where a group has one value or neither group has a spread (see `welch_pairs`); the others are.

Reference: Games, P. A. & Howell, J. F. (1976), Pairwise multiple comparison procedures with unequal N's and/or
variances, J. Educ. Stat. 1:113-125.
"""

from __future__ import annotations

import math

import numpy as np

from sameline.stats.columns import Columns, Question, interval
from sameline.stats.studentized_range import studentized_range_isf, studentized_range_sf
from sameline.stats.welch_pairs import welch_pairs


def games_howell(question: Question) -> Columns:
    """All pairs by Games-Howell; `statistic` is the studentized range q, `critical` is each pair's own.

    Raises:
        StatsError: no pair is estimable.
    """
    pairs = welch_pairs(question)
    at = np.flatnonzero(pairs.estimable)
    k = question.samples.k
    scale = pairs.standard_error[at] / math.sqrt(2.0)
    difference, df = pairs.difference[at], pairs.df[at]
    q = np.abs(difference) / scale
    p = np.asarray(studentized_range_sf(q, k, df))
    # Balanced groups of like spread share many degrees of freedom; each quantile is found once.
    freedoms, which = np.unique(df, return_inverse=True)
    critical = np.asarray(studentized_range_isf(question.alpha, k, freedoms))[which]
    lower, upper = interval(difference, critical * scale, p < question.alpha)
    whole = {"q": q, "p": p, "critical": critical, "lower": lower, "upper": upper}
    for name, column in whole.items():
        whole[name] = np.full(question.m, np.nan)
        whole[name][at] = column
    return Columns(
        difference=pairs.difference,
        standard_error=pairs.standard_error,
        df=pairs.df,
        statistic=whole["q"],
        p_value=whole["p"],
        lower=whole["lower"],
        upper=whole["upper"],
        critical=whole["critical"],
        p_raw=np.full(question.m, np.nan),
        estimable=pairs.estimable,
        reasons=pairs.reasons,
    )
