"""Levene's test of equal spread, on deviations from the medians (Brown and Forsythe) or from the means.

One-way analysis of variance of z = |value - centre of its group|. On medians it keeps its error rate under skewed and
long-tailed scatter; on means it is sharper under normal scatter.

Assumes independent values. Refuses where the deviations themselves have no spread within groups, and on medians where
no group has more than two values: the two deviations of such a group are equal by construction, and the p-value (1e-43
is common) would be an artefact of rounding.

References: Levene, H. (1960), in Contributions to Probability and Statistics, 278-292; Brown, M. B. & Forsythe, A. B.
(1974), J. Am. Stat. Assoc. 69:364-367.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np

from sameline.errors import StatsError
from sameline.stats.diagnostic_test import DiagnosticTest
from sameline.stats.distributions import f_sf
from sameline.stats.exact_sums import group_sums
from sameline.stats.samples import Samples, gather
from sameline.stats.values import Floats

CENTRES = ("median", "mean")


def levene_test(values: Iterable[Any], groups: Iterable[Any], *, center: str = "median") -> DiagnosticTest:
    """Levene's test.

    Args:
        values: n values: numbers, decimal text or `Decimal`.
        groups: n group labels.
        center: "median" or "mean".

    Raises:
        StatsError: a value, label or centre is refused, or the deviations have no spread within groups.
    """
    return of_samples(gather(values, groups), center=center)


def of_samples(samples: Samples, *, center: str = "median") -> DiagnosticTest:
    """The same, for samples already gathered."""
    if center not in CENTRES:
        raise StatsError(f"there is no centre {center!r}", where="center", advice="choose median or mean")
    samples.require_spread()
    if center == "median" and samples.n.max() <= 2:
        raise StatsError(
            "Levene's test on medians is not estimable with at most two values a group: "
            "their two deviations are equal whatever the spread",
            where="values",
            advice="use it from three values a group on",
        )
    values = samples.values.centred
    centre = group_medians(samples) if center == "median" else group_sums(values, samples.codes, samples.k).mean
    deviation = np.abs(values - centre[samples.codes])
    sums = group_sums(deviation, samples.codes, samples.k)
    noise = samples.total * (8 * np.finfo(float).eps * float(np.abs(values).max())) ** 2
    if sums.ss_within <= noise:
        raise StatsError(
            f"Levene's test on {center}s is not estimable: within each group all deviations are equal",
            where="values",
        )
    df1, df2 = samples.k - 1, samples.df_within
    ratio = (sums.ss_between / df1) / (sums.ss_within / df2)
    return DiagnosticTest(f"levene-{center}", ratio, float(df1), float(df2), float(f_sf(ratio, df1, df2)))


def group_medians(samples: Samples) -> Floats:
    """The median of each group's centred values, shape (k,)."""
    ordered = samples.values.centred[np.lexsort((samples.values.centred, samples.codes))]
    starts = np.concatenate([[0], np.cumsum(samples.n)[:-1]])
    low = ordered[starts + (samples.n - 1) // 2]
    high = ordered[starts + samples.n // 2]
    return np.asarray(low + (high - low) / 2.0)
