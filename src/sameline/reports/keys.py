"""Public keys as text and as a document."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from sameline.ledger.signatures import public_text
from sameline.records.signing import PersonKey
from sameline.reports.text import table


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
