"""What a comparison rests on, as of a ledger position: its values, group by group, and their digest."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass, field

from sqlalchemy import select

from sameline.ledger.canonical import canonical
from sameline.records import tables as t
from sameline.records.comparisons import Revision, effective_margin
from sameline.records.concluded import codes_of
from sameline.records.runs import Measurement, read_measurements
from sameline.records.scope import batches_in_scope
from sameline.records.store import Reading

RECENT_RUNS = 200


@dataclass(frozen=True, slots=True)
class Value:
    """One replicate that a comparison rests on.

    Attributes:
        group, batch: codes.
        run: the run's id.
        replicate: its number.
        value: in the characteristic's unit.
        censored: whether only a bound is known.
        excluded: the cause, if it is set aside.
        before: whether it was recorded before the comparison's revision was stated.
        tested_at: when (UTC, ISO 8601).
        session: label of the occasion on which it was tested; a run without one is an occasion of its own.
    """

    group: str
    batch: str
    run: int
    replicate: int
    value: float
    censored: bool
    excluded: str | None
    before: bool
    session: str
    tested_at: str


@dataclass(frozen=True, slots=True)
class Inputs:
    """All that an answer is computed from.

    Attributes:
        groups: id and code of every group in order, those without values too.
        values: in order of run and replicate; those set aside are marked.
        margin: that holds, or None.
        control: code of the control group, or None.
        elsewhere: values of the last runs of this characteristic on other batches, by batch code and run, where the
            comparison may use their run-to-run spread; else empty.
    """

    groups: tuple[tuple[int, str], ...]
    values: tuple[Value, ...]
    margin: float | None
    control: str | None
    elsewhere: Mapping[tuple[str, int], list[float]] = field(default_factory=dict)

    @property
    def kept(self) -> tuple[Value, ...]:
        """The values that are not set aside."""
        return tuple(v for v in self.values if v.excluded is None)

    def digest(self) -> bytes:
        """SHA-256 of the values that enter, in canonical form: it tells one look's data from another's."""
        rows = [[v.group, v.batch, v.run, v.replicate, v.value, v.censored] for v in self.kept]
        return hashlib.sha256(canonical(rows)).digest()


def gather(reading: Reading, revision: Revision) -> Inputs:
    """Read what a revision rests on, as of the reading."""
    scope = batches_in_scope(reading, revision)
    found = [
        m
        for m in read_measurements(reading, characteristic=revision.characteristic, batches=scope)
        if revision.tested_from is None or m.tested_at >= revision.tested_from
    ]
    order = revision.groups if revision.groups is not None else _with_values(scope, found)
    named = order if revision.control is None else (*order, revision.control)
    group_code = codes_of(reading.connection, revision.grouping, named)
    batch_code = codes_of(reading.connection, "batch", {m.batch for m in found})
    values = tuple(
        Value(
            group=group_code[scope[m.batch]],
            batch=batch_code[m.batch],
            run=m.run,
            replicate=m.replicate,
            value=m.value,
            censored=m.qualifier is not None,
            excluded=m.excluded,
            before=m.entry < revision.entry,
            session=m.session or f"run {m.run}",
            tested_at=m.tested_at,
        )
        for m in found
    )
    control = None if revision.control is None else group_code.get(revision.control)
    return Inputs(
        groups=tuple((number, group_code[number]) for number in order),
        values=values,
        margin=effective_margin(reading, revision),
        control=control,
        elsewhere=_elsewhere(reading, revision, scope) if revision.known_spread else {},
    )


def recent_runs(reading: Reading, characteristic: int) -> dict[tuple[str, int], list[float]]:
    """The values of the last `RECENT_RUNS` runs of a characteristic, by batch code and run, without what is set aside.

    So few are taken that it costs the same in a store of any age.
    """
    run = t.run
    query = select(run.c.id).where(run.c.characteristic == characteristic, run.c.entry <= reading.position)
    last = reading.connection.execute(query.order_by(run.c.id.desc()).limit(RECENT_RUNS)).scalars().all()
    kept = [m for m in read_measurements(reading, runs=last) if m.excluded is None and m.qualifier is None]
    code = codes_of(reading.connection, "batch", {m.batch for m in kept})
    found: dict[tuple[str, int], list[float]] = {}
    for m in kept:
        found.setdefault((code[m.batch], m.run), []).append(m.value)
    return found


def _elsewhere(reading: Reading, revision: Revision, scope: dict[int, int]) -> dict[tuple[str, int], list[float]]:
    own = set(codes_of(reading.connection, "batch", scope).values())
    found = recent_runs(reading, revision.characteristic)
    return {key: values for key, values in found.items() if key[0] not in own}


def _with_values(scope: dict[int, int], found: list[Measurement]) -> tuple[int, ...]:
    """The groups that have values, in the order in which their first runs were recorded: newcomers come last."""
    return tuple(dict.fromkeys(scope[m.batch] for m in sorted(found, key=lambda m: m.run)))
