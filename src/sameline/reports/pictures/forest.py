"""Rows with an interval each on a common level axis, their names at the left, their figures at the right."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from sameline.reports.pictures.drawing import MARGIN, Block, line_mm
from sameline.reports.pictures.fitting import safe, shortened, width_of
from sameline.reports.pictures.scale import Scale, draw_level
from sameline.reports.pictures.style import BAND, FILLED, INK, MARKERS, MM, MUTED, SMALL, STRONG

if TYPE_CHECKING:
    from matplotlib.axes import Axes

NARROW = 130.0
"""Below this width figures stand above the intervals, not at the right."""
GAP = 3.0


@dataclass(frozen=True, slots=True)
class ForestRow:
    """One row.

    Attributes:
        name: at the left.
        lower, middle, upper: of the interval; None where there is no such end or figure.
        figures: texts, one for each heading.
        verdict: decides the mark; None for a plain disc.
    """

    name: str
    lower: float | None
    middle: float | None
    upper: float | None
    figures: tuple[str, ...]
    verdict: str | None = None


@dataclass(frozen=True, slots=True)
class Lines:
    """Lines up through all rows: figure and its name; and a band from minus to plus the margin."""

    at: tuple[tuple[float, str], ...] = ()
    margin: float | None = None


def forest(
    rows: Sequence[ForestRow],
    headings: Sequence[str],
    scale: Scale,
    unit: str,
    width: float,
    lines: Lines | None = None,
) -> tuple[list[Block], list[tuple[str, str]]]:
    """The blocks, and the names that had to be shortened, as (shown, name).

    Args:
        rows: from the top down.
        headings: of their figures.
        scale: that holds every interval.
        unit: of the scale.
        width: of the picture in mm.
        lines: that go up through all rows.
    """
    if width < NARROW:
        return _narrow(rows, headings, scale, unit, width, lines or Lines())
    full = [safe(row.name) for row in rows]
    names = shortened(full, width * 0.3, SMALL)
    left = MARGIN + GAP + max(width_of(text, SMALL) for text in names)
    at = _places(rows, headings)
    each = line_mm(SMALL) + 1.5
    head = line_mm(SMALL) + 1.2

    def draw(axes: Axes) -> None:
        axes.set_ylim(len(rows) - 0.5, -0.5)
        draw_level(axes, scale, unit)
        _draw_lines(axes, scale, lines or Lines())
        for place, row in enumerate(rows):
            _band(axes, place)
            axes.annotate(
                names[place],
                (0, place),
                xycoords=axes.get_yaxis_transform(),
                xytext=(-6, 0),
                ha="right",
                va="center",
                size=SMALL,
                textcoords="offset points",
            )
            _right(axes, place, row.figures, at, INK)
            _interval(axes, place, place, row, scale)
        _right(axes, -0.5 - head / 2 / each, headings, at, MUTED)

    right = MARGIN + GAP + at[-1]
    return [_space(head), Block(each * len(rows), left, right, draw), _space(8.0)], _short(full, names)


def _narrow(
    rows: Sequence[ForestRow], headings: Sequence[str], scale: Scale, unit: str, width: float, lines: Lines
) -> tuple[list[Block], list[tuple[str, str]]]:
    """On a narrow picture names and figures stand above their interval, which has the whole width."""
    inner = width - 2 * MARGIN - 4.0
    full = [safe(row.name) for row in rows]
    under = [_under(row, headings) for row in rows]
    room = max(inner - GAP - max(width_of(text, SMALL) for text in under), 0.0)
    apart = any(width_of(name, SMALL) > room for name in full)
    names = shortened(full, inner, SMALL) if apart else full
    text_high = line_mm(SMALL) * (2 if apart else 1)
    each = text_high + 4.0

    def draw(axes: Axes) -> None:
        axes.set_ylim(len(rows) - 0.5, -0.5)
        draw_level(axes, scale, unit)
        _draw_lines(axes, scale, lines)
        for place, row in enumerate(rows):
            _band(axes, place)
            # nothing runs through the text
            axes.axhspan(
                place - 0.5,
                place - 0.5 + (text_high + 0.9) / each,
                color=BAND if place % 2 else "white",
                lw=0,
                zorder=6.5,
            )
            first = place - 0.5 + 0.5 / each
            second = first + (line_mm(SMALL) / each if apart else 0.0)
            _text(axes, 0.0, first, names[place], INK, "left")
            _text(axes, 0.0 if apart else 1.0, second, under[place], MUTED, "left" if apart else "right")
            _interval(axes, place + 0.5 - 1.6 / each, place, row, scale)

    head = _space(line_mm(SMALL) + 1.0)
    return [head, Block(each * len(rows), MARGIN + 2.0, MARGIN + 2.0, draw), _space(8.0)], _short(full, names)


def _short(full: Sequence[str], names: Sequence[str]) -> list[tuple[str, str]]:
    return list(dict.fromkeys((s, n) for s, n in zip(names, full, strict=True) if s != n))


def _band(axes: Axes, place: int) -> None:
    if place % 2:
        axes.axhspan(place - 0.5, place + 0.5, color=BAND, lw=0, zorder=0)


def _text(axes: Axes, x: float, y: float, text: str, ink: str, side: str) -> None:
    axes.text(x, y, text, transform=axes.get_yaxis_transform(), size=SMALL, color=ink, ha=side, va="top", zorder=7)


def _space(height: float) -> Block:
    return Block(height, MARGIN, MARGIN, lambda _axes: None)


def _under(row: ForestRow, headings: Sequence[str]) -> str:
    """The figures in one line; a heading that is a symbol stands before its figure."""
    return "; ".join(f"{h} {f}" if h in _NAMED else f for h, f in zip(headings, row.figures, strict=True) if f)


_NAMED = frozenset({"p", "overall p", "share"})


def _places(rows: Sequence[ForestRow], headings: Sequence[str]) -> list[float]:
    """Right ends of the columns of figures in mm, counted from the field's right end."""
    ends: list[float] = []
    for column, heading in enumerate(headings):
        widest = max(width_of(text, SMALL) for text in (heading, *(row.figures[column] for row in rows)))
        ends.append((ends[-1] if ends else 0.0) + GAP + widest)
    return ends


def _right(axes: Axes, place: float, texts: Sequence[str], at: Sequence[float], ink: str) -> None:
    for text, end in zip(texts, at, strict=True):
        axes.annotate(
            text,
            (1, place),
            xycoords=axes.get_yaxis_transform(),
            xytext=(end * MM, 0),
            color=ink,
            textcoords="offset points",
            ha="right",
            va="center",
            size=SMALL,
            annotation_clip=False,
        )


def _draw_lines(axes: Axes, scale: Scale, lines: Lines) -> None:
    if lines.margin is not None:
        axes.axvspan(
            max(-lines.margin, scale.low),
            min(lines.margin, scale.high),
            facecolor="none",
            edgecolor=MUTED,
            lw=0,
            hatch="/////",
            alpha=0.25,
            zorder=0.2,
        )
        for end in (-lines.margin, lines.margin):
            if scale.low <= end <= scale.high:
                (line,) = axes.plot(
                    [end, end],
                    [0, 1],
                    transform=axes.get_xaxis_transform(),
                    color=INK,
                    lw=0.7,
                    ls=(0, (3, 2)),
                    zorder=1,
                )
                line.set_gid(f"margin-{'lower' if end < 0 else 'upper'}")
    for figure, name in lines.at:
        if scale.low <= figure <= scale.high:
            axes.plot([figure, figure], [0, 1], transform=axes.get_xaxis_transform(), color=INK, lw=0.9, zorder=1)
            axes.annotate(
                name,
                (figure, 1),
                xycoords=axes.get_xaxis_transform(),
                xytext=(0, 2),
                ha="center",
                va="bottom",
                textcoords="offset points",
                size=SMALL,
                color=MUTED,
            )


def _interval(axes: Axes, y: float, place: int, row: ForestRow, scale: Scale) -> None:
    ink = STRONG if row.verdict in FILLED else INK
    if row.lower is not None or row.upper is not None:
        ends = (scale.low if row.lower is None else row.lower, scale.high if row.upper is None else row.upper)
        (line,) = axes.plot(ends, [y, y], color=ink, lw=1.2, zorder=4)
        line.set_gid(f"row-{place + 1}-interval")
        for end, given, arrow in ((ends[0], row.lower, "<"), (ends[1], row.upper, ">")):
            axes.plot(
                [end],
                [y],
                ls="",
                marker="|" if given is not None else arrow,
                ms=5.0,
                mew=1.1,
                color=ink,
                zorder=4,
                clip_on=False,
            )
    if row.middle is not None:
        filled = row.verdict is None or row.verdict in FILLED
        marker = "o" if row.verdict is None else MARKERS[row.verdict]
        (mark,) = axes.plot(
            [row.middle], [y], ls="", marker=marker, ms=4.6, mew=0.9, mec=ink, mfc=ink if filled else "white", zorder=6
        )
        mark.set_gid(f"row-{place + 1}-middle")
