"""Figures and tables as plain text: aligned columns that read the same in a terminal, a pipe and a mail."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from decimal import Decimal

LEFT, RIGHT = "<", ">"


def table(headings: Sequence[str], rows: Iterable[Sequence[str]], align: str, indent: str = "  ") -> list[str]:
    """Rows of text in aligned columns under their headings.

    Args:
        headings: one a column; where all are empty, no line of headings is written.
        rows: one text a column.
        align: one of "<" and ">" a column.
        indent: what stands before each line.
    """
    from rich.cells import cell_len

    lines = [list(headings), *(list(row) for row in rows)] if any(headings) else [list(row) for row in rows]
    widths = [max((cell_len(line[at]) for line in lines), default=0) for at in range(len(headings))]

    def laid(text: str, width: int, side: str) -> str:
        gap = " " * (width - cell_len(text))
        return gap + text if side == RIGHT else text + gap

    return [
        (indent + "  ".join(laid(text, w, side) for text, w, side in zip(line, widths, align, strict=True))).rstrip()
        for line in lines
    ]


def number(figure: float | None, decimals: int) -> str:
    """A figure with so many decimals, a true minus sign, never a minus zero; a dash where there is none."""
    if figure is None:
        return "–"
    text = f"{figure:.{decimals}f}"
    if float(text) == 0:
        text = text.lstrip("-")
    return text.replace("-", "\N{MINUS SIGN}")


def plain(figure: float | None) -> str:
    """A stated figure such as a limit or margin, with as many digits as it was stated with."""
    if figure is None:
        return "–"
    return format(Decimal(f"{figure:.12g}"), "f").replace("-", "\N{MINUS SIGN}")


def interval(lower: float | None, upper: float | None, decimals: int) -> str:
    """An interval; an open end is said so."""
    if lower is None and upper is None:
        return "–"
    if lower is None:
        return f"up to {number(upper, decimals)}"
    if upper is None:
        return f"from {number(lower, decimals)}"
    return f"{number(lower, decimals)} to {number(upper, decimals)}"


def p_value(p: float | None) -> str:
    """A p-value with two significant digits; below 0.0001 only that it is."""
    if p is None:
        return "–"
    if p < 0.0001:
        return "<0.0001"
    if p > 0.9999:
        return ">0.9999"
    digits = max(2, 1 - math.floor(math.log10(p))) if p < 0.1 else 2
    return f"{p:.{digits}f}"


def percent(share: float) -> str:
    """A share as a percentage: 0.05 is "5 %"."""
    return f"{100 * share:.6g} %"


def moment(utc: str) -> str:
    """A moment to the minute, as text: "2026-03-04 08:30 UTC"."""
    return f"{utc[:10]} {utc[11:16]} UTC"


def day(utc: str) -> str:
    """The day of a moment (UTC)."""
    return utc[:10]


def count(many: int, word: str, plural: str | None = None) -> str:
    """A count with its word: "1 run", "3 batches"."""
    return f"{many} {word if many == 1 else plural or word + 's'}"


def listed(words: Sequence[str], most: int = 6) -> str:
    """A few words as a list in a sentence: "a, b and c"."""
    shown = list(words[:most])
    if len(words) > most:
        shown.append(f"{len(words) - most} more")
    return shown[0] if len(shown) == 1 else ", ".join(shown[:-1]) + " and " + shown[-1]
