"""Whatever is changed behind Sameline's back is found and named.

Each named case is one change as somebody with every right to the database would make it, the triggers put back
afterwards.
"""

from __future__ import annotations

from collections.abc import Callable

import pytest
from sqlalchemy import Connection, Table, delete, insert

import attacker as a
from attacker import found, named
from sameline.records import tables as t
from sameline.records.checks import Finding


def test_nothing_is_found_where_nothing_was_changed(store: str):
    with a.unguarded(store) as connection:
        assert found(connection) == []


# -- one field of one row, in every column of every table -----------------------------------------------------------

COLUMNS = [
    pytest.param(table, column.name, id=f"{table.name}-{column.name}")
    for table in (t.entry, *t.recorded_tables())
    for column in table.columns
    if column.name != a.key(table)
]


@pytest.mark.parametrize(("table", "column"), COLUMNS)
def test_a_field_is_changed(sqlite_module_store: str, table: Table, column: str):
    with a.unguarded(sqlite_module_store) as connection:
        number = (a.last(connection, table) + 1) // 2
        a.changed(connection, table, column, number)
        assert named(found(connection), table.name, number, 2 if table is t.entry else 5)


# -- named cases ----------------------------------------------------------------------------------------------------


def value_and_digest(c: Connection) -> tuple[str, int]:
    a.write(c, t.measurement, 7, value=72.0, text="72.0")
    a.rehash_row(c, t.measurement, 7)
    return "measurement", 7


def digit_of_the_text(c: Connection) -> tuple[str, int]:
    a.write(c, t.measurement, 3, text="70.8")
    return "measurement", 3


def trailing_zero(c: Connection) -> tuple[str, int]:
    """12.50 is not 12.5: its resolution is a fact."""
    a.write(c, t.measurement, 14, text="70.5")
    return "measurement", 14


def text_kept_as_bytes(c: Connection) -> tuple[str, int]:
    """The digest is of hexadecimal text either way; the column's kind tells them apart."""
    sha = a.read(c, t.source_file, 1)["sha256"]
    with a.without_triggers(c, "source_file"):
        c.exec_driver_sql("UPDATE source_file SET sha256 = ?", (bytes.fromhex(sha),))
    return "source_file", 1


def moment_of_an_entry(c: Connection) -> tuple[str, int]:
    a.write(c, t.entry, 20, at="2026-01-01T00:00:00.000000Z")
    return "entry", 20


def person_of_an_entry(c: Connection) -> tuple[str, int]:
    a.write(c, t.entry, 41, person=1)
    return "entry", 41


def reason_of_an_entry(c: Connection) -> tuple[str, int]:
    number = a.last(c, t.entry) - 5
    a.write(c, t.entry, number, reason="nobody knows")
    return "entry", number


def entry_rehashed(c: Connection) -> tuple[str, int]:
    """The entry agrees with itself; the next does not follow from it."""
    a.write(c, t.entry, 20, reason="made up")
    a.rehash_row(c, t.entry, 20)
    return "entry", 21


def entries_rehashed_to_the_end(c: Connection) -> tuple[str, None]:
    """The chain agrees; the tree remembers."""
    a.write(c, t.entry, 20, reason="made up")
    for number in range(20, a.last(c, t.entry) + 1):
        a.write(c, t.entry, number, prior=a.read(c, t.entry, number - 1)["digest"])
        a.rehash_row(c, t.entry, number)
    return "tree_node", None


def last_entry_taken_away(c: Connection) -> tuple[str, None]:
    number = a.last(c, t.entry)
    while number % 2:  # an even one completes a node
        a.remove(c, t.entry, number)
        number -= 1
    a.remove(c, t.entry, number)
    return "tree_node", None


def entry_in_the_middle_taken_away(c: Connection) -> tuple[str, int]:
    a.remove(c, t.entry, 30)
    return "entry", 30


def rows_swapped(c: Connection) -> tuple[str, int]:
    a.write(c, t.conclusion_pair, 1, verdict="equivalent")
    return "conclusion_pair", 1


def list_of_rows(c: Connection) -> tuple[str, int]:
    """An entry that claims to have written more than a disk could hold is checked as fast as any."""
    text = a.read(c, t.entry, 5)["rows"].replace('"count":1', '"count":9007199254740000', 1)
    a.write(c, t.entry, 5, rows=text)
    return "entry", 5


def number_far_off(c: Connection) -> tuple[str, int]:
    a.write(c, t.measurement, 9, id=2**62)
    return "measurement", 9


def figure_that_is_none(c: Connection) -> tuple[str, int]:
    a.write(c, t.measurement, 9, value=float("inf"))
    return "measurement", 9


def text_that_is_none(c: Connection) -> tuple[str, int]:
    with a.without_triggers(c, "measurement"):
        c.exec_driver_sql("UPDATE measurement SET text = CAST(x'ff3730' AS TEXT) WHERE id = 9")
    return "measurement", 9


def reference_to_nothing(c: Connection) -> tuple[str, int]:
    a.write(c, t.run, 2, batch=77)
    return "run", 2


def row_of_another_entry(c: Connection) -> tuple[str, int]:
    a.write(c, t.measurement, 4, entry=3)
    return "measurement", 4


def exclusion_taken_away(c: Connection) -> tuple[str, int]:
    a.remove(c, t.exclusion, 2)
    return "exclusion", 2


def measurement_slipped_in(c: Connection) -> tuple[str, int]:
    row = a.read(c, t.measurement, 3)
    row.update(id=a.last(c, t.measurement) + 1, replicate=9)
    row["digest"] = a.digest(t.measurement, row)
    a.add(c, t.measurement, row)
    return "measurement", row["id"]


def tree_node_changed(c: Connection) -> tuple[str, None]:
    with a.without_triggers(c, "tree_node"):
        c.exec_driver_sql("UPDATE tree_node SET hash = zeroblob(32) WHERE level = 2 AND position = 1")
    return "tree_node", None


def tree_node_added(c: Connection) -> tuple[str, None]:
    c.execute(insert(t.tree_node), [{"level": 3, "position": 900, "hash": bytes(32)}])
    return "tree_node", None


def tree_emptied(c: Connection) -> tuple[str, None]:
    with a.without_triggers(c, "tree_node"):
        c.execute(delete(t.tree_node))
    return "tree_node", None


CASES = (
    value_and_digest,
    digit_of_the_text,
    trailing_zero,
    text_kept_as_bytes,
    moment_of_an_entry,
    person_of_an_entry,
    reason_of_an_entry,
    entry_rehashed,
    entries_rehashed_to_the_end,
    last_entry_taken_away,
    entry_in_the_middle_taken_away,
    rows_swapped,
    list_of_rows,
    number_far_off,
    figure_that_is_none,
    text_that_is_none,
    reference_to_nothing,
    row_of_another_entry,
    exclusion_taken_away,
    measurement_slipped_in,
    tree_node_changed,
    tree_node_added,
    tree_emptied,
)


@pytest.mark.parametrize("case", CASES, ids=lambda case: case.__name__)
def test_a_named_case(sqlite_module_store: str, case: Callable[[Connection], tuple[str, int]]):
    with a.unguarded(sqlite_module_store) as connection:
        table, row = case(connection)
        findings = found(connection)
        assert named(findings, table, row) or _in_span(findings, table, row), [str(f) for f in findings]
        assert len(findings) < 200


def _in_span(findings: list[Finding], table: str, row: int | None) -> bool:
    """A row replaced together with its digest is known by the entry that wrote it and the stretch it wrote."""
    return any(f.check == 6 and f.table == table and row is not None and f.row <= row and f.entry for f in findings)


@pytest.mark.parametrize(
    "statement",
    [
        "DROP TRIGGER measurement_no_update",
        "DROP TABLE conclusion_turn",
        "DROP INDEX ix_run_batch",
        "ALTER TABLE measurement ADD COLUMN corrected TEXT",
        "ALTER TABLE measurement RENAME COLUMN text TO words",
        "CREATE TABLE aside (x)",
        "CREATE TRIGGER quiet AFTER INSERT ON run BEGIN SELECT 1; END",
        "CREATE VIEW shown AS SELECT * FROM measurement",
    ],
)
def test_the_schema_is_changed(sqlite_module_store: str, statement: str):
    with a.unguarded(sqlite_module_store) as connection:
        connection.exec_driver_sql(statement)
        assert any(f.check == 1 for f in found(connection))


def test_a_trigger_of_the_same_name_that_refuses_nothing(sqlite_module_store: str):
    with a.unguarded(sqlite_module_store) as connection:
        connection.exec_driver_sql("DROP TRIGGER run_no_update")
        connection.exec_driver_sql("CREATE TRIGGER run_no_update BEFORE UPDATE ON run BEGIN SELECT 1; END")
        assert [f.table for f in found(connection) if f.check == 1] == ["run"]


@pytest.mark.parametrize(
    "statement",
    [
        "ALTER TABLE run DISABLE TRIGGER run_no_update",
        "DROP TRIGGER run_no_truncate ON run",
        "ALTER TABLE run ENABLE REPLICA TRIGGER run_no_delete",
        "CREATE OR REPLACE FUNCTION sameline_refuse() RETURNS trigger LANGUAGE plpgsql AS 'BEGIN RETURN NEW; END'",
        "DROP INDEX ix_run_batch",
        "ALTER TABLE run ADD COLUMN corrected text",
    ],
)
def test_the_postgresql_schema_is_changed(postgresql_store: str, statement: str):
    with a.unguarded(postgresql_store) as connection:
        connection.exec_driver_sql(statement)
        assert any(f.check == 1 and "run" in (f.table or f.problem) for f in found(connection))
