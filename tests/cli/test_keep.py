"""Keys, checkpoints, backups and copies, and whole entries reversed, from the command line."""

from __future__ import annotations

import json
import sqlite3

import pytest

from sameline.cli import run


@pytest.fixture
def call(sqlite_store, monkeypatch, capsys):
    monkeypatch.setenv("SAMELINE_STORE", sqlite_store)
    monkeypatch.setenv("SAMELINE_BY", "ben")
    monkeypatch.setenv("SAMELINE_PASSPHRASE", "quiet river")

    def called(*words, code=0):
        assert run([str(word) for word in words]) == code
        return capsys.readouterr()

    return called


def test_a_checkpoint_proves_a_truncated_ledger(call, tmp_path):
    call("key", "make", tmp_path / "ben.pem")
    call("checkpoint", "--key", tmp_path / "ben.pem", "--out", tmp_path / "point.txt")
    assert "checkpoint" in (tmp_path / "point.txt").read_text()
    good = call("verify", "--checkpoint", tmp_path / "point.txt", "--json")
    assert json.loads(good.out)["good"] is True
    call("add", "supplier", "CEDAR", "--name", "Cedar")
    call("verify", "--checkpoint", tmp_path / "point.txt")
    later = json.loads(call("verify", "--since", tmp_path / "point.txt", "--json").out)
    assert later["good"] is True
    assert later["rows"] < json.loads(good.out)["rows"]
    other = tmp_path / "other.db"
    call("init", "--store", other, "--by", "ben")
    bad = call("verify", "--checkpoint", tmp_path / "point.txt", "--store", other, code=1)
    assert "[10]" in bad.out


def test_a_checkpoint_never_overwrites_a_file(call, tmp_path):
    call("key", "make", tmp_path / "ben.pem")
    (tmp_path / "point.txt").write_text("something of yours")
    refused = call("checkpoint", "--key", tmp_path / "ben.pem", "--out", tmp_path / "point.txt", code=2)
    assert "already" in refused.err
    assert (tmp_path / "point.txt").read_text() == "something of yours"


def test_a_revoked_key_signs_nothing_more(call, tmp_path):
    call("key", "make", tmp_path / "ben.pem")
    listed = json.loads(call("key", "list", "--json").out)
    assert (listed[-1]["person"], listed[-1]["revoked"]) == ("ben", None)
    call("key", "revoke", listed[-1]["key"], "--reason", "the stick was lost")
    assert "revoked by entry" in call("key", "list").out
    refused = call("checkpoint", "--key", tmp_path / "ben.pem", "--out", tmp_path / "point.txt", code=2)
    assert "revoked" in refused.err
    assert not (tmp_path / "point.txt").exists()


def test_the_wrong_passphrase_is_told(call, tmp_path, monkeypatch):
    call("key", "make", tmp_path / "ben.pem")
    monkeypatch.setenv("SAMELINE_PASSPHRASE", "loud river")
    assert "passphrase" in call("checkpoint", "--key", tmp_path / "ben.pem", "--out", tmp_path / "p.txt", code=2).err


@pytest.mark.parametrize("command", ["backup", "copy"])
def test_a_copy_has_the_same_root_and_verifies(call, tmp_path, command):
    root = json.loads(call("verify", "--json").out)["root"]
    assert root in call(command, tmp_path / "other.db").err
    copied = json.loads(call("verify", "--json", "--store", tmp_path / "other.db").out)
    assert (copied["good"], copied["root"]) == (True, root)
    assert call(command, tmp_path / "other.db", code=3).err


def test_a_file_taken_by_mistake_is_reversed_as_a_whole(call):
    entry = next(e["number"] for e in json.loads(call("trail", "--json").out) if e["act"] == "take")
    before = json.loads(call("differ", "batches", "--json").out)
    said = call("reverse", entry, "--reason", "the file was another laboratory's")
    assert f"entry {entry} reversed" in said.err
    after = json.loads(call("differ", "batches", "--json").out)
    assert after["runs"] < before["runs"]
    assert any(c["code"] == "set aside" for c in after["cautions"])
    call("verify")


def test_a_run_s_particulars_are_restated_and_its_values_stay(call):
    before = json.loads(call("differ", "batches", "--json").out)
    call("restate", "run", "1", "--batch", "B2", "--reason", "the drums were exchanged")
    after = json.loads(call("differ", "batches", "--json").out)
    assert after["replicates"] == before["replicates"]
    assert [g["runs"] for g in after["groups"]] != [g["runs"] for g in before["groups"]]
    assert "nothing to state anew" in call("restate", "run", "1", "--reason", "no", code=2).err
    call("verify")


def test_a_conclusion_is_signed_by_two_and_a_later_version_is_not(call, tmp_path):
    for person in ("ana", "ben"):
        call("key", "make", tmp_path / f"{person}.pem", "--by", person)
    sign = ("sign", "suppliers", "--key")
    early = call(*sign, tmp_path / "ben.pem", "--as", "approved", code=2)
    assert "nobody has signed" in early.err
    call(*sign, tmp_path / "ana.pem", "--as", "prepared", "--by", "ana")
    own = call(*sign, tmp_path / "ana.pem", "--as", "approved", "--by", "ana", code=2)
    assert "another person" in own.err
    call(*sign, tmp_path / "ben.pem", "--as", "approved")
    assert "another person" in call(*sign, tmp_path / "ben.pem", "--as", "reviewed", code=2).err
    assert "somebody else" not in call(*sign, tmp_path / "ana.pem", "--as", "reviewed", code=2).out
    signed = json.loads(call("differ", "suppliers", "--json").out)
    assert [(s["version"], s["meaning"], s["person"]) for s in signed["signatures"]] == [
        (signed["version"], "prepared", "ana"),
        (signed["version"], "approved", "ben"),
    ]
    assert "Signed as approved by Ben Okoro" in call("differ", "suppliers").out
    call("amend", "70.5", "--run", "1", "--replicate", "1", "--reason", "misread")
    assert "NOT SIGNED" in call("differ", "suppliers").out
    call("verify")


@pytest.mark.parametrize(
    "change",
    [
        "UPDATE conclusion_signature SET meaning = 'reviewed'",
        "UPDATE conclusion_signature SET signer = 'Ana Lindqvist '",
        "UPDATE conclusion_signature SET signature = zeroblob(64)",
        "UPDATE conclusion_signature SET conclusion = conclusion - 1",
        "UPDATE conclusion_signature SET time = '2020-01-01T00:00:00+00:00'",
    ],
)
def test_a_signature_that_was_changed_is_found(call, tmp_path, sqlite_store, change):
    call("key", "make", tmp_path / "ben.pem")
    call("sign", "batches", "--as", "prepared", "--key", tmp_path / "ben.pem")
    with sqlite3.connect(sqlite_store) as raw:
        raw.execute("DROP TRIGGER conclusion_signature_no_update")
        raw.execute(change)
    raw.close()
    found = json.loads(call("verify", "--json", code=1).out)["findings"]
    assert any(f["check"] == 11 and f["table"] == "conclusion_signature" for f in found)
