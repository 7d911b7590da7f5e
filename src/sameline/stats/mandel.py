"""Mandel's h and k: which groups (laboratories, runs) lie or scatter unlike the others?

For p groups of n values: h_i = (mean_i - mean of means) / sd of the means, against
(p - 1) t / sqrt(p (t^2 + p - 2)), t the upper alpha/2 point of Student's t on p - 2 degrees of freedom;
k_i = s_i / sqrt(mean of variances), against sqrt(p / (1 + (p - 1)/F)), F the upper alpha point of F(n - 1,
(p - 1)(n - 1)). Each group is judged alone: with many groups some lie beyond by chance.

Assumes independent, normal values and groups of equal size. It only flags. Refuses fewer than three groups, groups of
unequal size or of one value, means all identical, and groups none of which has a spread.

References: ISO 5725-2, 7.3.1; ASTM E691; Mandel, J. (1991), Evaluation and Control of Measurements, Marcel Dekker.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np

from sameline.errors import StatsError
from sameline.stats.distributions import f_isf, t_isf
from sameline.stats.samples import Samples, gather
from sameline.stats.verdicts import check_alpha


@dataclass(frozen=True, slots=True)
class Mandel:
    """Mandel's statistics.

    Args:
        labels: the p groups, in order of first appearance.
        n: values in each.
        h: of each group.
        k: of each group.
        h_critical: bound of the absolute value of h.
        k_critical: bound of k.
        h_beyond: labels of the groups whose h is beyond.
        k_beyond: labels of the groups whose k is beyond.
    """

    labels: tuple[str, ...]
    n: int
    h: tuple[float, ...]
    k: tuple[float, ...]
    h_critical: float
    k_critical: float
    h_beyond: tuple[str, ...]
    k_beyond: tuple[str, ...]


def mandel_statistics(values: Iterable[Any], groups: Iterable[Any], *, alpha: float = 0.05) -> Mandel:
    """Mandel's h and k of every group.

    Args:
        values: values: numbers, decimal text or `Decimal`.
        groups: a label for each.
        alpha: error rate of each bound, between 0 and 1.

    Raises:
        StatsError: a value, label or option is refused, or the groups do not allow it (see the module).
    """
    return of_samples(gather(values, groups, fewest=3), alpha=check_alpha(alpha))


def of_samples(samples: Samples, *, alpha: float) -> Mandel:
    """The same, for samples already gathered."""
    _check(samples)
    p, n = samples.k, int(samples.n[0])
    means = samples.deviation
    between = math.fsum((means - math.fsum(means) / p) ** 2) / (p - 1)
    h = (means - math.fsum(means) / p) / math.sqrt(between)
    k = np.sqrt(samples.variance / (math.fsum(samples.variance) / p))
    h_critical, k_critical = mandel_critical(alpha, p, n)
    return Mandel(
        samples.labels,
        n,
        tuple(h.tolist()),
        tuple(k.tolist()),
        h_critical,
        k_critical,
        tuple(label for label, one in zip(samples.labels, h, strict=True) if abs(one) > h_critical),
        tuple(label for label, one in zip(samples.labels, k, strict=True) if one > k_critical),
    )


def mandel_critical(alpha: float, p: int, n: int) -> tuple[float, float]:
    """The bounds of |h| and of k for p >= 3 groups of n >= 2 values."""
    t = float(t_isf(alpha / 2, p - 2))
    F = float(f_isf(alpha, n - 1, (p - 1) * (n - 1)))
    return (p - 1) * t / math.sqrt(p * (t * t + p - 2)), math.sqrt(p / (1.0 + (p - 1) / F))


def _check(samples: Samples) -> None:
    if samples.k < 3:
        raise StatsError("Mandel's h and k need at least three groups", where="groups", advice="give more groups")
    if np.unique(samples.n).size > 1 or samples.n[0] < 2:
        raise StatsError(
            "Mandel's h and k need groups of equal size, two values or more",
            where="groups",
            advice="leave out groups of another size",
        )
    samples.require_spread()
    if samples.sums.ss_between == 0.0:
        raise StatsError("Mandel's h is not estimable: all group means are identical", where="values")
