"""What one look sees: the groups' unit means with a pooled variance, or contrasts with standard errors."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from sameline.errors import StatsError
from sameline.stats.looks.many import all_pairs

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    Floats = NDArray[np.float64]

Pair = tuple[str, str]


@dataclass(frozen=True, slots=True)
class UnitMeans:
    """The experimental units of each group at one look.

    Attributes:
        labels: the k groups stated for the comparison, in order of first appearance; a control comes first.
        n: units a group so far, 0 for a group that has none yet.
        means: mean of a group's units, in the characteristic's unit; any finite number where n is 0.
        variance: pooled variance of units within groups; 0 where df is 0.
        df: its degrees of freedom, total units less groups that have units.
    """

    labels: tuple[str, ...]
    n: tuple[int, ...]
    means: tuple[float, ...]
    variance: float
    df: float

    def __post_init__(self) -> None:
        k = len(self.labels)
        if k < 2:
            raise StatsError("a comparison needs at least two groups", where="labels")
        if len(set(self.labels)) != k:
            raise StatsError("a group is named twice", where="labels")
        if len(self.n) != k or len(self.means) != k:
            raise StatsError(f"{k} labels, but {len(self.n)} counts and {len(self.means)} means", where="labels")
        if any(count < 0 for count in self.n):
            raise StatsError("a group has fewer than no units", where="n")
        if not all(map(math.isfinite, (*self.means, self.variance))) or self.variance < 0:
            raise StatsError("means and variance must be finite numbers, the variance not below 0", where="means")
        if self.df < 0 or math.isnan(self.df):
            raise StatsError(f"degrees of freedom {self.df!r} cannot be meant", where="df")

    @property
    def present(self) -> int:
        """Groups that have units."""
        return sum(count > 0 for count in self.n)

    def arrays(self) -> tuple[Floats, Floats, Floats, Floats]:
        """Means (k,), n (k,), sum of squares (), df (), centred on the grand mean so that no offset costs digits."""
        n = np.array(self.n, dtype=np.float64)
        means = np.where(n > 0, np.array(self.means, dtype=np.float64), 0.0)
        total = n.sum()
        centred = np.where(n > 0, means - (n * means).sum() / total, 0.0) if total > 0 else means
        return centred, n, np.array(self.variance * self.df), np.array(self.df, dtype=np.float64)


@dataclass(frozen=True, slots=True)
class Contrasts:
    """Estimated differences of groups at one look, from any fit: one entry a pair that could be estimated.

    Attributes:
        labels: the k groups stated for the comparison.
        pairs: (a, b), the difference is b less a.
        estimates: differences, in the characteristic's unit.
        standard_errors: of the differences, > 0.
        dfs: degrees of freedom of each standard error, > 0, `inf` allowed.
        units: number of units the look rests on (batches, or runs): what grows from look to look.
    """

    labels: tuple[str, ...]
    pairs: tuple[Pair, ...]
    estimates: tuple[float, ...]
    standard_errors: tuple[float, ...]
    dfs: tuple[float, ...]
    units: int

    def __post_init__(self) -> None:
        m = len(self.pairs)
        if not (len(self.estimates) == len(self.standard_errors) == len(self.dfs) == m):
            raise StatsError("pairs, estimates, standard errors and dfs differ in number", where="pairs")
        if any(not (math.isfinite(se) and se > 0) for se in self.standard_errors):
            raise StatsError(
                "a standard error is not above zero", where="standard_errors", advice="leave that pair out"
            )
        if any(not df > 0 for df in self.dfs) or not all(map(math.isfinite, self.estimates)):
            raise StatsError("an estimate is not finite or its degrees of freedom are not above zero", where="dfs")
        if any(a not in self.labels or b not in self.labels for a, b in self.pairs):
            raise StatsError("a pair names a group that is not stated", where="pairs")


def unit_means(values: Sequence[float], groups: Sequence[str], labels: Sequence[str] | None = None) -> UnitMeans:
    """Summarises unit values (one a unit: a run's mean, a batch's mean) into `UnitMeans`.

    Args:
        values: one number a unit.
        groups: the group of each unit, same length.
        labels: all groups stated, in their order; by default those that occur, in order of first appearance.

    Raises:
        StatsError: lengths differ, or a unit's group is not among `labels`.
    """
    from sameline.stats.exact_sums import group_sums

    if len(values) != len(groups):
        raise StatsError(f"{len(values)} values but {len(groups)} groups", where="groups")
    stated = tuple(dict.fromkeys(groups)) if labels is None else tuple(labels)
    unknown = sorted(set(groups) - set(stated))
    if unknown:
        raise StatsError(f"units of groups that are not stated: {', '.join(unknown)}", where="groups")
    present = [label for label in stated if label in set(groups)]
    place = {label: i for i, label in enumerate(present)}
    sums = group_sums(np.asarray(values, dtype=np.float64), np.array([place[g] for g in groups]), len(present))
    count = {label: int(sums.n[i]) for label, i in place.items()}
    mean = {label: float(sums.mean[i]) for label, i in place.items()}
    df = len(values) - len(present)
    return UnitMeans(
        labels=stated,
        n=tuple(count.get(label, 0) for label in stated),
        means=tuple(mean.get(label, 0.0) for label in stated),
        variance=float(sums.ss_within) / df if df > 0 else 0.0,
        df=float(df),
    )


@dataclass(frozen=True, slots=True)
class PairFigures:
    """Plain figures of the pairs asked, from `UnitMeans`: one entry a pair, shape (m,).

    Attributes:
        pairs: the pairs asked.
        places: (m, 2) positions of the groups.
        difference: mean of b less mean of a.
        standard_error: pooled; 0 where it cannot be had.
        units: n_a n_b / (n_a + n_b); 0 where a group has none.
        missing: reason why a pair cannot be judged, "" where it can.
    """

    pairs: tuple[Pair, ...]
    places: NDArray[np.intp]
    difference: Floats
    standard_error: Floats
    units: Floats
    missing: tuple[str, ...]


def pair_figures(seen: UnitMeans, *, control: bool) -> PairFigures:
    """The figures of all pairs, or with `control` of the pairs with the first group."""
    places = [(a, b) for a, b in all_pairs(len(seen.labels)) if not control or a == 0]
    at = np.array(places, dtype=np.intp)
    means, n, _, _ = seen.arrays()
    n_a, n_b = n[at[:, 0]], n[at[:, 1]]
    both = np.where(n_a * n_b > 0, n_a + n_b, 1.0)
    units = n_a * n_b / both
    error = np.where(units > 0, np.sqrt(seen.variance / np.where(units > 0, units, 1.0)), 0.0)
    return PairFigures(
        pairs=tuple((seen.labels[a], seen.labels[b]) for a, b in places),
        places=at,
        difference=np.where(units > 0, means[at[:, 1]] - means[at[:, 0]], 0.0),
        standard_error=error,
        units=units,
        missing=tuple(_why_not(seen, a, b) for a, b in places),
    )


def _why_not(seen: UnitMeans, a: int, b: int) -> str:
    for place in (a, b):
        if seen.n[place] == 0:
            return f"{seen.labels[place]} has no unit yet"
    if seen.df <= 0:
        return "no group has two units yet, so the spread is not known"
    return "all units of each group are equal, so there is no spread to measure against" if seen.variance == 0 else ""
