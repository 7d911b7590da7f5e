"""What one look alone would say: Tukey-Kramer for all pairs, Dunnett with a control, on unit means."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from sameline.stats.dunnett_distribution import dunnett_isf, dunnett_sf
from sameline.stats.studentized_range import studentized_range_isf, studentized_range_sf

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from sameline.stats.looks.units import Contrasts, PairFigures, UnitMeans

    Floats = NDArray[np.float64]


def single_p(seen: UnitMeans, figures: PairFigures, *, control: bool) -> Floats:
    """Adjusted p-values, (m,); 1 where a pair cannot be judged."""
    good = np.array([not reason for reason in figures.missing])
    p = np.ones(good.size)
    if not good.any():
        return p
    t = np.abs(figures.difference[good] / figures.standard_error[good])
    if control:
        p[good] = dunnett_sf(t, control_weights(seen), seen.df)
    else:
        p[good] = studentized_range_sf(t * math.sqrt(2.0), seen.present, seen.df)
    return p


def single_critical_t(seen: UnitMeans, alpha: float, *, control: bool) -> float:
    """The |t| at which a single look at error rate alpha claims; needs df > 0 and two groups with units."""
    if control:
        return float(dunnett_isf(alpha, control_weights(seen), seen.df))
    return float(studentized_range_isf(alpha, seen.present, seen.df)) / math.sqrt(2.0)


def control_weights(seen: UnitMeans) -> Floats:
    """Dunnett's weights sqrt(n_i / (n_i + n_0)) of the groups that have units."""
    n = np.array([count for count in seen.n[1:] if count > 0], dtype=np.float64)
    return np.sqrt(n / (n + seen.n[0]))


def single_p_contrasts(contrasts: Contrasts) -> Floats:
    """Tukey-adjusted p-values of contrasts, each on its own degrees of freedom (Games and Howell's form), (m,)."""
    t = np.abs(np.array(contrasts.estimates) / np.array(contrasts.standard_errors))
    p = studentized_range_sf(t * math.sqrt(2.0), len(contrasts.labels), np.array(contrasts.dfs))
    return np.asarray(p, dtype=np.float64)


def contrast_critical_t(contrasts: Contrasts, alpha: float) -> Floats:
    """The |t| that belongs to `single_p_contrasts` = alpha, (m,)."""
    q = studentized_range_isf(alpha, len(contrasts.labels), np.array(contrasts.dfs))
    return np.asarray(q, dtype=np.float64) / math.sqrt(2.0)
