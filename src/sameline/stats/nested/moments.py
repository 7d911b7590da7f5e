"""The classical nested analysis of variance with expected mean squares: the older answer beside REML.

Every level is random and nested in the one above. With sequential sums of squares SS of level i among units of level
i - 1, E(MS_i) = Σ_j k_ij θ_j over the levels j from i down, k_ij = [Σ n_v²/n_u - Σ n_v²/n_p] / df_i, where v runs over
units of level j, u is the unit of level i and p the unit of level i - 1 that v lies in. Solving upwards gives the
components; a negative one is shown as it is (`variance_raw`) and as zero (`variance`). Each level is tested against
the combination of lower mean squares that has its expectation without the level's own component, degrees of freedom
by Satterthwaite; in balanced data that is the next level's mean square and the F test is exact.

References: Searle, Casella and McCulloch (1992), Variance Components, ch. 5 and app. F; Gaylor and Hopper (1969),
Technometrics 11:691-706.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np

from sameline.errors import StatsError
from sameline.stats.distributions import f_sf
from sameline.stats.nested.frames import frame_of
from sameline.stats.nested.levels import first_of
from sameline.stats.nested.rows import read_rows

if TYPE_CHECKING:
    from collections.abc import Iterable

    import pandas as pd
    from numpy.typing import NDArray

    Floats = NDArray[np.float64]


class LevelLine(NamedTuple):
    """One line of the table; `statistic` and what follows from it are None for the replicates."""

    source: str
    df: int
    ss: float
    ms: float
    statistic: float | None
    denominator_df: float | None
    p_value: float | None
    variance_raw: float
    variance: float
    standard_deviation: float
    share: float


@dataclass(frozen=True, slots=True)
class NestedAnova:
    """Nested analysis of variance.

    Args:
        lines: one a level, top down, ending with "replicate".
        expectation: E(MS) = expectation @ components, shape (t, t), upper triangular, read-only.
        grand_mean: mean of all values.
        total_variance: sum of the components cut at zero.
    """

    lines: tuple[LevelLine, ...]
    expectation: NDArray[np.float64]
    grand_mean: float
    total_variance: float

    def frame(self) -> pd.DataFrame:
        """One row a level: the fields of `LevelLine`."""
        return frame_of(LevelLine._fields, self.lines)


def nested_anova(
    values: Iterable[Any],
    groups: Iterable[Any] | None = None,
    batches: Iterable[Any] | None = None,
    runs: Iterable[Any] | None = None,
) -> NestedAnova:
    """Analyses nested data by expected mean squares, every given level random.

    Args:
        values: measured values, shape (n,).
        groups: label of each value's group, or None.
        batches: label of its batch within the group, or None.
        runs: label of its run within the batch, or None.

    Raises:
        StatsError: no level is given, or a level has no more units than the one above.
    """
    rows = read_rows(values, groups, batches, runs, None)
    given = {"group": groups, "batch": batches, "run": runs}
    levels = (*(level for level, labels in given.items() if labels is not None), "replicate")
    if len(levels) == 1:
        raise StatsError("no level is given", where="groups", advice="give groups, batches or runs")
    units = [np.zeros(rows.y.size, np.intp), *(rows.units[level] for level in levels)]
    df = np.diff([int(unit.max()) + 1 for unit in units])
    if np.any(df == 0):
        which = levels[int(np.argmax(df == 0))]
        raise StatsError(
            f"there are no more units of {which} than of the level above", where=which, advice="leave that level out"
        )
    ss, mean = _sums_of_squares(rows.y, units)
    expectation = _expectation(units, df)
    lines = _lines(levels, df, ss, expectation)
    expectation.setflags(write=False)
    return NestedAnova(lines, expectation, mean + rows.origin, sum(line.variance for line in lines))


def _sums_of_squares(y: Floats, units: list[NDArray[np.intp]]) -> tuple[Floats, float]:
    fitted = [_spread_out(y, unit) for unit in units]
    squares = [float(np.sum((low - high) ** 2)) for high, low in pairwise(fitted)]
    return np.array(squares), float(fitted[0][0])


def _spread_out(y: Floats, unit: NDArray[np.intp]) -> Floats:
    """The mean of each value's unit; two passes about one of its values."""
    starts = first_of(unit)
    size = np.diff(np.append(starts, y.size))
    centre = np.repeat(y[starts], size)
    mean = centre + np.repeat(np.add.reduceat(y - centre, starts) / size, size)
    return np.asarray(mean + np.repeat(np.add.reduceat(y - mean, starts) / size, size))


def _expectation(units: list[NDArray[np.intp]], df: NDArray[np.int64]) -> Floats:
    t = df.size
    sizes = [np.bincount(unit)[unit] for unit in units]
    matrix = np.zeros((t, t))
    for i in range(t):
        for j in range(i, t):
            # Summed over values instead of units: n_v² over unit v is n_v for each of its n_v values.
            size = sizes[j + 1]
            matrix[i, j] = float(np.sum(size / sizes[i + 1]) - np.sum(size / sizes[i])) / df[i]
    return matrix


def _lines(levels: tuple[str, ...], df: NDArray[np.int64], ss: Floats, expectation: Floats) -> tuple[LevelLine, ...]:
    ms = ss / df
    raw = np.asarray(np.linalg.solve(expectation, ms), float)
    total = float(np.maximum(raw, 0.0).sum())
    found: list[LevelLine] = []
    for i, level in enumerate(levels):
        statistic = denominator_df = p = None
        if i < len(levels) - 1:
            below = expectation[i + 1 :, i + 1 :]
            weights = np.linalg.solve(below.T, expectation[i, i + 1 :])
            parts = weights * ms[i + 1 :]
            denominator = float(parts.sum())
            if denominator > 0.0:
                denominator_df = float(denominator**2 / np.sum(parts**2 / df[i + 1 :]))
                statistic = float(ms[i] / denominator)
                p = float(f_sf(statistic, df[i], denominator_df))
        variance = max(float(raw[i]), 0.0)
        share = variance / total if total else 0.0
        found.append(
            LevelLine(
                level,
                int(df[i]),
                float(ss[i]),
                float(ms[i]),
                statistic,
                denominator_df,
                p,
                float(raw[i]),
                variance,
                variance**0.5,
                share,
            )
        )
    return tuple(found)
