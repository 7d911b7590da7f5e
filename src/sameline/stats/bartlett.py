"""Bartlett's test of equal variances.

K^2 = sum (n_i - 1) log(v / v_i) / C, v the pooled variance, C = 1 + [sum 1/(n_i - 1) - 1/(N - k)] / [3(k - 1)], against
chi-squared with k - 1 degrees of freedom.

Assumes independent, normal values: it is as much a test of normality as of spread. Not estimable where a group has one
value or no spread (the logarithm of its variance has no value; a p-value of 0 would be an artefact).

Reference: Bartlett, M. S. (1937), Proc. R. Soc. Lond. A 160:268-282.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from typing import Any

import numpy as np

from sameline.errors import StatsError
from sameline.stats.diagnostic_test import DiagnosticTest
from sameline.stats.distributions import chi2_sf
from sameline.stats.samples import Samples, gather


def bartlett_test(values: Iterable[Any], groups: Iterable[Any]) -> DiagnosticTest:
    """Bartlett's test.

    Args:
        values: n values: numbers, decimal text or `Decimal`.
        groups: n group labels.

    Raises:
        StatsError: a value or label is refused, or a group has one value or no spread.
    """
    return of_samples(gather(values, groups))


def of_samples(samples: Samples) -> DiagnosticTest:
    """The same, for samples already gathered."""
    n, k = samples.n, samples.k
    if (n == 1).any() or (samples.ss == 0).any():
        single = (n == 1).any()
        what, where = ("one value only", n == 1) if single else ("no spread", samples.ss == 0)
        raise StatsError(
            f"Bartlett's test is not estimable: {what} in {samples.named(where)}",
            where="values",
        )
    rest = (n - 1).astype(float)
    apart = math.fsum(rest * np.log(samples.ms_within / samples.variance))
    correction = 1.0 + (math.fsum(1.0 / rest) - 1.0 / samples.df_within) / (3.0 * (k - 1))
    K2 = max(0.0, apart / correction)
    return DiagnosticTest("bartlett", K2, float(k - 1), None, float(chi2_sf(K2, k - 1)))
