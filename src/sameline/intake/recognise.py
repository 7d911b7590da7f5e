"""Runs and files that the store has already: the same again, a changed copy, or something that looks alike."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from sameline.intake.files import Intake
from sameline.intake.findings import Finding
from sameline.records.drafts import DraftMeasurement, DraftRun

RunKey = tuple[str, str, str]
"""Batch, characteristic and moment of a run."""


@dataclass(frozen=True, slots=True)
class KnownRun:
    """A run as it is recorded, with the number of the ledger entry that holds it."""

    entry: int
    run: DraftRun


@dataclass(frozen=True, slots=True)
class Recognition:
    """What of an intake the store has already.

    Attributes:
        new: the runs that it has not.
        same: recorded runs that stand in the files again, value for value.
        changed: recorded runs that stand in the files with other values.
        findings: all of this, said; looks-alikes among the new ones are questions.
        passed: those of the findings that concern `same`, in its order: nothing need be done about them.
    """

    new: tuple[DraftRun, ...]
    same: tuple[KnownRun, ...]
    changed: tuple[KnownRun, ...]
    findings: tuple[Finding, ...]
    passed: tuple[Finding, ...] = ()


def keys_of(intake: Intake) -> frozenset[RunKey]:
    """What to look up in the store before `recognise`."""
    return frozenset(_key(run) for run in intake.runs)


def recognise(
    intake: Intake, known: Mapping[RunKey, Sequence[KnownRun]], digests: Mapping[str, int] | None = None
) -> Recognition:
    """Compare runs with those recorded under the same batch, characteristic and moment.

    Args:
        intake: what files hold.
        known: the recorded runs of `keys_of(intake)`, as they stand today (amendments included), and amended ones a
            second time as they were first recorded: a run that agrees with either is the same.
        digests: SHA-256 of files taken in before -> the entry that holds them.
    """
    gathered = _Gathered()
    for source in intake.sources:
        if digests and source.sha256 in digests:
            problem = f"this very file has been taken in already, in entry {digests[source.sha256]}"
            gathered.findings.append(Finding(source.name, None, None, None, None, problem, "there is nothing to take"))
    for part in intake.parts:
        for run in part.runs:
            gathered.look(run, known.get(_key(run), ()), part.file, part.sheet)
    return gathered.closed()


def _key(run: DraftRun) -> RunKey:
    return run.batch, run.characteristic, run.tested_at


class _Gathered:
    def __init__(self) -> None:
        self.new: list[DraftRun] = []
        self.same: list[KnownRun] = []
        self.changed: list[KnownRun] = []
        self.findings: list[Finding] = []
        self.passed: list[Finding] = []

    def closed(self) -> Recognition:
        return Recognition(
            tuple(self.new), tuple(self.same), tuple(self.changed), tuple(self.findings), tuple(self.passed)
        )

    def look(self, run: DraftRun, recorded: Sequence[KnownRun], file: str, sheet: str | None) -> None:
        own = [known for known in recorded if _occasion(known.run) == _occasion(run)]
        if not own:
            self.new.append(run)
            alike = next((known for known in recorded if _alike(known.run, run)), None)
            if alike is not None:
                self._say(run, file, sheet, _looks_like(alike), "is it another run?", question=True)
            return
        same = next((known for known in own if not _differences(known.run, run)), None)
        if same is not None:
            self.same.append(same)
            self._say(run, file, sheet, f"this run is recorded already, in entry {same.entry}", "leave it out")
            self.passed.append(self.findings[-1])
            return
        self.changed.append(own[0])
        differences = "; ".join(_differences(own[0].run, run))
        problem = f"this run is recorded already, in entry {own[0].entry}, with other values: {differences}"
        self._say(run, file, sheet, problem, "amend the recorded run, or leave this one out")

    def _say(
        self, run: DraftRun, file: str, sheet: str | None, problem: str, suggestion: str, *, question: bool = False
    ) -> None:
        self.findings.append(Finding(file, sheet, run.row, None, None, problem, suggestion, question))


def _occasion(run: DraftRun) -> tuple[str | None, str | None, str | None]:
    return run.analyst, run.instrument, run.session


def _alike(recorded: DraftRun, run: DraftRun) -> bool:
    """Whether two runs of one batch, characteristic and moment may be one: the same analyst, or the same values."""
    return recorded.analyst == run.analyst or not _differences(recorded, run)


def _looks_like(known: KnownRun) -> str:
    run = known.run
    told = [("analyst", run.analyst), ("instrument", run.instrument), ("session", run.session)]
    words = ", ".join(f"{name} {value}" for name, value in told if value) or "no analyst or instrument"
    return f"entry {known.entry} holds a run of the same batch, characteristic and time ({words})"


def _figure(measurement: DraftMeasurement) -> tuple[str | None, float]:
    return measurement.qualifier, measurement.value


def _differences(recorded: DraftRun, run: DraftRun) -> list[str]:
    """Replicates whose figures are not the same, in words."""
    before = {measurement.replicate: measurement for measurement in recorded.measurements}
    after = {measurement.replicate: measurement for measurement in run.measurements}
    words = []
    for number in sorted(before.keys() | after.keys()):
        old, new = before.get(number), after.get(number)
        if old is None or new is None or _figure(old) != _figure(new):
            words.append(f"replicate {number} {_shown(old)}, now {_shown(new)}")
    return words[:5] + ([f"and {len(words) - 5} more"] if len(words) > 5 else [])


def _shown(measurement: DraftMeasurement | None) -> str:
    if measurement is None:
        return "not there"
    return f"{measurement.text} {measurement.unit}" if measurement.unit else measurement.text
