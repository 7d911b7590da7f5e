"""Dunn: pairs of mean ranks after one ranking of all values, p-values by Holm.

z = (R_b - R_a) / sqrt[(N(N+1)/12 - T/(12(N-1))) (1/n_a + 1/n_b)], R the mean ranks, T the sum of t^3 - t over ties;
two-sided normal p-values, adjusted by Holm over the pairs asked. With a control the pairs are those with the control.

Assumes independent values and distributions of one shape; says nothing about normality. The ranks of a pair depend on
the other groups too; `steel-dwass` ranks each pair alone. `difference` remains the difference of means in the values'
unit, for the eye; the difference of mean ranks is in `columns.details["mean_rank_difference"]`. There is no interval
for the difference of means, so no margin can be judged. Groups of one value are allowed. Refuses identical values.

References: Dunn, O. J. (1964), Multiple comparisons using rank sums, Technometrics 6:241-252; Holm (1979), Scand. J.
Statist. 6:65-70.
"""

from __future__ import annotations

import numpy as np

from sameline.stats.adjusted import holm_adjusted
from sameline.stats.columns import Columns, Question
from sameline.stats.distributions import normal_sf, normal_two_sided
from sameline.stats.ranks import rank_all


def dunn(question: Question) -> Columns:
    """The pairs asked by Dunn's z; `statistic` is z.

    Raises:
        StatsError: all values are identical.
    """
    samples = question.samples
    ranking = rank_all(samples)
    total, n = float(samples.total), samples.n
    variance = total * (total + 1.0) / 12.0 - ranking.ties / (12.0 * (total - 1.0))
    by = np.sqrt(variance * (1.0 / n[question.first] + 1.0 / n[question.second]))
    rank_difference = ranking.mean_ranks[question.second] - ranking.mean_ranks[question.first]
    z = rank_difference / by
    sign = -1.0 if question.alternative == "less" else 1.0
    p_raw = normal_two_sided(z) if question.alternative == "two-sided" else normal_sf(sign * z)
    none = np.full(question.m, np.nan)
    return Columns(
        difference=question.difference,
        standard_error=none,
        df=np.full(question.m, np.inf),
        statistic=z,
        p_value=holm_adjusted(p_raw),
        lower=none,
        upper=none,
        critical=none,
        p_raw=p_raw,
        estimable=np.ones(question.m, bool),
        details={"mean_rank_difference": rank_difference, "rank_standard_error": by},
    )
