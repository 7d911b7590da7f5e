"""Variance components with intervals, and what they mean as precision in the sense of ISO 5725.

Repeatability: the spread between replicates of one run. Intermediate precision: of single values from different runs
of one batch in one laboratory, run and replicate (and session) together (ISO 5725-3). What sets batches apart is the
material's, not the measurement's, and stays out of both.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
from scipy.special import chdtri

from sameline.stats.nested.frames import frame_of
from sameline.stats.nested.mls import combination_interval
from sameline.stats.nested.profile import profile_interval
from sameline.stats.verdicts import check_alpha

if TYPE_CHECKING:
    import pandas as pd
    from numpy.typing import NDArray

    from sameline.stats.nested.estimate import Estimate
    from sameline.stats.nested.levels import Collapsed

REPEATABILITY, INTERMEDIATE, TOTAL = "repeatability", "intermediate precision", "total"
FEWEST_DF = 1e-3


class Spread(NamedTuple):
    """One component or sum of components; deviations in the values' unit.

    `lower` and `upper` are the ends of the deviation's 1 - alpha interval, None where it cannot be had; `share` is
    the part of the total variance.
    """

    name: str
    variance: float
    standard_deviation: float
    lower: float | None
    upper: float | None
    share: float


@dataclass(frozen=True, slots=True)
class ComponentTable:
    """Spreads of one fit.

    Args:
        levels: one entry a level that has a component of its own, top down.
        precision: repeatability and intermediate precision, where the data tell them, and the total.
        method: how the intervals were made.
        alpha: 1 - the confidence of each.
    """

    levels: tuple[Spread, ...]
    precision: tuple[Spread, ...]
    method: str
    alpha: float

    def frame(self) -> pd.DataFrame:
        """Columns name, variance, standard_deviation, lower, upper, share; levels first, then precision."""
        return frame_of(Spread._fields, (*self.levels, *self.precision))


def component_table(estimate: Estimate, collapsed: tuple[Collapsed, ...], alpha: float) -> ComponentTable:
    """Intervals for every level and for the ISO 5725 sums.

    Raises:
        StatsError: alpha is not between 0 and 1.
    """
    alpha = check_alpha(alpha)
    total = float(estimate.theta.sum())
    names = estimate.random

    def row(name: str, weights: NDArray[np.float64]) -> Spread:
        variance = float(weights @ estimate.theta)
        low, high = _interval(estimate, weights, alpha)
        return Spread(name, variance, variance**0.5, _root(low), _root(high), variance / total)

    each = np.eye(len(names))
    levels = tuple(row(name, weights) for name, weights in zip(names, each, strict=True))
    sums = [(name, _weights(names, members)) for name, members in _precision(names, collapsed)]
    return ComponentTable(levels, tuple(row(name, weights) for name, weights in sums), _method(estimate), alpha)


def _precision(names: tuple[str, ...], collapsed: tuple[Collapsed, ...]) -> list[tuple[str, set[str]]]:
    """Which components add up to what; sums that the data cannot tell are left out."""
    found: list[tuple[str, set[str]]] = []
    into = {gone.level: gone.into for gone in collapsed}
    if "replicate" in names:
        found.append((REPEATABILITY, {"replicate"}))
    of_batch = {level for level, where in into.items() if where == "batch"}
    seen_run = "run" in names or into.get("run") == "session"
    if seen_run and not of_batch & {"run", "session"}:
        found.append((INTERMEDIATE, set(names) - {"batch"}))
    return [*found, (TOTAL, set(names))]


def _weights(names: tuple[str, ...], members: set[str]) -> NDArray[np.float64]:
    return np.array([float(name in members) for name in names])


def _method(estimate: Estimate) -> str:
    if estimate.squares is not None:
        return "modified large sample (Ting et al. 1990) on unweighted mean squares"
    if estimate.criterion_at is not None:
        return "profile likelihood; sums by Satterthwaite"
    return "chi-squared with Satterthwaite's degrees of freedom"


def _interval(estimate: Estimate, weights: NDArray[np.float64], alpha: float) -> tuple[float | None, float | None]:
    squares = estimate.squares
    if squares is not None:
        coefficients = np.asarray(np.linalg.solve(squares.expectation.T, weights), float)
        return combination_interval(coefficients, squares.value, squares.df, alpha)
    if estimate.criterion_at is not None and np.count_nonzero(weights) == 1:
        return profile_interval(estimate.criterion_at, estimate.theta, int(np.argmax(weights)), alpha)
    variance = float(weights @ estimate.theta)
    error = float(weights @ estimate.expected @ weights)
    df = 2.0 * variance**2 / error if error > 0.0 else 0.0
    if df < FEWEST_DF:
        return None, None
    return variance * df / float(chdtri(df, alpha / 2.0)), variance * df / float(chdtri(df, 1.0 - alpha / 2.0))


def _root(variance: float | None) -> float | None:
    return None if variance is None else float(np.sqrt(variance))
