"""The triggers that make a table insert only, as SQL for each kind of database.

Migrations install them, so that the database itself refuses a change, whoever asks; `sameline verify` looks that they
are still there. The names and texts are part of every store ever made: change them only by a new migration.
"""

from __future__ import annotations

from collections.abc import Sequence

_SQLITE = {
    "no_update": "CREATE TRIGGER {table}_no_update BEFORE UPDATE ON {table} "
    "BEGIN SELECT RAISE(ABORT, 'records are never changed: {table}'); END",
    "no_delete": "CREATE TRIGGER {table}_no_delete BEFORE DELETE ON {table} "
    "BEGIN SELECT RAISE(ABORT, 'records are never deleted: {table}'); END",
    # INSERT OR REPLACE deletes whatever row has one of the new one's unique keys, without asking the trigger above
    "no_replace": "CREATE TRIGGER {table}_no_replace BEFORE INSERT ON {table} "
    "WHEN EXISTS (SELECT 1 FROM {table} WHERE {key}) "
    "BEGIN SELECT RAISE(ABORT, 'records are never replaced: {table}'); END",
}

FUNCTION_BODY = " BEGIN RAISE EXCEPTION 'records are never changed or deleted: %', TG_TABLE_NAME; END "
"""What PostgreSQL's triggers run, word for word."""

_POSTGRESQL_FUNCTION = (
    f"CREATE OR REPLACE FUNCTION sameline_refuse() RETURNS trigger LANGUAGE plpgsql AS $${FUNCTION_BODY}$$"
)
_POSTGRESQL = {
    "no_update": "CREATE TRIGGER {table}_no_update BEFORE UPDATE ON {table} "
    "FOR EACH ROW EXECUTE FUNCTION sameline_refuse()",
    "no_delete": "CREATE TRIGGER {table}_no_delete BEFORE DELETE ON {table} "
    "FOR EACH ROW EXECUTE FUNCTION sameline_refuse()",
    "no_truncate": "CREATE TRIGGER {table}_no_truncate BEFORE TRUNCATE ON {table} "
    "FOR EACH STATEMENT EXECUTE FUNCTION sameline_refuse()",
}


def trigger_names(dialect: str, table: str) -> tuple[str, ...]:
    """The names of the triggers that guard this table."""
    return tuple(f"{table}_{kind}" for kind in (_SQLITE if dialect == "sqlite" else _POSTGRESQL))


def guard(dialect: str, table: str, keys: Sequence[Sequence[str]]) -> list[str]:
    """The statements that make a table insert only.

    Args:
        dialect: "sqlite" or "postgresql".
        table: the table's name.
        keys: the columns of its primary key and of each other unique key, in a fixed order.
    """
    if dialect == "sqlite":
        same = " OR ".join(" AND ".join(f"{column} = NEW.{column}" for column in key) for key in keys)
        return [text.format(table=table, key=same) for text in _SQLITE.values()]
    return [_POSTGRESQL_FUNCTION, *(text.format(table=table) for text in _POSTGRESQL.values())]
