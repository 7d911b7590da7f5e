"""The studentized range's upper tail and its quantiles, one (q, df) pair at a time.

With Z standard normal, upper tail Q(z) and density φ(z), the range of k values exceeds w with probability

    S(w) = k ∫ φ(z) Q(z)^(k-1) [1 - (1 - Q(z+w)/Q(z))^(k-1)] dz,

z being the smallest value. The integrand falls like a normal density on both sides, so the trapezoid rule converges
geometrically. log S is tabulated once for each k on Chebyshev panels and serves every q and every number of degrees of
freedom; `scale_mixture` does the integral over the estimated scale.
"""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
from scipy.special import ndtr, ndtri, stdtrit

from sameline.errors import StatsError
from sameline.stats.panels import Panels, fit_panels
from sameline.stats.scale_mixture import KnownScaleTail, log_mixture, log_mixture_and_slope

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Array = NDArray[np.float64]

# S(52) is about 1e-294: beyond it the tail is continued as a normal one.
_END = 52.0
# The integral is done at the points of a few long polynomials, which are then cut into many short ones: the outer
# integral evaluates them some ten thousand times.
_LONG, _LONG_TERMS = (0.0, 12.0, _END, 0.5, 4.0), 14
_SHORT, _SHORT_TERMS = (0.0, _END, _END, 0.25, 0.25), 10


def log_sf(q: Array, groups: int, df: Array) -> Array:
    """Return log P(Q > q).

    Args:
        q: shape (m,), finite and above 0.
        groups: the number of means k.
        df: shape (m,), at least 1, infinity allowed.
    """
    tail = range_tail(groups)
    known = np.isinf(df)
    if not known.any():
        return log_mixture(tail, q, df)
    out = np.empty_like(q)
    out[known] = tail.log_tail(q[known])
    out[~known] = log_mixture(tail, q[~known], df[~known])
    return out


def _log_sf_and_slope(q: Array, groups: int, df: Array) -> tuple[Array, Array]:
    """Return log P(Q > q) and its derivative by log q; arguments as `log_sf`."""
    tail = range_tail(groups)
    known = np.isinf(df)
    if not known.any():
        return log_mixture_and_slope(tail, q, df)
    value, slope = np.empty_like(q), np.empty_like(q)
    value[known] = tail.log_tail(q[known])
    slope[known] = _range_panels(groups).slope(np.minimum(q[known], _END)) * q[known]
    value[~known], slope[~known] = log_mixture_and_slope(tail, q[~known], df[~known])
    return value, slope


def log_quantile(log_level: Array, groups: int, df: Array) -> Array:
    """Solve log P(Q > q) = log_level for log q by Newton from Bonferroni's bound, which is never too small.

    log P is concave in log q, so the steps come down to the root from one side.

    Args:
        log_level: shape (m,), logarithms of upper tail probabilities.
        groups: the number of means k.
        df: shape (m,), at least 1, infinity allowed.

    Raises:
        StatsError: a level so extreme that no quantile can be had.
    """
    single = np.exp(log_level) / (groups * (groups - 1))
    known = np.isinf(df)
    start = np.where(known, -ndtri(single), -stdtrit(np.where(known, 1.0, df), single))
    y: Array = np.log(np.sqrt(2.0) * np.maximum(start, 1e-3))
    active = np.arange(y.size)
    for _ in range(60):
        value, slope = _log_sf_and_slope(np.exp(y[active]), groups, df[active])
        step = (value - log_level[active]) / slope
        y[active] -= step
        # Newton's next step is of the order of this one's square
        active = active[np.abs(step) > 1e-7]
        if not active.size:
            return y
    raise StatsError("the quantile's iteration did not settle", where="alpha", advice="choose a less extreme level")


@lru_cache(maxsize=64)
def range_tail(groups: int) -> KnownScaleTail:
    """Return the tail of the range of `groups` normal values as the outer integral takes it."""
    panels = _range_panels(groups)

    def log_tail(w: Array) -> Array:
        if not (w > _END).any():
            return panels(w)
        inside, squared = np.minimum(w, _END), np.minimum(w, 1e150) ** 2
        return np.asarray(panels(inside) - 0.25 * (squared - inside * inside))

    return KnownScaleTail(log_tail, 0.25, 0.5 * groups * (groups - 1))


@lru_cache(maxsize=64)
def _range_panels(groups: int) -> Panels:
    """Tabulate log S(w)."""
    long = fit_panels(lambda w: np.log(_known_scale_tail(w, groups)), _LONG, _LONG_TERMS)
    return fit_panels(long, _SHORT, _SHORT_TERMS)


def _known_scale_tail(w: Array, groups: int) -> Array:
    """Return S(w) by the trapezoid rule over the smallest value z, stretch by stretch of w."""
    out = np.empty_like(w)
    stretch = np.floor(0.25 * w)
    for number in np.unique(stretch):
        members = np.flatnonzero(stretch == number)
        out[members] = _known_scale_tail_near(w[members], groups)
    return out


def _known_scale_tail_near(w: Array, groups: int) -> Array:
    """Return S(w) for like values of w, on one grid of z.

    The integrand is at most φ(z) and, about -w/2, at most a multiple of exp(-(z + w/2)²): beyond the grid lies less
    than 1e-16 of it.
    """
    step = 0.2 if groups <= 20 else 0.15 if groups <= 80 else 0.125 if groups <= 200 else 0.1
    low = -max(8.8, 6.6 + 0.5 * float(w.max()))
    z = np.arange(low, 6.6 - 0.5 * float(w.min()) + step, step)
    above = ndtr(-z)
    density = np.exp(-0.5 * z * z + (groups - 1) * np.log(above))
    missed = np.minimum(ndtr(-(z[:, None] + w)) / above[:, None], 1.0 - 1e-16)
    exceeded = -np.expm1((groups - 1) * np.log1p(-missed))
    return np.asarray(groups * step / np.sqrt(2.0 * np.pi) * (density[:, None] * exceeded).sum(axis=0))
