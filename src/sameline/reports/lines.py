"""The lines: maximal sets of groups none of which is shown to differ from another, as they are drawn and listed."""

from __future__ import annotations

import re
from collections.abc import Sequence

from sameline.records.answers import GroupAnswer

BAR = "│"
_NAME = re.compile(r"[A-Za-z]\d*")  # the 53rd line is "a1"


def by_mean(groups: Sequence[GroupAnswer]) -> list[GroupAnswer]:
    """The groups that have a mean, lowest first."""
    return sorted((g for g in groups if g.mean is not None), key=lambda g: (g.mean, g.label))


def lines_of(group: GroupAnswer) -> list[str]:
    """The names of the lines on which a group stands."""
    return _NAME.findall(group.letters)


def drawn_lines(groups: Sequence[GroupAnswer]) -> dict[str, list[str]]:
    """For each line its groups' labels, both in order of mean."""
    found: dict[str, list[str]] = {}
    for group in by_mean(groups):
        for line in lines_of(group):
            found.setdefault(line, []).append(group.label)
    return found


def bars(group: GroupAnswer, lines: Sequence[str]) -> str:
    """A group's row of the drawing: a bar in the column of each line on which it stands."""
    own = set(lines_of(group))
    return " ".join(BAR if line in own else " " for line in lines)
