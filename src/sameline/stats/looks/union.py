"""Any procedure, any number of looks: each judged look has its own share of the error rate (union bound).

For unequal spread, ranks, or nested random effects no exact method for looks without end is known to us. If a
procedure's family-adjusted p-value is valid at a single look, then judging the j-th look at alpha / (j (j + 1)) keeps
the error rate over all looks at most alpha, whatever the looks have in common: the sharing is exact, the p-values are
as good as the procedure. It is dear where many looks see nearly the same data. So a look is judged only when the units
have grown by `growth` since the last one judged (the first counts; 1.0 judges every look); the looks between show
estimates and carry the last judged interval, which still holds.
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
    look_weight,
    next_memories,
    version_share,
)
from sameline.stats.looks.assemble import Heading, PairInput, assemble
from sameline.stats.looks.results import LookResult, LooksState, PairMemory, check_members, remembered
from sameline.stats.looks.single import keep_interval
from sameline.stats.looks.single_look import contrast_critical_t, single_p_contrasts
from sameline.stats.looks.units import Contrasts
from sameline.stats.verdicts import check_alpha, check_margin

if TYPE_CHECKING:
    from collections.abc import Sequence

    from sameline.stats.looks.units import Pair

GROWTH = 1.25
"""Growth of the data from one judged look to the next unless a comparison states another."""


def rule_of(growth: float = GROWTH, reserve: float = RESERVE, procedure: str = "studentized range") -> str:
    """The options of a union comparison that may not change between looks, as text."""
    return f"{procedure}; growth {growth!r}; reserve {reserve!r}"


def is_judged(units: int, state: LooksState | None, growth: float = GROWTH) -> bool:
    """Whether a look at so many units is one that spends: enough growth since the last that did."""
    return state is None or state.judged == 0 or units >= growth * state.units


def rate_of_look(
    units: int, alpha: float, state: LooksState | None, growth: float = GROWTH, reserve: float = RESERVE
) -> float | None:
    """The error rate at which to run a procedure at this look for pairs no amendment touched; None when it spends none.

    A caller with a procedure of its own runs it at this rate, and hands its p-values and intervals to `judge_union`.
    """
    if not is_judged(units, state, growth):
        return None
    judged = 1 if state is None else state.judged + 1
    return alpha * (1.0 - reserve) * look_weight(judged)


def judge_union(
    seen: Contrasts,
    *,
    alpha: float = 0.05,
    margin: float | None = None,
    p_values: Sequence[float] | None = None,
    half_widths: Sequence[float] | None = None,
    procedure: str = "studentized range",
    growth: float = GROWTH,
    reserve: float = RESERVE,
    amended: Sequence[str] = (),
    state: LooksState | None = None,
) -> LookResult:
    """Judges contrasts, or any procedure's p-values, with a share of the error rate a judged look.

    Args:
        seen: contrasts now estimated, in the order of `p_values`.
        alpha: family error rate over all pairs and all looks.
        margin: smallest difference that matters, or None.
        p_values: family-adjusted p-values of this look from a procedure of the caller's; None for the studentized
            range of k groups with each contrast's own degrees of freedom.
        half_widths: half lengths of its simultaneous intervals at error rate `rate_of_look(...)`; `inf` where the
            procedure has none. Required with `p_values`.
        procedure: name of the procedure, part of the rule.
        growth: growth of `seen.units` between judged looks, at least 1.
        reserve: share of alpha kept for amended data.
        amended: groups with an amended value that an earlier look had seen.
        state: of the look before.

    Raises:
        StatsError: options out of range, or changed since the look before.
    """
    alpha, margin, reserve = check_alpha(alpha), check_margin(margin), check_reserve(reserve)
    if not growth >= 1:
        raise StatsError(f"a growth of {growth!r} between looks cannot be meant", where="growth", advice="1 or more")
    own = p_values is None
    if not own and (half_widths is None or not len(p_values or ()) == len(half_widths) == len(seen.pairs)):
        raise StatsError("p-values, half widths and pairs differ in number", where="p_values")
    before = remembered(state, "union", rule_of(growth, reserve, procedure))
    touched = check_members(amended, seen.labels, "amended")
    asked = [(a, b) for i, a in enumerate(seen.labels) for b in seen.labels[i + 1 :]]
    opened, memories = next_memories(before, asked, touched)
    spends = is_judged(seen.units, before, growth)
    if spends:
        opened = replace(opened, judged=opened.judged + 1, units=seen.units)
    p = single_p_contrasts(seen) if own else np.array(p_values, dtype=np.float64)
    inputs = []
    for pair in asked:
        found, memories[pair] = _one(seen, pair, memories[pair], opened, p, half_widths, alpha, reserve, spends=spends)
        inputs.append(found)
    notes = [*amendment_notes(opened, memories, reserve), *_notes(opened, growth, spends=spends)]
    guarantee = "exact sharing over looks, as good at each look as the procedure's own p-values"
    return assemble(Heading(seen.labels, alpha, margin, guarantee, tuple(notes)), opened, memories, inputs)


def _one(
    seen: Contrasts,
    pair: Pair,
    memory: PairMemory,
    state: LooksState,
    p: np.typing.NDArray[np.float64],
    half_widths: Sequence[float] | None,
    alpha: float,
    reserve: float,
    *,
    spends: bool,
) -> tuple[PairInput, PairMemory]:
    """The figures of one pair; a pair an amendment touched is judged at every look, its looks counted on their own."""
    if pair not in seen.pairs:
        return PairInput(
            "no estimate for this pair at this look", 0.0, 0.0, 0.0, float("inf"), None, None, None
        ), memory
    at = seen.pairs.index(pair)
    judged = spends or memory.version > 0
    share = version_share(reserve, memory.version)
    share *= look_weight(memory.since if memory.version else max(state.judged, 1))
    width = float("inf")
    if judged and share > 0:
        if half_widths is None:
            width = float(contrast_critical_t(seen, share * alpha)[at]) * seen.standard_errors[at]
        elif memory.version == 0:
            width = float(half_widths[at])
    found = PairInput(
        missing="",
        difference=seen.estimates[at],
        standard_error=seen.standard_errors[at],
        df=seen.dfs[at],
        half_width=width,
        p_now=(min(1.0, float(p[at]) / share) if share > 0 else 1.0) if judged else None,
        p_single=float(p[at]),
        share=share if judged else None,
    )
    return found, keep_interval(memory, found)


def _notes(state: LooksState, growth: float, *, spends: bool) -> list[str]:
    if spends:
        return [f"judged look {state.judged}"]
    need = int(np.ceil(growth * state.units))
    return [f"not judged: the next judged look is at {need} units or more; intervals are those of the last"]
