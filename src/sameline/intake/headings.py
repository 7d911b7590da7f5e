"""Which column of a file is which of our fields.

Our own headings are read without being told. Any other file needs a heading map: a value with a name, which a person
has confirmed once and the store keeps (`sameline.intake.proposals` proposes one on first sight).
"""

from __future__ import annotations

import json
import re
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import asdict, dataclass, replace
from typing import Any

from sameline.errors import CallError
from sameline.intake.dates import DateOrder
from sameline.intake.figures import DecimalSign
from sameline.records.moments import read_zone

KEY_FIELDS = ("batch", "characteristic", "tested_at", "analyst", "instrument", "session")
"""Rows that agree in these are one run."""

REQUIRED = ("batch", "characteristic", "tested_at", "value")
FIELDS = (*KEY_FIELDS, "time", "replicate", "value", "unit", "note", "ignore")
"""What a column can be: "time" is a clock time that belongs to a date in "tested_at"; "ignore" is not read."""

_PASSED_OVER = frozenset({"problem"})  # the column that a file to be mended carries
_WITH_UNIT = re.compile(r"(?P<name>.+?)\s*[\[(](?P<unit>[^\[\]()]+)[\])]\s*")
_REPLICATE = re.compile(r"(?:replicate|value)_?(\d{1,3})")


@dataclass(frozen=True, slots=True)
class MapColumn:
    """What one column of a file is.

    Attributes:
        heading: the heading as the file has it.
        field: one of `FIELDS`.
        characteristic: for a value column, the characteristic's code, where no column says it.
        unit: for a value column, the unit of its figures, where it is not the characteristic's.
        replicate: for a value column, its replicate's number; None where rows give it or count it.
    """

    heading: str
    field: str
    characteristic: str | None = None
    unit: str | None = None
    replicate: int | None = None


@dataclass(frozen=True, slots=True)
class HeadingMap:
    """How files of one kind are read, under a name that a person gave.

    Attributes:
        name: the map's name, for example "tensile rig".
        columns: what each column is, in the order of the file where headings are alike; those not to be read as
            "ignore" (a column of the file that is not named here at all is asked about).
        constants: fields that hold one value for the whole file, as (field, value).
        date_order: the order of day, month and year in dates that are not ISO 8601.
        decimal: the decimal sign; the other one may then group thousands.
        zone: IANA name of the zone of moments without one, where it is not the laboratory's.
        encoding: the character encoding of a text file that is not UTF-8, for example "cp1252".
        fill_down: fields whose empty cells repeat the cell above (merged cells).
        footers: first cells of rows that close the table ("Mean", "Total") and are left out.
        unit_row: whether the row below the headings holds the units of the columns of values.
    """

    name: str
    columns: tuple[MapColumn, ...]
    constants: tuple[tuple[str, str], ...] = ()
    date_order: DateOrder | None = None
    decimal: DecimalSign | None = None
    zone: str | None = None
    encoding: str | None = None
    fill_down: tuple[str, ...] = ()
    footers: tuple[str, ...] = ()
    unit_row: bool = False

    def fits(self, headings: Sequence[str]) -> bool:
        """Whether all columns of this map are among these headings."""
        return Counter(fold(column.heading) for column in self.columns) <= Counter(map(fold, headings))

    def unknown(self, headings: Sequence[str]) -> list[str]:
        """Headings that this map says nothing about."""
        left = Counter(fold(column.heading) for column in self.columns)
        unknown = []
        for heading in headings:
            left[fold(heading)] -= 1
            if heading.strip() and left[fold(heading)] < 0:
                unknown.append(heading)
        return unknown

    def to_json(self) -> str:
        """The map as JSON with sorted keys, for keeping."""
        return json.dumps(asdict(self), ensure_ascii=False, sort_keys=True)

    @classmethod
    def from_json(cls, text: str) -> HeadingMap:
        """The map that `to_json` wrote.

        Raises:
            CallError: the text is no map.
        """
        try:
            fields: dict[str, Any] = json.loads(text)
            fields["columns"] = tuple(MapColumn(**column) for column in fields["columns"])
            fields["constants"] = tuple((str(name), str(value)) for name, value in fields.get("constants", ()))
            for name in ("fill_down", "footers"):
                fields[name] = tuple(fields.get(name, ()))
            made = cls(**fields)
        except (ValueError, KeyError, TypeError, AttributeError) as error:
            raise CallError("this is not a heading map", advice="propose it again from a file") from error
        made.check()
        return made

    def check(self) -> None:
        """Refuse a map that cannot be meant.

        Raises:
            CallError: a field is unknown, given twice, or one that is needed is missing.
        """
        fields = [column.field for column in self.columns] + [name for name, _ in self.constants]
        for field in sorted(set(fields)):
            if field not in FIELDS:
                raise CallError(f"the map {self.name!r} names an unknown field {field!r}", advice=", ".join(FIELDS))
            if field not in ("value", "ignore") and fields.count(field) > 1:
                raise CallError(f"the map {self.name!r} says twice which column is {field!r}")
        if self.zone is not None:
            read_zone(self.zone)
        missing = self.missing()
        if missing:
            raise CallError(f"the map {self.name!r} does not say where to find: {', '.join(missing)}")
        for column in self.columns:
            if column.replicate is not None and column.replicate < 1:
                raise CallError(f"the map {self.name!r} has a replicate number below 1", where=column.heading)

    def missing(self) -> tuple[str, ...]:
        """Required fields that neither a column nor a constant gives."""
        given = {column.field for column in self.columns} | {name for name, _ in self.constants}
        values = [column for column in self.columns if column.field == "value"]
        if values and all(column.characteristic for column in values):
            given.add("characteristic")
        return tuple(field for field in REQUIRED if field not in given)


@dataclass(frozen=True, slots=True)
class ValueColumn:
    """A column of figures: its place (from 0), heading, and what the heading or the map says of it."""

    index: int
    heading: str
    characteristic: str | None = None
    unit: str | None = None
    replicate: int | None = None


@dataclass(frozen=True, slots=True)
class Layout:
    """A table's columns by our fields.

    Attributes:
        form: the map that says how the table is read (for our own headings, one without a name).
        row: the row of the headings.
        headings: the headings as they stand.
        fields: field -> place of its column (from 0); without the columns of values.
        values: the columns of values: one in long form, several in wide form.
    """

    form: HeadingMap
    row: int
    headings: tuple[str, ...]
    fields: Mapping[str, int]
    values: tuple[ValueColumn, ...]

    @property
    def last_above(self) -> int:
        """The last row above the results."""
        return self.row + self.form.unit_row

    def heading(self, field: str) -> str:
        """The heading of a field's column; the field's name where it has none."""
        place = self.fields.get(field)
        return field if place is None else self.headings[place]


def fold(heading: str) -> str:
    """The heading without case, outer blanks and byte order mark; inner blanks are one underscore."""
    return re.sub(r"[\s_\u00a0]+", "_", heading.replace("\ufeff", "").strip()).strip("_").casefold()


def trimmed(headings: Sequence[str]) -> list[str]:
    """The headings without empty ones at the end."""
    last = next((place for place in range(len(headings), 0, -1) if headings[place - 1].strip()), 0)
    return list(headings[:last])


def own_map(headings: Sequence[str]) -> HeadingMap:
    """The map of a file with our own headings: what is not ours is passed over (and reported by `strange`)."""
    columns = []
    for heading in headings:
        column = _own_column(heading)
        if column is not None:
            columns.append(column)
    return HeadingMap("", tuple(columns))


def _own_column(heading: str) -> MapColumn | None:
    folded, unit = fold(heading), None
    if (found := _WITH_UNIT.fullmatch(heading.strip())) and fold(found["name"]) not in FIELDS[:7]:
        folded, unit = fold(found["name"]), found["unit"].strip()
    if folded in FIELDS and folded not in ("ignore", "time") and (unit is None or folded == "value"):
        return MapColumn(heading, folded, unit=unit)
    if number := _REPLICATE.fullmatch(folded):
        return MapColumn(heading, "value", unit=unit, replicate=int(number[1]))
    return None


def strange(headings: Sequence[str]) -> list[str]:
    """Headings of a file with our own form that are none of ours."""
    return [name for name in headings if name.strip() and fold(name) not in _PASSED_OVER and _own_column(name) is None]


def layout_of(form: HeadingMap, row: int, headings: Sequence[str], units: Sequence[str] = ()) -> Layout:
    """The places of a map's columns among these headings; the map must fit them.

    Args:
        form: the map.
        row: the row of the headings.
        headings: the headings.
        units: the cells of the row below, where the map says that it holds the units.
    """
    places: dict[str, list[int]] = {}
    for place, heading in enumerate(headings):
        places.setdefault(fold(heading), []).append(place)
    fields: dict[str, int] = {}
    values = []
    for column in form.columns:
        place = places[fold(column.heading)].pop(0)
        if column.field == "value":
            unit = units[place].strip(" []()") if form.unit_row and place < len(units) else ""
            told = ValueColumn(place, headings[place], column.characteristic, column.unit, column.replicate)
            values.append(replace(told, unit=unit or column.unit))
        elif column.field != "ignore":
            fields[column.field] = place
    return Layout(form, row, tuple(headings), fields, tuple(sorted(values, key=lambda value: value.index)))
