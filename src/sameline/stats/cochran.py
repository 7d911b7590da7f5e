"""Cochran's C: is the largest of several variances an outlier?

C = largest variance / sum of variances, k groups of n values each; critical value 1 / (1 + (k-1)/F), F the upper
alpha/k point of F(n-1, (k-1)(n-1)); the p-value min(1, k P(F > C(k-1)/(1-C))) is Bonferroni's and exact for C > 1/2.
For unequal n the share of each group's sum of squares in the total takes the place of C ('t Lam's G, which is C for
equal n), each with its own critical value, and the group with the smallest p-value is named.

Assumes independent, normal values. It only flags. Not estimable with fewer than two groups of two or more values, nor
where fewer than two groups have a spread. Groups of one value show no variance and are left out.

References: Cochran, W. G. (1941), Ann. Eugen. 11:47-52; ISO 5725-2; 't Lam, R. U. E. (2010), Anal. Chim. Acta
659:68-84.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np

from sameline.errors import StatsError
from sameline.stats.distributions import Floats, f_isf, f_sf
from sameline.stats.samples import Samples, gather
from sameline.stats.verdicts import check_alpha


@dataclass(frozen=True, slots=True)
class Cochran:
    """What Cochran's test found.

    Args:
        k: number of groups with two values or more.
        C: share of the suspect group in the sum of variances (of sums of squares for unequal n).
        critical: its critical value.
        p_value: min(1, Bonferroni's bound).
        group: label of the suspect group.
        outlier: whether C is above the critical value.
    """

    k: int
    C: float
    critical: float
    p_value: float
    group: str
    outlier: bool


def cochran_test(values: Iterable[Any], groups: Iterable[Any], *, alpha: float = 0.05) -> Cochran:
    """Cochran's test for one outlying variance.

    Args:
        values: n values: numbers, decimal text or `Decimal`.
        groups: n group labels.
        alpha: error rate, between 0 and 1.

    Raises:
        StatsError: a value, label or option is refused, or fewer than two groups have a spread.
    """
    return of_samples(gather(values, groups), alpha=check_alpha(alpha))


def of_samples(samples: Samples, *, alpha: float) -> Cochran:
    """The same, for samples already gathered."""
    at = np.flatnonzero(samples.n > 1)
    if np.count_nonzero(samples.ss) < 2:
        raise StatsError(
            "Cochran's test is not estimable: fewer than two groups have a spread",
            where="values",
            advice="record the values with more digits, or look at the one group that scatters",
        )
    rest, ss = (samples.n[at] - 1).astype(float), samples.ss[at]
    share = ss / samples.sums.ss_within
    ratio = (ss / rest) / ((samples.sums.ss_within - ss) / (rest.sum() - rest))
    p = at.size * f_sf(ratio, rest, rest.sum() - rest)
    worst = int(np.lexsort((-share, p))[0])
    critical = float(critical_share(alpha, at.size, rest)[worst])
    C = float(share[worst])
    return Cochran(at.size, C, critical, min(1.0, float(p[worst])), samples.labels[at[worst]], critical < C)


def critical_share(alpha: float, k: int, rest: Floats) -> Floats:
    """Critical share of each of k groups with these degrees of freedom, shape (k,)."""
    others = rest.sum() - rest
    return np.asarray(1.0 / (1.0 + others / rest / f_isf(alpha / k, rest, others)))


def cochran_critical(alpha: float, k: int, n: int) -> float:
    """Critical value of C for k >= 2 groups of n >= 2 values each.

    Raises:
        StatsError: alpha is outside (0, 1), or there are fewer than two groups or two values.
    """
    alpha = check_alpha(alpha)
    if k < 2 or n < 2:
        raise StatsError(f"{k} groups of {n} values have no critical value", where="k", advice="give at least 2 of 2")
    return float(critical_share(alpha, k, np.full(k, n - 1.0))[0])
