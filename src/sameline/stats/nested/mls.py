"""Intervals for linear combinations of mean squares: the modified large-sample method.

For γ = Σ c_i MS_i, MS_i/E(MS_i) ~ χ²(ν_i)/ν_i independent, the ends are γ̂ ∓ sqrt(V) with V built from exact χ² and F
points, so that a single mean square has its exact interval and differences of two come close to their confidence for
all ratios (Ting, Burdick, Graybill, Jeyaratnam and Lu 1990, J. Statist. Comput. Simul. 35:135-143; sums: Graybill and
Wang 1980, J. Amer. Statist. Assoc. 75:869-873; Burdick and Graybill 1992, Confidence Intervals on Variance
Components).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from scipy.special import chdtri, fdtri

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Floats = NDArray[np.float64]


def combination_interval(coefficients: Floats, mean_squares: Floats, df: Floats, alpha: float) -> tuple[float, float]:
    """Two-sided 1 - alpha interval for Σ c MS, cut at zero.

    Args:
        coefficients: shape (m,), any signs.
        mean_squares: shape (m,), >= 0.
        df: their degrees of freedom, > 0, shape (m,).
        alpha: error rate of the interval.
    """
    used = coefficients != 0.0
    weighted, freedom = (coefficients * mean_squares)[used], df[used]
    estimate = float(weighted.sum())
    plus, minus = weighted > 0.0, weighted < 0.0
    low = _variance(weighted[plus], freedom[plus], -weighted[minus], freedom[minus], alpha / 2.0)
    high = _variance(-weighted[minus], freedom[minus], weighted[plus], freedom[plus], alpha / 2.0)
    return max(estimate - low**0.5, 0.0), max(estimate + high**0.5, 0.0)


def _variance(down: Floats, down_df: Floats, up: Floats, up_df: Floats, tail: float) -> float:
    """V of one bound: `down` are the terms whose mean squares may be too large for it, `up` those too small."""
    g = 1.0 - down_df / chdtri(down_df, tail)
    h = up_df / chdtri(up_df, 1.0 - tail) - 1.0
    total = float(np.sum((g * down) ** 2) + np.sum((h * up) ** 2))
    for a, na, ga in zip(down, down_df, g, strict=True):
        for b, nb, hb in zip(up, up_df, h, strict=True):
            f = float(fdtri(na, nb, 1.0 - tail))
            total += ((f - 1.0) ** 2 - (ga * f) ** 2 - hb**2) / f * a * b
    return max(total, 0.0)
