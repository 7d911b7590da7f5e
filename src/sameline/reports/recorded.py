"""The runs that are recorded, with the numbers by which a person names them."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from itertools import groupby
from typing import Any

from sameline.records.registry import KINDS, codes, find
from sameline.records.runs import Measurement, read_measurements
from sameline.records.store import Reading
from sameline.reports.text import moment, table


@dataclass(frozen=True, slots=True)
class RecordedRun:
    """One run as it holds.

    Attributes:
        run: its number.
        batch, characteristic, analyst, instrument: codes; the last two may be None.
        tested_at: when it was tested (UTC, ISO 8601).
        session: label of the occasion, or None.
        entry: the ledger entry that recorded it.
        replicates: one mapping each: replicate, text, value, qualifier, unit, amended, excluded.
    """

    run: int
    batch: str
    characteristic: str
    tested_at: str
    analyst: str | None
    instrument: str | None
    session: str | None
    entry: int
    replicates: tuple[Mapping[str, Any], ...]


def recorded_runs(
    reading: Reading, *, batch: str | None = None, characteristic: str | None = None, last: int | None = None
) -> list[RecordedRun]:
    """The runs as they hold, in order of recording.

    Args:
        reading: the view.
        batch: only of this one (by code).
        characteristic: only of this one (by code).
        last: only so many, the newest.

    Raises:
        CallError: a code is not registered.
    """
    connection = reading.connection
    found = read_measurements(
        reading,
        characteristic=None if characteristic is None else find(connection, KINDS["characteristic"], characteristic),
        batches=None if batch is None else [find(connection, KINDS["batch"], batch)],
    )
    names = {kind: codes(connection, KINDS[kind]) for kind in ("batch", "characteristic", "person", "instrument")}
    runs = [_run(list(members), names) for _, members in groupby(found, key=lambda m: m.run)]
    return runs if last is None else runs[-last:]


def _run(members: list[Measurement], names: Mapping[str, Mapping[int, str]]) -> RecordedRun:
    first = members[0]
    fields = ("replicate", "text", "value", "qualifier", "unit", "amended", "excluded")
    return RecordedRun(
        run=first.run,
        batch=names["batch"][first.batch],
        characteristic=names["characteristic"][first.characteristic],
        tested_at=first.tested_at,
        analyst=None if first.analyst is None else names["person"][first.analyst],
        instrument=None if first.instrument is None else names["instrument"][first.instrument],
        session=first.session,
        entry=first.entry,
        replicates=tuple({field: getattr(m, field) for field in fields} for m in members),
    )


def recorded_text(runs: Iterable[RecordedRun]) -> list[str]:
    """The runs as a table; a value that was amended or set aside says so."""
    rows = [
        (
            str(r.run),
            moment(r.tested_at),
            r.characteristic,
            r.batch,
            r.analyst or "",
            r.instrument or "",
            ", ".join(_value(m) for m in r.replicates),
        )
        for r in runs
    ]
    if not rows:
        return ["No run is recorded here. `sameline log` records one, `sameline take FILE` a file of them."]
    headings = ("run", "tested", "what", "batch", "analyst", "instrument", "values, from replicate 1 on")
    return table(headings, rows, "><<<<<<", indent="")


def _value(m: Mapping[str, Any]) -> str:
    unit = f" {m['unit']}" if m["unit"] else ""
    marks = ["amended"] if m["amended"] else []
    if m["excluded"]:
        marks.append(f"set aside: {m['excluded']}")
    return f"{m['text']}{unit}" + (f" ({'; '.join(marks)})" if marks else "")
