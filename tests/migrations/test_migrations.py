"""The migrations make what `sameline.records.tables` describes, on both kinds of database."""

from __future__ import annotations

from alembic.autogenerate import compare_metadata
from alembic.config import Config
from alembic.migration import MigrationContext
from alembic.script import ScriptDirectory
from sqlalchemy import CheckConstraint, inspect

from sameline.records import schema
from sameline.records import tables as t
from sameline.records.append_only import trigger_names
from sameline.records.store import Store
from sameline.resources import migrations_folder


def test_the_migrations_make_the_tables(store: str):
    with Store.open(store) as opened, opened.reading() as reading:
        context = MigrationContext.configure(reading.connection, opts={"compare_type": True})
        assert compare_metadata(context, t.metadata) == []


def test_the_migrations_make_the_check_constraints(store: str):
    with Store.open(store) as opened, opened.reading() as reading:
        inspector = inspect(reading.connection)
        for table in t.metadata.tables.values():
            made = {check["name"] for check in inspector.get_check_constraints(table.name)}
            assert made == {c.name for c in table.constraints if isinstance(c, CheckConstraint)}, table.name


def test_the_revisions_known_are_the_migrations_in_their_order():
    config = Config()
    config.set_main_option("script_location", str(migrations_folder()))
    config.set_main_option("path_separator", "os")
    scripts = ScriptDirectory.from_config(config)
    assert tuple(s.revision for s in reversed(list(scripts.walk_revisions()))) == schema.REVISIONS


def test_every_table_has_its_triggers(store: str, kind: str):
    with Store.open(store) as opened, opened.reading() as reading:
        source = "sqlite_master WHERE type = 'trigger'" if kind == "sqlite" else "pg_trigger WHERE NOT tgisinternal"
        column = "name" if kind == "sqlite" else "tgname"
        found = set(reading.connection.exec_driver_sql(f"SELECT {column} FROM {source}").scalars())
    assert found == {name for table in t.metadata.tables for name in trigger_names(kind, table)}
