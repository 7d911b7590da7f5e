"""The studentized range's lower tail, where 1 minus the upper tail would have no digit left.

The range of k standard normal values is at most w with probability

    C(w) = k ∫ φ(z) [Φ(z+w) - Φ(z)]^(k-1) dz,

which goes to zero like w^(k-1). log C over log w is tabulated once for each k; `scale_mixture` does the integral over
the estimated scale.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
from scipy.special import gammaln, ndtr

from sameline.errors import StatsError
from sameline.stats.panels import Panels, fit_panels
from sameline.stats.scale_mixture import STEP_IN_SIGMA, log_mixture_and_slope, reach

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    Array = NDArray[np.float64]

# The table runs over -log w: fine panels where C bends (w from 0.3 to 16), coarse ones on its straight side.
_LAYOUT = (-2.75, 1.25, 13.25, 0.125, 1.5)
_TERMS = 14
_LOG_SQRT_2PI = 0.5 * float(np.log(2.0 * np.pi))


def log_cdf_and_slope(q: Array, groups: int, df: Array) -> tuple[Array, Array]:
    """Return log P(Q <= q) and its derivative by log q.

    Args:
        q: shape (m,), finite and above 0.
        groups: the number of means k.
        df: shape (m,), at least 1, infinity allowed.
    """
    tail = _lower_tail(groups)
    known = np.isinf(df)
    log_cdf, slope = np.empty_like(q), np.empty_like(q)
    log_cdf[known] = tail.log_tail(q[known])
    slope[known] = tail.slope(q[known])
    log_cdf[~known], slope[~known] = log_mixture_and_slope(tail, q[~known], df[~known])
    return log_cdf, slope


def log_lower_quantile(log_level: Array, groups: int, df: Array) -> Array:
    """Solve log P(Q <= q) = log_level for log q by Newton from the leading power's root, which is never too large.

    log P is concave in log q with slope k - 1 at the far left, so the steps go up to the root from one side.

    Args:
        log_level: shape (m,), logarithms of lower tail probabilities.
        groups: the number of means k.
        df: shape (m,), at least 1, infinity allowed.
    """
    power = groups - 1
    finite = np.where(np.isinf(df), 1.0, df)
    log_moment = gammaln(0.5 * (finite + power)) - gammaln(0.5 * finite) - 0.5 * power * np.log(0.5 * finite)
    leading = 0.5 * np.log(groups) - power * _LOG_SQRT_2PI + np.where(np.isinf(df), 0.0, log_moment)
    y: Array = (log_level - leading) / power
    active = np.arange(y.size)
    for _ in range(60):
        value, slope = log_cdf_and_slope(np.exp(y[active]), groups, df[active])
        step = (log_level[active] - value) / slope
        y[active] += step
        active = active[np.abs(step) > 1e-8]
        if not active.size:
            return y
    raise StatsError("the quantile's iteration did not settle", where="p", advice="choose a less extreme level")


@dataclass(frozen=True, slots=True)
class _LowerTail:
    """The lower tail at known scale, for the outer integral."""

    log_tail: Callable[[Array], Array]
    slope: Callable[[Array], Array]
    groups: int

    def window(self, q: Array, df: Array) -> tuple[Array, Array, Array]:
        """Return nodes' ends and step: while C is a power of w, g's degrees of freedom grow by that power."""
        most = df + self.groups - 1.0
        left, right = reach(df)
        edge = min(0.12, 0.3 / float(np.log(self.groups)))
        return (
            np.broadcast_to(-left, q.shape),
            np.broadcast_to(0.5 * np.log(most / df) + right, q.shape),
            np.broadcast_to(np.minimum(edge, STEP_IN_SIGMA / np.sqrt(2.0 * most)), q.shape),
        )


@lru_cache(maxsize=64)
def _lower_tail(groups: int) -> _LowerTail:
    """Return log C and its derivative by log w, continued beyond the table: a power on the left, 0 on the right."""
    panels = _lower_panels(groups)
    power = groups - 1.0

    def log_tail(w: Array) -> Array:
        x = -np.log(w)
        inside = np.clip(x, panels.start, panels.end)
        return np.asarray(np.minimum(panels(inside) - power * np.maximum(x - panels.end, 0.0), 0.0))

    def slope(w: Array) -> Array:
        x = -np.log(w)
        return np.where(x > panels.end, power, -panels.slope(np.clip(x, panels.start, panels.end)))

    return _LowerTail(log_tail, slope, groups)


@lru_cache(maxsize=64)
def _lower_panels(groups: int) -> Panels:
    """Tabulate log C over -log w."""
    return fit_panels(lambda x: _known_scale_log_cdf(np.exp(-x), groups), _LAYOUT, _TERMS)


def _known_scale_log_cdf(w: Array, groups: int) -> Array:
    """Return log C(w) by the trapezoid rule around z = -w/2."""
    step = min(0.125, 0.5 / np.sqrt(groups))
    u = np.arange(-9.0, 9.0 + step, step)[:, None]
    z = u - 0.5 * w
    exponent = -0.5 * z * z + (groups - 1) * np.log(_between(np.abs(u), w))
    top = exponent.max(axis=0)
    total = np.exp(exponent - top).sum(axis=0)
    return np.asarray(top + np.log(total * groups * step) - _LOG_SQRT_2PI)


def _between(u: Array, w: Array) -> Array:
    """Return Φ(u + w/2) - Φ(u - w/2) for u >= 0, w > 0, in relative accuracy and never below 1e-300."""
    plain = ndtr(0.5 * w - u) - ndtr(-u - 0.5 * w)
    # for narrow intervals the density's Taylor series about the middle
    u2, w2 = u * u, w * w
    series = 1.0 + w2 / 24.0 * (u2 - 1.0 + w2 / 80.0 * (u2 * u2 - 6.0 * u2 + 3.0))
    narrow = w * np.exp(-0.5 * u2 - _LOG_SQRT_2PI) * series
    return np.maximum(np.where(w < 0.02, narrow, plain), 1e-300)
