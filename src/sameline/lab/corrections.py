"""What corrections of more than one value touch: a run's particulars, and whole entries reversed."""

from __future__ import annotations

from collections.abc import Iterable
from typing import TYPE_CHECKING

from sqlalchemy import select

from sameline.records import runs, scope
from sameline.records import tables as t
from sameline.records.store import Reading

if TYPE_CHECKING:
    from sameline.records.acts import Act


def touched_by_amending_runs(act: Act, of_runs: Iterable[int]) -> set[int]:
    """The comparisons in whose scope these runs fell before the act, or fall after it."""
    before = runs.read_measurements(Reading(act.connection, act.number - 1), runs=of_runs)
    held = {(m.run, m.characteristic): (m.batch, m.tested_at) for m in before}
    after = {row["run"]: (row["batch"], row["tested_at"]) for row in act.pending(t.run_amendment)}
    places = {(characteristic, *place) for (_, characteristic), place in held.items()}
    places |= {(characteristic, *after[run]) for run, characteristic in held if run in after}
    return scope.touched_by_runs(act, places)


def touched_by_reversal(act: Act) -> set[int]:
    """The comparisons that anything which a reversal wrote touches."""
    measurements = {row["measurement"] for row in act.pending(t.measurement_amendment)}
    of_runs = {row["run"] for row in act.pending(t.run_amendment)}
    batches: set[int] = set()
    for row in (*act.pending(t.exclusion), *_lifted(act)):
        measurements |= {row["measurement"]} - {None}
        of_runs |= {row["run"]} - {None}
        batches |= {row["batch"]} - {None}
    of_runs |= {runs.run_of(act.connection, measurement) for measurement in measurements}
    touched = touched_by_amending_runs(act, of_runs) if of_runs else set()
    for batch in batches:
        touched |= scope.touched_by_batch(act, batch)
    for row in act.pending(t.batch_particulars):
        touched |= scope.touched_by_batch(act, row["batch"])
        touched |= scope.touched_by_batch(act, row["batch"], (row["material"], row["supplier"]))
    for row in act.pending(t.characteristic_particulars):
        touched |= scope.touched_by_characteristic(act, row["characteristic"])
    return touched


def _lifted(act: Act) -> list[dict[str, int | None]]:
    """The exclusions that the act lifts."""
    lifted = [row["exclusion"] for row in act.pending(t.restoration)]
    query = select(t.exclusion).where(t.exclusion.c.id.in_(lifted))
    return [dict(row) for row in act.connection.execute(query).mappings()]
