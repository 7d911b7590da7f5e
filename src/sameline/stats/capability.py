"""How well a process keeps its limits: performance indices with intervals, in the terms of ISO 22514.

With mean m and standard deviation s of what the process makes, and limits L and U:

    P_p = (U - L)/(6 s),   P_pkL = (m - L)/(3 s),   P_pkU = (U - m)/(3 s),   P_pk = min(P_pkL, P_pkU).

ISO 22514-1 calls them performance indices, and capability indices C_p and C_pk only where the process is shown
to be stable; the formulas are the same. Intervals:

- P_p: (U - L)/(6 s) times the ends of sqrt(chi-squared/df), exact for independent normal values;
- P_pk: P_pk +- z sqrt(e^2/(9 s^2) + P_pk^2/(2 df)), e the standard error of the mean; with e^2 = s^2/n and
  df = n - 1 it is the published one.

References: ISO 22514-1:2014, ISO 22514-2:2017 (terms, indices); NIST/SEMATECH e-Handbook of Statistical Methods, 6.1.6
(indices and intervals); Bissell (1990), How reliable is your capability index?, Appl. Statist. 39:331-340.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from scipy import special

from sameline.errors import StatsError
from sameline.stats.verdicts import check_alpha

FEWEST_BATCHES = 5
"""With fewer batches nothing is said: the upper end of a standard deviation is then about three times the estimate."""
MANY_BATCHES = 25
"""Below so many a caution is raised (common practice, no source)."""


@dataclass(frozen=True, slots=True)
class Process:
    """What is known of a process.

    Args:
        mean: in the unit of the limits.
        deviation: standard deviation s > 0 of single results, in the same unit.
        df: degrees of freedom of s, > 0.
        error: standard error e of the mean.
    """

    mean: float
    deviation: float
    df: float
    error: float


@dataclass(frozen=True, slots=True)
class Index:
    """One index with its 1 - alpha interval; a lower end may be negative where the mean is near or beyond a limit."""

    name: str
    value: float
    lower: float
    upper: float


def performance(process: Process, lower: float | None, upper: float | None, alpha: float = 0.05) -> tuple[Index, ...]:
    """The indices that the limits allow: P_p (both limits), P_pkL, P_pkU, and P_pk.

    Args:
        process: mean, spread, and how well both are known.
        lower: lower limit L, or None.
        upper: upper limit U, or None.
        alpha: 1 - the confidence of each interval.

    Raises:
        StatsError: no limit is given, they are not in order, there is no spread, or alpha is not between 0 and 1.
    """
    alpha = check_alpha(alpha)
    if lower is None and upper is None:
        raise StatsError("there is no limit to keep", where="limits", advice="state a lower or an upper one")
    if lower is not None and upper is not None and not lower < upper:
        raise StatsError(f"the lower limit {lower:g} is not below the upper limit {upper:g}", where="limits")
    if not (process.deviation > 0.0 and process.df > 0.0):
        raise StatsError("there is no spread, so no index can be had", where="process")
    found = []
    if lower is not None and upper is not None:
        found.append(_potential(process, upper - lower, alpha))
    sides = []
    if lower is not None:
        sides.append(_sided("PpkL", process, process.mean - lower, alpha))
    if upper is not None:
        sides.append(_sided("PpkU", process, upper - process.mean, alpha))
    least = min(sides, key=lambda index: index.value)
    return (*found, *sides, Index("Ppk", least.value, least.lower, least.upper))


def _potential(process: Process, width: float, alpha: float) -> Index:
    value, df = width / (6.0 * process.deviation), process.df
    low = math.sqrt(float(special.chdtri(df, 1.0 - alpha / 2.0)) / df)
    high = math.sqrt(float(special.chdtri(df, alpha / 2.0)) / df)
    return Index("Pp", value, value * low, value * high)


def _sided(name: str, process: Process, distance: float, alpha: float) -> Index:
    s = process.deviation
    value = distance / (3.0 * s)
    half = -float(special.ndtri(alpha / 2.0)) * math.sqrt(
        process.error**2 / (9.0 * s * s) + value**2 / (2.0 * process.df)
    )
    return Index(name, value, value - half, value + half)


def spread_df(deviation: float, upper: float, alpha: float = 0.05) -> float:
    """Degrees of freedom at which a chi-squared interval about a standard deviation has this upper end.

    Args:
        deviation: the estimate.
        upper: upper end of its 1 - alpha interval, above the estimate.
        alpha: 1 - the confidence.

    Raises:
        StatsError: the upper end is not above the estimate.
    """
    if not (0.0 < deviation < upper):
        raise StatsError("the upper end is not above the deviation", where="upper")
    wanted = (upper / deviation) ** 2
    low, high = 1e-3, 1e7
    for _ in range(200):
        middle = math.sqrt(low * high)
        ratio = middle / max(float(special.chdtri(middle, 1.0 - alpha / 2.0)), 1e-300)
        low, high = (middle, high) if ratio > wanted else (low, middle)
    return math.sqrt(low * high)
