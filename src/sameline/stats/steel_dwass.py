"""Steel-Dwass: all pairs, each ranked alone, against the studentized range.

For groups a and b ranked together alone, U counts the pairs of values with b above a (ties half); z = (U - n_a n_b/2) /
sqrt[n_a n_b/12 (N + 1 - T/(N(N-1)))], N = n_a + n_b, T the sum of t^3 - t over ties; q = sqrt(2) |z| against the
studentized range of k means with infinite degrees of freedom. No continuity correction.

Assumes independent values and, under no difference, one distribution; says nothing about normality. The normal
approximation is for moderate sizes: with few values a group no values whatever can show a difference, and a caution
says so. Groups of one value are allowed. A pair whose values are all identical is not estimable. Refuses data in which
no pair is estimable.

The intervals invert the test: they hold every shift of one group against the other that the test does not reject, with
the tie correction of the values as they are. They are for a shift between distributions of one shape, which then is the
difference of means; they run from one difference of a value of b and a value of a to another, or are open where the
values are too few. `difference` remains the difference of means and may lie outside where a value lies far out; the
median of the differences between values (Hodges & Lehmann 1963) is in `columns.details["shift"]`, z in
`columns.details["z"]`.

References: Steel, R. G. D. (1960), Technometrics 2:197-207; Dwass, M. (1960), in Contributions to Probability and
Statistics, 198-202; Critchlow, D. E. & Fligner, M. A. (1991), Commun. Stat. Theory Methods 20:127-139 (the intervals);
Hodges, J. L. & Lehmann, E. L. (1963), Ann. Math. Statist. 34:598-611.
"""

from __future__ import annotations

import math

import numpy as np

from sameline.errors import StatsError
from sameline.stats.columns import Columns, Question
from sameline.stats.pair_ranks import tie_sums, wins
from sameline.stats.shifts import Shifts, shifts
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
    estimable = ties < total**3 - total
    if not estimable.any():
        raise StatsError(
            "all values are identical, so their ranks say nothing",
            where="values",
            advice="record the values with more digits, or check that they are measurements and not copies",
        )
    sd = np.full(question.m, np.nan)
    sd[estimable] = np.sqrt(product / 12.0 * (total + 1.0 - ties / (total * (total - 1.0))))[estimable]
    z = (above - product / 2.0) / sd
    q = math.sqrt(2.0) * np.abs(z)
    p = np.full(question.m, np.nan)
    p[estimable] = studentized_range_sf(q[estimable], samples.k, math.inf)
    critical = float(studentized_range_isf(question.alpha, samples.k, math.inf))
    found = shifts(question, np.where(estimable, critical / math.sqrt(2.0) * sd, 0.0))
    lower, upper = _in_step(found, z, p < question.alpha)
    lower[~estimable] = upper[~estimable] = np.nan
    none = np.full(question.m, np.nan)
    return Columns(
        difference=question.difference,
        standard_error=none,
        df=np.full(question.m, np.inf),
        statistic=q,
        p_value=p,
        lower=lower,
        upper=upper,
        critical=np.full(question.m, critical),
        p_raw=none,
        estimable=estimable,
        reasons={int(at): "all values of the two groups are identical" for at in np.flatnonzero(~estimable)},
        details={"z": z, "shift": found.median},
    )


def _in_step(found: Shifts, z: Floats, differs: np.ndarray) -> tuple[Floats, Floats]:
    """The intervals, an end at 0 itself moved to the side that the test says: tied values make such ends common."""
    least = float(np.finfo(float).tiny)
    lower = np.where(differs & (z > 0), np.maximum(found.lower, least), found.lower)
    upper = np.where(differs & (z < 0), np.minimum(found.upper, -least), found.upper)
    return np.where(differs, lower, np.minimum(lower, 0.0)), np.where(differs, upper, np.maximum(upper, 0.0))
