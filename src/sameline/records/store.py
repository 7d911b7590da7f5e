"""A store: opened or made, read as of any ledger entry, and written by one act at a time."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Self

from sqlalchemy import Connection, Engine, func, select
from sqlalchemy.exc import DBAPIError, OperationalError

from sameline.errors import CallError, StoreError
from sameline.records import engine as engines
from sameline.records import schema
from sameline.records.acts import Act
from sameline.records.moments import read_moment
from sameline.records.tables import entry, laboratory, person


@dataclass(frozen=True, slots=True)
class Reading:
    """A view of the records as they were after one ledger entry.

    Attributes:
        connection: an open connection, in a transaction.
        position: the number of the last entry that is seen.
        latest: whether nothing had been recorded after it when the view was opened.
    """

    connection: Connection
    position: int
    latest: bool = True


class Store:
    """The records of one laboratory.

    Make it with `Store.open` (a store that exists) or `Store.create`; close it, or use it in a `with` block.
    """

    def __init__(self, engine: Engine) -> None:
        self._engine = engine

    @classmethod
    def open(cls, store: str | Path) -> Store:
        """Open a store that exists.

        Raises:
            StoreError: it is missing, is something else, or belongs to an older or newer Sameline.
        """
        opened = cls(engines.make_engine(engines.store_url(store), must_exist=True))
        with _said_plainly(str(opened)), opened._engine.connect() as connection:
            schema.check_revision(schema.found_revision(connection))
        return opened

    @classmethod
    def create(cls, store: str | Path, *, upgrade: bool = False) -> tuple[Store, bool]:
        """Make a store, or with `upgrade` bring an older one to this Sameline's schema.

        Returns:
            The store, and whether it is new.

        Raises:
            StoreError: there is a store already (and `upgrade` was not asked), or the place cannot be written.
        """
        opened = cls(engines.make_engine(engines.store_url(store), must_exist=upgrade))
        with _said_plainly(str(opened)), engines.for_writing(opened._engine) as connection, connection.begin():
            engines.lock_for_writing(connection)
            revision = schema.found_revision(connection)
            if revision is not None and not upgrade and _has_entries(connection, revision):
                schema.check_revision(revision)
                raise StoreError(
                    "there is a store here already",
                    where=str(opened),
                    advice="use it as it is, or name another file with --store",
                )
            if revision is not None and revision not in schema.REVISIONS:
                schema.check_revision(revision)
            schema.upgrade(connection)
            return opened, not _has_entries(connection, schema.REVISIONS[-1])

    def __str__(self) -> str:
        url = self._engine.url
        return url.database or "" if url.get_backend_name() == "sqlite" else url.render_as_string(hide_password=True)

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def close(self) -> None:
        """Let go of the database."""
        self._engine.dispose()

    @property
    def engine(self) -> Engine:
        """The SQLAlchemy engine, for those who check the records."""
        return self._engine

    @contextmanager
    def reading(self, as_of: int | str | None = None) -> Iterator[Reading]:
        """A view of the records: the latest, or as of an entry's number or a moment.

        Args:
            as_of: an entry's number, or a date or time (ISO 8601; without a zone, the laboratory's).
        """
        with _said_plainly(str(self)), self._engine.connect() as connection, connection.begin():
            head = connection.execute(select(func.coalesce(func.max(entry.c.number), 0))).scalar_one()
            position = head if as_of is None else _position(connection, as_of, head)
            yield Reading(connection, position, latest=position == head)

    @contextmanager
    def act(self, what: str, *, by: str, at: str, reason: str | None = None, first: bool = False) -> Iterator[Act]:
        """One act: one transaction, one ledger entry. It is recorded when the block ends, or not at all.

        Args:
            what: the act's name, such as "log".
            by: the code of the person acting.
            at: the moment (UTC, ISO 8601).
            reason: why, where a reason is asked for.
            first: the store's first act, whose person is registered within it.
        """
        with (
            _said_plainly(str(self)),
            engines.for_writing(self._engine) as connection,
            connection.begin(),
        ):
            engines.lock_for_writing(connection)
            act = Act(connection, what, person=1 if first else _person(connection, by), at=at, reason=reason)
            yield act
            act.record()


def _has_entries(connection: Connection, revision: str) -> bool:
    """Whether anything was recorded: making a store may have been cut short before its first entry."""
    if revision not in schema.REVISIONS:
        return True
    return connection.execute(select(entry.c.number).limit(1)).first() is not None


def _person(connection: Connection, code: str) -> int:
    found = connection.execute(select(person.c.id).where(person.c.code == code)).scalar()
    if found is None:
        known = connection.execute(select(person.c.code).order_by(person.c.id).limit(12)).scalars().all()
        raise CallError(
            f"no person is registered as {code!r}",
            advice=f"known: {', '.join(known)}; add one with `sameline add person CODE --name NAME`",
        )
    return int(found)


def _position(connection: Connection, as_of: int | str, head: int) -> int:
    """The number of the last entry that a reading as of this entry or moment sees."""
    if isinstance(as_of, int) or as_of.isdecimal():
        number = int(as_of)
        if not 1 <= number <= head:
            raise CallError(f"the ledger has no entry {number}", advice=f"entries run from 1 to {head}")
        return number
    zone = connection.execute(select(laboratory.c.zone).order_by(laboratory.c.id.desc()).limit(1)).scalar() or "UTC"
    moment = read_moment(as_of, zone)
    if len(as_of.strip()) == len("2026-03-04"):
        moment = moment_after_day(moment)
    found = connection.execute(select(func.max(entry.c.number)).where(entry.c.at < moment)).scalar()
    if found is None:
        raise CallError(f"nothing had been recorded by {as_of}", advice="`sameline trail` shows the first entry")
    return int(found)


def moment_after_day(moment: str) -> str:
    """The moment one day later: a date given alone means its whole day."""
    import datetime as dt

    from sameline.records.moments import utc_text

    return utc_text(dt.datetime.fromisoformat(moment) + dt.timedelta(days=1))


@contextmanager
def _said_plainly(where: str) -> Iterator[None]:
    """Turn what a database driver raises into what a person can act on."""
    try:
        yield
    except OperationalError as error:
        raise StoreError(*_operational(error), where=where, advice=_advice(error)) from error
    except DBAPIError as error:
        if isinstance(error.orig, sqlite3.DatabaseError) and "not a database" in str(error.orig):
            raise StoreError(
                "this file is not a store", where=where, advice="name another file with --store"
            ) from error
        raise StoreError(f"the database refused: {error.orig}", where=where) from error


def _operational(error: OperationalError) -> tuple[str]:
    text = str(error.orig)
    if "locked" in text:
        return (f"another writer held the store for more than {engines.BUSY_SECONDS} s",)
    if "readonly" in text:
        return ("the store can be read but not written",)
    if "unable to open" in text:
        return ("the store cannot be opened",)
    if "full" in text:
        return ("the disk is full; nothing was recorded",)
    return (f"the database cannot be used: {text.splitlines()[0]}",)


def _advice(error: OperationalError) -> str | None:
    text = str(error.orig)
    if "readonly" in text or "unable to open" in text:
        return "check the permissions of the file and of its folder, which must be writable too"
    if "locked" in text:
        return "try again; if no other Sameline runs, look for a backup or sync program that holds the file"
    return None
