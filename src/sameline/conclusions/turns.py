"""What changed between two versions of a conclusion, and why."""

from __future__ import annotations

from collections.abc import Iterable

from sameline.records.answers import Answer, Turn

NEW_RUNS = "new runs"
AMENDMENT = "an amendment"
CHANGED = "a changed comparison"
RESTATED = "a restated characteristic or batch"

_BECAUSE = {
    "log": NEW_RUNS,
    "take": NEW_RUNS,
    "amend": AMENDMENT,
    "exclude": AMENDMENT,
    "restore": AMENDMENT,
    "reverse": AMENDMENT,
    "compare": CHANGED,
    "restate": RESTATED,
}


def because(acts: Iterable[str]) -> str:
    """Why a conclusion changed, from the names of the acts that touched its comparison: "new runs and an amendment"."""
    kinds = {_BECAUSE[act.split()[0]] for act in acts}
    return " and ".join(kind for kind in (CHANGED, RESTATED, AMENDMENT, NEW_RUNS) if kind in kinds)


def turns(before: Answer | None, after: Answer, why: str) -> tuple[Turn, ...]:
    """The verdicts that changed, in the order of the pairs.

    A pair that is new counts as a turn where it is decided at once; a first version's pairs likewise.

    Args:
        before: the answer of the version before, if there is one.
        after: the answer now.
        why: as `because` says it.
    """
    earlier = {frozenset((p.a, p.b)): p.verdict for p in before.pairs} if before else {}
    found = []
    for pair in after.pairs:
        old = earlier.get(frozenset((pair.a, pair.b)))
        if pair.verdict != old and not (old is None and pair.verdict == "undecided"):
            found.append(Turn(pair.a, pair.b, old, pair.verdict, why))
    return tuple(found)
