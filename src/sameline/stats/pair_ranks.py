"""Ranks within each pair of groups alone, for all pairs at once and exact."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from sameline.stats.samples import Samples
from sameline.stats.values import Floats

Places = NDArray[np.intp]


def wins(samples: Samples, places: Places) -> Floats:
    """For all groups i, j the number of pairs of values with i above j, ties half; shape (k, k), exact.

    `places` is the place of each value among the distinct values, shape (n,).
    """
    order = np.argsort(samples.codes, kind="stable")
    starts = np.concatenate([[0], np.cumsum(samples.n)])
    own = [np.sort(places[order[starts[j] : starts[j + 1]]]) for j in range(samples.k)]
    table = np.empty((samples.k, samples.k))
    for j, sorted_ in enumerate(own):
        twice = np.searchsorted(sorted_, places, "left") + np.searchsorted(sorted_, places, "right")
        table[:, j] = np.bincount(samples.codes, weights=twice, minlength=samples.k) / 2.0
    return table


def tie_sums(samples: Samples, places: Places) -> Floats:
    """For all groups i, j the sum of t^3 - t over sets of t tied values in i and j together; shape (k, k), exact.

    With c_i the times a value occurs in i, (c_i + c_j)^3 = c_i^3 + 3 c_i^2 c_j + 3 c_i c_j^2 + c_j^3; only values that
    occur in several groups have the mixed terms.
    """
    cells, times = np.unique(samples.codes.astype(np.int64) * samples.total + places, return_counts=True)
    group, value, c = cells // samples.total, cells % samples.total, times.astype(float)
    alone = np.bincount(group, weights=c**3 - c, minlength=samples.k)
    shared = np.flatnonzero(np.bincount(value) > 1)
    table = np.zeros((samples.k, shared.size))
    keep = np.isin(value, shared)
    table[group[keep], np.searchsorted(shared, value[keep])] = c[keep]
    mixed = table**2 @ table.T
    return alone[:, None] + alone[None, :] + 3.0 * (mixed + mixed.T)
