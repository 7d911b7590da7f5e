"""Mean squares of unweighted means, for intervals: their expectations are exact, their distributions near χ².

In balanced data they are the classical mean squares (per unit of the level). In unbalanced data unweighted means keep
each mean square close to χ² and nearly independent of the others (Thomas and Hultquist 1978, Ann. Statist. 6:582-587;
Burdick and Graybill 1992, ch. 4 and 6).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from sameline.stats.nested.layout import Layout


@dataclass(frozen=True, slots=True)
class MeanSquares:
    """One mean square a level, top down.

    Args:
        value: shape (t,).
        df: degrees of freedom, shape (t,).
        expectation: E(value) = expectation @ θ, shape (t, t), upper triangular with ones on its diagonal.
    """

    value: NDArray[np.float64]
    df: NDArray[np.float64]
    expectation: NDArray[np.float64]


def unweighted_mean_squares(layout: Layout) -> MeanSquares:
    """Mean squares of unweighted means of every level of the layout."""
    t = len(layout.random)
    value, df, expectation = np.zeros(t), np.zeros(t), np.eye(t)
    value[-1], df[-1] = layout.within_ss / layout.within_df, layout.within_df
    if t > 1:
        per_upper = np.add.reduceat(layout.count, layout.cell_starts)
        inverse_sizes = np.add.reduceat(layout.count / layout.size, layout.cell_starts)
        square = np.add.reduceat(layout.second, layout.cell_starts)
        square = square - np.add.reduceat(layout.first, layout.cell_starts) ** 2 / per_upper
        df[-2] = layout.lower - per_upper.size
        value[-2] = square.sum() / df[-2]
        expectation[-2, -1] = np.sum((1.0 - 1.0 / per_upper) * inverse_sizes) / df[-2]
    if t > 2:
        uppers = np.diff(np.append(layout.upper_starts, layout.centre.size))
        mean = np.add.reduceat(layout.centre, layout.upper_starts) / uppers
        share = 1.0 - np.repeat(1.0 / uppers, uppers)
        df[0] = layout.centre.size - layout.k
        value[0] = np.sum((layout.centre - np.repeat(mean, uppers)) ** 2) / df[0]
        expectation[0, 1] = np.sum(share / per_upper) / df[0]
        expectation[0, 2] = np.sum(share * inverse_sizes / per_upper**2) / df[0]
    return MeanSquares(value, df, expectation)
