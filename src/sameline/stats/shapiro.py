"""Shapiro and Wilk's test of normal shape, on the residuals from the group means.

W = (sum a_i x_(i))^2 / sum (x_i - mean)^2, with Royston's approximations for the weights a and for the distribution of
W (algorithm AS R94; 3 to 5000 values). Residuals of small groups are not independent, so the p-value is a guide.

Refuses fewer than three or more than 5000 values, and residuals without spread.

References: Shapiro, S. S. & Wilk, M. B. (1965), Biometrika 52:591-611; Royston, P. (1995), Remark AS R94, Appl.
Statist. 44:547-551.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np
from scipy.special import ndtr, ndtri

from sameline.errors import StatsError
from sameline.stats.diagnostic_test import DiagnosticTest
from sameline.stats.exact_sums import group_sums
from sameline.stats.samples import Samples, gather
from sameline.stats.values import Floats

FEWEST, MOST = 3, 5000
_C1 = (0.0, 0.221157, -0.147981, -2.07119, 4.434685, -2.706056)
_C2 = (0.0, 0.042981, -0.293762, -1.752461, 5.682633, -3.582633)
_C3 = (0.544, -0.39978, 0.025054, -6.714e-4)
_C4 = (1.3822, -0.77857, 0.062767, -0.0020322)
_C5 = (-1.5861, -0.31082, -0.083751, 0.0038915)
_C6 = (-0.4803, -0.082676, 0.0030302)
_G = (-2.273, 0.459)


def shapiro_test(values: Iterable[Any], groups: Iterable[Any]) -> DiagnosticTest:
    """Shapiro and Wilk's test on the residuals from the group means.

    Args:
        values: n values: numbers, decimal text or `Decimal`.
        groups: n group labels; one label throughout tests the values themselves.

    Raises:
        StatsError: a value or label is refused, there are fewer than 3 or more than 5000 values, or no spread.
    """
    return of_samples(gather(values, groups, fewest=1))


def of_samples(samples: Samples) -> DiagnosticTest:
    """The same, for samples already gathered."""
    samples.require_spread()
    values = samples.values.centred
    residuals = values - group_sums(values, samples.codes, samples.k).mean[samples.codes]
    W = shapiro_w(residuals)
    return DiagnosticTest("shapiro-wilk", W, None, None, _p_value(W, residuals.size))


def shapiro_w(values: Floats) -> float:
    """W of some values, shape (n,), 3 <= n <= 5000, not all equal."""
    n = values.size
    if not FEWEST <= n <= MOST:
        raise StatsError(f"Shapiro and Wilk's test is for {FEWEST} to {MOST} values, and there are {n}", where="values")
    ordered = np.sort(values)
    # Scaled by the range, so that no square leaves the range of doubles.
    ordered = (ordered - ordered[n // 2]) / (ordered[-1] - ordered[0])
    half = _weights(n)
    numerator = math.fsum(half * (ordered[::-1][: half.size] - ordered[: half.size])) ** 2
    mean = math.fsum(ordered) / n
    return min(1.0, numerator / math.fsum((ordered - mean) ** 2))


def _weights(n: int) -> Floats:
    """The weights of the largest n // 2 order statistics, largest first; the others mirror them."""
    if n == 3:
        return np.array([math.sqrt(0.5)])
    m = -ndtri((np.arange(1, n // 2 + 1) - 0.375) / (n + 0.25))
    total = 2.0 * math.fsum(m**2)
    root, u = math.sqrt(total), 1.0 / math.sqrt(n)
    head = [m[0] / root + _polynomial(_C1, u)]
    if n > 5:
        head.append(m[1] / root + _polynomial(_C2, u))
    outer = np.asarray(head)
    kept = total - 2.0 * math.fsum(m[: outer.size] ** 2)
    scale = math.sqrt(kept / (1.0 - 2.0 * math.fsum(outer**2)))
    return np.concatenate([outer, m[outer.size :] / scale])


def _p_value(W: float, n: int) -> float:
    if n == 3:
        return max(0.0, 6.0 / math.pi * (math.asin(math.sqrt(W)) - math.asin(math.sqrt(0.75))))
    if W >= 1.0:
        return 1.0
    y, log_n = math.log1p(-W), math.log(n)
    if n <= 11:
        bound = _polynomial(_G, n)
        if y >= bound:
            return 1e-99  # the approximation's own end: W as small as it can be
        y = -math.log(bound - y)
        mean, sd = _polynomial(_C3, n), math.exp(_polynomial(_C4, n))
    else:
        mean, sd = _polynomial(_C5, log_n), math.exp(_polynomial(_C6, log_n))
    return float(ndtr(-(y - mean) / sd))


def _polynomial(coefficients: Sequence[float], x: float) -> float:
    """Value of the polynomial with these coefficients, lowest power first."""
    return math.fsum(c * x**power for power, c in enumerate(coefficients))
