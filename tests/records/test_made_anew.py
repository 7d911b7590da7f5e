"""Where every digest was made anew, only a conclusion or a checkpoint remembers: and does."""

from __future__ import annotations

from dataclasses import replace
from datetime import UTC, datetime

from sqlalchemy import Connection, Table, delete

import attacker as a
from attacker import found, named
from laboratory import signing_key
from sameline.conclusions.recompute import verify
from sameline.ledger.checkpoint import Checkpoint, sign_checkpoint
from sameline.records import tables as t
from sameline.records.checks import Finding, check_ledger
from sameline.records.signing import read_checkpoints
from sameline.records.store import Reading, Store


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
        for signed in (t.checkpoint, t.conclusion_signature):
            a.forget(connection, signed)
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
                for signed in (t.checkpoint, t.conclusion_signature):
                    a.forget(connection, signed)
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


def test_the_history_of_a_conclusion_replaced_and_everything_made_anew(sqlite_store: str):
    findings = _made_anew(sqlite_store, t.conclusion_turn, 1, because="chance")
    assert ["turns 1 because" in f.problem for f in findings] == [True]


def test_a_count_of_looks_replaced_and_everything_made_anew(sqlite_store: str):
    findings = _made_anew(sqlite_store, t.conclusion, 11, look=1)
    assert any(f.row == 11 and "look: recorded 1" in f.problem for f in findings)


def test_since_a_checkpoint_only_what_came_after_is_looked_at(sqlite_module_store: str):
    with a.unguarded(sqlite_module_store) as connection:
        since = checkpoint_of(connection)
        whole = check_ledger(connection)
        row = {"id": a.last(connection, t.measurement) + 1, "entry": since.entries, "run": 1, "replicate": 9}
        row |= {"text": "70", "value": 70.0, "qualifier": None, "unit": None, "digest": bytes(32)}
        a.add(connection, t.measurement, row)
        report = check_ledger(connection, since=since)
        assert report.rows == 0
        assert report.root == whole.root
        assert named(list(report.findings), "measurement", row["id"], 4)
        assert len(report.findings) == 1
        early = a.read(connection, t.checkpoint, 1)["entries"]
        kept = next(c for c in read_checkpoints(Reading(connection, since.entries)) if c.entries == early)
        a.write(connection, t.measurement, 3, text="70.9")
        a.write(connection, t.entry, early + 1, reason="made up")
        after = list(check_ledger(connection, since=kept).findings)
        assert not named(after, "measurement", 3)
        assert named(after, "entry", early + 1, 2)
        a.write(connection, t.entry, 5, reason="made up")
        a.rehash_all(connection)
        assert any(f.check == 10 and "given" in f.problem for f in check_ledger(connection, since=kept).findings)
