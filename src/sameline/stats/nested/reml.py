"""Minimises a REML criterion over components that cannot be negative: Newton steps with exact derivatives.

A component at zero whose gradient points outwards stays there. Where the exact Hessian is not positive definite the
expected information takes its place (Fisher scoring), and steps are halved until the criterion falls. The last steps
are full Newton steps, so that the components are as exact as their derivatives.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Protocol, TypeVar

import numpy as np

from sameline.errors import StatsError

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable

    from numpy.typing import NDArray


class Evaluated(Protocol):
    """A criterion at one point, as `Criterion` gives it."""

    @property
    def value(self) -> float:
        """The criterion."""

    @property
    def gradient(self) -> NDArray[np.float64]:
        """First derivatives, shape (t,)."""

    @property
    def hessian(self) -> NDArray[np.float64]:
        """Second derivatives, shape (t, t)."""

    @property
    def information(self) -> NDArray[np.float64]:
        """Expected information, shape (t, t)."""


E = TypeVar("E", bound=Evaluated)
MOST_STEPS = 200
CLOSE, DONE = 1e-7, 1e-20
SAME = 0.02  # of the largest component: a Newton step that aims so near to a known minimum leads to it


def minimise(
    evaluate: Callable[[NDArray[np.float64]], E],
    starts: Iterable[NDArray[np.float64]],
    *,
    last_positive: bool = True,
) -> tuple[NDArray[np.float64], E]:
    """The lowest of the minima reached from `starts`, and the criterion there.

    Args:
        evaluate: the criterion at components of shape (t,), all >= 0.
        starts: components to start from; the first wins a tie.
        last_positive: the last component is a residual, which may not become zero.

    Raises:
        StatsError: no start led to a minimum.
    """
    best: tuple[NDArray[np.float64], E] | None = None
    for start in starts:
        found = _descend(evaluate, start, 0.1 if last_positive else 0.0, None if best is None else best[0])
        if found and (best is None or found[1].value < best[1].value - 1e-9 * (1.0 + abs(best[1].value))):
            best = found
    if best is None:
        raise StatsError(
            "the variance components could not be found: the search came to no end",
            where="values",
            advice="look for a unit whose values are many orders of magnitude away from the rest",
        )
    return best


def _descend(
    evaluate: Callable[[NDArray[np.float64]], E],
    start: NDArray[np.float64],
    shrink: float,
    known: NDArray[np.float64] | None,
) -> tuple[NDArray[np.float64], E] | None:
    """The minimum below `start`; None if there is none or if it is the known one."""
    theta, here = start, evaluate(start)
    last = np.inf
    for _ in range(MOST_STEPS):
        step, decrement = _step(theta, here)
        if decrement <= DONE or (last < CLOSE and decrement >= last):
            return theta, here
        length = 1.0
        trial = _moved(theta, step, shrink)
        if known is not None and decrement < 1.0 and np.max(np.abs(trial - known)) < SAME * known.max():
            return None
        there = evaluate(trial)
        while decrement > CLOSE and there.value > here.value + 1e-4 * float(here.gradient @ (trial - theta)):
            length *= 0.5
            if length < 1e-12:
                return None
            trial = _moved(theta, length * step, shrink)
            there = evaluate(trial)
        theta, here, last = trial, there, decrement
    return None


def _moved(theta: NDArray[np.float64], step: NDArray[np.float64], shrink: float) -> NDArray[np.float64]:
    """Along the step, held at zero, and the last component at a share of what it was."""
    moved = np.maximum(theta + step, 0.0)
    moved[-1] = max(moved[-1], shrink * theta[-1])
    return moved


def _step(theta: NDArray[np.float64], here: Evaluated) -> tuple[NDArray[np.float64], float]:
    """Newton step of the free components, and how much it promises (twice the fall of the criterion)."""
    step = np.zeros_like(theta)
    free = free_components(theta, here.gradient)
    while free.any():
        inner = np.ix_(free, free)
        gradient = here.gradient[free]
        step[:] = 0.0
        step[free] = _solved(here.hessian[inner], 2.0 * here.information[inner], gradient)
        # A component at zero that the joint step would push below it is fixed there, and the rest step without it.
        pushed = free & (theta <= 0.0) & (step < 0.0)
        if not pushed.any():
            return step, float(-gradient @ step[free])
        free = free & ~pushed
    return step, 0.0


def free_components(theta: NDArray[np.float64], gradient: NDArray[np.float64]) -> NDArray[np.bool_]:
    """Which components are above zero or would leave it."""
    return np.asarray((theta > 0.0) | (gradient < 0.0))


def _solved(
    hessian: NDArray[np.float64], expected: NDArray[np.float64], gradient: NDArray[np.float64]
) -> NDArray[np.float64]:
    for matrix in (hessian, expected):
        diagonal = np.diag(matrix)
        if not np.all(diagonal > 0.0):
            continue
        scale = 1.0 / np.sqrt(diagonal)
        roots, axes = np.linalg.eigh(matrix * scale[:, None] * scale[None, :])
        if roots[0] > 1e-10:
            return np.asarray(-scale * (axes @ ((axes.T @ (scale * gradient)) / roots)))
    diagonal = np.diag(expected)
    return np.divide(-gradient, diagonal, out=np.zeros_like(gradient), where=diagonal > 0.0)
