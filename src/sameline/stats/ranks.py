"""Midranks and tie sums, for the procedures on ranks."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from sameline.errors import StatsError
from sameline.stats.samples import Samples
from sameline.stats.values import Floats


@dataclass(frozen=True, slots=True)
class Ranking:
    """Ranks of all values together.

    Args:
        ranks: midrank of each value, shape (n,).
        mean_ranks: mean rank of each group, shape (k,); each is one rounding from exact.
        ties: sum over sets of t tied values of t^3 - t.
    """

    ranks: Floats
    mean_ranks: Floats
    ties: float


def rank_all(samples: Samples) -> Ranking:
    """Ranks all values together, tied values sharing their mean rank.

    Raises:
        StatsError: all values are identical, so that ranks say nothing.
    """
    _, place, count = np.unique(samples.values.centred, return_inverse=True, return_counts=True)
    if count.size == 1:
        raise StatsError(
            "all values are identical, so their ranks say nothing",
            where="values",
            advice="record the values with more digits, or check that they are measurements and not copies",
        )
    ranks = (np.cumsum(count) - (count - 1) / 2.0)[place]
    # Midranks are whole or half numbers, so their sums are exact and cannot depend on the order.
    sums = np.bincount(samples.codes, weights=ranks, minlength=samples.k)
    tied = count.astype(float)
    return Ranking(ranks, sums / samples.n, float(np.sum(tied**3 - tied)))
