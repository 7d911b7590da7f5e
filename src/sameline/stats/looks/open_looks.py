"""Looks without end: evidence that holds at every look, from the first run to the ten-thousandth.

Exact for independent normal units with one spread (`judge_open`); with contrasts of any other fit the same formulas
are approximate, as good as their standard errors and degrees of freedom (`judge_open_contrasts`). Unequal spread is not
forgiven: with one of five groups spread three times as wide, `judge_open` claimed falsely in 13 % of 10 000 simulated
histories of 30 looks, contrasts by Welch in 1 %, `judge_union` in 3 % (tests/benchmarks/looks_false_claims.py).
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from sameline.errors import StatsError
from sameline.stats.looks.amendments import (
    RESERVE,
    amendment_notes,
    check_reserve,
    next_memories,
    overall_p,
    version_share,
)
from sameline.stats.looks.assemble import Heading, PairInput, assemble
from sameline.stats.looks.closed import FEW, closed_p_few
from sameline.stats.looks.evidence import critical_t, log_e_value
from sameline.stats.looks.many import (
    closed_p_from_pairs,
    closed_p_many,
    holm_from_log,
    log_pair_evidence,
)
from sameline.stats.looks.results import LookResult, LooksState, check_members, remembered
from sameline.stats.looks.shares import interval_shares, with_joiners
from sameline.stats.looks.single_look import single_p, single_p_contrasts
from sameline.stats.looks.units import Contrasts, PairFigures, UnitMeans, pair_figures
from sameline.stats.verdicts import check_alpha, check_margin

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    Floats = NDArray[np.float64]

PHI = 1.5
"""Tuning unless a comparison states another: differences of up to about one standard deviation of a unit are looked
for; chosen by simulation as quick for such a shift from the first look and still good for one that begins late."""


def rule_of(
    phi: float = PHI, reserve: float = RESERVE, founders: tuple[str, ...] | None = None, *, control: str | None = None
) -> str:
    """The options of an open comparison that may not change between looks, as text."""
    parts = [f"phi {phi!r}", f"reserve {reserve!r}"]
    parts += [f"control {control}"] if control is not None else []
    parts += [f"founders {', '.join(founders)}"] if founders is not None else []
    return "; ".join(parts)


def judge_open(
    seen: UnitMeans,
    *,
    alpha: float = 0.05,
    margin: float | None = None,
    phi: float = PHI,
    reserve: float = RESERVE,
    control: str | None = None,
    founders: Sequence[str] | None = None,
    amended: Sequence[str] = (),
    state: LooksState | None = None,
) -> LookResult:
    """Judges every pair at this look, error rate alpha over all pairs and all looks ever made.

    Args:
        seen: the unit means now recorded, cumulated over all looks; with `control` that group must come first.
        alpha: family error rate, in (0, 1).
        margin: smallest difference that matters, in the unit of the means, or None.
        phi: tuning, stated beforehand; `phi_from_margin` gives one.
        reserve: share of alpha kept for amended data (see `amendments`).
        control: compare the others with this group only.
        founders: the groups stated at the outset when groups may join later; None when all are stated.
        amended: groups with a value corrected or excluded since the last look that an earlier look had seen.
        state: of the look before; None at the first look.

    Returns:
        The look; `.state` goes into the next.

    Raises:
        StatsError: options out of range, or changed since the look before.
    """
    alpha, margin, reserve = check_alpha(alpha), check_margin(margin), check_reserve(reserve)
    _check_phi(phi)
    first = _founders(seen, founders, control)
    rule = rule_of(phi, reserve, None if first is None else seen.labels[:first], control=control)
    touched = check_members(amended, seen.labels, "amended")
    figures = pair_figures(seen, control=control is not None)
    opened, memories = next_memories(remembered(state, "open", rule), figures.pairs, touched)
    opened = _fixed_groups(opened, seen.labels, joining=first is not None)
    p_closed, logs = _closed(seen, first, phi, control=control is not None)
    part = np.array([version_share(reserve, memory.version) for memory in memories.values()])
    shares = interval_shares(len(seen.labels), first, control=control is not None) * part
    widths = _half_widths(figures, seen.df, phi, shares * alpha)
    alone = single_p(seen, figures, control=control is not None)
    inputs = []
    for at, memory in enumerate(memories.values()):
        inputs.append(
            PairInput(
                missing=figures.missing[at],
                difference=float(figures.difference[at]),
                standard_error=float(figures.standard_error[at]),
                df=seen.df,
                half_width=float(widths[at]),
                p_now=overall_p(memory, float(p_closed[at]), reserve, spends_by_look=False),
                p_single=float(alone[at]),
                share=float(shares[at]),
                log_evidence=float(logs[at]),
            )
        )
    notes = amendment_notes(opened, memories, reserve)
    notes += [f"{label} has no unit yet" for label, n in zip(seen.labels, seen.n, strict=True) if n == 0]
    guarantee = _guarantee(notes)
    return assemble(Heading(seen.labels, alpha, margin, guarantee, tuple(notes)), opened, memories, inputs)


def _guarantee(notes: Sequence[str]) -> str:
    if any("approximate" in note for note in notes):
        return "approximate: amended values reach the other pairs through the pooled variance"
    return "exact for independent normal units with one spread, at all looks together"


def _check_phi(phi: float) -> None:
    if not (np.isfinite(phi) and phi > 0):
        raise StatsError(
            f"a tuning of {phi!r} cannot be meant", where="phi", advice="give (sd of a unit / margin) squared"
        )


def _founders(seen: UnitMeans, founders: Sequence[str] | None, control: str | None) -> int | None:
    if control is not None and seen.labels[0] != control:
        raise StatsError(f"the control {control!r} must be the first group", where="control")
    if founders is None:
        return None
    first = len(founders)
    if first < 2 or tuple(founders) != seen.labels[:first]:
        raise StatsError(
            "the founders must be two groups or more, and come first in the order they were stated", where="founders"
        )
    return first


def _fixed_groups(state: LooksState, labels: tuple[str, ...], *, joining: bool) -> LooksState:
    """Refuses groups that appear or vanish where the error rate was shared among the groups stated.

    Raises:
        StatsError: so.
    """
    before = {name for row in state.pairs for name in (row.a, row.b)}
    if before and ((not joining and set(labels) != before) or not before <= set(labels)):
        raise StatsError(
            f"the groups changed: {', '.join(sorted(before ^ set(labels)))}",
            where="labels",
            advice="state founders so that groups may join, or restate the comparison with looks.restate",
        )
    return state


def _closed(seen: UnitMeans, founders: int | None, phi: float, *, control: bool) -> tuple[Floats, Floats]:
    """Closed p-values and log evidence of the pairs asked."""
    means, n, ss, df = seen.arrays()
    groups = len(seen.labels)
    logs = log_pair_evidence(means, n, ss, df, phi)
    logs = logs[: groups - 1] if control else logs
    first = groups if founders is None else founders
    p = _closed_of_first(means[:first], n[:first], ss, df, phi, control=control)
    return (p if founders is None else with_joiners(p, logs, groups, first, control=control)), logs


def _closed_of_first(means: Floats, n: Floats, ss: Floats, df: Floats, phi: float, *, control: bool) -> Floats:
    groups = means.shape[-1]
    if groups <= FEW:
        return closed_p_few(means, n, ss, df, phi, control=control)
    if control:
        return holm_from_log(log_pair_evidence(means, n, ss, df, phi)[: groups - 1])
    return closed_p_many(means, n, ss, df, phi)


def _half_widths(figures: PairFigures, df: float, phi: float, rates: Floats) -> Floats:
    """Half lengths of the intervals, (m,); `inf` where nothing bounds the difference."""
    there = np.array([not reason for reason in figures.missing]) & (rates > 0)
    t = critical_t(df, figures.units, phi, np.where(there, rates, 0.5))
    return np.where(there, np.where(np.isfinite(t), t, 0.0) * figures.standard_error, np.inf) + np.where(
        np.isfinite(t), 0.0, np.inf
    )


def judge_open_contrasts(
    seen: Contrasts,
    unit_sd: float,
    *,
    alpha: float = 0.05,
    margin: float | None = None,
    phi: float = PHI,
    reserve: float = RESERVE,
    amended: Sequence[str] = (),
    state: LooksState | None = None,
) -> LookResult:
    """Judges contrasts of any fit as `judge_open` does; the guarantee is approximate.

    The e-value takes each contrast's t, its degrees of freedom and (unit_sd / standard error)^2 units. Closed testing
    over partitions uses the pairs' own evidence. It rests on the fit's standard errors: simulate it for the design, or
    use `judge_union`, whose looks share the error rate without any assumption on how looks hang together.

    Args:
        seen: contrasts now estimated.
        unit_sd: standard deviation of one unit, stated beforehand, in the unit of the estimates.
        alpha: family error rate.
        margin: smallest difference that matters, or None.
        phi: tuning.
        reserve: share of alpha kept for amended data.
        amended: groups with an amended value that an earlier look had seen.
        state: of the look before.

    Raises:
        StatsError: options out of range, or changed since the look before.
    """
    alpha, margin, reserve = check_alpha(alpha), check_margin(margin), check_reserve(reserve)
    _check_phi(phi)
    if not (np.isfinite(unit_sd) and unit_sd > 0):
        raise StatsError(f"a spread of {unit_sd!r} cannot be meant", where="unit_sd")
    touched = check_members(amended, seen.labels, "amended")
    groups = len(seen.labels)
    asked = tuple((a, b) for i, a in enumerate(seen.labels) for b in seen.labels[i + 1 :])
    rule = f"{rule_of(phi, reserve)}; unit sd {unit_sd!r}"
    opened, memories = next_memories(remembered(state, "open", rule), asked, touched)
    opened = _fixed_groups(opened, seen.labels, joining=False)
    place = {pair: at for at, pair in enumerate(seen.pairs)}
    se, df = np.array(seen.standard_errors), np.array(seen.dfs)
    units = (unit_sd / se) ** 2
    own_logs = log_e_value(np.array(seen.estimates) / se, df, units, phi)
    logs = np.array([own_logs[place[pair]] if pair in place else 0.0 for pair in asked])
    p_closed = closed_p_from_pairs(logs, groups)
    alone = single_p_contrasts(seen)
    inputs = []
    for at, (pair, memory) in enumerate(memories.items()):
        share = 2.0 / (groups * (groups - 1)) * version_share(reserve, memory.version)
        if pair not in place:
            inputs.append(_absent())
            continue
        own = place[pair]
        width = float(critical_t(df[own], units[own], phi, share * alpha)) * se[own] if share > 0 else float("inf")
        inputs.append(
            PairInput(
                missing="",
                difference=seen.estimates[own],
                standard_error=seen.standard_errors[own],
                df=seen.dfs[own],
                half_width=float(width),
                p_now=overall_p(memory, float(p_closed[at]), reserve, spends_by_look=False),
                p_single=float(alone[own]),
                share=share,
                log_evidence=float(logs[at]),
            )
        )
    notes = amendment_notes(opened, memories, reserve)
    guarantee = "approximate: as good as the standard errors and degrees of freedom of the fit"
    return assemble(Heading(seen.labels, alpha, margin, guarantee, tuple(notes)), opened, memories, inputs)


def _absent() -> PairInput:
    return PairInput("the fit gives no estimate for this pair", 0.0, 0.0, 0.0, float("inf"), None, None, None)


def skip_look(state: LooksState) -> LooksState:
    """Counts a look that could not be evaluated at all, so that its number is not given twice."""
    return replace(state, look=state.look + 1)
