"""The outer integral shared by the studentized range and Dunnett's statistic: over the estimated scale.

A statistic of known scale with upper tail S(w) becomes, when the scale is estimated with df degrees of freedom,

    P(Q > q) = ∫ g(x) S(q e^x) dx,   g(x) = 2 (df/2)^(df/2) / Γ(df/2) · exp(df x - df e^(2x) / 2),

where e^x = s/sigma is chi distributed, scaled by 1/√df, and x runs over the whole line. The integrand is analytic
and falls at least exponentially on the left and double-exponentially on the right, so the trapezoid rule converges
geometrically (Trefethen and Weideman, SIAM Review 56, 2014, section 5). Tails of S fall like exp(-rate·w²), which
moves the integrand's mode left to x = -½ log(1 + 2 rate q²/df); the nodes go with it, and everything is summed on
the logarithmic scale, so that tails as far as 1e-290 keep their relative accuracy.

The number of nodes for a (q, df) pair depends on that pair alone: no value changes with the company it is computed in.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Protocol

import numpy as np
from scipy.special import gammaln

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    Array = NDArray[np.float64]

# The integrand is followed down to e^-39 = 1.2e-17 of its mode.
_DEPTH = 39.0
# Gauss: the trapezoid rule's error is exp(-2 (pi sigma/h)^2), 7e-35 at half a standard deviation; the skewness
# at few degrees of freedom uses up the surplus.
STEP_IN_SIGMA = 0.5
# Beyond this x - (e^2x - 1)/2 needs its series near zero.
_MANY_DF = 100.0
_PRACTICALLY_INFINITE = 1e18
# Nodes times pairs in one go, so that the working arrays stay in the cache.
_BLOCK = 65_536


class Mixand(Protocol):
    """What is mixed over the scale: a tail at known scale, and where its integrand lives."""

    @property
    def log_tail(self) -> Callable[[Array], Array]:
        """Return the vectorised logarithm of the tail at known scale."""

    def window(self, q: Array, df: Array) -> tuple[Array, Array, Array]:
        """Return the first node, the last node, and the widest step that does justice to each pair."""


@dataclass(frozen=True, slots=True)
class KnownScaleTail:
    """The upper tail of a largest statistic at known scale.

    Attributes:
        log_tail: vectorised log S(w).
        rate: S falls like exp(-rate·w²).
        count: S(w) <= count·exp(-rate·w²): the number of single statistics whose maximum it is.
    """

    log_tail: Callable[[Array], Array]
    rate: float
    count: float

    def window(self, q: Array, df: Array) -> tuple[Array, Array, Array]:
        """Return nodes' ends and step; q is not zero."""
        log_count = float(np.log(max(self.count, 2.0)))
        # S is of order 1 up to the plateau's end, where count·exp(-rate·w²) comes down to 1, and falls behind
        plateau = np.sqrt(log_count / self.rate)
        # below zero (one-sided statistics only) S rises towards 1, and g alone says where the integrand lives
        positive, log_q = q > 0.0, np.log(np.abs(q))
        shift = np.where(positive, -0.5 * np.logaddexp(0.0, np.log(2.0 * self.rate / df) + 2.0 * log_q), 0.0)
        edge = np.where(positive, np.log(plateau) - log_q, 0.0)
        left, right = reach(df)
        # the edge of S in log w is about 1/(2 log count) wide (extreme values)
        step = np.minimum(min(0.12, 0.6 / log_count), STEP_IN_SIGMA / np.sqrt(2.0 * df))
        return shift - left, np.minimum(0.0, np.maximum(shift, edge)) + right, step


def effective_df(df: Array) -> Array:
    """Return the degrees of freedom with those that no double can tell from infinity made infinite.

    log P moves by about q^4/(16 df) between df and infinity: beyond 1e18 by less than 1e-12 as far as 1e-290.
    """
    return np.where(df > _PRACTICALLY_INFINITE, np.inf, df)


def log_mixture(tail: Mixand, q: Array, df: Array) -> Array:
    """Return the logarithm of the mixed tail at q.

    Args:
        tail: the tail at known scale.
        q: shape (m,), the statistics, not zero.
        df: shape (m,), finite, at least 1.
    """
    return _mix(tail, q, df, with_slope=False)[0]


def log_mixture_and_slope(tail: Mixand, q: Array, df: Array) -> tuple[Array, Array]:
    """Return the logarithm of the mixed tail at q, and its derivative by log q; arguments as `log_mixture`."""
    return _mix(tail, q, df, with_slope=True)


def _mix(tail: Mixand, q: Array, df: Array, *, with_slope: bool) -> tuple[Array, Array]:
    """Integrate class by class of node counts, so that unlike pairs are not all given the largest."""
    low, high, step = tail.window(q, df)
    nodes = (16 * np.ceil(((high - low) / step + 1.0) / 16.0)).astype(np.intp)
    step = (high - low) / (nodes - 1)
    kinds = np.where(df > _MANY_DF, -nodes, nodes)
    log_total, slope = np.empty_like(q), np.empty_like(q)
    for kind in np.unique(kinds):
        count, exponent = abs(int(kind)), _plain_exponent if kind > 0 else _close_exponent
        members = np.flatnonzero(kinds == kind)
        size = max(1, _BLOCK // count)
        for begin in range(0, members.size, size):
            part = members[begin : begin + size]
            x = low[part] + step[part] * np.arange(count)[:, None]
            scale = np.exp(x)
            weights = tail.log_tail(q[part] * scale) + df[part] * exponent(x, scale)
            top = weights.max(axis=0)
            weights -= top
            np.exp(weights, out=weights)
            total = weights.sum(axis=0)
            log_total[part] = top + np.log(total)
            if with_slope:
                # by parts: d/dlog q ∫ g S(q e^x) = -∫ g' S = ∫ df (e^2x - 1) g S
                slope[part] = df[part] * (weights * np.expm1(2.0 * x)).sum(axis=0) / total
    return log_total + np.log(step) + _log_constant(df), slope


def _plain_exponent(x: Array, scale: Array) -> Array:
    """Return x - (e^2x - 1)/2, given e^x."""
    return np.asarray(x - 0.5 * (scale * scale - 1.0))


def _close_exponent(x: Array, scale: Array) -> Array:
    """Return the same without the cancellation near zero, which many degrees of freedom would magnify."""
    near = np.abs(x) < 0.25
    small = np.where(near, x, 0.0)
    series = np.ones_like(x)
    for power in range(14, 2, -1):
        series = 1.0 + series * (2.0 * small) / power
    return np.where(near, -small * small * series, _plain_exponent(x, scale))


def _log_constant(df: Array) -> Array:
    """Return log[2 (df/2)^(df/2) / Γ(df/2)] - df/2, by Stirling's series where the plain form cancels."""
    a = 0.5 * df
    large = np.maximum(a, 20.0)
    i2 = 1.0 / (large * large)
    series = (1 / 12 - i2 * (1 / 360 - i2 * (1 / 1260 - i2 * (1 / 1680 - i2 / 1188)))) / large
    stirling = 0.5 * np.log(large / (2.0 * np.pi)) - series
    plain = a * np.log(a) - a - gammaln(a)
    return np.asarray(np.log(2.0) + np.where(a > 20.0, stirling, plain))


def reach(df: Array) -> tuple[Array, Array]:
    """Return how far left and right of its mode g falls to e^-39 of it, by Newton from outside."""
    depth = _DEPTH / df
    left = np.minimum(depth + 0.5, depth + np.sqrt(depth))
    right = np.minimum(np.sqrt(depth), 0.5 * np.log1p(2.0 * depth) + 1.0)
    for _ in range(3):  # from outside: always far enough, and near enough after three steps
        left = left - (left + 0.5 * np.expm1(-2.0 * left) - depth) / -np.expm1(-2.0 * left)
        right = right - (0.5 * np.expm1(2.0 * right) - right - depth) / np.expm1(2.0 * right)
    return left, right
