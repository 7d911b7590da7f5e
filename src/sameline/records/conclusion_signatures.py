"""Signatures with a meaning on versions of conclusions: made, read, and checked.

What is signed names the comparison, the version, and the digest of the ledger entry that recorded it, which commits to
every figure of the conclusion. So a signature is of one version only: what turns later is not signed.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from sqlalchemy import Connection, select

from sameline.errors import CallError, SamelineError
from sameline.ledger.canonical import canonical
from sameline.ledger.signatures import verify_signature
from sameline.records import tables as t
from sameline.records.acts import Act, entry_digest
from sameline.records.answers import Conclusion
from sameline.records.findings import Findings
from sameline.records.registry import KINDS, current
from sameline.records.signing import PersonKey, read_keys, usable_key
from sameline.records.store import Reading

if TYPE_CHECKING:
    from sameline.ledger.signatures import SigningKey

MEANINGS = ("prepared", "reviewed", "approved")
PURPOSE = "conclusion"


@dataclass(frozen=True, slots=True)
class Signature:
    """One signature on one version of a conclusion.

    Attributes:
        conclusion: id of the conclusion.
        meaning: "prepared", "reviewed" or "approved".
        person: code of the signer.
        signer: the signer's name as it was.
        time: when (UTC, ISO 8601).
        key: the key's short name.
        entry: the entry that recorded it.
    """

    conclusion: int
    meaning: str
    person: str
    signer: str
    time: str
    key: str
    entry: int


def sign(act: Act, conclusion: Conclusion, meaning: str, signing_key: SigningKey) -> None:
    """Sign a version of a conclusion within an act.

    Raises:
        CallError: the meaning is none of `MEANINGS`, the key is not the acting person's, the person signed this
            version already in a role that excludes this one, or an approval comes before anything was prepared.
    """
    if meaning not in MEANINGS:
        raise CallError(f"there is no meaning {meaning!r}", advice=f"one of {', '.join(MEANINGS)}")
    key = usable_key(act, signing_key.public)
    made = read_signatures(Reading(act.connection, act.number - 1), conclusion.id)
    _check_roles(made, meaning, key.person, conclusion)
    signer = str(current(act.connection, KINDS["person"], act.person)["name"])
    time = dt.datetime.fromisoformat(act.at).isoformat()
    digest = entry_digest(act.connection, conclusion.entry) or b""
    statement = _statement(conclusion.name, conclusion.version, conclusion.entry, digest, meaning, signer, time)
    act.add(
        t.conclusion_signature,
        conclusion=conclusion.id,
        person_key=key.id,
        meaning=meaning,
        signer=signer,
        time=time,
        signature=signing_key.sign(PURPOSE, statement),
    )


def _check_roles(made: list[Signature], meaning: str, person: str, conclusion: Conclusion) -> None:
    own = {s.meaning for s in made if s.person == person}
    what = f"{conclusion.name} v{conclusion.version}"
    if meaning in own:
        raise CallError(f"{person} signed {what} as {meaning} already")
    if meaning == "approved" and not any(s.meaning == "prepared" for s in made):
        raise CallError(f"nobody has signed {what} as prepared", advice="the one who prepared it signs first")
    if (meaning == "approved" and own) or "approved" in own:
        raise CallError(
            f"{person} signed {what} as {', '.join(sorted(own))}",
            advice="the approver is another person than the others",
        )


def read_signatures(reading: Reading, conclusion: int | None = None) -> list[Signature]:
    """The signatures by the reading's position, oldest first; only those on one conclusion if its id is given."""
    keys = {key.id: key for key in read_keys(reading)}
    table = t.conclusion_signature
    query = select(table).where(table.c.entry <= reading.position).order_by(table.c.id)
    if conclusion is not None:
        query = query.where(table.c.conclusion == conclusion)
    return [
        Signature(
            conclusion=row["conclusion"],
            meaning=row["meaning"],
            person=keys[row["person_key"]].person,
            signer=row["signer"],
            time=row["time"],
            key=keys[row["person_key"]].name,
            entry=row["entry"],
        )
        for row in reading.connection.execute(query).mappings()
    ]


def check_signatures(connection: Connection, findings: Findings) -> None:
    """11. Each signature on a conclusion: of a key that held then, over what the record says."""
    keys = {key.id: key for key in read_keys(Reading(connection, _ALL))}
    table, conclusion, comparison, entry = t.conclusion_signature, t.conclusion, t.comparison, t.entry
    query = (
        select(
            *(table.c[name] for name in ("id", "entry", "person_key", "meaning", "signer", "time", "signature")),
            conclusion.c.version,
            conclusion.c.entry.label("recorded"),
            comparison.c.name,
            entry.c.digest.label("recorded_digest"),
        )
        .join_from(table, conclusion, table.c.conclusion == conclusion.c.id)
        .join(comparison, conclusion.c.comparison == comparison.c.id)
        .join(entry, conclusion.c.entry == entry.c.number)
        .order_by(table.c.id)
    )
    for row in connection.execute(query).mappings():
        for problem in _problems(row, keys):
            findings.add(11, problem, "conclusion_signature", row["id"], row["entry"])


def _problems(row: Any, keys: dict[int, PersonKey]) -> Iterator[str]:  # noqa: ANN401 - a row of the query above
    what = f"the signature on {row['name']} v{row['version']} as {row['meaning']}"
    key = keys.get(row["person_key"])
    if key is None:
        yield f"{what} is of a key that is not registered"
        return
    statement = _statement(
        row["name"], row["version"], row["recorded"], row["recorded_digest"], row["meaning"], row["signer"], row["time"]
    )
    try:
        verify_signature(key.public, PURPOSE, statement, row["signature"])
        signed = dt.datetime.fromisoformat(row["time"])
    except (SamelineError, ValueError, TypeError) as error:
        yield f"{what} does not hold: {error}"
        return
    if key.revoked_at is not None and dt.datetime.fromisoformat(key.revoked_at) < signed:
        yield f"{what} was made with key {key.name} after entry {key.revoked} had revoked it"


def _statement(name: str, version: int, entry: int, digest: bytes, meaning: str, signer: str, time: str) -> bytes:
    return canonical(
        {
            "comparison": name,
            "version": version,
            "entry": entry,
            "entry_digest": digest.hex(),
            "meaning": meaning,
            "signer": signer,
            "time": time,
        }
    )


_ALL = 2**31 - 1
"""A position after every entry: the check looks at all that is there."""
