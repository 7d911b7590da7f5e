"""Files in, checked runs out: everything found is listed, and nothing is half taken."""

from __future__ import annotations

import gc
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from itertools import dropwhile
from pathlib import Path

from sameline.intake.choose import choose_layout, report_missing
from sameline.intake.codes import Codes
from sameline.intake.dates import DateReader
from sameline.intake.decimals import DecimalEvidence
from sameline.intake.findings import EnoughFoundError, Finding, FindingBook
from sameline.intake.gather import Gatherer, Identity, Place
from sameline.intake.headings import HeadingMap, Layout
from sameline.intake.lines import Lines
from sameline.intake.opening import open_tables
from sameline.intake.rawfiles import SIZE_LIMIT, RawFile, load
from sameline.intake.runs import RunMaker
from sameline.intake.tables import Row, Table, UnreadableError, explaining
from sameline.records.drafts import DraftRun, Register, SourceFile

Progress = Callable[[str, int], None]
"""Called now and then with the file's name and the number of rows read of the present table."""
_STEP = 20_000  # rows between two calls


@dataclass(frozen=True, slots=True)
class Part:
    """What one table (a text file or a sheet) gave.

    Attributes:
        file: the file's name without folders.
        sheet: the sheet's name; None for a text file.
        map: name of the heading map it was read with; empty for our own headings; None when it was not read.
        heading_row: the row of its headings; None when it was not read.
        runs: its runs without a fault.
        held: rows of results that are in no such run; None when these are all the rows there are.
    """

    file: str
    sheet: str | None
    map: str | None
    heading_row: int | None
    runs: tuple[DraftRun, ...]
    held: tuple[int, ...] | None


@dataclass(frozen=True, slots=True)
class Intake:
    """What files hold.

    Attributes:
        runs: the runs without a fault, in the order of the files. Where a finding is a refusal the caller stores none
            of them, unless the person has asked for the good ones.
        findings: all that is wrong or doubtful, by file, sheet and row.
        sources: name, SHA-256 and size of each file.
        parts: the same by table.
    """

    runs: tuple[DraftRun, ...]
    findings: tuple[Finding, ...]
    sources: tuple[SourceFile, ...]
    parts: tuple[Part, ...] = ()

    @property
    def refusals(self) -> tuple[Finding, ...]:
        """The findings that cannot be answered: as long as there are any, nothing is stored."""
        return tuple(finding for finding in self.findings if not finding.question)

    @property
    def questions(self) -> tuple[Finding, ...]:
        """The findings that the person is asked about."""
        return tuple(finding for finding in self.findings if finding.question)


def read_files(
    paths: Iterable[Path | str | RawFile],
    register: Register,
    *,
    maps: Sequence[HeadingMap] = (),
    sheets: Sequence[str] = (),
    limit: int = SIZE_LIMIT,
    progress: Progress | None = None,
) -> Intake:
    """Read and check files; nothing is stored.

    Args:
        paths: the files, or their bytes (`rawfiles.load_stream` for standard input).
        register: what is registered and recorded.
        maps: heading maps that a person has confirmed. Our own headings need none; another table is read with the map
            that fits its headings, and refused when none does or several do.
        sheets: names of the sheets to read of workbooks; empty for all.
        limit: bytes that a file, unpacked too, may have.
        progress: is told how far reading has come.

    Raises:
        CallError: a file cannot be opened, or the register's zone is no time zone.
    """
    reader = _Reader(register, maps, sheets, limit, progress)
    with _no_collection():
        for path in paths:
            reader.read(path if isinstance(path, RawFile) else load(path, limit))
    return reader.intake()


@contextmanager
def _no_collection() -> Iterator[None]:
    """Without the search for cyclic garbage: none is made here, and the search would walk all runs again and again."""
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()


class _Reader:
    def __init__(
        self,
        register: Register,
        maps: Sequence[HeadingMap],
        sheets: Sequence[str],
        limit: int,
        progress: Progress | None,
    ) -> None:
        self._register = register
        self._maps = maps
        self._sheets = sheets
        self._limit = limit
        self._progress = progress
        self._codes = Codes(register)
        self._seen: dict[Identity, Place] = {}
        self._last: Gatherer | None = None
        self._findings: list[Finding] = []
        self._sources: list[SourceFile] = []
        self._parts: list[Part] = []

    def intake(self) -> Intake:
        runs = tuple(run for part in self._parts for run in part.runs)
        return Intake(runs, tuple(self._findings), tuple(self._sources), tuple(self._parts))

    def read(self, raw: RawFile) -> None:
        """Read one file."""
        source = raw.source()
        book = FindingBook(raw.name)
        first = next((other for other in self._sources if other.sha256 == source.sha256 and raw.data), source)
        self._sources.append(source)
        if first is not source:
            book.add(None, None, None, f"the file has the same content as {first.name}", "name it once")
            self._close(book, raw.name)
            return
        try:
            tables = open_tables(raw, self._maps, self._sheets, self._limit)
        except UnreadableError as error:
            book.add(error.row, None, None, error.problem, error.suggestion)
            self._close(book, raw.name)
            return
        self._read_tables(tables)

    def _close(self, book: FindingBook, name: str, sheet: str | None = None) -> None:
        self._findings.extend(book.closed())
        self._parts.append(Part(name, sheet, None, None, (), None))

    def _read_tables(self, choices: list[list[Table]]) -> None:
        """Read the tables of one file; each is given in the ways in which its rows can be parted into cells."""
        books = []
        for choice in choices:
            book = FindingBook(choice[0].file, choice[0].sheet)
            books.append((choice[0], book, choose_layout(choice, self._maps, book)))
        some = any(chosen is not None and not table.hidden for table, _, chosen in books)
        for table, book, chosen in books:
            if chosen is not None and not (table.hidden and not self._sheets):
                self._read_table(*chosen, book)
                continue
            aside = FindingBook(table.file, table.sheet) if table.hidden else book
            self._left_out(table, aside, fits=chosen is not None, some=some)
            self._close(aside, table.file, table.sheet)

    def _left_out(self, table: Table, book: FindingBook, *, fits: bool, some: bool) -> None:
        """Say why a table is not read, unless that has been said."""
        if book:
            return
        if fits:
            book.add(None, None, None, "the hidden sheet holds results", "they would be left out", question=True)
        elif some and not table.hidden:
            problem = "the sheet has no headings of ours and fits no map"
            book.add(None, None, None, problem, "it would be left out", question=True)
        elif not some:
            report_missing(table, book)

    def _read_table(self, table: Table, layout: Layout, book: FindingBook) -> None:
        form = layout.form
        book.headings = layout.headings
        lines = Lines(layout, book, table.merged())
        dates = DateReader(form.zone or self._register.zone, self._register.now, form.date_order)
        evidence = DecimalEvidence(form.decimal, point_is_usual=table.point_is_usual)
        self._remember()
        gatherer = self._last = Gatherer(layout, self._codes, dates, evidence, book)
        runs: list[DraftRun] = []
        held: tuple[int, ...] | None = None
        try:
            self._gather(table, layout, lines, gatherer)
            runs, rows = self._make(layout, lines, gatherer, evidence, book)
            held = tuple(sorted({*rows, *lines.loose}))
        except EnoughFoundError:
            book.stop()
        except UnreadableError as error:
            book.add(error.row, None, None, error.problem, error.suggestion)
        self._findings.extend(book.closed())
        self._parts.append(Part(table.file, table.sheet, form.name, layout.row, tuple(runs), held))

    def _remember(self) -> None:
        """Keep where the runs of the last table begin, now that another one follows."""
        if self._last is not None:
            for identity, place in self._last.places():
                self._seen.setdefault(identity, place)

    def _make(
        self, layout: Layout, lines: Lines, gatherer: Gatherer, evidence: DecimalEvidence, book: FindingBook
    ) -> tuple[list[DraftRun], list[int]]:
        doubtful = set()
        for row, heading, text, problem, suggestion in evidence.doubts():
            book.add(row, heading, text, problem, suggestion)
            doubtful.add(row)
        maker = RunMaker(self._register, layout, book, self._seen, gatherer.noted(lines.notes))
        return maker.make(gatherer.groups, frozenset(doubtful))

    def _gather(self, table: Table, layout: Layout, lines: Lines, gatherer: Gatherer) -> None:
        rows: Iterator[Row] = dropwhile(lambda row: row[0] <= layout.last_above, table.rows(layout.form.decimal or "."))
        with explaining(table):
            gatherer.take(lines.read(rows if self._progress is None else self._told(table, rows)))
        if not gatherer.groups and not lines.loose:
            raise UnreadableError("there are headings and no results below them", "write the results below", layout.row)

    def _told(self, table: Table, rows: Iterator[Row]) -> Iterator[Row]:
        for count, row in enumerate(rows):
            if self._progress is not None and count % _STEP == 0:
                self._progress(table.file, count)
            yield row
