"""One-way analysis of variance.

F = [SS_between / (k - 1)] / [SS_within / (N - k)] against F(k - 1, N - k). Assumes independent values, one variance in
all groups, and normal scatter about the group means. Groups of one value are allowed as long as some group has more.
Refuses fewer than two groups, and data in which no group has a spread.

Reference: Fisher, R. A. (1925), Statistical Methods for Research Workers; NIST/SEMATECH e-Handbook of Statistical
Methods, 7.4.3. Sums of squares are exact for the values as recorded (`exact_sums`).
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from sameline.stats.distributions import f_sf
from sameline.stats.samples import Samples, gather
from sameline.stats.summaries import GroupSummary, summaries

if TYPE_CHECKING:
    import pandas as pd


@dataclass(frozen=True, slots=True)
class Anova:
    """The table of a one-way analysis of variance.

    Args:
        df_between: k - 1.
        df_within: N - k.
        ss_between: sum of squares of the group means about the grand mean, weighted by size.
        ss_within: sum of squares of the values about their group means.
        ms_between: ss_between / df_between.
        ms_within: ss_within / df_within.
        F: ms_between / ms_within.
        p_value: upper tail of F.
        eta_squared: share of the total sum of squares that lies between groups (R squared).
        residual_sd: square root of ms_within.
        grand_mean: mean of all values.
        groups: size, mean, standard deviation and pooled 95 % interval of each group.
    """

    df_between: int
    df_within: int
    ss_between: float
    ss_within: float
    ms_between: float
    ms_within: float
    F: float
    p_value: float
    eta_squared: float
    residual_sd: float
    grand_mean: float
    groups: tuple[GroupSummary, ...]

    @property
    def statistic(self) -> float:
        """F, under the name it has in every result."""
        return self.F

    def frame(self) -> pd.DataFrame:
        """Rows between, within, total; columns source, df, ss, ms, F, p_value, None where there is none."""
        import pandas as pd

        rows = [
            ("between", self.df_between, self.ss_between, self.ms_between, self.F, self.p_value),
            ("within", self.df_within, self.ss_within, self.ms_within, None, None),
            ("total", self.df_between + self.df_within, self.ss_between + self.ss_within, None, None, None),
        ]
        return pd.DataFrame(rows, columns=["source", "df", "ss", "ms", "F", "p_value"], dtype=object)


def anova(values: Iterable[Any], groups: Iterable[Any]) -> Anova:
    """One-way analysis of variance.

    Args:
        values: n values: numbers, decimal text or `Decimal`.
        groups: n group labels.

    Raises:
        StatsError: a value or label is refused, there are fewer than two groups, or no group has a spread.
    """
    return of_samples(gather(values, groups))


def of_samples(samples: Samples, *, alpha: float = 0.05) -> Anova:
    """The same, for samples already gathered; `alpha` is for the groups' intervals."""
    samples.require_spread()
    sums = samples.sums
    df_between, df_within = samples.k - 1, samples.df_within
    ms_between, ms_within = sums.ss_between / df_between, samples.ms_within
    ratio = ms_between / ms_within
    return Anova(
        df_between=df_between,
        df_within=df_within,
        ss_between=sums.ss_between,
        ss_within=sums.ss_within,
        ms_between=ms_between,
        ms_within=ms_within,
        F=ratio,
        p_value=float(f_sf(ratio, df_between, df_within)),
        eta_squared=sums.ss_between / (sums.ss_between + sums.ss_within),
        residual_sd=math.sqrt(ms_within),
        grand_mean=sums.grand_mean,
        groups=summaries(samples, alpha, pooled=True),
    )
