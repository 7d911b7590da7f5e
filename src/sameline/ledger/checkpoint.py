"""A checkpoint: the signed statement of a ledger's size and root hash at a time.

It is a small text file that can be mailed, printed or posted. Whoever keeps one can later have it proven that the
ledger still begins with those entries. Its form, one `name: value` a line, in this order, in UTF-8:

    Sameline checkpoint 1
    laboratory: Northbank Materials Laboratory
    entries: 1234
    root: 5dc9da79a70659a9ad559cb701ded9a2ab9d823aad2f4960cfe370eff4604328
    time: 2026-03-02T14:05:09Z
    signer: M. Okafor
    key: 11qYAYKxCrfVS/7TyWQHOg7hcvPapiMlrwIaaPcHURo=
    signature: (base64 of 64 bytes)

The signature (Ed25519, purpose "checkpoint") is on the bytes of the lines above it, line feeds included. The key is
there so that the file can be checked by itself; that it is the signer's, the reader must know from elsewhere.
"""

from __future__ import annotations

import base64
import re
import unicodedata
from collections.abc import Callable, Collection
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from typing import Final, TypeVar

from sameline.ledger.errors import FormatError, LedgerError, ProofError
from sameline.ledger.merkle import EMPTY_ROOT, HASH_SIZE
from sameline.ledger.signatures import (
    SIGNATURE_SIZE,
    SigningKey,
    key_id,
    parse_base64,
    parse_public,
    public_text,
    verify_signature,
)

HEADING: Final = "Sameline checkpoint 1"
PURPOSE: Final = "checkpoint"
MAX_BYTES: Final = 4096
"""No checkpoint is longer; what is longer is not read."""

_NAMES: Final = ("laboratory", "entries", "root", "time", "signer", "key", "signature")
_NAME_LENGTH: Final = 200
_ENTRIES: Final = re.compile(r"0|[1-9][0-9]{0,15}")
_ROOT: Final = re.compile(r"[0-9a-f]{64}")
_T = TypeVar("_T")
_TIME: Final = "%Y-%m-%dT%H:%M:%SZ"


@dataclass(frozen=True, slots=True)
class Checkpoint:
    """A signed statement of a ledger's size and root.

    Attributes:
        laboratory: whose ledger it is.
        entries: how many entries the ledger had.
        root: the Merkle root over them, 32 bytes.
        time: when it was signed: UTC, whole seconds.
        signer: the person who signed.
        key: the public key that the signature is by, 32 bytes.
        signature: its 64 bytes; empty in a checkpoint still to be signed.
    """

    laboratory: str
    entries: int
    root: bytes
    time: datetime
    signer: str
    key: bytes
    signature: bytes = b""

    def statement(self) -> bytes:
        """What is signed: every line but the last."""
        lines = [
            HEADING,
            f"laboratory: {self.laboratory}",
            f"entries: {self.entries}",
            f"root: {self.root.hex()}",
            f"time: {self.time.strftime(_TIME)}",
            f"signer: {self.signer}",
            f"key: {public_text(self.key)}",
        ]
        return "".join(line + "\n" for line in lines).encode()

    def to_bytes(self) -> bytes:
        """The file's content."""
        return self.statement() + b"signature: " + base64.b64encode(self.signature) + b"\n"


def sign_checkpoint(
    signing_key: SigningKey, *, laboratory: str, entries: int, root: bytes, time: datetime, signer: str
) -> Checkpoint:
    """Make and sign a checkpoint.

    Args:
        signing_key: the signer's private key.
        laboratory: whose ledger it is.
        entries: how many entries it has.
        root: the Merkle root over them, 32 bytes.
        time: the moment, with its time zone; stated in UTC, without fractions of a second.
        signer: the person's name.

    Raises:
        LedgerError: a name that is not one line of text, a time without zone, or a size or root that cannot be meant.
    """
    if time.tzinfo is None:
        raise LedgerError("a checkpoint's time needs its time zone")
    if not 0 <= entries < 10**16:
        raise LedgerError(f"a ledger cannot have {entries} entries")
    if len(root) != HASH_SIZE or (root == EMPTY_ROOT) != (entries == 0):
        raise LedgerError(f"a ledger of {entries} entries cannot have the root {root.hex()}")
    moment = time.astimezone(UTC).replace(microsecond=0)
    plain = Checkpoint(_laboratory(laboratory), entries, root, moment, _signer(signer), signing_key.public)
    return replace(plain, signature=signing_key.sign(PURPOSE, plain.statement()))


def parse_checkpoint(data: bytes) -> Checkpoint:
    """Read a checkpoint. Whether its signature holds, `verify_checkpoint` tells.

    Line ends as Windows or a mail program makes them, and blank lines after the last, are taken as they are;
    everything else must be as `Checkpoint.to_bytes` writes it.

    Raises:
        FormatError: not a checkpoint; with the line that does not read as one.
    """
    if len(data) > MAX_BYTES:
        raise FormatError(f"too long for a checkpoint: {len(data)} bytes")
    try:
        text = data.decode()
    except UnicodeDecodeError:
        raise FormatError("a checkpoint is in UTF-8, and this is not") from None
    lines = text.replace("\r\n", "\n").rstrip("\n").split("\n")
    if lines[0] != HEADING:
        raise FormatError(f"a checkpoint begins with {HEADING!r}", where="line 1")
    laboratory, entries, root, time, signer, key, signature = _values(lines[1:])
    size = _read(_entries, entries, 3)
    checkpoint = Checkpoint(
        laboratory=_read(_laboratory, laboratory, 2),
        entries=size,
        root=_read(_root, root, 4),
        time=_read(_time, time, 5),
        signer=_read(_signer, signer, 6),
        key=_read(parse_public, key, 7),
        signature=_read(_signature, signature, 8),
    )
    if (checkpoint.root == EMPTY_ROOT) != (size == 0):
        raise FormatError(f"a ledger of {size} entries cannot have this root", where="line 4")
    return checkpoint


def verify_checkpoint(checkpoint: Checkpoint, keys: Collection[bytes] | None = None) -> None:
    """Check a checkpoint's signature, and that its key is one of those known to be the signer's.

    Args:
        checkpoint: as made or read.
        keys: the public keys that are accepted; None accepts the key in the file, which then shows only that
            the file is as its signer left it.

    Raises:
        ProofError: the signature does not hold, or is by another key.
    """
    if keys is not None and checkpoint.key not in keys:
        known = ", ".join(sorted(key_id(key) for key in keys)) or "none"
        raise ProofError("signed with a key that is not known", got=key_id(checkpoint.key), want=f"one of {known}")
    verify_signature(checkpoint.key, PURPOSE, checkpoint.statement(), checkpoint.signature)


def _values(lines: list[str]) -> list[str]:
    values = []
    for number, name in enumerate(_NAMES, 2):
        line = lines[number - 2] if number - 2 < len(lines) else ""
        if not line.startswith(name + ": "):
            raise FormatError(f"here stands the checkpoint's {name}, as '{name}: ...'", where=f"line {number}")
        values.append(line[len(name) + 2 :])
    if len(lines) > len(_NAMES):
        raise FormatError("nothing stands below a checkpoint's signature", where=f"line {len(_NAMES) + 2}")
    return values


def _read(reader: Callable[[str], _T], text: str, line: int) -> _T:
    try:
        return reader(text)
    except FormatError as error:
        raise FormatError(error.message, where=f"line {line}") from None


def _laboratory(text: str) -> str:
    return _one_line(text, "laboratory")


def _signer(text: str) -> str:
    return _one_line(text, "signer")


def _one_line(text: str, what: str) -> str:
    if not 0 < len(text) <= _NAME_LENGTH or text != text.strip():
        raise FormatError(f"the {what} is 1 to {_NAME_LENGTH} characters, without a space at either end")
    if any(unicodedata.category(character) in {"Cc", "Cs", "Zl", "Zp"} for character in text):
        raise FormatError(f"the {what} is one line of text, without control characters")
    return text


def _entries(text: str) -> int:
    if not _ENTRIES.fullmatch(text):
        raise FormatError("the number of entries is written in digits")
    return int(text)


def _root(text: str) -> bytes:
    if not _ROOT.fullmatch(text):
        raise FormatError("the root is 64 hexadecimal digits, in lowercase")
    return bytes.fromhex(text)


def _time(text: str) -> datetime:
    try:
        time = datetime.strptime(text, _TIME).replace(tzinfo=UTC)
    except ValueError:
        time = None
    if time is None or time.strftime(_TIME) != text:
        raise FormatError("the time is in UTC, as 2026-03-02T14:05:09Z")
    return time


def _signature(text: str) -> bytes:
    signature = parse_base64(text, "signature")
    if len(signature) != SIGNATURE_SIZE:
        raise FormatError(f"a signature has {SIGNATURE_SIZE} bytes, not {len(signature)}")
    return signature
