"""Putting one look together: pair by pair from arrays to the frozen result."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from sameline.stats.looks.results import LookResult, LooksState, PairAtLook, PairMemory
from sameline.stats.verdicts import verdict

if TYPE_CHECKING:
    from collections.abc import Sequence

    from sameline.stats.looks.units import Pair


@dataclass(frozen=True, slots=True)
class PairInput:
    """What a procedure found for one pair at one look; see `PairAtLook` for the figures.

    Attributes:
        missing: why the pair cannot be judged, "" when it can.
        difference: mean of b less mean of a.
        standard_error: of the difference.
        df: its degrees of freedom.
        half_width: of the interval, `inf` for no bound.
        p_now: overall p-value of this look alone; None when this look spends nothing.
        p_single: of a single look.
        share: share of the error rate the interval spends.
        log_evidence: log e-value.
    """

    missing: str
    difference: float
    standard_error: float
    df: float
    half_width: float
    p_now: float | None
    p_single: float | None
    share: float | None
    log_evidence: float | None = None


@dataclass(frozen=True, slots=True)
class Heading:
    """What is the same for all pairs of a look."""

    labels: tuple[str, ...]
    alpha: float
    margin: float | None
    guarantee: str
    notes: tuple[str, ...]


def assemble(
    heading: Heading, state: LooksState, memories: dict[Pair, PairMemory], inputs: Sequence[PairInput]
) -> LookResult:
    """The result of a look, its state with the p-values of this look taken in.

    Args:
        heading: what all pairs share.
        state: with this look already counted.
        memories: of the pairs asked, in order, this look counted in `since`.
        inputs: one for each of them.
    """
    rows, kept = [], []
    for memory, found in zip(memories.values(), inputs, strict=True):
        row, after = _one(heading, memory, found)
        rows.append(row)
        kept.append(after)
    asked = set(memories)
    others = tuple(row for row in state.pairs if (row.a, row.b) not in asked)
    return LookResult(
        mode=state.mode,
        look=state.look,
        alpha=heading.alpha,
        labels=heading.labels,
        pairs=tuple(rows),
        guarantee=heading.guarantee,
        notes=heading.notes,
        state=replace(state, pairs=(*kept, *others)),
        not_estimable={(row.a, row.b): found.missing for row, found in zip(rows, inputs, strict=True) if found.missing},
    )


def _one(heading: Heading, memory: PairMemory, found: PairInput) -> tuple[PairAtLook, PairMemory]:
    p_value = memory.p_value if found.missing or found.p_now is None else min(memory.p_value, found.p_now)
    after = memory.with_p(p_value)
    differs = p_value <= heading.alpha
    if found.missing:
        word = verdict(None, None, heading.margin, differs)
        none = (None,) * 8
        return PairAtLook(memory.a, memory.b, *none[:4], None, None, None, word, None, None, None, None, differs), after
    lower, upper = interval_of(found, memory, differs=differs)
    return (
        PairAtLook(
            a=memory.a,
            b=memory.b,
            difference=found.difference,
            standard_error=found.standard_error,
            df=found.df,
            statistic=found.difference / found.standard_error,
            p_value=p_value,
            lower=lower,
            upper=upper,
            verdict=verdict(lower, upper, heading.margin, differs),
            p_now=found.p_now,
            p_single=found.p_single,
            log_evidence=found.log_evidence,
            share=found.share,
            differs=differs,
        ),
        after,
    )


def interval_of(found: PairInput, memory: PairMemory, *, differs: bool) -> tuple[float, float]:
    """The interval; of a pair not claimed it is drawn out to reach 0, so that no reader sees a claim that is not made.

    At a look that spends nothing it is the interval of the last look that did. Drawing out only adds coverage.
    """
    if found.p_now is None and math.isinf(found.half_width):
        lower = -math.inf if memory.lower is None else memory.lower
        upper = math.inf if memory.upper is None else memory.upper
    else:
        lower, upper = found.difference - found.half_width, found.difference + found.half_width
    return (lower, upper) if differs else (min(lower, 0.0), max(upper, 0.0))
