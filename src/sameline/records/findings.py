"""What checking the records finds: each with its table, row, entry and person."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

Progress = Callable[[int, int], None]
"""Called with rows checked and rows in all."""


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing that is not as it was recorded.

    Attributes:
        check: number of the check that found it.
        table, row: where, if it is a row.
        entry: the ledger entry that wrote it, or should have, if known.
        person: code of the person of that entry, if known.
        problem: what is wrong, one sentence.
    """

    check: int
    table: str | None
    row: int | None
    entry: int | None
    person: str | None
    problem: str

    def __str__(self) -> str:
        place = f"{self.table} {self.row}: " if self.row is not None else f"{self.table}: " if self.table else ""
        origin = f" (entry {self.entry}{f', by {self.person}' if self.person else ''})" if self.entry else ""
        return f"[{self.check}] {place}{self.problem}{origin}"


@dataclass(frozen=True, slots=True)
class LedgerReport:
    """What checking the ledger against the rows found.

    Attributes:
        entries, rows: how many were checked.
        root: the ledger's Merkle root as the entries give it now, in hexadecimal.
        findings: all of them, in the order of the checks.
    """

    entries: int
    rows: int
    root: str
    findings: tuple[Finding, ...]


@dataclass(slots=True)
class Findings:
    """Findings as they are gathered.

    Attributes:
        all: so far.
        people: entry number -> code of the person who acted.
    """

    all: list[Finding] = field(default_factory=list)
    people: dict[int, str] = field(default_factory=dict)

    def add(
        self, check: int, problem: str, table: str | None = None, row: int | None = None, entry: int | None = None
    ) -> None:
        """Note one."""
        person = None if entry is None else self.people.get(entry)
        self.all.append(Finding(check, table, row, entry, person, problem))

    def missing(self, check: int, table: str, first: int, last: int, entry: int | None = None) -> None:
        """Note rows that are not there: one finding for all of a stretch."""
        problem = "it is missing" if first == last else f"it is missing, and so is each up to {last}"
        self.add(check, problem, table, first, first if table == "entry" else entry)
