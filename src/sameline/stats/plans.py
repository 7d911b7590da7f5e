"""How many batches, runs and replicates to plan, from the spreads of each level and what each costs.

In a balanced plan with b batches a group, r runs a batch and n replicates a run, the difference of two group means has
variance 2 (θ_batch/b + θ_run/(b r) + θ_replicate/(b r n)) and k (b - 1) degrees of freedom: those of the topmost level
with a spread. The power is the chance that a pair whose true difference is δ is shown to differ, either way:
P(|T| > c) for the noncentral t distribution with δ over the standard error, c the procedure's critical value. Where
groups are batches themselves there is no batch level, and the runs take its place.

References: ISO 5725-3 (the levels); Hayter and Liu (1991), J. Amer. Statist. Assoc. 86:1096-1099 (power of pairs);
Searle, Casella and McCulloch (1992), Variance Components, ch. 3 (balanced nested designs).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from sameline.errors import StatsError
from sameline.stats.distributions import t_isf
from sameline.stats.noncentral_t import exceedance
from sameline.stats.verdicts import check_alpha

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping

    import pandas as pd

LEVELS = ("batch", "run", "replicate")
PLAN_PROCEDURES = ("tukey", "dunnett", "bonferroni", "none")
MOST_TOP, MOST_BELOW = 1000, 12
ALTERNATIVES = 8
CURVE_POINTS = 41


@dataclass(frozen=True, slots=True)
class Costs:
    """What one more unit of each level costs, in one unit of money or time; each at least 0, not all 0.

    As it stands it counts measurements.
    """

    batch: float = 0.0
    run: float = 0.0
    replicate: float = 1.0


class Plan(NamedTuple):
    """A balanced plan; batches is None where groups are batches, runs or replicates are 1 where they have no spread.

    `power` is at the difference asked; `half_width` is that of the simultaneous interval with the spreads as given;
    `cost` and `measurements` are of all groups together.
    """

    batches: int | None
    runs: int
    replicates: int
    measurements: int
    cost: float
    standard_error: float
    df: float
    half_width: float
    power: float


@dataclass(frozen=True, slots=True)
class PlanTable:
    """The cheapest plan and others near it.

    Args:
        best: the cheapest plan that reaches the power.
        alternatives: the next cheapest with other numbers of runs or replicates, in order of cost.
        difference: the true difference to be shown, in the values' unit.
        power: the power asked.
        groups: number of groups.
        alpha: error rate of the family.
        procedure: one of `PLAN_PROCEDURES`.
        curve: (difference, power) of the best plan, from no difference to twice the one asked.
    """

    best: Plan
    alternatives: tuple[Plan, ...]
    difference: float
    power: float
    groups: int
    alpha: float
    procedure: str
    curve: tuple[tuple[float, float], ...]

    def frame(self) -> pd.DataFrame:
        """The best plan and the alternatives, one row each: the fields of `Plan`."""
        import pandas as pd

        return pd.DataFrame([self.best, *self.alternatives], columns=list(Plan._fields))


def plan(
    components: Mapping[str, float],
    difference: float,
    *,
    groups: int,
    costs: Costs | None = None,
    power: float = 0.8,
    alpha: float = 0.05,
    procedure: str = "tukey",
) -> PlanTable:
    """Finds the cheapest balanced plan that shows a true difference with the wanted power.

    Args:
        components: variances by level, any of "batch", "run", "replicate", such as a fit's `components`. Leave "batch"
            out where the groups are batches. A level that is left out has no spread of its own.
        difference: smallest true difference of two groups that must be shown, > 0; usually the margin.
        groups: number of groups compared, >= 2.
        costs: of one batch, run and replicate; if not given, the plan with the fewest measurements is looked for.
        power: chance of showing that difference, between 0 and 1.
        alpha: error rate of the family.
        procedure: "tukey" (all pairs), "dunnett" (with a control), "bonferroni" (all pairs) or "none" (each pair).

    Raises:
        StatsError: an argument cannot be meant, or no plan of at most 1000 units of the top level reaches the power.
    """
    spreads, alpha, costs = _spreads(components), check_alpha(alpha), costs or Costs()
    _check(difference, groups, costs, power, procedure)
    family = Family(groups, alpha, procedure)
    found = [each for each in _candidates(spreads, difference, power, family, costs) if each is not None]
    if not found:
        raise StatsError(
            f"no plan of up to {MOST_TOP} units a group shows a difference of {difference:g} with power {power:g}",
            where="difference",
            advice="ask for a larger difference or less power, or lower the spread of the method",
        )
    found.sort(key=lambda each: (each.cost, each.measurements, each.batches or each.runs, each.runs))
    best, rest = found[0], tuple(found[1 : ALTERNATIVES + 1])
    grid = np.linspace(0.0, 2.0 * difference, CURVE_POINTS).tolist()
    curve = tuple((at, family.power(at, best.standard_error, best.df)) for at in grid)
    return PlanTable(best, rest, float(difference), power, groups, alpha, procedure, curve)


@dataclass(frozen=True, slots=True)
class Family:
    """How pairs of `groups` means are judged together at error rate `alpha` by one of `PLAN_PROCEDURES`."""

    groups: int
    alpha: float
    procedure: str

    def critical(self, df: float) -> float:
        """Critical value of difference over standard error."""
        return _critical(self.groups, self.alpha, self.procedure, df)

    def power(self, difference: float, standard_error: float, df: float) -> float:
        """P(|T| > c) for a true difference, both tails counted."""
        return exceedance(self.critical(df), df, abs(difference) / standard_error, two_sided=True)


@lru_cache(maxsize=4096)
def _critical(groups: int, alpha: float, procedure: str, df: float) -> float:
    if groups > 2 and procedure == "tukey":
        from sameline.stats.studentized_range import studentized_range_isf

        return float(studentized_range_isf(alpha, groups, df)) / math.sqrt(2.0)
    if groups > 2 and procedure == "dunnett":
        from sameline.stats.dunnett_distribution import dunnett_isf

        return float(dunnett_isf(alpha, np.full(groups - 1, math.sqrt(0.5)), df))
    members = groups * (groups - 1) // 2 if procedure == "bonferroni" else 1
    return float(t_isf(alpha / (2.0 * members), df))


def _candidates(
    spreads: Mapping[str, float], difference: float, power: float, family: Family, costs: Costs
) -> Iterator[Plan | None]:
    """For each number of lower units, the plan with the fewest units of the top level."""
    top = next(level for level in LEVELS if level in spreads)
    several_runs = top == "batch" and "run" in spreads
    several_replicates = top != "replicate" and "replicate" in spreads
    for runs in range(1, MOST_BELOW + 1) if several_runs else (1,):
        for replicates in range(1, MOST_BELOW + 1) if several_replicates else (1,):
            shape = _Shape(spreads, top, runs, replicates)
            units = _fewest(shape, difference, power, family)
            yield None if units is None else shape.plan(units, difference, family, costs)


@dataclass(frozen=True, slots=True)
class _Shape:
    """What hangs below one unit of the top level."""

    spreads: Mapping[str, float]
    top: str
    runs: int
    replicates: int

    def error(self, units: int) -> float:
        """Standard error of a difference with so many units of the top level a group."""
        below_run = self.spreads.get("replicate", 0.0) / self.replicates
        below_batch = (self.spreads.get("run", 0.0) + below_run) / self.runs
        return math.sqrt(2.0 * (self.spreads.get("batch", 0.0) + below_batch) / units)

    def plan(self, units: int, difference: float, family: Family, costs: Costs) -> Plan:
        batches = units if self.top == "batch" else None
        runs = units if self.top == "run" else self.runs
        replicates = units if self.top == "replicate" else self.replicates
        of_batch = costs.batch + runs * (costs.run + replicates * costs.replicate)
        error, df = self.error(units), float(family.groups * (units - 1))
        return Plan(
            batches=batches,
            runs=runs,
            replicates=replicates,
            measurements=family.groups * (batches or 1) * runs * replicates,
            cost=family.groups * (batches or 1) * of_batch,
            standard_error=error,
            df=df,
            half_width=family.critical(df) * error,
            power=family.power(difference, error, df),
        )


def _fewest(shape: _Shape, difference: float, power: float, family: Family) -> int | None:
    """The fewest units of the top level that reach the power: it rises with their number."""

    def reaches(units: int) -> bool:
        return family.power(difference, shape.error(units), float(family.groups * (units - 1))) >= power

    low, high = 1, 2
    while not reaches(high):
        low, high = high, min(2 * high, MOST_TOP)
        if low == high:
            return None
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (low, middle) if reaches(middle) else (middle, high)
    return high


def _spreads(components: Mapping[str, float]) -> dict[str, float]:
    unknown = [name for name in components if name not in LEVELS]
    if unknown:
        raise StatsError(
            f"the level {unknown[0]!r} has no place in a plan", where="components", advice="one of " + ", ".join(LEVELS)
        )
    spreads = {level: float(components[level]) for level in LEVELS if level in components}
    if not all(math.isfinite(value) and value >= 0.0 for value in spreads.values()) or not sum(spreads.values()) > 0.0:
        raise StatsError(
            "the components must be variances, at least 0 and not all 0",
            where="components",
            advice="give squared standard deviations in the values' unit",
        )
    return spreads


def _check(difference: float, groups: int, costs: Costs, power: float, procedure: str) -> None:
    if not (math.isfinite(difference) and difference > 0.0):
        raise StatsError(
            f"a difference of {difference!r} cannot be meant", where="difference", advice="give one above 0"
        )
    if groups < 2:
        raise StatsError("a comparison needs two groups", where="groups", advice="give 2 or more")
    if not 0.0 < power < 1.0:
        raise StatsError(f"a power of {power!r} cannot be meant", where="power", advice="give a number such as 0.8")
    if procedure not in PLAN_PROCEDURES:
        raise StatsError(
            f"no plan for procedure {procedure!r}", where="procedure", advice="one of " + ", ".join(PLAN_PROCEDURES)
        )
    each = (costs.batch, costs.run, costs.replicate)
    if not all(math.isfinite(cost) and cost >= 0.0 for cost in each) or not any(each):
        raise StatsError("costs must be at least 0 and not all 0", where="costs", advice="say what one more unit costs")
