"""Value cells of one characteristic: read, converted, compared with what was recorded; each distinct text once."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from math import inf, isfinite

from sameline.errors import CallError
from sameline.intake.decimals import DecimalEvidence
from sameline.intake.far import Far
from sameline.intake.figures import Figure, NoFigure, read_figure
from sameline.intake.headings import ValueColumn
from sameline.records.drafts import CharacteristicFacts, DraftMeasurement

CACHED = 24
"""Replicates up to this number are remembered by their text."""
LARGEST = 4_000
"""Texts that are remembered of one replicate number; a characteristic with more does not repeat itself."""


class KnownTexts:
    """What texts of one characteristic and unit were read as, where nothing was to be said about them.

    Attributes:
        tables: for each replicate number, from 1, text -> measurement.
        low, high: a plain figure between these needs no further look; where the unit is not the characteristic's own,
            there is none.
    """

    __slots__ = ("high", "low", "tables")

    def __init__(self) -> None:
        self.tables: list[dict[str, DraftMeasurement]] = [{} for _ in range(CACHED)]
        self.low, self.high = inf, -inf

    def keep(self, text: str, measurement: DraftMeasurement) -> None:
        """Remember a reading."""
        if 1 <= measurement.replicate <= CACHED:
            table = self.tables[measurement.replicate - 1]
            if len(table) < LARGEST:
                table[text] = measurement


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
        self._known: dict[str | None, KnownTexts] = {}

    def known(self, column: ValueColumn) -> KnownTexts:
        """What texts under this column were read as."""
        known = self._known.get(column.unit)
        if known is None:
            known = self._known[column.unit] = KnownTexts()
            if column.unit is None or (self.facts is not None and _same(column.unit, self.facts.unit)):
                known.low, known.high = self._far.low, self._far.high
        return known

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
