"""A watched folder: complete files are taken in once, and each is found again with what became of it."""

from __future__ import annotations

import json
import time

import pytest

from sameline.cli import run
from sameline.errors import StoreError
from sameline.lab import Lab, open_lab
from sameline.lab.watching import Folder, findings_beside, handle

HEAD = "batch,characteristic,tested_at,analyst,replicate,value\n"
GOOD = HEAD + "B1,hardness,2026-02-21T09:00,ana,1,70.5\n"
NEXT = GOOD + "B2,hardness,2026-02-21T10:00,ana,1,70.1\n"
BAD = GOOD + "B9,hardness,2026-02-21T10:00,ana,1,70.1\n"


@pytest.fixture
def call(sqlite_store, monkeypatch, capsys):
    monkeypatch.setenv("SAMELINE_STORE", sqlite_store)
    monkeypatch.setenv("SAMELINE_BY", "ben")

    def called(*words, code=0):
        assert run([str(word) for word in words]) == code, capsys.readouterr()
        return capsys.readouterr()

    return called


@pytest.fixture
def drop(tmp_path):
    folder = tmp_path / "drop"
    folder.mkdir()
    return folder


def once(call, folder, code=0):
    return call("watch", folder, "--once", "--settle", 0.01, code=code)


def runs_recorded(call):
    return len(json.loads(call("runs", "--json").out))


def names(folder):
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*") if path.is_file())


def test_good_files_are_taken_and_bad_ones_held_with_their_findings(call, drop):
    before = runs_recorded(call)
    (drop / "good.csv").write_text(GOOD)
    (drop / "bad.csv").write_text(BAD)
    said = once(call, drop, code=1)
    assert "good.csv: taken in, entry" in said.err
    assert names(drop) == ["held/bad.csv", "held/bad.csv.findings.txt", "taken/good.csv"]
    assert "'B9' is not registered" in findings_beside(drop / "held" / "bad.csv").read_text()
    assert runs_recorded(call) == before + 1
    once(call, drop)
    assert runs_recorded(call) == before + 1


def test_the_same_content_again_is_only_moved_and_overwrites_nothing(call, drop):
    (drop / "day.csv").write_text(GOOD)
    once(call, drop)
    before = runs_recorded(call)
    for content in (GOOD, HEAD + GOOD.splitlines()[1].replace("70.5", "70.50") + "\n"):
        (drop / "day.csv").write_text(content)
        assert "nothing new" in once(call, drop).err
    assert names(drop) == ["taken/day (2).csv", "taken/day (3).csv", "taken/day.csv"]
    assert runs_recorded(call) == before


def test_a_file_that_grows_brings_what_is_new(call, drop):
    before = runs_recorded(call)
    for content in (GOOD, NEXT):
        (drop / "day.csv").write_text(content)
        once(call, drop)
    assert runs_recorded(call) == before + 2
    assert names(drop) == ["taken/day (2).csv", "taken/day.csv"]


def test_a_file_is_complete_when_it_no_longer_changes(drop):
    path, folder = drop / "day.csv", Folder(drop)
    path.write_text(GOOD)
    assert folder.complete() == []
    path.write_text(NEXT)
    assert folder.complete() == []
    assert folder.complete() == [path]


@pytest.mark.parametrize("name", [".hidden.csv", "~$day.xlsx", "day.csv.part", "day.TMP"])
def test_what_another_program_is_writing_is_left(call, drop, name):
    (drop / name).write_text(GOOD)
    once(call, drop)
    assert names(drop) == [name]


def test_stopped_between_recording_and_moving_it_goes_on_where_it_was(call, drop, sqlite_store, monkeypatch):
    path = drop / "day.csv"
    path.write_text(GOOD)
    before = runs_recorded(call)
    with open_lab(sqlite_store, by="ben") as lab, monkeypatch.context() as stopped:
        stopped.setattr("sameline.lab.watching._moved", lambda *_: (_ for _ in ()).throw(KeyboardInterrupt))
        with pytest.raises(KeyboardInterrupt):
            handle(lab, path)
    assert (names(drop), runs_recorded(call)) == (["day.csv"], before + 1)
    assert "nothing new" in once(call, drop).err
    assert (names(drop), runs_recorded(call)) == (["taken/day.csv"], before + 1)


def test_a_store_that_cannot_be_used_leaves_the_file(call, drop, monkeypatch):
    (drop / "day.csv").write_text(GOOD)

    def locked(*_: object, **__: object) -> None:
        raise StoreError("the store is locked")

    monkeypatch.setattr(Lab, "take", locked)
    assert "the store is locked" in once(call, drop, code=3).err
    assert names(drop) == ["day.csv"]


def test_it_watches_until_it_is_stopped(call, drop, monkeypatch):
    looks = []

    def sleep(_: float) -> None:
        looks.append(names(drop))
        if len(looks) == 1:
            (drop / "late.csv").write_text(GOOD)
        if len(looks) == 4:
            raise KeyboardInterrupt

    monkeypatch.setattr(time, "sleep", sleep)
    assert "stop with Ctrl-C" in call("watch", drop, code=130).err
    assert looks == [[], ["late.csv"], ["taken/late.csv"], ["taken/late.csv"]]


def test_a_folder_that_is_not_there_is_made_only_when_asked(call, tmp_path):
    assert "no such folder" in once(call, tmp_path / "none", code=2).err
    call("watch", tmp_path / "none", "--make", "--once", "--settle", 0)
    assert (tmp_path / "none").is_dir()


def test_a_folder_that_cannot_be_worked_in_is_told(call, drop, tmp_path, monkeypatch):
    (tmp_path / "file").write_text("")
    assert "cannot be made" in call("watch", tmp_path / "file", "--make", "--once", code=2).err
    (drop / "day.csv").write_text(GOOD)
    (drop / "taken").write_text("a file where the folder would be")
    assert "cannot be moved" in once(call, drop, code=2).err
    monkeypatch.setattr(time, "sleep", lambda _: drop.rename(tmp_path / "gone"))
    assert "cannot be read" in once(call, drop, code=2).err


def test_the_folder_of_the_store_is_not_watched(call, tmp_path):
    before = names(tmp_path)
    assert "the store lies in this folder" in once(call, tmp_path, code=2).err
    assert names(tmp_path) == before
