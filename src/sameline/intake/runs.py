"""Gathered rows become runs; what can be said only of a whole run is checked here."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from sameline.intake.findings import FindingBook, row_ranges
from sameline.intake.gather import Group, Identity, Place
from sameline.intake.headings import Layout
from sameline.intake.slips import slipped
from sameline.records.drafts import DraftMeasurement, DraftRun, Register

_LOOKED_AT = 1_000  # replicate numbers among which gaps are looked for


class RunMaker:
    """Makes the runs of one table.

    Args:
        register: what is registered and recorded.
        layout: which column is what.
        book: where findings go.
        seen: where the runs of the tables before begin.
        notes: what the note column says of runs.
    """

    def __init__(
        self,
        register: Register,
        layout: Layout,
        book: FindingBook,
        seen: Mapping[Identity, Place],
        notes: Mapping[Group, str],
    ) -> None:
        self._register = register
        self._layout = layout
        self._book = book
        self._seen = seen
        self._notes = notes

    def make(self, groups: Iterable[Group], doubtful: frozenset[int] = frozenset()) -> tuple[list[DraftRun], list[int]]:
        """The runs without a fault, and the rows of those that have one.

        Args:
            groups: the runs as gathered.
            doubtful: rows whose figures were refused after all rows had been read.

        Raises:
            EnoughFoundError: there are too many findings to go on.
        """
        runs, held = [], []
        for group in groups:
            if group.faults:
                self._report(group)
            if group.footer:
                continue
            if doubtful and not doubtful.isdisjoint(group.rows()):
                group.faulty = True
            run = None if group.identity is None else self._run(group, group.identity)
            if run is None:
                held.extend(group.rows())
            else:
                runs.append(run)
        return runs, held

    def _report(self, group: Group) -> None:
        for fault in group.faults:
            for row in group.rows():
                question = fault.question
                self._book.add(row, fault.column, fault.text, fault.problem, fault.suggestion, question=question)

    def _run(self, group: Group, identity: Identity) -> DraftRun | None:
        measurements = group.measurements
        if not group.ordered:
            measurements.sort(key=_by_number)
        if group.numbers is not None:
            self._gaps(group)
        if len(measurements) >= 4:
            self._twice(group, measurements)
        if group.cells.facts is not None and group.cells.facts.mean is None:
            for measurement, problem in slipped(measurements):
                self._ask_slip(group, measurement, problem)
        faulty = self._recorded(group, identity) | self._elsewhere(group, identity)
        if faulty or group.faulty or not measurements:
            return None
        batch, characteristic, tested_at, analyst, instrument, session = identity
        return DraftRun(
            batch, characteristic, tested_at, tuple(measurements), analyst, instrument, session,
            self._notes.get(group), group.first,
        )  # fmt: skip

    def _ask_slip(self, group: Group, measurement: DraftMeasurement, problem: str) -> None:
        rows = group.rows()
        place = group.measurements.index(measurement)
        one_each = len(rows) == len(group.measurements) and group.ordered
        row = rows[place] if one_each else group.first
        heading = self._layout.values[0].heading if len(self._layout.values) == 1 else None
        self._book.add(row, heading, measurement.text, problem, "did the decimal point slip?", question=True)

    def _gaps(self, group: Group) -> None:
        """Replicate numbers that are left out are asked about; those whose cell says "n/a" have been already."""
        present = group.numbers or set()
        gaps = [number for number in range(1, min(group.highest, _LOOKED_AT)) if number not in present]
        if gaps:
            listed = ", ".join(str(number) for number in gaps[:10]) + (", …" if len(gaps) > 10 else "")
            problem = f"replicate {listed} of this run is not there"
            advice = "was it lost, or are the numbers wrong?"
            self._book.add(group.first, self._layout.heading("replicate"), None, problem, advice, question=True)

    def _twice(self, group: Group, measurements: list[DraftMeasurement]) -> None:
        """A run that was pasted twice below itself, where no replicate numbers show it."""
        if "replicate" in self._layout.fields or len(measurements) % 2 or len(self._layout.values) > 1:
            return
        half = len(measurements) // 2
        texts = [measurement.text for measurement in measurements]
        if texts[:half] == texts[half:] and len(set(texts)) > 1:
            again = row_ranges(group.rows()[half:])
            problem = f"this run holds the same {half} values twice, the second time in {again}"
            self._book.add(group.first, None, None, problem, "was it copied twice?", question=True)

    def _recorded(self, group: Group, identity: Identity) -> bool:
        if identity[:3] not in self._register.runs:
            return False
        problem = f"a run of {identity[0]}, {identity[1]}, {identity[2]} is recorded already"
        self._book.add(group.first, None, None, problem, "amend the recorded run, or leave this one out")
        return True

    def _elsewhere(self, group: Group, identity: Identity) -> bool:
        """Whether the run stands in a table before this one."""
        place = self._seen.get(identity)
        if place is None:
            return False
        file, sheet, row = place
        where = f"{file}, row {row}" if sheet is None else f"{file}, sheet {sheet!r}, row {row}"
        self._book.add(group.first, None, None, f"this run is already in {where}", "leave one of them out")
        return True


def _by_number(measurement: DraftMeasurement) -> int:
    return measurement.replicate
