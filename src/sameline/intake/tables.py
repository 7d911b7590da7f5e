"""What every kind of file comes down to: a named table of text cells with row numbers."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from itertools import islice
from typing import Protocol

from sameline.intake.figures import DecimalSign

HEAD = 50
"""The headings are looked for among so many rows."""

Row = tuple[int, list[str]]


class UnreadableError(Exception):
    """A table cannot be read on; carries what a finding needs."""

    def __init__(self, problem: str, suggestion: str | None = None, row: int | None = None) -> None:
        super().__init__(problem)
        self.problem = problem
        self.suggestion = suggestion
        self.row = row


class Table(Protocol):
    """One sheet, or one text file read with one delimiter.

    Attributes:
        file: the file's name without folders.
        sheet: the sheet's name; None for a text file.
        hidden: whether the workbook hides it.
        point_is_usual: whether a decimal point is expected where nothing is stated.
    """

    file: str
    sheet: str | None
    hidden: bool
    point_is_usual: bool

    def rows(self, decimal: DecimalSign = ".") -> Iterator[Row]:
        """All rows with their numbers, from 1; blank rows may be left out.

        Args:
            decimal: the decimal sign to write the numbers of a workbook with, which have none of their own.

        Raises:
            Exception: the rest cannot be read; `explained` says why.
        """
        ...

    def explained(self, error: Exception) -> UnreadableError | None:
        """What an error met while reading rows says of the file; None when it is no matter of the file."""
        ...

    def merged(self) -> Mapping[tuple[int, int], tuple[int, int]]:
        """For cells (row from 1, place from 0) covered by a merged cell, the cell that holds the text."""
        ...


def head(table: Table) -> list[Row]:
    """The first rows that are not blank.

    Raises:
        UnreadableError: they cannot be read.
    """
    with explaining(table):
        return [(number, row) for number, row in islice(table.rows(), HEAD) if any(cell.strip() for cell in row)]


@contextmanager
def explaining(table: Table) -> Iterator[None]:
    """Where rows are read: an error that is the file's is explained.

    Raises:
        UnreadableError: the rest cannot be read.
    """
    try:
        yield
    except Exception as error:
        explained = table.explained(error)
        if explained is None:
            raise
        raise explained from error
