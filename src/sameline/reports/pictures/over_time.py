"""The picture over time: batches in order of their first test, limits, the spread of runs, amendments, exclusions."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from sameline.reports.pictures.captions import named, shown_caption
from sameline.reports.pictures.columns import columns, heading_width, names, row, shortened_words
from sameline.reports.pictures.drawing import Picture, check_width, compose, drawing
from sameline.reports.pictures.marks import RUN_WORDS, draw_runs, special_words
from sameline.reports.pictures.plain import axis_lines
from sameline.reports.pictures.scale import draw_limits, draw_upright, scale_of
from sameline.reports.pictures.style import INK, MUTED
from sameline.reports.text import count, day, number

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from sameline.reports.pictures.content import DrawnRun, Shown

FIELD = 56.0


def over_time_picture(shown: Shown, *, width: float = 170.0) -> Picture:
    """Draws a characteristic batch by batch.

    Args:
        shown: from `content.read_shown`.
        width: in mm.

    Raises:
        CallError: the width is none, or there are too many batches for it.
    """
    check_width(width)
    own: dict[str, list[DrawnRun]] = {}
    for run in shown.runs:
        own.setdefault(run.column, []).append(run)
    labels = list(own)
    values = [v.value for run in shown.runs for v in run.values]
    decimals = shown.decimals + 1
    means = [_mean(own[label]) for label in labels]
    with drawing():
        scale = scale_of(values, (shown.lower, shown.upper))
        made = columns(len(labels), width, heading_width(["first test"], scale.width))

        def field(axes: Axes) -> None:
            draw_upright(axes, scale, shown.unit)
            draw_limits(axes, scale, shown.lower, shown.upper, shown.unit)
            for at, label in enumerate(labels):
                _batch(axes, at, own[label], means[at], made.each)

        naming, short = names(made, "batch", labels)
        blocks = [
            made.block(4.0, lambda _axes: None),
            made.block(FIELD, field),
            naming,
            row(made, "first test", [day(own[label][0].tested_at)[2:] for label in labels]),
            row(made, "mean", [number(m, decimals) for m in means], bold=True, ids="mean-figure"),
            row(made, "runs", [str(len(own[label])) for label in labels], ids="runs-figure"),
            row(made, "values", [str(sum(len(r.values) for r in own[label])) for label in labels], ids="values-figure"),
        ]
        caption = shown_caption(shown, f"{_words(shown)} {shortened_words(short)}".strip())
        subtitle = f"{named(shown.name, shown.characteristic)}, {shown.unit}; {shown.filter}, over time"
        return compose(width, shown.name, subtitle, blocks, caption, _told(shown, own, means, decimals))


def _batch(axes: Axes, at: int, runs: Sequence[DrawnRun], mean: float | None, column_mm: float) -> None:
    places = draw_runs(axes, at, runs, (-0.34, 0.34), column_mm)
    for x, run in zip(places, runs, strict=True):
        if len(run.kept) > 1:
            axes.plot([x, x], [min(run.kept), max(run.kept)], color=MUTED, lw=0.7, zorder=1.5)
    if mean is not None:
        (line,) = axes.plot([at - 0.44, at + 0.44], [mean, mean], color=INK, lw=0.6, ls=(0, (1, 1.4)), zorder=1.6)
        line.set_gid(f"batch-{at + 1}-mean")


def _mean(runs: Sequence[DrawnRun]) -> float | None:
    """Mean of the run means."""
    means = [run.mean for run in runs if run.mean is not None]
    return sum(means) / len(means) if means else None


def _words(shown: Shown) -> str:
    return (
        f"{RUN_WORDS}, on a line from the run's least to its greatest{special_words(shown.runs)}; dotted: mean of "
        "the batch's run means. Batches stand in order of their first test, runs of a batch in order of time; rows "
        "below count what is set aside too."
    )


def _told(shown: Shown, own: dict[str, list[DrawnRun]], means: Sequence[float | None], decimals: int) -> list[str]:
    drawn = []
    for (label, runs), mean in zip(own.items(), means, strict=True):
        kept = [v for run in runs for v in run.kept]
        aside = sum(v.aside is not None for run in runs for v in run.values)
        amended = sum(v.amended for run in runs for v in run.values)
        remarks = [
            count(len(runs), "run"),
            *([f"{aside} set aside"] if aside else []),
            *([f"{amended} amended"] if amended else []),
        ]
        drawn.append((label, min(kept, default=None), mean, max(kept, default=None), ", ".join(remarks)))
    return axis_lines(drawn, decimals, (shown.lower, shown.upper), shown.unit)
