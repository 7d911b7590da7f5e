"""One test of all groups at once, the one whose assumptions are those of the pair procedure it stands beside."""

from __future__ import annotations

from dataclasses import dataclass

from sameline.stats import analysis_of_variance, kruskal, welch
from sameline.stats.procedures import COMMON, RANKS
from sameline.stats.samples import Samples


@dataclass(frozen=True, slots=True)
class OverallTest:
    """Do the groups differ at all?

    Args:
        name: "one-way anova", "welch" or "kruskal-wallis".
        statistic: F or H.
        df1: degrees of freedom (of the numerator).
        df2: degrees of freedom of the denominator; None for Kruskal-Wallis.
        p_value: upper tail.
    """

    name: str
    statistic: float
    df1: float
    df2: float | None
    p_value: float


def overall_test(samples: Samples, family: str) -> OverallTest:
    """The overall test for a family of pair procedures (`procedures.Procedure.family`).

    Raises:
        StatsError: it is not estimable from these samples.
    """
    if family == RANKS:
        ranks = kruskal.of_samples(samples)
        return OverallTest("kruskal-wallis", ranks.H, float(ranks.df), None, ranks.p_value)
    if family == COMMON:
        table = analysis_of_variance.of_samples(samples)
        return OverallTest("one-way anova", table.F, float(table.df_between), float(table.df_within), table.p_value)
    own = welch.of_samples(samples)
    return OverallTest("welch", own.F, own.df1, own.df2, own.p_value)
