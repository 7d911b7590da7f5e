"""Kruskal-Wallis: do several groups differ in location, judged by ranks?

H = [12/(N(N+1)) sum n_i (R_i - (N+1)/2)^2] / [1 - T/(N^3 - N)], R_i the mean ranks, T the sum of t^3 - t over ties,
against chi-squared with k - 1 degrees of freedom (an approximation that wants about five values a group).

Assumes independent values and distributions of one shape. Groups of one value are allowed. Refuses identical values.

Reference: Kruskal, W. H. & Wallis, W. A. (1952), J. Am. Stat. Assoc. 47:583-621.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

from sameline.stats.distributions import chi2_sf
from sameline.stats.ranks import rank_all
from sameline.stats.samples import Samples, gather


@dataclass(frozen=True, slots=True)
class KruskalWallis:
    """H corrected for ties, its degrees of freedom and upper tail; mean rank of each label."""

    H: float
    df: int
    p_value: float
    labels: tuple[str, ...]
    mean_ranks: tuple[float, ...]

    @property
    def statistic(self) -> float:
        """H, under the name it has in every result."""
        return self.H


def kruskal_wallis(values: Iterable[Any], groups: Iterable[Any]) -> KruskalWallis:
    """The Kruskal-Wallis test.

    Args:
        values: n values: numbers, decimal text or `Decimal`.
        groups: n group labels.

    Raises:
        StatsError: a value or label is refused, there are fewer than two groups, or all values are identical.
    """
    return of_samples(gather(values, groups))


def of_samples(samples: Samples) -> KruskalWallis:
    """The same, for samples already gathered."""
    ranking, total = rank_all(samples), samples.total
    between = math.fsum(samples.n * (ranking.mean_ranks - (total + 1) / 2.0) ** 2)
    cube = float(total) ** 3 - total
    H = 12.0 * between / (total * (total + 1.0)) / (1.0 - ranking.ties / cube)
    df = samples.k - 1
    return KruskalWallis(H, df, float(chi2_sf(H, df)), samples.labels, tuple(ranking.mean_ranks.tolist()))
