"""What kind of file it is, by its content and not by its name."""

from __future__ import annotations

from collections.abc import Sequence

from sameline.intake.headings import HeadingMap
from sameline.intake.rawfiles import RawFile
from sameline.intake.tables import Table, UnreadableError
from sameline.intake.texttables import text_tables


def open_tables(raw: RawFile, maps: Sequence[HeadingMap], limit: int) -> list[list[Table]]:
    """The tables of a file, each in the ways in which it can be read.

    Args:
        raw: the file.
        maps: heading maps; their encodings are tried where text is not UTF-8.
        limit: bytes that a file may have, unpacked too.

    Raises:
        UnreadableError: it cannot be read.
    """
    if raw.too_large or len(raw.data) > limit:
        raise UnreadableError(f"the file is larger than {limit / 1e6:g} MB", "split it into smaller files")
    encodings = tuple(dict.fromkeys(form.encoding for form in maps if form.encoding))
    return [[*text_tables(raw, encodings)]]
