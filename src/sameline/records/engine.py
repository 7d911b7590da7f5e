"""Engines: how a store is opened, on SQLite and on PostgreSQL.

SQLite runs with write-ahead logging, foreign keys on and full synchronisation; Sameline begins its transactions
itself, so that a writer takes the write lock at once (BEGIN IMMEDIATE) and waits for it instead of failing later.
On PostgreSQL writers are serialised by one advisory lock, held until their transaction ends; they read what was
committed before they got it, while a reader sees one state of the records throughout (REPEATABLE READ).
"""

from __future__ import annotations

import sqlite3
import time
from pathlib import Path
from typing import Any

from sqlalchemy import Connection, Engine, create_engine, event, make_url, text
from sqlalchemy.engine import URL
from sqlalchemy.engine.interfaces import IsolationLevel
from sqlalchemy.exc import ArgumentError, NoSuchModuleError

from sameline.errors import StoreError

BUSY_SECONDS = 60
"""How long a writer waits for another before it gives up."""

_ADVISORY_LOCK = 0x53414D45  # one number for all Sameline writers of a PostgreSQL database


def store_url(store: str | Path) -> URL:
    """The database URL of a store named by a path or by a SQLAlchemy URL.

    Raises:
        StoreError: not a URL, or of a kind of database that Sameline does not use.
    """
    named = str(store)
    if "://" not in named:
        return URL.create("sqlite", database=named)
    try:
        url = make_url(named)
        if url.drivername in {"postgresql", "postgres"}:
            url = url.set(drivername="postgresql+psycopg")
    except ArgumentError as error:
        raise StoreError(
            "the store's URL cannot be read", advice="for example postgresql+psycopg://host/lab"
        ) from error
    if url.get_backend_name() not in {"sqlite", "postgresql"}:
        raise StoreError(
            f"stores are kept in SQLite or PostgreSQL, not in {url.get_backend_name()}",
            advice="give a file, or a URL such as postgresql+psycopg://host/lab",
        )
    return url


def make_engine(url: URL, *, must_exist: bool) -> Engine:
    """An engine for a store; nothing is connected yet.

    Args:
        url: where the store is.
        must_exist: whether a missing SQLite file is refused (else it is made).

    Raises:
        StoreError: the file is not there, or the database's driver is not installed.
    """
    if url.get_backend_name() != "sqlite":
        try:
            return create_engine(url)
        except (ModuleNotFoundError, NoSuchModuleError) as error:
            raise StoreError(
                f"no driver for {url.drivername} is installed", advice="pip install 'sameline[postgresql]'"
            ) from error
    _check_file(Path(url.database or ""), must_exist=must_exist)
    engine = create_engine(url, connect_args={"timeout": BUSY_SECONDS})
    event.listen(engine, "connect", _set_up_sqlite)
    event.listen(engine, "begin", _begin_sqlite)
    return engine


def lock_for_writing(connection: Connection) -> None:
    """Wait until no other writer is at work; the lock ends with the transaction."""
    if connection.dialect.name == "postgresql":
        connection.execute(text(f"SET LOCAL lock_timeout = '{BUSY_SECONDS}s'"))
        connection.execute(text("SELECT pg_advisory_xact_lock(:key)"), {"key": _ADVISORY_LOCK})


def for_writing(engine: Engine) -> Connection:
    """A connection whose transaction is a writer's from its first statement."""
    return _isolated(engine.connect(), "READ COMMITTED").execution_options(sameline_writes=True)


def for_reading(engine: Engine) -> Connection:
    """A connection whose transaction sees one state of the records, whatever others record meanwhile."""
    return _isolated(engine.connect(), "REPEATABLE READ")


def keep_log_ahead(engine: Engine) -> None:
    """Set a SQLite store to write-ahead logging, which it then keeps; only ever done to what is known to be a store."""
    if engine.dialect.name != "sqlite":
        return
    with engine.connect() as connection:
        raw = connection.connection.dbapi_connection
        mode = raw.execute("PRAGMA journal_mode").fetchone()[0]  # type: ignore[union-attr]
        if mode != "wal":
            raw.execute("PRAGMA journal_mode = WAL")  # type: ignore[union-attr]


def _isolated(connection: Connection, level: IsolationLevel) -> Connection:
    """SQLite needs no word for it: its one writer excludes others, and its readers see the state they began with."""
    return connection if connection.dialect.name == "sqlite" else connection.execution_options(isolation_level=level)


def _check_file(path: Path, *, must_exist: bool) -> None:
    if path.is_dir():
        raise StoreError("this is a folder, not a store", where=str(path), advice="name a file, such as lab.db")
    if must_exist and not path.exists():
        raise StoreError(
            "there is no store here", where=str(path), advice="make one with `sameline init`, or name it with --store"
        )
    if not path.parent.is_dir():
        raise StoreError("the folder does not exist", where=str(path.parent), advice="make the folder first")


def _set_up_sqlite(connection: Any, _record: object) -> None:  # noqa: ANN401 - the driver's own connection
    connection.isolation_level = None
    cursor = connection.cursor()
    for pragma in ("foreign_keys = ON", "synchronous = FULL", "recursive_triggers = ON"):
        cursor.execute(f"PRAGMA {pragma}")
    cursor.close()


def _begin_sqlite(connection: Connection) -> None:
    if connection.get_execution_options().get("sameline_writes"):
        _take_turn(connection)
    else:
        connection.exec_driver_sql("BEGIN")


def _take_turn(connection: Connection) -> None:
    """Begin a writer's transaction when no other is at work; of many that wait, the longest waiting asks most often.

    SQLite itself asks the less often the longer it waits, so that in a crowd those who came last are served first,
    and some are not served within any reasonable time.
    """
    raw: Any = connection.connection.dbapi_connection
    began = time.monotonic()
    raw.execute("PRAGMA busy_timeout = 0")
    try:
        while (waited := time.monotonic() - began) < BUSY_SECONDS:
            try:
                raw.execute("BEGIN IMMEDIATE")
            except sqlite3.OperationalError as error:
                if "locked" not in str(error):
                    break
                time.sleep(max(_SHORTEST_WAIT, _FIRST_WAIT / (1 + waited)))
            else:
                return
        connection.exec_driver_sql("BEGIN IMMEDIATE")  # what it raises, SQLAlchemy knows
    finally:
        raw.execute(f"PRAGMA busy_timeout = {1000 * BUSY_SECONDS}")


_FIRST_WAIT = 0.02  # seconds between two attempts to begin
_SHORTEST_WAIT = 0.001
