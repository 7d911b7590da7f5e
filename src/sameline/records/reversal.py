"""A whole entry reversed by another: nothing is taken away, and what the entry did no longer holds.

Runs that were logged or taken in are set aside; an amended value or run, and a restated particular, is stated as it
was before; what was set aside is put back, and what was put back is set aside again.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from sqlalchemy import Table, select

from sameline.errors import CallError
from sameline.records import tables as t
from sameline.records.acts import Act
from sameline.records.amendments import exclude, standing_exclusions
from sameline.records.registry import KINDS
from sameline.records.run_particulars import read_run, state_run
from sameline.records.store import Reading

REVERSIBLE = ("log", "take", "amend", "exclude", "restore", "restate", "reverse")
"""The acts that can be reversed; a registration, a statement or a conclusion is followed by another one instead."""


def reverse(act: Act, entry: int, cause: str) -> None:
    """Reverse what an entry did.

    Args:
        act: the act that reverses it.
        entry: the entry's number.
        cause: the assignable cause for which runs that it recorded are set aside.

    Raises:
        CallError: there is no such entry, it cannot be reversed, or a later entry changed the same again.
    """
    found = act.connection.execute(select(t.entry.c.act).where(t.entry.c.number == entry)).scalar()
    if found is None:
        raise CallError(f"the ledger has no entry {entry}", advice=f"entries run from 1 to {act.number - 1}")
    if found.split()[0] not in REVERSIBLE:
        raise CallError(
            f"entry {entry} is of the kind {found!r}, which cannot be reversed",
            advice=f"these can: {', '.join(REVERSIBLE)}",
        )
    done = [step(act, entry, cause) for step in _STEPS]
    if not any(done):
        raise CallError(f"entry {entry} no longer holds; there is nothing to reverse")


def _set_runs_aside(act: Act, entry: int, cause: str) -> int:
    runs = _written(act, t.run, entry)
    standing = [run for run in runs if not standing_exclusions(act, run=run["id"])]
    for run in standing:
        exclude(act, cause, run=run["id"])
    return len(standing)


def _values_as_before(act: Act, entry: int, _cause: str) -> int:
    rows = _written(act, t.measurement_amendment, entry)
    for row in rows:
        before = _before(act, t.measurement_amendment, "measurement", row)
        if before is None:
            recorded = select(t.measurement).where(t.measurement.c.id == row["measurement"])
            before = act.connection.execute(recorded).mappings().one()
        value = {name: before[name] for name in ("text", "value", "qualifier", "unit")}
        act.add(t.measurement_amendment, measurement=row["measurement"], **value)
    return len(rows)


def _runs_as_before(act: Act, entry: int, _cause: str) -> int:
    rows = _written(act, t.run_amendment, entry)
    for row in rows:
        _before(act, t.run_amendment, "run", row)
        state_run(act, row["run"], read_run(Reading(act.connection, entry - 1), row["run"]))
    return len(rows)


def _put_back(act: Act, entry: int, _cause: str) -> int:
    lifted = select(t.restoration.c.exclusion)
    query = select(t.exclusion.c.id).where(t.exclusion.c.entry == entry, t.exclusion.c.id.not_in(lifted))
    standing = act.connection.execute(query.order_by(t.exclusion.c.id)).scalars().all()
    for exclusion in standing:
        act.add(t.restoration, exclusion=exclusion)
    return len(standing)


def _set_aside_again(act: Act, entry: int, _cause: str) -> int:
    done = 0
    for row in _written(act, t.restoration, entry):
        lifted = (
            act.connection.execute(select(t.exclusion).where(t.exclusion.c.id == row["exclusion"])).mappings().one()
        )
        what = {kind: lifted[kind] for kind in ("measurement", "run", "batch") if lifted[kind] is not None}
        if not standing_exclusions(act, **what):
            act.add(t.exclusion, cause=lifted["cause"], **what)
            done += 1
    return done


def _particulars_as_before(act: Act, entry: int, _cause: str) -> int:
    done = 0
    for kind in KINDS.values():
        for row in _written(act, kind.particulars, entry):
            before = _before(act, kind.particulars, kind.name, row)
            if before is not None:
                act.add(kind.particulars, **{name: before[name] for name in (kind.name, *kind.columns)})
                done += 1
    return done


_STEPS: tuple[Callable[[Act, int, str], int], ...] = (
    _set_runs_aside,
    _values_as_before,
    _runs_as_before,
    _put_back,
    _set_aside_again,
    _particulars_as_before,
)


def _written(act: Act, table: Table, entry: int) -> list[Any]:
    """The rows that an entry wrote to a table."""
    query = select(table).where(table.c.entry == entry).order_by(table.c.id)
    return list(act.connection.execute(query).mappings())


def _before(act: Act, table: Table, subject: str, row: Any) -> Any | None:  # noqa: ANN401 - rows of the table
    """The row that held before this one; None where it was the first.

    Raises:
        CallError: this one does not hold any more.
    """
    others = select(table).where(table.c[subject] == row[subject])
    later = act.connection.execute(others.where(table.c.id > row["id"]).limit(1)).mappings().first()
    if later is not None:
        raise CallError(
            f"entry {later['entry']} changed the same {subject} again", advice=f"reverse entry {later['entry']} first"
        )
    return act.connection.execute(others.where(table.c.id < row["id"]).order_by(table.c.id.desc())).mappings().first()
