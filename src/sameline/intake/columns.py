"""What the columns of an unknown table are, from what stands in them and over them."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from sameline.intake.dates import DateReader
from sameline.intake.figures import Figure, read_figure
from sameline.intake.headings import MapColumn, fold
from sameline.intake.nearest import looks
from sameline.intake.units import is_unit
from sameline.intake.words import field_of
from sameline.records.drafts import Register

_MOSTLY = 0.6
_CODED = ("batch", "characteristic", "analyst", "instrument")
_UNIT = re.compile(
    r"^(?P<name>.*?)\s*(?:[\[(]\s*(?P<inside>[^\[\]()]+?)\s*[\])]"
    r"|\s(?:in|/)\s+(?P<behind>\S+(?: [A-D])?))\s*$"
)
_NUMBER = re.compile(r"^(?P<name>.*?)[\s_#.\-]*(?P<number>\d{1,3})$")
_REPLICATE_WORDS = frozenset(
    re.findall(r"\w+", "r x m n rep replicate specimen value reading test sample probe wert no nr result run piece")
) | {""}


@dataclass(frozen=True, slots=True)
class Column:
    """One column: its place (from 0), heading, cells that are not empty, and what it is taken for and why."""

    place: int
    heading: str
    samples: tuple[str, ...]
    proposed: MapColumn
    reason: str


class Known:
    """The register, arranged for asking what a column of texts holds.

    Args:
        register: what is registered.
    """

    def __init__(self, register: Register) -> None:
        self.register = register
        codes = (register.batches, register.characteristics, register.people, register.instruments)
        self._looks = {field: {looks(code) for code in some} for field, some in zip(_CODED, codes, strict=True)}
        self._dates = {order: DateReader("UTC", "9999", order) for order in (None, "dmy", "mdy")}

    def coded(self, cells: Sequence[str]) -> tuple[str, float]:
        """The field whose codes these cells mostly are, with the share of cells that are."""
        shares = {
            field: sum(looks(cell) in known for cell in cells) / len(cells) for field, known in self._looks.items()
        }
        best = max(shares, key=lambda field: shares[field])
        return best, shares[best]

    def dated(self, cells: Sequence[str]) -> float:
        """The share of cells that can be dates in some order."""
        return sum(any(reader.read(cell).utc for reader in self._dates.values()) for cell in cells) / len(cells)

    def characteristic(self, heading: str) -> str | None:
        """The characteristic whose code this heading is."""
        wanted = looks(heading)
        return next((code for code in self.register.characteristics if wanted and looks(code) == wanted), None)


def describe(headings: Sequence[str], rows: Sequence[Sequence[str]], known: Known) -> list[Column]:
    """What each column is taken for; each field but "value" is given to one column, the likeliest."""
    columns = [_describe(place, heading, rows, known) for place, heading in enumerate(headings)]
    taken: dict[str, tuple[float, int]] = {}
    for column, sure in columns:
        field = column.proposed.field
        if field not in ("value", "ignore") and (field not in taken or sure > taken[field][0]):
            taken[field] = (sure, column.place)
    chosen = [
        column if _is_first(column, taken) else _ignored(column, "another column is likelier for the same")
        for column, _ in columns
    ]
    return _replicates(_only_figures(chosen))


def _only_figures(columns: list[Column]) -> list[Column]:
    """Where no heading says which column holds the values: the one column of figures that is left."""
    if any(column.proposed.field == "value" for column in columns):
        return columns
    left = [column for column in columns if column.proposed.field == "ignore" and _are_figures(column.samples)]
    if len(left) != 1:
        return columns
    name, unit = _apart(left[0].heading)
    value = MapColumn(left[0].heading, "value", None, unit)
    found = Column(left[0].place, left[0].heading, left[0].samples, value, f"{name!r} is the only column of figures")
    return [found if column is left[0] else column for column in columns]


def _is_first(column: Column, taken: dict[str, tuple[float, int]]) -> bool:
    field = column.proposed.field
    return field in ("value", "ignore") or taken[field][1] == column.place


def _ignored(column: Column, reason: str) -> Column:
    return Column(column.place, column.heading, column.samples, MapColumn(column.heading, "ignore"), reason)


def _describe(place: int, heading: str, rows: Sequence[Sequence[str]], known: Known) -> tuple[Column, float]:
    cells = [row[place].strip() for row in rows if place < len(row) and row[place].strip()]
    proposed, reason, sure = _taken_for(heading, cells, known)
    return Column(place, heading, tuple(cells[:3]), proposed, reason), sure


def _taken_for(heading: str, cells: list[str], known: Known) -> tuple[MapColumn, str, float]:
    word = field_of(heading)
    if not cells:
        field = word if word in ("session", "note", "unit", "analyst", "instrument") else "ignore"
        return MapColumn(heading, field), "the column is empty", 0.1
    coded, share = known.coded(cells)
    if share >= _MOSTLY:
        sure = share + (coded == word)
        return MapColumn(heading, coded), f"{share:.0%} of its cells are registered as {coded}", sure
    value = _as_value(heading, cells, known)
    if value is not None and word not in ("replicate", "session", "batch", "time"):
        return value, _why_value(value), 1.0
    dated = known.dated(cells)
    if dated >= _MOSTLY and word != "time":
        return MapColumn(heading, "tested_at"), f"{dated:.0%} of its cells are dates", dated + (word == "tested_at")
    if word is not None and word != "value":
        return MapColumn(heading, word), f"headings like {heading.strip()!r} are used for it", 0.5
    return MapColumn(heading, "ignore"), "nothing says what it is", 0.0


def _as_value(heading: str, cells: list[str], known: Known) -> MapColumn | None:
    """The column as one of values, where its cells are mostly figures and its heading does not contradict."""
    if not _are_figures(cells):
        return None
    name, unit = _apart(heading)
    numbered = _NUMBER.match(name)
    for text in (name, numbered["name"] if numbered else None):
        code = None if text is None else known.characteristic(text)
        if code is not None:
            number = int(numbered["number"]) if numbered and text != name else None
            return MapColumn(heading, "value", code, unit, number or None)
    if field_of(name) == "value":
        return MapColumn(heading, "value", None, unit)
    if numbered and fold(numbered["name"]) in _REPLICATE_WORDS and int(numbered["number"]):
        return MapColumn(heading, "value", None, unit, int(numbered["number"]))
    return None


def _are_figures(cells: Sequence[str]) -> bool:
    """Whether most of these cells are figures."""
    return bool(cells) and sum(isinstance(read_figure(cell), Figure) for cell in cells) / len(cells) >= _MOSTLY


def _apart(heading: str) -> tuple[str, str | None]:
    """A heading's name and unit: "Tensile strength [MPa]", "TS (N/mm²)", "TS / MPa", "TS in MPa"."""
    found = _UNIT.match(heading.strip())
    if found is None:
        return heading.strip(), None
    unit = found["inside"] or found["behind"]
    if not is_unit(unit):
        return heading.strip(), None
    return found["name"], unit


def _why_value(column: MapColumn) -> str:
    parts = ["its cells are figures"]
    if column.characteristic:
        parts.append(f"its heading is the characteristic {column.characteristic}")
    if column.replicate:
        parts.append(f"its heading is numbered {column.replicate}")
    if column.unit:
        parts.append(f"its heading gives the unit {column.unit}")
    return ", ".join(parts)


def _replicates(columns: list[Column]) -> list[Column]:
    """Where a column gives the replicate, a number in a heading is none."""
    if not any(column.proposed.field == "replicate" for column in columns):
        return columns
    values = [column for column in columns if column.proposed.field == "value"]
    if len(values) > 1 and any(column.proposed.replicate for column in values):
        return [
            _ignored(column, "the replicates stand in columns") if column.proposed.field == "replicate" else column
            for column in columns
        ]
    return columns
