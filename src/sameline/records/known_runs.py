"""Recorded runs looked up by what files say of theirs: batch, characteristic and moment."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from itertools import groupby

from sqlalchemy import Connection, select

from sameline.records import tables as t
from sameline.records.drafts import DraftMeasurement, DraftRun
from sameline.records.registry import KINDS, codes
from sameline.records.runs import FEW, Measurement, read_measurements
from sameline.records.store import Reading

RunKey = tuple[str, str, str]
"""Codes of the batch and the characteristic, and the moment (UTC, ISO 8601)."""


def read_known_runs(reading: Reading, keys: Iterable[RunKey]) -> dict[RunKey, list[tuple[int, DraftRun]]]:
    """The recorded runs of these batches, characteristics and moments, as they hold, each with its entry.

    A run whose values were amended is there a second time, as it was first recorded, so that the file it came from is
    known again.
    """
    batches, characteristics = (
        {code: number for number, code in codes(reading.connection, KINDS[kind]).items()}
        for kind in ("batch", "characteristic")
    )
    moments: dict[tuple[int, int], set[str]] = {}
    for batch, characteristic, tested_at in keys:
        if batch in batches and characteristic in characteristics:
            moments.setdefault((characteristics[characteristic], batches[batch]), set()).add(tested_at)
    found = [run for pair, wanted in moments.items() for run in _candidates(reading.connection, *pair, wanted)]
    known: dict[RunKey, list[tuple[int, DraftRun]]] = {}
    for entry, draft in _drafts(reading, sorted(set(found))):
        known.setdefault((draft.batch, draft.characteristic, draft.tested_at), []).append((entry, draft))
    return known


def _candidates(connection: Connection, characteristic: int, batch: int, wanted: set[str]) -> Iterator[int]:
    """Runs that have one of these moments, or were moved to one."""
    run, moved = t.run, t.run_amendment
    low, high = min(wanted), max(wanted)
    recorded = select(run.c.id, run.c.tested_at).where(
        run.c.characteristic == characteristic, run.c.batch == batch, run.c.tested_at.between(low, high)
    )
    amended = (
        select(run.c.id, moved.c.tested_at)
        .join_from(moved, run, moved.c.run == run.c.id)
        .where(moved.c.batch == batch, run.c.characteristic == characteristic)
    )
    for query in (recorded, amended):
        for number, tested_at in connection.execute(query):
            if tested_at in wanted:
                yield number


def _drafts(reading: Reading, runs: Sequence[int]) -> Iterator[tuple[int, DraftRun]]:
    names = {
        kind: codes(reading.connection, KINDS[kind]) for kind in ("batch", "characteristic", "person", "instrument")
    }
    for start in range(0, len(runs), FEW):
        held = read_measurements(reading, runs=runs[start : start + FEW])
        for _, group in groupby(held, key=lambda m: m.run):
            replicates = list(group)
            yield replicates[0].entry, _draft(names, replicates, [_replicate(m) for m in replicates])
            if any(m.amended for m in replicates):
                yield replicates[0].entry, _draft(names, replicates, _first(reading.connection, replicates[0].run))


def _draft(
    names: dict[str, dict[int, str]], replicates: Sequence[Measurement], values: Sequence[DraftMeasurement]
) -> DraftRun:
    first = replicates[0]
    return DraftRun(
        names["batch"][first.batch],
        names["characteristic"][first.characteristic],
        first.tested_at,
        tuple(values),
        None if first.analyst is None else names["person"][first.analyst],
        None if first.instrument is None else names["instrument"][first.instrument],
        first.session,
    )


def _replicate(m: Measurement) -> DraftMeasurement:
    return DraftMeasurement(m.replicate, m.text, m.value, m.qualifier, m.unit)


def _first(connection: Connection, run: int) -> list[DraftMeasurement]:
    """A run's replicates as they were first recorded."""
    m = t.measurement
    query = select(m.c.replicate, m.c.text, m.c.value, m.c.qualifier, m.c.unit).where(m.c.run == run)
    return [DraftMeasurement(*row) for row in connection.execute(query.order_by(m.c.replicate))]
