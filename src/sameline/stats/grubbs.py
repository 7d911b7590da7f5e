"""Grubbs' test: is the most extreme of some values an outlier?

G = max |value - mean| / sd (two-sided), or with the largest or the smallest value alone. With t the upper
alpha/(s n) point of Student's t on n - 2 degrees of freedom (s = 2 two-sided, else 1), the critical value is
(n - 1)/sqrt(n) sqrt(t^2 / (n - 2 + t^2)); the p-value min(1, s n P(T > t_G)) is Bonferroni's and exact for a large G.

Assumes the other values are independent and normal, and at most one outlier (for several see `esd`). It only flags: a
value is excluded by a person with an assignable cause. Refuses fewer than three values, and values all identical but
for one at most.

Reference: Grubbs, F. E. (1969), Procedures for detecting outlying observations in samples, Technometrics 11:1-21;
NIST/SEMATECH e-Handbook, 1.3.5.17.1.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np

from sameline.errors import StatsError
from sameline.stats.distributions import t_isf, t_sf
from sameline.stats.single_values import most_extreme, read_single, standardized
from sameline.stats.verdicts import check_alpha

SIDES = ("two-sided", "greater", "less")


@dataclass(frozen=True, slots=True)
class Grubbs:
    """What Grubbs' test found.

    Args:
        n: number of values.
        alternative: "two-sided", "greater" (the largest value) or "less" (the smallest).
        G: the statistic.
        index: position of the suspect, from 0.
        value: the suspect.
        critical: critical value of G.
        p_value: min(1, Bonferroni's bound).
        outlier: whether G is above the critical value.
    """

    n: int
    alternative: str
    G: float
    index: int
    value: float
    critical: float
    p_value: float
    outlier: bool


def grubbs_test(values: Iterable[Any], *, alpha: float = 0.05, alternative: str = "two-sided") -> Grubbs:
    """Grubbs' test on one set of values.

    Args:
        values: n >= 3 values: numbers, decimal text or `Decimal`.
        alpha: error rate, between 0 and 1.
        alternative: "two-sided", "greater" for the largest value, "less" for the smallest.

    Raises:
        StatsError: a value or option is refused, there are too few values, or all but one at most are identical.
    """
    alpha = check_alpha(alpha)
    if alternative not in SIDES:
        raise StatsError(
            f"there is no alternative {alternative!r}", where="alternative", advice="choose one of " + ", ".join(SIDES)
        )
    read = read_single(values, fewest=3, test="Grubbs' test")
    z = standardized(read.centred, "Grubbs' test")
    score = {"two-sided": np.abs(z), "greater": z, "less": -z}[alternative]
    at = most_extreme(read.centred, score)
    n, sides = z.size, 2 if alternative == "two-sided" else 1
    G = float(score[at])
    critical = critical_deviation(alpha / (sides * n), n)
    p = min(1.0, sides * n * deviation_tail(G, n))
    return Grubbs(n, alternative, G, at, float(read.raw[at]), critical, p, critical < G)


def critical_deviation(tail: float, n: int) -> float:
    """The largest deviation in standard deviations that one given value of n exceeds with probability `tail`."""
    t = float(t_isf(tail, n - 2))
    return (n - 1) / math.sqrt(n) * math.sqrt(t * t / (n - 2 + t * t))


def deviation_tail(deviation: float, n: int) -> float:
    """The probability that one given value of n lies more than so many standard deviations above the mean."""
    # All but one value identical would make the room 0; rounding must not make it less.
    room = max((n - 1) ** 2 - n * deviation**2, (n - 1) ** 2 * 2.0**-52)
    t = math.copysign(math.sqrt(n * (n - 2) * deviation**2 / room), deviation)
    return float(t_sf(t, n - 2))
