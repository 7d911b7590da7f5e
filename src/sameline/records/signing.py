"""Who may sign: public keys as registered and revoked, and the checkpoints that were signed with them.

The private keys are kept outside the store (`sameline.ledger.signatures`); an entry registers the public one.
"""

from __future__ import annotations

import datetime as dt
from dataclasses import dataclass

from sqlalchemy import select

from sameline.errors import CallError
from sameline.ledger.checkpoint import Checkpoint, sign_checkpoint
from sameline.ledger.edwards import check_public_key
from sameline.ledger.signatures import SigningKey, key_id
from sameline.records import tables as t
from sameline.records.acts import Act, read_frontier
from sameline.records.registry import KINDS, current, find
from sameline.records.store import Reading


@dataclass(frozen=True, slots=True)
class PersonKey:
    """A public key as registered.

    Attributes:
        id: of the row.
        person: code of whose it is.
        public: its 32 bytes.
        registered: the entry that registered it.
        revoked: the entry that revoked it, None while it holds.
        revoked_at: when (UTC, ISO 8601), or None.
    """

    id: int
    person: str
    public: bytes
    registered: int
    revoked: int | None
    revoked_at: str | None

    @property
    def name(self) -> str:
        """The short name by which people tell keys apart."""
        return key_id(self.public)


def read_keys(reading: Reading, person: str | None = None) -> list[PersonKey]:
    """The public keys registered by the reading's position, oldest first; only a person's (by code) if one is given."""
    key, revocation, when = t.person_key, t.person_key_revocation, t.entry.alias()
    query = (
        select(key.c.id, t.person.c.code, key.c.public, key.c.entry, revocation.c.entry, when.c.at)
        .join_from(key, t.person, key.c.person == t.person.c.id)
        .outerjoin(revocation, (revocation.c.person_key == key.c.id) & (revocation.c.entry <= reading.position))
        .outerjoin(when, when.c.number == revocation.c.entry)
        .where(key.c.entry <= reading.position)
        .order_by(key.c.id)
    )
    found = [PersonKey(*row) for row in reading.connection.execute(query)]
    return [k for k in found if person in (None, k.person)]


def register_key(act: Act, person: str, public: bytes) -> int:
    """Register a person's public key.

    Returns:
        The row's id.

    Raises:
        CallError: the person is not registered, or the key is, by whomever.
        FormatError: it is no key that can be relied on.
    """
    number = find(act.connection, KINDS["person"], person)
    check_public_key(public)
    known = _by_bytes(act, public)
    if known is not None:
        raise CallError(f"key {known.name} is registered already, as {known.person}'s")
    return act.add(t.person_key, person=number, public=public)


def revoke_key(act: Act, name: str) -> None:
    """Revoke a key by its short name: nothing signed from now on counts.

    Raises:
        CallError: no key has this name, or it is revoked already.
    """
    keys = read_keys(Reading(act.connection, act.number - 1))
    found = [key for key in keys if key.name == name]
    if not found:
        raise CallError(
            f"no key is registered as {name!r}", advice=f"known: {', '.join(k.name for k in keys) or 'none'}"
        )
    if found[0].revoked is not None:
        raise CallError(f"key {name} is revoked already, by entry {found[0].revoked}")
    act.add(t.person_key_revocation, person_key=found[0].id)


def usable_key(act: Act, public: bytes) -> PersonKey:
    """The registered key of the acting person that has these bytes.

    Raises:
        CallError: it is not registered, is somebody else's, or is revoked.
    """
    found = _by_bytes(act, public)
    if found is None:
        raise CallError(f"key {key_id(public)} is not registered", advice="register it with `sameline key add`")
    acting = act.connection.execute(select(t.person.c.code).where(t.person.c.id == act.person)).scalar_one()
    if found.person != acting:
        raise CallError(f"key {found.name} is {found.person}'s, and {acting} is acting")
    if found.revoked is not None:
        raise CallError(f"key {found.name} was revoked by entry {found.revoked}")
    return found


def make_checkpoint(act: Act, signing_key: SigningKey) -> Checkpoint:
    """Sign the ledger's size and root as they are before this act, and record the checkpoint within it.

    Raises:
        CallError: the key is not one that the acting person may sign with.
    """
    key = usable_key(act, signing_key.public)
    entries = act.number - 1
    name = act.connection.execute(select(t.laboratory.c.name).order_by(t.laboratory.c.id.desc())).scalars().first()
    made = sign_checkpoint(
        signing_key,
        laboratory=str(name),
        entries=entries,
        root=read_frontier(act.connection, entries).root(),
        time=dt.datetime.fromisoformat(act.at),
        signer=str(current(act.connection, KINDS["person"], act.person)["name"]),
    )
    act.add(
        t.checkpoint,
        person_key=key.id,
        entries=made.entries,
        root=made.root,
        laboratory=made.laboratory,
        signer=made.signer,
        time=made.time.isoformat(),
        signature=made.signature,
    )
    return made


def read_checkpoints(reading: Reading) -> list[Checkpoint]:
    """The checkpoints recorded by the reading's position, oldest first."""
    table, key = t.checkpoint, t.person_key
    query = (
        select(table, key.c.public)
        .join(key, table.c.person_key == key.c.id)
        .where(table.c.entry <= reading.position)
        .order_by(table.c.id)
    )
    return [
        Checkpoint(
            laboratory=row["laboratory"],
            entries=row["entries"],
            root=row["root"],
            time=dt.datetime.fromisoformat(row["time"]),
            signer=row["signer"],
            key=row["public"],
            signature=row["signature"],
        )
        for row in reading.connection.execute(query).mappings()
    ]


def _by_bytes(act: Act, public: bytes) -> PersonKey | None:
    keys = read_keys(Reading(act.connection, act.number - 1))
    return next((key for key in keys if key.public == public), None)
