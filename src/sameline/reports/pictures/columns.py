"""Blocks that stand in one set of columns, one a group: bands, rows of text under them, lines along them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from sameline.errors import CallError
from sameline.reports.pictures.drawing import MARGIN, Block, line_mm
from sameline.reports.pictures.fitting import safe, shortened, width_of, wrapped
from sameline.reports.pictures.style import BAND, INK, MUTED, SMALL

if TYPE_CHECKING:
    from collections.abc import Callable

    from matplotlib.axes import Axes

NARROWEST_COLUMN = 2.5
LONGEST_NAME = 30.0
GAP = 0.9
MOST_LINES = 3


@dataclass(frozen=True, slots=True)
class Columns:
    """So many columns between a left and a right margin, on a picture so many mm wide."""

    many: int
    width: float
    left: float
    right: float = MARGIN

    @property
    def each(self) -> float:
        """Width of a column in mm."""
        return (self.width - self.left - self.right) / self.many

    def block(self, height: float, draw: Callable[[Axes], None], *, banded: bool = True) -> Block:
        """A block whose x counts the columns from 0; every second one lies on a band."""

        def drawn(axes: Axes) -> None:
            axes.set_xlim(-0.5, self.many - 0.5)
            if banded:
                for at in range(1, self.many, 2):
                    axes.axvspan(at - 0.5, at + 0.5, color=BAND, lw=0, zorder=0)
            draw(axes)

        return Block(height, self.left, self.right, drawn)


def columns(many: int, width: float, left: float) -> Columns:
    """Columns for so many groups.

    Raises:
        CallError: they would be too narrow to read.
    """
    made = Columns(many, width, left)
    if made.each < NARROWEST_COLUMN:
        needed = int(left + MARGIN + many * NARROWEST_COLUMN) + 1
        raise CallError(
            f"{many} columns are too many for {width:g} mm", advice=f"choose a width of {needed} mm, or fewer of them"
        )
    return made


def heading_width(words: Sequence[str], scale_width: float) -> float:
    """Left margin in mm that holds row headings and the figures of the scale."""
    return MARGIN + max([scale_width + 2.0, *(width_of(word, SMALL) + 1.6 for word in words)])


def row(made: Columns, heading: str, texts: Sequence[str], *, bold: bool = False, ids: str | None = None) -> Block:
    """One row of short texts, one a column; turned upright where the columns are narrow.

    Args:
        made: the columns.
        heading: what they are.
        texts: one a column.
        bold: whether they are set bold.
        ids: stem of their ids in SVG, if they have any.
    """
    widest = max((width_of(text, SMALL, bold=bold) for text in texts), default=0.0)
    upright = widest > made.each - GAP / 2
    high = widest + 1.4 if upright else line_mm(SMALL) + 0.3

    def draw(axes: Axes) -> None:
        axes.set_ylim(high, 0)
        _head(axes, heading, high / 2)
        for at, text in enumerate(texts):
            shown = axes.text(
                at,
                high / 2,
                text,
                size=SMALL,
                ha="center",
                va="center",
                weight="bold" if bold else "normal",
                rotation=90 if upright else 0,
            )
            if ids is not None:
                shown.set_gid(f"{ids}-{at + 1}")

    return made.block(high, draw)


def names(made: Columns, heading: str, labels: Sequence[str]) -> tuple[Block, list[tuple[str, str]]]:
    """The row of names, level, broken into lines, or upright; and what had to be shortened, as (shown, name)."""
    shown = [safe(label) for label in labels]
    room = made.each - GAP
    lines = [wrapped(name, room, SMALL) for name in shown]
    if max(len(own) for own in lines) <= MOST_LINES and _words_whole(shown, lines):
        return _level(made, heading, lines), []
    short = shortened(shown, LONGEST_NAME, SMALL)
    return row(made, heading, short), [(s, n) for s, n in zip(short, shown, strict=True) if s != n]


def _words_whole(shown: Sequence[str], lines: Sequence[Sequence[str]]) -> bool:
    return all(" ".join(own) == " ".join(name.split()) for name, own in zip(shown, lines, strict=True))


def _level(made: Columns, heading: str, lines: Sequence[Sequence[str]]) -> Block:
    high = max(len(own) for own in lines) * line_mm(SMALL) + 0.8

    def draw(axes: Axes) -> None:
        axes.set_ylim(high, 0)
        _head(axes, heading, 0.4 + line_mm(SMALL) / 2)
        for at, own in enumerate(lines):
            for place, line in enumerate(own):
                axes.text(at, 0.4 + (place + 0.5) * line_mm(SMALL), line, size=SMALL, ha="center", va="center")

    return made.block(high, draw)


def stretches(made: Columns, heading: str, spans: Sequence[tuple[int, int]]) -> Block:
    """Thick lines along columns from first to last; those that share no column lie on one level."""
    levels: list[list[tuple[int, int]]] = []
    for span in sorted(spans):
        level = next((on for on in levels if on[-1][1] < span[0]), None)
        if level is None:
            levels.append([span])
        else:
            level.append(span)
    high = 1.4 + 1.7 * len(levels)

    def draw(axes: Axes) -> None:
        axes.set_ylim(high, 0)
        _head(axes, heading, high / 2)
        for place, on in enumerate(levels):
            for first, last in on:
                y = 1.4 + 1.7 * place
                axes.plot([first - 0.36, last + 0.36], [y, y], color=INK, lw=2.3, solid_capstyle="round")

    return made.block(high, draw)


def _head(axes: Axes, heading: str, at: float) -> None:
    axes.annotate(
        heading,
        (0, at),
        xycoords=axes.get_yaxis_transform(),
        xytext=(-4, 0),
        textcoords="offset points",
        ha="right",
        va="center",
        size=SMALL,
        color=MUTED,
    )


def shortened_words(short: Sequence[tuple[str, str]]) -> str:
    """For the caption: what shortened names stand for."""
    return "Names shortened: " + "; ".join(f"{s} is {n}" for s, n in short) + "." if short else ""
