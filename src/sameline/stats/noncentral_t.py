"""Student's t with a true difference behind it: the power of a pairwise test, by the quadrature of the other tails.

T' = (Z + ncp)/s exceeds c where, at known scale, Z exceeds w - ncp with w = c·s; two-sided, either tail counts
(N. L. Johnson and B. L. Welch, Applications of the non-central t-distribution, Biometrika 31, 1940, 362-389).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from scipy.special import log_ndtr

from sameline.stats.scale_mixture import STEP_IN_SIGMA, log_mixture, reach

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class _ShiftedTail:
    """P(Z > w - ncp), and with two sides P(Z < -w - ncp) as well, for the outer integral.

    Attributes:
        ncp: the noncentrality, at least 0.
        two_sided: whether the other tail counts.
    """

    ncp: float
    two_sided: bool

    def log_tail(self, w: Array) -> Array:
        """Return the tail's logarithm."""
        near = log_ndtr(self.ncp - w)
        return np.asarray(np.logaddexp(near, log_ndtr(-self.ncp - w)) if self.two_sided else near)

    def window(self, q: Array, df: Array) -> tuple[Array, Array, Array]:
        """Return nodes' ends and step: the tail is of order 1 up to the noncentrality and then falls like a normal."""
        left, right = reach(df)
        shift = -0.5 * np.log1p(q * q / df)
        edge = np.log((self.ncp + 2.0) / q)
        step = np.minimum(0.2 / max(self.ncp, 2.0), STEP_IN_SIGMA / np.sqrt(2.0 * df))
        return shift - left, np.minimum(0.0, np.maximum(shift, edge)) + right, step


def exceedance(critical: float, df: float, ncp: float, *, two_sided: bool) -> float:
    """Return P(|T'| > critical), or P(T' > critical) for one side.

    Args:
        critical: the critical value, above 0.
        df: degrees of freedom, 1 to infinity.
        ncp: the noncentrality, at least 0.
        two_sided: whether both tails count.
    """
    tail = _ShiftedTail(ncp, two_sided)
    point = np.array([critical])
    log_p = tail.log_tail(point) if math.isinf(df) else log_mixture(tail, point, np.array([df]))
    return min(1.0, float(np.exp(log_p[0])))


def noncentrality(critical: float, df: float, power: float, *, two_sided: bool) -> float:
    """Return the noncentrality at which the critical value is exceeded with probability `power`.

    Bisection, narrowed by false position (Illinois rule); 0 where chance alone suffices.

    Args:
        critical: the critical value, above 0.
        df: degrees of freedom, 1 to infinity.
        power: the wanted probability, strictly between 0 and 1.
        two_sided: whether both tails count.
    """

    def lack(ncp: float) -> float:
        return exceedance(critical, df, ncp, two_sided=two_sided) - power

    low, at_low = 0.0, lack(0.0)
    if at_low >= 0.0:
        return 0.0
    high = critical + 1.0
    while (at_high := lack(high)) < 0.0:
        low, at_low, high = high, at_high, 2.0 * high
    for _ in range(200):
        middle = high - at_high * (high - low) / (at_high - at_low)
        at_middle = lack(middle)
        if at_middle == 0.0 or high - low <= 1e-12 * high:
            break
        if at_middle < 0.0:
            low, at_low, at_high = middle, at_middle, 0.5 * at_high
        else:
            high, at_high, at_low = middle, at_middle, 0.5 * at_low
        if abs(at_middle) < 1e-14:
            break
    return middle
