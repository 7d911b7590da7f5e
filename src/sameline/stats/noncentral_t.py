"""Tails of the noncentral t distribution for power, by quadrature over the estimated scale.

P(T > c) = E[Φ(δ - c S)], S² ~ χ²(ν)/ν: a smooth integrand on a short range, so that Gauss-Legendre nodes give nearly
full precision in every tail (library series return no number for small ones).

Reference: Johnson, Kotz and Balakrishnan (1995), Continuous Univariate Distributions 2, ch. 31.
"""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
from scipy.special import gammainccinv, gammaincinv, ndtr

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Floats = NDArray[np.float64]

NODES = 120
CUT = 1e-18


def noncentral_t_sf(c: float, df: float, shift: float) -> float:
    """P(T > c) to 1e-12, for `df` >= 1 degrees of freedom (inf: the normal) and noncentrality `shift`."""
    if np.isinf(df):
        return float(ndtr(shift - c))
    scale, weight = _scale(float(df))
    return min(1.0, float(weight @ ndtr(shift - c * scale)))


def noncentral_t_two_sided(c: float, df: float, shift: float) -> float:
    """P(|T| > c): the power of a two-sided test with critical value `c` >= 0."""
    return min(1.0, noncentral_t_sf(c, df, shift) + noncentral_t_sf(c, df, -shift))


@lru_cache(maxsize=512)
def _scale(df: float) -> tuple[Floats, Floats]:
    """Nodes of S and their weights, which sum to 1.

    With few degrees of freedom the density of S has a root-like start at 0; nodes in S**(1/4) make it smooth.
    """
    half, root = df / 2.0, 4.0 if df < 4.0 else 1.0
    low, high = (float(tail(half, CUT) / half) ** (0.5 / root) for tail in (gammaincinv, gammainccinv))
    x, w = _legendre()
    u = low + (high - low) * (x + 1.0) / 2.0
    s = u**root
    weight = w * np.exp((df - 1.0) * np.log(s) - half * (s**2 - 1.0)) * u ** (root - 1.0)
    return s, weight / weight.sum()


@lru_cache(maxsize=1)
def _legendre() -> tuple[Floats, Floats]:
    x, w = np.polynomial.legendre.leggauss(NODES)
    return x, w
