"""A store copied while it is in use: to a file as a backup, or from one kind of database to the other.

A copy has the same rows, digests and ledger root as the store, or it is not made: it is checked whole before it counts.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Callable, Iterator, Sequence
from contextlib import closing, contextmanager
from itertools import islice
from pathlib import Path
from typing import Any

from sqlalchemy import Connection, insert, select

from sameline.errors import StoreError
from sameline.records import engine as engines
from sameline.records import tables as t
from sameline.records.acts import insert_rows
from sameline.records.check_rows import CHUNK, every_row
from sameline.records.checks import check_ledger
from sameline.records.findings import LedgerReport
from sameline.records.store import Store, said_plainly

Progress = Callable[[str, int, int], None]
"""Called with what is being done, and how far of how much: "copied" and "checked" rows."""


def backup(store: Store, path: str | Path, progress: Progress = lambda _what, _done, _all: None) -> LedgerReport:
    """Copy a store to a new file while others read and write it, and check the copy.

    Args:
        store: the open store; from a PostgreSQL server the copy is a SQLite file too.
        path: the file to make.
        progress: told now and then how far it is.

    Returns:
        What checking the copy found: nothing, with its number of entries and its root.

    Raises:
        StoreError: there is such a file already, it cannot be written, or the store is damaged.
    """
    path = Path(path)
    if path.exists():
        raise StoreError("there is a file here already", where=str(path), advice="name another; nothing was written")
    if store.engine.dialect.name != "sqlite":
        return copy_store(store, path, progress)
    part = path.with_name(path.name + ".part")
    with _removed_unless_finished(part):
        _online(store, part)
        report = _checked(part, progress)
        part.replace(path)
    return report


def copy_store(store: Store, place: str | Path, progress: Progress = lambda _what, _done, _all: None) -> LedgerReport:
    """Copy a store to a new place, of either kind of database; ledger and root stay what they are.

    Args:
        store: the open store.
        place: a path without a file, or the URL of an empty database.
        progress: told now and then how far it is.

    Returns:
        What checking the copy found: nothing, with its number of entries and its root.

    Raises:
        StoreError: there is a store at the place already, it cannot be written, or the store is damaged.
    """
    with store.reading() as reading:
        entries = reading.position
        made, new = Store.create(place)
        with made, said_plainly(str(made)), engines.for_writing(made.engine) as connection, connection.begin():
            engines.lock_for_writing(connection)
            if not new or connection.execute(select(t.entry.c.number).limit(1)).first():
                raise StoreError("there is a store here already", where=str(made))
            _copy_rows(reading.connection, connection, progress)
            report = check_ledger(connection, lambda done, total: progress("checked", done, total))
            _refuse_unless_sound(report, entries)
    return report


def _copy_rows(source: Connection, target: Connection, progress: Progress) -> None:
    done = 0
    for table in (t.entry, *t.recorded_tables()):
        columns = [*t.hashed_columns(table), "digest"]
        for rows in _in_chunks(every_row(source, table, "number" if table is t.entry else "id")):
            insert_rows(target, table, columns, [row[:-1] for row in rows], [row[-1] for row in rows])
            done += len(rows)
            progress("copied", done, done)
    nodes = [dict(row) for row in source.execute(select(t.tree_node)).mappings()]
    if nodes:
        target.execute(insert(t.tree_node), nodes)


def _in_chunks(rows: Iterator[Any]) -> Iterator[Sequence[tuple[Any, ...]]]:
    while chunk := [tuple(row) for row in islice(rows, CHUNK)]:
        yield chunk


def _online(store: Store, part: Path) -> None:
    """SQLite's own online backup: one state of the store, whatever is recorded meanwhile."""
    with said_plainly(str(part)), store.engine.connect() as connection:
        source = connection.connection.dbapi_connection
        try:
            with closing(sqlite3.connect(part)) as target:
                source.backup(target)  # type: ignore[union-attr]
        except sqlite3.Error as error:
            raise StoreError(f"the backup cannot be written: {error}", where=str(part)) from error


def _checked(part: Path, progress: Progress) -> LedgerReport:
    with Store.open(part) as made, made.reading() as reading:
        report = check_ledger(reading.connection, lambda done, total: progress("checked", done, total))
        _refuse_unless_sound(report, reading.position)
    return report


def _refuse_unless_sound(report: LedgerReport, entries: int) -> None:
    if report.findings or report.entries != entries:
        first = f": {report.findings[0]}" if report.findings else ""
        raise StoreError(
            f"the copy was not kept, because the store is damaged{first}",
            advice="`sameline verify` tells what is wrong",
        )


@contextmanager
def _removed_unless_finished(part: Path) -> Iterator[None]:
    try:
        yield
    finally:
        for name in (part.name, f"{part.name}-wal", f"{part.name}-shm"):
            part.with_name(name).unlink(missing_ok=True)
