"""Profile likelihood intervals of single components, for designs without independent mean squares.

The interval holds the values of one component at which the REML criterion, minimised over the others, exceeds its
minimum by less than the χ² point of one degree of freedom (Venzon and Moolgavkar 1988, Appl. Statist. 37:87-94).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from scipy.special import chdtri

from sameline.errors import StatsError
from sameline.stats.nested.reml import minimise

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    from sameline.stats.nested.reml import Evaluated

    Criterion = Callable[[NDArray[np.float64]], Evaluated]

MOST_STEPS = 30
NEAR_ZERO = 1e-8


@dataclass(frozen=True, slots=True)
class _Rest:
    """A criterion as a function of all components but one."""

    value: float
    gradient: NDArray[np.float64]
    hessian: NDArray[np.float64]
    information: NDArray[np.float64]


def profile_interval(criterion: Criterion, theta: NDArray[np.float64], index: int, alpha: float) -> tuple[float, float]:
    """Interval of θ[index] at confidence 1 - alpha; its lower end is 0 where the data allow that.

    Args:
        criterion: minus twice the REML log likelihood.
        theta: its minimum, shape (t,).
        index: which component.
        alpha: error rate.

    Raises:
        StatsError: the criterion does not rise above the limit for any value that can be told.
    """
    limit = criterion(theta).value + float(chdtri(1, alpha))

    def excess(value: float) -> float:
        return _minimum_given(criterion, theta, index, value) - limit

    smallest = NEAR_ZERO * float(theta.sum())
    here = max(float(theta[index]), smallest)
    low = _crossing(excess, here, 0.25, smallest) if theta[index] > smallest else None
    high = _crossing(excess, here, 4.0, here * 4.0**MOST_STEPS)
    if high is None:
        raise StatsError("a component has no upper limit", where="values", advice="more units of that level are needed")
    return low or 0.0, high


def _crossing(excess: Callable[[float], float], start: float, factor: float, end: float) -> float | None:
    """Where `excess` turns positive on the way from `start` to `end` by `factor`, or None."""
    from scipy.optimize import brentq  # heavy, and few fits ask for a profile

    inside, outside = start, start * factor
    while excess(outside) <= 0.0:
        inside, outside = outside, outside * factor
        if (outside - end) * (end - start) > 0.0:
            return None
    return float(brentq(excess, inside, outside, xtol=1e-7 * inside, rtol=1e-7))


def _minimum_given(criterion: Criterion, theta: NDArray[np.float64], index: int, value: float) -> float:
    keep = np.arange(theta.size) != index
    whole = theta.copy()

    def rest(others: NDArray[np.float64]) -> _Rest:
        whole[keep], whole[index] = others, value
        found = criterion(whole.copy())
        inner = np.ix_(keep, keep)
        return _Rest(found.value, found.gradient[keep], found.hessian[inner], found.information[inner])

    floor = NEAR_ZERO * float(theta.sum())
    return minimise(rest, [np.maximum(theta[keep], floor)], last_positive=index != theta.size - 1)[1].value
