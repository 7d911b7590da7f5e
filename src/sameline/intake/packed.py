"""Workbooks are packed files: how large they really are is known before they are unpacked into memory."""

from __future__ import annotations

import io
import zipfile
import zlib

from sameline.intake.tables import UnreadableError

MOST_MEMBERS = 5_000
_STEP = 1 << 16
_DAMAGED = "open it in a spreadsheet program and save it again"


class Packed:
    """A packed file whose contents are no larger than they say, and together no larger than a limit.

    Args:
        data: the packed file.
        limit: bytes that all its members may have together, unpacked.

    Raises:
        UnreadableError: it is damaged, protected, larger than the limit, or lies about its size.
    """

    def __init__(self, data: bytes, limit: int) -> None:
        self._data = data
        try:  # zipfile says NotImplementedError of a way of packing that it does not know
            self._archive = zipfile.ZipFile(io.BytesIO(data))
            members = self._archive.infolist()
        except (zipfile.BadZipFile, ValueError, OSError, NotImplementedError, OverflowError) as error:
            raise UnreadableError("the workbook is damaged", _DAMAGED) from error
        if len(members) > MOST_MEMBERS or sum(member.file_size for member in members) > limit:
            raise UnreadableError(
                f"unpacked the workbook is larger than {limit / 1e6:g} MB", "split it into smaller files"
            )
        self.names = frozenset(member.filename for member in members)
        if len(self.names) < len(members):
            raise UnreadableError("the workbook is damaged: it has two parts of one name", _DAMAGED)
        for member in members:
            self._check(member)

    def _check(self, member: zipfile.ZipInfo) -> None:
        if member.flag_bits & 1:
            raise UnreadableError("the workbook is protected by a password", "save it without one")
        if member.compress_type not in (zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED):
            raise UnreadableError("the workbook is packed in an unusual way", _DAMAGED)
        if self._size(member) != member.file_size:
            raise UnreadableError("the workbook is damaged: a part has another size than it says", _DAMAGED)

    def _size(self, member: zipfile.ZipInfo) -> int:
        """The true size of a member, counted piece by piece; counting stops where it exceeds what the member says."""
        header = self._data[member.header_offset : member.header_offset + 30]
        if len(header) < 30 or not header.startswith(b"PK\x03\x04"):
            return -1
        start = (
            member.header_offset
            + 30
            + int.from_bytes(header[26:28], "little")
            + int.from_bytes(header[28:30], "little")
        )
        packed = memoryview(self._data)[start : start + member.compress_size]
        if member.compress_type == zipfile.ZIP_STORED:
            return len(packed)
        return _inflated(packed, member.file_size)

    def read(self, name: str) -> bytes:
        """A member's content.

        Raises:
            UnreadableError: there is none of this name, or it is damaged.
        """
        try:  # here too NotImplementedError is zipfile's word for an unknown way of packing
            return self._archive.read(name)
        except (KeyError, zipfile.BadZipFile, zlib.error, EOFError, OSError, ValueError, NotImplementedError) as error:
            raise UnreadableError("the workbook is damaged", _DAMAGED) from error


def _inflated(packed: memoryview, most: int) -> int:
    """Bytes that a deflated stream unpacks to; at most one step more than `most`; -1 when it is damaged."""
    stream, size, place = zlib.decompressobj(-zlib.MAX_WBITS), 0, 0
    piece: bytes | memoryview = b""
    try:
        while not stream.eof and size <= most:
            if not piece:
                piece = packed[place : place + _STEP]
                place += len(piece)
                if not piece:
                    return -1
            size += len(stream.decompress(piece, _STEP))
            piece = stream.unconsumed_tail
    except zlib.error:
        return -1
    return size
