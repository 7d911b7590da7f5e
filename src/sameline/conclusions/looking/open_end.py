"""Looks without end, on units: evidence that holds at every look, over the whole record and over stated windows.

A comparison may state windows: its evidence also starts anew every so many units, in the order in which they were
recorded (set aside or not, so that an exclusion moves no window), or every so many calendar months of testing, counted
from the month in which it was stated (what was tested before that belongs to the first). The whole record and the
windows share the error rate (`sameline.stats.looks.windows`); intervals are those of the whole record.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Any

from sameline.conclusions.looking.telling import told
from sameline.conclusions.looking.view import Looking, Plain, kept_reserve, remembered, state_before, unit_means_seen

if TYPE_CHECKING:
    from collections.abc import Callable

    from sameline.conclusions.judged import Judged
    from sameline.conclusions.models import Unit
    from sameline.records.comparisons import Revision
    from sameline.stats.looks import LookResult

_LEAST_PHI, _MOST_PHI = 1 / 64, 4.0


def judge_without_end(looking: Looking) -> Judged:
    """The verdicts of a comparison that is looked at again and again, with no end stated."""
    from sameline.stats.looks import window_alpha

    memory = {} if looking.past.state is None else remembered(looking.past.state)
    phi, founders = _tuning(looking, memory), _founders(looking, memory)
    reserve = kept_reserve(looking, memory)
    window = _window_rule(looking.revision)
    alpha = looking.revision.alpha
    if window is None:
        result = _judge(looking, looking.units, memory.get("state"), alpha, phi, founders, reserve)
        return told(looking, result, {"founders": founders, "phi": phi, "reserve": reserve})
    whole = _judge(looking, looking.units, memory.get("state"), window_alpha(alpha, 0), phi, founders, reserve)
    windows = _windows(looking, window, memory.get("windows", {}), phi, reserve)
    states = {number: window.state.to_plain() for number, window in windows.items()}
    kept = {"founders": founders, "phi": phi, "reserve": reserve, "windows": states}
    return told(looking, _together(whole, windows, alpha), kept)


def _judge(
    looking: Looking,
    units: tuple[Unit, ...],
    stored: Plain | None,
    alpha: float,
    phi: float,
    founders: list[str] | None,
    reserve: float,
) -> LookResult:
    from sameline.stats.looks import judge_open, open_looks

    seen = unit_means_seen(looking, units)
    control = looking.inputs.control
    rule = open_looks.rule_of(phi, reserve, founders=None if founders is None else tuple(founders), control=control)
    return judge_open(
        seen,
        phi=phi,
        reserve=reserve,
        alpha=alpha,
        margin=looking.inputs.margin,
        control=control,
        founders=founders,
        amended=looking.past.amended,
        state=state_before(stored, "open", rule, seen.labels if founders is None else None),
    )


def _windows(
    looking: Looking, window: Callable[[Unit], int], stored: dict[str, Any], phi: float, reserve: float
) -> dict[str, LookResult]:
    """Each window that has begun, judged on its own units; a comparison by windows lists its groups."""
    from sameline.stats.looks import window_alpha

    by_window: dict[int, list[Unit]] = {}
    for unit in looking.units:
        by_window.setdefault(window(unit), []).append(unit)
    alpha = looking.revision.alpha
    return {
        str(number): _judge(
            looking, tuple(units), stored.get(str(number)), window_alpha(alpha, number), phi, None, reserve
        )
        for number, units in sorted(by_window.items())
    }


def _window_rule(revision: Revision) -> Callable[[Unit], int] | None:
    """The window (1, 2, …) that a unit belongs to; None where the comparison states none."""
    from sameline.stats.looks import window_of

    if revision.window_units is not None:
        length = revision.window_units
        return lambda unit: window_of(unit.place, length)
    if revision.window_months is not None:
        months, start = revision.window_months, _month(revision.stated_at)
        return lambda unit: window_of(max(_month(unit.tested_at) - start, 0), months)
    return None


def _month(moment: str) -> int:
    return 12 * int(moment[:4]) + int(moment[5:7])


def _together(whole: LookResult, windows: dict[str, LookResult], alpha: float) -> LookResult:
    """The whole record's look, with the pairs that a window claims."""
    from sameline.stats.looks import over_windows

    claims = over_windows(alpha, {0: whole, **{int(number): result for number, result in windows.items()}})
    pairs, notes = [], list(whole.notes)
    for row, claim in zip(whole.pairs, claims, strict=True):
        verdict = "differs" if claim.differs and not row.differs and row.verdict == "undecided" else row.verdict
        pairs.append(replace(row, p_value=claim.p_value, differs=claim.differs, verdict=verdict))
        if claim.differs and claim.window:
            notes.append(f"{row.a} and {row.b} are shown to differ within window {claim.window}")
    return replace(whole, alpha=alpha, pairs=tuple(pairs), notes=tuple(notes))


def _tuning(looking: Looking, memory: dict[str, Any]) -> float:
    """What the evidence looks hardest for: differences of the margin, where margin and spread were known beforehand.

    It is fixed at the first look; bounded, so that a spread known badly cannot blind it.
    """
    from sameline.stats.looks import open_looks, phi_from_margin

    kept = memory.get("phi")
    if kept is not None and not looking.past.restated:
        return float(kept)
    if looking.inputs.margin is None or looking.past.unit_sd is None:
        return open_looks.PHI
    return min(max(phi_from_margin(looking.inputs.margin, looking.past.unit_sd), _LEAST_PHI), _MOST_PHI)


def _founders(looking: Looking, memory: dict[str, Any]) -> list[str] | None:
    """The groups of the first look, where others may join by a filter; None where all groups were listed."""
    if looking.revision.groups is not None:
        return None
    kept = memory.get("founders")
    labels = unit_means_seen(looking, looking.units).labels
    return list(labels) if kept is None or looking.past.restated else kept
