"""What an amendment does to the error rate, and what is kept from look to look.

Kept: an overall p-value is the running minimum over looks. The martingale (or the spending) makes the probability that
any look ever claims a true equality at most alpha, so a claim once made needs no second proof and cannot be un-made by
looking on; a reader also sees `p_now`, the evidence of this look's data alone, and a claim whose evidence went back is
marked `receded`.

Amendments: a corrected or excluded value means that earlier looks were made on other data than the record now holds.
For a pair with an amended group the claims of those looks are void. It starts a new version, judged on the amended data
alone, and since choosing what to amend after seeing results is itself a way of looking, versions draw on a reserve set
aside beforehand: the m-th amendment has the share reserve / (m (m + 1)) of alpha, the untouched pairs have
1 - reserve, and all shares together are at most 1. With a reserve of 0 touched pairs are descriptive from then on:
their p-value is 1. The pooled variance carries an amended value into the other pairs' figures too; for those the
guarantee is approximate from then on, and the result says so.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from sameline.errors import StatsError
from sameline.stats.looks.results import LooksState, PairMemory

if TYPE_CHECKING:
    from collections.abc import Iterable

    from sameline.stats.looks.units import Pair

RESERVE = 0.05
"""Share of alpha kept for amended data unless a comparison states another."""


def check_reserve(reserve: float) -> float:
    """Refuses a reserve outside [0, 1).

    Raises:
        StatsError: so.
    """
    if not 0.0 <= reserve < 1.0:
        raise StatsError(f"a reserve of {reserve!r} of the error rate cannot be meant", where="reserve")
    return float(reserve)


def version_share(reserve: float, version: int) -> float:
    """Share of alpha a version has: 1 - reserve for the data as first recorded, reserve / (m (m + 1)) for the m-th."""
    return 1.0 - reserve if version == 0 else reserve / (version * (version + 1))


def look_weight(judged: int) -> float:
    """1 / (j (j + 1)), the share of the j-th look in a sequence without end; they add up to 1.

    From the second look on it is more than 6 / (pi^2 j^2), the better known choice, and finds late changes sooner.
    """
    return 1.0 / (judged * (judged + 1))


def next_memories(
    state: LooksState, pairs: Iterable[Pair], touched: frozenset[str]
) -> tuple[LooksState, dict[Pair, PairMemory]]:
    """Opens a look: counts it, and starts a new version of every pair that an amendment touched.

    Args:
        state: the state before this look.
        pairs: the pairs asked now; pairs new to the state begin with nothing remembered.
        touched: groups with an amended or excluded value that an earlier look had seen.

    Returns:
        The state with look and amendments counted, and the memories of the pairs asked.
    """
    counts = bool(touched) and state.look > 0
    opened = replace(state, look=state.look + 1, amendments=state.amendments + counts)
    old = state.memory()
    memories = {}
    for a, b in pairs:
        kept = old.get((a, b)) or PairMemory(a, b, version=state.version)
        if counts and (a in touched or b in touched):
            kept = PairMemory(a, b, version=opened.amendments)
        memories[a, b] = kept.counted()
    return opened, memories


def restate(state: LooksState, mode: str, rule: str) -> LooksState:
    """Carries the looks of a comparison into the one that replaces it over data already seen.

    The count of looks and of amendments goes on, and what was claimed is not carried over: every pair begins a new
    version that draws on the reserve, exactly as after an amendment that touches all groups. A comparison that uses
    only data recorded after it was stated begins with no state instead.

    Args:
        state: of the comparison that is replaced.
        mode: of the new one.
        rule: its rule, from `rule_of` in the module of its mode.
    """
    version = state.amendments + 1
    pairs = tuple(PairMemory(row.a, row.b, version=version) for row in state.pairs)
    return LooksState(
        mode=mode,
        rule=rule,
        look=state.look,
        amendments=version,
        pairs=pairs,
        restated=state.restated + 1,
        version=version,
    )


def overall_p(memory: PairMemory, p_now: float, reserve: float, *, spends_by_look: bool) -> float:
    """The p-value of one look on the scale of the whole error rate.

    Args:
        memory: of the pair, with this look counted in `since`.
        p_now: p-value within the pair's version.
        reserve: share of alpha kept for amended data.
        spends_by_look: whether a later version's looks must share its part between them, because its p-value holds
            for one look only.
    """
    share = version_share(reserve, memory.version)
    if memory.version and spends_by_look:
        share *= look_weight(memory.since)
    return min(1.0, p_now / share) if share > 0 else 1.0


def amendment_notes(state: LooksState, memories: dict[Pair, PairMemory], reserve: float) -> list[str]:
    """Sentences on what amendments mean for this look."""
    notes = []
    if state.restated:
        notes.append(f"restated over data already seen; {state.look - 1} earlier looks are counted")
    late = [f"{a} and {b}" for (a, b), row in memories.items() if row.version]
    if late and reserve > 0:
        notes.append(f"judged on amended data from the reserve of the error rate: {', '.join(late)}")
    elif late:
        notes.append(f"amended after a look, no reserve stated, so descriptive only: {', '.join(late)}")
    if state.amendments > state.restated and len(late) < len(memories):
        notes.append("the pooled variance holds amended values: for the other pairs the guarantee is approximate")
    return notes
