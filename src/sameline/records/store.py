"""A store: opened or made, read as of any ledger entry, and written by one act at a time."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Self

from sqlalchemy import Connection, Engine, func, select
from sqlalchemy.exc import DBAPIError

from sameline.errors import CallError, StoreError
from sameline.records import engine as engines
from sameline.records import schema
from sameline.records.acts import Act
from sameline.records.moments import is_date, read_moment
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
        with opened._or_closed(), said_plainly(str(opened)):
            with opened._engine.connect() as connection:
                revision = schema.found_revision(connection)
                schema.check_revision(revision)
                if not _has_entries(connection):
                    raise StoreError(
                        "the making of this store was cut short", advice="run `sameline init` again; it goes on"
                    )
            engines.keep_log_ahead(opened._engine)
        return opened

    @classmethod
    def create(cls, store: str | Path, *, upgrade: bool = False) -> tuple[Store, bool]:
        """Make a store, or with `upgrade` bring an older one to this Sameline's schema.

        Returns:
            The store, and whether it is new: whether its first entry is still to be recorded.

        Raises:
            StoreError: there is a store already (and `upgrade` was not asked), or the place cannot be written.
        """
        opened = cls(engines.make_engine(engines.store_url(store), must_exist=upgrade))
        with opened._or_closed(), said_plainly(str(opened)):
            with engines.for_writing(opened._engine) as connection, connection.begin():
                engines.lock_for_writing(connection)
                new = opened._make(connection, upgrade=upgrade)
            engines.keep_log_ahead(opened._engine)
        return opened, new

    def _make(self, connection: Connection, *, upgrade: bool) -> bool:
        revision = schema.found_revision(connection)
        if revision is not None and (revision not in schema.REVISIONS or (_has_entries(connection) and not upgrade)):
            schema.check_revision(revision)
            raise StoreError(
                "there is a store here already",
                where=str(self),
                advice="use it as it is, or name another file with --store",
            )
        schema.upgrade(connection)
        return not _has_entries(connection)

    @contextmanager
    def _or_closed(self) -> Iterator[None]:
        try:
            yield
        except BaseException:
            self.close()
            raise

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
        with said_plainly(str(self)), engines.for_reading(self._engine) as connection, connection.begin():
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
            said_plainly(str(self)),
            engines.for_writing(self._engine) as connection,
            connection.begin(),
        ):
            engines.lock_for_writing(connection)
            act = Act(connection, what, person=1 if first else _person(connection, by), at=at, reason=reason)
            if first and act.number != 1:
                raise StoreError("somebody else made this store just now", advice="use it as it is")
            yield act
            if not act.abandoned:
                act.record()


def _has_entries(connection: Connection) -> bool:
    """Whether anything was recorded: making a store may have been cut short before its first entry."""
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
    moment = read_moment(as_of, zone, whole_day=True)
    seen = entry.c.at < moment if is_date(as_of) else entry.c.at <= moment
    found = connection.execute(select(func.max(entry.c.number)).where(seen)).scalar()
    if found is None:
        raise CallError(f"nothing had been recorded by {as_of}", advice="`sameline trail` shows the first entry")
    return int(found)


@contextmanager
def said_plainly(where: str) -> Iterator[None]:
    """Turn what a database driver raises into what a person can act on."""
    try:
        yield
    except DBAPIError as error:
        problem, advice = _in_plain_words(str(error.orig).strip() or type(error.orig).__name__)
        raise StoreError(problem, where=where, advice=advice) from error
    except StoreError as error:
        error.where = error.where or where
        raise


def _in_plain_words(text: str) -> tuple[str, str | None]:
    first = text.splitlines()[0]
    for sign, problem, advice in _SIGNS:
        if sign in text.lower():
            return problem.format(first), advice
    return f"the database refused: {first}", None


_PERMISSIONS = "check the permissions of the file and of its folder, which must be writable too"
_HELD = f"another writer held the store for more than {engines.BUSY_SECONDS} s"
_UNREACHED = "the server cannot be reached: {}"
_REACH = "check the URL's host and port, and that the server runs"
_TRY_AGAIN = "try again; if no other Sameline runs, look for a backup or sync program that holds the file"

_SIGNS = (
    ("not a database", "this file is not a store", "name another file with --store"),
    ("malformed", "the store is damaged", "restore it from a backup; `sameline verify` tells what can still be read"),
    ("locked", _HELD, _TRY_AGAIN),
    ("lock timeout", _HELD, "try again; look for a writer that hangs, in the server's list of sessions"),
    ("readonly", "the store, or the folder it is in, cannot be written", _PERMISSIONS),
    ("unable to open", "the store cannot be opened", _PERMISSIONS),
    ("is full", "the disk is full; nothing was recorded", "make room, then do it again"),
    ("no space left", "the disk is full; nothing was recorded", "make room, then do it again"),
    ("disk i/o error", "the disk cannot be read or written", "nothing was recorded; check the disk"),
    ("permission denied", "the database does not allow this", "ask whoever runs the server for the rights to it"),
    ("authentication failed", "the server does not let this user in: {}", "check the user and the password"),
    ("does not exist", "the database lacks something: {}", "check the URL's user and database"),
    ("resolve host", _UNREACHED, _REACH),
    ("translate host", _UNREACHED, _REACH),
    ("connection", _UNREACHED, _REACH),
    ("timeout", _UNREACHED, _REACH),
    ("records are never", "records are never changed or deleted", "amend instead"),
)
"""What a driver's message contains, what that means, and what to do."""
