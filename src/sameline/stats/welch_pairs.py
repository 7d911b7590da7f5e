"""Each pair with its own variances: the part that Games-Howell and Welch-Holm share.

For groups a and b with variances v_a, v_b: se = sqrt(v_a/n_a + v_b/n_b) and Welch-Satterthwaite degrees of freedom
(v_a/n_a + v_b/n_b)^2 / ((v_a/n_a)^2/(n_a - 1) + (v_b/n_b)^2/(n_b - 1)).

A pair with a group of one value is not estimable (that group shows no variance of its own), nor is a pair neither of
whose groups has a spread. A pair in which one group has a spread is.

References: Welch, B. L. (1938), Biometrika 29:350-362; Satterthwaite, F. E. (1946), Biometrics Bull. 2:110-114.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from sameline.errors import StatsError
from sameline.stats.columns import Bools, Question
from sameline.stats.values import Floats


@dataclass(frozen=True, slots=True)
class WelchPairs:
    """Columns of shape (m,); standard error and df are NaN where a pair is not estimable, with its reason."""

    difference: Floats
    standard_error: Floats
    df: Floats
    estimable: Bools
    reasons: dict[int, str]


def welch_pairs(question: Question) -> WelchPairs:
    """Standard errors and degrees of freedom of the pairs asked.

    Raises:
        StatsError: no pair is estimable.
    """
    samples, a, b = question.samples, question.first, question.second
    n = samples.n
    share = samples.variance / n
    single, flat = n == 1, (n > 1) & (samples.ss == 0)
    lonely = single[a] | single[b]
    estimable = ~lonely & ~(flat[a] & flat[b])
    if not estimable.any():
        raise StatsError(
            "no pair can be compared by its own variances: "
            + (f"one value only in {samples.named(single)}" if lonely.any() else "no group has a spread"),
            where="values",
            advice="give each group a second value, recorded with enough digits to differ",
        )
    sum_ = np.where(estimable, share[a] + share[b], np.nan)
    # Shares of the sum, so that no square leaves the range of doubles.
    weight_a, weight_b = share[a] / sum_, share[b] / sum_
    rest = np.maximum(n - 1, 1)
    # Never below the smaller group's own, which rounding could make it.
    df = np.maximum(1.0 / (weight_a**2 / rest[a] + weight_b**2 / rest[b]), np.minimum(rest[a], rest[b]))
    reasons = {int(at): _reason(question, int(at), single) for at in np.flatnonzero(~estimable)}
    return WelchPairs(question.difference, np.sqrt(sum_), df, estimable, reasons)


def _reason(question: Question, at: int, single: Bools) -> str:
    labels, pair = question.samples.labels, (question.first[at], question.second[at])
    lonely = [repr(labels[group]) for group in pair if single[group]]
    if lonely:
        return f"{' and '.join(lonely)} {'has' if len(lonely) == 1 else 'have'} one value, which shows no variance"
    return "neither group has a spread"
