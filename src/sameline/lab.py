"""The Python face of a laboratory: acts that record, and reads of what is recorded.

Every act is one transaction with one ledger entry. In the same transaction it marks the comparisons that it touches;
after it commits, each of them is answered anew in a transaction of its own. If that is cut short, they stay visibly
behind, and the next act or `Lab.catch_up` answers them.

    import sameline

    with sameline.open_lab("lab.db") as lab:
        frame = lab.measurements()
        answer = lab.conclusion("seal set")
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, Self

from sameline.conclusions.conclude import bring_up_to_date
from sameline.conclusions.statements import check
from sameline.errors import CallError
from sameline.records import amendments, comparisons, concluded, registry, runs, scope
from sameline.records import tables as t
from sameline.records.moments import read_moment, read_zone, utc_text
from sameline.records.store import Reading, Store

if TYPE_CHECKING:
    import pandas as pd

    from sameline.conclusions.recompute import Verification
    from sameline.records.acts import Act
    from sameline.records.answers import Conclusion
    from sameline.records.comparisons import Revision, Statement
    from sameline.records.drafts import DraftMeasurement, DraftRun, Register, SourceFile
    from sameline.records.runs import Measurement
    from sameline.records.trail import TrailEntry


def _now() -> str:
    return utc_text(dt.datetime.now(dt.UTC))


WAKES: dict[str, str] = {
    "init": "nothing",
    "add": "nothing",
    "log": "the comparisons in whose scope the new runs fall",
    "take": "the comparisons in whose scope the new runs fall",
    "amend": "the comparisons in whose scope the amended run fell, and falls now",
    "exclude": "the comparisons in whose scope what is set aside falls",
    "restore": "the comparisons in whose scope what is put back falls",
    "compare": "the comparison that is stated",
    "restate batch": "the comparisons in whose scope its runs fell, and fall now",
    "restate characteristic": "the comparisons that take their margin from it",
    "conclude": "nothing",
}
"""Which act wakes what. Anything that is not listed wakes nothing; a test holds each line to what happens."""


@dataclass(frozen=True, slots=True)
class Outcome:
    """What an act did.

    Attributes:
        entry: the ledger entry that recorded it.
        runs: ids of the runs it recorded, if it recorded any.
        conclusions: the answers it led to, in order of their comparisons.
        behind: names of comparisons that are still behind, with the reason.
    """

    entry: int
    runs: tuple[int, ...] = ()
    conclusions: tuple[Conclusion, ...] = ()
    behind: tuple[tuple[str, str], ...] = ()


class Lab:
    """A laboratory's records. `open_lab` makes it; use it in a `with` block, or close it.

    Args:
        store: the open store.
        by: code of the person acting; needed to record, not to read.
        clock: gives the present moment (UTC, ISO 8601 to the microsecond, final Z).
    """

    def __init__(self, store: Store, *, by: str | None = None, clock: Callable[[], str] = _now) -> None:
        self._store = store
        self._by = by
        self._clock = clock

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def close(self) -> None:
        """Let go of the store."""
        self._store.close()

    # -- acts -----------------------------------------------------------------------------------------------------

    def add(self, kind: str, code: str, *, reason: str | None = None, **particulars: Any) -> Outcome:  # noqa: ANN401
        """Register a person, supplier, material, batch, characteristic or instrument under a code."""
        with self._act(f"add {kind}", reason) as act:
            registry.register(act, registry.KINDS[kind], code, **particulars)
        return Outcome(act.number)

    def restate(self, kind: str, code: str, *, reason: str, **changes: Any) -> Outcome:  # noqa: ANN401
        """State some particulars of a registered thing anew; the old ones stay readable."""
        with self._act(f"restate {kind}", reason) as act:
            number = registry.find(act.connection, registry.KINDS[kind], code)
            touched = self._touched_by_restating(act, kind, number)
            registry.restate(act, registry.KINDS[kind], code, **changes)
            if kind == "batch":
                origin = act.pending(t.batch_particulars)[-1]
                touched |= scope.touched_by_batch(act, number, (origin["material"], origin["supplier"]))
            scope.touch(act, touched)
        return self._after(act.number)

    def record(self, drafts: Sequence[DraftRun], source: SourceFile | None = None) -> Outcome:
        """Record checked runs: logged at the bench, or taken from a file."""
        if not drafts:
            raise CallError("there is no run to record")
        with self._act("log" if source is None else "take", None) as act:
            if source is not None and (known := runs.known_source(act.connection, source.sha256)):
                raise CallError(
                    f"this file was taken in already, as {known[1]}",
                    where=source.name,
                    advice=f"entry {known[0]} holds it; nothing was recorded",
                )
            ids = runs.record_runs(act, drafts, source)
            new = [(row["characteristic"], row["batch"], row["tested_at"]) for row in act.pending(t.run)]
            scope.touch(act, scope.touched_by_runs(act, new))
        return replace(self._after(act.number), runs=tuple(ids))

    def amend(self, measurement: Measurement, value: DraftMeasurement, *, reason: str) -> Outcome:
        """Correct a recorded value; the original stays readable."""
        with self._act("amend", reason) as act:
            amendments.amend_value(act, measurement, value)
            self._touch_measurements(act, [measurement])
        return self._after(act.number)

    def exclude(self, cause: str, *, reason: str, **what: int) -> Outcome:
        """Set a replicate, run or batch (`measurement=`, `run=` or `batch=` its id) aside, with an assignable cause."""
        with self._act("exclude", reason) as act:
            amendments.exclude(act, cause, **what)
            self._touch_measurements(act, self._named(act, **what))
        return self._after(act.number)

    def restore(self, *, reason: str, **what: int) -> Outcome:
        """Put back what was set aside."""
        with self._act("restore", reason) as act:
            amendments.restore(act, **what)
            self._touch_measurements(act, self._named(act, **what))
        return self._after(act.number)

    def compare(self, statement: Statement, *, reason: str | None = None) -> Outcome:
        """State a comparison, or restate the one of this name: a new revision; the old one stays."""
        check(statement)
        with self._act("compare", reason) as act:
            comparison = comparisons.state(act, statement)
            scope.touch(act, [comparison])
        return self._after(act.number)

    def catch_up(self) -> Outcome:
        """Answer every comparison that is behind."""
        return self._after(0)

    # -- reads ----------------------------------------------------------------------------------------------------

    @contextmanager
    def reading(self, as_of: int | str | None = None) -> Iterator[Reading]:
        """A view of the records, as of a ledger entry or a moment if one is given."""
        with self._store.reading(as_of) as reading:
            yield reading

    def register(self) -> Register:
        """What is registered, as intake needs it."""
        with self.reading() as reading:
            return runs.read_register(reading, self._clock())

    def listing(self, kind: str, as_of: int | str | None = None) -> list[dict[str, Any]]:
        """All that is registered of a kind."""
        with self.reading(as_of) as reading:
            return registry.listing(reading, registry.KINDS[kind])

    def measurements(self, as_of: int | str | None = None) -> pd.DataFrame:
        """Every replicate as it holds, one row each: see `sameline.reports.frames`."""
        from sameline.reports.frames import measurement_frame

        with self.reading(as_of) as reading:
            return measurement_frame(reading)

    def conclusion(self, name: str, version: int | None = None, as_of: int | str | None = None) -> Conclusion:
        """The latest conclusion of a comparison, or one version of it.

        Raises:
            CallError: there is no such comparison, or it has no such version.
        """
        with self.reading(as_of) as reading:
            comparison = comparisons.find_comparison(reading.connection, name)
            if version is not None:
                return concluded.version_of(reading, comparison, version)
            found = concluded.latest(reading, comparison)
        if found is None:
            raise CallError(f"{name!r} had no conclusion by then", advice="`sameline history NAME` lists the versions")
        return found

    def overview(self, as_of: int | str | None = None) -> list[tuple[str, Conclusion | None, bool]]:
        """Every comparison: its name, its latest conclusion, and whether it is behind."""
        with self.reading(as_of) as reading:
            late = set(scope.behind(reading))
            stated = comparisons.stated_names(reading)
            return [(name, concluded.latest(reading, number), number in late) for number, name in stated]

    def history(self, name: str, as_of: int | str | None = None) -> list[Conclusion]:
        """Every version of a comparison's conclusion, oldest first."""
        with self.reading(as_of) as reading:
            return concluded.versions(reading, comparisons.find_comparison(reading.connection, name))

    def revision(self, conclusion: Conclusion) -> Revision:
        """The comparison's revision that a conclusion answers."""
        with self.reading() as reading:
            return comparisons.read_revision(reading, conclusion.comparison, revision_id=conclusion.revision_id)

    def trail(self, as_of: int | str | None = None, **only: Any) -> list[TrailEntry]:  # noqa: ANN401 - see read_trail
        """The audit trail, oldest entry first; the filters are those of `sameline.records.trail.read_trail`."""
        from sameline.records.trail import read_trail

        with self.reading(as_of) as reading:
            if only.get("comparison") is not None:
                only["comparison"] = comparisons.find_comparison(reading.connection, only["comparison"])
            zone = runs.laboratory_zone(reading.connection)
            moments = {w: read_moment(only[w], zone) for w in ("since", "until") if only.get(w) is not None}
            return read_trail(reading, **{**only, **moments})

    def verify(self, progress: Callable[[str, int, int], None] | None = None) -> Verification:
        """Check the ledger against the rows, and recompute every conclusion: every finding, not only the first."""
        from sameline.conclusions.recompute import verify

        return verify(self._store, progress)

    def find_measurements(self, run: int, replicate: int | None = None) -> list[Measurement]:
        """The replicates of a run as they hold, or one of them.

        Raises:
            CallError: there is no such run or replicate.
        """
        with self.reading() as reading:
            found = runs.read_measurements(reading, runs=[run])
        kept = [m for m in found if replicate in (None, m.replicate)]
        if not kept:
            what = f"run {run}" if not found else f"replicate {replicate} in run {run}"
            raise CallError(f"there is no {what}", advice="`sameline runs` lists the runs with their numbers")
        return kept

    # -- inside ---------------------------------------------------------------------------------------------------

    @contextmanager
    def _act(self, what: str, reason: str | None) -> Iterator[Act]:
        if self._by is None:
            raise CallError("who is acting?", advice="give --by CODE, or set SAMELINE_BY")
        with self._store.act(what, by=self._by, at=self._clock(), reason=reason) as act:
            yield act

    def _after(self, entry: int) -> Outcome:
        """Answer what is behind, each in its own transaction; what cannot be answered stays behind and is named."""
        done, left = [], []
        with self._store.reading() as reading:
            waiting = scope.behind(reading)
            names = dict(comparisons.stated_names(reading)) if waiting else {}
        for comparison in waiting:
            try:
                done.append(bring_up_to_date(self._store, comparison, by=self._by or "", at=self._clock()))
            except ArithmeticError as error:  # a fault of the engine must not hide the act, which is recorded
                left.append((names[comparison], str(error)))
        return Outcome(entry, conclusions=tuple(done), behind=tuple(left))

    def _touched_by_restating(self, act: Act, kind: str, number: int) -> set[int]:
        if kind == "batch":
            return scope.touched_by_batch(act, number)
        return scope.touched_by_characteristic(act, number) if kind == "characteristic" else set()

    def _named(self, act: Act, **what: int) -> list[Measurement]:
        """The replicates that a measurement, run or batch id names."""
        reading = Reading(act.connection, act.number - 1)
        if "batch" in what:
            return runs.read_measurements(reading, batches=[what["batch"]])
        of_run = what["run"] if "run" in what else runs.run_of(act.connection, what["measurement"])
        return runs.read_measurements(reading, runs=[of_run])

    def _touch_measurements(self, act: Act, found: Sequence[Measurement]) -> None:
        touched = scope.touched_by_runs(act, {(m.characteristic, m.batch, m.tested_at) for m in found})
        scope.touch(act, touched)


def open_lab(store: str | Path, *, by: str | None = None, clock: Callable[[], str] = _now) -> Lab:
    """Open a laboratory's records.

    Args:
        store: a path, or a SQLAlchemy URL.
        by: code of the person acting; needed to record, not to read.
        clock: gives the present moment; for tests and demonstrations.

    Raises:
        StoreError: there is no store, or this Sameline cannot read it.
    """
    return Lab(Store.open(store), by=by, clock=clock)


def make_lab(  # noqa: D417 - the others are open_lab's
    store: str | Path,
    *,
    by: str,
    person_name: str | None = None,
    name: str,
    zone: str = "UTC",
    upgrade: bool = False,
    clock: Callable[[], str] = _now,
) -> Lab:
    """Make a laboratory's store; its first entry registers the laboratory and the person who makes it.

    Args:
        person_name: the person's full name; the code where none is given.
        name: the laboratory's name.
        zone: its time zone (IANA name).
        upgrade: bring an older store to this Sameline's schema instead.
    """
    read_zone(zone)
    made, new = Store.create(store, upgrade=upgrade)
    if new:
        with made.act("init", by=by, at=clock(), first=True) as act:
            registry.register(act, registry.KINDS["person"], by, name=person_name or by)
            act.add(t.laboratory, name=name, zone=zone)
    return Lab(made, by=by, clock=clock)
