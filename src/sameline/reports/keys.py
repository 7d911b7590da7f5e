"""Public keys as text and as a document."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict
from typing import Any

from sameline.ledger.signatures import public_text
from sameline.records.answers import Conclusion
from sameline.records.conclusion_signatures import Signature
from sameline.records.signing import PersonKey
from sameline.reports.text import moment, table


def keys_text(keys: Sequence[PersonKey]) -> list[str]:
    """The keys, oldest first, and whether they hold."""
    if not keys:
        return ["No key is registered. `sameline key make FILE` makes one."]
    rows = [(k.name, k.person, str(k.registered), _state(k), public_text(k.public)) for k in keys]
    return table(("key", "person", "entry", "state", "public key"), rows, "<<><<", indent="")


def _state(key: PersonKey) -> str:
    return "holds" if key.revoked is None else f"revoked by entry {key.revoked}"


def keys_document(keys: Sequence[PersonKey]) -> list[dict[str, Any]]:
    """The same for other programs."""
    return [
        {
            "key": k.name,
            "person": k.person,
            "registered": k.registered,
            "revoked": k.revoked,
            "revoked_at": k.revoked_at,
            "public": public_text(k.public),
        }
        for k in keys
    ]


def signatures_text(signed: Sequence[tuple[int, Signature]], conclusion: Conclusion) -> list[str]:
    """Who signed this version as what; where an earlier version was signed and this one is not, that is said."""
    own = [s for version, s in signed if version == conclusion.version]
    if own:
        return ["", *(f"  Signed as {s.meaning} by {s.signer}, {moment(s.time)}, key {s.key}." for s in own)]
    if not signed:
        return []
    version, last = signed[-1]
    return [
        "",
        f"  NOT SIGNED. Version {version} was signed as {last.meaning} by {last.signer}; what came after it is not.",
    ]


def signatures_document(signed: Sequence[tuple[int, Signature]]) -> list[dict[str, Any]]:
    """The same for other programs."""
    return [{"version": version, **asdict(s)} for version, s in signed]
