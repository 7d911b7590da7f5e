"""The unit of work: the rows of one act, recorded together under one ledger entry, or not at all.

An act collects its rows, gives them their ids, and at its end writes the entry and the rows in one transaction.
The entry's `rows` text lists for each table the first id, the count and the Merkle root of the rows' canonical
forms, so the entry's own hash commits to every field of every row.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field
from typing import Any

from sqlalchemy import Connection, Table, func, insert, select

from sameline.errors import CallError, StoreError
from sameline.ledger.manifest import TableRows, manifest_text
from sameline.ledger.merkle import Frontier, leaf_hash, leaf_hashes, root
from sameline.ledger.rows import RowEncoder, row_bytes
from sameline.records.tables import entry, hashed_columns, tree_node
from sameline.version import __version__

Row = tuple[Any, ...]


@dataclass(slots=True)
class _Pending:
    """The rows of one table that an act will write: values in the order of `columns`, without the digest."""

    columns: tuple[str, ...]
    first: int
    rows: list[Row] = field(default_factory=list)


class Act:
    """One act in the making. `Store.act` makes it, under the writer's lock, and records it.

    Attributes:
        number: the ledger entry's number.
        connection: the open transaction; reads see the records before the act.
        at: the moment of the act.
    """

    def __init__(self, connection: Connection, what: str, *, person: int, at: str, reason: str | None) -> None:
        self.connection = connection
        self.at = at
        self.person = person
        self.what = what
        self.reason = reason
        head = connection.execute(select(func.max(entry.c.number))).scalar() or 0
        self.number: int = head + 1
        self.abandoned = False
        self._pending: dict[str, _Pending] = {}

    def abandon(self) -> None:
        """There is nothing to record after all: the act leaves no entry."""
        self.abandoned = True

    def add(self, table: Table, **fields: str | float | bytes | None) -> int:
        """Add one row; fields left out have no value.

        Returns:
            The row's id.
        """
        pending = self._of(table)
        number = pending.first + len(pending.rows)
        given = {"id": number, "entry": self.number, **fields}
        unknown = given.keys() - set(pending.columns)
        _refuse_nul(given.values())
        if unknown:
            raise KeyError(f"{table.name} has no column {', '.join(sorted(unknown))}")
        pending.rows.append(tuple(given.get(column) for column in pending.columns))
        return number

    def add_many(self, table: Table, columns: tuple[str, ...], rows: Iterable[Row]) -> range:
        """Add many rows whose values stand in the order of `columns`, which are all but id, entry and digest.

        Returns:
            The rows' ids.
        """
        pending = self._of(table)
        if ("id", "entry", *columns) != pending.columns:
            raise KeyError(f"{table.name} has the columns {pending.columns}")
        first = pending.first + len(pending.rows)
        number = self.number
        pending.rows.extend((row_id, number, *row) for row_id, row in enumerate(rows, first))
        for row in pending.rows[first - pending.first :]:
            _refuse_nul(row)
        return range(first, pending.first + len(pending.rows))

    def pending(self, table: Table) -> list[dict[str, Any]]:
        """The rows that this act will write to a table, as mappings."""
        pending = self._pending.get(table.name)
        return [dict(zip(pending.columns, row, strict=True)) for row in pending.rows] if pending else []

    def record(self) -> None:
        """Write the entry, its rows, and the nodes that they complete in the ledger's tree."""
        digests = {name: _digests(name, pending) for name, pending in self._pending.items()}
        manifest = [
            TableRows(name, pending.first, len(pending.rows), root(digests[name]))
            for name, pending in self._pending.items()
            if pending.rows
        ]
        fields: dict[str, Any] = {
            "number": self.number,
            "at": self.at,
            "person": self.person,
            "act": self.what,
            "reason": self.reason,
            "rows": manifest_text(manifest),
            "prior": entry_digest(self.connection, self.number - 1),
            "software": f"sameline {__version__}",
        }
        digest = leaf_hash(row_bytes("entry", fields))
        self.connection.execute(insert(entry), [{**fields, "digest": digest}])
        for part in manifest:
            table, pending = entry.metadata.tables[part.table], self._pending[part.table]
            insert_rows(self.connection, table, [*pending.columns, "digest"], pending.rows, digests[part.table])
        self._extend_tree(digest)

    def _of(self, table: Table) -> _Pending:
        if table.name not in self._pending:
            last = self.connection.execute(select(func.max(table.c.id))).scalar() or 0
            self._pending[table.name] = _Pending(hashed_columns(table), last + 1)
        return self._pending[table.name]

    def _extend_tree(self, digest: bytes) -> None:
        frontier = read_frontier(self.connection, self.number - 1)
        done = [
            {"level": level, "position": position, "hash": node}
            for level, position, node in frontier.add(digest)
            if level > 0  # level 0 is the entry's own digest
        ]
        if done:
            self.connection.execute(insert(tree_node), done)


def entry_digest(connection: Connection, number: int) -> bytes | None:
    """The digest of an entry, None before the first."""
    return connection.execute(select(entry.c.digest).where(entry.c.number == number)).scalar()


def read_node(connection: Connection, level: int, position: int) -> bytes:
    """The hash of a perfect subtree of the ledger's tree."""
    if level == 0:
        found = entry_digest(connection, position + 1)
    else:
        found = connection.execute(
            select(tree_node.c.hash).where(tree_node.c.level == level, tree_node.c.position == position)
        ).scalar()
    if found is None:
        raise StoreError(
            f"the ledger is damaged: its tree lacks the node at level {level}, position {position}",
            advice="`sameline verify` tells what else is; restore it from a backup",
        )
    return found


def read_frontier(connection: Connection, size: int) -> Frontier:
    """The right edge of the ledger's tree over its first `size` entries: as many reads as `size` has bits."""
    edge, start = [], 0
    for level in reversed(range(size.bit_length())):
        if size >> level & 1:
            edge.append(read_node(connection, level, start >> level))
            start += 1 << level
    return Frontier(size, edge)


def insert_rows(
    connection: Connection, table: Table, columns: list[str], rows: list[Row], digests: list[bytes]
) -> None:
    """Insert many rows; on SQLite as plain tuples, which is several times faster than mappings."""
    complete = [(*row, digest) for row, digest in zip(rows, digests, strict=True)]
    if connection.dialect.name == "sqlite":
        marks = ", ".join("?" * len(columns))
        names = ", ".join(f'"{column}"' for column in columns)
        # the names are the schema's own
        connection.exec_driver_sql(f'INSERT INTO "{table.name}" ({names}) VALUES ({marks})', complete)  # noqa: S608
        return
    connection.execute(insert(table), [dict(zip(columns, row, strict=True)) for row in complete])


def _refuse_nul(values: Iterable[object]) -> None:
    """PostgreSQL keeps no text with a NUL in it; SQLite would, and the two must hold the same."""
    for value in values:
        if isinstance(value, str) and "\0" in value:
            raise CallError(f"{value!r} holds a NUL character", advice="leave it out; it stands for nothing in text")


def _digests(name: str, pending: _Pending) -> list[bytes]:
    return leaf_hashes(RowEncoder(name, pending.columns).many(pending.rows))
