"""Welch's analysis of variance: do the means of several groups differ, each group with its own variance?

With w_i = n_i/v_i, W their sum, m the mean weighted by w: F = [sum w_i (mean_i - m)^2 / (k-1)] /
[1 + 2(k-2)/(k^2-1) L], L = sum (1 - w_i/W)^2/(n_i - 1), against F(k - 1, (k^2 - 1)/(3 L)).

Assumes independent values and normal scatter, not one variance. Not estimable where a group has one value or no spread:
its variance would weigh infinitely.

Reference: Welch, B. L. (1951), On the comparison of several mean values, Biometrika 38:330-336.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np

from sameline.errors import StatsError
from sameline.stats.distributions import f_sf
from sameline.stats.samples import Samples, gather


@dataclass(frozen=True, slots=True)
class WelchAnova:
    """Welch's F with its degrees of freedom and upper tail."""

    F: float
    df1: float
    df2: float
    p_value: float

    @property
    def statistic(self) -> float:
        """F, under the name it has in every result."""
        return self.F


def welch_anova(values: Iterable[Any], groups: Iterable[Any]) -> WelchAnova:
    """Welch's analysis of variance.

    Args:
        values: n values: numbers, decimal text or `Decimal`.
        groups: n group labels.

    Raises:
        StatsError: a value or label is refused, there are fewer than two groups, or a group has one value or no spread.
    """
    return of_samples(gather(values, groups))


def of_samples(samples: Samples) -> WelchAnova:
    """The same, for samples already gathered."""
    n, k = samples.n, samples.k
    if (n == 1).any() or (samples.ss == 0).any():
        single = (n == 1).any()
        where = n == 1 if single else samples.ss == 0
        raise StatsError(
            f"Welch's test is not estimable: {'one value only' if single else 'no spread'} in {samples.named(where)}",
            where="values",
            advice="leave the group out, or choose the analysis of variance with a common variance",
        )
    # Weights relative to the largest, and sums rounded once, so that neither scale nor order of groups moves a digit.
    weight = n / samples.variance
    weight /= weight.max()
    total = math.fsum(weight)
    unit = float(np.min(samples.variance / n))
    centre = math.fsum(weight * samples.deviation) / total
    between = math.fsum(weight * (samples.deviation - centre) ** 2) / unit / (k - 1)
    spread = math.fsum((1.0 - weight / total) ** 2 / (n - 1))
    ratio = between / (1.0 + 2.0 * (k - 2) / (k * k - 1.0) * spread)
    df2 = (k * k - 1.0) / (3.0 * spread)
    return WelchAnova(ratio, float(k - 1), df2, float(f_sf(ratio, k - 1, df2)))
