import base64
import os
import stat
from pathlib import Path
from types import ModuleType

import pytest
from cryptography.hazmat.primitives.asymmetric import ec
from cryptography.hazmat.primitives.serialization import (
    BestAvailableEncryption,
    Encoding,
    NoEncryption,
    PrivateFormat,
    load_pem_private_key,
)
from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.ledger import signatures
from sameline.ledger.errors import FormatError, LedgerError, ProofError
from sameline.ledger.signatures import (
    SigningKey,
    key_id,
    make_key_file,
    parse_public,
    public_text,
    read_key_file,
    verify_signature,
)

# RFC 8032 section 7.1: secret key, public key, message, signature of TEST 1, TEST 2 and TEST 3.
VECTORS = [
    (
        "9d61b19deffd5a60ba844af492ec2cc44449c5697b326919703bac031cae7f60",
        "d75a980182b10ab7d54bfed3c964073a0ee172f3daa62325af021a68f707511a",
        "",
        (
            "e5564300c360ac729086e2cc806e828a84877f1eb8e5d974d873e065224901555"
            "fb8821590a33bacc61e39701cf9b46bd25bf5f0595bbe24655141438e7a100b"
        ),
    ),
    (
        "4ccd089b28ff96da9db6c346ec114e0f5b8a319f35aba624da8cf6ed4fb8a6fb",
        "3d4017c3e843895a92b70aa74d1b7ebc9c982ccf2ec4968cc0cd55f12af4660c",
        "72",
        (
            "92a009a9f0d4cab8720e820b5f642540a2b27b5416503f8fb3762223ebdb69da0"
            "85ac1e43e15996e458f3613d0f11d8c387b2eaeb4302aeeb00d291612bb0c00"
        ),
    ),
    (
        "c5aa8df43f9f837bedb7442f31dcb7b166d38535076f094b85ce3a2e0b4458f7",
        "fc51cd8e6218a1a38da47ed00230f0580816ed13ba3303ac5deb911548908025",
        "af82",
        (
            "6291d657deec24024827e69c3abe01a30ce548a284743a445e3680d7db5ac3ac1"
            "8ff9b538d16f290ae67f760984dc6594a7c15e9716ed28dc027beceea1ec40a"
        ),
    ),
]


@pytest.fixture
def quick(monkeypatch: pytest.MonkeyPatch):
    """Few rounds, where the strength is not what is tested."""
    monkeypatch.setattr(signatures, "ITERATIONS", 2)


def from_seed(seed: bytes, path: Path):
    given_bytes = iter([seed, b"salt" * 4, b"iv" * 8])
    return make_key_file(path, "open sesame", random_bytes=lambda size: next(given_bytes)[:size])


@pytest.mark.parametrize("vector", VECTORS)
def test_the_definition_gives_the_vectors_of_rfc_8032(ed25519: ModuleType, vector: tuple[str, ...]):
    secret, public, message, signature = vector
    assert ed25519.public_key(bytes.fromhex(secret)).hex() == public
    assert ed25519.sign(bytes.fromhex(secret), bytes.fromhex(message)).hex() == signature


@pytest.mark.usefixtures("quick")
@pytest.mark.parametrize("vector", VECTORS)
def test_keys_and_signatures_equal_the_definition(ed25519: ModuleType, tmp_path: Path, vector: tuple[str, ...]):
    secret, public, message, signature = vector
    key = from_seed(bytes.fromhex(secret), tmp_path / "key.pem")
    assert key.public.hex() == public
    assert key._private.sign(bytes.fromhex(message)).hex() == signature
    made = key.sign("checkpoint", bytes.fromhex(message))
    assert made == ed25519.sign(bytes.fromhex(secret), b"sameline 1 checkpoint\n" + bytes.fromhex(message))
    verify_signature(key.public, "checkpoint", bytes.fromhex(message), made)


def test_a_signature_holds_for_its_statement_purpose_and_key_only(signing_key: SigningKey, other_key: SigningKey):
    signature = signing_key.sign("checkpoint", b"statement")
    verify_signature(signing_key.public, "checkpoint", b"statement", signature)
    wrong = [
        (other_key.public, "checkpoint", b"statement", signature),
        (signing_key.public, "record", b"statement", signature),
        (signing_key.public, "checkpoint", b"statemenT", signature),
        (signing_key.public, "checkpoint", b"", signature),
        (signing_key.public, "checkpoint", b"statement", other_key.sign("checkpoint", b"statement")),
    ]
    for call in wrong:
        with pytest.raises(ProofError, match="signature is not by key"):
            verify_signature(*call)


def test_any_changed_bit_of_a_signature_is_found(signing_key: SigningKey):
    signature = signing_key.sign("checkpoint", b"statement")
    for bit in range(512):
        changed = bytearray(signature)
        changed[bit // 8] ^= 1 << bit % 8
        with pytest.raises(ProofError):
            verify_signature(signing_key.public, "checkpoint", b"statement", bytes(changed))
    for size in (0, 63, 65):
        with pytest.raises(FormatError, match="64 bytes"):
            verify_signature(signing_key.public, "checkpoint", b"statement", (signature + b"0")[:size])


def test_a_signature_has_no_second_spelling(signing_key: SigningKey, ed25519: ModuleType):
    # S + L signs as S does unless S is bounded (RFC 8032 section 5.1.7, step 1).
    signature = signing_key.sign("checkpoint", b"statement")
    s = int.from_bytes(signature[32:], "little") + ed25519.L
    with pytest.raises(ProofError):
        verify_signature(signing_key.public, "checkpoint", b"statement", signature[:32] + s.to_bytes(32, "little"))


@pytest.mark.parametrize("purpose", ["", "Checkpoint", "check\npoint", " checkpoint", "a  b", "é", "checkpoint\n"])
def test_a_purpose_is_in_lowercase_words(signing_key: SigningKey, purpose: str):
    with pytest.raises(LedgerError, match="lowercase words"):
        signing_key.sign(purpose, b"")


def test_a_public_key_is_base64_and_has_a_short_name(signing_key: SigningKey):
    text = public_text(signing_key.public)
    assert text == "11qYAYKxCrfVS/7TyWQHOg7hcvPapiMlrwIaaPcHURo="
    assert parse_public(text) == signing_key.public
    assert key_id(signing_key.public) == "21fe31dfa154a261"
    assert key_id(signing_key.public) in repr(signing_key)


NO_PUBLIC_KEYS = ["", "11qY", "é", "\ud800", "11qYAYKxCrfVS/7TyWQHOg7hcvPapiMlrwIaaPcHURo"]
NO_PUBLIC_KEYS += [f"11qYAYKxCrfVS{sign}7TyWQHOg7hcvPapiMlrwIaaPcHUR{end}=" for sign, end in ("_o", "/p", "//", " /")]
NO_PUBLIC_KEYS += [" 11qYAYKxCrfVS/7TyWQHOg7hcvPapiMlrwIaaPcHURo=", base64.b64encode(bytes(32)).decode()]


@pytest.mark.parametrize("text", NO_PUBLIC_KEYS, ids=range(len(NO_PUBLIC_KEYS)))
def test_what_is_no_public_key_is_refused(text: str):
    with pytest.raises(FormatError):
        parse_public(text)


def test_a_key_file_opens_with_its_passphrase_and_for_its_owner_only(tmp_path: Path):
    path = tmp_path / "key.pem"
    made = make_key_file(path, "Großer Wal")
    assert stat.S_IMODE(path.stat().st_mode) == 0o600
    assert read_key_file(path, "Großer Wal").public == made.public
    assert read_key_file(str(path), "Großer Wal").sign("x", b"1") == made.sign("x", b"1")
    # A common library reads the file too.
    assert load_pem_private_key(path.read_bytes(), "Großer Wal".encode()).public_key().public_bytes_raw() == made.public
    with pytest.raises(LedgerError, match="does not open"):
        read_key_file(path, "Grosser Wal")


@pytest.mark.usefixtures("quick")
def test_a_passphrase_is_the_same_however_its_accents_are_typed(tmp_path: Path):
    key = make_key_file(tmp_path / "key.pem", "caf\u00e9")
    assert read_key_file(tmp_path / "key.pem", "cafe\u0301").public == key.public


@pytest.mark.usefixtures("quick")
def test_two_keys_differ(tmp_path: Path):
    assert make_key_file(tmp_path / "a.pem", "x").public != make_key_file(tmp_path / "b.pem", "x").public


@pytest.mark.usefixtures("quick")
def test_no_file_is_overwritten_even_one_that_a_link_points_at(tmp_path: Path):
    path, link = tmp_path / "key.pem", tmp_path / "link.pem"
    path.write_bytes(b"kept")
    link.symlink_to(path)
    for name in (path, link):
        with pytest.raises(LedgerError, match="already"):
            make_key_file(name, "x")
    assert path.read_bytes() == b"kept"


@pytest.mark.usefixtures("quick")
def test_a_file_that_cannot_be_written_leaves_nothing_behind(tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    def full(_file: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(LedgerError, match="No space left"):
        make_key_file(tmp_path / "key.pem", "x")
    assert list(tmp_path.iterdir()) == []


@pytest.mark.usefixtures("quick")
def test_what_cannot_be_a_key_file_is_refused(tmp_path: Path):
    with pytest.raises(LedgerError, match="cannot be made"):
        make_key_file(tmp_path / "no folder" / "key.pem", "x")
    with pytest.raises(LedgerError, match="cannot be read"):
        read_key_file(tmp_path / "key.pem", "x")
    for call in (make_key_file, read_key_file):
        with pytest.raises(LedgerError, match="empty"):
            call(tmp_path / "key.pem", "")
        with pytest.raises(LedgerError, match="Unicode"):
            call(tmp_path / "key.pem", "\ud800")
    assert list(tmp_path.iterdir()) == []


def test_a_key_without_passphrase_or_of_another_kind_is_refused(tmp_path: Path, signing_key: SigningKey):
    path = tmp_path / "key.pem"
    path.write_bytes(signing_key._private.private_bytes(Encoding.PEM, PrivateFormat.PKCS8, NoEncryption()))
    with pytest.raises(FormatError, match="under a passphrase"):
        read_key_file(path, "x")
    other = ec.generate_private_key(ec.SECP256R1())
    path.write_bytes(other.private_bytes(Encoding.PEM, PrivateFormat.PKCS8, BestAvailableEncryption(b"x")))
    with pytest.raises(FormatError, match="not of Ed25519"):
        read_key_file(path, "x")


@settings(max_examples=150)
@given(data=st.data())
def test_a_damaged_key_file_gives_a_typed_refusal(tmp_path_factory: pytest.TempPathFactory, data: st.DataObject):
    path = tmp_path_factory.mktemp("keys") / "key.pem"
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(signatures, "ITERATIONS", 2)
        from_seed(b"s" * 32, path)
    content = bytearray(path.read_bytes())
    start = data.draw(st.integers(0, len(content) - 1))
    content[start : start + data.draw(st.integers(0, 4))] = data.draw(st.binary(max_size=4))
    path.write_bytes(content)
    try:
        key = read_key_file(path, "open sesame")
    except LedgerError:
        return
    verify_signature(key.public, "x", b"1", key.sign("x", b"1"))
