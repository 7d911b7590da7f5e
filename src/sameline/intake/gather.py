"""Single results gathered into runs, each checked against what is registered."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass

from sameline.intake.cells import CACHED, LARGEST, Cells, KnownTexts
from sameline.intake.codes import Codes
from sameline.intake.dates import DateReader, Moment
from sameline.intake.decimals import DecimalEvidence
from sameline.intake.figures import PLAIN, NoFigure
from sameline.intake.findings import FindingBook
from sameline.intake.headings import Layout, ValueColumn
from sameline.intake.lines import Key, Line, looks_like_footer
from sameline.records.drafts import DraftMeasurement

_NUMERALS = tuple(str(number) for number in range(1, CACHED + 1))
_MOST_REPLICATES = 10_000
Identity = tuple[str, str, str, str | None, str | None, str | None]
"""What makes a run one: batch, characteristic, moment, analyst, instrument, session."""
Place = tuple[str, str | None, int]
"""File, sheet and row where a run begins."""


class Group:
    """The rows of one run while they are gathered."""

    __slots__ = (
        "breaks", "cells", "column", "faults", "faulty", "first", "footer", "highest", "identity", "known",
        "measurements", "next", "numbers", "ordered",
    )  # fmt: skip

    def __init__(self, row: int, identity: Identity | None, cells: Cells, column: ValueColumn | None) -> None:
        self.first = self.next = row
        self.identity = identity
        self.cells = cells
        self.column = column
        self.known = KnownTexts() if column is None else cells.known(column)
        self.measurements: list[DraftMeasurement] = []
        self.breaks: list[tuple[int, int]] | None = None  # rows in between that are not its own
        self.numbers: set[int] | None = None  # replicate numbers seen (also without a figure), once not 1, 2, 3, …
        self.highest = 0  # the highest of them
        self.ordered = True
        self.faulty = identity is None
        self.faults: tuple[Fault, ...] = ()
        self.footer = False

    def skip(self, row: int) -> None:
        """Rows from the next one up to this one (without it) are not the run's own."""
        self.breaks = self.breaks or []
        self.breaks.append((self.next, row))

    def rows(self) -> list[int]:
        """The rows that belong to it."""
        starts = [self.first, *(end for _, end in self.breaks or ())]
        ends = [*(start for start, _ in self.breaks or ()), self.next]
        return [row for start, end in zip(starts, ends, strict=True) for row in range(start, end)]


@dataclass(frozen=True, slots=True)
class Fault:
    """What is wrong with a run's key: it stands in all the run's rows."""

    column: str
    text: str
    problem: str
    suggestion: str | None
    question: bool = False


class Gatherer:
    """Gathers one table.

    Args:
        layout: which column is what.
        codes: the registered codes.
        dates: reads the table's dates.
        evidence: what the table shows of its decimal sign.
        book: where findings go.
    """

    def __init__(
        self, layout: Layout, codes: Codes, dates: DateReader, evidence: DecimalEvidence, book: FindingBook
    ) -> None:
        self._layout = layout
        self._codes = codes
        self._dates = dates
        self._evidence = evidence
        self._book = book
        self._by_key: dict[Key, Group] = {}
        self._by_identity: dict[Identity, Group] = {}
        self._cells: dict[str, Cells] = {}
        self._moments: dict[str, Moment] = {}

    @property
    def groups(self) -> list[Group]:
        """The runs in the order in which they begin."""
        return list(dict.fromkeys(self._by_key.values()))

    def take(self, lines: Iterable[Line]) -> None:
        """Gather these results.

        Raises:
            EnoughFoundError: there are too many findings to go on.
        """
        numerals, is_plain, settled = _NUMERALS, PLAIN.fullmatch, False
        last: Key | None = None
        for row, key, replicate, text, column in lines:
            if key != last:  # rows of a run mostly stand together
                group = self._by_key.get(key) or self._open(row, key, column)
                last = key
            if row > group.next:
                group.skip(row)
            group.next = row + 1
            place = len(group.measurements)
            if column is not group.column or place >= CACHED or (replicate and replicate != numerals[place]):
                self._measure(group, row, replicate, text, column)
                continue
            known = group.known
            table = known.tables[place]
            measurement = table.get(text)
            # The fast path gives what `_measure` gives (a test compares them): a figure with a point in the unit that
            # is expected, within the limits that need no question, where nothing more is to be learned of its sign.
            if measurement is None and settled and is_plain(text) and known.low <= (value := float(text)) <= known.high:
                measurement = DraftMeasurement(place + 1, text, value)
                if len(table) < LARGEST:
                    table[text] = measurement
            if measurement is not None:
                group.measurements.append(measurement)
                continue
            self._measure(group, row, replicate, text, column)
            settled = self._evidence.settled

    def noted(self, notes: Mapping[Key, list[str]]) -> dict[Group, str]:
        """The note of each run that has one, from the notes of its keys."""
        texts: dict[Group, list[str]] = {}
        for key, said in notes.items():
            texts.setdefault(self._by_key[key], []).extend(said)
        return {group: "; ".join(dict.fromkeys(said)) for group, said in texts.items()}

    def places(self) -> Iterator[tuple[Identity, Place]]:
        """Where each run begins."""
        for identity, group in self._by_identity.items():
            yield identity, (self._book.file, self._book.sheet, group.first)

    def _measure(self, group: Group, row: int, replicate: str, text: str, column: ValueColumn) -> None:
        """One result whose text was not seen before, or that is not as it should be."""
        if group.footer:
            return
        number = self._number(group, row, replicate)
        reading = group.cells.read(text, row, column)
        if isinstance(reading, NoFigure):
            self._no_figure(group, row, number, text, column, reading)
            return
        measurement = DraftMeasurement(number, reading.text, reading.value, reading.qualifier, reading.unit)
        if reading.doubt is not None:
            problem, suggestion = reading.doubt
            self._book.add(row, column.heading, text, problem, suggestion, question=True)
        elif reading.certain:
            group.cells.known(column).keep(text, measurement)
        if number:
            group.measurements.append(measurement)

    def _no_figure(
        self, group: Group, row: int, number: int, text: str, column: ValueColumn, reading: NoFigure
    ) -> None:
        self._irregular(group).add(number)
        group.highest = max(group.highest, number)
        group.faulty = group.faulty or not reading.stated
        self._book.add(row, column.heading, text, reading.problem, reading.suggestion, question=reading.stated)

    def _irregular(self, group: Group) -> set[int]:
        """From here on the run's replicate numbers are kept one by one, and the fast path is left."""
        if group.numbers is None:
            group.numbers = {measurement.replicate for measurement in group.measurements}
            group.highest = len(group.measurements)
            group.column = None
        return group.numbers

    def _number(self, group: Group, row: int, replicate: str) -> int:
        """The replicate's number, stated or counted; 0 where it cannot be had."""
        counted = len(group.measurements) + 1
        stated = replicate.strip()
        if group.numbers is None and (not stated or stated == str(counted)):
            return counted
        numbers = self._irregular(group)
        number = int(stated) if stated.isascii() and stated.isdigit() and len(stated) < 6 else 0
        if not stated:
            number = group.highest + 1
        heading = self._layout.heading("replicate")
        if not 1 <= number <= _MOST_REPLICATES:
            group.faulty = True
            advice = "number the replicates 1, 2, 3, … within each run, or leave the column out"
            self._book.add(row, heading, replicate, f"{stated!r} is no replicate number", advice)
            return 0
        if number in numbers:
            group.faulty = True
            advice = "is the row there twice, or is it another run?"
            problem = f"replicate {number} of this run (from row {group.first}) is there already"
            self._book.add(row, heading, replicate, problem, advice)
            return 0
        group.ordered = group.ordered and number > group.highest
        group.highest = max(group.highest, number)
        numbers.add(number)
        return number

    def _open(self, row: int, key: Key, column: ValueColumn) -> Group:
        """The run that a key means: a new one, or one that was written in another way before."""
        faults: list[Fault] = []
        if self._codes.all_known(key):
            batch, characteristic, tested_at, analyst, instrument, session = key
            moment = self._moment(tested_at, faults)
            group = self._placed(
                row, (batch, characteristic, moment, analyst or None, instrument or None, session), faults, column
            )
        else:
            group = self._footer(row, key) or self._checked(row, key, faults, column)
        self._by_key[key] = group
        return group

    def _checked(self, row: int, key: Key, faults: list[Fault], column: ValueColumn) -> Group:
        """The run of a key that holds a code which is not registered as it stands."""
        batch, characteristic, tested_at, analyst, instrument, session = (text.strip() for text in key)
        parts = (
            self._code("batch", batch, faults),
            self._code("characteristic", characteristic, faults),
            self._moment(tested_at, faults),
            self._code("analyst", analyst, faults),
            self._code("instrument", instrument, faults),
            session,
        )
        return self._placed(row, parts, faults, column)

    def _placed(self, row: int, parts: tuple[str | None, ...], faults: list[Fault], column: ValueColumn) -> Group:
        batch, characteristic, moment, analyst, instrument, session = parts
        wrong = bool(faults) and not all(fault.question for fault in faults)
        cells = self._cells_of(characteristic)
        if wrong or batch is None or characteristic is None or moment is None:
            group = Group(row, None, cells, column)
        else:
            identity = (batch, characteristic, moment, analyst, instrument, (session or "").strip() or None)
            group = self._by_identity.get(identity) or Group(row, identity, cells, column)
            self._by_identity[identity] = group
        if faults:
            group.faults += tuple(fault for fault in faults if fault not in group.faults)
        return group

    def _cells_of(self, characteristic: str | None) -> Cells:
        code = characteristic or ""
        cells = self._cells.get(code)
        if cells is None:
            cells = self._cells[code] = Cells(self._codes.facts(code), self._evidence)
        return cells

    def _code(self, field: str, text: str, faults: list[Fault]) -> str | None:
        code, problem, suggestion = self._codes.check(field, text)
        if problem is not None:
            faults.append(Fault(self._layout.heading(field), text, problem, suggestion))
        return code

    def _moment(self, text: str, faults: list[Fault]) -> str | None:
        moment = self._moments.get(text)
        if moment is None:
            if len(self._moments) > 50_000:
                self._moments.clear()
            moment = self._moments[text] = self._dates.read(text)
        if moment.problem is not None:
            heading = self._layout.heading("tested_at")
            faults.append(Fault(heading, text, moment.problem, moment.suggestion, moment.question))
        return moment.utc

    def _footer(self, row: int, key: Key) -> Group | None:
        """A row that sums up the others, left out when the person agrees."""
        first = next((text for text in key if text.strip()), "")
        if not looks_like_footer(first) or sum(bool(text.strip()) for text in key) > 1:
            return None
        group = Group(row, None, self._cells_of(None), None)
        group.footer = True
        group.faults = (
            Fault(
                self._layout.heading("batch"), first, f"{first.strip()!r} looks like a row that sums up the others",
                "it would be left out", question=True,
            ),
        )  # fmt: skip
        return group
