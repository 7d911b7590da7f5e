"""How many more runs would settle an undecided pair.

The further runs are thought of as the present ones: same spreads, same number of replicates, shared evenly between
the two groups. Were the true difference the one now estimated, so many more are needed that the pair is shown to
differ, or shown to differ by less than the margin, with the wanted power. For equivalence the power is bounded from
below by P(T1 > c) + P(T2 > c) - 1 of the two one-sided tests (Schuirmann 1987, J. Pharmacokinet. Biopharm. 15:657-680).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from sameline.errors import StatsError
from sameline.stats.noncentral_t import exceedance
from sameline.stats.plans import Family
from sameline.stats.verdicts import DIFFERS, EQUIVALENT

if TYPE_CHECKING:
    from collections.abc import Callable

    from sameline.stats.nested.estimate import Estimate
    from sameline.stats.nested.fit import NestedFit
    from sameline.stats.nested.rows import Rows

MOST_MORE = 500


@dataclass(frozen=True, slots=True)
class Settling:
    """What would settle one pair.

    Args:
        a: label of the first group.
        b: label of the second.
        unit: what to add, the topmost level with a spread: "batch", "run" or "replicate".
        more: how many more of them in each of the two groups; None if 500 more would not do.
        towards: the verdict they would lead to, "differs" or "equivalent"; None likewise.
        power: chance that they settle it, were the difference as now estimated; None likewise.
        text: one sentence for a reader.
    """

    a: str
    b: str
    unit: str
    more: int | None
    towards: str | None
    power: float | None
    text: str


@dataclass(frozen=True, slots=True)
class Wanted:
    """The pair and what is asked of it; see `NestedFit.to_settle`."""

    a: str
    b: str
    margin: float | None
    family: Family
    power: float


def settling_of(fit: NestedFit, estimate: Estimate, rows: Rows, wanted: Wanted) -> Settling:
    """Finds how many more units settle a pair; see `NestedFit.to_settle`."""
    a, b = _places(fit, wanted)
    unit = next(name for name in estimate.random if name != "session")
    error, df = estimate.judged(estimate.spread.differences(np.array([a]), np.array([b])), fit.df_method)
    first = np.unique(rows.units[unit], return_index=True)[1]
    count = np.bincount(rows.units["group"][first])[rows.place]
    now = _Now(
        float(estimate.means[b] - estimate.means[a]), float(error[0]), float(df[0]), int(count[a]), int(count[b])
    )
    chances = {DIFFERS: now.differs}
    if wanted.margin is not None and abs(now.difference) < wanted.margin:
        chances[EQUIVALENT] = now.equivalent
    found = {word: _fewest(chance, wanted) for word, chance in chances.items()}
    possible = {word: more for word, more in found.items() if more is not None}
    if not possible:
        text = f"{MOST_MORE} more {unit}s in each of {wanted.a} and {wanted.b} would not settle it"
        return Settling(wanted.a, wanted.b, unit, None, None, None, text)
    towards = min(possible, key=possible.__getitem__)
    more = possible[towards]
    text = (
        f"{more} more {unit}{'' if more == 1 else 's'} in each of {wanted.a} and {wanted.b} would show that they are "
        f"{'equivalent' if towards == EQUIVALENT else 'different'} with a chance of at least {wanted.power:g}, "
        "were the difference and the spreads as now estimated"
    )
    return Settling(wanted.a, wanted.b, unit, more, towards, chances[towards](more, wanted), text)


def _places(fit: NestedFit, wanted: Wanted) -> tuple[int, int]:
    for label in (wanted.a, wanted.b):
        if label not in fit.groups:
            raise StatsError(f"{label!r} is not among the groups", where="pair", advice="give two groups' labels")
    if wanted.a == wanted.b:
        raise StatsError("a pair needs two groups", where="pair", advice="give two groups' labels")
    if fit.unseen:
        raise StatsError(fit.unseen, where="runs", advice="test each group in one more run first")
    if not 0.0 < wanted.power < 1.0:
        raise StatsError(
            f"a power of {wanted.power!r} cannot be meant", where="power", advice="give a number such as 0.8"
        )
    return fit.groups.index(wanted.a), fit.groups.index(wanted.b)


@dataclass(frozen=True, slots=True)
class _Now:
    """The pair as it stands: difference, its standard error and degrees of freedom, units of both groups."""

    difference: float
    error: float
    df: float
    units_a: int
    units_b: int

    def with_more(self, more: int) -> tuple[float, float]:
        """Standard error and degrees of freedom with so many more units in each group."""
        now = 1.0 / self.units_a + 1.0 / self.units_b
        then = 1.0 / (self.units_a + more) + 1.0 / (self.units_b + more)
        return self.error * (then / now) ** 0.5, self.df + 2.0 * more

    def differs(self, more: int, wanted: Wanted) -> float:
        error, df = self.with_more(more)
        return wanted.family.power(self.difference, error, df)

    def equivalent(self, more: int, wanted: Wanted) -> float:
        error, df = self.with_more(more)
        c = wanted.family.critical(df)
        margin = wanted.margin or 0.0
        sides = [exceedance(c, df, (margin + side * self.difference) / error, two_sided=False) for side in (-1.0, 1.0)]
        return max(0.0, sides[0] + sides[1] - 1.0)


def _fewest(chance: Callable[[int, Wanted], float], wanted: Wanted) -> int | None:
    """The fewest further units with the wanted chance, which rises with their number."""
    low, high = 0, 1
    while chance(high, wanted) < wanted.power:
        low, high = high, min(2 * high, MOST_MORE)
        if low == high:
            return None
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (low, middle) if chance(middle, wanted) >= wanted.power else (middle, high)
    return high
