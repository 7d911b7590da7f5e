"""Tail probabilities and quantiles of t, F, chi-squared and the normal, right in the tail and vectorised.

Thin names over scipy.special: upper tails are computed as such, never as 1 minus a value near 1, so that a p-value
of 1e-70 keeps its digits. Infinite degrees of freedom of t mean the normal distribution.
"""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import special

Floats: TypeAlias = NDArray[np.float64]


def t_sf(t: ArrayLike, df: ArrayLike) -> Floats:
    """P(T > t) for Student's t with `df` > 0 degrees of freedom (inf: the normal); broadcasts."""
    t, df = np.broadcast_arrays(np.asarray(t, float), np.asarray(df, float))
    finite = np.where(np.isinf(df), 1.0, df)
    return np.asarray(np.where(np.isinf(df), special.ndtr(-t), special.stdtr(finite, -t)), float)


def t_two_sided(t: ArrayLike, df: ArrayLike) -> Floats:
    """P(|T| > |t|), at most 1."""
    return np.minimum(1.0, 2.0 * t_sf(np.abs(t), df))


def t_isf(tail: ArrayLike, df: ArrayLike) -> Floats:
    """The t whose upper tail is `tail` (0 < tail < 1); broadcasts."""
    tail, df = np.broadcast_arrays(np.asarray(tail, float), np.asarray(df, float))
    finite = np.where(np.isinf(df), 1.0, df)
    return np.asarray(np.where(np.isinf(df), -special.ndtri(tail), -special.stdtrit(finite, tail)), float)


def normal_sf(z: ArrayLike) -> Floats:
    """P(Z > z) for a standard normal Z."""
    return np.asarray(special.ndtr(-np.asarray(z, float)), float)


def normal_two_sided(z: ArrayLike) -> Floats:
    """P(|Z| > |z|) for a standard normal Z."""
    return np.asarray(2.0 * special.ndtr(-np.abs(z)), float)


def f_sf(f: ArrayLike, df1: ArrayLike, df2: ArrayLike) -> Floats:
    """P(F > f) for the F distribution with `df1`, `df2` > 0 degrees of freedom; broadcasts."""
    return np.asarray(special.fdtrc(df1, df2, f), float)


def f_isf(tail: ArrayLike, df1: ArrayLike, df2: ArrayLike) -> Floats:
    """The f whose upper tail is `tail`, from the beta quantile: 1 - tail would lose the digits of a small one."""
    df1, df2 = np.asarray(df1, float), np.asarray(df2, float)
    share = special.betaincinv(df2 / 2.0, df1 / 2.0, tail)
    return np.asarray(df2 * (1.0 - share) / (df1 * share), float)


def chi2_sf(x: ArrayLike, df: ArrayLike) -> Floats:
    """P(chi-squared > x) with `df` > 0 degrees of freedom; broadcasts."""
    return np.asarray(special.chdtrc(df, x), float)
