"""SQLite and PostgreSQL hold the same rows, digests and ledger, and both verify."""

from collections.abc import Callable
from pathlib import Path

from sqlalchemy import select

import laboratory
from sameline.lab import open_lab
from sameline.records import tables as t
from sameline.records.store import Store


def everything(store: str):
    with Store.open(store) as opened, opened.reading() as reading:
        return {
            table.name: [
                tuple(row) for row in reading.connection.execute(select(table).order_by(*table.primary_key.columns))
            ]
            for table in t.metadata.tables.values()
        }


def test_every_act_leaves_the_same_rows_and_ledger(new_place: Callable[[], str], sqlite_template: Path):
    place = new_place()
    laboratory.small(place).close()
    found, expected = everything(place), everything(str(sqlite_template))
    assert found.keys() == expected.keys()
    for table, rows in expected.items():
        assert found[table] == rows, table


def test_the_small_laboratory_fills_every_table(sqlite_template: Path):
    empty = {name for name, rows in everything(str(sqlite_template)).items() if not rows}
    assert empty == set()


def test_a_store_verifies(store: str):
    with open_lab(store) as lab:
        found = lab.verify()
    assert [str(f) for f in found.findings] == []
    assert found.behind == ()
    assert found.conclusions > 10
    assert found.ledger.rows > 100
