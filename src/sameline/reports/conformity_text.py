"""Conformity and capability as text for a terminal, and as documents for other programs."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import asdict
from typing import TYPE_CHECKING, Any

from sameline.reports.text import count, interval, number, percent, plain, table

if TYPE_CHECKING:
    from sameline.reports.conformity import BatchConformity, Limits, SupplierCapability
    from sameline.stats.conformity import Conformity


def conformity_text(found: BatchConformity) -> list[str]:
    """A batch against its limits, for a terminal."""
    limits, measured, decimals = found.limits, found.measured, found.limits.decimals + 1
    other = f", with another {plain(found.other)} in it" if found.other else ""
    known = f"standard uncertainty {number(measured.uncertainty, decimals + 1)}{other}, {_df_words(measured.df)}"
    amounts = f"{count(found.runs, 'run')} and {count(found.values, 'value')}"
    chance = f"probability of conformity {_share(found.answers[0].probability)}"
    lines = [
        f"{found.batch} ({found.material}): {_limit_words(limits)}",
        f"  mean {number(measured.estimate, decimals)} of {amounts}; {known}",
        f"  ({found.basis})",
        f"  {chance}; records up to ledger entry {limits.position}",
        "",
    ]
    rows = [_answer_row(answer, decimals) for answer in found.answers]
    lines += table(("decision rule", "answer", "guard band", "accepted"), rows, "<<><")
    lines += [
        "",
        f"  Guarded: expanded uncertainty, coverage 95.45 %; ISO 14253-1 and JCGM 106 at {percent(found.probability)}.",
        "  It concerns the mean of the batch, not each piece of it.",
    ]
    return [*lines, *_caution_lines(found.cautions)]


def capability_text(found: SupplierCapability) -> list[str]:
    """A supplier's batches against the limits, for a terminal."""
    limits, decimals = found.limits, found.limits.decimals + 1
    amounts = ", ".join(count(n, level, "batches" if level == "batch" else None) for level, n in found.counts.items())
    spread = f"standard deviation {number(found.deviation, decimals + 1)} with {_df_words(found.df)}"
    lines = [
        f"{found.supplier}, {found.material}: {_limit_words(limits)}",
        f"  {amounts}; mean {number(found.mean, decimals)}, {spread}; records up to ledger entry {limits.position}",
        "",
    ]
    rows = [(i.name, number(i.value, 2), interval(i.lower, i.upper, 2)) for i in found.indices]
    lines += table(("index", "value", f"{percent(1 - found.alpha)} interval"), rows, "<><")
    return [*lines, *_caution_lines(found.cautions)]


def _caution_lines(cautions: Sequence[str]) -> list[str]:
    return ["", "  Cautions:", *(f"  * {text}" for text in cautions)] if cautions else []


def _answer_row(answer: Conformity, decimals: int) -> tuple[str, ...]:
    guard = "–" if answer.guard is None else number(answer.guard, decimals + 1)
    return answer.rule, answer.verdict, guard, interval(answer.lower, answer.upper, decimals)


def _limit_words(limits: Limits) -> str:
    name = limits.name if limits.name == limits.code else f"{limits.name} ({limits.code})"
    named = f"{name}, {limits.unit}; limits"
    if limits.lower is None:
        return f"{named} at most {plain(limits.upper)}"
    if limits.upper is None:
        return f"{named} at least {plain(limits.lower)}"
    return f"{named} {plain(limits.lower)} to {plain(limits.upper)}"


def _df_words(df: float) -> str:
    return f"{df:.1f} degrees of freedom" if math.isfinite(df) else "known without doubt"


def _share(p: float) -> str:
    return ">0.9999" if p > 0.9999 else "<0.0001" if p < 0.0001 else f"{p:.4f}"


def conformity_document(found: BatchConformity) -> dict[str, Any]:
    """The same for other programs; degrees of freedom without end are null."""
    document = asdict(found)
    if not math.isfinite(found.measured.df):
        document["measured"]["df"] = None
    return document


def capability_document(found: SupplierCapability) -> dict[str, Any]:
    """The same for other programs."""
    return asdict(found)
