"""Stores that cannot be used: exit code 3, what to do, and the file as it was."""

from __future__ import annotations

import contextlib
import os
import shutil
import sqlite3
import tempfile
from collections.abc import Iterator
from pathlib import Path

import pytest

NOBODY = 65534

EVERY = [("differ",), ("log", "-b", "B-1", "-c", "TS", "12.5"), ("verify",), ("list", "batches"), ("trail",)]


@pytest.mark.parametrize("command", EVERY, ids=lambda command: command[0])
def test_a_file_that_is_not_a_store(bench, refused, command):
    path = bench.folder / "letter.db"
    path.write_text("Dear laboratory, " * 100, encoding="utf-8")
    refused(bench(*command, "--store", path), 3, "this file is not a store", "name another file")
    assert path.read_text(encoding="utf-8") == "Dear laboratory, " * 100


@pytest.mark.parametrize("command", [*EVERY, ("init",)], ids=lambda command: command[0])
def test_a_database_of_something_else_is_left_alone(bench, refused, command):
    path = bench.folder / "stamps.db"
    connection = sqlite3.connect(path)
    connection.execute("CREATE TABLE stamp (id INTEGER PRIMARY KEY)")
    connection.commit()
    connection.close()
    before = path.read_bytes()
    refused(bench(*command, "--store", path), 3, "not a Sameline store", "name another file")
    assert path.read_bytes() == before


@pytest.mark.parametrize("command", EVERY, ids=lambda command: command[0])
def test_no_store_where_one_is_named(bench, refused, command):
    refused(bench(*command, "--store", "elsewhere.db"), 3, "there is no store here", "`sameline init`")
    assert not (bench.folder / "elsewhere.db").exists()


def test_a_store_is_not_made_over_another(unchanged, refused):
    refused(unchanged("init"), 3, "there is a store here already", "--store")


def test_a_store_in_a_folder_that_is_not_there(bench, refused):
    refused(bench("init", "--store", "nowhere/lab.db"), 3, "the folder does not exist", "make the folder first")


def test_a_store_below_a_file_cannot_be_made(bench, refused):
    """Nobody may write below a file, not even root: the nearest to a folder that is read-only."""
    (bench.folder / "notes").write_text("", encoding="utf-8")
    refused(bench("init", "--store", "notes/lab.db"), 3, "notes")


@contextlib.contextmanager
def without_leave_to_write(folder: Path) -> Iterator[None]:
    """The folder and its files may be read and not written; root, who may do everything, is nobody meanwhile."""
    for path in folder.iterdir():
        path.chmod(0o444)
    folder.chmod(0o555)
    root = os.geteuid() == 0
    if root:
        os.seteuid(NOBODY)
    try:
        yield
    finally:
        if root:
            os.seteuid(0)
        folder.chmod(0o755)


def test_a_store_in_a_folder_that_is_read_only(answered, refused):
    answered.done("log", "-b", "B-1", "-c", "TS", "12.5", "--at", "2026-02-01")  # all that is needed is now loaded
    with tempfile.TemporaryDirectory() as place:
        folder = Path(place)
        shutil.copy(answered.folder / "lab.db", folder)
        content = (folder / "lab.db").read_bytes()
        with without_leave_to_write(folder):
            logged = answered("log", "-b", "B-1", "-c", "TS", "12.5", "--store", folder / "lab.db")
            made = answered("init", "--store", folder / "new.db")
        refused(logged, 3, "check the permissions", "lab.db")
        refused(made, 3, "check the permissions", "new.db")
        assert [path.name for path in folder.iterdir()] == ["lab.db"]
        assert (folder / "lab.db").read_bytes() == content


def test_a_tour_needs_an_empty_folder(unchanged, refused):
    refused(unchanged("tour", "."), 2, "the folder is not empty", "name a new one")
    refused(unchanged("tour", "lab.db"), 2, "the folder cannot be made", "name another one")


def test_an_unknown_time_zone(tool, refused):
    refused(tool("init", "--by", "mira", "--zone", "Mars/Olympus"), 2, "Mars/Olympus", "UTC")
    refused(tool("init"), 2, "who makes the store?", "--by")
    assert list(tool.folder.iterdir()) == []
