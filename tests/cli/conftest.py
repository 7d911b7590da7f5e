"""The command line as its user has it: in an empty folder, with nothing in the environment."""

from __future__ import annotations

import contextlib
import hashlib
import io
import json
import shutil
import sqlite3
import sys
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, settings

from sameline.cli import run

settings.register_profile(
    "fixed", deadline=None, derandomize=True, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
settings.load_profile("fixed")

HEADINGS = "batch,characteristic,tested_at,replicate,value"


@dataclass(frozen=True)
class Ran:
    """What one command did: its exit code and what it wrote where."""

    code: int
    out: str
    err: str

    @property
    def document(self) -> Any:  # noqa: ANN401 - any JSON value
        return json.loads(self.out)


@dataclass(frozen=True)
class Tool:
    """The command line in one folder."""

    folder: Path

    def __call__(self, *arguments: object) -> Ran:
        out, err = io.StringIO(), io.StringIO()
        with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
            code = run([str(argument) for argument in arguments])
        return Ran(code, out.getvalue(), err.getvalue())

    def done(self, *arguments: object) -> Ran:
        """Run a command that has to succeed."""
        ran = self(*arguments)
        assert ran.code == 0, (arguments, ran)
        return ran

    def answer(self, name: str, *options: object) -> dict[str, Any]:
        document: dict[str, Any] = self.done("differ", name, "--json", *options).document
        return document

    def file(self, name: str, rows: Iterable[str], headings: str = HEADINGS) -> Path:
        path = self.folder / name
        path.write_text("\n".join([headings, *rows]) + "\n", encoding="utf-8")
        return path

    def state(self, store: str = "lab.db") -> tuple[int, str]:
        """The number of ledger entries, and a digest of every row of every table."""
        with contextlib.closing(sqlite3.connect(self.folder / store)) as connection:
            entries = connection.execute("SELECT count(*) FROM entry").fetchone()[0]
            content = "\n".join(connection.iterdump())
        return entries, hashlib.sha256(content.encode()).hexdigest()


@pytest.fixture
def tool(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Tool:
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("SAMELINE_STORE", raising=False)
    monkeypatch.delenv("SAMELINE_BY", raising=False)
    monkeypatch.setattr(sys, "stdin", io.StringIO())
    return Tool(tmp_path)


@pytest.fixture(scope="session")
def made_store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A store with three batches of one material and one characteristic, made by `mira`."""
    folder = tmp_path_factory.mktemp("made")
    path = folder / "lab.db"
    tool = Tool(folder)
    for command in (
        ("init", "--laboratory", "Ferrin Seals, incoming tests"),
        ("add", "supplier", "NORD"),
        ("add", "material", "SEAL"),
        *(("add", "batch", batch, "--material", "SEAL", "--supplier", "NORD") for batch in ("B-1", "B-2", "B-3")),
        ("add", "characteristic", "TS", "--unit", "MPa", "--lower", 10, "--margin", 1.5, "--decimals", 1),
    ):
        tool.done(*command, "--store", path, "--by", "mira")
    return path


@pytest.fixture
def bench(tool: Tool, made_store: Path, monkeypatch: pytest.MonkeyPatch) -> Tool:
    """A laboratory with three batches and one characteristic, and `mira` at work in it."""
    monkeypatch.setenv("SAMELINE_BY", "mira")
    shutil.copy(made_store, tool.folder / "lab.db")
    return tool


@pytest.fixture(scope="session")
def answered_store(made_store: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The same store with the comparison `pair` of B-1 and B-2, and two runs of each."""
    folder = tmp_path_factory.mktemp("answered")
    path = folder / "lab.db"
    shutil.copy(made_store, path)
    tool, here = Tool(folder), ("--store", path, "--by", "mira")
    tool.done("compare", "pair", "B-1", "B-2", "-c", "TS", *here)
    rows = [
        f"{batch},TS,2026-01-0{day}T08:00,1,{value}"
        for batch, values in {"B-1": ("12.1", "12.4"), "B-2": ("16.0", "15.7")}.items()
        for day, value in enumerate(values, 5)
    ]
    tool.done("take", tool.file("runs.csv", rows), *here)
    return path


@pytest.fixture
def answered(bench: Tool, answered_store: Path) -> Tool:
    """The laboratory with a comparison, `pair`, that is answered: two runs of each of its two batches."""
    shutil.copy(answered_store, bench.folder / "lab.db")
    return bench


@pytest.fixture
def unchanged(answered: Tool) -> Iterator[Tool]:
    """The same laboratory, of whose records and files the test may change nothing."""
    before, content = answered.state(), (answered.folder / "lab.db").read_bytes()
    yield answered
    assert answered.state() == before
    assert (answered.folder / "lab.db").read_bytes() == content


@pytest.fixture
def refused() -> Callable[..., None]:
    """Asserts that a command was refused with a message that says these words, and no traceback or data."""

    def check(ran: Ran, code: int, *words: str) -> None:
        assert ran.code == code, ran
        assert ran.out == ""
        assert ran.err.startswith("sameline: ")
        assert "Traceback" not in ran.err
        for word in words:
            assert word in ran.err

    return check
