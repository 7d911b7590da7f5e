"""What is in a comparison's scope, which acts touched it, and so which comparisons are behind.

An act that changes what a comparison rests on records a touch in the same transaction. A comparison is behind while
it was touched after its last conclusion read the records: a question of two indexed columns, whatever the store's size.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

from sqlalchemy import Connection, Select, func, select

from sameline.records import tables as t
from sameline.records.acts import Act
from sameline.records.comparisons import Revision
from sameline.records.runs import FEW, read_measurements
from sameline.records.store import Reading


def batches_in_scope(reading: Reading, revision: Revision) -> dict[int, int]:
    """The batches that a revision's filter and list let in, as of the reading: batch id -> id of its group."""
    table = t.batch_particulars
    newest = (
        select(func.max(table.c.id)).where(table.c.entry <= reading.position).group_by(table.c.batch).scalar_subquery()
    )
    group = table.c.batch if revision.grouping == "batch" else table.c[revision.grouping]
    query: Select[Any] = select(table.c.batch, group).where(table.c.id.in_(newest)).order_by(table.c.batch)
    if revision.grouping == "batch" and revision.groups is not None:
        query = query.where(table.c.batch.in_(revision.groups))
    if revision.of_material is not None:
        query = query.where(table.c.material == revision.of_material)
    if revision.of_supplier is not None:
        query = query.where(table.c.supplier == revision.of_supplier)
    found: dict[int, int] = {row[0]: row[1] for row in reading.connection.execute(query)}
    if revision.groups is None:
        return found
    return {batch: of_group for batch, of_group in found.items() if of_group in revision.groups}


def touched_by_runs(act: Act, runs: Iterable[tuple[int, int, str]], origin: tuple[int, int] | None = None) -> set[int]:
    """The comparisons in whose scope runs fall.

    Args:
        act: the act that records or amends them.
        runs: characteristic id, batch id and moment tested of each.
        origin: ids of material and supplier, where the batches' are not those recorded before the act.
    """
    latest: dict[tuple[int, int], str] = {}
    for characteristic, batch, tested_at in runs:
        key = (characteristic, batch)
        latest[key] = max(tested_at, latest.get(key, ""))
    stated = _stated(act.connection, {characteristic for characteristic, _ in latest})
    if not stated:
        return set()
    origins = _origins(act.connection, {batch for _, batch in latest}) if origin is None else {}
    return {
        question.comparison
        for (characteristic, batch), tested_at in latest.items()
        for question in stated.get(characteristic, ())
        if question.takes(batch, *(origin or origins[batch]), tested_at)
    }


def touched_by_batch(act: Act, batch: int, origin: tuple[int, int] | None = None) -> set[int]:
    """The comparisons in whose scope any run of a batch falls, by its origin as recorded, or by this one."""
    found = read_measurements(Reading(act.connection, act.number - 1), batches=[batch])
    return touched_by_runs(act, {(m.characteristic, m.batch, m.tested_at) for m in found}, origin)


def touched_by_characteristic(act: Act, characteristic: int) -> set[int]:
    """The comparisons of a characteristic (its margin is theirs, unless they state their own)."""
    query = select(t.comparison_revision.c.comparison).where(
        t.comparison_revision.c.characteristic == characteristic,
        t.comparison_revision.c.margin.is_(None),
        _is_current(),
    )
    return set(act.connection.execute(query).scalars())


def touch(act: Act, comparisons: Iterable[int]) -> None:
    """Record that this act changed what these comparisons rest on: they are behind until a conclusion follows."""
    already = {row["comparison"] for row in act.pending(t.comparison_touch)}
    for comparison in sorted(set(comparisons) - already):
        act.add(t.comparison_touch, comparison=comparison)


def behind(reading: Reading) -> list[int]:
    """The comparisons that an act touched after their last conclusion read the records, in order of their ids."""
    touch_table, conclusion = t.comparison_touch, t.conclusion
    read_to = (
        select(func.max(conclusion.c.position))
        .where(conclusion.c.comparison == t.comparison.c.id, conclusion.c.entry <= reading.position)
        .scalar_subquery()
    )
    touched = (
        select(func.max(touch_table.c.entry))
        .where(touch_table.c.comparison == t.comparison.c.id, touch_table.c.entry <= reading.position)
        .scalar_subquery()
    )
    query = select(t.comparison.c.id).where(touched > func.coalesce(read_to, 0)).order_by(t.comparison.c.id)
    return list(reading.connection.execute(query).scalars())


def touches_since(connection: Connection, comparison: int, after: int, upto: int) -> list[int]:
    """The entries that touched a comparison after one position, up to another."""
    table = t.comparison_touch
    query = (
        select(table.c.entry)
        .where(table.c.comparison == comparison, table.c.entry > after, table.c.entry <= upto)
        .order_by(table.c.entry)
    )
    return list(connection.execute(query).scalars())


def _is_current() -> Any:  # noqa: ANN401 - a SQL condition
    other = t.comparison_revision.alias()
    newest = (
        select(func.max(other.c.revision))
        .where(other.c.comparison == t.comparison_revision.c.comparison)
        .scalar_subquery()
    )
    return t.comparison_revision.c.revision == newest


@dataclass(frozen=True, slots=True)
class _Question:
    """The current revision of a comparison: what it lets in."""

    comparison: int
    grouping: str
    of_material: int | None
    of_supplier: int | None
    tested_from: str | None
    listed: frozenset[int] | None

    def takes(self, batch: int, material: int, supplier: int, tested_at: str) -> bool:
        """Whether a run of this batch, tested then, is in its scope."""
        group = {"batch": batch, "material": material, "supplier": supplier}[self.grouping]
        return (
            self.of_material in (None, material)
            and self.of_supplier in (None, supplier)
            and (self.tested_from is None or self.tested_from <= tested_at)
            and (self.listed is None or group in self.listed)
        )


def _stated(connection: Connection, characteristics: set[int]) -> dict[int, list[_Question]]:
    """Characteristic id -> the current revisions of its comparisons."""
    table = t.comparison_revision
    found: dict[int, list[_Question]] = {}
    for characteristic in characteristics:
        query = select(table).where(table.c.characteristic == characteristic, _is_current())
        for row in connection.execute(query).mappings():
            found.setdefault(characteristic, []).append(
                _Question(
                    row["comparison"],
                    row["grouping"],
                    row["of_material"],
                    row["of_supplier"],
                    row["tested_from"],
                    _listed(connection, row["id"], row["grouping"]) if row["listed"] else None,
                )
            )
    return found


def _listed(connection: Connection, revision: int, grouping: str) -> frozenset[int]:
    group = t.comparison_group
    return frozenset(connection.execute(select(group.c[grouping]).where(group.c.revision == revision)).scalars())


def _origins(connection: Connection, batches: set[int]) -> dict[int, tuple[int, int]]:
    """Batch id -> ids of its material and supplier, as they are now."""
    table = t.batch_particulars
    newest = select(func.max(table.c.id)).group_by(table.c.batch)
    if len(batches) <= FEW:
        newest = newest.where(table.c.batch.in_(batches))
    query = select(table.c.batch, table.c.material, table.c.supplier).where(table.c.id.in_(newest.scalar_subquery()))
    return {batch: (material, supplier) for batch, material, supplier in connection.execute(query)}


def touched_entries(comparison: int) -> Any:  # noqa: ANN401 - a SQL subquery of entry numbers
    """The entries that stated, touched or concluded a comparison."""
    return (
        select(t.comparison_touch.c.entry)
        .where(t.comparison_touch.c.comparison == comparison)
        .union(
            select(t.comparison_revision.c.entry).where(t.comparison_revision.c.comparison == comparison),
            select(t.conclusion.c.entry).where(t.conclusion.c.comparison == comparison),
        )
    )
