"""The reading half of a laboratory's face."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

from sameline.errors import CallError
from sameline.records import comparisons, concluded, heading_maps, registry, runs, scope
from sameline.records.lookups import read_facts, read_register
from sameline.records.moments import read_moment
from sameline.records.store import Reading, Store

if TYPE_CHECKING:
    from pathlib import Path

    import pandas as pd

    from sameline.conclusions.diagnosis import Diagnosis
    from sameline.conclusions.planning import Sizes
    from sameline.conclusions.recompute import Verification
    from sameline.intake.headings import HeadingMap
    from sameline.ledger.checkpoint import Checkpoint
    from sameline.records.answers import Answer, Conclusion
    from sameline.records.conclusion_signatures import Signature
    from sameline.records.drafts import DraftMeasurement, Register
    from sameline.records.findings import LedgerReport
    from sameline.records.runs import Measurement
    from sameline.records.signing import PersonKey
    from sameline.records.trail import TrailEntry
    from sameline.reports.subject import Subject
    from sameline.stats.nested.fit import NestedFit
    from sameline.stats.plans import Costs


class Reads:
    """What is recorded, as of now or of any moment.

    Args:
        store: the open store.
        clock: gives the present moment (UTC, ISO 8601).
    """

    def __init__(self, store: Store, clock: Callable[[], str]) -> None:
        self._store = store
        self._clock = clock

    @contextmanager
    def reading(self, as_of: int | str | None = None) -> Iterator[Reading]:
        """A view of the records, as of a ledger entry or a moment if one is given."""
        with self._store.reading(as_of) as reading:
            yield reading

    @contextmanager
    def register(self) -> Iterator[Register]:
        """What is registered and recorded, as intake needs it; good inside the block."""
        with self.reading() as reading:
            yield read_register(reading, self._clock())

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

    def subject(self, conclusion: Conclusion) -> Subject:
        """What a conclusion is about: the question as it was revised then, and its characteristic."""
        from sameline.reports.subject import read_subject

        with self.reading() as reading:
            return read_subject(reading, conclusion)

    def contrast(self, conclusion: Conclusion, unit: str) -> Answer:
        """What a single look would say that takes each `unit` ("replicate" or "run") as independent evidence.

        It is for contrast with the recorded conclusion, and is not recorded.
        """
        from sameline.conclusions.conclude import naive_answer

        with self.reading() as reading:
            return naive_answer(reading, conclusion, unit)

    def spread(self, characteristic: str, *, as_of: int | str | None = None, **only: str | None) -> NestedFit:
        """The variance components of a characteristic; the filters are those of `conclusions.spread.fit_spread`."""
        from sameline.conclusions.spread import fit_spread

        with self.reading(as_of) as reading:
            zone = runs.laboratory_zone(reading.connection)
            moments = {
                w: read_moment(m, zone) for w in ("tested_from", "tested_before") if (m := only.get(w)) is not None
            }
            return fit_spread(reading, characteristic, **{**only, **moments})

    def sizes(
        self, name: str, *, power: float = 0.8, difference: float | None = None, costs: Costs | None = None
    ) -> Sizes:
        """How much more to test for a comparison: plans, what settles its undecided pairs, the price of looking."""
        from sameline.conclusions.planning import sizes_of

        conclusion = self.conclusion(name)
        with self.reading() as reading:
            return sizes_of(reading, conclusion, power=power, difference=difference, costs=costs)

    def diagnose(self, conclusion: Conclusion) -> Diagnosis:
        """Spreads, shape, equivalence and suspects in the data behind a conclusion; nothing is recorded."""
        from sameline.conclusions.diagnosis import diagnose

        with self.reading(conclusion.position) as reading:
            return diagnose(reading, conclusion)

    def is_behind(self, conclusion: Conclusion) -> bool:
        """Whether the comparison of a conclusion is behind the records."""
        with self.reading() as reading:
            return conclusion.comparison in scope.behind(reading)

    def trail(self, as_of: int | str | None = None, **only: Any) -> list[TrailEntry]:  # noqa: ANN401 - see read_trail
        """The audit trail, oldest entry first; the filters are those of `sameline.records.trail.read_trail`."""
        from sameline.records.trail import read_trail

        with self.reading(as_of) as reading:
            if only.get("comparison") is not None:
                only["comparison"] = comparisons.find_comparison(reading.connection, only["comparison"])
            zone = runs.laboratory_zone(reading.connection)
            moments = {w: read_moment(only[w], zone) for w in ("since", "until") if only.get(w) is not None}
            return read_trail(reading, **{**only, **moments})

    def verify(
        self,
        progress: Callable[[str, int, int], None] | None = None,
        checkpoints: Sequence[Checkpoint] = (),
        since: Checkpoint | None = None,
    ) -> Verification:
        """Check the ledger against the rows, and recompute every conclusion: every finding, not only the first.

        Args:
            progress: told what is checked, how far it is, and how far it goes.
            checkpoints: kept elsewhere; the ledger must still begin with what they stand for.
            since: one of such; what it covers is taken as checked before.
        """
        from sameline.conclusions.recompute import verify

        return verify(self._store, progress, (*checkpoints, *([since] if since else [])), since)

    def signatures(self, conclusion: Conclusion) -> list[tuple[int, Signature]]:
        """The signatures on this version of a conclusion and on those before it, each with its version."""
        from sameline.records.conclusion_signatures import read_signatures

        with self.reading() as reading:
            versions = concluded.versions_of(reading, conclusion.comparison, conclusion.version)
            return [(versions[s.conclusion], s) for s in read_signatures(reading) if s.conclusion in versions]

    def keys(self, as_of: int | str | None = None) -> list[PersonKey]:
        """The public keys that persons sign with, oldest first."""
        from sameline.records.signing import read_keys

        with self.reading(as_of) as reading:
            return read_keys(reading)

    def maps(self, as_of: int | str | None = None) -> list[tuple[int, HeadingMap]]:
        """The heading maps that hold, by name, each with the entry that kept it."""
        from sameline.intake.headings import HeadingMap

        with self.reading(as_of) as reading:
            return [(kept.entry, HeadingMap.from_json(kept.form)) for kept in heading_maps.read_maps(reading)]

    def backup(self, path: Path) -> LedgerReport:
        """Copy the store to a new file while others use it, and check the copy."""
        from sameline.records.copying import backup

        return backup(self._store, path)

    def copy(self, place: str) -> LedgerReport:
        """Copy the store to another database, of either kind; ledger and root stay what they are."""
        from sameline.records.copying import copy_store

        return copy_store(self._store, place)

    def moment(self, text: str | None) -> str | None:
        """A moment as a person writes it, as the store keeps it; without a zone it is in the laboratory's."""
        if text is None:
            return None
        with self.reading() as reading:
            return read_moment(text, runs.laboratory_zone(reading.connection))

    def named(
        self, *, run: int | None = None, replicate: int | None = None, batch: str | None = None
    ) -> tuple[str, dict[str, int]]:
        """A replicate (of a run), a run, or a batch, by what a person calls it: its words, and its id by kind.

        Raises:
            CallError: nothing or several things are named, or it is not there.
        """
        if (run is None) == (batch is None) or (replicate is not None and run is None):
            raise CallError("name one thing", advice="--run, --run with --replicate, or --batch")
        if batch is not None:
            with self.reading() as reading:
                return f"batch {batch}", {"batch": registry.find(reading.connection, registry.KINDS["batch"], batch)}
        found = self.find_measurements(run or 0, replicate)
        if replicate is None:
            return f"run {run}", {"run": found[0].run}
        return f"run {run}, replicate {replicate}", {"measurement": found[0].id}

    def corrected(self, run: int, replicate: int, text: str) -> tuple[Measurement, DraftMeasurement]:
        """A recorded replicate, and the value that a person says it should have had, checked as any value is.

        Raises:
            FindingsError: the text is no value of this characteristic.
        """
        from sameline.intake.bench import read_corrected

        measurement = self.find_measurements(run, replicate)[0]
        with self.reading() as reading:
            facts = read_facts(reading, measurement.characteristic)
        return measurement, read_corrected(facts, replicate, text)

    def find_run(self, batch: str, characteristic: str, tested_at: str) -> int:
        """The number of the run of a batch and characteristic tested at a moment.

        Raises:
            CallError: there is none, or a code is not registered.
        """
        with self.reading() as reading:
            return runs.find_run(
                reading, batch, characteristic, read_moment(tested_at, runs.laboratory_zone(reading.connection))
            )

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
