from dataclasses import fields, replace
from datetime import UTC, datetime, timedelta, timezone

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.ledger.checkpoint import Checkpoint, parse_checkpoint, sign_checkpoint, verify_checkpoint
from sameline.ledger.errors import FormatError, LedgerError, ProofError
from sameline.ledger.merkle import EMPTY_ROOT
from sameline.ledger.signatures import SigningKey

ROOT = bytes.fromhex("5dc9da79a70659a9ad559cb701ded9a2ab9d823aad2f4960cfe370eff4604328")
MOMENT = datetime(2026, 3, 2, 14, 5, 9, tzinfo=UTC)
TEXT = """\
Sameline checkpoint 1
laboratory: Northbank Materials Laboratory
entries: 1234
root: 5dc9da79a70659a9ad559cb701ded9a2ab9d823aad2f4960cfe370eff4604328
time: 2026-03-02T14:05:09Z
signer: M. Okafor
key: 11qYAYKxCrfVS/7TyWQHOg7hcvPapiMlrwIaaPcHURo=
"""


def made(key: SigningKey, **changes: object):
    given_fields = {"laboratory": "Northbank Materials Laboratory", "entries": 1234, "root": ROOT, "time": MOMENT}
    return sign_checkpoint(key, **{**given_fields, "signer": "M. Okafor", **changes})


def test_a_checkpoint_reads_as_documented_and_comes_back_the_same(signing_key: SigningKey):
    checkpoint = made(signing_key)
    head, signature = checkpoint.to_bytes().decode().split("signature: ")
    assert head == TEXT
    assert len(signature) == 89
    assert parse_checkpoint(checkpoint.to_bytes()) == checkpoint
    verify_checkpoint(checkpoint)
    verify_checkpoint(checkpoint, [signing_key.public])


def test_a_checkpoint_of_an_empty_ledger(signing_key: SigningKey):
    checkpoint = made(signing_key, entries=0, root=EMPTY_ROOT)
    assert parse_checkpoint(checkpoint.to_bytes()) == checkpoint


def test_the_time_is_stated_in_utc_and_whole_seconds(signing_key: SigningKey):
    there = datetime(2026, 3, 2, 23, 5, 9, 999_999, tzinfo=timezone(timedelta(hours=9)))
    assert made(signing_key, time=there) == made(signing_key)
    with pytest.raises(LedgerError, match="zone"):
        made(signing_key, time=datetime(2026, 3, 2, 14, 5, 9))  # noqa: DTZ001 - refused for want of a zone


def test_every_field_is_under_the_signature(signing_key: SigningKey, other_key: SigningKey):
    checkpoint = made(signing_key)
    other = {
        "laboratory": "Northbank Materials Laboratories",
        "entries": 1235,
        "root": ROOT[::-1],
        "time": MOMENT + timedelta(seconds=1),
        "signer": "M. Okafor Jr.",
        "key": other_key.public,
        "signature": made(other_key).signature,
    }
    assert set(other) == {field.name for field in fields(Checkpoint)}
    for name, value in other.items():
        with pytest.raises(ProofError, match="signature is not by key"):
            verify_checkpoint(replace(checkpoint, **{name: value}))


def test_a_key_that_is_not_known_is_not_accepted(signing_key: SigningKey, other_key: SigningKey):
    verify_checkpoint(made(signing_key), [other_key.public, signing_key.public])
    with pytest.raises(ProofError, match="not known") as caught:
        verify_checkpoint(made(signing_key), [other_key.public])
    assert caught.value.got == "21fe31dfa154a261"
    with pytest.raises(ProofError, match="one of none"):
        verify_checkpoint(made(signing_key), [])


def test_line_ends_of_mail_programs_are_taken(signing_key: SigningKey):
    checkpoint = made(signing_key)
    text = checkpoint.to_bytes()
    for variant in (text.replace(b"\n", b"\r\n"), text[:-1], text + b"\r\n\n", text + b"\n"):
        assert parse_checkpoint(variant) == checkpoint


@pytest.mark.parametrize("name", ["", " x", "x ", "a\nb", "a\rb", "a\u2028b", "x" * 201, "a\tb", "a\x00b", "a\ud800"])
def test_a_name_is_one_line(signing_key: SigningKey, name: str):
    with pytest.raises(LedgerError, match=r"characters|one line"):
        made(signing_key, signer=name)
    with pytest.raises(LedgerError, match=r"characters|one line"):
        made(signing_key, laboratory=name)


@pytest.mark.parametrize(("entries", "root"), [(0, ROOT), (3, EMPTY_ROOT), (-1, ROOT), (10**16, ROOT), (3, ROOT[:31])])
def test_a_size_and_root_that_cannot_be_are_refused(signing_key: SigningKey, entries: int, root: bytes):
    with pytest.raises(LedgerError, match="cannot have"):
        made(signing_key, entries=entries, root=root)


@pytest.mark.parametrize(
    ("old", "new", "where"),
    [
        ("Sameline checkpoint 1", "Sameline checkpoint 2", "line 1"),
        ("Sameline checkpoint 1", "\ufeffSameline checkpoint 1", "line 1"),
        ("laboratory: ", "Laboratory: ", "line 2"),
        ("laboratory: ", "laboratory:", "line 2"),
        ("laboratory: N", "laboratory:  N", "line 2"),
        ("laboratory: Northbank Materials Laboratory\n", "", "line 2"),
        ("entries: 1234", "entries: 01234", "line 3"),
        ("entries: 1234", "entries: +1234", "line 3"),
        ("entries: 1234", "entries: ١٢٣٤", "line 3"),
        ("entries: 1234", "entries: 12345678901234567", "line 3"),
        ("entries: 1234", "entries: 0", "line 4"),
        ("root: 5dc9", "root: 5DC9", "line 4"),
        ("root: 5dc9", "root: dc9", "line 4"),
        ("T14:05:09Z", "T14:05:09.5Z", "line 5"),
        ("T14:05:09Z", " 14:05:09Z", "line 5"),
        ("T14:05:09Z", "T14:05:09+00:00", "line 5"),
        ("T14:05:09Z", "T24:05:09Z", "line 5"),
        ("2026-03-02", "2026-02-30", "line 5"),
        ("2026-03-02", "2026-3-2", "line 5"),
        ("2026-03-02", "0026-03-02", "line 5"),
        ("signer: M", "signer: \x1b[2JM", "line 6"),
        ("key: 11", "key: 1", "line 7"),
        ("\nkey: ", "\nkey: \n", "line 8"),
        ("signature: ", "signature: A", "line 8"),
        ("signature: ", "signature: \n", "line 9"),
        ("signature: ", "", "line 8"),
    ],
)
def test_what_reads_otherwise_is_refused_with_its_line(signing_key: SigningKey, old: str, new: str, where: str):
    text = made(signing_key).to_bytes().decode()
    assert old in text
    with pytest.raises(FormatError) as caught:
        parse_checkpoint(text.replace(old, new).encode())
    assert caught.value.where == where


@pytest.mark.parametrize("data", [b"", b"\n", b"\xff", b"\xfe\xff\x00S", TEXT.encode(), b"x" * 5000])
def test_what_is_no_checkpoint_is_refused(data: bytes):
    with pytest.raises(FormatError):
        parse_checkpoint(data)


@settings(max_examples=500)
@given(data=st.data())
def test_a_changed_file_is_refused_or_does_not_hold_or_says_the_same(data: st.DataObject, signing_key: SigningKey):
    checkpoint = made(signing_key)
    content = bytearray(checkpoint.to_bytes())
    for _ in range(data.draw(st.integers(1, 3))):
        start = data.draw(st.integers(0, len(content)))
        content[start : start + data.draw(st.integers(0, 5))] = data.draw(
            st.binary(max_size=5) | st.sampled_from([b"\n", b"\r\n", b": ", b"0", b"=", "é".encode()])
        )
    try:
        read = parse_checkpoint(bytes(content))
        verify_checkpoint(read, [signing_key.public])
    except (FormatError, ProofError):
        return
    assert read == checkpoint


names = st.text(st.characters(exclude_categories=("Cc", "Cs", "Zl", "Zp")), min_size=1, max_size=200).filter(
    lambda text: text == text.strip()
)


@settings(max_examples=50)
@given(names, names, st.integers(1, 10**16 - 1), st.datetimes(min_value=datetime(1000, 1, 1), timezones=st.just(UTC)))  # noqa: DTZ001 - hypothesis wants its bounds without a zone
def test_any_checkpoint_comes_back_the_same(
    signing_key: SigningKey, laboratory: str, signer: str, entries: int, time: datetime
):
    checkpoint = made(signing_key, laboratory=laboratory, signer=signer, entries=entries, time=time)
    assert parse_checkpoint(checkpoint.to_bytes()) == checkpoint
    verify_checkpoint(parse_checkpoint(checkpoint.to_bytes()))
