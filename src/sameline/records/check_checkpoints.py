"""Does the ledger still begin with the entries of each checkpoint, and is each signed by whom it says?"""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterator, Sequence

from sqlalchemy import Connection, select
from sqlalchemy.exc import DBAPIError

from sameline.errors import SamelineError
from sameline.ledger.checkpoint import Checkpoint, verify_checkpoint
from sameline.records import tables as t
from sameline.records.check_entries import Entries
from sameline.records.findings import Findings
from sameline.records.signing import PersonKey, read_checkpoints, read_keys
from sameline.records.store import Reading


def recorded_checkpoints(connection: Connection, findings: Findings) -> list[Checkpoint]:
    """The checkpoints that the store itself remembers; what cannot be read as one is a finding."""
    try:
        return read_checkpoints(Reading(connection, _ALL))
    except (ValueError, TypeError, DBAPIError) as error:
        findings.add(10, f"the recorded checkpoints cannot be read: {error}", "checkpoint")
        return []


def check_checkpoints(
    connection: Connection,
    findings: Findings,
    said: Entries,
    given: Sequence[Checkpoint],
    recorded: Sequence[Checkpoint],
) -> None:
    """10. Each checkpoint that is given or recorded.

    Args:
        connection: sees the store.
        findings: takes what is found.
        said: what the entries say, with the roots at the checkpoints' sizes.
        given: checkpoints kept elsewhere.
        recorded: those that the store remembers.
    """
    names = set(connection.execute(select(t.laboratory.c.name)).scalars())
    keys = {key.public: key for key in read_keys(Reading(connection, _ALL))}
    for checkpoint, origin in (*((c, "given") for c in given), *((c, "recorded") for c in recorded)):
        for problem in _problems(checkpoint, said, names, keys):
            when = checkpoint.time.strftime("%Y-%m-%d %H:%M:%S")
            findings.add(10, f"{problem} (the {origin} checkpoint of {when} UTC by {checkpoint.signer})", "entry")


def _problems(checkpoint: Checkpoint, said: Entries, names: set[str], keys: dict[bytes, PersonKey]) -> Iterator[str]:
    if checkpoint.laboratory not in names:
        yield f"the checkpoint is of another laboratory, {checkpoint.laboratory}"
    if checkpoint.entries > said.last:
        yield f"the ledger has {said.last} entries, and had {checkpoint.entries}: entries have been taken away"
    elif checkpoint.entries and said.roots.get(checkpoint.entries) != checkpoint.root:
        yield f"the first {checkpoint.entries} entries are not those that the checkpoint states"
    try:
        verify_checkpoint(checkpoint, keys)
    except SamelineError as error:
        yield error.message
        return
    key = keys[checkpoint.key]
    if key.revoked_at is not None and dt.datetime.fromisoformat(key.revoked_at) < checkpoint.time:
        yield f"it was signed with key {key.name} after entry {key.revoked} had revoked it"


_ALL = 2**31 - 1
"""A position after every entry: the check looks at all that is there."""
