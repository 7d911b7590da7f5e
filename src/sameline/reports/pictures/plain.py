"""Pictures for a terminal: one row a thing, its interval as a line on a common axis."""

from __future__ import annotations

from collections.abc import Sequence

from sameline.reports.text import interval, number, plain, table

Row = tuple[str, float | None, float | None, float | None, str]
"""Label, lower end, middle, upper end, what stands behind."""

WIDTH = 48


def axis_lines(
    rows: Sequence[Row], decimals: int, lines: Sequence[float | None] = (), unit: str = "", width: int = WIDTH
) -> list[str]:
    """Rows with their intervals on one axis; "|" stands at the given lines (limits, zero, margin) where they fit.

    Args:
        rows: label, lower, middle, upper, remark; figures may be None.
        decimals: of the figures.
        lines: figures at which a line stands, None where there is none.
        unit: of the figures.
        width: of the axis in characters.
    """
    known = [x for r in rows for x in r[1:4] if x is not None]
    if not known:
        return ["(nothing to draw)"]
    low, high = min(known), max(known)
    span = (high - low) or max(abs(low), 1.0) * 0.02
    marks = [x for x in lines if x is not None]
    for mark in marks:
        if max(high, mark) - min(low, mark) <= 1.6 * span:
            low, high = min(low, mark), max(high, mark)
    span = (high - low) or span
    low, span = low - 0.02 * span, 1.04 * span

    def at(x: float) -> int:
        return min(width - 1, max(0, round((x - low) / span * (width - 1))))

    inside = [at(m) for m in marks if low <= m <= low + span]
    cells = [
        (
            label,
            _line(at, lower, middle, upper, inside, width),
            number(middle, decimals),
            "" if lower is None and upper is None else interval(lower, upper, decimals),
            remark,
        )
        for label, lower, middle, upper, remark in rows
    ]
    found = table(("", _ends(low, low + span, decimals, width), unit, "", ""), cells, "<<><<")
    named = ", ".join(plain(m) for m in marks)
    return [*found, f"  | at {named} {unit}".rstrip()] if inside else found


def _line(at, lower: float | None, middle: float | None, upper: float | None, inside: Sequence[int], width: int) -> str:  # type: ignore[no-untyped-def]  # noqa: ANN001
    cells = [" "] * width
    for mark in inside:
        cells[mark] = "|"
    if lower is not None or upper is not None:
        first = 0 if lower is None else at(lower)
        last = width - 1 if upper is None else at(upper)
        cells[first : last + 1] = ["-"] * (last - first + 1)
    if middle is not None:
        cells[at(middle)] = "O"
    return "".join(cells)


def _ends(low: float, high: float, decimals: int, width: int) -> str:
    left, right = number(low, decimals), number(high, decimals)
    return left + " " * max(1, width - len(left) - len(right)) + right
