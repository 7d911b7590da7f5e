"""Dunnett's distribution: the largest of m Student statistics that share a control and a deviation's estimate.

With group i's weight λ_i = sqrt(n_i/(n_i+n_0)) the statistics are correlated by ρ_ij = λ_i λ_j (C. W. Dunnett, A
multiple comparison procedure for comparing several treatments with a control, J. Am. Statist. Assoc. 50, 1955,
1096-1121; New tables, Biometrics 20, 1964, 482-491). Given the control's mean z they are independent, so at known
scale

    P(max |T_i| > w) = ∫ φ(z) [1 - Π (1 - t_i(z))] dz,
    t_i(z) = Q((w - λ_i z)/c_i) + Q((w + λ_i z)/c_i)   (the first term alone for one side),   c_i = sqrt(1 - λ_i²),

with 1 - Π(1 - t) as -expm1(Σ log1p(-t)), which keeps the tail's relative accuracy. The trapezoid rule over z converges
geometrically; its logarithm is tabulated once for a set of weights, and `scale_mixture` does the outer integral over
the estimated scale. No random numbers: the same answer every time.
"""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from scipy.special import ndtr, ndtri, stdtrit

from sameline.errors import StatsError
from sameline.stats.panels import Panels, fit_panels
from sameline.stats.scale_mixture import KnownScaleTail, effective_df, log_mixture, log_mixture_and_slope

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray

    Array = NDArray[np.float64]

Alternative = Literal["two-sided", "greater", "less"]

# The tail at 36 is about 1e-283: beyond it the tail is continued as a normal one.
_END = 36.0
_TERMS = 14
_SMALLEST_T, _LARGEST_T = 1e-300, 1e300


def dunnett_sf(t: ArrayLike, lambdas: ArrayLike, df: float, alternative: Alternative = "two-sided") -> Any:  # noqa: ANN401 - float in, float out
    """Return the single-step p-value of a statistic t among m comparisons with a control.

    Args:
        t: statistics, any shape.
        lambdas: shape (m,), the weights sqrt(n_i/(n_i+n_0)), each in [0, 1).
        df: degrees of freedom of the deviation's estimate, 1 to infinity.
        alternative: "two-sided" gives P(max |T_i| > |t|), "greater" P(max T_i > t), "less" P(min T_i < t).

    Returns:
        A float for a scalar t, else an array of its shape. Relative error below 1e-10 down to 1e-280.

    Raises:
        StatsError: weights outside [0, 1), degrees of freedom below 1, an unknown alternative, a t that is no number.
    """
    statistic = np.asarray(t, dtype=np.float64)
    if np.isnan(statistic).any():
        raise StatsError("t is not a number", where="t")
    weights, two_sided = _weights(lambdas), _is_two_sided(alternative)
    oriented = np.abs(statistic) if two_sided else -statistic if alternative == "less" else statistic
    log_sf = _log_sf(np.clip(oriented.ravel(), -_LARGEST_T, _LARGEST_T), weights, two_sided, _freedom(df))
    flat = oriented.ravel()
    sf = np.exp(np.where(np.isinf(flat), np.where(flat > 0, -np.inf, 0.0), log_sf))
    return sf.reshape(statistic.shape) if statistic.shape else float(sf[0])


def dunnett_isf(alpha: float, lambdas: ArrayLike, df: float, alternative: Alternative = "two-sided") -> float:
    """Return the critical value: the t whose `dunnett_sf` is alpha. For "less" it is negative.

    Args:
        alpha: the familywise error rate, strictly between 0 and 1.
        lambdas: as in `dunnett_sf`.
        df: as in `dunnett_sf`.
        alternative: as in `dunnett_sf`.

    Raises:
        StatsError: as `dunnett_sf`, or an alpha outside (0, 1).
    """
    if not 0.0 < alpha < 1.0:
        raise StatsError(f"a probability must lie strictly between 0 and 1, got {alpha}", where="alpha")
    weights, two_sided = _weights(lambdas), _is_two_sided(alternative)
    critical = _quantile(float(alpha), weights, two_sided, _freedom(df))
    return -critical if alternative == "less" else critical


def _weights(lambdas: ArrayLike) -> tuple[float, ...]:
    """Return the weights sorted, checked."""
    weights = np.sort(np.asarray(lambdas, dtype=np.float64).ravel())
    if not weights.size or not ((weights >= 0.0) & (weights < 1.0)).all():
        raise StatsError("a comparison's weight sqrt(n_i/(n_i+n_0)) must lie in [0, 1)", where="lambdas")
    return tuple(weights.tolist())


def _is_two_sided(alternative: str) -> bool:
    """Return whether the alternative is two-sided, checked."""
    if alternative not in ("two-sided", "greater", "less"):
        raise StatsError(
            f"unknown alternative {alternative!r}", where="alternative", advice="use two-sided, greater or less"
        )
    return alternative == "two-sided"


def _freedom(df: float) -> float:
    """Return the degrees of freedom, checked."""
    if not df >= 1.0:
        raise StatsError(f"degrees of freedom must be at least 1, got {df}", where="df")
    return float(effective_df(np.array([df]))[0])


def _log_sf(t: Array, weights: tuple[float, ...], two_sided: bool, df: float) -> Array:
    """Return log P(max > t)."""
    out = np.zeros_like(t) if two_sided else np.full_like(t, _tail(weights, two_sided).log_tail(np.zeros(1))[0])
    moved = np.flatnonzero((t if two_sided else np.abs(t)) > _SMALLEST_T)
    if np.isinf(df):
        out[moved] = _tail(weights, two_sided).log_tail(t[moved])
    else:
        out[moved] = log_mixture(_tail(weights, two_sided), t[moved], np.full(moved.size, df))
    return out


def _log_sf_and_slope(t: Array, weights: tuple[float, ...], two_sided: bool, df: float) -> tuple[Array, Array]:
    """Return log P(max > t) and its derivative by log t, for t other than 0."""
    tail = _tail(weights, two_sided)
    if np.isinf(df):
        return tail.log_tail(t), t * _panels(weights, two_sided).slope(np.minimum(t, _END))
    return log_mixture_and_slope(tail, t, np.full_like(t, df))


def _quantile(alpha: float, weights: tuple[float, ...], two_sided: bool, df: float) -> float:
    """Solve P(max > t) = alpha by Newton in log t, downwards from Bonferroni's bound."""
    at_zero = float(_log_sf(np.zeros(1), weights, two_sided, df)[0])
    if np.log(alpha) >= at_zero:
        return _bisect(np.log(alpha), weights, df)
    single = alpha / len(weights) / (2.0 if two_sided else 1.0)
    t = np.array([-ndtri(single) if np.isinf(df) else -stdtrit(df, single)])
    for _ in range(60):
        value, slope = _log_sf_and_slope(t, weights, two_sided, df)
        step = float(((value - np.log(alpha)) / slope)[0])
        t = t * np.exp(-step)
        if abs(step) < 1e-9:
            return float(t[0])
    raise StatsError("the quantile's iteration did not settle", where="alpha", advice="choose a less extreme level")


def _bisect(log_alpha: float, weights: tuple[float, ...], df: float) -> float:
    """Solve the one-sided equation for a root at or below zero, which only an alpha above one half has."""
    single = -np.expm1(log_alpha)
    low, high = float(ndtri(single) if np.isinf(df) else stdtrit(df, single)), 0.0
    while high - low > 4e-16 * abs(low):
        middle = 0.5 * (low + high)
        if middle in (low, high):
            break
        above = float(_log_sf(np.array([middle]), weights, two_sided=False, df=df)[0]) > log_alpha
        low, high = (middle, high) if above else (low, middle)
    return 0.5 * (low + high)


@lru_cache(maxsize=64)
def _tail(weights: tuple[float, ...], two_sided: bool) -> KnownScaleTail:
    """Return the tail at known scale as the outer integral takes it."""
    panels = _panels(weights, two_sided)

    def log_tail(w: Array) -> Array:
        inside = np.clip(w, panels.start, _END)
        value: Array = panels(inside)
        if (w > _END).any():
            value -= np.where(w > _END, 0.5 * (np.clip(w, 0.0, 1e150) ** 2 - _END * _END), 0.0)
        return value

    return KnownScaleTail(log_tail, 0.5, len(weights) * (2.0 if two_sided else 1.0))


@lru_cache(maxsize=64)
def _panels(weights: tuple[float, ...], two_sided: bool) -> Panels:
    """Tabulate log P(max > w) at known scale; below -10 it is 0 to the last digit."""
    start = 0.0 if two_sided else -10.0

    def log_tail(w: Array) -> Array:
        return np.minimum(np.log(_known_scale_tail(w, weights, two_sided)), 0.0)

    return fit_panels(log_tail, (start, 12.0, _END, 0.5, 4.0), _TERMS)


def _known_scale_tail(w: Array, weights: tuple[float, ...], two_sided: bool) -> Array:
    """Return P(max > w), stretch by stretch of w."""
    out = np.empty_like(w)
    stretch = np.floor(0.25 * w)
    for number in np.unique(stretch):
        members = np.flatnonzero(stretch == number)
        out[members] = _known_scale_tail_near(w[members], weights, two_sided)
    return out


def _known_scale_tail_near(w: Array, weights: tuple[float, ...], two_sided: bool) -> Array:
    """Return P(max > w) for like values of w, by the trapezoid rule over the control's mean z.

    While w is inside the plateau the integrand lives around 0. Behind it each comparison's part is at most a multiple
    of a normal density about λw with deviation c as long as z < w/λ, and at most φ(z) from there on.
    """
    lambdas, copies = np.unique(weights, return_counts=True)
    rest = np.sqrt((1.0 - lambdas) * (1.0 + lambdas))
    log_count = float(np.log(max(copies.sum() * (2.0 if two_sided else 1.0), 2.0)))
    # the product's edge in z is c/lambda wide, and sharper the more factors it has
    narrow = float((rest / np.maximum(lambdas, 1e-3)).min())
    step = min(0.5, 0.5 * narrow / (1.0 + 0.5 * log_count))
    behind = max(float(w.min()) - np.sqrt(2.0 * log_count), 0.0)
    low = float((lambdas * behind - 8.8).min())
    most = float(w.max())
    bell = lambdas * most + 8.8 * rest
    high = max(8.8, float(np.where(bell * lambdas < most, bell, np.sqrt(most * most + 78.0)).max()))
    if two_sided:  # symmetric in z: the half line, on points that mirror into an even grid
        low = (np.floor(max(low, 0.0) / step) + 0.5) * step
    z = np.arange(low, high + step, step)[:, None]
    total = np.empty_like(w)
    size = max(1, 262_144 // len(z))
    for begin in range(0, w.size, size):
        part = w[begin : begin + size]
        log_all_below = np.zeros((len(z), part.size))
        for weight, c, number in zip(lambdas, rest, copies, strict=True):
            beyond = ndtr((weight * z - part) / c)
            if two_sided:
                beyond += ndtr((-weight * z - part) / c)
            log_all_below += number * np.log1p(-np.minimum(beyond, 1.0 - 1e-16))
        total[begin : begin + size] = (np.exp(-0.5 * z * z) * -np.expm1(log_all_below)).sum(axis=0)
    return np.asarray((2.0 if two_sided else 1.0) * step / np.sqrt(2.0 * np.pi) * total)
