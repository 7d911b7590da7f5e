"""The studentized range: the range of k independent normal means over an independent estimate of their deviation.

The distribution behind Tukey's procedure (H. L. Harter, Tables of range and studentized range, Ann. Math. Statist. 31,
1960, 1122-1147). Tails are computed as tails, never as 1 minus something, by deterministic quadrature: `range_tail`
says how. For k = 2, Q/√2 is the size of Student's t.

Nothing here is random, and no value depends on what else is computed in the same call.
"""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING, Any

import numpy as np

from sameline.errors import StatsError
from sameline.stats.range_curves import log_sf_over_q, quantiles_over_df
from sameline.stats.range_lower_tail import log_cdf_and_slope, log_lower_quantile
from sameline.stats.range_tail import log_quantile, log_sf
from sameline.stats.scale_mixture import effective_df

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray

    Array = NDArray[np.float64]

_MOST_GROUPS = 10_000
_SMALLEST_Q, _LARGEST_Q = 1e-300, 1e300
_LOG_HALF = float(np.log(0.5))


def studentized_range_sf(q: ArrayLike, groups: int, df: ArrayLike) -> Any:  # noqa: ANN401 - float in, float out
    """Return the upper tail P(Q > q) of the studentized range of `groups` means.

    Args:
        q: statistics, any shape; negative ones give 1.
        groups: the number of means k, an integer from 2 to 10 000.
        df: degrees of freedom of the deviation's estimate, 1 to infinity; broadcast against q.

    Returns:
        A float for scalars, else an array of the broadcast shape. Relative error below 1e-10 down to 1e-280.

    Raises:
        StatsError: a number of groups or degrees of freedom out of range, or a q that is not a number.
    """
    statistic, freedom = _arguments(q, df, "q")
    return _shaped(np.exp(_log_sf(statistic, _group_count(groups), freedom)), q, df)


def studentized_range_cdf(q: ArrayLike, groups: int, df: ArrayLike) -> Any:  # noqa: ANN401 - float in, float out
    """Return the lower tail P(Q <= q); arguments and errors as `studentized_range_sf`."""
    statistic, freedom = _arguments(q, df, "q")
    return _shaped(_cdf(statistic, _group_count(groups), freedom), q, df)


def studentized_range_isf(alpha: ArrayLike, groups: int, df: ArrayLike) -> Any:  # noqa: ANN401 - float in, float out
    """Return the q with P(Q > q) = alpha, by Newton's rule on the tail's logarithm.

    Args:
        alpha: upper tail probabilities, between 0 and 1, any shape.
        groups: the number of means k, an integer from 2 to 10 000.
        df: degrees of freedom, 1 to infinity; broadcast against alpha.

    Returns:
        A float for scalars, else an array of the broadcast shape.

    Raises:
        StatsError: as `studentized_range_sf`, or an alpha that is not strictly between 0 and 1.
    """
    level, freedom = _arguments(alpha, df, "alpha")
    upper = _probability(level, "alpha")
    return _shaped(_quantile(upper, 1.0 - upper, _group_count(groups), freedom), alpha, df)


def studentized_range_ppf(p: ArrayLike, groups: int, df: ArrayLike) -> Any:  # noqa: ANN401 - float in, float out
    """Return the q with P(Q <= q) = p; arguments and errors as `studentized_range_isf`."""
    level, freedom = _arguments(p, df, "p")
    lower = _probability(level, "p")
    return _shaped(_quantile(1.0 - lower, lower, _group_count(groups), freedom), p, df)


def _arguments(value: ArrayLike, df: ArrayLike, name: str) -> tuple[Array, Array]:
    """Return both as flat arrays; df keeps length 1 where it is one number, which has a faster way."""
    first, second = np.asarray(value, dtype=np.float64), np.asarray(df, dtype=np.float64)
    if np.isnan(first).any():
        raise StatsError(f"{name} is not a number", where=name)
    if not (second >= 1.0).all():
        raise StatsError(f"degrees of freedom must be at least 1, got {second.min()}", where="df")
    second = effective_df(second)
    if second.size == 1:
        return first.ravel(), second.ravel()
    first, second = np.broadcast_arrays(first, second)
    return first.ravel(), second.ravel()


def _group_count(groups: int) -> int:
    """Return the number of groups, checked."""
    if groups != int(groups) or not 2 <= groups <= _MOST_GROUPS:
        raise StatsError(f"a range needs 2 to {_MOST_GROUPS} groups, got {groups}", where="groups")
    return int(groups)


def _probability(level: Array, name: str) -> Array:
    """Return probabilities, checked."""
    if not ((level > 0.0) & (level < 1.0)).all():
        raise StatsError("a probability must lie strictly between 0 and 1", where=name)
    return level


def _shaped(flat: Array, value: ArrayLike, df: ArrayLike) -> Any:  # noqa: ANN401 - float in, float out
    """Return a float for scalars, else the broadcast shape."""
    shape = np.broadcast_shapes(np.shape(value), np.shape(df))
    return flat.reshape(shape) if shape else float(flat[0])


def _log_sf(q: Array, groups: int, df: Array) -> Array:
    """Return log P(Q > q), 0 for q <= 0."""
    out = np.zeros_like(q)
    inside = np.flatnonzero(q > 0.0)
    positive = np.clip(q[inside], _SMALLEST_Q, _LARGEST_Q)
    if df.size == 1:
        out[inside] = log_sf_over_q(positive, groups, float(df[0]))
    else:
        out[inside] = log_sf(positive, groups, df[inside])
    out[np.isposinf(q)] = -np.inf
    return np.minimum(out, 0.0)


def _cdf(q: Array, groups: int, df: Array) -> Array:
    """Return P(Q <= q), from whichever tail is the smaller."""
    above = _log_sf(q, groups, df)
    out = -np.expm1(above)
    low = np.flatnonzero((q > 0.0) & (above > _LOG_HALF))
    if low.size:
        out[low] = np.exp(
            log_cdf_and_slope(np.maximum(q[low], _SMALLEST_Q), groups, np.broadcast_to(df, q.shape)[low])[0]
        )
    return out


def _quantile(upper: Array, lower: Array, groups: int, df: Array) -> Array:
    """Return the q with P(Q > q) = upper = 1 - lower, from whichever tail is the smaller."""
    low = lower < 0.5
    if not low.any():
        return _upper_quantile(upper, groups, df)
    freedom = np.broadcast_to(df, upper.shape)
    out = np.empty_like(upper)
    out[low] = np.exp(log_lower_quantile(np.log(lower[low]), groups, freedom[low]))
    out[~low] = _upper_quantile(upper[~low], groups, freedom[~low])
    return out


def _upper_quantile(alpha: Array, groups: int, df: Array) -> Array:
    """Return the q with P(Q > q) = alpha for alpha up to one half."""
    if alpha.size > 1 and df.size > 1 and (alpha == alpha[0]).all():
        return quantiles_over_df(float(alpha[0]), groups, df)
    if alpha.size == 1:
        return np.array([_one_quantile(float(alpha[0]), groups, float(df[0]))])
    return np.asarray(np.exp(log_quantile(np.log(alpha), groups, np.broadcast_to(df, alpha.shape))))


@lru_cache(maxsize=256)
def _one_quantile(alpha: float, groups: int, df: float) -> float:
    """Return one quantile, kept: a comparison looked at again asks for the same."""
    return float(np.exp(log_quantile(np.array([np.log(alpha)]), groups, np.array([df])))[0])
