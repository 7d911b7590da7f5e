"""Runs and their replicates: recorded from checked drafts, and read as they hold as of a ledger position.

Reading lays amendments and exclusions over what was recorded: the value that holds is the last amendment's, and a
replicate is excluded while an exclusion of itself, of its run or of its batch has not been lifted.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from typing import Any

from sqlalchemy import Connection, Select, or_, select

from sameline.errors import CallError
from sameline.records import tables as t
from sameline.records.acts import Act
from sameline.records.drafts import DraftRun, SourceFile
from sameline.records.registry import KINDS, codes, find
from sameline.records.store import Reading

_RUN_COLUMNS = ("batch", "characteristic", "tested_at", "analyst", "instrument", "session", "note", "source_file")
_MEASUREMENT_COLUMNS = ("run", "replicate", "text", "value", "qualifier", "unit")

FEW = 500
"""So many ids are named in a query; of more, all are read and the wanted ones picked."""


@dataclass(frozen=True, slots=True)
class Measurement:
    """One replicate as it holds, with its run.

    Attributes:
        id, run: ids of the measurement and of its run.
        batch, characteristic: ids, as the run's particulars hold.
        tested_at: when it was tested (UTC, ISO 8601).
        entry: the ledger entry that recorded it.
        replicate, text, value, qualifier, unit: as in `sameline.records.drafts.DraftMeasurement`.
        analyst, instrument: ids or None.
        session: label of the occasion, or None.
        amended: whether its value is an amendment's.
        excluded: the cause, if it is set aside.
    """

    id: int
    run: int
    batch: int
    characteristic: int
    tested_at: str
    entry: int
    replicate: int
    text: str
    value: float
    qualifier: str | None
    unit: str | None
    analyst: int | None
    instrument: int | None
    session: str | None
    amended: bool = False
    excluded: str | None = None


def record_runs(act: Act, drafts: Sequence[DraftRun], source: SourceFile | None = None) -> range:
    """Record runs and their replicates within an act.

    Returns:
        The runs' ids, in the order of the drafts.

    Raises:
        CallError: a code is not registered (checked drafts have none such).
    """
    known = {kind: {code: number for number, code in codes(act.connection, KINDS[kind]).items()} for kind in _REFERRED}
    file = act.add(t.source_file, name=source.name, sha256=source.sha256, size=source.size) if source else None
    rows = [
        (
            _known(known, "batch", draft.batch),
            _known(known, "characteristic", draft.characteristic),
            draft.tested_at,
            _known(known, "person", draft.analyst),
            _known(known, "instrument", draft.instrument),
            draft.session,
            draft.note,
            file,
            draft.row,
        )
        for draft in drafts
    ]
    ids = act.add_many(t.run, (*_RUN_COLUMNS, "source_row"), rows)
    act.add_many(
        t.measurement,
        _MEASUREMENT_COLUMNS,
        (
            (run, m.replicate, m.text, m.value, m.qualifier, m.unit)
            for run, draft in zip(ids, drafts, strict=True)
            for m in draft.measurements
        ),
    )
    return ids


_REFERRED = ("batch", "characteristic", "person", "instrument")


def _known(known: dict[str, dict[str, int]], kind: str, code: str | None) -> int | None:
    if code is None:
        return None
    if code not in known[kind]:
        raise CallError(f"no {kind} is registered as {code!r}", advice=f"`sameline list {kind}` shows what is")
    return known[kind][code]


def read_measurements(
    reading: Reading,
    *,
    characteristic: int | None = None,
    batches: Iterable[int] | None = None,
    runs: Iterable[int] | None = None,
) -> list[Measurement]:
    """The replicates as they hold, excluded ones included and marked, in order of run and replicate.

    Args:
        reading: the view.
        characteristic: only of this one.
        batches: only of these, as the runs' particulars hold.
        runs: only of these runs.
    """
    wanted = None if batches is None else set(batches)
    of_runs = None if runs is None else set(runs)
    query = _recorded(reading, characteristic)
    if wanted is not None and len(wanted) <= FEW:
        moved_in = select(t.run_amendment.c.run).where(t.run_amendment.c.batch.in_(wanted))
        query = query.where(or_(t.run.c.batch.in_(wanted), t.run.c.id.in_(moved_in)))
    if of_runs is not None:
        few = len(of_runs) <= FEW
        query = query.where(t.run.c.id.in_(of_runs) if few else t.run.c.id.between(min(of_runs), max(of_runs)))
    found = [Measurement(*row) for row in reading.connection.execute(query)]
    if of_runs is not None:
        found = [m for m in found if m.run in of_runs]
    if not found:
        return []
    held = _amended(reading, found)
    kept = held if wanted is None else [m for m in held if m.batch in wanted]
    return _marked(reading, kept)


def _recorded(reading: Reading, characteristic: int | None) -> Select[Any]:
    run, measurement = t.run, t.measurement
    query = (
        select(
            measurement.c.id,
            run.c.id,
            run.c.batch,
            run.c.characteristic,
            run.c.tested_at,
            measurement.c.entry,
            measurement.c.replicate,
            measurement.c.text,
            measurement.c.value,
            measurement.c.qualifier,
            measurement.c.unit,
            run.c.analyst,
            run.c.instrument,
            run.c.session,
        )
        .join_from(run, measurement, measurement.c.run == run.c.id)
        .where(run.c.entry <= reading.position)
        .order_by(run.c.id, measurement.c.replicate)
    )
    return query if characteristic is None else query.where(run.c.characteristic == characteristic)


def _amended(reading: Reading, found: list[Measurement]) -> list[Measurement]:
    """Lay the amendments over what was recorded. They are few, so all that came before the position are read."""
    run, value = t.run_amendment, t.measurement_amendment
    runs = {
        row.run: row
        for row in reading.connection.execute(select(run).where(run.c.entry <= reading.position).order_by(run.c.id))
    }
    values = {
        row.measurement: row
        for row in reading.connection.execute(
            select(value).where(value.c.entry <= reading.position).order_by(value.c.id)
        )
    }
    if not runs and not values:
        return found
    return [_held(m, runs.get(m.run), values.get(m.id)) for m in found]


def _held(m: Measurement, run: Any, value: Any) -> Measurement:  # noqa: ANN401 - rows of the two tables
    if run is not None:
        m = replace(
            m,
            batch=run.batch,
            tested_at=run.tested_at,
            analyst=run.analyst,
            instrument=run.instrument,
            session=run.session,
        )
    if value is not None:
        m = replace(m, text=value.text, value=value.value, qualifier=value.qualifier, unit=value.unit, amended=True)
    return m


def _marked(reading: Reading, held: list[Measurement]) -> list[Measurement]:
    """Mark what is excluded."""
    exclusion, restoration = t.exclusion, t.restoration
    lifted = select(restoration.c.exclusion).where(restoration.c.entry <= reading.position)
    query = select(exclusion).where(exclusion.c.entry <= reading.position, exclusion.c.id.not_in(lifted))
    causes = {
        ("measurement", row.measurement)
        if row.measurement
        else ("run", row.run)
        if row.run
        else ("batch", row.batch): row.cause
        for row in reading.connection.execute(query.order_by(exclusion.c.id.desc()))
    }
    if not causes:
        return held
    return [replace(m, excluded=_cause(m, causes)) for m in held]


def _cause(m: Measurement, causes: dict[tuple[str, int], str]) -> str | None:
    for key in (("measurement", m.id), ("run", m.run), ("batch", m.batch)):
        if key in causes:
            return causes[key]
    return None


def known_source(connection: Connection, sha256: str) -> tuple[int, str] | None:
    """The entry and name under which a file of this content was taken in, if it was."""
    file = t.source_file
    found = connection.execute(select(file.c.entry, file.c.name).where(file.c.sha256 == sha256).limit(1)).first()
    return (found.entry, found.name) if found else None


def laboratory_zone(connection: Connection) -> str:
    """The laboratory's time zone (IANA name): moments written without a zone are in it."""
    return connection.execute(select(t.laboratory.c.zone).order_by(t.laboratory.c.id.desc()).limit(1)).scalar() or "UTC"


def run_of(connection: Connection, measurement: int) -> int:
    """The run of a measurement, both by id.

    Raises:
        CallError: there is no such measurement.
    """
    found = connection.execute(select(t.measurement.c.run).where(t.measurement.c.id == measurement)).scalar()
    if found is None:
        raise CallError(f"there is no measurement {measurement}")
    return int(found)


def find_run(reading: Reading, batch: str, characteristic: str, tested_at: str) -> int:
    """The id of the run of a batch and characteristic (by code) tested at a moment (UTC, ISO 8601).

    Raises:
        CallError: there is none, or a code is not registered.
    """
    connection, run = reading.connection, t.run
    query = select(run.c.id).where(
        run.c.characteristic == find(connection, KINDS["characteristic"], characteristic),
        run.c.batch == find(connection, KINDS["batch"], batch),
        run.c.tested_at == tested_at,
        run.c.entry <= reading.position,
    )
    found = connection.execute(query.order_by(run.c.id)).scalar()
    if found is None:
        raise CallError(f"no run of {characteristic} on {batch} was tested at {tested_at}")
    return int(found)
