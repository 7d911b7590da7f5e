"""A stated final amount of data and any number of looks on the way: error spending by information fraction.

Exact up to the simulation of `boundaries` for independent normal units with one spread. Information fraction: units so
far, of all groups, over units planned. Looks at times not foreseen simply spend what their fraction allows. A look
beyond the plan spends all that is left and says so; once all is spent, later looks are descriptive. A look with no more
data than one before (values were excluded, or a late recorded run moved) spends nothing.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from sameline.errors import StatsError
from sameline.stats.looks.amendments import (
    RESERVE,
    amendment_notes,
    check_reserve,
    look_weight,
    next_memories,
    overall_p,
    version_share,
)
from sameline.stats.looks.assemble import Heading, PairInput, assemble
from sameline.stats.looks.boundaries import DRAWS, SEED, History, next_boundaries
from sameline.stats.looks.results import LookResult, LooksState, PairMemory, PlannedLook, check_members, remembered
from sameline.stats.looks.single import keep_interval
from sameline.stats.looks.single_look import single_critical_t, single_p
from sameline.stats.looks.spending import SPENDINGS, Spending, rate_that_spends
from sameline.stats.looks.units import PairFigures, UnitMeans, pair_figures
from sameline.stats.verdicts import check_alpha, check_margin

if TYPE_CHECKING:
    from collections.abc import Sequence

_RATES = (0.9, 0.7, 0.5, 0.35, 0.2, 0.1, 0.05, 0.02, 0.01, 0.005, 0.002, 0.001)


@dataclass(frozen=True, slots=True)
class Plan:
    """What a planned comparison states beforehand.

    Attributes:
        units: final number of units, of all groups together.
        spending: "obrien-fleming" or "pocock".
        draws: simulated histories a boundary rests on.
        seed: of the simulation.
        reserve: share of alpha kept for amended data.
    """

    units: int
    spending: Spending = "obrien-fleming"
    draws: int = DRAWS
    seed: int = SEED
    reserve: float = RESERVE

    def __post_init__(self) -> None:
        if self.units < 2:
            raise StatsError(f"a plan of {self.units} units cannot be meant", where="units")
        if self.spending not in SPENDINGS:
            raise StatsError(f"unknown spending {self.spending!r}", where="spending", advice=" or ".join(SPENDINGS))
        if self.draws < 10_000:
            raise StatsError("fewer than 10000 draws leave the boundary loose", where="draws")
        check_reserve(self.reserve)


def rule_of(plan: Plan, alpha: float) -> str:
    """The options of a planned comparison that may not change between looks, as text."""
    return (
        f"units {plan.units!r}; {plan.spending}; alpha {alpha!r}; draws {plan.draws!r}; seed {plan.seed!r}; "
        f"reserve {plan.reserve!r}"
    )


def judge_planned(
    seen: UnitMeans,
    plan: Plan,
    *,
    alpha: float = 0.05,
    margin: float | None = None,
    amended: Sequence[str] = (),
    state: LooksState | None = None,
) -> LookResult:
    """Judges every pair at this look of a plan.

    Args:
        seen: the unit means now recorded.
        plan: stated beforehand.
        alpha: family error rate over all pairs and all looks of the plan.
        margin: smallest difference that matters, or None.
        amended: groups with an amended or excluded value that an earlier look had seen.
        state: of the look before.

    Returns:
        The look. `p_value` is found from the boundaries at a ladder of error rates, interpolated between them.

    Raises:
        StatsError: options out of range, or changed since the look before.
    """
    alpha, margin = check_alpha(alpha), check_margin(margin)
    touched = check_members(amended, seen.labels, "amended")
    before = remembered(state, "planned", rule_of(plan, alpha))
    figures = pair_figures(seen, control=False)
    opened, memories = next_memories(before, figures.pairs, touched)
    rates = ladder(alpha * (1.0 - plan.reserve))
    look, notes = _this_look(seen, plan, rates, before)
    spends = look is not None and any(edge is not None for edge in look.boundaries)
    if look is not None:
        opened = replace(opened, planned=(*before.planned, look), judged=opened.judged + spends, units=sum(seen.n))
    step = _Step(plan, alpha, rates, look, before.planned[-1].fraction if before.planned else 0.0)
    alone = single_p(seen, figures, control=False)
    inputs: list[PairInput] = []
    for at, pair in enumerate(figures.pairs):
        found = _one(step, seen, figures, at, memories[pair], float(alone[at]))
        memories[pair] = keep_interval(memories[pair], found)
        inputs.append(found)
    notes = (*notes, *amendment_notes(opened, memories, plan.reserve))
    guarantee = f"exact but for the simulation of {plan.draws} histories, for independent normal units with one spread"
    return assemble(Heading(seen.labels, alpha, margin, guarantee, notes), opened, memories, inputs)


def ladder(rate: float) -> tuple[float, ...]:
    """The error rates at which boundaries are kept: a fixed ladder, with the comparison's own in it; descending."""
    return tuple(sorted({*_RATES, rate}, reverse=True))


@dataclass(frozen=True, slots=True)
class _Step:
    plan: Plan
    alpha: float
    rates: tuple[float, ...]
    look: PlannedLook | None
    fraction_before: float


def _this_look(
    seen: UnitMeans, plan: Plan, rates: tuple[float, ...], before: LooksState
) -> tuple[PlannedLook | None, tuple[str, ...]]:
    """What this look may spend, and what must be said of it; None when it spends nothing."""
    total, last = sum(seen.n), before.planned[-1].fraction if before.planned else 0.0
    fraction = min(1.0, total / plan.units)
    if last >= 1.0:
        return None, (f"the plan's {plan.units} units were reached before; figures of later data are descriptive",)
    if fraction <= last:
        return None, (f"no more data than at an earlier look ({total} units): this look spends nothing",)
    notes = (f"{total} units, {plan.units} planned: the plan is overrun, all that is left is spent here",)
    history = History(
        _growing((*(row.n for row in before.planned), seen.n)), tuple(row.boundaries for row in before.planned)
    )
    edges = next_boundaries(history, rates, plan.spending, (last, fraction), draws=plan.draws, seed=plan.seed)
    spends = any(edge is not None for edge in edges)
    look = PlannedLook(seen.n, fraction if spends else last, edges)
    return look, notes if total > plan.units else ()


def _growing(n: tuple[tuple[int, ...], ...]) -> tuple[tuple[int, ...], ...]:
    """Counts a look that never shrink: where values were excluded since, the smaller count stands for the past too."""
    table = np.array(n, dtype=np.int64)
    shrunk = np.minimum.accumulate(table[::-1], axis=0)[::-1]
    return tuple(tuple(row) for row in shrunk.tolist())


def _one(step: _Step, seen: UnitMeans, figures: PairFigures, at: int, memory: PairMemory, alone: float) -> PairInput:
    error = float(figures.standard_error[at])
    share = version_share(step.plan.reserve, memory.version)
    p_now: float | None = None
    width = math.inf
    if figures.missing[at]:
        pass
    elif memory.version:
        share *= look_weight(memory.since)
        p_now = overall_p(memory, alone, step.plan.reserve, spends_by_look=True)
        width = single_critical_t(seen, share * step.alpha, control=False) * error if share > 0 else math.inf
    elif step.look is not None:
        q = abs(float(figures.difference[at])) / error * math.sqrt(2.0)
        p_now, edge = _ladder_p(step, q, alone)
        width = math.inf if edge is None else edge * error / math.sqrt(2.0)
    return PairInput(
        missing=figures.missing[at],
        difference=float(figures.difference[at]),
        standard_error=error,
        df=seen.df,
        half_width=width,
        p_now=p_now,
        p_single=alone,
        share=share if p_now is not None else None,
    )


def _ladder_p(step: _Step, q: float, alone: float) -> tuple[float | None, float | None]:
    """The least overall error rate at which q crosses at this look, and the boundary at the comparison's own rate."""
    look = step.look
    if look is None or all(edge is None for edge in look.boundaries):
        return None, None
    own = step.rates.index(step.alpha * (1.0 - step.plan.reserve))
    edge = look.boundaries[own]
    keep = 1.0 - step.plan.reserve
    claimed = edge is not None and q > edge
    rate = _interpolated(step, q, alone) / keep
    # interpolation and the union bound below the ladder may not contradict the boundary that decides
    rate = min(rate, step.alpha) if claimed else max(rate, math.nextafter(step.alpha, 1.0))
    return min(rate, 1.0), edge


def _interpolated(step: _Step, q: float, alone: float) -> float:
    look = step.look
    if look is None:
        return 1.0
    steps = [(rate, edge) for rate, edge in zip(step.rates, look.boundaries, strict=True) if edge is not None]
    rates, edges = np.log([rate for rate, _ in steps]), np.maximum.accumulate([edge for _, edge in steps])
    if q <= edges[0]:
        return 1.0
    if q > edges[-1]:
        bound = rate_that_spends(step.plan.spending, step.fraction_before, look.fraction, alone)
        return min(bound, float(np.exp(rates[-1])))
    return float(np.exp(np.interp(q, edges, rates)))
