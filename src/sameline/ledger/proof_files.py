"""Proofs as documents that travel: checked with no store, by anyone who has a checkpoint's key.

A row proof shows that one row, or one entry, is in the ledger that a checkpoint speaks of: the row's text, its path
in the tree of its table's rows in its entry, the entry's text, its path in the ledger's tree, and the checkpoint.
An extension proof shows that the ledger of a later checkpoint begins with that of an earlier one. Either is one
JSON document. Places and sizes are not stated a second time: a row's place follows from its id, an entry's from its
number, and the sizes from the entry's list of its rows and the checkpoint.
"""

from __future__ import annotations

import json
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

from sameline.ledger.canonical import read_json
from sameline.ledger.checkpoint import Checkpoint, parse_checkpoint
from sameline.ledger.errors import FormatError

ROW_FORM: Final = "Sameline row proof 1"
EXTENSION_FORM: Final = "Sameline extension proof 1"
MAX_BYTES: Final = 32 * 2**20
"""No proof is longer; what is longer is not read."""

_HASH: Final = re.compile(r"[0-9a-f]{64}")


@dataclass(frozen=True, slots=True)
class RowProof:
    """That a row, or an entry, is in the ledger.

    Attributes:
        entry: the canonical bytes of the entry's own row.
        entry_path: its path in the ledger's tree.
        checkpoint: the ledger it is shown to be in.
        row: the canonical bytes of the row; None in the proof of an entry alone.
        row_path: its path in the tree of the rows that the entry wrote to its table.
    """

    entry: bytes
    entry_path: tuple[bytes, ...]
    checkpoint: Checkpoint
    row: bytes | None = None
    row_path: tuple[bytes, ...] = ()

    def to_bytes(self) -> bytes:
        """The document."""
        document: dict[str, object] = {"form": ROW_FORM}
        if self.row is not None:
            document["row"] = {"text": self.row.decode(), "path": _hex(self.row_path)}
        document["entry"] = {"text": self.entry.decode(), "path": _hex(self.entry_path)}
        document["checkpoint"] = self.checkpoint.to_bytes().decode()
        return _document_bytes(document)


@dataclass(frozen=True, slots=True)
class ExtensionProof:
    """That the ledger of a later checkpoint begins with the ledger of an earlier one.

    Attributes:
        earlier, later: the two checkpoints.
        path: the consistency path between them.
    """

    earlier: Checkpoint
    later: Checkpoint
    path: tuple[bytes, ...]

    def to_bytes(self) -> bytes:
        """The document."""
        document: dict[str, object] = {
            "form": EXTENSION_FORM,
            "earlier": self.earlier.to_bytes().decode(),
            "later": self.later.to_bytes().decode(),
            "path": _hex(self.path),
        }
        return _document_bytes(document)


def parse_proof(data: bytes) -> RowProof | ExtensionProof:
    """Read a proof of either kind. Whether it holds, `sameline.ledger.proof_checks` tells.

    Raises:
        FormatError: not a proof; with the member that does not read as one.
    """
    if len(data) > MAX_BYTES:
        raise FormatError(f"too long for a proof: {len(data)} bytes")
    document = read_json(data)
    if isinstance(document, dict):
        if document.get("form") == ROW_FORM:
            return _row_proof(document)
        if document.get("form") == EXTENSION_FORM:
            return _extension_proof(document)
    raise FormatError(f"a proof is a JSON object whose form is {ROW_FORM!r} or {EXTENSION_FORM!r}")


def _row_proof(document: dict[str, object]) -> RowProof:
    _check_members(document, ["form", "entry", "checkpoint"], "the proof", optional="row")
    row, row_path = _leaf(document["row"], "row") if "row" in document else (None, ())
    entry, entry_path = _leaf(document["entry"], "entry")
    return RowProof(entry, entry_path, _checkpoint(document, "checkpoint"), row, row_path)


def _extension_proof(document: dict[str, object]) -> ExtensionProof:
    _check_members(document, ["form", "earlier", "later", "path"], "the proof")
    earlier, later = _checkpoint(document, "earlier"), _checkpoint(document, "later")
    return ExtensionProof(earlier, later, _path(document["path"], "path"))


def _leaf(part: object, name: str) -> tuple[bytes, tuple[bytes, ...]]:
    if not isinstance(part, dict):
        raise FormatError("not an object with a text and a path", where=name)
    _check_members(part, ["text", "path"], name)
    return _utf8(part["text"], f"{name}.text"), _path(part["path"], f"{name}.path")


def _check_members(part: dict[str, object], names: Sequence[str], where: str, *, optional: str = "") -> None:
    for name in names:
        if name not in part:
            raise FormatError(f"there is no member {name!r}", where=where)
    surplus = sorted(part.keys() - {*names, optional})
    if surplus:
        raise FormatError(f"there is no place for a member {surplus[0]!r}", where=where)


def _checkpoint(document: dict[str, object], name: str) -> Checkpoint:
    try:
        return parse_checkpoint(_utf8(document[name], name))
    except FormatError as error:
        raise FormatError(error.message, where=f"{name}, {error.where}" if error.where else name) from None


def _utf8(text: object, where: str) -> bytes:
    if not isinstance(text, str):
        raise FormatError("not a text", where=where)
    try:
        return text.encode()
    except UnicodeEncodeError:
        raise FormatError("not Unicode text", where=where) from None


def _path(hashes: object, where: str) -> tuple[bytes, ...]:
    if not isinstance(hashes, list):
        raise FormatError("not a list of hashes", where=where)
    for value in hashes:
        if not isinstance(value, str) or not _HASH.fullmatch(value):
            raise FormatError("a hash is 64 hexadecimal digits, in lowercase", where=where)
    return tuple(bytes.fromhex(value) for value in hashes)


def _hex(path: Sequence[bytes]) -> list[str]:
    return [value.hex() for value in path]


def _document_bytes(document: dict[str, object]) -> bytes:
    return (json.dumps(document, ensure_ascii=False, indent=2) + "\n").encode()
