"""Family-wise p-values and critical values for contrasts that each have their own degrees of freedom.

Tukey's and Dunnett's distributions are taken with each pair's own degrees of freedom and, for Dunnett, the
correlations of the fitted means, as is usual for mixed models; both are exact on balanced data.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from sameline.errors import StatsError
from sameline.stats.distributions import t_isf, t_sf, t_two_sided
from sameline.stats.dunnett_distribution import Alternative, dunnett_isf, dunnett_sf
from sameline.stats.studentized_range import studentized_range_isf, studentized_range_sf

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    Floats = NDArray[np.float64]

ADJUSTMENTS = ("tukey", "dunnett", "holm", "bonferroni", "none")
SIDES: dict[str, Alternative] = {"two-sided": "two-sided", "greater": "greater", "less": "greater"}
FEWEST_DF = 1.0  # the studentized range is tabulated from here; a t distribution of fewer says nothing useful


@dataclass(frozen=True, slots=True)
class Family:
    """The contrasts judged together.

    Args:
        t: difference over standard error, shape (m,).
        df: degrees of freedom, each at least `FEWEST_DF`, shape (m,).
        size: how many contrasts the family has (pairs that cannot be estimated included).
        groups: how many means they range over.
        lambdas: square roots of the shared variances for Dunnett's distribution, shape (m,), or None.
        alternative: "two-sided", "greater" or "less".
    """

    t: Floats
    df: Floats
    size: int
    groups: int
    lambdas: Floats | None
    alternative: str

    @property
    def towards(self) -> Floats:
        """The statistics with the alternative's direction up."""
        if self.alternative == "two-sided":
            return np.abs(self.t)
        return self.t if self.alternative == "greater" else -self.t


def adjusted(family: Family, adjust: str, alpha: float) -> tuple[Floats, Floats]:
    """p-values and critical values of t, shape (m,) each; the critical value is NaN where there is no interval."""
    if adjust == "tukey" and family.groups > 2:
        return _tukey(family, alpha)
    if adjust == "dunnett" and family.size > 1:
        return _dunnett(family, alpha)
    raw = raw_p(family)
    sides = 2.0 if family.alternative == "two-sided" else 1.0
    if adjust == "holm":
        return holm(raw, family.size), np.full(raw.shape, np.nan)
    members = family.size if adjust == "bonferroni" else 1
    return np.minimum(1.0, members * raw), t_isf(alpha / (sides * members), family.df)


def raw_p(family: Family) -> Floats:
    """Unadjusted p-values of t."""
    if family.alternative == "two-sided":
        return t_two_sided(family.t, family.df)
    return t_sf(family.towards, family.df)


def holm(raw: Floats, size: int) -> Floats:
    """Holm's step-down adjustment (Holm 1979, Scand. J. Statist. 6:65-70) in a family of `size`."""
    order = np.argsort(raw, kind="stable")
    factors = size - np.arange(raw.size)
    stepped = np.minimum(1.0, np.maximum.accumulate(raw[order] * factors))
    p = np.empty_like(stepped)
    p[order] = stepped
    return p


def _tukey(family: Family, alpha: float) -> tuple[Floats, Floats]:
    root = np.sqrt(2.0)
    p = np.asarray(studentized_range_sf(family.towards * root, family.groups, family.df), float)
    critical = _by_df(family.df, lambda df: studentized_range_isf(alpha, family.groups, df))
    return p, critical / root


def _dunnett(family: Family, alpha: float) -> tuple[Floats, Floats]:
    if family.lambdas is None:
        raise StatsError("Dunnett's procedure needs a control", where="control", advice="name the control")
    lambdas, side = family.lambdas, SIDES[family.alternative]
    t, p, critical = family.towards, np.empty(family.df.shape), np.empty(family.df.shape)
    for df in np.unique(family.df):
        same = family.df == df
        p[same] = dunnett_sf(t[same], lambdas, df, side)
        critical[same] = dunnett_isf(alpha, lambdas, df, side)
    return p, critical


def _by_df(df: Floats, quantile: Callable[[Floats], Floats]) -> Floats:
    """A quantile once for each different number of degrees of freedom."""
    different, at = np.unique(df, return_inverse=True)
    return np.asarray(np.asarray(quantile(different), float)[at])
