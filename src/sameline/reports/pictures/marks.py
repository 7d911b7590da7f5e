"""Marks that all pictures share: a column's runs with their replicates, and a mean with its interval."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from sameline.reports.pictures.style import FILLED, INK, MARKERS, MUTED, STRONG

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from sameline.records.answers import PairAnswer
    from sameline.reports.pictures.content import DrawnRun

DASH = 0.9


def draw_runs(
    axes: Axes, at: float, runs: Sequence[DrawnRun], span: tuple[float, float], column_mm: float
) -> list[float]:
    """Runs side by side: a ring for a replicate, a dash for the run's mean, a cross for what is set aside.

    A triangle stands on an amended replicate; an arrowhead is a value that is only a bound.

    Returns:
        Where each run stands.
    """
    low, high = span
    places = [at + (low + high) / 2] if len(runs) == 1 else np.linspace(at + low, at + high, len(runs)).tolist()
    step = (high - low) / max(len(runs), 2)
    size = min(2.6, max(1.3, column_mm * step * 1.5))
    for x, run in zip(places, runs, strict=True):
        own = (
            ("o", [v.value for v in run.values if v.aside is None and v.bound is None]),
            ("v", [v.value for v in run.values if v.aside is None and v.bound == "<"]),
            ("^", [v.value for v in run.values if v.aside is None and v.bound == ">"]),
        )
        for marker, values in own:
            if values:
                axes.plot(
                    [x] * len(values), values, ls="", marker=marker, ms=size, mew=0.5, mec=MUTED, mfc="white", zorder=2
                )
        aside = [v.value for v in run.values if v.aside is not None]
        if aside:
            axes.plot([x] * len(aside), aside, ls="", marker="x", ms=size + 1.2, mew=0.9, color=INK, zorder=3)
        amended = [v.value for v in run.values if v.amended]
        if amended:
            axes.plot(
                [x] * len(amended), amended, ls="", marker="^", ms=size + 2.2, mew=0.8, mec=INK, mfc="none", zorder=3
            )
        if run.mean is not None:
            half = min(step * 0.42, DASH / column_mm)
            (dash,) = axes.plot([x - half, x + half], [run.mean, run.mean], color=INK, lw=1.3, zorder=3)
            dash.set_gid(f"run-{run.run}-mean")
    return list(places)


def draw_mean(axes: Axes, at: float, mean: float, lower: float | None, upper: float | None, stem: str) -> None:
    """A mean as a filled disc, its interval as a line with ends."""
    if lower is not None and upper is not None:
        (line,) = axes.plot([at, at], [lower, upper], color=INK, lw=1.1, zorder=4)
        line.set_gid(f"{stem}-interval")
        axes.plot([at, at], [lower, upper], ls="", marker="_", ms=6.0, mew=1.1, color=INK, zorder=4)
    (disc,) = axes.plot([at], [mean], ls="", marker="o", ms=4.2, mfc=INK, mec="white", mew=0.6, zorder=5)
    disc.set_gid(f"{stem}-mean")


def verdict_marks(axes: Axes, verdict: str, places: Sequence[tuple[float, float]], size: float) -> None:
    """The mark of a verdict at each place: filled where a difference is shown, open where none is."""
    filled = verdict in FILLED
    ink = STRONG if filled else INK
    axes.plot(
        [x for x, _ in places],
        [y for _, y in places],
        ls="",
        marker=MARKERS[verdict],
        ms=size,
        mew=0.9,
        mec=ink,
        mfc=ink if filled else "white",
        zorder=6,
    )


def stars(pair: PairAnswer) -> str:
    """Stars by the p-value: *** below 0.001, ** below 0.01, * otherwise (common practice, no source)."""
    p = 1.0 if pair.p_value is None else pair.p_value
    return "***" if p < 0.001 else "**" if p < 0.01 else "*"


STARS_WORDS = "* shown to differ, ** with {p} below 0.01, *** below 0.001"
VERDICT_WORDS = (
    "Filled diamond: differs and matters; filled slim diamond: differs; open square: equivalent; ring: undecided."
)
RUN_WORDS = "Ring: a replicate; dash: a run's mean"


def special_words(runs: Sequence[DrawnRun]) -> str:
    """For the caption: what the rarer marks mean, where they occur."""
    values = [v for run in runs for v in run.values]
    found = [
        ("cross: set aside", any(v.aside is not None for v in values)),
        ("triangle around: amended", any(v.amended for v in values)),
        ("small triangle: only a bound", any(v.bound for v in values)),
    ]
    return "".join(f"; {words}" for words, there in found if there)
