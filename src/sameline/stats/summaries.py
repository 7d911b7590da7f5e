"""What is said of each group beside the comparison: size, mean, spread, and an interval for its mean."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from sameline.stats.distributions import t_isf
from sameline.stats.samples import Samples


@dataclass(frozen=True, slots=True)
class GroupSummary:
    """One group.

    Args:
        label: its label.
        n: number of values.
        mean: their mean.
        sd: their standard deviation (n - 1); None for one value.
        lower: lower end of the interval for the mean, for this group alone (not simultaneous); None where none is had.
        upper: its upper end.
    """

    label: str
    n: int
    mean: float
    sd: float | None
    lower: float | None
    upper: float | None


def summaries(samples: Samples, alpha: float, *, pooled: bool) -> tuple[GroupSummary, ...]:
    """Summaries of all groups, in order of first appearance.

    Args:
        samples: the checked samples.
        alpha: 1 - the confidence of each interval.
        pooled: whether the intervals use the mean square within all groups (procedures that assume one variance) or
            each group's own spread.
    """
    n = samples.n
    if pooled and samples.df_within > 0:
        half = t_isf(alpha / 2, samples.df_within) * np.sqrt(samples.ms_within / n)
        has = np.ones(n.shape, bool)
    else:
        half = t_isf(alpha / 2, np.maximum(n - 1, 1)) * np.sqrt(samples.variance / n)
        has = (n > 1) & (samples.ss > 0)
    mean, sd = samples.mean, np.sqrt(samples.variance)
    lower, upper = mean - half, mean + half
    return tuple(
        GroupSummary(
            label,
            int(n[at]),
            float(mean[at]),
            float(sd[at]) if n[at] > 1 else None,
            float(lower[at]) if has[at] else None,
            float(upper[at]) if has[at] else None,
        )
        for at, label in enumerate(samples.labels)
    )
