"""Sufficient statistics of nested data: what is left of the values once they have been read.

The lower units (runs, say) are known by their number of values and mean, and all together by one sum of squares
within. Lower units of one upper unit (a batch) that have the same number of values share their variance, so only
their count, sum and sum of squares about the upper unit's centre are kept: a cell. Fitting walks over cells and
upper units, never over values.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import csr_array

from sameline.stats.nested.levels import first_of

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from sameline.stats.nested.levels import Chain


@dataclass(frozen=True, slots=True)
class Layout:
    """Sufficient statistics, in canonical order of groups, upper units and cells.

    Args:
        random: names of the components, from the top down; the last is the residual; length t of 1, 2 or 3.
        k: groups.
        within_ss: sum of squares within lower units.
        within_df: its degrees of freedom, values minus lower units.
        log_sizes: sum of the logarithms of the lower units' numbers of values.
        size: values in each lower unit of a cell, shape (c,).
        count: lower units in a cell.
        first: sum of (lower mean - centre of the upper unit) over a cell.
        second: sum of squares of the same.
        sizes: the different sizes of lower units, shape (d,).
        size_totals: lower units of each size, shape (d,).
        by_size: count, first and second as sparse matrices, upper units by sizes, shape (u, d) each.
        cell_starts: first cell of each upper unit, shape (u,).
        centre: centre of each upper unit about the origin, shape (u,).
        upper_starts: first upper unit of each group, shape (k,).
        group_values: values in each group, shape (k,).
        group_units: units of the topmost random level in each group, shape (k,).
    """

    random: tuple[str, ...]
    k: int
    within_ss: float
    within_df: int
    log_sizes: float
    size: NDArray[np.float64]
    count: NDArray[np.float64]
    first: NDArray[np.float64]
    second: NDArray[np.float64]
    sizes: NDArray[np.float64]
    size_totals: NDArray[np.float64]
    by_size: tuple[csr_array, csr_array, csr_array]
    cell_starts: NDArray[np.intp]
    centre: NDArray[np.float64]
    upper_starts: NDArray[np.intp]
    group_values: NDArray[np.int64]
    group_units: NDArray[np.int64]

    @property
    def values(self) -> int:
        """Number of values n."""
        return int(self.group_values.sum())

    @property
    def lower(self) -> int:
        """Number of lower units."""
        return int(self.count.sum())

    @property
    def balanced(self) -> bool:
        """Every upper unit has as many lower units as any, and every lower unit as many values."""
        return bool(np.all(self.size == self.size[0]) and np.all(self.count == self.count[0]))


@dataclass(frozen=True, slots=True)
class Units:
    """Lower units: number of values, mean about the origin, and the row each starts at; shape (m,) each."""

    size: NDArray[np.int64]
    mean: NDArray[np.float64]
    starts: NDArray[np.intp]
    within_ss: float


def lower_units(y: NDArray[np.float64], unit: NDArray[np.intp]) -> Units:
    """Means and the pooled sum of squares within units, from sorted values; two passes about a value of the unit."""
    starts = first_of(unit)
    size = np.diff(np.append(starts, y.size))
    centre = y[starts]
    mean = np.add.reduceat(y - np.repeat(centre, size), starts) / size
    rest = y - np.repeat(centre, size) - np.repeat(mean, size)
    slip = np.add.reduceat(rest, starts)
    ss = np.add.reduceat(rest * rest, starts) - slip * slip / size
    return Units(size, centre + mean + slip / size, starts, float(np.maximum(ss, 0.0).sum()))


def layout_of(chain: Chain) -> Layout:
    """Reduces the values of a chain of at least one level to its sufficient statistics."""
    rows, random = chain.rows, chain.random
    lower = random[-2] if len(random) > 1 else "group"
    upper = random[-3] if len(random) > 2 else "group"
    units = lower_units(rows.y, rows.units[lower])
    of_upper = rows.units[upper][units.starts]
    upper_first = first_of(of_upper)
    per_upper = np.diff(np.append(upper_first, of_upper.size))
    base = units.mean[upper_first]
    centre = base + np.add.reduceat(units.mean - np.repeat(base, per_upper), upper_first) / per_upper
    deviation = units.mean - np.repeat(centre, per_upper)
    key = of_upper * (int(units.size.max()) + 1) + units.size
    keys, cell = np.unique(key, return_inverse=True)
    cell_upper, size = np.divmod(keys, int(units.size.max()) + 1)
    count = np.bincount(cell).astype(float)
    first = np.bincount(cell, deviation).astype(float)
    second = np.bincount(cell, deviation * deviation).astype(float)
    sizes, which = np.unique(size, return_inverse=True)
    cell_starts = first_of(cell_upper)
    edges = np.append(cell_starts, size.size)
    shape = (cell_starts.size, sizes.size)
    group_of_upper = rows.units["group"][units.starts][upper_first]
    return Layout(
        random=random,
        k=len(rows.groups),
        within_ss=units.within_ss,
        within_df=rows.y.size - units.size.size,
        log_sizes=float(np.log(units.size).sum()),
        size=size.astype(float),
        count=count,
        first=first,
        second=second,
        sizes=sizes.astype(float),
        size_totals=np.bincount(which, count).astype(float),
        by_size=(
            csr_array((count, which, edges), shape=shape),
            csr_array((first, which, edges), shape=shape),
            csr_array((second, which, edges), shape=shape),
        ),
        cell_starts=cell_starts,
        centre=centre,
        upper_starts=first_of(group_of_upper),
        group_values=np.bincount(rows.units["group"]),
        group_units=_per_group(rows.units["group"], rows.units[random[0]]),
    )


def _per_group(group: NDArray[np.intp], unit: NDArray[np.intp]) -> NDArray[np.int64]:
    return np.bincount(group[first_of(unit)])
