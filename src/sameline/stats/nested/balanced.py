"""The closed form of REML for balanced nested data: mean squares, pooled where they are out of order.

With every batch of the same size the criterion is Σ ν (log λ + MS/λ) over the levels, with λ = expected mean square
falling from the top level to the residual. Without the order the answer is λ = MS, the classical analysis of
variance; with it, adjacent mean squares out of order are pooled (Thompson 1962, Ann. Math. Statist. 33:273-289).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from sameline.stats.nested.layout import Layout


def has_closed_form(layout: Layout) -> bool:
    """Whether mean squares alone give the REML estimate."""
    same_size = bool(np.all(layout.size == layout.size[0]))
    return len(layout.random) == 1 or (same_size and (len(layout.random) == 2 or layout.balanced))


def mean_squares(layout: Layout) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Sums of squares, degrees of freedom and values in a unit, each level against the one above, top down."""
    ss, df, unit = [layout.within_ss], [float(layout.within_df)], [1.0]
    starts = layout.upper_starts
    if len(layout.random) > 1:
        ss.append(float(np.sum(layout.size * (layout.second - layout.first**2 / layout.count))))
        df.append(layout.lower - layout.cell_starts.size)
        unit.append(float(layout.size[0]))
    if len(layout.random) > 2:
        uppers = np.diff(np.append(starts, layout.centre.size))
        mean = np.add.reduceat(layout.centre, starts) / uppers
        ss.append(float(unit[-1] * layout.count[0] * np.sum((layout.centre - np.repeat(mean, uppers)) ** 2)))
        df.append(layout.centre.size - layout.k)
        unit.append(unit[-1] * float(layout.count[0]))
    return np.array(ss[::-1]), np.array(df[::-1]), np.array(unit[::-1])


def closed_form(layout: Layout) -> NDArray[np.float64]:
    """The components, top down, from mean squares pooled into falling order; a pooled level is exactly zero."""
    ss, df, unit = mean_squares(layout)
    blocks: list[tuple[float, float, int]] = []
    for sum_of_squares, freedom in zip(ss.tolist(), df.tolist(), strict=True):
        blocks.append((sum_of_squares, freedom, 1))
        while len(blocks) > 1 and blocks[-2][0] * blocks[-1][1] <= blocks[-1][0] * blocks[-2][1]:
            low, high = blocks.pop(), blocks.pop()
            blocks.append((low[0] + high[0], low[1] + high[1], low[2] + high[2]))
    expected = [square / freedom for square, freedom, members in blocks for _ in range(members)]
    components = -np.diff(np.array(expected))
    return np.append(components / unit[:-1] + 0.0, expected[-1])  # + 0.0: no minus before a zero
