"""What a pair procedure is asked and what it answers: columns of numbers, one entry a pair."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from sameline.stats.samples import Samples
from sameline.stats.values import Floats

Bools = NDArray[np.bool_]
Places = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Question:
    """Which pairs are asked, and how sure the answer must be.

    Args:
        samples: the checked samples.
        alpha: family error rate.
        first: number of group a of each pair, shape (m,).
        second: number of group b of each pair, shape (m,).
        control: number of the control group; None for all pairs.
        alternative: "two-sided", or with a control "less" or "greater" (mean of b against mean of the control).
    """

    samples: Samples
    alpha: float
    first: Places
    second: Places
    control: int | None
    alternative: str

    @property
    def m(self) -> int:
        """Number of pairs asked."""
        return self.first.size

    @property
    def difference(self) -> Floats:
        """Mean of b less mean of a, shape (m,)."""
        deviation = self.samples.deviation
        return deviation[self.second] - deviation[self.first]


@dataclass(frozen=True, slots=True)
class Columns:
    """The answer of one procedure, shape (m,) each; entries of pairs that are not estimable are NaN and masked.

    Args:
        difference: mean of b less mean of a, unit of the values.
        standard_error: of the difference; NaN where the procedure has none.
        df: degrees of freedom (inf: the normal).
        statistic: the procedure's own statistic.
        p_value: adjusted for the family.
        lower: lower end of the simultaneous interval, -inf where open; NaN where the procedure has none.
        upper: upper end, likewise.
        critical: critical value of each pair's statistic; NaN where the procedure has none.
        p_raw: unadjusted p-value; NaN where the procedure has none.
        estimable: False where a pair could not be computed.
        reasons: {entry: reason} for those.
        details: further columns of the procedure, by name.
    """

    difference: Floats
    standard_error: Floats
    df: Floats
    statistic: Floats
    p_value: Floats
    lower: Floats
    upper: Floats
    critical: Floats
    p_raw: Floats
    estimable: Bools
    reasons: dict[int, str] = field(default_factory=dict)
    details: dict[str, Floats] = field(default_factory=dict)


def interval(difference: Floats, half: Floats, differs: Bools, alternative: str = "two-sided") -> tuple[Floats, Floats]:
    """Difference minus and plus half, open on one side for a one-sided alternative, in step with the p-values.

    Interval and p-value come from the critical value and from the tail, which agree but for rounding; where rounding
    alone puts 0 on the wrong side of an end, the end is moved to the side the p-value says.
    """
    lower, upper = difference - half, difference + half
    least = np.abs(difference) * 2.0**-52
    if alternative != "less":
        lower = np.where(differs & (difference > 0), np.maximum(lower, least), lower)
        lower = np.where(~differs, np.minimum(lower, 0.0), lower)
    if alternative != "greater":
        upper = np.where(differs & (difference < 0), np.minimum(upper, -least), upper)
        upper = np.where(~differs, np.maximum(upper, 0.0), upper)
    if alternative == "less":
        lower = np.full_like(lower, -np.inf)
    if alternative == "greater":
        upper = np.full_like(upper, np.inf)
    return lower, upper
