"""Runs as they were recorded, against the specification limits."""

from __future__ import annotations

import math
from collections.abc import Sequence

from sameline.records.drafts import CharacteristicFacts, DraftRun
from sameline.reports.text import count, number, plain


def limits_text(facts: CharacteristicFacts) -> str:
    """The specification limits in words: "at most 25 %"."""
    if facts.lower is not None and facts.upper is not None:
        return f"{plain(facts.lower)} to {plain(facts.upper)} {facts.unit}"
    if facts.upper is not None:
        return f"at most {plain(facts.upper)} {facts.unit}"
    if facts.lower is not None:
        return f"at least {plain(facts.lower)} {facts.unit}"
    return "no limits"


def run_line(run: int, draft: DraftRun, facts: CharacteristicFacts) -> str:
    """One run in a line: its mean, spread, and what lies outside the limits."""
    known = [m.value for m in draft.measurements if m.qualifier is None]
    decimals = (2 if facts.decimals is None else facts.decimals) + 1
    figures = [count(len(draft.measurements), "value")]
    if known:
        mean = math.fsum(known) / len(known)
        figures.append(f"mean {number(mean, decimals)} {facts.unit}")
    if len(known) > 1:
        spread = math.sqrt(math.fsum((x - mean) ** 2 for x in known) / (len(known) - 1))
        figures.append(f"sd {number(spread, decimals)}")
    return f"run {run}: {draft.characteristic} of {draft.batch}, {', '.join(figures)}; {_against(draft, facts)}"


def outside(draft: DraftRun, facts: CharacteristicFacts) -> list[int]:
    """The numbers of the replicates that lie outside the specification limits."""
    low, high = facts.lower, facts.upper
    return [
        m.replicate
        for m in draft.measurements
        if (low is not None and m.value < low) or (high is not None and m.value > high)
    ]


def _against(draft: DraftRun, facts: CharacteristicFacts) -> str:
    limits = limits_text(facts)
    if facts.lower is None and facts.upper is None:
        return limits
    beyond = outside(draft, facts)
    if not beyond:
        return f"all within limits ({limits})"
    texts = [m.text for m in draft.measurements if m.replicate in beyond]
    return f"OUTSIDE LIMITS ({limits}): {', '.join(texts)}"


def runs_summary(runs: Sequence[int], drafts: Sequence[DraftRun], facts: dict[str, CharacteristicFacts]) -> list[str]:
    """Runs taken from a file: a line each up to a dozen, else a count and those that have values outside."""
    lines = [run_line(run, draft, facts[draft.characteristic]) for run, draft in zip(runs, drafts, strict=True)]
    if len(lines) <= 12:
        return lines
    off = [line for line in lines if "OUTSIDE LIMITS" in line]
    shown = off[:12] + ([f"and {len(off) - 12} more runs with values outside"] if len(off) > 12 else [])
    return [f"{count(len(lines), 'run')}, {len(off)} with values outside the limits", *shown]
