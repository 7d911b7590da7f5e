"""What earlier looks at a comparison leave for the next: their state, and what was corrected since.

A look is a version computed on data that differ from those of the look before. A version on the same data (after a
changed margin, for example) goes on from the state before that look, so that no look is counted twice.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

from sqlalchemy import func, select

from sameline.conclusions.inputs import Inputs, gather, recent_runs
from sameline.records import concluded
from sameline.records import tables as t
from sameline.records.answers import ANSWERED, Conclusion
from sameline.records.comparisons import Revision, read_revision
from sameline.records.store import Reading


@dataclass(frozen=True, slots=True)
class Past:
    """What came before a look.

    Attributes:
        state: what the look before left to remember (canonical JSON), None at the first look.
        amended: labels of the groups with a value corrected, set aside or put back that an earlier look had seen.
        restated: whether the comparison was stated anew since, over data that an earlier look had seen.
        elsewhere: how often other comparisons of these groups had looked before this one was stated.
        unit_sd: standard deviation of a unit, known when the comparison was stated; None where it was not.
    """

    state: str | None = None
    amended: tuple[str, ...] = ()
    restated: bool = False
    elsewhere: int = 0
    unit_sd: float | None = None


NO_PAST = Past()

FEWEST_DF = 3  # with fewer, a spread known beforehand says too little to tune by


def past_of(reading: Reading, revision: Revision, inputs: Inputs) -> Past:
    """What earlier looks leave for a look as of this reading."""
    elsewhere = _looks_elsewhere(reading, revision, inputs)
    sd = known_unit_sd(reading, revision)
    last = concluded.latest(reading, revision.comparison)
    if last is not None and last.answer.inputs == inputs.digest():
        last = concluded.before_look(reading, revision.comparison, last.look)
    if last is None or last.look == 0:
        return Past(elsewhere=elsewhere, unit_sd=sd)
    restated = last.revision_id != revision.id
    if restated and not any(value.before for value in inputs.kept):
        return Past(elsewhere=elsewhere, unit_sd=sd)  # all its data are newer than its statement: its looks begin anew
    return Past(last.answer.looks_state, _amended(reading, last, inputs), restated, elsewhere, sd)


def known_unit_sd(reading: Reading, revision: Revision) -> float | None:
    """The spread of run means within batches of this characteristic, from the runs recorded before the statement.

    It tunes what an open comparison looks hardest for, so it must not come from the data compared: only runs that were
    there when the comparison was stated are taken.
    """
    stated = replace(reading, position=revision.entry, latest=False)
    by_batch: dict[str, list[float]] = {}
    for (batch, _), values in recent_runs(stated, revision.characteristic).items():
        by_batch.setdefault(batch, []).append(math.fsum(values) / len(values))
    df = sum(len(means) - 1 for means in by_batch.values())
    if df < FEWEST_DF:
        return None
    spread = math.fsum((x - math.fsum(means) / len(means)) ** 2 for means in by_batch.values() for x in means)
    return math.sqrt(spread / df) or None


def _amended(reading: Reading, last: Conclusion, inputs: Inputs) -> tuple[str, ...]:
    """The groups that have lost or changed a value since a look had seen it."""
    then = replace(reading, position=last.position, latest=False)
    old = gather(then, read_revision(then, last.comparison, revision_id=last.revision_id))
    now = {(v.run, v.replicate): v for v in inputs.kept}
    recorded_then = {(v.run, v.replicate) for v in old.values}
    touched = {v.group for v in old.kept if _told(now.get((v.run, v.replicate))) != _told(v)}
    seen = {(v.run, v.replicate) for v in old.kept}
    touched |= {v.group for key, v in now.items() if key in recorded_then - seen}  # put back since
    present = [label for _, label in inputs.groups if label in touched]
    return tuple(present)


def _told(value: object) -> tuple[object, ...] | None:
    return None if value is None else (value.group, value.value, value.censored)  # type: ignore[attr-defined]


def _looks_elsewhere(reading: Reading, revision: Revision, inputs: Inputs) -> int:
    """Looks of other comparisons of this characteristic, over two or more of these groups, before this was stated."""
    if not any(value.before for value in inputs.kept):
        return 0
    other, group, stated = t.conclusion, t.conclusion_group, t.comparison_revision
    column = group.c[revision.grouping]
    shared = (
        select(other.c.comparison, other.c.look)
        .join(group, group.c.conclusion == other.c.id)
        .join(stated, stated.c.id == other.c.revision)
        .where(
            other.c.comparison != revision.comparison,
            other.c.entry < revision.entry,
            other.c.state == ANSWERED,
            stated.c.characteristic == revision.characteristic,
            column.in_([number for number, _ in inputs.groups]),
            group.c.units > 0,
        )
        .group_by(other.c.comparison, other.c.look)
        .having(func.count(column.distinct()) > 1)
        .subquery()
    )
    return int(reading.connection.execute(select(func.count()).select_from(shared)).scalar_one())
