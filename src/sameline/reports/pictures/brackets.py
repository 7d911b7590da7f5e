"""Brackets over groups: a long bar for a group, short bars for those it is paired with, packed without overlap."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Bracket:
    """One bracket.

    Attributes:
        at: place of the group with the long bar, counted from 0.
        others: places of the groups with short bars, in order.
        level: how high it lies, counted from 0.
    """

    at: int
    others: tuple[int, ...]
    level: int = 0

    @property
    def first(self) -> int:
        """Leftmost place."""
        return min(self.at, *self.others)

    @property
    def last(self) -> int:
        """Rightmost place."""
        return max(self.at, *self.others)


def brackets(pairs: Iterable[tuple[int, int]]) -> list[Bracket]:
    """Few brackets that hold every pair once, on few levels.

    The group in most of the pairs not yet held gets the next bracket (equal ones: the one farther right), until none
    is left. Then shorter brackets lie lower; two on one level have a free place between them or none in common.

    Args:
        pairs: different pairs of places.
    """
    return _packed(_stars({frozenset(pair) for pair in pairs}))


def _stars(left: set[frozenset[int]]) -> list[Bracket]:
    found: list[Bracket] = []
    while left:
        partners: dict[int, set[int]] = {}
        for pair in left:
            for one in pair:
                partners.setdefault(one, set()).update(pair - {one})
        centre = max(partners, key=lambda at: (len(partners[at]), at))
        found.append(Bracket(centre, tuple(sorted(partners[centre]))))
        left = {pair for pair in left if centre not in pair}
    return found


def _packed(found: list[Bracket]) -> list[Bracket]:
    levels: list[list[Bracket]] = []
    for each in sorted(found, key=lambda b: (b.last - b.first, b.first, b.at)):
        level = next((n for n, on in enumerate(levels) if all(_apart(each, other) for other in on)), len(levels))
        if level == len(levels):
            levels.append([])
        levels[level].append(Bracket(each.at, each.others, level))
    return sorted((b for on in levels for b in on), key=lambda b: (b.level, b.first))


def _apart(one: Bracket, other: Bracket) -> bool:
    return one.last < other.first or other.last < one.first
