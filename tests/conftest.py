"""Stores for every test: a small laboratory on SQLite, and on a real PostgreSQL server where a test asks for one."""

from __future__ import annotations

import datetime as dt
import importlib.util
import itertools
import shutil
import sys
import tempfile
from pathlib import Path
from types import ModuleType

import pytest
from sqlalchemy import make_url

from sameline.lab import open_lab


def _beside(name: str) -> ModuleType:
    spec = importlib.util.spec_from_file_location(name, Path(__file__).with_name(f"{name}.py"))
    module = importlib.util.module_from_spec(spec)
    sys.modules[name] = module
    spec.loader.exec_module(module)
    return module


# so that tests can import them by their names
laboratory = _beside("laboratory")
servers = _beside("servers")
attacker = _beside("attacker")


@pytest.fixture(scope="session")
def postgresql():
    """A PostgreSQL server."""
    # a socket's path must be short, and the names of pytest's folders are not
    with tempfile.TemporaryDirectory(prefix="pg") as folder:
        server = servers.PostgreSQL(Path(folder) / "data")
        yield server
        server.stop()


@pytest.fixture(scope="session")
def sqlite_template(tmp_path_factory: pytest.TempPathFactory):
    path = tmp_path_factory.mktemp("template") / "lab.db"
    laboratory.small(str(path)).close()
    return path


@pytest.fixture(scope="session")
def postgresql_template(postgresql: servers.PostgreSQL):
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


@pytest.fixture(scope="session")
def bare_template(tmp_path_factory: pytest.TempPathFactory):
    path = tmp_path_factory.mktemp("template") / "bare.db"
    laboratory.bare(str(path)).close()
    return path


@pytest.fixture
def lab(tmp_path: Path, bare_template: Path):
    """A laboratory on SQLite in which things are registered, and nothing is tested or asked; its clock goes on."""
    path = tmp_path / "bare.db"
    shutil.copy(bare_template, path)
    start = laboratory.START + dt.timedelta(hours=2)
    with open_lab(path, by="ana", clock=laboratory.Clock(start)) as opened:
        yield opened


@pytest.fixture
def sqlite_store(tmp_path: Path, sqlite_template: Path):
    """The path of a store of its own that holds the small laboratory."""
    path = tmp_path / "lab.db"
    shutil.copy(sqlite_template, path)
    return str(path)


@pytest.fixture(scope="module")
def sqlite_module_store(tmp_path_factory: pytest.TempPathFactory, sqlite_template):
    """The path of the small laboratory's store, one for a whole file of tests that leave it as it was."""
    path = tmp_path_factory.mktemp("tampered") / "lab.db"
    path.write_bytes(sqlite_template.read_bytes())
    return str(path)


@pytest.fixture
def postgresql_store(postgresql: servers.PostgreSQL, postgresql_template: str):
    """The URL of a database of its own that holds the small laboratory."""
    return postgresql.new(postgresql_template)


@pytest.fixture
def store(kind: str, request: pytest.FixtureRequest):
    """The path or URL of a store of its own that holds the small laboratory, on each kind of database."""
    return request.getfixturevalue(f"{kind}_store")
