"""Steel-Dwass: all pairs, each ranked alone, against the studentized range.

For groups a and b ranked together alone, U counts the pairs of values with b above a (ties half); z = (U - n_a n_b/2) /
sqrt[n_a n_b/12 (N + 1 - T/(N(N-1)))], N = n_a + n_b, T the sum of t^3 - t over ties; q = sqrt(2) |z| against the
studentized range of k means with infinite degrees of freedom. No continuity correction.

Assumes independent values and, under no difference, one distribution; says nothing about normality. The normal
approximation is for moderate sizes: with few values a group no values whatever can show a difference, and a caution
says so. `difference` remains the difference of means in the values' unit, for the eye; z is in `columns.details["z"]`.
There is no interval for the difference of means, so no margin can be judged (the interval that inverts this test is
one for a shift between two distributions of the same shape, another quantity). Groups of one value are allowed. A pair
whose values are all identical is not estimable. Refuses data in which no pair is estimable.

References: Steel, R. G. D. (1960), Technometrics 2:197-207; Dwass, M. (1960), in Contributions to Probability and
Statistics, 198-202; Critchlow, D. E. & Fligner, M. A. (1991), Commun. Stat. Theory Methods 20:127-139.
"""

from __future__ import annotations

import math

import numpy as np

from sameline.errors import StatsError
from sameline.stats.columns import Columns, Question
from sameline.stats.samples import Samples
from sameline.stats.studentized_range import studentized_range_isf, studentized_range_sf
from sameline.stats.values import Floats


def steel_dwass(question: Question) -> Columns:
    """All pairs by Steel-Dwass; `statistic` is the studentized range q.

    Raises:
        StatsError: all values are identical.
    """
    samples, a, b = question.samples, question.first, question.second
    n = samples.n.astype(float)
    places = np.unique(samples.values.centred, return_inverse=True)[1]
    above, ties = wins(samples, places)[b, a], tie_sums(samples, places)[a, b]
    product, total = n[a] * n[b], n[a] + n[b]
    variance = product / 12.0 * (total + 1.0 - ties / (total * (total - 1.0)))
    estimable = ties < total**3 - total
    if not estimable.any():
        raise StatsError(
            "all values are identical, so their ranks say nothing",
            where="values",
            advice="record the values with more digits, or check that they are measurements and not copies",
        )
    z = np.full(question.m, np.nan)
    z[estimable] = (above - product / 2.0)[estimable] / np.sqrt(variance[estimable])
    q = math.sqrt(2.0) * np.abs(z)
    p = np.full(question.m, np.nan)
    p[estimable] = studentized_range_sf(q[estimable], samples.k, math.inf)
    critical = float(studentized_range_isf(question.alpha, samples.k, math.inf))
    none = np.full(question.m, np.nan)
    return Columns(
        difference=question.difference,
        standard_error=none,
        df=np.full(question.m, np.inf),
        statistic=q,
        p_value=p,
        lower=none,
        upper=none,
        critical=np.full(question.m, critical),
        p_raw=none,
        estimable=estimable,
        reasons={int(at): "all values of the two groups are identical" for at in np.flatnonzero(~estimable)},
        details={"z": z},
    )


def wins(samples: Samples, places: np.ndarray) -> Floats:
    """For all groups i, j the number of pairs of values with i above j, ties half; shape (k, k), exact."""
    order = np.argsort(samples.codes, kind="stable")
    starts = np.concatenate([[0], np.cumsum(samples.n)])
    own = [np.sort(places[order[starts[j] : starts[j + 1]]]) for j in range(samples.k)]
    table = np.empty((samples.k, samples.k))
    for j, sorted_ in enumerate(own):
        twice = np.searchsorted(sorted_, places, "left") + np.searchsorted(sorted_, places, "right")
        table[:, j] = np.bincount(samples.codes, weights=twice, minlength=samples.k) / 2.0
    return table


def tie_sums(samples: Samples, places: np.ndarray) -> Floats:
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
