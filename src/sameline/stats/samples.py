"""Values with their groups, checked once: what every procedure starts from.

Sums are exact (`exact_sums`): values near 1e12 that differ in the first decimal give differences of means right to the
last digit. Neither the order of rows nor that of groups moves a figure.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from sameline.errors import StatsError
from sameline.stats import labels as label_rules
from sameline.stats.cautions import Caution
from sameline.stats.exact_sums import GroupSums, group_sums
from sameline.stats.values import Floats, Values, read_values

Ints: TypeAlias = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Samples:
    """Checked values in k groups, in order of first appearance.

    Args:
        labels: the groups' labels, k of them.
        codes: group of each row, shape (n,).
        values: the checked values.
        sums: exact sums of the values in each group.
        cautions: what is odd about the labels.
    """

    labels: tuple[str, ...]
    codes: NDArray[np.intp]
    values: Values
    sums: GroupSums
    cautions: tuple[Caution, ...]

    @property
    def k(self) -> int:
        """Number of groups."""
        return len(self.labels)

    @property
    def n(self) -> Ints:
        """Values in each group, shape (k,)."""
        return self.sums.n

    @property
    def total(self) -> int:
        """Values in all."""
        return self.codes.size

    @property
    def mean(self) -> Floats:
        """Mean of each group, shape (k,)."""
        return self.sums.mean

    @property
    def deviation(self) -> Floats:
        """Mean of each group less the mean of all values, shape (k,); differences of means are taken of these."""
        return self.sums.deviation

    @property
    def ss(self) -> Floats:
        """Sum of squares about its own mean in each group, shape (k,); exactly 0 for a group without spread."""
        return self.sums.ss

    @property
    def variance(self) -> Floats:
        """Variance of each group, shape (k,); 0 where the group has one value (see `n`)."""
        return self.sums.ss / np.maximum(self.n - 1, 1)

    @property
    def df_within(self) -> int:
        """Degrees of freedom within groups."""
        return self.total - self.k

    @property
    def ms_within(self) -> float:
        """Mean square within groups; call `require_spread` first."""
        return self.sums.ss_within / self.df_within

    def require_spread(self) -> None:
        """Refuses samples from which no common spread can be had.

        Raises:
            StatsError: every group has one value only, or no group has a spread.
        """
        if self.df_within < 1:
            raise StatsError(
                "every group has one value only, so nothing shows how values of one group scatter",
                where="values",
                advice="give at least one group a second value",
            )
        if self.sums.ss_within == 0.0:
            raise StatsError(
                "no group has a spread: within each group all values are identical",
                where="values",
                advice="record the values with more digits, or check that they are measurements and not copies",
            )

    def named(self, where: NDArray[np.bool_]) -> str:
        """The labels of some groups, for a message; at most five of them."""
        some = [repr(self.labels[at]) for at in np.flatnonzero(where)]
        return ", ".join(some[:5]) + (f" and {len(some) - 5} more" if len(some) > 5 else "")


def gather(values: Iterable[Any], groups: Iterable[Any], *, fewest: int = 2) -> Samples:
    """Checks values and groups and sums them exactly.

    Args:
        values: n values, see `values.read_values`.
        groups: n labels, see `labels.encode`.
        fewest: the fewest groups that make sense to the caller.

    Raises:
        StatsError: lengths differ, there are too few groups, or a value or label is refused.
    """
    read = read_values(values)
    labels, codes = label_rules.encode(groups)
    if codes.size != read.raw.size:
        raise StatsError(
            f"there are {read.raw.size} values and {codes.size} group labels",
            where="groups",
            advice="give one label for each value",
        )
    if len(labels) < fewest:
        found = "is 1 group" if len(labels) == 1 else f"are {len(labels)} groups"
        raise StatsError(
            f"there {found}, and this needs at least {fewest}",
            where="groups",
            advice="give values of more groups",
        )
    sums = group_sums(read.recorded, codes, len(labels))
    return Samples(labels, codes, read, sums, label_rules.look_alikes(labels))
