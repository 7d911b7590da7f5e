"""Which revision of the schema a store has, and bringing it to this one. Alembic is loaded only to change a store."""

from __future__ import annotations

from typing import TYPE_CHECKING

from sqlalchemy import Connection, inspect, text

from sameline.errors import StoreError
from sameline.resources import migrations_folder

if TYPE_CHECKING:
    from alembic.config import Config

REVISIONS = ("0001", "0002", "0003")
"""Every revision a store may have, oldest first; the last is this Sameline's."""


def found_revision(connection: Connection) -> str | None:
    """The revision that the store says it has; None for a database without any tables.

    Raises:
        StoreError: the database holds something else than a store.
    """
    tables = set(inspect(connection).get_table_names())
    if not tables:
        return None
    if not {"alembic_version", "entry", "person"} <= tables:
        raise StoreError(
            "this database is not a Sameline store",
            advice="name another file with --store, or make a new one with `sameline init`",
        )
    revisions = connection.execute(text("SELECT version_num FROM alembic_version")).scalars().all()
    if len(revisions) != 1:
        raise StoreError("the store does not say which revision its schema has", advice="restore it from a backup")
    return str(revisions[0])


def check_revision(revision: str | None) -> None:
    """Refuse a store that this Sameline cannot read.

    Raises:
        StoreError: it is empty, older or newer; the message says what to do.
    """
    if revision is None:
        raise StoreError("the store is empty", advice="make it with `sameline init`")
    if revision not in REVISIONS:
        raise StoreError(
            f"the store was made by a newer Sameline (schema {revision}, this one knows up to {REVISIONS[-1]})",
            advice="install the newer Sameline; nothing was changed",
        )
    if revision != REVISIONS[-1]:
        raise StoreError(
            f"the store was made by an older Sameline (schema {revision}, this one uses {REVISIONS[-1]})",
            advice="back it up, then run `sameline init --upgrade`; nothing was changed",
        )


def upgrade(connection: Connection) -> None:
    """Run the migrations that are missing, inside the connection's open transaction."""
    from alembic import command

    config = _alembic()
    config.attributes["connection"] = connection
    command.upgrade(config, REVISIONS[-1])


def _alembic() -> Config:
    from alembic.config import Config

    config = Config()
    config.set_main_option("script_location", str(migrations_folder()))
    config.set_main_option("path_separator", "os")
    return config
