"""A smooth function of one variable as polynomials on panels, made once and evaluated often.

Each panel holds the polynomial through the function's values at the panel's Chebyshev points (Trefethen,
Approximation Theory and Approximation Practice, 2013, chapters 2-4 and 8): for an analytic function the error
falls geometrically with the degree. The polynomial is kept in powers of the local variable in [-1, 1], because
Horner's rule is the cheapest to evaluate; the loss against the Chebyshev basis is below one digit as long as the
coefficients fall by more than half from one to the next, which panels narrow against the function's features ensure.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Panels:
    """A piecewise polynomial on equal fine panels up to a turn, and equal coarse panels beyond it.

    Attributes:
        start: left end of the first panel.
        turn: where the coarse panels begin.
        end: right end of the last panel.
        fine: width of a panel before the turn.
        coarse: width of a panel after the turn.
        powers: shape (terms, panels), the coefficients of the local variable's powers, lowest first.
    """

    start: float
    turn: float
    end: float
    fine: float
    coarse: float
    powers: Array

    def __call__(self, x: Array) -> Array:
        """Return the values at x, not below start; beyond the end those of the last panel's polynomial."""
        index, local = self._locate(x)
        value: Array = self.powers[-1].take(index)
        for row in self.powers[-2::-1]:
            value *= local
            value += row.take(index)
        return value

    def slope(self, x: Array) -> Array:
        """Return the first derivative at x."""
        index, local = self._locate(x)
        value: Array = (len(self.powers) - 1) * self.powers[-1].take(index)
        for power in range(len(self.powers) - 2, 0, -1):
            value *= local
            value += power * self.powers[power].take(index)
        return np.asarray(value * (2.0 / np.where(x < self.turn, self.fine, self.coarse)))

    def _locate(self, x: Array) -> tuple[NDArray[np.intp], Array]:
        """Return each x's panel and its place in it, in [-1, 1]."""
        place: Array = (x - self.start) * (1.0 / self.fine)
        if self.turn < self.end:
            fine_panels = round((self.turn - self.start) / self.fine)
            place = np.where(x < self.turn, place, fine_panels + (x - self.turn) / self.coarse)
        index = place.astype(np.intp)
        np.minimum(index, self.powers.shape[1] - 1, out=index)
        place -= index
        place *= 2.0
        place -= 1.0
        return index, place


def fit_panels(
    function: Callable[[Array], Array], layout: tuple[float, float, float, float, float], terms: int
) -> Panels:
    """Fit a vectorised function on panels.

    Args:
        function: takes an array of abscissas, returns the values.
        layout: start, turn, end, fine, coarse of `Panels`; the widths must divide their stretches.
        terms: the number of coefficients a panel, its degree plus one.
    """
    start, turn, end, fine, coarse = layout
    edges = np.concatenate(
        [
            np.arange(round((turn - start) / fine)) * fine + start,
            np.arange(round((end - turn) / coarse)) * coarse + turn,
        ]
    )
    widths = np.where(edges < turn, fine, coarse)
    points, to_series, to_powers = _chebyshev(terms)
    x = edges[None, :] + 0.5 * widths[None, :] * (1.0 + points[:, None])
    values = function(x.ravel()).reshape(x.shape)
    # a sum over the first axis adds rows in order, whatever the number of columns: the same digits every time
    series = np.stack([np.sum(row[:, None] * values, axis=0) for row in to_series])
    powers = np.stack([np.sum(row[:, None] * series, axis=0) for row in to_powers])
    powers.flags.writeable = False
    return Panels(start, turn, end, fine, coarse, powers)


@lru_cache(maxsize=8)
def _chebyshev(terms: int) -> tuple[Array, Array, Array]:
    """Return the Chebyshev points of the first kind, values there -> series, series -> powers' coefficients."""
    angles = (np.arange(terms) + 0.5) * np.pi / terms
    to_series = np.cos(np.outer(np.arange(terms), angles)) * (2.0 / terms)
    to_series[0] *= 0.5
    # two steps, not one matrix: the high terms are small, and large entries must meet small numbers only
    to_powers = np.eye(terms)
    for degree in range(2, terms):  # T_n = 2 x T_(n-1) - T_(n-2)
        to_powers[1:, degree] = 2.0 * to_powers[:-1, degree - 1]
        to_powers[:, degree] -= to_powers[:, degree - 2]
    points = np.cos(angles)
    for array in (points, to_series, to_powers):
        array.flags.writeable = False
    return points, to_series, to_powers
