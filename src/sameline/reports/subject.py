"""What a conclusion is about, in the words and units that a reader needs beside its figures."""

from __future__ import annotations

from dataclasses import dataclass

from sameline.records.answers import Conclusion
from sameline.records.comparisons import Revision, effective_margin, read_revision
from sameline.records.concluded import codes_of
from sameline.records.registry import KINDS, current
from sameline.records.store import Reading


@dataclass(frozen=True, slots=True)
class Subject:
    """The question and the characteristic behind a conclusion.

    Attributes:
        revision: the comparison's revision.
        characteristic: code.
        name, method, unit: of the characteristic; the method may be None.
        lower, upper: specification limits, or None.
        margin: that held, or None.
        decimals: reported for single values.
        safety_critical: whether a safety-critical part depends on it.
        filter: which batches it takes, in words ("all batches of EPDM-70"), or None where its groups are listed.
    """

    revision: Revision
    characteristic: str
    name: str
    method: str | None
    unit: str
    lower: float | None
    upper: float | None
    margin: float | None
    decimals: int
    safety_critical: bool
    filter: str | None


def read_subject(reading: Reading, conclusion: Conclusion) -> Subject:
    """The subject of a conclusion, as it was when the conclusion read the records."""
    then = Reading(reading.connection, conclusion.position, latest=False)
    revision = read_revision(then, conclusion.comparison, revision_id=conclusion.revision_id)
    kind = KINDS["characteristic"]
    stated = current(reading.connection, kind, revision.characteristic, conclusion.position)
    identity = (
        reading.connection.execute(kind.identity.select().where(kind.identity.c.id == revision.characteristic))
        .mappings()
        .one()
    )
    return Subject(
        revision=revision,
        characteristic=identity["code"],
        name=stated["name"],
        method=stated["method"],
        unit=identity["unit"],
        lower=stated["lower"],
        upper=stated["upper"],
        margin=effective_margin(then, revision),
        decimals=2 if stated["decimals"] is None else stated["decimals"],
        safety_critical=bool(stated["safety_critical"]),
        filter=_filter(reading, revision),
    )


_PLURAL = {"batch": "batches", "material": "materials", "supplier": "suppliers"}


def _filter(reading: Reading, revision: Revision) -> str | None:
    if revision.groups is not None:
        return None
    words = [f"all {_PLURAL[revision.grouping]} with results"]
    for number, kind, link in ((revision.of_material, "material", "of"), (revision.of_supplier, "supplier", "from")):
        if number is not None:
            words.append(f"{link} {codes_of(reading.connection, kind, [number])[number]}")
    if revision.tested_from is not None:
        words.append(f"tested from {revision.tested_from[:10]}")
    return " ".join(words)
