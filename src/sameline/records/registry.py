"""What is registered: persons, suppliers, materials, batches, characteristics, instruments.

Each has an identity (its code, which never changes) and particulars (which may be restated: the last recorded hold).
"""

from __future__ import annotations

import difflib
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from sqlalchemy import Connection, Table, func, select

from sameline.errors import CallError
from sameline.records import tables
from sameline.records.acts import Act
from sameline.records.store import Reading

Fields = Mapping[str, Any]


@dataclass(frozen=True, slots=True)
class Kind:
    """A kind of registered thing.

    Attributes:
        name: its word, which is also its identity table's name and the column by which others refer to it.
        refers: the particulars that are references: column -> kind.
    """

    name: str
    refers: tuple[str, ...] = ()

    @property
    def identity(self) -> Table:
        """The table of codes."""
        return tables.metadata.tables[self.name]

    @property
    def particulars(self) -> Table:
        """The table of particulars."""
        return tables.metadata.tables[f"{self.name}_particulars"]

    @property
    def columns(self) -> tuple[str, ...]:
        """The particulars' columns, without bookkeeping."""
        outside = {"id", "entry", "digest", self.name}
        return tuple(column.name for column in self.particulars.columns if column.name not in outside)


KINDS = {
    kind.name: kind
    for kind in (
        Kind("person"),
        Kind("supplier"),
        Kind("material"),
        Kind("instrument"),
        Kind("batch", refers=("material", "supplier")),
        Kind("characteristic"),
    )
}


def register(act: Act, kind: Kind, code: str, *, unit: str | None = None, **particulars: Any) -> int:  # noqa: ANN401
    """Register a new thing under its code; references among the particulars are given as codes.

    Raises:
        CallError: the code is empty or taken, or a reference is to nothing registered.
    """
    code = code.strip()
    if not code or any(not character.isprintable() for character in code):
        raise CallError(f"{code!r} is not a code for a {kind.name}", advice="use printable characters, at least one")
    taken = act.connection.execute(select(kind.identity.c.id).where(kind.identity.c.code == code)).scalar()
    if taken is not None or any(row["code"] == code for row in act.pending(kind.identity)):
        raise CallError(
            f"a {kind.name} is registered as {code!r} already", advice=f"`sameline list {kind.name}` shows it"
        )
    identity = {"code": code, "unit": unit} if unit is not None else {"code": code}
    number = act.add(kind.identity, **identity)
    _state(act, kind, number, particulars)
    return number


def restate(act: Act, kind: Kind, code: str, **changes: Any) -> int:  # noqa: ANN401 - any column's value
    """State some particulars anew; the others stay as they were.

    Raises:
        CallError: nothing is registered under this code, or nothing would change.
    """
    number = find(act.connection, kind, code)
    now = current(act.connection, kind, number)
    if all(_as_kept(act.connection, kind, column, value) == now[column] for column, value in changes.items()):
        raise CallError(f"{kind.name} {code!r} says so already; nothing to change")
    stated = {**now, **{k: _as_kept(act.connection, kind, k, v) for k, v in changes.items()}}
    act.add(kind.particulars, **{kind.name: number}, **stated)
    return number


def find(connection: Connection, kind: Kind, code: str) -> int:
    """The id of what is registered under a code.

    Raises:
        CallError: nothing is; the nearest code is named.
    """
    found = connection.execute(select(kind.identity.c.id).where(kind.identity.c.code == code)).scalar()
    if found is None:
        raise CallError(f"no {kind.name} is registered as {code!r}", advice=_nearest(connection, kind, code))
    return int(found)


def current(connection: Connection, kind: Kind, number: int, position: int | None = None) -> dict[str, Any]:
    """The particulars that hold, as of a ledger position if one is given; references as ids."""
    table = kind.particulars
    query = select(*(table.c[column] for column in kind.columns)).where(table.c[kind.name] == number)
    if position is not None:
        query = query.where(table.c.entry <= position)
    return dict(connection.execute(query.order_by(table.c.id.desc()).limit(1)).mappings().one())


def listing(reading: Reading, kind: Kind) -> list[dict[str, Any]]:
    """All that is registered of a kind, in order of registration: code, unit if it has one, particulars by code."""
    identity, table = kind.identity, kind.particulars
    newest = (
        select(func.max(table.c.id))
        .where(table.c.entry <= reading.position)
        .group_by(table.c[kind.name])
        .scalar_subquery()
    )
    own = [column for column in identity.columns if column.name in {"code", "unit"}]
    columns: list[Any] = [*own]
    source = table.join(identity, table.c[kind.name] == identity.c.id)
    for column in kind.columns:
        if column in kind.refers:
            other = KINDS[column].identity
            source = source.join(other, table.c[column] == other.c.id)
            columns.append(other.c.code.label(column))
        else:
            columns.append(table.c[column])
    query = select(*columns).select_from(source).where(table.c.id.in_(newest)).order_by(identity.c.id)
    return [dict(row) for row in reading.connection.execute(query).mappings()]


def codes(connection: Connection, kind: Kind) -> dict[int, str]:
    """The codes, by id, of all that is registered of a kind."""
    return {row.id: row.code for row in connection.execute(select(kind.identity.c.id, kind.identity.c.code))}


def _state(act: Act, kind: Kind, number: int, particulars: Fields) -> None:
    kept = {column: _as_kept(act.connection, kind, column, value) for column, value in particulars.items()}
    act.add(kind.particulars, **{kind.name: number}, **kept)


def _as_kept(connection: Connection, kind: Kind, column: str, value: Any) -> Any:  # noqa: ANN401
    """A reference's code as the id that the table keeps; other values as they are."""
    return find(connection, KINDS[column], value) if column in kind.refers and isinstance(value, str) else value


def _nearest(connection: Connection, kind: Kind, code: str) -> str:
    known = list(codes(connection, kind).values())
    near = difflib.get_close_matches(code, known, n=1, cutoff=0.6)
    if near:
        return f"did you mean {near[0]!r}?"
    return (
        f"`sameline list {kind.name}` shows what is registered"
        if known
        else f"register it with `sameline add {kind.name}`"
    )
