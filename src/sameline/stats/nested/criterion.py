"""The REML criterion of nested data and its exact derivatives, summed over cells, batches and groups.

Model: y = μ[group] + upper + lower + residual, independent normal, variances θ (top down). Within one upper unit the
lower means have variance v = θ_lower + θ_residual/n and share θ_upper. With a = 1/v, w = Σa and s = 1/(1 + θ_upper w)
the upper unit adds to its group

    X'V⁻¹X: s w,   log|V|: Σ log v - log s,   r'V⁻¹r: s w m² + 2 s m u + Σ a d² - θ_upper s u²,   u = Σ a d,

for centre m and deviations d of its lower means: no difference of large numbers. Harville (1977), J. Amer. Statist.
Assoc. 72:320-338, gives REML; minus twice its logarithm is log|V| + log|X'V⁻¹X| + r'V⁻¹r + (n - k) log 2π.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from sameline.stats.nested import jets

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from sameline.stats.nested.jets import Jet
    from sameline.stats.nested.layout import Layout


@dataclass(frozen=True, slots=True)
class Criterion:
    """Minus twice the REML log likelihood at one θ, with what inference needs.

    Args:
        value: the criterion.
        gradient: shape (t,).
        hessian: shape (t, t); half of it is the observed information.
        information: expected information of all components, shape (t, t).
        means: group means about the origin, shape (k,).
        precision: X'V⁻¹X with derivatives: its diagonal, one entry a group.
    """

    value: float
    gradient: NDArray[np.float64]
    hessian: NDArray[np.float64]
    information: NDArray[np.float64]
    means: NDArray[np.float64]
    precision: Jet


def nested_criterion(layout: Layout, theta: NDArray[np.float64]) -> Criterion:
    """Evaluates the criterion at components `theta`, shape (t,), residual above zero."""
    t = theta.size
    residual = jets.component(theta, t - 1)
    variance = _variance(layout, theta)
    a = variance.reciprocal()
    w, u, q = (a.mapped(weights) for weights in layout.by_size)
    determinant = variance.log().scaled(layout.size_totals).total() + residual.log().scaled(layout.within_df)
    if t > 2:
        top = jets.component(theta, 0)
        shrink = (top * w + jets.constant(1.0, t)).reciprocal()
        determinant = determinant + shrink.log().scaled(-1.0).total()
        q = q + (top * (u * u) * shrink).scaled(-1.0)
        w, u = shrink * w, shrink * u
    starts = layout.upper_starts
    precision = w.summed(starts)
    means = np.add.reduceat(w.value * layout.centre + u.value, starts) / precision.value
    m = layout.centre - np.repeat(means, np.diff(np.append(starts, layout.centre.size)))
    score = (w.scaled(m) + u).summed(starts)
    fit = (w.scaled(m * m) + u.scaled(2.0 * m) + q).total() + residual.reciprocal().scaled(layout.within_ss)
    volume = determinant + precision.log().total()
    profile = 2.0 * (score.slope / precision.value) @ score.slope.T
    constant = layout.log_sizes + (layout.values - layout.k) * math.log(2.0 * math.pi)
    return Criterion(
        value=float(volume.value[0] + fit.value[0] + constant),
        gradient=(volume.slope + fit.slope)[:, 0],
        hessian=(volume.curve + fit.curve)[:, :, 0] - profile,
        information=-0.5 * volume.curve[:, :, 0],
        means=means,
        precision=precision,
    )


def _variance(layout: Layout, theta: NDArray[np.float64]) -> Jet:
    """Variance of a lower mean about its upper unit, for each size of lower units."""
    slope = np.zeros((theta.size, layout.sizes.size))
    slope[-1] = 1.0 / layout.sizes
    value = theta[-1] / layout.sizes
    if theta.size > 1:
        slope[-2] = 1.0
        value = value + theta[-2]
    return jets.linear(value, slope)
