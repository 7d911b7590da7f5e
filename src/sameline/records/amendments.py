"""Corrections: a value amended, something set aside, or put back. The original stays; the reason is the entry's."""

from __future__ import annotations

from collections.abc import Sequence

from sqlalchemy import select

from sameline.errors import CallError
from sameline.records import tables as t
from sameline.records.acts import Act
from sameline.records.drafts import DraftMeasurement
from sameline.records.runs import Measurement

CAUSES = (
    "instrument fault",
    "specimen damaged",
    "wrong specimen",
    "method not followed",
    "conditions out of range",
    "copying error",
    "other stated cause",
)
"""The assignable causes for which something may be set aside; the reason says the rest in words."""


def amend_value(act: Act, measurement: Measurement, value: DraftMeasurement) -> None:
    """Record another value for a replicate.

    Raises:
        CallError: it has this value already.
    """
    if (measurement.text, measurement.unit) == (value.text, value.unit):
        raise CallError(f"the value is {value.text} already; nothing to amend")
    act.add(
        t.measurement_amendment,
        measurement=measurement.id,
        text=value.text,
        value=value.value,
        qualifier=value.qualifier,
        unit=value.unit,
    )


def exclude(
    act: Act, cause: str, *, measurement: int | None = None, run: int | None = None, batch: int | None = None
) -> int:
    """Set one replicate, one run or one batch aside.

    Returns:
        The exclusion's id.

    Raises:
        CallError: the cause is none of `CAUSES`, or it is set aside already.
    """
    if cause not in CAUSES:
        raise CallError(f"{cause!r} is not an assignable cause", advice=f"one of: {'; '.join(CAUSES)}")
    if standing_exclusions(act, measurement=measurement, run=run, batch=batch):
        raise CallError("it is set aside already; nothing to exclude")
    return act.add(t.exclusion, measurement=measurement, run=run, batch=batch, cause=cause)


def restore(act: Act, *, measurement: int | None = None, run: int | None = None, batch: int | None = None) -> None:
    """Lift the exclusion of one replicate, run or batch.

    Raises:
        CallError: it is not set aside by itself.
    """
    standing = standing_exclusions(act, measurement=measurement, run=run, batch=batch)
    if not standing:
        raise CallError("it is not set aside; nothing to restore", advice="its run or its batch may be: name that")
    for exclusion in standing:
        act.add(t.restoration, exclusion=exclusion)


def standing_exclusions(
    act: Act, *, measurement: int | None = None, run: int | None = None, batch: int | None = None
) -> Sequence[int]:
    """Ids of the exclusions of exactly this replicate, run or batch that have not been lifted."""
    table = t.exclusion
    query = select(table.c.id).where(table.c.id.not_in(select(t.restoration.c.exclusion)))
    for column, number in (("measurement", measurement), ("run", run), ("batch", batch)):
        if number is not None:
            query = query.where(table.c[column] == number)
    return act.connection.execute(query.order_by(table.c.id)).scalars().all()
