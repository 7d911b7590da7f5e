"""How an entry commits to the rows it wrote: the text of its `rows` field.

For each table that the entry wrote to, the text lists the first row's id, how many rows there are, and the Merkle
root over `leaf_hash(row_bytes(...))` of the rows in the order of their ids. The text is canonical JSON.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

from sameline.ledger.canonical import MAX_INTEGER, canonical, parse_canonical
from sameline.ledger.errors import FormatError, LedgerError

_HASH: Final = re.compile(r"[0-9a-f]{64}")


@dataclass(frozen=True, slots=True)
class TableRows:
    """The rows that one entry wrote to one table.

    Attributes:
        table: the table's name.
        first: the first row's id; the others follow without a gap.
        count: how many rows, at least one.
        root: the Merkle root over them, 32 bytes.
    """

    table: str
    first: int
    count: int
    root: bytes


def manifest_text(parts: Sequence[TableRows]) -> str:
    """The `rows` field of an entry.

    Raises:
        LedgerError: a table named twice, or a first id, count or root that cannot be meant.
    """
    items = [{"table": p.table, "first": p.first, "count": p.count, "root": p.root.hex()} for p in parts]
    text = canonical(items).decode()
    try:
        parse_manifest(text)
    except FormatError as error:
        raise LedgerError(error.message) from None
    return text


def parse_manifest(text: str) -> list[TableRows]:
    """Read an entry's `rows` field.

    Raises:
        FormatError: not such a text.
    """
    try:
        items = parse_canonical(text.encode())
    except UnicodeEncodeError:
        raise FormatError("an entry's list of its rows is not Unicode text") from None
    if not isinstance(items, list):
        raise FormatError("an entry's list of its rows is not a list")
    parts = [_part(item) for item in items]
    if len({part.table for part in parts}) != len(parts):
        raise FormatError("an entry's list of its rows names a table twice")
    return parts


def _part(item: object) -> TableRows:
    match item:
        case {"table": str(table), "first": int(first), "count": int(count), "root": str(root), **rest} if not rest:
            whole = type(first) is int and type(count) is int and first + count <= MAX_INTEGER
            if table and whole and first >= 0 and count >= 1 and _HASH.fullmatch(root):
                return TableRows(table, first, count, bytes.fromhex(root))
    raise FormatError("an entry's list of its rows states each table, first id, count and root, and nothing else")
