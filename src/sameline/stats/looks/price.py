"""The price of looking: how many more units honesty costs at a margin."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from sameline.errors import StatsError
from sameline.stats.looks.amendments import RESERVE
from sameline.stats.looks.evidence import critical_t
from sameline.stats.looks.open_looks import PHI
from sameline.stats.studentized_range import studentized_range_isf

if TYPE_CHECKING:
    from collections.abc import Callable


@dataclass(frozen=True, slots=True)
class Price:
    """Units a group until every interval is shorter than the margin to either side.

    Attributes:
        single: when the data are looked at once.
        always: when they are looked at without end.
        extra: always - single.
    """

    single: int
    always: int
    extra: int


def price_of_looking(
    groups: int, margin: float, sd: float, *, alpha: float = 0.05, phi: float = PHI, reserve: float = RESERVE
) -> Price:
    """Units a group that an interval of half length `margin` takes, looked at once and without end.

    At that many units a true difference of twice the margin is seen, and groups that are equal are often found
    equivalent. Equal numbers in all groups, one spread.

    Args:
        groups: number of groups, at least 2.
        margin: half length wanted, in the characteristic's unit.
        sd: standard deviation of one unit, same unit.
        alpha: family error rate.
        phi: tuning of the open procedure.
        reserve: share of alpha it keeps for amended data.

    Raises:
        StatsError: fewer than two groups, a margin or spread not above zero, or more than 10 million units needed.
    """
    if groups < 2:
        raise StatsError("a comparison needs at least two groups", where="groups")
    if not (margin > 0 and sd > 0 and math.isfinite(margin) and math.isfinite(sd)):
        raise StatsError("margin and spread must be above zero", where="margin")
    rate = alpha * (1.0 - reserve) * 2.0 / (groups * (groups - 1))

    def once(n: int) -> float:
        q = float(studentized_range_isf(alpha, groups, groups * (n - 1.0)))
        return q / math.sqrt(2.0) * sd * math.sqrt(2.0 / n)

    def always(n: int) -> float:
        t = float(critical_t(groups * (n - 1.0), n / 2.0, phi, rate))
        return t * sd * math.sqrt(2.0 / n) if np.isfinite(t) else math.inf

    single, endless = (_least(width, margin) for width in (once, always))
    return Price(single, endless, endless - single)


def _least(width: Callable[[int], float], margin: float) -> int:
    """The least n >= 2 with width(n) <= margin, by doubling and halving."""
    high = 2
    while width(high) > margin:
        high *= 2
        if high > 10_000_000:
            raise StatsError("more than 10 million units a group would be needed", where="margin")
    low = high // 2
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (low, middle) if width(middle) <= margin else (middle, high)
    return high
