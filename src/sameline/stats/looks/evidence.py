"""Evidence that stays valid however often one looks: the e-value of a contrast of group means, and its inversion.

Model: unit values y_ij = mu_i + sigma e_ij with independent standard normal e_ij, group means x_i of n_i units, and a
residual sum of squares on df degrees of freedom. Under a null hypothesis that is a linear restriction of the means, the
data enter only through their maximal invariant under shifts that obey the restriction and changes of scale; its
distribution has no unknown parameter, neither under the null nor under the alternative "the contrast is delta sigma
with delta normal, mean 0, variance 1/phi". The ratio of the two densities is

    E = sqrt(r) (1 - (1 - r) Q / S0) ** (-(df0) / 2),    r = phi / (phi + n),

with S0 the residual sum of squares under the null on df0 degrees of freedom, Q the part of it the contrast explains
and n the contrast's number of units (for two groups n_a n_b / (n_a + n_b)). Written with t and df = df0 - 1 it is
sqrt(r) ((1 + r t^2/df) / (1 + t^2/df)) ** (-(df + 1) / 2). As a likelihood ratio of one sequence of invariants it is a
non-negative martingale with expectation 1, so P(sup over all looks >= 1/alpha) <= alpha (Ville).

Exact when: units independent and normal with one spread, and what arrives next does not depend on the values seen
except through differences relative to their spread.

References: Lai 1976, Ann. Statist. 4:265-280; Goenen, Johnson, Lu and Westfall 2005, Am. Stat. 59:252-257 (the same
ratio for two groups at one look); Perez-Ortiz, Lardy, de Heide and Gruenwald 2024, Ann. Statist. 52:1410-1432;
Wang and Ramdas 2023, arXiv:2310.03722; Lindon, Ham, Tingley and Bojinov 2022, arXiv:2210.08589.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from sameline.errors import StatsError

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray

SMALLEST_P = 1e-300
"""No p-value below this is stated: what is smaller is stated as this, which is larger and so still true."""


def phi_from_margin(margin: float, sd: float) -> float:
    """The tuning phi that looks hardest for differences the size of the margin.

    Args:
        margin: smallest difference that matters, in the characteristic's unit, > 0.
        sd: spread (standard deviation) of one unit, known beforehand, same unit, > 0.

    Returns:
        phi = (sd / margin)^2, so that the prior standard deviation of the difference is the margin.

    Raises:
        StatsError: either number is not above zero.
    """
    for name, value in (("margin", margin), ("sd", sd)):
        if not (math.isfinite(value) and value > 0):
            raise StatsError(f"{name} {value!r} is not above zero", where=name)
    return (sd / margin) ** 2


def log_evidence(
    explained: ArrayLike, null_ss: ArrayLike, null_df: ArrayLike, n: ArrayLike, phi: float
) -> NDArray[np.float64]:
    """Log E of a contrast from sums of squares; arguments broadcast.

    Args:
        explained: Q, the sum of squares the contrast explains, in the squared unit.
        null_ss: S0 >= Q, residual sum of squares under the null; where it is 0 there is no spread to measure against
            and the ratio Q / S0 is taken as 0.
        null_df: df0, degrees of freedom of S0; 0 gives log E = 0 (nothing seen yet).
        n: the contrast's number of units; 0 gives log E = 0.
        phi: tuning, 1 / variance of the standardised difference.
    """
    shrink = phi / (phi + np.asarray(n, dtype=np.float64))
    total = np.asarray(null_ss, dtype=np.float64)
    part = np.divide(
        explained, total, out=np.zeros(np.broadcast_shapes(np.shape(explained), total.shape)), where=total > 0
    )
    part = np.minimum(part, 1.0)
    df = np.asarray(null_df, dtype=np.float64)
    value = 0.5 * np.log(shrink) - 0.5 * df * np.log1p(-(1.0 - shrink) * part)
    return np.where(df > 0, value, 0.0)


def log_e_value(t: ArrayLike, df: ArrayLike, n: ArrayLike, phi: float) -> NDArray[np.float64]:
    """Log E of a contrast from its t statistic; arguments broadcast.

    Args:
        t: estimate divided by its standard error.
        df: degrees of freedom of the standard error; `inf` for a known spread; 0 gives log E = 0.
        n: number of units, (sd of one unit / standard error)^2; for two groups n_a n_b / (n_a + n_b).
        phi: tuning, 1 / variance of the standardised difference.
    """
    square, df, n = np.broadcast_arrays(np.square(np.asarray(t, float)), np.asarray(df, float), np.asarray(n, float))
    shrink = phi / (phi + n)
    known = np.isinf(df)
    finite = np.where(known, 1.0, df)
    sums = log_evidence(
        square, np.where(finite > 0, finite + square, 0.0), np.where(finite > 0, finite + 1, 0.0), n, phi
    )
    return np.where(known, 0.5 * np.log(shrink) + 0.5 * (1.0 - shrink) * square, sums)


def critical_t(df: ArrayLike, n: ArrayLike, phi: float, share: ArrayLike) -> NDArray[np.float64]:
    """The |t| at which E reaches 1 / share: half the length of the confidence sequence, in standard errors.

    {d : E((estimate - d) / se) < 1 / share} covers the true difference at every look together with probability at
    least 1 - share. `inf` where so few units cannot bound the difference at this share. Arguments broadcast.

    Args:
        df: degrees of freedom of the standard error (`inf` allowed).
        n: number of units of the contrast.
        phi: tuning.
        share: the error rate this one interval may spend, in (0, 1).
    """
    df, n, share = np.broadcast_arrays(np.asarray(df, float), np.asarray(n, float), np.asarray(share, float))
    shrink = phi / (phi + n)
    reach = -np.log(share) - 0.5 * np.log(shrink)
    known = np.isinf(df)
    log_ratio = np.minimum(2.0 * reach / (np.where(known, 1.0, df) + 1.0), 700.0)
    room = 1.0 - shrink * np.exp(log_ratio)
    bounded = (room > 0) & (df > 0) & (n > 0)
    t_squared = np.where(known, 1.0, df) * np.expm1(log_ratio) / np.where(bounded, room, 1.0)
    spread_known = 2.0 * reach / np.where(n > 0, 1.0 - shrink, 1.0)
    squared = np.where(known, spread_known, t_squared)
    return np.where(bounded | (known & (n > 0)), np.sqrt(squared), np.inf)


def p_from_log(log_e: ArrayLike) -> NDArray[np.float64]:
    """min(1, 1/E), not below `SMALLEST_P`."""
    p: NDArray[np.float64] = np.clip(np.exp(-np.clip(log_e, -1.0, 1000.0)), SMALLEST_P, 1.0)
    return p
