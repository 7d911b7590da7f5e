"""Whatever is changed behind Sameline's back is found and named.

Each named case is one change as somebody with every right to the database would make it, the triggers put back
afterwards. The campaign makes random single changes, each from a seed of its own.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from dataclasses import replace
from datetime import UTC, datetime

import pytest
from sqlalchemy import Connection, Table, delete, insert

import attacker as a
from laboratory import signing_key
from sameline.conclusions.recompute import verify
from sameline.ledger.checkpoint import Checkpoint, sign_checkpoint
from sameline.records import tables as t
from sameline.records.checks import Finding, check_ledger
from sameline.records.store import Store


def found(connection: Connection, *checkpoints: Checkpoint) -> list[Finding]:
    return list(check_ledger(connection, checkpoints=checkpoints).findings)


def named(findings: list[Finding], table: str, row: int, check: int | None = None) -> bool:
    return any((f.table, f.row) == (table, row) and check in (None, f.check) for f in findings)


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


@pytest.fixture(scope="module")
def sqlite_module_store(tmp_path_factory: pytest.TempPathFactory, sqlite_template):
    path = tmp_path_factory.mktemp("tampered") / "lab.db"
    path.write_bytes(sqlite_template.read_bytes())
    return str(path)


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


# -- everything made anew: only a conclusion, or a checkpoint kept elsewhere, remembers ----------------------------


def checkpoint_of(connection: Connection) -> Checkpoint:
    """A checkpoint of the ledger as it is, signed with a registered key, and kept elsewhere only."""
    report = check_ledger(connection)
    return sign_checkpoint(
        signing_key(1),
        laboratory="Northbank Testing",
        entries=report.entries,
        root=bytes.fromhex(report.root),
        time=datetime(2026, 3, 3, tzinfo=UTC),
        signer="Ana Lindqvist",
    )


def test_a_ledger_cut_off_at_its_end_is_found_against_a_checkpoint(sqlite_module_store: str):
    with a.unguarded(sqlite_module_store) as connection:
        kept = checkpoint_of(connection)
        assert found(connection, kept) == []
        for table in t.recorded_tables():
            with a.without_triggers(connection, table.name):
                connection.execute(delete(table).where(table.c.entry > kept.entries - 3))
        with a.without_triggers(connection, "entry"):
            connection.execute(delete(t.entry).where(t.entry.c.number > kept.entries - 3))
        a.rehash_all(connection)
        assert found(connection) == []
        (finding,) = found(connection, kept)
        assert finding.check == 10
        assert "taken away" in finding.problem


def test_a_ledger_made_anew_is_found_against_a_checkpoint(sqlite_module_store: str):
    """The store's own checkpoints tell it too, unless they are taken away."""
    with a.unguarded(sqlite_module_store) as connection:
        kept = checkpoint_of(connection)
        a.write(connection, t.measurement, 14, text="70.5")
        a.rehash_all(connection)
        (finding, *_) = found(connection)
        assert "recorded checkpoint" in finding.problem
        a.forget(connection, t.checkpoint)
        a.rehash_all(connection)
        assert found(connection) == []
        (finding,) = found(connection, kept)
        assert (finding.check, "not those that the checkpoint states" in finding.problem) == (10, True)


def test_a_checkpoint_of_another_laboratory_or_signer_is_told(sqlite_module_store: str):
    with a.unguarded(sqlite_module_store) as connection:
        kept = checkpoint_of(connection)
        problems = [f.problem for f in found(connection, replace(kept, laboratory="Elsewhere"))]
        assert len(problems) == 2  # another laboratory, and not what was signed
        assert "another laboratory" in problems[0]
        (finding,) = found(connection, replace(kept, signer="Eve"))
        assert "signature" in finding.problem
        (finding,) = found(connection, replace(kept, key=signing_key(3).public))
        assert "not known" in finding.problem


def test_a_checkpoint_signed_after_its_key_was_revoked_is_told(sqlite_module_store: str):
    with a.unguarded(sqlite_module_store) as connection:
        kept = checkpoint_of(connection)
        old = signing_key(2)
        late = {"laboratory": kept.laboratory, "entries": kept.entries, "root": kept.root, "signer": kept.signer}
        (finding,) = found(connection, sign_checkpoint(old, time=kept.time, **late))
        assert "revoked" in finding.problem
        early = datetime(2026, 3, 1, tzinfo=UTC)
        assert found(connection, sign_checkpoint(old, time=early, **late)) == []


def test_the_signature_of_another_checkpoint_is_told(sqlite_module_store: str):
    with a.unguarded(sqlite_module_store) as connection:
        a.write(connection, t.checkpoint, 2, signature=a.read(connection, t.checkpoint, 1)["signature"])
        a.rehash_row(connection, t.checkpoint, 2)
        findings = found(connection)
        assert any(f.check == 10 and "signature" in f.problem for f in findings)
        assert named(findings, "checkpoint", 2, 6)


def _made_anew(store: str, table: Table, number: int, **fields: object) -> list[Finding]:
    with Store.open(store) as opened:
        with opened.engine.connect() as connection:
            connection.connection.dbapi_connection.execute("PRAGMA foreign_keys = OFF")
            with connection.begin():
                a.write(connection, table, number, **fields)
                a.forget(connection, t.checkpoint)
                a.rehash_all(connection)
        return list(verify(opened).findings)


def test_a_figure_of_a_conclusion_replaced_and_everything_made_anew(sqlite_store: str):
    (finding,) = _made_anew(sqlite_store, t.conclusion_pair, 3, p_value=0.5)
    assert finding.check == 8
    assert finding.table == "conclusion"
    assert "p_value" in finding.problem


def test_a_value_replaced_and_everything_made_anew(sqlite_store: str):
    findings = _made_anew(sqlite_store, t.measurement, 8, value=75.0)
    assert {f.check for f in findings} >= {8}
    assert all("otherwise" in f.problem or "other values" in f.problem for f in findings)


# -- the campaign ---------------------------------------------------------------------------------------------------


def campaign(store: str, seeds: range) -> Counter[str]:
    """Random single changes, each found and named; how many of each sort."""
    done: Counter[str] = Counter()
    for seed in seeds:
        with a.unguarded(store) as connection:
            change = a.change_something(connection, seed)
            if change is None:
                continue
            findings = found(connection)
            assert findings, (seed, change)
            assert _names(findings, change), (seed, change, [str(f) for f in findings])
            done[change.what] += 1
    return done


def _names(findings: list[Finding], change: a.Change) -> bool:
    """Whether a finding names the row, the stretch that its entry wrote, or (for an entry) the one that follows it."""
    for f in findings:
        if f.table == change.table and f.row is not None:
            if f.row == change.row or f.check == 6 or change.what in {"double", "swap"}:
                return True
            if change.table == "entry" and f.row == change.row + 1:
                return True
        if change.table == "entry" and f.table == "tree_node":
            return True
    return False


def test_random_changes_are_all_found(sqlite_module_store: str):
    done = campaign(sqlite_module_store, range(100))
    assert done.total() >= 75
    assert len(done) == 7


def test_random_changes_are_all_found_on_postgresql(postgresql_store: str):
    assert campaign(postgresql_store, range(1000, 1012)).total() >= 8


@pytest.mark.slow
def test_two_thousand_random_changes_are_all_found(sqlite_module_store: str):
    done = campaign(sqlite_module_store, range(10_000, 12_700))
    print(sorted(done.items()), done.total())
    assert done.total() >= 2000
