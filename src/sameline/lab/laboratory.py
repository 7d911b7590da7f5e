"""A laboratory's face: its acts, on top of its reads."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, Self

from sameline.conclusions.conclude import bring_up_to_date
from sameline.conclusions.statements import check
from sameline.errors import CallError, KnownAlreadyError
from sameline.lab.corrections import touched_by_amending_runs, touched_by_reversal
from sameline.lab.outcomes import Outcome, Taken, by_source, refuse
from sameline.lab.reads import Reads
from sameline.records import (
    amendments,
    comparisons,
    conclusion_signatures,
    heading_maps,
    registry,
    reversal,
    run_particulars,
    runs,
    scope,
    signing,
)
from sameline.records import tables as t
from sameline.records.moments import read_zone, utc_text
from sameline.records.store import Reading, Store

if TYPE_CHECKING:
    from sameline.intake.headings import HeadingMap
    from sameline.intake.rawfiles import RawFile
    from sameline.ledger.checkpoint import Checkpoint
    from sameline.ledger.signatures import SigningKey
    from sameline.records.acts import Act
    from sameline.records.answers import Conclusion
    from sameline.records.comparisons import Statement
    from sameline.records.drafts import DraftMeasurement, DraftRun, SourceFile
    from sameline.records.runs import Measurement


def _now() -> str:
    return utc_text(dt.datetime.now(dt.UTC))


class Lab(Reads):
    """A laboratory's records. `open_lab` makes it; use it in a `with` block, or close it.

    Args:
        store: the open store.
        by: code of the person acting; needed to record, not to read.
        clock: gives the present moment (UTC, ISO 8601 to the microsecond, final Z).
    """

    def __init__(self, store: Store, *, by: str | None = None, clock: Callable[[], str] = _now) -> None:
        super().__init__(store, clock)
        self._by = by

    def acting(self, by: str) -> None:
        """Let another person act from now on."""
        self._by = by

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def close(self) -> None:
        """Let go of the store."""
        self._store.close()

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
                raise _taken_already(source, known)
            ids = runs.record_runs(act, drafts, source)
            new = [(row["characteristic"], row["batch"], row["tested_at"]) for row in act.pending(t.run)]
            scope.touch(act, scope.touched_by_runs(act, new))
        return replace(self._after(act.number), runs=tuple(ids))

    def take(
        self,
        paths: Sequence[Path | str | RawFile],
        *,
        check_only: bool = False,
        as_they_stand: bool = False,
        good_runs: Path | None = None,
        only_map: str | None = None,
        progress: Callable[[str, int], None] | None = None,
    ) -> Taken:
        """Take in files: every run of every file that is not recorded yet, or none.

        Args:
            paths: the files.
            check_only: report what is in them and record nothing.
            as_they_stand: record runs with values that were asked about (far from all recorded, for example).
            good_runs: record the runs without a fault, and write what is left of each file into this folder, to be
                mended.
            only_map: name of the heading map to read with, where several fit; all that are kept if left out.
            progress: told the file's name and the rows read now and then.

        Raises:
            FindingsError: the files have findings, or hold nothing new; nothing was recorded.
        """
        from sameline.intake.rawfiles import RawFile, load
        from sameline.lab import taking

        opened = [path if isinstance(path, RawFile) else load(path) for path in paths]
        self._refuse_known([raw.source() for raw in opened])
        maps = taking.chosen_maps([form for _, form in self.maps()], only_map)
        with self.reading() as reading:
            seen = taking.examine(reading, self._clock(), opened, maps, progress)
        taken = Taken(seen.intake, seen.facts, seen.passed)
        if check_only:
            return taken
        refuse(seen.intake, as_they_stand=as_they_stand, good_runs=good_runs is not None)
        taking.refuse_nothing_new(seen)
        rest = taking.write_rest(opened, seen, good_runs) if good_runs is not None and seen.intake.refusals else ()
        try:
            outcomes = tuple(self.record(drafts, source) for source, drafts in by_source(seen.intake))
        except BaseException:
            taking.remove(rest)
            raise
        return replace(taken, outcomes=outcomes, rest=rest)

    def keep_map(self, form: HeadingMap, *, reason: str | None = None) -> Outcome:
        """Keep a heading map under its name: `take` reads files with its headings from now on.

        Raises:
            CallError: the map has no name or does not say all that is needed, or it is kept already.
        """
        form.check()
        with self._act("map", reason) as act:
            heading_maps.keep_map(act, form.name, form.to_json())
        return Outcome(act.number)

    def amend(self, measurement: Measurement, value: DraftMeasurement, *, reason: str) -> Outcome:
        """Correct a recorded value; the original stays readable."""
        with self._act("amend", reason) as act:
            amendments.amend_value(act, measurement, value)
            self._touch_measurements(act, [measurement])
        return self._after(act.number)

    def amend_run(self, run: int, *, reason: str, **changes: str | None) -> Outcome:
        """Correct a run's batch, moment, analyst, instrument (by code), session or note; the original stays readable.

        Args:
            run: the run's number.
            reason: why.
            changes: of `sameline.records.run_particulars.FIELDS`; `tested_at` in UTC, ISO 8601 (see `Reads.moment`).
        """
        with self._act("amend", reason) as act:
            run_particulars.amend_run(act, run, **changes)
            scope.touch(act, touched_by_amending_runs(act, [run]))
        return self._after(act.number)

    def reverse(self, entry: int, *, reason: str, cause: str = "other stated cause") -> Outcome:
        """Reverse a whole entry, such as a file taken in: see `sameline.records.reversal`.

        Args:
            entry: the entry's number.
            reason: why.
            cause: the assignable cause for which runs that it recorded are set aside.
        """
        with self._act("reverse", reason) as act:
            reversal.reverse(act, entry, cause)
            scope.touch(act, touched_by_reversal(act))
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

    def register_key(self, person: str, public: bytes, *, reason: str | None = None) -> Outcome:
        """Register the public key (32 bytes) that a person signs with; the private one stays outside the store."""
        with self._act("key", reason) as act:
            signing.register_key(act, person, public)
        return Outcome(act.number)

    def revoke_key(self, name: str, *, reason: str) -> Outcome:
        """Revoke a key by its short name: nothing signed with it from now on counts."""
        with self._act("revoke key", reason) as act:
            signing.revoke_key(act, name)
        return Outcome(act.number)

    def checkpoint(self, signing_key: SigningKey) -> Checkpoint:
        """Sign the ledger's size and root as they are now; who keeps it can later see that nothing was rewritten."""
        with self._act("checkpoint", None) as act:
            return signing.make_checkpoint(act, signing_key)

    def sign(self, name: str, meaning: str, signing_key: SigningKey) -> Conclusion:
        """Sign the latest version of a conclusion as prepared, reviewed or approved.

        Raises:
            CallError: the comparison is behind, or the person may not sign it so.
        """
        conclusion = self.conclusion(name)
        if self.is_behind(conclusion):
            raise CallError(f"{name} is behind", advice="`sameline catch-up` brings it up to date")
        with self._act("sign", None) as act:
            conclusion_signatures.sign(act, conclusion, meaning, signing_key)
        return conclusion

    def catch_up(self) -> Outcome:
        """Answer every comparison that is behind."""
        return self._after(0)

    @contextmanager
    def _act(self, what: str, reason: str | None) -> Iterator[Act]:
        if self._by is None:
            raise CallError("who is acting?", advice="give --by CODE, or set SAMELINE_BY")
        if reason is not None and not reason.strip():
            raise CallError("the reason is empty", advice="say why; it stands in the audit trail")
        with self._store.act(what, by=self._by, at=self._clock(), reason=reason) as act:
            yield act

    def _refuse_known(self, sources: Sequence[SourceFile]) -> None:
        """Refuse a file whose content was taken in already, before it is read line by line."""
        with self._store.reading() as reading:
            for source in sources:
                if known := runs.known_source(reading.connection, source.sha256):
                    raise _taken_already(source, known)

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


def _taken_already(source: SourceFile, known: tuple[int, str]) -> KnownAlreadyError:
    return KnownAlreadyError(
        f"this file was taken in already, as {known[1]}",
        [],
        where=source.name,
        advice=f"entry {known[0]} holds its runs; nothing was recorded",
    )


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
    role: str | None = None,
    name: str,
    zone: str = "UTC",
    upgrade: bool = False,
    clock: Callable[[], str] = _now,
) -> Lab:
    """Make a laboratory's store; its first entry registers the laboratory and the person who makes it.

    Args:
        person_name: the person's full name; the code where none is given.
        role: what the person does.
        name: the laboratory's name.
        zone: its time zone (IANA name).
        upgrade: bring an older store to this Sameline's schema instead.
    """
    read_zone(zone)
    made, new = Store.create(store, upgrade=upgrade)
    if new:
        with made.act("init", by=by, at=clock(), first=True) as act:
            registry.register(act, registry.KINDS["person"], by, name=person_name or by, role=role)
            act.add(t.laboratory, name=name, zone=zone)
    return Lab(made, by=by, clock=clock)
