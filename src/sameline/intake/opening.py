"""What kind of file it is, by its content and not by its name."""

from __future__ import annotations

from collections.abc import Sequence

from sameline.intake.headings import HeadingMap
from sameline.intake.rawfiles import RawFile
from sameline.intake.tables import Table, UnreadableError
from sameline.intake.texttables import text_tables


def open_tables(raw: RawFile, maps: Sequence[HeadingMap], sheets: Sequence[str], limit: int) -> list[list[Table]]:
    """The tables of a file, each in the ways in which it can be read.

    Args:
        raw: the file.
        maps: heading maps; their encodings are tried where text is not UTF-8.
        sheets: names of the sheets to read of a workbook; empty for all.
        limit: bytes that a file may have, unpacked too.

    Raises:
        UnreadableError: it cannot be read.
    """
    if raw.too_large or len(raw.data) > limit:
        raise UnreadableError(f"the file is larger than {limit / 1e6:g} MB", "split it into smaller files")
    if raw.data.startswith(b"PK"):
        return _sheets(raw, sheets, limit)
    encodings = tuple(dict.fromkeys(form.encoding for form in maps if form.encoding))
    return [[*text_tables(raw, encodings)]]


def _sheets(raw: RawFile, names: Sequence[str], limit: int) -> list[list[Table]]:
    from sameline.intake.workbooks import sheet_tables

    tables = sheet_tables(raw, limit)
    chosen: list[list[Table]] = [[table] for table in tables if not names or table.sheet in names]
    if not chosen:
        there = ", ".join(repr(table.sheet) for table in tables)
        raise UnreadableError(f"there is no sheet {' or '.join(map(repr, names))}", f"the sheets are: {there}")
    return chosen
