"""The picture of power: the chance of showing a difference, against the difference, for the cheapest plan."""

from __future__ import annotations

from typing import TYPE_CHECKING

from sameline.errors import CallError
from sameline.reports.pictures.columns import columns, heading_width
from sameline.reports.pictures.drawing import Block, Picture, check_width, compose, drawing
from sameline.reports.pictures.scale import Scale, draw_level, draw_upright, scale_of
from sameline.reports.pictures.style import INK, MUTED, SMALL
from sameline.reports.text import count, percent, plain

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from sameline.conclusions.planning import Sizes
    from sameline.stats.plans import PlanTable

FIELD = 52.0
TENTH = 4


def power_picture(found: Sizes, title: str, unit: str, *, position: int | None = None, width: float = 170.0) -> Picture:
    """Draws the power curve of the `size` command.

    Args:
        found: plans.
        title: what they are for.
        unit: of the difference.
        position: the ledger entry up to which the records were read, where the spreads are from records.
        width: in mm.

    Raises:
        CallError: the width is none, or no plan reaches the power.
    """
    check_width(width)
    plans = found.plans
    if plans is None:
        raise CallError(found.refusal or "there is no plan to draw")
    with drawing():
        upright = Scale(-0.02, 1.04, tuple((x / 5, f"{x * 20} %") for x in range(6)))
        level = scale_of([x for x, _ in plans.curve])
        made = columns(1, width, heading_width(["power"], upright.width))

        def draw(axes: Axes) -> None:
            _curve(axes, plans, upright, level, unit)

        blocks = [
            Block(4.0, made.left, made.right, lambda _axes: None),
            Block(FIELD, made.left, made.right + 3.0, draw),
            Block(8.0, made.left, made.right, lambda _axes: None),
        ]
        subtitle = f"Power at one look, against the true difference, {unit}"
        told = [
            f"  {plain(round(x, 6)):>12} {unit}  {'#' * round(y * 50):<50} {y:.3f}" for x, y in plans.curve[::TENTH]
        ]
        return compose(width, title, subtitle, blocks, _caption(found, plans, unit, position), told)


def _curve(axes: Axes, plans: PlanTable, upright: Scale, level: Scale, unit: str) -> None:
    draw_upright(axes, upright, "power")
    draw_level(axes, level, unit)
    (line,) = axes.plot([x for x, _ in plans.curve], [y for _, y in plans.curve], color=INK, lw=1.6, zorder=4)
    line.set_gid("power-curve")
    asked, reached = plans.difference, plans.best.power
    axes.plot([asked, asked], [upright.low, reached], color=MUTED, lw=0.7, ls=(0, (3, 2)), zorder=3)
    axes.plot([level.low, asked], [reached, reached], color=MUTED, lw=0.7, ls=(0, (3, 2)), zorder=3)
    axes.plot([asked], [reached], ls="", marker="o", ms=4.6, mfc=INK, mec="white", mew=0.6, zorder=5)
    axes.plot([level.low, level.high], [plans.alpha, plans.alpha], color=INK, lw=0.6, ls=(0, (1, 1.5)), zorder=2)
    axes.annotate(
        f"{plain(asked)} {unit}: power {reached:.3f}",
        (asked, reached),
        xytext=(5, -3),
        size=SMALL,
        va="top",
        textcoords="offset points",
    )


def _caption(found: Sizes, plans: PlanTable, unit: str, position: int | None) -> str:
    best = plans.best
    batches = "" if best.batches is None else f"{count(best.batches, 'batch', 'batches')} a group, "
    runs = f"{count(best.runs, 'run')} {'a batch' if best.batches else 'a group'}"
    spreads = ", ".join(f"{level} {plain(round(v**0.5, 6))}" for level, v in found.components.items())
    parts = [
        "Curve: the chance that a pair with this true difference is shown to differ; dotted: the error rate.",
        f"Disc: the difference asked for ({plain(plans.difference)} {unit}); {percent(plans.power)} was wanted.",
        f"Plan: {batches}{runs}, {count(best.replicates, 'replicate')} a run.",
        f"n: {count(best.measurements, 'value')} in {count(plans.groups, 'group')}.",
        f"Procedure: {plans.procedure}, family error rate {percent(plans.alpha)}, at ONE look; more looks cost power.",
        f"Standard deviations taken as true, {unit}: {spreads} ({found.source}).",
        "" if position is None else f"Records up to ledger entry {position}; what is set aside is left out.",
        "It is a plan: it says nothing of results.",
    ]
    return " ".join(part for part in parts if part)
