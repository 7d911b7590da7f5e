"""The axis of values: its range, its marks with their figures, and specification limits in or beyond it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from sameline.reports.pictures.fitting import safe, width_of
from sameline.reports.pictures.style import HAIR, INK, MUTED, SMALL
from sameline.reports.text import number, plain

if TYPE_CHECKING:
    from matplotlib.axes import Axes

ROOM = 0.06
FARTHEST = 1.6
"""A limit is inside the axis if it makes it at most so many times as long as the values alone; else it is noted."""
_DASHES = (0, (5, 1.6, 1, 1.6))


@dataclass(frozen=True, slots=True)
class Scale:
    """The axis of values: from `low` to `high`, with marks and their figures as text."""

    low: float
    high: float
    marks: tuple[tuple[float, str], ...]

    @property
    def width(self) -> float:
        """Width in mm of the widest figure."""
        return max((width_of(text, SMALL) for _, text in self.marks), default=0.0)


def scale_of(values: Sequence[float], limits: Sequence[float | None] = (), most: int = 6) -> Scale:
    """An axis that holds all values, and the limits that are not far from them.

    Args:
        values: at least one.
        limits: specification limits, margins; None is left out.
        most: about so many marks.
    """
    low, high = min(values), max(values)
    span = (high - low) or max(abs(low) * 0.02, 1e-9)
    for limit in limits:
        if limit is not None and max(high, limit) - min(low, limit) <= FARTHEST * span:
            low, high = min(low, limit), max(high, limit)
    room = ROOM * ((high - low) or span * 4)
    low, high = low - room, high + room
    return Scale(low, high, _marks(low, high, most))


def _marks(low: float, high: float, most: int) -> tuple[tuple[float, str], ...]:
    raw = (high - low) / most
    unit = 10.0 ** np.floor(np.log10(raw))
    step = float(unit * next(m for m in (1.0, 2.0, 5.0, 10.0) if m * unit >= raw * (1 - 1e-9)))
    decimals = max(0, -int(np.floor(np.log10(step) + 1e-9)))
    places = np.arange(np.ceil(low / step - 1e-9), np.floor(high / step + 1e-9) + 0.5)
    if decimals > 6 or max(abs(low), abs(high)) >= 1e7:
        return tuple((float(p * step), plain(float(f"{p * step:.6g}"))) for p in places)
    return tuple((float(p * step), number(float(p * step), decimals)) for p in places)


def draw_upright(axes: Axes, scale: Scale, unit: str) -> None:
    """The axis at the left side: a line, marks with figures, and light lines across. The axes' x is 0 to 1 outside."""
    axes.set_ylim(scale.low, scale.high)
    across = axes.get_yaxis_transform()
    for at, text in scale.marks:
        axes.plot([0, 1], [at, at], transform=across, color=HAIR, lw=0.35, zorder=0.5)
        axes.annotate(
            text,
            (0, at),
            xycoords=across,
            xytext=(-4, 0),
            textcoords="offset points",
            ha="right",
            va="center",
            size=SMALL,
        )
        (mark,) = axes.plot([0, 0.008], [at, at], transform=across, color=INK, lw=0.7, clip_on=False)
        mark.set_gid(f"scale-{at!r}")
    axes.plot([0, 0], [0, 1], transform=axes.transAxes, color=INK, lw=0.9, clip_on=False)
    axes.annotate(
        safe(unit),
        (0, 1),
        xycoords="axes fraction",
        xytext=(-4, 4),
        textcoords="offset points",
        ha="right",
        va="bottom",
        size=SMALL,
        color=MUTED,
    )


def draw_level(axes: Axes, scale: Scale, unit: str) -> None:
    """The axis at the foot: marks with figures, and light lines up."""
    axes.set_xlim(scale.low, scale.high)
    up = axes.get_xaxis_transform()
    for at, text in scale.marks:
        axes.plot([at, at], [0, 1], transform=up, color=HAIR, lw=0.35, zorder=0.5)
        axes.annotate(
            text, (at, 0), xycoords=up, xytext=(0, -3), textcoords="offset points", ha="center", va="top", size=SMALL
        )
        (mark,) = axes.plot([at, at], [0, 0.004], transform=up, color=INK, lw=0.7, clip_on=False)
        mark.set_gid(f"scale-{at!r}")
    axes.plot([0, 1], [0, 0], transform=axes.transAxes, color=INK, lw=0.9, clip_on=False)
    axes.annotate(
        safe(unit),
        (1, 0),
        xycoords="axes fraction",
        xytext=(0, -12),
        textcoords="offset points",
        ha="right",
        va="top",
        size=SMALL,
        color=MUTED,
    )


def draw_limits(axes: Axes, scale: Scale, lower: float | None, upper: float | None, unit: str) -> None:
    """Specification limits across an upright axis, named; one that lies beyond the axis is noted at its edge."""
    for limit, word, arrow in ((lower, "lower limit", "↓"), (upper, "upper limit", "↑")):
        if limit is None:
            continue
        name = f"{word} {plain(limit)} {safe(unit)}"
        inside = scale.low <= limit <= scale.high
        at = limit if inside else (scale.high if arrow == "↑" else scale.low)
        if inside:
            (line,) = axes.plot(
                [0, 1], [limit, limit], transform=axes.get_yaxis_transform(), color=INK, lw=0.9, ls=_DASHES, zorder=1
            )
            line.set_gid(f"limit-{word.split()[0]}")
        # the name stands between the limit and the edge of the picture's field, away from the values
        below = arrow == "↓" if inside else arrow == "↑"
        axes.annotate(
            name if inside else f"{arrow} {name}",
            (1, at),
            xycoords=axes.get_yaxis_transform(),
            xytext=(-1, -2 if below else 2),
            textcoords="offset points",
            ha="right",
            va="top" if below else "bottom",
            size=SMALL,
            zorder=5,
        )
