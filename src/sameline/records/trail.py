"""The audit trail: who did what, when, why, to what."""

from __future__ import annotations

import json
from dataclasses import dataclass
from typing import Any

from sqlalchemy import Select, select

from sameline.records import tables as t
from sameline.records.registry import KINDS, find
from sameline.records.scope import touched_entries
from sameline.records.store import Reading
from sameline.records.subjects import Manifest, subjects


@dataclass(frozen=True, slots=True)
class TrailEntry:
    """One entry of the ledger as people read it.

    Attributes:
        number, at, person, act, reason, software: as recorded; the person by code.
        about: what it is about, in words.
        rows: for each table, how many rows the act wrote.
        digest: the entry's hash, in hexadecimal.
    """

    number: int
    at: str
    person: str
    act: str
    reason: str | None
    about: tuple[str, ...]
    rows: dict[str, int]
    software: str
    digest: str


def read_trail(
    reading: Reading,
    *,
    person: str | None = None,
    batch: str | None = None,
    comparison: int | None = None,
    since: str | None = None,
    until: str | None = None,
    last: int | None = None,
) -> list[TrailEntry]:
    """The entries, oldest first.

    Args:
        reading: the view.
        person: only this person's (by code).
        batch: only those that wrote something about this batch (by code).
        comparison: only those that stated, touched or concluded this comparison (by id).
        since: only those recorded at or after this moment (UTC, ISO 8601).
        until: only those recorded before this moment.
        last: only so many, the newest.
    """
    entry = t.entry
    query: Select[Any] = select(entry, t.person.c.code).join(t.person, entry.c.person == t.person.c.id)
    query = query.where(entry.c.number <= reading.position)
    if person is not None:
        query = query.where(entry.c.person == find(reading.connection, KINDS["person"], person))
    if since is not None:
        query = query.where(entry.c.at >= since)
    if until is not None:
        query = query.where(entry.c.at < until)
    if batch is not None:
        query = query.where(entry.c.number.in_(_about_batch(find(reading.connection, KINDS["batch"], batch))))
    if comparison is not None:
        query = query.where(entry.c.number.in_(touched_entries(comparison)))
    found = reading.connection.execute(query.order_by(entry.c.number.desc()).limit(last)).mappings().all()
    manifests = {row["number"]: _manifest(row) for row in found}
    about = subjects(reading, manifests)
    return [_entry(row, manifests[row["number"]], about[row["number"]]) for row in reversed(found)]


def _manifest(row: Any) -> dict[str, tuple[int, int]]:  # noqa: ANN401 - a row of the query above
    return {part["table"]: (part["first"], part["count"]) for part in json.loads(row["rows"])}


def _entry(row: Any, manifest: Manifest, about: list[str]) -> TrailEntry:  # noqa: ANN401 - a row of the query above
    rows = {table: count for table, (_, count) in manifest.items()}
    own = {f: row[f] for f in ("number", "at", "act", "reason", "software")}
    return TrailEntry(**own, person=row["code"], about=tuple(about), rows=rows, digest=row["digest"].hex())


def _about_batch(batch: int) -> Any:  # noqa: ANN401 - a SQL subquery of entry numbers
    runs = select(t.run.c.id).where(t.run.c.batch == batch)
    measurements = select(t.measurement.c.id).where(t.measurement.c.run.in_(runs))
    return (
        select(t.batch.c.entry)
        .where(t.batch.c.id == batch)
        .union(
            select(t.batch_particulars.c.entry).where(t.batch_particulars.c.batch == batch),
            select(t.run.c.entry).where(t.run.c.batch == batch),
            select(t.run_amendment.c.entry).where((t.run_amendment.c.batch == batch) | t.run_amendment.c.run.in_(runs)),
            select(t.measurement_amendment.c.entry).where(t.measurement_amendment.c.measurement.in_(measurements)),
            select(t.exclusion.c.entry).where(
                (t.exclusion.c.batch == batch)
                | t.exclusion.c.run.in_(runs)
                | t.exclusion.c.measurement.in_(measurements)
            ),
        )
    )
