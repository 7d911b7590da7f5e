"""Somebody who may do anything to the database: changes records behind Sameline's back, and covers the tracks."""

from __future__ import annotations

import json
import random
from collections.abc import Iterator
from contextlib import ExitStack, contextmanager
from dataclasses import dataclass
from typing import Any

from sqlalchemy import Connection, Float, Integer, LargeBinary, Table, delete, func, insert, select, update
from sqlalchemy.exc import DBAPIError

from sameline.ledger.checkpoint import Checkpoint
from sameline.ledger.manifest import TableRows, manifest_text
from sameline.ledger.merkle import Frontier, leaf_hash, root
from sameline.ledger.rows import row_bytes
from sameline.records import tables as t
from sameline.records.checks import Finding, check_ledger
from sameline.records.store import Store

Row = dict[str, Any]


@contextmanager
def unguarded(store: str) -> Iterator[Connection]:
    """A connection that no trigger, check or foreign key stops; nothing that it does outlasts the block."""
    with Store.open(store) as opened, opened.engine.connect() as connection:
        if connection.dialect.name == "sqlite":
            raw = connection.connection.dbapi_connection
            raw.execute("PRAGMA foreign_keys = OFF")
            raw.execute("PRAGMA ignore_check_constraints = ON")
        with connection.begin() as transaction:
            if connection.dialect.name == "postgresql":
                connection.exec_driver_sql("SET LOCAL session_replication_role = replica")
            yield connection
            transaction.rollback()


@contextmanager
def without_triggers(connection: Connection, table: str) -> Iterator[None]:
    """The triggers of a SQLite table are dropped, and put back word for word as if nothing had happened."""
    if connection.dialect.name != "sqlite":
        yield
        return
    query = "SELECT name, sql FROM sqlite_master WHERE type = 'trigger' AND tbl_name = ?"
    triggers = connection.exec_driver_sql(query, (table,)).all()
    for name, _ in triggers:
        connection.exec_driver_sql(f"DROP TRIGGER {name}")
    yield
    for _, statement in triggers:
        connection.exec_driver_sql(statement)


def found(connection: Connection, *checkpoints: Checkpoint) -> list[Finding]:
    """What checking the ledger finds."""
    return list(check_ledger(connection, checkpoints=checkpoints).findings)


def named(findings: list[Finding], table: str, row: int, check: int | None = None) -> bool:
    """Whether a finding names this row."""
    return any((f.table, f.row) == (table, row) and check in (None, f.check) for f in findings)


def key(table: Table) -> str:
    return "number" if table is t.entry else "id"


def read(connection: Connection, table: Table, number: int) -> Row:
    return dict(connection.execute(select(table).where(table.c[key(table)] == number)).mappings().one())


def write(connection: Connection, table: Table, number: int, /, **fields: Any) -> None:  # noqa: ANN401
    """Change fields of one row."""
    with without_triggers(connection, table.name):
        connection.execute(update(table).where(table.c[key(table)] == number).values(fields))


def remove(connection: Connection, table: Table, number: int) -> None:
    """Delete one row."""
    with without_triggers(connection, table.name):
        connection.execute(delete(table).where(table.c[key(table)] == number))


def add(connection: Connection, table: Table, row: Row) -> None:
    """Add one row."""
    connection.execute(insert(table), [row])


def last(connection: Connection, table: Table) -> int:
    return connection.execute(select(func.max(table.c[key(table)]))).scalar() or 0


def digest(table: Table, row: Row) -> bytes:
    """The digest that a row of these fields would have had."""
    return leaf_hash(row_bytes(table.name, {name: value for name, value in row.items() if name != "digest"}))


def rehash_row(connection: Connection, table: Table, number: int) -> None:
    """Give a row the digest of the fields that it has now."""
    write(connection, table, number, digest=digest(table, read(connection, table, number)))


def rehash_all(connection: Connection) -> None:
    """Make every digest, root, link and tree node anew, so that the ledger agrees with itself."""
    with ExitStack() as dropped:
        for table in t.metadata.tables:
            dropped.enter_context(without_triggers(connection, table))
        _rehash(connection)


def _rehash(connection: Connection) -> None:
    prior, frontier, nodes = None, Frontier(), []
    for number in range(1, last(connection, t.entry) + 1):
        row = read(connection, t.entry, number)
        row["rows"] = manifest_text(
            [_rehashed(connection, t.metadata.tables[part["table"]], part) for part in json.loads(row["rows"])]
        )
        row["prior"] = prior
        prior = digest(t.entry, row)
        write(connection, t.entry, number, rows=row["rows"], prior=row["prior"], digest=prior)
        nodes += [node for node in frontier.add(prior) if node[0]]
    connection.execute(delete(t.tree_node))
    connection.execute(
        insert(t.tree_node), [{"level": level, "position": position, "hash": h} for level, position, h in nodes]
    )


def forget(connection: Connection, table: Table) -> None:
    """Take all rows of a table away, and out of what the entries say they wrote."""
    with without_triggers(connection, table.name):
        connection.execute(delete(table))
    for number, text in connection.execute(select(t.entry.c.number, t.entry.c.rows)).all():
        kept = [part for part in json.loads(text) if part["table"] != table.name]
        write(connection, t.entry, number, rows=json.dumps(kept, separators=(",", ":"), sort_keys=True))


def _rehashed(connection: Connection, table: Table, part: dict[str, Any]) -> TableRows:
    ids = range(part["first"], part["first"] + part["count"])
    for number in ids:
        rehash_row(connection, table, number)
    return TableRows(
        table.name, part["first"], part["count"], root([read(connection, table, n)["digest"] for n in ids])
    )


# -- random single changes ------------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Change:
    """What was done to which row."""

    what: str
    table: str
    row: int


def change_something(connection: Connection, seed: int) -> Change | None:
    """Do one thing to one record; None where the database does not let it be done, or it would change nothing."""
    rng = random.Random(seed)  # noqa: S311 - chance, not secrecy
    table = rng.choice([t.entry, *t.recorded_tables()])
    number = connection.execute(select(table.c[key(table)])).scalars().all()
    if not number:
        return None
    what = rng.choice([_field, _field, _field_and_digest, _delete, _double, _swap, _digest_only, _renumber])
    chosen = rng.choice(number)
    try:
        done = what(connection, rng, table, chosen)
    except DBAPIError:
        return None
    return Change(what.__name__.strip("_"), table.name, chosen) if done else None


def _field(connection: Connection, rng: random.Random, table: Table, number: int) -> bool:
    name = rng.choice([c.name for c in table.columns if c.name not in {key(table), "digest"}])
    before = read(connection, table, number)[name]
    after = _other(rng, table.c[name].type, before, nullable=bool(table.c[name].nullable))
    if after == before:
        return False
    write(connection, table, number, **{name: after})
    return True


def _field_and_digest(connection: Connection, rng: random.Random, table: Table, number: int) -> bool:
    if not _field(connection, rng, table, number):
        return False
    rehash_row(connection, table, number)
    return True


def _digest_only(connection: Connection, rng: random.Random, table: Table, number: int) -> bool:
    write(connection, table, number, digest=_flipped(rng, read(connection, table, number)["digest"]))
    return True


def _delete(connection: Connection, _rng: random.Random, table: Table, number: int) -> bool:
    remove(connection, table, number)
    return True


def _double(connection: Connection, rng: random.Random, table: Table, number: int) -> bool:
    """Add a row like another, with the digest that it should have."""
    row = read(connection, table, number)
    row[key(table)] = last(connection, table) + rng.choice([1, 1, 7])
    for unique in ("code", "name"):
        if unique in row:
            row[unique] += "x"
    row["digest"] = digest(table, row)
    add(connection, table, row)
    return True


def _swap(connection: Connection, rng: random.Random, table: Table, number: int) -> bool:
    """Let two rows change places, each with the digest that it then should have."""
    other = rng.randint(1, last(connection, table))
    one, two = read(connection, table, number), read(connection, table, other)
    fixed = {key(table), "entry", "digest"}
    if all(one[name] == two[name] for name in one.keys() - fixed):
        return False
    write(connection, table, other, **{n: None if table.c[n].nullable else v for n, v in two.items() if n == "code"})
    remove(connection, table, other)
    write(connection, table, number, **{n: v for n, v in two.items() if n not in fixed})
    add(connection, table, {**two, **{n: v for n, v in one.items() if n not in fixed}})
    rehash_row(connection, table, number)
    rehash_row(connection, table, other)
    return True


def _renumber(connection: Connection, rng: random.Random, table: Table, number: int) -> bool:
    new = last(connection, table) + rng.choice([1, 3, 10**6])
    write(connection, table, number, **{key(table): new})
    return True


def changed(connection: Connection, table: Table, column: str, number: int) -> None:
    """Change one field of one row in the least way."""
    before = read(connection, table, number)[column]
    kind = table.c[column].type
    after = before + 5000 if isinstance(kind, Integer) and before is not None else None
    other = _other(random.Random(number), kind, before, nullable=False)  # noqa: S311 - chance, not secrecy
    write(connection, table, number, **{column: other if after is None else after})


def _other(rng: random.Random, kind: object, before: Any, *, nullable: bool) -> Any:  # noqa: ANN401 - a field
    if before is not None and nullable and rng.random() < 0.1:
        return None
    if isinstance(kind, Integer):
        return (before or 0) + rng.choice([-1, 1, 1, 100])
    if isinstance(kind, Float):
        return rng.choice([(before or 0.0) * (1 + 2**-52) + 1e-300, (before or 0.0) + 0.1, -(before or 1.0)])
    if isinstance(kind, LargeBinary):
        return _flipped(rng, before or bytes(32))
    return _altered(rng, before or "x")


def _flipped(rng: random.Random, value: bytes) -> bytes:
    at = rng.randrange(len(value))
    return value[:at] + bytes([value[at] ^ 1 << rng.randrange(8)]) + value[at + 1 :]


def _altered(rng: random.Random, text: str) -> str:
    """One character is another: a digit another digit, a letter another letter; or a space is added at the end."""
    at = rng.randrange(len(text) + 1)
    if at == len(text):
        return text + " "
    pool = "0123456789" if text[at].isdigit() else "abcdefghijklmnopqrstuvwxyz"
    return text[:at] + rng.choice(pool.replace(text[at], "")) + text[at + 1 :]
