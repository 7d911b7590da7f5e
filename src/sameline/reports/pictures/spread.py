"""The picture of spread: variance components as standard deviations with their intervals and shares."""

from __future__ import annotations

from typing import TYPE_CHECKING

from sameline.reports.pictures.captions import SAFETY, aside_words, named
from sameline.reports.pictures.drawing import Picture, check_width, compose, drawing
from sameline.reports.pictures.forest import ForestRow, Lines, forest
from sameline.reports.pictures.plain import axis_lines
from sameline.reports.pictures.scale import scale_of
from sameline.reports.text import count, interval, number, percent

if TYPE_CHECKING:
    from sameline.reports.pictures.content import Shown
    from sameline.stats.nested.components import Spread
    from sameline.stats.nested.fit import NestedFit

_SAYS = {
    "batch": "from batch to batch",
    "run": "from run to run",
    "replicate": "from replicate to replicate",
    "total": "in all",
}


def spread_picture(fit: NestedFit, shown: Shown, *, alpha: float = 0.05, width: float = 170.0) -> Picture:
    """Draws the components of a characteristic.

    Args:
        fit: the nested model's, on what is shown.
        shown: the characteristic, and the runs that it was fitted to.
        alpha: 1 - the confidence of each interval.
        width: in mm.

    Raises:
        CallError: the width is none.
    """
    check_width(width)
    found = fit.spread(alpha)
    unit, decimals, title = shown.unit, shown.decimals, named(shown.name, shown.characteristic)
    rows = [_row(each, decimals + 2) for each in (*found.levels, *found.precision)]
    headings = ("sd", f"{percent(1 - alpha)} interval", "share")
    with drawing():
        scale = scale_of([0.0, *(x for r in rows for x in (r.lower, r.middle, r.upper) if x is not None)])
        blocks, _ = forest(rows, headings, scale, unit, width, Lines(((0.0, "0"),)))
        amounts = ", ".join(
            count(many, level, "batches" if level == "batch" else None)
            for level, many in fit.counts.items()
            if level != "group"
        )
        parts = [
            f"Disc: standard deviation; line: its {percent(1 - alpha)} interval, for each alone ({found.method}).",
            "Share: of the variance.",
            f"{title} in {unit}; {shown.filter}. Procedure: nested model by REML, a mean for each material.",
            "Repeatability and intermediate precision: as ISO 5725 has them.",
            f"n: {amounts}; what is only a bound is left out.",
            aside_words(shown.runs, ()),
            "Nothing is tested here, so no error rate and no look applies.",
            f"Records up to ledger entry {shown.position}.",
            *(c.text[:1].upper() + c.text[1:].rstrip(".") + "." for c in fit.cautions),
            *([SAFETY] if shown.safety_critical else []),
        ]
        told = axis_lines(
            [(r.name, r.lower, r.middle, r.upper, r.figures[2]) for r in rows], decimals + 2, (0.0,), unit
        )
        return compose(
            width, title, f"Spread as standard deviations, {unit}; {shown.filter}", blocks, " ".join(parts), told
        )


def _row(each: Spread, decimals: int) -> ForestRow:
    figures = (
        number(each.standard_deviation, decimals),
        interval(each.lower, each.upper, decimals),
        f"{100 * each.share:.0f} %",
    )
    return ForestRow(_SAYS.get(each.name, each.name), each.lower, each.standard_deviation, each.upper, figures)
