"""A run's particulars: as they hold, and amended. The recorded ones stay; the last amendment's hold, all of them."""

from __future__ import annotations

from dataclasses import asdict, dataclass, replace

from sqlalchemy import select

from sameline.errors import CallError
from sameline.records import tables as t
from sameline.records.acts import Act
from sameline.records.registry import KINDS, find
from sameline.records.store import Reading


@dataclass(frozen=True, slots=True)
class RunParticulars:
    """What is said of a run.

    Attributes:
        batch: id.
        tested_at: when it was tested (UTC, ISO 8601).
        analyst, instrument: ids or None.
        session: label of the occasion, or None.
        note: free text, or None.
    """

    batch: int
    tested_at: str
    analyst: int | None
    instrument: int | None
    session: str | None
    note: str | None


FIELDS = tuple(RunParticulars.__dataclass_fields__)
_REFERS = {"batch": "batch", "analyst": "person", "instrument": "instrument"}


def read_run(reading: Reading, run: int) -> RunParticulars:
    """The particulars of a run as they hold at the reading's position.

    Raises:
        CallError: there is no such run.
    """
    amended = t.run_amendment
    query = select(*(amended.c[name] for name in FIELDS)).where(
        amended.c.run == run, amended.c.entry <= reading.position
    )
    found = reading.connection.execute(query.order_by(amended.c.id.desc()).limit(1)).first()
    if found is None:
        recorded = select(*(t.run.c[name] for name in FIELDS)).where(t.run.c.id == run)
        found = reading.connection.execute(recorded.where(t.run.c.entry <= reading.position)).first()
    if found is None:
        raise CallError(f"there is no run {run}", advice="`sameline runs` lists the runs with their numbers")
    return RunParticulars(*found)


def amend_run(act: Act, run: int, **changes: str | None) -> None:
    """Amend some particulars of a run; the others stay as they hold.

    Args:
        act: the act.
        run: the run's id.
        changes: of `FIELDS`; batch, analyst and instrument by code, `tested_at` in UTC, ISO 8601.

    Raises:
        CallError: there is no such run, a code is not registered, or nothing would change.
    """
    unknown = changes.keys() - set(FIELDS)
    if unknown:
        raise CallError(f"a run has no {', '.join(sorted(unknown))}", advice=f"it has {', '.join(FIELDS)}")
    for needed in ("batch", "tested_at"):
        if needed in changes and changes[needed] is None:
            raise CallError(f"a run cannot be without its {needed}")
    held = read_run(Reading(act.connection, act.number - 1), run)
    kept = {name: _as_kept(act, name, value) for name, value in changes.items()}
    amended = replace(held, **kept)  # type: ignore[arg-type]  # each value is of its field's kind
    if amended == held:
        raise CallError(f"run {run} says so already; nothing to amend")
    state_run(act, run, amended)


def state_run(act: Act, run: int, particulars: RunParticulars) -> None:
    """Record all particulars of a run anew."""
    act.add(t.run_amendment, run=run, **asdict(particulars))


def _as_kept(act: Act, name: str, value: str | None) -> str | int | None:
    """A reference's code as the id that the table keeps; other values as they are."""
    return find(act.connection, KINDS[_REFERS[name]], value) if name in _REFERS and value is not None else value
