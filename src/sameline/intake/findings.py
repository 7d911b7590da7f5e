"""What was found in a file, said so that the person who made it can mend it."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

MOST = 10_000
"""So many different findings are listed of one file; reading it stops there, and the last finding says so."""


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing that is wrong or doubtful in a file.

    Attributes:
        file: the file's name without folders.
        sheet: the sheet's name; None in a text file.
        row: the row (headings are usually row 1), or None where it concerns the file.
        column: the heading of the column, or None where it concerns the row or the file.
        text: the cell as it stands, or None.
        problem: what is wrong.
        suggestion: the nearest right thing, or what to do; None where nothing helps.
        question: whether it can be answered ("yes, it is meant"), rather than being a refusal.
        more: further rows with the same finding in the same column.
    """

    file: str
    sheet: str | None
    row: int | None
    column: str | None
    text: str | None
    problem: str
    suggestion: str | None = None
    question: bool = False
    more: tuple[int, ...] = ()

    @property
    def place(self) -> str:
        """Where it is, in words."""
        parts = [self.file]
        if self.sheet is not None:
            parts.append(f"sheet {self.sheet!r}")
        if self.row is not None:
            parts.append(f"row {self.row}")
        if self.column is not None:
            parts.append(f"column {self.column!r}")
        return ", ".join(parts)

    def __str__(self) -> str:
        advice = f"; {self.suggestion}" if self.suggestion else ""
        more = f" (also {row_ranges(self.more)})" if self.more else ""
        return f"{self.place}: {self.problem}{advice}{more}"


def row_ranges(rows: Iterable[int], most: int = 5) -> str:
    """Rows in words: "row 7", "rows 3-5, 9"; after `most` ranges only how many more."""
    ranges: list[list[int]] = []
    for row in sorted(set(rows)):
        if ranges and row == ranges[-1][1] + 1:
            ranges[-1][1] = row
        else:
            ranges.append([row, row])
    words = [str(low) if low == high else f"{low}-{high}" for low, high in ranges[:most]]
    rest = sum(high - low + 1 for low, high in ranges[most:])
    count = sum(high - low + 1 for low, high in ranges)
    return f"row{'s' if count > 1 else ''} {', '.join(words)}" + (f" and {rest} more" if rest else "")


class EnoughFoundError(Exception):
    """So much was found in one file that reading on helps nobody."""


class FindingBook:
    """Collects the findings of one table; the same finding in several rows is one finding.

    Args:
        file: the file's name without folders.
        sheet: the sheet's name, or None.
        most: how many different findings are kept.
    """

    def __init__(self, file: str, sheet: str | None = None, most: int = MOST) -> None:
        self.file = file
        self.sheet = sheet
        self.headings: tuple[str, ...] = ()
        """The table's headings, once they are known: findings of one row are listed in their order."""
        self._most = most
        self._rows: dict[tuple[str | None, str | None, str, str | None, bool], list[int]] = {}

    def __bool__(self) -> bool:
        return bool(self._rows)

    def add(
        self,
        row: int | None,
        column: str | None,
        text: str | None,
        problem: str,
        suggestion: str | None = None,
        *,
        question: bool = False,
    ) -> None:
        """Note one finding.

        Raises:
            EnoughFoundError: there are as many different ones as are kept.
        """
        text = text if text is None or len(text) <= 200 else text[:200] + "…"
        key = (column, text, problem, suggestion, question)
        rows = self._rows.get(key)
        if rows is None:
            if len(self._rows) >= self._most:
                raise EnoughFoundError
            rows = self._rows[key] = []
        if row is not None:
            rows.append(row)

    def stop(self) -> None:
        """Say that the rest of the table was not checked."""
        self._rows[None, None, f"there are more than {self._most} findings; the rest was not checked", None, False] = []

    def closed(self) -> tuple[Finding, ...]:
        """All findings, by row; those that concern the whole table come first."""
        found = []
        for (column, text, problem, suggestion, question), rows in self._rows.items():
            ordered = sorted(set(rows))
            first = ordered[0] if ordered else None
            more = tuple(ordered[1:])
            found.append(Finding(self.file, self.sheet, first, column, text, problem, suggestion, question, more))
        return tuple(sorted(found, key=self._order))

    def _order(self, finding: Finding) -> tuple[int, int]:
        known = finding.column is not None and finding.column in self.headings
        return finding.row or 0, self.headings.index(finding.column or "") if known else -1
