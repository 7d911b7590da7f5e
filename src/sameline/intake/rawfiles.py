"""A file's bytes, read once: what is hashed is what is parsed."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass, field
from pathlib import Path
from typing import BinaryIO

from sameline.errors import CallError
from sameline.records.drafts import SourceFile

SIZE_LIMIT = 200_000_000
"""Bytes that a file, and what is packed inside it, may have; a larger one is refused before it is read or unpacked."""


@dataclass(frozen=True, slots=True)
class RawFile:
    """A file in memory.

    Attributes:
        name: its name without folders.
        data: its bytes; of a file that is too large, none.
        too_large: whether it has more bytes than the limit.
    """

    name: str
    data: bytes = field(repr=False)
    too_large: bool = False

    def source(self) -> SourceFile:
        """Name, SHA-256 and size, for the ledger."""
        return SourceFile(self.name, hashlib.sha256(self.data).hexdigest(), len(self.data))


def load(path: Path | str, limit: int = SIZE_LIMIT) -> RawFile:
    """The file at this path, unless it is larger than `limit` bytes.

    Raises:
        CallError: there is no file that can be read.
    """
    path = Path(path)
    try:
        with path.open("rb") as stream:
            return load_stream(stream, path.name, limit)
    except FileNotFoundError as error:
        raise CallError("there is no such file", where=str(path), advice="check the name and the folder") from error
    except IsADirectoryError as error:
        raise CallError("this is a folder, not a file", where=str(path), advice="name the files in it") from error
    except (OSError, ValueError) as error:
        raise CallError(f"the file cannot be read: {error}", where=str(path)) from error


def load_stream(stream: BinaryIO, name: str = "standard input", limit: int = SIZE_LIMIT) -> RawFile:
    """What a stream holds, under this name, unless it is more than `limit` bytes."""
    data = stream.read(limit + 1)
    return RawFile(name, b"", too_large=True) if len(data) > limit else RawFile(name, data)
