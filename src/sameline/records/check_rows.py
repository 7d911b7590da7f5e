"""Are the rows those that the entries wrote: all there, no other, each as it was?"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any

from sqlalchemy import Column, Connection, Float, Integer, LargeBinary, Table
from sqlalchemy.exc import DBAPIError

from sameline.ledger.errors import LedgerError
from sameline.ledger.merkle import leaf_hash, root
from sameline.ledger.rows import RowEncoder
from sameline.records import tables as t
from sameline.records.findings import Findings

CHUNK = 20_000
"""Rows read at a time, and between two reports of progress."""


@dataclass(frozen=True, slots=True)
class Span:
    """The rows that one entry says it wrote to one table: their first id, number and Merkle root."""

    entry: int
    first: int
    count: int
    root: bytes

    @property
    def end(self) -> int:
        """The id after the last."""
        return self.first + self.count


class TableCheck:
    """4, 5 and 6. The rows of one table against the entries that wrote them, in order of their ids.

    Args:
        connection: sees the store.
        findings: takes what is found.
        table: the table.
        counted: told of each row.
        start: the id of the first row to look at.
    """

    def __init__(
        self, connection: Connection, findings: Findings, table: Table, counted: Callable[[], None], start: int = 0
    ) -> None:
        self._findings = findings
        self._table = table
        self._digest = Digester(table)
        self._rows = every_row(connection, table, "id", start)
        self._row: Any = None
        self._counted = counted

    def run(self, spans: list[Span]) -> None:
        """Check all rows; `spans` are what the entries say they wrote here."""
        self._next()
        for span in sorted(spans, key=lambda s: s.first):
            self._check_span(span)
        while self._row is not None:
            self._surplus()

    def _next(self) -> None:
        self._row = next(self._rows, None)

    def _surplus(self) -> None:
        self._findings.add(4, "no entry wrote this row", self._table.name, self._row[0])
        self._next()

    def _check_span(self, span: Span) -> None:
        digests: list[bytes] = []
        named = False
        wanted = span.first
        while wanted < span.end:
            while self._row is not None and self._row[0] < wanted:
                self._surplus()
            there = span.end if self._row is None else min(self._row[0], span.end)
            if there > wanted:
                self._findings.missing(4, self._table.name, wanted, there - 1, span.entry)
                named, wanted = True, there
                continue
            own = self._check_row(span)
            named |= own is None
            digests.append(own or b"")
            self._next()
            wanted += 1
        if not named and root(digests) != span.root:
            self._replaced(span)

    def _check_row(self, span: Span) -> bytes | None:
        """The digest that the row's fields have; None where it has been named as changed."""
        *values, digest = self._row
        self._counted()
        if values[1] != span.entry:
            self._findings.add(4, f"it names entry {values[1]} as its own", self._table.name, values[0], span.entry)
        own = self._digest(values)
        if own == digest:
            return own
        problem = "its fields are not what its digest was made of"
        self._findings.add(5, problem, self._table.name, values[0], span.entry)
        return None

    def _replaced(self, span: Span) -> None:
        """Each row has the digest of its fields, but they are not the entry's: fields and digest were both replaced."""
        if span.count == 1:
            problem = "the row, with its digest, is not the one that was recorded"
        else:
            problem = (
                f"of the rows from here to {span.end - 1} at least one, with its digest, is not as it was recorded"
            )
        self._findings.add(6, problem, self._table.name, span.first, span.entry)


def check_references(connection: Connection, findings: Findings) -> None:
    """7. References, where the database does not vouch for them itself (SQLite checks only as it writes)."""
    if connection.dialect.name != "sqlite":
        return
    try:
        for table, row, parent, _ in connection.exec_driver_sql("PRAGMA foreign_key_check"):
            findings.add(7, f"it refers to a {parent} that is not there", table, row)
    except DBAPIError as error:
        findings.add(7, f"the references cannot be checked: {error.orig}")


def every_row(connection: Connection, table: Table, key: str, start: int = 0) -> Iterator[Any]:
    """The rows of a table from one key on, in its order, as plain tuples with the digest last; odd text is kept odd."""
    names = ", ".join(f'"{name}"' for name in (*t.hashed_columns(table), "digest"))
    beyond = f' WHERE "{key}" >= {int(start)}' if start else ""
    statement = f'SELECT {names} FROM "{table.name}"{beyond} ORDER BY "{key}"'  # noqa: S608 - the schema's own names
    streaming = connection.execution_options(stream_results=True, yield_per=CHUNK)
    for chunk in streaming.exec_driver_sql(statement).partitions():
        yield from chunk


class Digester:
    """The digest of a table's rows, as it must be.

    Args:
        table: the table.
    """

    def __init__(self, table: Table) -> None:
        self._columns = [table.c[name] for name in t.hashed_columns(table)]
        self._encode = RowEncoder(table.name, [column.name for column in self._columns])
        self._known: set[tuple[type, ...]] = set()

    def __call__(self, values: Sequence[Any]) -> bytes | None:
        """The digest of a row's fields; None where no row could have such fields."""
        kinds = tuple(map(type, values))
        if kinds not in self._known:
            if not all(kind in _kinds(column) for kind, column in zip(kinds, self._columns, strict=True)):
                return None
            self._known.add(kinds)
        try:
            return leaf_hash(self._encode(values))
        except LedgerError:
            return None


def _kinds(column: Column[Any]) -> tuple[type, ...]:
    """The types that a column's values may have: SQLite keeps any in any column, and some of them hash alike."""
    if isinstance(column.type, Integer):
        return (int, type(None))
    if isinstance(column.type, Float):
        return (float, int, type(None))
    return (bytes if isinstance(column.type, LargeBinary) else str, type(None))
