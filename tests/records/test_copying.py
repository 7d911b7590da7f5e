"""Backups and copies have the same rows and root as the store, or are not made."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from pathlib import Path

import pytest
from sqlalchemy import select

import attacker
import laboratory
from sameline.errors import StoreError
from sameline.lab import open_lab
from sameline.records import tables as t
from sameline.records.copying import backup, copy_store
from sameline.records.store import Store


def rows_of(store: str) -> dict[str, list[tuple[object, ...]]]:
    with Store.open(store) as opened, opened.reading() as reading:
        return {
            table.name: [
                tuple(row) for row in reading.connection.execute(select(table).order_by(*table.primary_key.columns))
            ]
            for table in t.metadata.tables.values()
        }


def test_a_backup_is_the_store(store: str, tmp_path: Path):
    path = tmp_path / "kept.db"
    with Store.open(store) as opened:
        report = backup(opened, path)
    assert report.findings == ()
    assert rows_of(str(path)) == rows_of(store)
    with open_lab(path, by="ana") as kept, open_lab(store) as lab:
        assert kept.verify().ledger == lab.verify().ledger == report
        assert kept.record([laboratory.run("B1", 30, "70.1")]).entry == report.entries + 1
    assert [p.name for p in tmp_path.glob("kept*")] == ["kept.db"]


def test_a_copy_between_kinds_of_database_and_back(store: str, new_place: Callable[[], str], tmp_path: Path):
    told = []
    there, back = new_place(), str(tmp_path / "back.db")
    with Store.open(store) as opened:
        first = copy_store(opened, there, lambda *progress: told.append(progress))
    with Store.open(there) as opened:
        second = copy_store(opened, back)
    assert first == second
    assert rows_of(back) == rows_of(store)
    assert told[-1][:2] == ("copied", first.rows + first.entries)
    with open_lab(there, by="ana") as lab:
        lab.record([laboratory.run("B1", 30, "70.1")])
        assert lab.verify().findings == ()


def test_sqlite_to_postgresql(sqlite_store: str, postgresql) -> None:
    url = postgresql.new()
    with Store.open(sqlite_store) as opened:
        copy_store(opened, url)
    assert rows_of(url) == rows_of(sqlite_store)


def test_a_backup_while_somebody_records(sqlite_store: str, tmp_path: Path):
    with Store.open(sqlite_store) as opened, opened.act("add", by="ana", at=laboratory.moment(40)) as act:
        act.add(t.supplier, code="HALF")
        report = backup(opened, tmp_path / "kept.db")
        assert report.entries == act.number - 1


def test_nothing_is_overwritten(store: str, sqlite_template: Path, tmp_path: Path):
    path = tmp_path / "there.db"
    shutil.copy(sqlite_template, path)
    content = path.read_bytes()
    with Store.open(store) as opened:
        for action in (backup, copy_store):
            with pytest.raises(StoreError, match="already"):
                action(opened, path)
    assert path.read_bytes() == content


def test_a_damaged_store_is_not_copied(sqlite_store: str, tmp_path: Path, new_place: Callable[[], str]):
    with Store.open(sqlite_store) as opened, opened.engine.begin() as connection:
        attacker.write(connection, t.measurement, 3, text="70.9")
    with Store.open(sqlite_store) as opened:
        with pytest.raises(StoreError, match="measurement 3"):
            backup(opened, tmp_path / "kept.db")
        place = new_place()
        with pytest.raises(StoreError, match="measurement 3"):
            copy_store(opened, place)
    assert list(tmp_path.glob("kept*")) == []
    with pytest.raises(StoreError, match="cut short"):
        Store.open(place)
    with Store.open(sqlite_store) as opened, opened.engine.begin() as connection:
        attacker.write(connection, t.measurement, 3, text=_as_it_was(3))
    with Store.open(sqlite_store) as opened:
        assert copy_store(opened, place).findings == ()


def _as_it_was(number: int) -> str:
    assert number == 3
    return "70.2"


def test_a_place_that_cannot_be_written(sqlite_store: str, tmp_path: Path):
    with Store.open(sqlite_store) as opened:
        for action in (backup, copy_store):
            with pytest.raises(StoreError):
                action(opened, tmp_path / "none" / "kept.db")
