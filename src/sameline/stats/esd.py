"""Generalized extreme Studentized deviate: which of some values are outliers, up to a number fixed beforehand?

For i = 1 .. r: R_i is the largest |value - mean| / sd of the values left; the value is set aside and the rest looked at
again. lambda_i = (n - i) t / sqrt[(n - i - 1 + t^2)(n - i + 1)], t the upper alpha / (2 (n - i + 1)) point of
Student's t on n - i - 1 degrees of freedom. The number of outliers is the largest i with R_i > lambda_i, which is what
keeps several outliers from masking each other.

Assumes the other values are independent and normal. The error rate is accurate from 25 values on and fair from 15
(NIST/SEMATECH e-Handbook, 1.3.5.17.3); below, a caution. It only flags. Refuses an r that leaves fewer than three
values, and values of which those left are all identical but for one at most.

Reference: Rosner, B. (1983), Percentage points for a generalized ESD many-outlier procedure, Technometrics 25:165-172.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np

from sameline.errors import StatsError
from sameline.stats.cautions import Caution
from sameline.stats.grubbs import critical_deviation
from sameline.stats.single_values import most_extreme, read_single, standardized
from sameline.stats.verdicts import check_alpha

FAIR_FROM = 15


@dataclass(frozen=True, slots=True)
class Esd:
    """What the procedure found.

    Args:
        n: number of values.
        R: statistic of each step.
        critical: its critical value, lambda.
        index: position of the value set aside at each step, from 0.
        value: the value set aside at each step.
        outliers: how many of them, from the first, are outliers.
        cautions: what to know about the error rate.
    """

    n: int
    R: tuple[float, ...]
    critical: tuple[float, ...]
    index: tuple[int, ...]
    value: tuple[float, ...]
    outliers: int
    cautions: tuple[Caution, ...]

    @property
    def outlier_index(self) -> tuple[int, ...]:
        """Positions of the outliers, most extreme first."""
        return self.index[: self.outliers]


def esd_test(values: Iterable[Any], most: int, *, alpha: float = 0.05) -> Esd:
    """The generalized extreme Studentized deviate procedure on one set of values.

    Args:
        values: n values: numbers, decimal text or `Decimal`.
        most: the largest number of outliers to look for, 1 to n - 2, fixed before looking.
        alpha: error rate, between 0 and 1.

    Raises:
        StatsError: a value or option is refused, or the values left at some step have no scatter to judge by.
    """
    alpha = check_alpha(alpha)
    read = read_single(values, fewest=3, test="the extreme Studentized deviate")
    n = read.raw.size
    if isinstance(most, bool) or int(most) != most or not 1 <= most <= n - 2:
        raise StatsError(
            f"{most!r} outliers among {n} values cannot be looked for",
            where="most",
            advice=f"give a whole number from 1 to {n - 2}",
        )
    left = np.arange(n)
    R, critical, index = [], [], []
    for _ in range(int(most)):
        score = np.abs(standardized(read.centred[left], "the extreme Studentized deviate"))
        at = most_extreme(read.centred[left], score)
        R.append(float(score[at]))
        critical.append(critical_deviation(alpha / (2 * left.size), left.size))
        index.append(int(left[at]))
        left = np.delete(left, at)
    beyond = [step for step in range(int(most)) if R[step] > critical[step]]
    few = Caution("few-values", f"{n} values: the error rate of this procedure is fair from {FAIR_FROM} values on")
    return Esd(
        n,
        tuple(R),
        tuple(critical),
        tuple(index),
        tuple(read.raw[index].tolist()),
        beyond[-1] + 1 if beyond else 0,
        (few,) if n < FAIR_FROM else (),
    )
