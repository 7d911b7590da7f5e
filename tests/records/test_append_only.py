"""The database itself refuses to change, delete or replace a record, whoever asks and by whatever program."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import closing

import psycopg
import pytest
from sqlalchemy import Table, UniqueConstraint, make_url

from sameline.lab import open_lab
from sameline.records import tables as t
from servers import PostgreSQL

TABLES = [pytest.param(table, id=name) for name, table in t.metadata.tables.items()]


def keys(table: Table) -> Iterator[tuple[str, ...]]:
    """The primary key and each other unique key."""
    yield tuple(column.name for column in table.primary_key.columns)
    for constraint in table.constraints:
        if isinstance(constraint, UniqueConstraint):
            yield tuple(column.name for column in constraint.columns)


def columns(table: Table) -> str:
    return ", ".join(f'"{column.name}"' for column in table.columns)


@pytest.fixture
def plain_sqlite(sqlite_store: str) -> Iterator[sqlite3.Connection]:
    """SQLite as another program opens it: without any of Sameline's settings."""
    with closing(sqlite3.connect(sqlite_store)) as connection:
        yield connection


@pytest.fixture(scope="module")
def plain_postgresql(postgresql: PostgreSQL, postgresql_template: str) -> Iterator[psycopg.Connection]:
    url = postgresql.new(postgresql_template).replace("postgresql+psycopg", "postgresql")
    with psycopg.connect(url) as connection:
        yield connection


@pytest.mark.parametrize("table", TABLES)
def test_sqlite_refuses(plain_sqlite: sqlite3.Connection, table: Table):
    name, first = table.name, table.columns.values()[0].name
    before = plain_sqlite.execute(f"SELECT * FROM {name}").fetchall()
    assert before
    attempts = [
        f'UPDATE {name} SET "{first}" = "{first}"',
        f'UPDATE OR REPLACE {name} SET "{first}" = "{first}"',
        f"DELETE FROM {name}",
        f"DELETE FROM {name} WHERE rowid = (SELECT max(rowid) FROM {name})",
        f"REPLACE INTO {name} SELECT * FROM {name} LIMIT 1",
        f'INSERT INTO {name} SELECT * FROM {name} WHERE true LIMIT 1 ON CONFLICT DO UPDATE SET "{first}" = 1',
    ]
    for attempt in attempts:
        with pytest.raises(sqlite3.IntegrityError, match="records are never"):
            plain_sqlite.execute(attempt)
    assert plain_sqlite.execute(f"SELECT * FROM {name}").fetchall() == before


@pytest.mark.parametrize("table", TABLES)
def test_sqlite_refuses_to_replace_by_any_unique_key(plain_sqlite: sqlite3.Connection, table: Table):
    name = table.name
    before = plain_sqlite.execute(f"SELECT * FROM {name}").fetchall()
    for key in keys(table):
        values = ", ".join(
            f'"{c.name}"' if c.name in key else "9000" if c.primary_key else f'"{c.name}"' for c in table.columns
        )
        with pytest.raises(sqlite3.IntegrityError, match="records are never replaced"):
            plain_sqlite.execute(f"REPLACE INTO {name} ({columns(table)}) SELECT {values} FROM {name} LIMIT 1")
    assert plain_sqlite.execute(f"SELECT * FROM {name}").fetchall() == before


@pytest.mark.parametrize("table", TABLES)
def test_postgresql_refuses(plain_postgresql: psycopg.Connection, table: Table):
    name, first, primary = table.name, table.columns.values()[0].name, ", ".join(next(keys(table)))
    attempts = [
        f'UPDATE {name} SET "{first}" = "{first}"',
        f"DELETE FROM {name}",
        f"TRUNCATE {name} CASCADE",
        f"INSERT INTO {name} SELECT * FROM {name} LIMIT 1 ON CONFLICT ({primary}) DO UPDATE SET {first} = 1",
    ]
    for attempt in attempts:
        with pytest.raises(psycopg.errors.RaiseException, match="records are never changed or deleted"):
            plain_postgresql.execute(attempt)
        plain_postgresql.rollback()


def test_postgresql_role_without_the_right_to_change(postgresql: PostgreSQL, postgresql_template: str):
    """A role for the application that may read and insert, and nothing else; everything still works with it."""
    url = postgresql.new(postgresql_template)
    database = make_url(url).database
    postgresql.execute("DROP ROLE IF EXISTS bench")
    for statement in (
        "CREATE ROLE bench LOGIN",
        "GRANT USAGE ON SCHEMA public TO bench",
        "GRANT SELECT, INSERT ON ALL TABLES IN SCHEMA public TO bench",
    ):
        postgresql.execute(statement, database)
    with open_lab(str(make_url(url).set(username="bench")), by="ana") as lab:
        assert lab.add("supplier", "CEDAR", name="Cedar").entry > 0
        assert lab.verify().findings == ()
    as_bench = url.replace("postgresql+psycopg", "postgresql").replace("postgres:@", "bench:@")
    with psycopg.connect(as_bench) as connection:
        for attempt in ("UPDATE supplier SET code = 'X'", "DELETE FROM supplier", "TRUNCATE supplier"):
            with pytest.raises(psycopg.errors.InsufficientPrivilege):
                connection.execute(attempt)
            connection.rollback()
        with pytest.raises(psycopg.errors.InsufficientPrivilege):
            connection.execute("DROP TRIGGER supplier_no_update ON supplier")
    postgresql.execute("DROP OWNED BY bench", database)
    postgresql.execute("DROP ROLE bench")
