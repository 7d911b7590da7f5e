"""Group means of a nested fit with their intervals."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from sameline.stats.distributions import t_isf
from sameline.stats.nested.frames import frame_of
from sameline.stats.verdicts import check_alpha

if TYPE_CHECKING:
    import pandas as pd

    from sameline.stats.nested.estimate import Estimate
    from sameline.stats.nested.rows import Rows


@dataclass(frozen=True, slots=True)
class NestedMeans:
    """One entry a group, in order of first appearance.

    Args:
        group: labels.
        n: numbers of values.
        mean: estimated means, weighted by what batches and runs say (generalised least squares).
        standard_error: None where no spread can be had.
        df: degrees of freedom; None likewise.
        lower: lower end of the 1 - alpha interval of this mean alone; None likewise.
        upper: upper end.
        alpha: 1 - the confidence.
    """

    group: tuple[str, ...]
    n: tuple[int, ...]
    mean: tuple[float, ...]
    standard_error: tuple[float | None, ...]
    df: tuple[float | None, ...]
    lower: tuple[float | None, ...]
    upper: tuple[float | None, ...]
    alpha: float

    def frame(self) -> pd.DataFrame:
        """Columns group, n, mean, standard_error, df, lower, upper."""
        names = ("group", "n", "mean", "standard_error", "df", "lower", "upper")
        return frame_of(names, list(zip(*(getattr(self, name) for name in names), strict=True)))


def means_of(estimate: Estimate, rows: Rows, method: str, alpha: float, unseen: str | None) -> NestedMeans:
    """Means with intervals; figures of spread are None where `unseen` says why there are none."""
    alpha = check_alpha(alpha)
    error, df = estimate.judged(estimate.spread.means(), method)
    half = t_isf(alpha / 2.0, df) * error
    mean = estimate.means + rows.origin
    none: tuple[None, ...] = (None,) * mean.size
    return NestedMeans(
        group=rows.groups,
        n=tuple(np.bincount(rows.units["group"])[rows.place].tolist()),
        mean=tuple(mean.tolist()),
        standard_error=none if unseen else tuple(error.tolist()),
        df=none if unseen else tuple(df.tolist()),
        lower=none if unseen else tuple((mean - half).tolist()),
        upper=none if unseen else tuple((mean + half).tolist()),
        alpha=alpha,
    )
