"""The ledger checked against the rows: every finding, each with its table, row, entry and person.

The checks, by number:

1. The schema is the one the migrations made, and every table's refusing triggers are there.
2. Entries run from 1 without gaps, each names the one before by its digest, and each has its own digest.
3. The stored nodes of the ledger's tree are those of its entries.
4. Every row that an entry says it wrote is there, and no other.
5. Every row has the digest of its fields.
6. The rows of each entry have the Merkle root that the entry states.
7. Every reference leads to a row.

Recomputing the conclusions is the eighth check (`sameline.conclusions.recompute`); that no comparison was left behind
unseen, the ninth.
"""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

from sqlalchemy import Connection, Table, inspect, select, text

from sameline.ledger.errors import LedgerError
from sameline.ledger.merkle import Frontier, leaf_hash, root
from sameline.ledger.rows import RowEncoder
from sameline.records import schema
from sameline.records import tables as t
from sameline.records.append_only import trigger_names

Progress = Callable[[int, int], None]
"""Called with rows checked and rows in all."""

_CHUNK = 20_000


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
class _Span:
    """The rows that one entry says it wrote to one table."""

    entry: int
    first: int
    count: int
    root: str


class _Checker:
    def __init__(self, connection: Connection, progress: Progress) -> None:
        self.connection = connection
        self.progress = progress
        self.findings: list[Finding] = []
        self.people: dict[int, str] = {}
        self.rows = 0
        self.expected = 0

    def find(self, check: int, problem: str, table: str | None = None, row: int | None = None, entry: int = 0) -> None:
        """Note one finding."""
        person = self.people.get(entry)
        self.findings.append(Finding(check, table, row, entry or None, person, problem))


def check_ledger(connection: Connection, progress: Progress = lambda _done, _all: None) -> LedgerReport:
    """Check the whole ledger against the rows.

    Args:
        connection: a connection that sees the store.
        progress: told now and then how far it is.
    """
    checker = _Checker(connection, progress)
    if connection.dialect.name == "sqlite":  # bytes that are no text must be found, not stumbled over
        connection.connection.dbapi_connection.text_factory = _any_text  # type: ignore[union-attr]
    _check_schema(checker)
    spans, count, top = _check_entries(checker)
    checker.expected = sum(span.count for of_table in spans.values() for span in of_table)
    for table in t.recorded_tables():
        _check_table(checker, table, spans.pop(table.name, []))
    for name, left in spans.items():
        for span in left:
            checker.find(4, f"the entry wrote to {name}, which is no table of a store", entry=span.entry)
    _check_references(checker)
    return LedgerReport(count, checker.rows, top.hex(), tuple(sorted(checker.findings, key=lambda f: f.check)))


def _check_schema(checker: _Checker) -> None:
    """1. Schema and triggers."""
    connection = checker.connection
    revision = schema.found_revision(connection)
    if revision != schema.REVISIONS[-1]:
        checker.find(1, f"the schema is {revision}, not {schema.REVISIONS[-1]}")
    dialect = connection.dialect.name
    source = (
        "SELECT name FROM sqlite_master WHERE type = 'trigger'"
        if dialect == "sqlite"
        else "SELECT tgname FROM pg_trigger WHERE NOT tgisinternal AND tgenabled <> 'D'"
    )
    present = set(connection.execute(text(source)).scalars())
    inspector = inspect(connection)
    for table in t.metadata.tables.values():
        missing = [name for name in trigger_names(dialect, table.name) if name not in present]
        if missing:
            checker.find(1, f"the triggers that refuse changes are gone: {', '.join(missing)}", table.name)
        stored = {column["name"] for column in inspector.get_columns(table.name)}
        if stored != {column.name for column in table.columns}:
            checker.find(1, "the columns are not those that the migrations made", table.name)


def _check_entries(checker: _Checker) -> tuple[dict[str, list[_Span]], int, bytes]:
    """2 and 3. The chain of entries and the stored tree; returns what each entry says it wrote, by table."""
    columns = t.hashed_columns(t.entry)
    encode = RowEncoder("entry", columns)
    codes = dict(checker.connection.execute(select(t.person.c.id, t.person.c.code)).tuples().all())
    nodes = _stored_nodes(checker.connection)
    frontier, prior, number = Frontier(), None, 0
    spans: dict[str, list[_Span]] = {}
    for *values, digest in _rows(checker.connection, t.entry, "number"):
        row = dict(zip(columns, values, strict=True))
        for missing in range(number + 1, row["number"]):
            checker.find(2, "the entry is missing", "entry", missing, missing)
        number = row["number"]
        checker.people[number] = codes.get(row["person"], "nobody registered")
        own = _digest(encode, values)
        if own != digest:
            checker.find(2, "its fields are not what its digest was made of", "entry", number, number)
        if row["prior"] != prior:
            checker.find(2, "it does not follow from the entry before it", "entry", number, number)
        prior = digest
        for level, position, node in frontier.add(digest)[1:]:
            if nodes.pop((level, position), None) != node:
                checker.find(
                    3, f"the tree's node at level {level}, position {position} is not the entries'", entry=number
                )
        _read_manifest(checker, row, spans)
    for level, position in sorted(nodes):
        checker.find(3, f"the tree has a node at level {level}, position {position} that no entry completes")
    return spans, number, frontier.root()


def _stored_nodes(connection: Connection) -> dict[tuple[int, int], bytes]:
    node = t.tree_node
    return {
        (level, position): bytes(hash_)
        for level, position, hash_ in connection.execute(select(node.c.level, node.c.position, node.c.hash))
    }


def _read_manifest(checker: _Checker, row: dict[str, Any], spans: dict[str, list[_Span]]) -> None:
    try:
        for part in json.loads(row["rows"]):
            span = _Span(row["number"], part["first"], part["count"], part["root"])
            spans.setdefault(part["table"], []).append(span)
    except (ValueError, KeyError, TypeError):
        checker.find(2, "its list of the rows it wrote cannot be read", "entry", row["number"], row["number"])


def _check_table(checker: _Checker, table: Table, spans: list[_Span]) -> None:
    """4, 5 and 6. The rows of one table against the entries that wrote them, in order of their ids."""
    columns = t.hashed_columns(table)
    encode = RowEncoder(table.name, columns)
    rows = iter(_rows(checker.connection, table, "id"))
    row = next(rows, None)
    for span in sorted(spans, key=lambda s: s.first):
        digests = []
        for number in range(span.first, span.first + span.count):
            while row is not None and row[0] < number:
                row = _surplus(checker, table, row, rows)
            if row is None or row[0] != number:
                checker.find(4, "the row is missing", table.name, number, span.entry)
                continue
            digests.append(_check_row(checker, encode, table, row, span))
            row = next(rows, None)
        if len(digests) == span.count and root(digests).hex() != span.root:
            _check_root(checker, table, span)
    while row is not None:
        row = _surplus(checker, table, row, rows)


def _check_row(checker: _Checker, encode: RowEncoder, table: Table, row: Any, span: _Span) -> bytes:  # noqa: ANN401
    *values, digest = row
    checker.rows += 1
    if checker.rows % _CHUNK == 0:
        checker.progress(checker.rows, checker.expected)
    own = _digest(encode, values)
    if own != digest:
        checker.find(5, "its fields are not what its digest was made of", table.name, values[0], span.entry)
    if values[1] != span.entry:
        checker.find(4, f"it names entry {values[1]} as its own", table.name, values[0], span.entry)
    return own or b""


def _check_root(checker: _Checker, table: Table, span: _Span) -> None:
    """A row whose own digest does not fit has been named already; else the row and its digest were both replaced."""
    last = span.first + span.count
    named = any(f.check == 5 and f.table == table.name and span.first <= (f.row or 0) < last for f in checker.findings)
    if not named:
        rows = str(span.first) if span.count == 1 else f"{span.first} to {last - 1}"
        problem = f"among the rows {rows} at least one, with its digest, is not the one that was recorded"
        checker.find(6, problem, table.name, span.first if span.count == 1 else None, span.entry)


def _surplus(checker: _Checker, table: Table, row: Any, rows: Iterator[Any]) -> Any:  # noqa: ANN401
    checker.find(4, "no entry wrote this row", table.name, row[0])
    return next(rows, None)


def _check_references(checker: _Checker) -> None:
    """7. References, where the database does not vouch for them itself (SQLite checks only as it writes)."""
    if checker.connection.dialect.name != "sqlite":
        return
    for table, row, parent, _ in checker.connection.exec_driver_sql("PRAGMA foreign_key_check"):
        checker.find(7, f"it refers to a {parent} that is not there", table, row)


def _rows(connection: Connection, table: Table, key: str) -> Iterator[Any]:
    """Every row of a table in order of its key, as plain tuples with the digest last; undecodable text is kept odd."""
    names = ", ".join(f'"{name}"' for name in (*t.hashed_columns(table), "digest"))
    statement = f'SELECT {names} FROM "{table.name}" ORDER BY "{key}"'  # noqa: S608 - the schema's own names
    streaming = connection.execution_options(stream_results=True, yield_per=_CHUNK)
    for chunk in streaming.exec_driver_sql(statement).partitions():
        yield from chunk


def _any_text(stored: bytes) -> str:
    return stored.decode(errors="surrogateescape")


def _digest(encode: RowEncoder, values: list[Any]) -> bytes | None:
    """The digest of a row's fields; None where no row could have such fields."""
    try:
        return leaf_hash(encode(values))
    except LedgerError:
        return None
