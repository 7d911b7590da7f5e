"""Entry forms that Sameline wrote: a hidden sheet says how they are read, so that they need no map of their own."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from itertools import islice

from sameline.errors import CallError
from sameline.intake.headings import HeadingMap, MapColumn
from sameline.intake.rawfiles import RawFile
from sameline.intake.tables import UnreadableError

TAG_SHEET = "Sameline"
TAG = "entry form, schema 1"
TAG_LIMIT = 32_000
"""Characters that a cell of a workbook holds, with some to spare."""
OWN_FIELDS = ("batch", "tested_at", "analyst", "instrument", "session")
"""The columns before those of values, by field."""
_FORM_SIZE = 2_000_000  # a larger workbook is none of our forms, and is not opened twice


def form_map(characteristics: Sequence[tuple[str, str]], replicates: int) -> HeadingMap:
    """How a form is read: a row is one occasion of one batch, with the replicates of each characteristic side by side.

    Args:
        characteristics: code and unit of each.
        replicates: how many columns each has.
    """
    values = [
        MapColumn(f"{code} {number} [{unit}]", "value", code, unit, number)
        for code, unit in characteristics
        for number in range(1, replicates + 1)
    ]
    return HeadingMap(
        "entry form", (*(MapColumn(field, field) for field in OWN_FIELDS), *values, MapColumn("note", "note"))
    )


def with_forms(maps: Sequence[HeadingMap], raws: Iterable[RawFile]) -> tuple[HeadingMap, ...]:
    """These maps, and those of the entry forms among the files."""
    own = (found for raw in raws if (found := tagged_map(raw)) is not None)
    return tuple(dict.fromkeys((*maps, *own)))


def tagged_map(raw: RawFile) -> HeadingMap | None:
    """How an entry form says that it is read; None of any other file."""
    from sameline.intake.workbooks import sheet_tables

    if not raw.data.startswith(b"PK") or len(raw.data) > _FORM_SIZE:
        return None
    try:
        tag = next((sheet for sheet in sheet_tables(raw, _FORM_SIZE * 10) if sheet.sheet == TAG_SHEET), None)
        cells = [] if tag is None else [cell for _, row in islice(tag.rows(), 1) for cell in row]
        return HeadingMap.from_json(cells[1]) if cells[:1] == [TAG] and len(cells) > 1 else None
    except (UnreadableError, CallError):  # what is wrong with the file is said where it is read
        return None
