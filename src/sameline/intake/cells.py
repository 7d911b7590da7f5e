"""Value cells of one characteristic: read, converted, compared with what was recorded; each distinct text once."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from math import inf, isfinite

from sameline.errors import CallError
from sameline.intake.decimals import DecimalEvidence
from sameline.intake.far import Far
from sameline.intake.figures import PLAIN, Figure, NoFigure, read_figure
from sameline.intake.headings import ValueColumn
from sameline.records.drafts import CharacteristicFacts, DraftMeasurement

TABLES = 24
"""Replicates up to this number are cached by their text."""
_LARGEST = 50_000  # texts a replicate's table may hold; a characteristic with more does not repeat itself

Table = dict[str, DraftMeasurement]


@dataclass(frozen=True, slots=True)
class Reading:
    """A value cell as read; `doubt` is a question about it: the problem and the suggestion."""

    text: str
    value: float
    qualifier: str | None
    unit: str | None
    doubt: tuple[str, str | None] | None = None
    certain: bool = True


class Cells:
    """Reads the value cells of one characteristic in one table.

    Args:
        facts: the characteristic, or None when it is not registered (figures are then only checked for being figures).
        evidence: what the table has shown of its decimal sign.
    """

    def __init__(self, facts: CharacteristicFacts | None, evidence: DecimalEvidence) -> None:
        self.facts = facts
        self._evidence = evidence
        self._far = Far(facts)
        self._tables: dict[str | None, list[Table]] = {}

    def tables(self, column: ValueColumn) -> list[Table]:
        """For each replicate number (from 1) what its texts were read as, for figures in this column's unit."""
        tables = self._tables.get(column.unit)
        if tables is None:
            tables = self._tables[column.unit] = [{} for _ in range(TABLES)]
        return tables

    def read(self, text: str, row: int, column: ValueColumn) -> Reading | NoFigure:
        """The figure in this cell, in the characteristic's unit."""
        figure = read_figure(text, self._evidence.stated)
        if isinstance(figure, NoFigure):
            return figure
        certain = self._evidence.note(figure, row, column.heading, text)
        if not isfinite(float(figure.number)):
            return NoFigure(f"{text.strip()!r} is too large to be kept", "write the figure as it was measured")
        if self.facts is None:
            return Reading(figure.text, float(figure.number), figure.qualifier, None, None, certain)
        try:
            return self._in_unit(figure, column.unit, self.facts, certain=certain)
        except (CallError, OverflowError) as error:
            advice = error.advice if isinstance(error, CallError) else None
            return NoFigure(error.message if isinstance(error, CallError) else f"{text.strip()!r} is too large", advice)

    def _in_unit(self, figure: Figure, told: str | None, facts: CharacteristicFacts, *, certain: bool) -> Reading:
        unit = figure.unit or told
        own = unit is None or _same(unit, facts.unit)
        if figure.unit and told and not _same(figure.unit, told):
            raise CallError(f"the cell says {figure.unit!r} and its column {told!r}", advice="give one unit")
        to_own = _as_it_is if own or unit is None else _converter(unit, facts.unit)
        value = to_own(figure.number)
        doubt = None if figure.qualifier else self._far.doubt(figure.number, value, to_own)
        return Reading(figure.text, value, figure.qualifier, None if own else unit, doubt, certain)

    def plain(self, text: str, number: int, column: ValueColumn) -> DraftMeasurement | None:
        """The fast path: a plain figure in the characteristic's own unit that nothing is to be said about, else None.

        It must give what `read` gives (a test compares them).
        """
        if not self._evidence.settled or (column.unit is not None and not self._is_own(column.unit)):
            return None
        if not PLAIN.fullmatch(text):
            return None
        value = float(text)
        if not self._far.low <= value <= self._far.high:
            return None
        measurement = DraftMeasurement(number, text, value)
        self.keep(text, measurement, column)
        return measurement

    def keep(self, text: str, measurement: DraftMeasurement, column: ValueColumn) -> None:
        """Remember a reading that nothing is to be said about, so that the same text need not be read again."""
        if 1 <= measurement.replicate <= TABLES:
            table = self.tables(column)[measurement.replicate - 1]
            if len(table) < _LARGEST:
                table[text] = measurement

    def _is_own(self, unit: str) -> bool:
        return self.facts is not None and _same(unit, self.facts.unit)


def _same(first: str, second: str) -> bool:
    if first == second:
        return True
    from sameline.intake.units import same_unit

    return same_unit(first, second)


def _as_it_is(number: str) -> float:
    return float(number)


def _converter(unit: str, own: str) -> Callable[[str], float]:
    from sameline.intake.units import factors

    slope, offset = factors(unit, own)

    def converted(number: str) -> float:
        exact = float(Fraction(number) * slope + offset)
        return exact if exact not in (inf, -inf) else float(number)

    return converted
