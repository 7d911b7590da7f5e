"""Is the schema the one that the migrations made, with every trigger that refuses changes?"""

from __future__ import annotations

import re
from functools import cache

from sqlalchemy import Connection, create_engine, text

from sameline.records import schema
from sameline.records import tables as t
from sameline.records.append_only import FUNCTION_BODY, trigger_names
from sameline.records.findings import Findings

_BEFORE, _FOR_EACH_ROW = 2, 1
_POSTGRESQL_KINDS = {
    "no_update": _BEFORE + _FOR_EACH_ROW + 16,
    "no_delete": _BEFORE + _FOR_EACH_ROW + 8,
    "no_truncate": _BEFORE + 32,
}
"""What `pg_trigger.tgtype` says of each (PostgreSQL source, catalog/pg_trigger.h)."""


def check_schema(connection: Connection, findings: Findings) -> None:
    """1. The schema's revision, tables, columns, constraints, indexes and triggers."""
    revision = schema.found_revision(connection)
    if revision != schema.REVISIONS[-1]:
        findings.add(1, f"the schema is {revision}, not {schema.REVISIONS[-1]}", "alembic_version")
    if connection.dialect.name == "sqlite":
        _check_sqlite(connection, findings)
    else:
        _check_postgresql(connection, findings)


# -- SQLite: every statement that made the schema is kept in it ----------------------------------------------------


def _check_sqlite(connection: Connection, findings: Findings) -> None:
    made, found = _as_migrated(), _statements(connection)
    for (kind, name), (table, statement) in made.items():
        if (kind, name) not in found:
            findings.add(1, f"the {_word(kind, name)} {name} is gone", table)
        elif found[kind, name][1] != statement:
            findings.add(1, f"the {_word(kind, name)} {name} is not as the migrations made it", table)
    for kind, name in found.keys() - made.keys():
        findings.add(1, f"the {kind} {name} is none that the migrations made", found[kind, name][0])
    for (problem,) in connection.exec_driver_sql("PRAGMA integrity_check"):
        if problem != "ok":
            findings.add(1, f"the file is damaged: {problem}")


def _word(kind: str, name: str) -> str:
    refuses = kind == "trigger" and name in {n for table in t.metadata.tables for n in trigger_names("sqlite", table)}
    return "trigger that refuses changes," if refuses else kind


@cache
def _as_migrated() -> dict[tuple[str, str], tuple[str, str]]:
    """The statements of a schema that the migrations make in memory just now; they take a third of a second."""
    engine = create_engine("sqlite://")
    with engine.connect() as connection, connection.begin():
        schema.upgrade(connection)
        made = _statements(connection)
    engine.dispose()
    return made


def _statements(connection: Connection) -> dict[tuple[str, str], tuple[str, str]]:
    """Kind and name of all that a schema holds -> the table it belongs to, and its statement without layout."""
    rows = connection.exec_driver_sql("SELECT type, name, tbl_name, coalesce(sql, '') FROM sqlite_master")
    return {
        (kind, name): (table, re.sub(r"\s+", " ", statement).strip())
        for kind, name, table, statement in rows
        if not name.startswith("sqlite_stat")  # what ANALYZE counts
    }


# -- PostgreSQL: the catalogue against the tables and triggers as Sameline knows them ------------------------------

_TRIGGERS = text(
    "SELECT c.relname, g.tgname, g.tgtype, p.proname, p.prosrc, g.tgqual IS NULL AND g.tgenabled IN ('O', 'A') "
    "FROM pg_trigger g JOIN pg_class c ON c.oid = g.tgrelid JOIN pg_proc p ON p.oid = g.tgfoid "
    "WHERE NOT g.tgisinternal AND c.relnamespace = current_schema()::regnamespace"
)


def _check_postgresql(connection: Connection, findings: Findings) -> None:
    from alembic.autogenerate import compare_metadata
    from alembic.migration import MigrationContext

    for change in compare_metadata(MigrationContext.configure(connection), t.metadata):
        findings.add(1, f"the schema is not as the migrations made it: {_described(change)}")
    kept = {
        (table, name): (kind, function == "sameline_refuse" and body == FUNCTION_BODY and active)
        for table, name, kind, function, body, active in connection.execute(_TRIGGERS)
    }
    for table in t.metadata.tables:
        for word, kind in _POSTGRESQL_KINDS.items():
            name = f"{table}_{word}"
            found = kept.pop((table, name), None)
            if found is None:
                findings.add(1, f"the trigger that refuses changes, {name}, is gone", table)
            elif found != (kind, True):
                findings.add(1, f"the trigger that refuses changes, {name}, is not as the migrations made it", table)
    for table, name in kept:
        findings.add(1, f"the trigger {name} is none that the migrations made", table)


def _described(change: object) -> str:
    """A difference as Alembic gives it, "add_table" meaning that the store lacks it."""
    parts = change if isinstance(change, tuple) else tuple(change) if isinstance(change, list) else (change,)
    return " ".join(str(part) for part in parts if part is not None)[:200]
