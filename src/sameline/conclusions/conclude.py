"""One look: a comparison is answered from the records as they are, and the answer recorded."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from sqlalchemy import select

from sameline.conclusions.answer import answer
from sameline.conclusions.inputs import gather
from sameline.conclusions.past import NO_PAST, past_of
from sameline.conclusions.turns import because, turns
from sameline.records import concluded
from sameline.records.acts import Act
from sameline.records.answers import Answer, Conclusion, Turn
from sameline.records.comparisons import Revision, read_revision
from sameline.records.scope import behind, touches_since
from sameline.records.store import Reading, Store
from sameline.records.tables import entry

ACT = "conclude"


def bring_up_to_date(store: Store, comparison: int, *, by: str, at: str) -> Conclusion:
    """Answer a comparison from the records as they are now, in a transaction of its own.

    Args:
        store: the store.
        comparison: the comparison's id.
        by: code of the person whose act led to it.
        at: the moment (UTC, ISO 8601).

    Returns:
        The conclusion as recorded: a new one, or where another process was faster, the one that it recorded.
    """
    with store.act(ACT, by=by, at=at) as act:
        last = _last_if_up_to_date(act, comparison)
        if last is not None:
            act.abandon()
        version = last or _conclude(act, comparison)
    with store.reading() as reading:
        return concluded.version_of(reading, comparison, version)


def answer_as_of(reading: Reading, revision: Revision) -> Answer:
    """The answer to a revision from the records as they were: what a look then must have found."""
    inputs = gather(reading, revision)
    return answer(revision, inputs, past_of(reading, revision, inputs))


def naive_answer(reading: Reading, conclusion: Conclusion, unit: str) -> Answer:
    """What one look says of a conclusion's data that takes each `unit` as independent evidence, for contrast."""
    then = replace(reading, position=conclusion.position, latest=False)
    revision = read_revision(then, conclusion.comparison, revision_id=conclusion.revision_id)
    alone = replace(
        revision, model="pooled", procedure="tukey-kramer", unit=unit, looks="single", final_units=None, control=None
    )
    return answer(alone, gather(then, alone), NO_PAST)


def _last_if_up_to_date(act: Act, comparison: int) -> int | None:
    """The last version, unless the comparison is behind."""
    reading = Reading(act.connection, act.number - 1)
    last = concluded.latest(reading, comparison)
    return None if last is None or comparison in behind(reading) else last.version


@dataclass(frozen=True, slots=True)
class Place:
    """Where an answer stands in its comparison's history.

    Attributes:
        version: counted from 1.
        look: of the comparison; a look is a version computed on other data than the one before; no data, no look.
        causes: the entries that touched the comparison since the version before.
        turns: the verdicts that changed against it.
    """

    version: int
    look: int
    causes: tuple[int, ...]
    turns: tuple[Turn, ...]


def place_of(reading: Reading, comparison: int, found: Answer) -> Place:
    """Where an answer from the records as of a reading stands, after the conclusions recorded by then."""
    before = concluded.latest(reading, comparison)
    causes = touches_since(reading.connection, comparison, before.position if before else 0, reading.position)
    turned = turns(before.answer if before else None, found, because(_acts(reading, causes)))
    if before is None:
        return Place(1, int(found.runs > 0), tuple(causes), turned)
    looked_again = found.inputs != before.answer.inputs
    return Place(before.version + 1, before.look + looked_again, tuple(causes), turned)


def _conclude(act: Act, comparison: int) -> int:
    reading = Reading(act.connection, act.number - 1)
    revision = read_revision(reading, comparison)
    found = answer_as_of(reading, revision)
    place = place_of(reading, comparison, found)
    concluded.record(
        act,
        revision,
        found,
        version=place.version,
        look=place.look,
        position=reading.position,
        causes=place.causes,
        turns=place.turns,
    )
    return place.version


def _acts(reading: Reading, causes: Sequence[int]) -> list[str]:
    query = select(entry.c.act).where(entry.c.number.in_(causes)).order_by(entry.c.number)
    return list(reading.connection.execute(query).scalars())
