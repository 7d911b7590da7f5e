"""Spending the error rate by information fraction (Lan and DeMets 1983, Biometrika 70:659-663).

A spending function gives the error rate that may be spent until a fraction of the planned data is there; it rises from
0 to alpha at fraction 1. Looks need not be foreseen in number or time, as long as their times do not depend on results.
"""

from __future__ import annotations

import math
from typing import Literal

import numpy as np
from scipy.special import ndtr, ndtri

from sameline.errors import StatsError

Spending = Literal["obrien-fleming", "pocock"]
SPENDINGS: tuple[Spending, ...] = ("obrien-fleming", "pocock")


def spent(spending: Spending, fraction: float, alpha: float) -> float:
    """Error rate spent until `fraction` of the information.

    Args:
        spending: "obrien-fleming": 4 - 4 Phi(z(1 - alpha/4) / sqrt(t)), hardly anything early (Lan and DeMets' first
            function with alpha/2 to either side); "pocock": alpha ln(1 + (e - 1) t), nearly evenly.
        fraction: t, in [0, inf); from 1 on all of alpha is spent.
        alpha: the whole error rate, in (0, 1).

    Raises:
        StatsError: an unknown function, or a fraction or alpha out of range.
    """
    if spending not in SPENDINGS:
        raise StatsError(f"unknown spending {spending!r}", where="spending", advice=f"use {' or '.join(SPENDINGS)}")
    if not (fraction >= 0 and 0 < alpha < 1):
        raise StatsError(f"fraction {fraction!r} or alpha {alpha!r} is out of range", where="fraction")
    if fraction >= 1:
        return alpha
    if fraction == 0:
        return 0.0
    if spending == "pocock":
        return alpha * math.log1p((math.e - 1.0) * fraction)
    return float(4.0 * ndtr(ndtri(alpha / 4.0) / math.sqrt(fraction)))


def rate_that_spends(spending: Spending, before: float, now: float, increment: float) -> float:
    """The least alpha whose spending between two fractions is at least `increment`; 1.0 when none is.

    Args:
        spending: the function.
        before: fraction until which was spent already, < 1.
        now: fraction until which may be spent, > before.
        increment: error rate wanted for the step.
    """

    def step(alpha: float) -> float:
        return spent(spending, now, alpha) - spent(spending, before, alpha)

    grid = np.exp(np.linspace(math.log(1e-300), math.log(0.999), 2000))
    enough = next((i for i, alpha in enumerate(grid.tolist()) if step(alpha) >= increment), None)
    if enough is None:
        return 1.0
    if enough == 0:
        return float(grid[0])
    low, high = math.log(grid[enough - 1]), math.log(grid[enough])
    for _ in range(60):
        middle = 0.5 * (low + high)
        low, high = (low, middle) if step(math.exp(middle)) >= increment else (middle, high)
    return math.exp(high)
