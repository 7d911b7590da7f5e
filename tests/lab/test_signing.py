"""Keys of persons, and checkpoints that they sign."""

from __future__ import annotations

from dataclasses import replace

import pytest

from laboratory import run, signing_key
from sameline.errors import CallError, SamelineError
from sameline.lab import Lab
from sameline.ledger.checkpoint import parse_checkpoint, verify_checkpoint
from sameline.ledger.signatures import key_id
from sameline.records.signing import read_checkpoints, read_keys


@pytest.fixture
def keyed(lab: Lab) -> Lab:
    lab.register_key("ana", signing_key(1).public)
    lab.register_key("ben", signing_key(2).public)
    return lab


def test_keys_as_registered_and_revoked(keyed: Lab):
    before = keyed.trail()[-1].number
    revoked = keyed.revoke_key(key_id(signing_key(2).public), reason="retired").entry
    with keyed.reading() as reading:
        assert [(k.person, k.revoked) for k in read_keys(reading)] == [("ana", None), ("ben", revoked)]
        assert [k.name for k in read_keys(reading, "ben")] == [key_id(signing_key(2).public)]
    with keyed.reading(before) as then:
        assert [k.revoked for k in read_keys(then)] == [None, None]
    with keyed.reading(before - 1) as then:
        assert [k.person for k in read_keys(then)] == ["ana"]


def test_keys_that_are_refused(keyed: Lab):
    before = keyed.trail()
    with pytest.raises(CallError, match="registered already, as ana's"):
        keyed.register_key("ben", signing_key(1).public)
    with pytest.raises(CallError, match="no person"):
        keyed.register_key("eve", signing_key(3).public)
    with pytest.raises(SamelineError):
        keyed.register_key("ana", bytes(32))
    with pytest.raises(CallError, match="no key is registered"):
        keyed.revoke_key("0123456789abcdef", reason="x")
    assert keyed.trail() == before


def test_a_checkpoint_is_signed_recorded_and_read_back(keyed: Lab):
    expected = keyed.verify().ledger
    made = keyed.checkpoint(signing_key(1))
    assert (made.entries, made.root.hex()) == (expected.entries, expected.root)
    verify_checkpoint(parse_checkpoint(made.to_bytes()), [signing_key(1).public])
    with keyed.reading() as reading:
        assert read_checkpoints(reading) == [made]
    keyed.record([run("B1", 1, "70.1")])
    assert keyed.verify(checkpoints=[made]).findings == ()
    (finding,) = keyed.verify(checkpoints=[replace(made, root=bytes(32))]).findings[:1]
    assert finding.check == 10


def test_who_may_not_sign(keyed: Lab):
    before = keyed.trail()
    with pytest.raises(CallError, match="is ben's, and ana is acting"):
        keyed.checkpoint(signing_key(2))
    with pytest.raises(CallError, match="not registered"):
        keyed.checkpoint(signing_key(3))
    assert keyed.trail() == before
    keyed.revoke_key(key_id(signing_key(1).public), reason="lost")
    with pytest.raises(CallError, match="was revoked"):
        keyed.checkpoint(signing_key(1))
    with pytest.raises(CallError, match="revoked already"):
        keyed.revoke_key(key_id(signing_key(1).public), reason="lost")
