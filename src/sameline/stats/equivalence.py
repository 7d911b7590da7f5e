"""Are pairs of groups equivalent: is their difference shown to be smaller than the margin?

Two one-sided t tests a pair on the common variance (Schuirmann 1987; the standard of the idea in laboratories is ASTM
E2935): p = P(T > (margin - |difference|)/se), and the pair is equivalent when the 1 - 2 alpha interval lies strictly
inside (-margin, margin). This holds alpha for each pair. Beside it stand the simultaneous 1 - 2 alpha intervals of
Tukey-Kramer, which hold for all pairs together.

Assumes independent values, one variance in all groups, normal scatter. Refuses data in which no group has a spread, a
margin not above 0, and alpha of one half or more.

References: Schuirmann, D. J. (1987), J. Pharmacokinet. Biopharm. 15:657-680; ASTM E2935, Standard Practice for
Evaluating Equivalence of Two Testing Processes; for the simultaneous intervals see `tukey_kramer`.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np

from sameline.errors import StatsError
from sameline.stats.distributions import t_isf, t_sf
from sameline.stats.pairs import compare_pairs
from sameline.stats.verdicts import check_alpha, check_margin

if TYPE_CHECKING:
    import pandas as pd


class EquivalentPair(NamedTuple):
    """One pair at a level a pair (lower, upper, p_value, equivalent) and simultaneously."""

    a: str
    b: str
    difference: float
    standard_error: float
    df: float
    lower: float
    upper: float
    p_value: float
    equivalent: bool
    simultaneous_lower: float
    simultaneous_upper: float
    simultaneously_equivalent: bool


@dataclass(frozen=True, slots=True)
class Equivalence:
    """Two one-sided tests of every pair against the margin.

    Args:
        margin: smallest difference that matters.
        alpha: error rate of each pair's decision.
        df: degrees of freedom within groups.
        t_critical: upper alpha point of t.
        q_critical: upper 2 alpha point of the studentized range.
        pairs: one row a pair, (earlier, later).
    """

    margin: float
    alpha: float
    df: int
    t_critical: float
    q_critical: float
    pairs: tuple[EquivalentPair, ...]

    def frame(self) -> pd.DataFrame:
        """One row a pair, the fields of `EquivalentPair`."""
        import pandas as pd

        return pd.DataFrame(self.pairs, columns=list(EquivalentPair._fields))


def equivalent_pairs(
    values: Iterable[Any], groups: Iterable[Any], margin: float, *, alpha: float = 0.05
) -> Equivalence:
    """Two one-sided tests of every pair of groups against the margin.

    Args:
        values: n values: numbers, decimal text or `Decimal`.
        groups: n group labels.
        margin: smallest difference that matters, above 0, in the unit of the values.
        alpha: error rate of each pair, below 1/2.

    Raises:
        StatsError: a value, label or option is refused, or no group has a spread.
    """
    alpha, limit = check_alpha(alpha), check_margin(margin)
    if limit is None:
        raise StatsError(
            "equivalence needs a margin", where="margin", advice="give the smallest difference that matters"
        )
    if alpha >= 0.5:
        raise StatsError(f"an error rate of {alpha} leaves no interval", where="alpha", advice="choose one below 0.5")
    tukey = compare_pairs(values, groups, "tukey-kramer", 2 * alpha)
    c, df = tukey.columns, tukey.question.samples.df_within
    critical = float(t_isf(alpha, df))
    half = critical * c.standard_error
    lower, upper = c.difference - half, c.difference + half
    p = t_sf((limit - np.abs(c.difference)) / c.standard_error, df)
    single = (lower > -limit) & (upper < limit)
    together = (c.lower > -limit) & (c.upper < limit)
    columns = (c.difference, c.standard_error, c.df, lower, upper, p, single, c.lower, c.upper, together)
    rows = zip(tukey.a, tukey.b, *(column.tolist() for column in columns), strict=True)
    pairs = tuple(EquivalentPair._make(row) for row in rows)
    return Equivalence(limit, alpha, df, critical, float(c.critical[0]), pairs)
