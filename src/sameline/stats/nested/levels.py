"""Which levels the data can tell apart: the rest collapse, and it is said what that means.

A level's spread can be estimated when it has more units than the level above it. Where each unit of the level above
has exactly one, the two are one partition of the data: their spreads add, and only the sum is seen.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from sameline.errors import StatsError

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from sameline.stats.nested.rows import Rows


@dataclass(frozen=True, slots=True)
class Collapsed:
    """A level whose spread the data cannot show by itself.

    Args:
        level: "batch", "run", "session" or "replicate".
        into: the level that now carries its spread; "group" when it is hidden in the differences between groups,
            "nothing" when it is nil or cancels.
        meaning: one sentence for a reader.
    """

    level: str
    into: str
    meaning: str


@dataclass(frozen=True, slots=True)
class Chain:
    """The levels left after collapsing.

    Args:
        rows: the values left (means of a level whose replicates are all alike).
        random: levels with a spread of their own, from the top down; the last is the residual.
        collapsed: the levels that went.
    """

    rows: Rows
    random: tuple[str, ...]
    collapsed: tuple[Collapsed, ...]


NESTED = ("batch", "run", "replicate")


def chain_of(rows: Rows, *, spread_known: bool = False) -> Chain:
    """Collapses equal partitions from the group down, then a residual without any spread.

    Args:
        rows: the values in canonical order.
        spread_known: a spread from outside is at hand, so that data without any are no reason to refuse.

    Raises:
        StatsError: nothing varies within any group.
    """
    given = tuple(level for level in NESTED if level in rows.units)
    random, collapsed = _distinct(rows, given)
    while random and _no_residual(rows, random):
        if spread_known and random == ("replicate",) and any(gone.level == "run" for gone in collapsed):
            break
        rows, gone = _reduced(rows, random)
        collapsed.append(gone)
        random, more = _distinct(rows, random[:-1])
        collapsed.extend(more)
        if not random:
            raise StatsError(
                "nothing varies within any group",
                where="values",
                advice="the values are recorded too coarsely to judge a difference by; record more digits",
            )
    return Chain(rows, random, tuple(collapsed))


def _distinct(rows: Rows, levels: tuple[str, ...]) -> tuple[tuple[str, ...], list[Collapsed]]:
    kept: list[str] = []
    collapsed: list[Collapsed] = []
    above = "group"
    for level in levels:
        if rows.count(level) > rows.count(above):
            kept.append(level)
            above = level
        else:
            collapsed.append(Collapsed(level, above, _meaning(level, above, rows)))
    return tuple(kept), collapsed


def _meaning(level: str, above: str, rows: Rows) -> str:
    if above != "group":
        return (
            f"every {above} has one {level}, so the two cannot be told apart: "
            f"the spread called {above} holds that of its {level} as well"
        )
    if len(rows.groups) == 1:
        return f"there is one {level}: the spread from {level} to {level} cannot be seen"
    scope = {
        "batch": "the answer is about these batches, not about the groups at large",
        "run": "what sets one run apart from another is in the differences and cannot be seen",
        "replicate": "there is no spread to judge a difference by",
    }[level]
    return f"every group has one {level}: {scope}"


def _no_residual(rows: Rows, random: tuple[str, ...]) -> bool:
    above = random[-2] if len(random) > 1 else "group"
    starts = first_of(rows.units[above])
    return bool(np.all(rows.y == np.repeat(rows.y[starts], np.diff(np.append(starts, rows.y.size)))))


def _reduced(rows: Rows, random: tuple[str, ...]) -> tuple[Rows, Collapsed]:
    """One value for each unit of the level above a residual that is nil."""
    level = random[-1]
    above = random[-2] if len(random) > 1 else "group"
    starts = first_of(rows.units[above])
    units = {name: unit[starts] for name, unit in rows.units.items()}
    units[level] = np.arange(starts.size)
    meaning = f"the {level}s of a {above} are all alike as recorded: each {above} counts once"
    return replace(rows, y=rows.y[starts], units=units), Collapsed(level, "nothing", meaning)


def session_collapsed(chain: Chain) -> Collapsed | None:
    """Why the session has no component of its own, or None where it has one; None too without sessions."""
    rows = chain.rows
    if "session" not in rows.units:
        return None
    if len(rows.sessions) == 1:
        return Collapsed("session", "nothing", "there is one session: what its batches share cancels in differences")
    if _same_partition(rows.units["session"], rows.units["group"]):
        meaning = "every group was tested in a session of its own: what sets sessions apart is in the differences"
        return Collapsed("session", "group", meaning)
    for level in chain.random[:-1]:
        if _same_partition(rows.units["session"], rows.units[level]):
            meaning = f"every {level} has a session of its own: the spread called {level} holds the sessions' as well"
            return Collapsed("session", level, meaning)
    return None


def _same_partition(one: NDArray[np.intp], other: NDArray[np.intp]) -> bool:
    both = np.unique(one * (int(other.max()) + 1) + other).size
    return both == int(one.max()) + 1 == int(other.max()) + 1


def first_of(unit: NDArray[np.intp]) -> NDArray[np.intp]:
    """Where each unit starts in a non-decreasing array of 0-based units without gaps."""
    return np.flatnonzero(np.diff(unit, prepend=-1))
