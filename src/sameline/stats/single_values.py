"""One set of values, for the outlier tests: checked, centred, with mean and standard deviation."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np

from sameline.errors import StatsError
from sameline.stats.exact_sums import group_sums
from sameline.stats.values import Floats, read_values


@dataclass(frozen=True, slots=True)
class SingleValues:
    """The values as given and about their origin, shape (n,)."""

    raw: Floats
    centred: Floats


def read_single(values: Iterable[Any], *, fewest: int, test: str) -> SingleValues:
    """Checks one set of values.

    Raises:
        StatsError: a value is refused or there are fewer than `fewest`.
    """
    read = read_values(values)
    if read.raw.size < fewest:
        raise StatsError(f"{test} needs at least {fewest} values, and there are {read.raw.size}", where="values")
    return SingleValues(read.raw, read.centred)


def standardized(centred: Floats, test: str) -> Floats:
    """(value - mean) / sd of each value, shape (n,).

    Raises:
        StatsError: the values are all identical, or all but one are: then nothing shows how they scatter.
    """
    values, times = np.unique(centred, return_counts=True)
    if values.size == 1 or (values.size == 2 and times.min() == 1):
        raise StatsError(
            f"{test} is not estimable: all values{' but one' if values.size == 2 else ''} are identical",
            where="values",
            advice="record the values with more digits",
        )
    sums = group_sums(centred, np.zeros(centred.size, np.int64), 1)
    return np.asarray((centred - sums.mean[0]) / math.sqrt(sums.ss[0] / (centred.size - 1)))


def most_extreme(centred: Floats, score: Floats) -> int:
    """Position of the largest score; of equally extreme values the largest, and of equal values the first."""
    top = score.max()
    tied = np.flatnonzero(score >= top * (1.0 - 1e-14))
    return int(tied[np.argmax(centred[tied])])
