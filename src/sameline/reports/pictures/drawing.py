"""A picture: blocks one below another on a sheet of so many mm, its caption at the foot, written as SVG or PNG."""

from __future__ import annotations

import io
import warnings
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import TYPE_CHECKING

from sameline.errors import CallError
from sameline.reports.pictures.fitting import safe, width_of, wrapped
from sameline.reports.pictures.style import (
    HAIR,
    INK,
    LINE_HEIGHT,
    MM,
    MUTED,
    NARROWEST,
    SMALL,
    TEXT,
    TITLE,
    WIDEST,
    settings,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

MARGIN = 2.0
DPI = 300


@dataclass(frozen=True, slots=True)
class Block:
    """A part of a picture: so many mm high, with free space to both sides, drawn into axes of its own.

    Attributes:
        height, left, right: in mm; left and right are free space at the sides, where labels may stand.
        draw: draws into the axes, which have neither frame nor ticks at first.
    """

    height: float
    left: float
    right: float
    draw: Callable[[Axes], None]


@dataclass(frozen=True)
class Picture:
    """A drawn picture.

    Attributes:
        title: what it shows, one line.
        caption: what a reader must know of it; it stands in the picture, and is its description in SVG.
        text: the same as lines for a terminal.
        figure: matplotlib's.
    """

    title: str
    caption: str
    text: tuple[str, ...]
    figure: Figure

    def svg(self) -> bytes:
        """SVG 1.1, UTF-8: text kept as text, its typeface inside, title and description for those who listen."""
        from sameline.reports.pictures.svg import finished

        raw = self._written("svg", {"Date": None, "Creator": "Sameline", "Title": self.title})
        return finished(raw, self.title, self.caption)

    def png(self, dpi: int = DPI) -> bytes:
        """PNG with so many dots an inch."""
        return self._written(
            "png", {"Software": None, "Title": self.title.encode("latin-1", "replace").decode("latin-1")}, dpi
        )

    def _written(self, form: str, metadata: dict[str, str | None], dpi: int = DPI) -> bytes:
        out = io.BytesIO()
        with drawing():
            self.figure.savefig(out, format=form, dpi=dpi, metadata=metadata)
        return out.getvalue()


@contextmanager
def drawing() -> Iterator[None]:
    """The settings of pictures, in force inside the block only.

    A letter that DejaVu does not hold is drawn as a box in PNG; in SVG the reader's own typefaces show it. That is no
    warning to the person who draws.
    """
    import matplotlib as mpl

    with warnings.catch_warnings(), mpl.rc_context(settings()):
        warnings.filterwarnings("ignore", message=r"Glyph .* missing from font", category=UserWarning)
        warnings.filterwarnings(
            "ignore", message=r"Matplotlib currently does not support .* natively", category=UserWarning
        )
        yield


def check_width(width: float) -> None:
    """Refuse a width that no page has.

    Raises:
        CallError: it is not between `NARROWEST` and `WIDEST` mm.
    """
    if not NARROWEST <= width <= WIDEST:
        raise CallError(
            f"a picture cannot be {width:g} mm wide", advice=f"{NARROWEST:g} to {WIDEST:g}; 85 and 170 fit a page"
        )


def compose(
    width: float, title: str, subtitle: str, blocks: Sequence[Block], caption: str, text: Sequence[str]
) -> Picture:
    """Puts blocks one below another under a heading, and the caption at the foot. Call it inside `drawing()`.

    Args:
        width: in mm.
        title: of the heading.
        subtitle: below it.
        blocks: from the top down.
        caption: stands below, and in the picture's description.
        text: the picture for a terminal, without heading and caption.
    """
    from matplotlib.figure import Figure

    inner = width - 2 * MARGIN
    text_width = inner * 0.99  # what other programs set is a little wider
    heading = _heading(safe(title), safe(subtitle), inner)
    foot = _caption(wrapped(safe(caption), text_width, SMALL))
    stack = [heading, *blocks, foot]
    height = sum(block.height for block in stack) + 2 * MARGIN
    figure = Figure(figsize=(width * MM / 72.0, height * MM / 72.0))
    top = height - MARGIN
    for block in stack:
        top -= block.height
        box = (block.left / width, top / height, (width - block.left - block.right) / width, block.height / height)
        block.draw(bare(figure.add_axes(box)))
    told = (title, subtitle, "", *text, "", *_told(caption))
    return Picture(safe(f"{title}: {subtitle}"), safe(caption), told, figure)


def bare(axes: Axes) -> Axes:
    """Axes without frame, ticks and ground, in mm-like units from 0 to 1."""
    axes.set(xlim=(0.0, 1.0), ylim=(0.0, 1.0), xticks=[], yticks=[])
    axes.spines[:].set_visible(False)
    axes.patch.set_visible(False)
    return axes


def line_mm(size: float) -> float:
    """Height of a line of text in mm."""
    return size * LINE_HEIGHT / MM


def _heading(title: str, subtitle: str, inner: float) -> Block:
    titles = _wrapped_bold(title, inner)
    below = wrapped(subtitle, inner, TEXT)
    high = 2.2 + len(titles) * line_mm(TITLE) + len(below) * line_mm(TEXT) + 1.6

    def draw(axes: Axes) -> None:
        axes.set(xlim=(0, inner), ylim=(high, 0))
        axes.plot([0, inner], [0.4, 0.4], color=HAIR, lw=0.6, clip_on=False)
        axes.plot([0, 9], [0.4, 0.4], color=INK, lw=2.2, clip_on=False)
        at = 2.2
        for line in titles:
            axes.text(0, at, line, size=TITLE, weight="bold", va="top")
            at += line_mm(TITLE)
        for line in below:
            axes.text(0, at, line, size=TEXT, color=MUTED, va="top")
            at += line_mm(TEXT)

    return Block(high, MARGIN, MARGIN, draw)


def _wrapped_bold(text: str, inner: float) -> list[str]:
    return wrapped(text, inner * width_of(text, TITLE) / max(width_of(text, TITLE, bold=True), 1e-9), TITLE)


def _caption(lines: Sequence[str]) -> Block:
    high = 2.4 + len(lines) * line_mm(SMALL)

    def draw(axes: Axes) -> None:
        axes.set(ylim=(high, 0))
        axes.plot([0, 1], [1.0, 1.0], color=HAIR, lw=0.6, clip_on=False)
        for place, line in enumerate(lines):
            axes.text(0, 2.0 + place * line_mm(SMALL), line, size=SMALL, color=INK, va="top")

    return Block(high, MARGIN, MARGIN, draw)


def _told(caption: str) -> list[str]:
    import textwrap

    return textwrap.wrap(safe(caption), 100)
