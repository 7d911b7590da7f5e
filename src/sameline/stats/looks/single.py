"""One look, at a stated amount of data: estimates before it, the verdicts at it, nothing new after it.

Exact (Tukey-Kramer or Dunnett on unit means) for independent normal units with one spread: only one look spends.
The look that spends is the first whose units reach the stated amount; if it holds more than stated, it is judged on
what it holds and says so, which costs nothing as long as the amount did not depend on the results.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

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
from sameline.stats.looks.results import LookResult, LooksState, PairMemory, check_members, remembered
from sameline.stats.looks.single_look import single_critical_t, single_p
from sameline.stats.looks.units import UnitMeans, pair_figures
from sameline.stats.verdicts import check_alpha, check_margin

if TYPE_CHECKING:
    from collections.abc import Sequence


def rule_of(units: int, reserve: float = RESERVE, *, control: str | None = None) -> str:
    """The options of a single-look comparison that may not change between looks, as text."""
    return f"units {units!r}; reserve {reserve!r}" + (f"; control {control}" if control is not None else "")


def judge_single(
    seen: UnitMeans,
    units: int,
    *,
    alpha: float = 0.05,
    margin: float | None = None,
    reserve: float = RESERVE,
    control: str | None = None,
    amended: Sequence[str] = (),
    state: LooksState | None = None,
) -> LookResult:
    """Estimates at every look; p-values and intervals once, when the stated number of units is there.

    Args:
        seen: the unit means now recorded; with `control` that group comes first.
        units: number of units, of all groups together, at which the one look is made.
        alpha: family error rate.
        margin: smallest difference that matters, or None.
        reserve: share of alpha kept for data amended after the look.
        control: compare the others with this group only.
        amended: groups with an amended or excluded value that an earlier look had seen.
        state: of the look before.

    Returns:
        A look; before and after the one that spends, `p_now` is None and the interval is that of the look that did.

    Raises:
        StatsError: options out of range, or changed since the look before.
    """
    alpha, margin, reserve = check_alpha(alpha), check_margin(margin), check_reserve(reserve)
    if units < 2:
        raise StatsError(f"a look at {units} units cannot be meant", where="units")
    if control is not None and seen.labels[0] != control:
        raise StatsError(f"the control {control!r} must be the first group", where="control")
    with_control = control is not None
    before = remembered(state, "single", rule_of(units, reserve, control=control))
    # an amendment before the one look that spends voids nothing
    touched = check_members(amended, seen.labels, "amended") if before.judged else frozenset()
    figures = pair_figures(seen, control=with_control)
    opened, memories = next_memories(before, figures.pairs, touched)
    total = sum(seen.n)
    spends = total >= units and not opened.judged
    opened = replace(opened, judged=opened.judged + spends, units=total if spends else opened.units)
    alone = single_p(seen, figures, control=with_control)
    inputs: list[PairInput] = []
    for at, (pair, memory) in enumerate(list(memories.items())):
        judged = not figures.missing[at] and (spends or (memory.version > 0 and total >= units))
        rate = alpha * version_share(reserve, memory.version)
        rate *= look_weight(memory.since) if memory.version else 1.0
        width = float("inf")
        if judged and rate > 0:
            width = single_critical_t(seen, rate, control=with_control) * float(figures.standard_error[at])
        found = PairInput(
            missing=figures.missing[at],
            difference=float(figures.difference[at]),
            standard_error=float(figures.standard_error[at]),
            df=seen.df,
            half_width=width,
            p_now=overall_p(memory, float(alone[at]), reserve, spends_by_look=True) if judged else None,
            p_single=float(alone[at]),
            share=rate / alpha if judged else None,
        )
        memories[pair] = keep_interval(memory, found)
        inputs.append(found)
    notes = [*_notes(total, units, opened, spends=spends), *amendment_notes(opened, memories, reserve)]
    guarantee = "exact for independent normal units with one spread: one look spends the error rate"
    return assemble(Heading(seen.labels, alpha, margin, guarantee, tuple(notes)), opened, memories, inputs)


def keep_interval(memory: PairMemory, found: PairInput) -> PairMemory:
    """The memory with the interval of a look that spends, for the looks after it that do not.

    The intervals of all looks hold together, so what they have in common holds too. Where they have nothing in common
    (one of them is wrong, which the error rate allows, or a slip that nobody has amended yet) the newest is kept.
    """
    if found.p_now is None or found.missing or found.half_width == float("inf"):
        return memory
    newest = found.difference - found.half_width, found.difference + found.half_width
    lower = newest[0] if memory.lower is None else max(memory.lower, newest[0])
    upper = newest[1] if memory.upper is None else min(memory.upper, newest[1])
    if lower > upper:
        lower, upper = newest
    return replace(memory, lower=lower, upper=upper)


def _notes(total: int, units: int, state: LooksState, *, spends: bool) -> list[str]:
    if spends and total > units:
        return [f"the look was stated at {units} units and made at {total}"]
    if spends:
        return []
    if state.judged:
        return [f"the one look was made at {state.units} units; figures of later data are descriptive"]
    return [f"no verdicts before {units} units are there; now {total}"]
