"""How much more to test: plans from components, what would settle a pair, and the price of looking again and again."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from sameline.conclusions.inputs import gather
from sameline.errors import CallError, StatsError
from sameline.records.answers import ANSWERED, Conclusion
from sameline.records.comparisons import read_revision

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from sameline.conclusions.inputs import Value
    from sameline.records.store import Reading
    from sameline.stats.looks import Price
    from sameline.stats.nested.fit import NestedFit
    from sameline.stats.nested.settling import Settling
    from sameline.stats.plans import Costs, PlanTable

_ADJUST = {"tukey-kramer": "tukey", "dunnett": "dunnett", "holm": "bonferroni", "bonferroni": "bonferroni"}


@dataclass(frozen=True, slots=True)
class Sizes:
    """How much to test.

    Attributes:
        components: the variances that the plans rest on, by level.
        source: where they come from, in words.
        plans: the cheapest plan, alternatives and the power curve; None where no plan reaches the power.
        refusal: why there is no plan, if there is none.
        settling: for each undecided pair of a comparison, what would settle it.
        detectable: the smallest true difference that the present data show with the wanted power at one look, pair by
            pair: labels and difference.
        price: what looking without end costs beside one look, in units a group; None where it cannot be said.
    """

    components: Mapping[str, float]
    source: str
    plans: PlanTable | None
    refusal: str | None = None
    settling: tuple[Settling, ...] = ()
    price: Price | None = None
    detectable: tuple[tuple[str, str, float], ...] = ()


@dataclass(frozen=True, slots=True)
class Wanted:
    """What a plan must reach.

    Attributes:
        groups: number of groups compared.
        difference: that must be shown, in the characteristic's unit.
        power: chance of showing it.
        alpha: family error rate.
        procedure: "tukey", "dunnett", "bonferroni" or "none".
        costs: of a batch, a run and a replicate; None for the fewest measurements.
    """

    groups: int
    difference: float
    power: float
    alpha: float
    procedure: str
    costs: Costs | None = None


def sizes(components: Mapping[str, float], source: str, wanted: Wanted) -> Sizes:
    """Plans from components alone."""
    plans, refusal = _plans(components, wanted)
    return Sizes(components, source, plans, refusal, price=_price(components, wanted))


def sizes_of(
    reading: Reading, conclusion: Conclusion, *, power: float, difference: float | None, costs: Costs | None
) -> Sizes:
    """Plans for a comparison as it was last concluded, and what would settle each of its undecided pairs.

    Raises:
        CallError: it has no answer on the nested model, or no difference to look for.
    """
    if conclusion.answer.state != ANSWERED:
        raise CallError(
            f"{conclusion.name} has no answer to plan from", advice="give the spreads with --run-sd and others"
        )
    revision = read_revision(reading, conclusion.comparison, revision_id=conclusion.revision_id)
    inputs = gather(reading, revision)
    looked_for = difference or inputs.margin
    if looked_for is None:
        raise CallError("there is no margin to plan for", advice="give --difference")
    fit = _fit(revision.grouping, inputs.kept)
    wanted = Wanted(
        groups=len(fit.groups),
        difference=looked_for,
        power=power,
        alpha=revision.alpha,
        procedure=_ADJUST.get(revision.procedure, "tukey"),
        costs=costs,
    )
    found = sizes(fit.components, f"{conclusion.name} v{conclusion.version}", wanted)
    settling = tuple(
        fit.to_settle(p.a, p.b, margin=inputs.margin, alpha=revision.alpha, adjust=wanted.procedure, power=power)
        for p in conclusion.answer.pairs
        if p.verdict == "undecided" and p.a in fit.groups and p.b in fit.groups and p.reason is None
    )
    shown = _detectable(fit, wanted)
    return Sizes(found.components, found.source, found.plans, found.refusal, settling, found.price, shown)


def _fit(grouping: str, kept: Sequence[Value]) -> NestedFit:
    from sameline.stats.nested.fit import fit_nested

    batches = None if grouping == "batch" else [v.batch for v in kept]
    return fit_nested([v.value for v in kept], [v.group for v in kept], batches, [v.run for v in kept])


def _detectable(fit: NestedFit, wanted: Wanted) -> tuple[tuple[str, str, float], ...]:
    """The power of a pair rises with its true difference: the difference is found by halving."""
    from scipy.optimize import brentq

    from sameline.stats.plans import Family

    family = Family(wanted.groups, wanted.alpha, wanted.procedure)
    pairs = fit.pairs(wanted.alpha, wanted.procedure if wanted.procedure != "dunnett" else "tukey")
    found = []
    for p in pairs.pairs:
        if not p.standard_error or not p.df:
            continue
        error, df = p.standard_error, p.df
        high = error
        while family.power(high, error, df) < wanted.power:
            high *= 2
        difference = brentq(lambda d, e=error, f=df: family.power(d, e, f) - wanted.power, 0.0, high, rtol=1e-12)
        found.append((p.a, p.b, float(difference)))
    return tuple(found)


def _plans(components: Mapping[str, float], wanted: Wanted) -> tuple[PlanTable | None, str | None]:
    from sameline.stats.plans import plan

    try:
        table = plan(
            components,
            wanted.difference,
            groups=wanted.groups,
            costs=wanted.costs,
            power=wanted.power,
            alpha=wanted.alpha,
            procedure=wanted.procedure,
        )
    except StatsError as error:
        if error.where != "difference":
            raise
        return None, str(error)
    return table, None


def _price(components: Mapping[str, float], wanted: Wanted) -> Price | None:
    """In runs where groups are batches, in batches where they are not: units of one replicate of each level below."""
    from sameline.stats.looks import price_of_looking

    try:
        return price_of_looking(wanted.groups, wanted.difference, sum(components.values()) ** 0.5, alpha=wanted.alpha)
    except StatsError:
        return None
