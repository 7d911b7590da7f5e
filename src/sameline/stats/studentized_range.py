"""The studentized range: the range of k independent normal means over an independent estimate of their deviation.

With Z the standard normal's upper tail Q(z) and density φ(z), the range of k values exceeds w with probability

    S(w) = k ∫ φ(z) Q(z)^(k-1) [1 - (1 - Q(z+w)/Q(z))^(k-1)] dz,

z being the smallest value (H. L. Harter, Tables of range and studentized range, Ann. Math. Statist. 31, 1960,
1122-1147, in the form that keeps the upper tail's relative accuracy). The integrand falls like a normal density on
both sides, so the trapezoid rule converges geometrically. log S is tabulated once for each k on Chebyshev panels and
serves every q and every number of degrees of freedom; `scale_mixture` does the integral over the estimated scale.

Nothing here is random, and no value depends on what else is computed in the same call.
"""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING, Any

import numpy as np
from scipy.special import ndtr, ndtri, stdtrit

from sameline.errors import StatsError
from sameline.stats.panels import Panels, fit_panels
from sameline.stats.scale_mixture import KnownScaleTail, log_mixture

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray

    Array = NDArray[np.float64]

# S(52) is about 1e-294: beyond it the tail is continued as a normal one.
_END = 52.0
_LAYOUT = (0.0, 12.0, _END, 0.5, 4.0)
_TERMS = 14


def studentized_range_sf(q: ArrayLike, groups: int, df: ArrayLike) -> Any:  # noqa: ANN401 - float in, float out
    """Return the upper tail P(Q > q) of the studentized range of `groups` means.

    Args:
        q: statistics, any shape; negative ones give 1.
        groups: the number of means k, an integer of at least 2.
        df: degrees of freedom of the deviation's estimate, 1 to infinity; broadcast against q.

    Returns:
        A float for scalars, else an array of the broadcast shape. Relative error below 1e-10 down to 1e-290.

    Raises:
        StatsError: fewer than two groups, degrees of freedom below 1, or a q that is not a number.
    """
    statistic, freedom = _arguments(q, df, "q")
    return _shaped(np.exp(_log_sf(statistic, _group_count(groups), freedom)), q, df)


def studentized_range_cdf(q: ArrayLike, groups: int, df: ArrayLike) -> Any:  # noqa: ANN401 - float in, float out
    """Return the lower tail P(Q <= q); arguments and errors as `studentized_range_sf`."""
    statistic, freedom = _arguments(q, df, "q")
    return _shaped(-np.expm1(_log_sf(statistic, _group_count(groups), freedom)), q, df)


def studentized_range_isf(alpha: ArrayLike, groups: int, df: ArrayLike) -> Any:  # noqa: ANN401 - float in, float out
    """Return the q with P(Q > q) = alpha, by Newton's rule on the tail's logarithm.

    Args:
        alpha: upper tail probabilities, between 0 and 1, any shape.
        groups: the number of means k, an integer of at least 2.
        df: degrees of freedom, 1 to infinity; broadcast against alpha.

    Returns:
        A float for scalars, else an array of the broadcast shape.

    Raises:
        StatsError: as `studentized_range_sf`, or an alpha that is not strictly between 0 and 1.
    """
    level, freedom = _arguments(alpha, df, "alpha")
    return _shaped(_quantile(np.log(_probability(level)), _group_count(groups), freedom), alpha, df)


def studentized_range_ppf(p: ArrayLike, groups: int, df: ArrayLike) -> Any:  # noqa: ANN401 - float in, float out
    """Return the q with P(Q <= q) = p; arguments and errors as `studentized_range_isf`."""
    level, freedom = _arguments(p, df, "p")
    return _shaped(_quantile(np.log1p(-_probability(level)), _group_count(groups), freedom), p, df)


def _arguments(value: ArrayLike, df: ArrayLike, name: str) -> tuple[Array, Array]:
    """Return both as flat arrays; df keeps length 1 where it is one number, which is cheaper."""
    first, second = np.asarray(value, dtype=np.float64), np.asarray(df, dtype=np.float64)
    if np.isnan(first).any():
        raise StatsError(f"{name} is not a number", where=name)
    if not (second >= 1.0).all():
        raise StatsError(f"degrees of freedom must be at least 1, got {second.min()}", where="df")
    if second.size == 1:
        return first.ravel(), second.ravel()
    first, second = np.broadcast_arrays(first, second)
    return first.ravel(), second.ravel()


def _group_count(groups: int) -> int:
    """Return the number of groups, checked."""
    if groups != int(groups) or groups < 2:
        raise StatsError(f"a range needs at least 2 groups, got {groups}", where="groups")
    return int(groups)


def _probability(level: Array) -> Array:
    """Return probabilities, checked."""
    if not ((level > 0.0) & (level < 1.0)).all():
        raise StatsError("a probability must lie strictly between 0 and 1", where="alpha")
    return level


def _shaped(flat: Array, value: ArrayLike, df: ArrayLike) -> Any:  # noqa: ANN401 - float in, float out
    """Return a float for scalars, else the broadcast shape."""
    shape = np.broadcast_shapes(np.shape(value), np.shape(df))
    return flat.reshape(shape) if shape else float(flat[0])


def _log_sf(q: Array, groups: int, df: Array) -> Array:
    """Return log P(Q > q)."""
    out = np.zeros_like(q)
    inside = np.flatnonzero(q > 0.0)
    out[inside] = _log_sf_and_slope(np.minimum(q[inside], 1e150), groups, df if df.size == 1 else df[inside])[0]
    out[np.isposinf(q)] = -np.inf
    return out


def _log_sf_and_slope(q: Array, groups: int, df: Array) -> tuple[Array, Array]:
    """Return log P(Q > q) and its derivative by log q, for q > 0."""
    tail = _range_tail(groups)
    log_sf, slope = np.empty_like(q), np.empty_like(q)
    freedom = np.broadcast_to(df, q.shape)
    known = np.isinf(freedom)
    if known.any():
        log_sf[known] = tail.log_tail(q[known])
        slope[known] = _range_panels(groups).slope(np.minimum(q[known], _END)) * q[known]
    if not known.all():
        log_sf[~known], slope[~known] = log_mixture(tail, q[~known], freedom[~known])
    return log_sf, slope


def _quantile(log_level: Array, groups: int, df: Array) -> Array:
    """Solve log P(Q > q) = log_level by Newton in log q, from Bonferroni's bound, which is never too small.

    log P is concave in log q, so the steps come down to the root from one side.
    """
    freedom = np.broadcast_to(df, log_level.shape)
    single = np.exp(log_level) / (groups * (groups - 1))
    known = np.isinf(freedom)
    start = np.where(known, -ndtri(single), -stdtrit(np.where(known, 1.0, freedom), single))
    y: Array = np.log(np.sqrt(2.0) * start)
    active = np.arange(y.size)
    for _ in range(60):
        value, slope = _log_sf_and_slope(np.exp(y[active]), groups, freedom[active])
        step = (value - log_level[active]) / slope
        y[active] -= step
        active = active[np.abs(step) > 1e-9]
        if not active.size:
            return np.asarray(np.exp(y))
    raise StatsError("the quantile's iteration did not settle", where="alpha", advice="choose a less extreme level")


@lru_cache(maxsize=64)
def _range_tail(groups: int) -> KnownScaleTail:
    """Return the tail of the range of `groups` normal values as the outer integral takes it."""
    panels = _range_panels(groups)

    def log_tail(w: Array) -> Array:
        value: Array = panels(np.minimum(w, _END))
        beyond = w > _END
        if beyond.any():
            value -= np.where(beyond, 0.25 * (w * w - _END * _END), 0.0)
        return value

    return KnownScaleTail(log_tail, 0.25, 0.5 * groups * (groups - 1))


@lru_cache(maxsize=64)
def _range_panels(groups: int) -> Panels:
    """Tabulate log S(w)."""
    return fit_panels(lambda w: np.log(_range_tail_integral(w, groups)), _LAYOUT, _TERMS)


def _range_tail_integral(w: Array, groups: int) -> Array:
    """Return S(w) by the trapezoid rule around z = -w/2, where smallest and largest value lie evenly about zero."""
    step = 0.2 if groups <= 40 else 0.125 if groups <= 200 else 0.1
    offsets = np.arange(-9.0, 7.5, step)[:, None]
    z = offsets - 0.5 * w
    above = ndtr(-z)
    missed = np.minimum(ndtr(-(z + w)) / above, 1.0 - 1e-16)
    exceeded = -np.expm1((groups - 1) * np.log1p(-missed))
    integrand = np.exp(-0.5 * z * z + (groups - 1) * np.log(above)) * exceeded
    return np.asarray(groups * step / np.sqrt(2.0 * np.pi) * integrand.sum(axis=0))
