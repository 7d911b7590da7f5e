"""Comparisons as stated, and their revisions as recorded."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from sqlalchemy import Connection, func, select

from sameline.errors import CallError
from sameline.records import tables as t
from sameline.records.acts import Act
from sameline.records.registry import KINDS, current, find
from sameline.records.store import Reading

GROUPINGS = ("batch", "material", "supplier")


@dataclass(frozen=True, slots=True)
class Statement:
    """A question asked beforehand, by codes.

    Attributes:
        name: the comparison's name.
        characteristic: code of what is compared.
        grouping: what the groups are: "batch", "material" or "supplier".
        groups: codes of the groups; empty for all that pass the filter.
        of_material, of_supplier: only batches of this material, of this supplier.
        tested_from: only runs tested at or after this moment (UTC, ISO 8601).
        model: "nested", "pooled", "unequal" or "ranks".
        procedure: the simultaneous procedure.
        unit: "run" or "replicate": what counts as one value where the model does not nest.
        alpha: family error rate.
        alternative: "two-sided", "less" or "greater" (with a control).
        margin: smallest difference that matters, in the characteristic's unit; None for the characteristic's own.
        control: code of the group that the others are compared with, or None.
        looks: "open", "planned" or "single".
        final_units: the amount of data planned for, in units a group, with "planned" and "single".
        spending: how a plan spends its error rate over looks.
        known_spread: whether the run-to-run spread of other batches may be used where these have one run each.
        sessions: whether what the batches of one session share is taken out of their differences.
        window_units: with open looks, evidence also starts anew every so many units; None for no such windows.
        window_months: the same for calendar months of testing, counted from that of the statement.
    """

    name: str
    characteristic: str
    grouping: str
    groups: tuple[str, ...] = ()
    of_material: str | None = None
    of_supplier: str | None = None
    tested_from: str | None = None
    model: str = "nested"
    procedure: str = "tukey-kramer"
    unit: str = "run"
    alpha: float = 0.05
    alternative: str = "two-sided"
    margin: float | None = None
    control: str | None = None
    looks: str = "open"
    final_units: int | None = None
    spending: str | None = None
    known_spread: bool = False
    sessions: bool = False
    window_units: int | None = None
    window_months: int | None = None


@dataclass(frozen=True, slots=True)
class Revision:
    """One revision of a comparison as recorded: like a statement, with ids.

    Attributes:
        id, comparison, revision, entry: the row, its comparison's id, its number, the entry that stated it.
        name: the comparison's name.
        characteristic: id.
        stated_at: when it was stated (UTC, ISO 8601).
        groups: ids of the listed groups in their order, or None where all that pass the filter are compared.
        control: id of the control group, or None.
    """

    id: int
    comparison: int
    revision: int
    entry: int
    name: str
    characteristic: int
    grouping: str
    groups: tuple[int, ...] | None
    of_material: int | None
    of_supplier: int | None
    tested_from: str | None
    model: str
    procedure: str
    unit: str
    alpha: float
    alternative: str
    margin: float | None
    control: int | None
    looks: str
    final_units: int | None
    spending: str | None
    known_spread: bool
    sessions: bool
    window_units: int | None
    window_months: int | None
    stated_at: str


def state(act: Act, statement: Statement) -> int:
    """Record a statement: a new comparison, or a new revision of the one that has its name.

    Returns:
        The comparison's id.

    Raises:
        CallError: a code is not registered.
    """
    connection = act.connection
    number = connection.execute(select(t.comparison.c.id).where(t.comparison.c.name == statement.name)).scalar()
    comparison = act.add(t.comparison, name=statement.name) if number is None else int(number)
    table = t.comparison_revision
    last = connection.execute(select(func.max(table.c.revision)).where(table.c.comparison == comparison)).scalar()
    kind = KINDS[statement.grouping]
    control = None if statement.control is None else find(connection, kind, statement.control)
    revision = act.add(
        table,
        comparison=comparison,
        revision=(last or 0) + 1,
        characteristic=find(connection, KINDS["characteristic"], statement.characteristic),
        grouping=statement.grouping,
        listed=int(bool(statement.groups)),
        of_material=statement.of_material and find(connection, KINDS["material"], statement.of_material),
        of_supplier=statement.of_supplier and find(connection, KINDS["supplier"], statement.of_supplier),
        tested_from=statement.tested_from,
        model=statement.model,
        procedure=statement.procedure,
        unit=statement.unit,
        alpha=statement.alpha,
        alternative=statement.alternative,
        margin=statement.margin,
        looks=statement.looks,
        final_units=statement.final_units,
        spending=statement.spending,
        known_spread=1 if statement.known_spread else None,
        sessions=1 if statement.sessions else None,
        window_units=statement.window_units,
        window_months=statement.window_months,
        **{f"control_{statement.grouping}": control},
    )
    for place, code in enumerate(statement.groups, 1):
        act.add(
            t.comparison_group, revision=revision, place=place, **{statement.grouping: find(connection, kind, code)}
        )
    return comparison


def find_comparison(connection: Connection, name: str) -> int:
    """The id of a comparison.

    Raises:
        CallError: none has this name; the nearest is named.
    """
    import difflib

    found = connection.execute(select(t.comparison.c.id).where(t.comparison.c.name == name)).scalar()
    if found is not None:
        return int(found)
    known = connection.execute(select(t.comparison.c.name)).scalars().all()
    near = difflib.get_close_matches(name, known, n=1)
    advice = f"did you mean {near[0]!r}?" if near else "`sameline differ` lists the comparisons"
    raise CallError(f"no comparison is called {name!r}", advice=advice)


def read_revision(reading: Reading, comparison: int, *, revision_id: int | None = None) -> Revision:
    """The revision of a comparison that holds at the reading's position, or the one with this row id."""
    table = t.comparison_revision
    query = (
        select(table, t.comparison.c.name, t.entry.c.at.label("stated_at"))
        .join(t.comparison, table.c.comparison == t.comparison.c.id)
        .join(t.entry, table.c.entry == t.entry.c.number)
    )
    if revision_id is not None:
        query = query.where(table.c.id == revision_id)
    else:
        query = query.where(table.c.comparison == comparison, table.c.entry <= reading.position)
    row = reading.connection.execute(query.order_by(table.c.revision.desc()).limit(1)).mappings().first()
    if row is None:
        raise CallError("the comparison had not been stated by then", advice="choose a later moment")
    return _revision(reading.connection, row)


def _revision(connection: Connection, row: Any) -> Revision:  # noqa: ANN401 - a row of the query above
    listed = None
    if row["listed"]:
        group = t.comparison_group
        query = select(group.c[row["grouping"]]).where(group.c.revision == row["id"]).order_by(group.c.place)
        listed = tuple(connection.execute(query).scalars())
    made = {"groups", "control", "known_spread", "sessions"}
    own = {f: row[f] for f in Revision.__dataclass_fields__ if f not in made}
    return Revision(
        **own,
        groups=listed,
        control=row[f"control_{row['grouping']}"],
        known_spread=bool(row["known_spread"]),
        sessions=bool(row["sessions"]),
    )


def effective_margin(reading: Reading, revision: Revision) -> float | None:
    """The revision's margin, or else its characteristic's as of the reading's position."""
    if revision.margin is not None:
        return revision.margin
    stated = current(reading.connection, KINDS["characteristic"], revision.characteristic, reading.position)
    margin: float | None = stated["margin"]
    return margin


def stated_names(reading: Reading) -> Sequence[tuple[int, str]]:
    """Id and name of every comparison stated by the reading's position, in order of statement."""
    table = t.comparison
    query = select(table.c.id, table.c.name).where(table.c.entry <= reading.position).order_by(table.c.id)
    return [(number, name) for number, name in reading.connection.execute(query)]
