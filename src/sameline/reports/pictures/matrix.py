"""The matrix of pairs: for more groups than brackets can serve."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

from sameline.reports.pictures.columns import Columns
from sameline.reports.pictures.drawing import Block
from sameline.reports.pictures.marks import stars, verdict_marks
from sameline.reports.pictures.style import FILLED, HAIR, MM, SMALL

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from sameline.records.answers import PairAnswer

ROW = 3.0
WORDS = (
    "Matrix, row against column: filled diamond, differs and matters; filled slim diamond, differs; open square, "
    "equivalent; ring, undecided; empty, not compared."
)


def matrix(
    made: Columns, labels: Sequence[str], pairs: Mapping[frozenset[str], PairAnswer], short: Sequence[str]
) -> Block:
    """One mark a pair, below the diagonal; rows are named at the left, columns by the names above them.

    Args:
        made: the columns.
        labels: groups in order of mean.
        pairs: by their two labels.
        short: the labels as shown.
    """
    many = len(labels)
    high = ROW * many + 1.5
    size = min(4.0, min(made.each, ROW) * MM * 0.62)

    by_verdict: dict[str, list[tuple[float, float]]] = {}
    for at, label in enumerate(labels):
        for before in range(at):
            pair = pairs.get(frozenset((label, labels[before])))
            if pair is not None:
                by_verdict.setdefault(pair.verdict, []).append((before, at))

    def draw(axes: Axes) -> None:
        axes.set_ylim(many - 0.4, -0.6)
        for at, name in enumerate(short):
            axes.annotate(
                name,
                (0, at),
                xycoords=axes.get_yaxis_transform(),
                xytext=(-4, 0),
                textcoords="offset points",
                ha="right",
                va="center",
                size=SMALL,
            )
            axes.plot([-0.5, at - 0.5], [at + 0.5, at + 0.5], color=HAIR, lw=0.35, zorder=0.5)
            axes.plot([at - 0.3, at + 0.3], [at, at], color=HAIR, lw=0.8)
        for verdict, places in by_verdict.items():
            verdict_marks(axes, verdict, places, size)

    return made.block(high, draw)


def matrix_lines(labels: Sequence[str], pairs: Mapping[frozenset[str], PairAnswer]) -> list[str]:
    """The same for a terminal: stars where a difference is shown, = where equivalent, ? where undecided."""
    wide = max(len(label) for label in labels)
    lines = []
    for at, label in enumerate(labels):
        cells = [_cell(pairs.get(frozenset((label, other)))) for other in labels[:at]]
        lines.append(f"{at + 1:>3} {label:<{wide}}  {' '.join(cells)}".rstrip())
    return lines


def _cell(pair: PairAnswer | None) -> str:
    if pair is None:
        return "   "
    if pair.verdict in FILLED:
        return f"{stars(pair):<3}"
    return " = " if pair.verdict == "equivalent" else " ? "
