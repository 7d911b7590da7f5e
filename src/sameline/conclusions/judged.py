"""What a model says of a comparison's inputs, whichever model it is."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from sameline.records.answers import CautionAnswer, ComponentAnswer, GlobalTest, PairAnswer


@dataclass(frozen=True, slots=True)
class GroupFigures:
    """What is said of one group: number of units, mean, their standard deviation, interval of the mean."""

    units: int
    mean: float
    sd: float | None
    lower: float | None
    upper: float | None


@dataclass(frozen=True, slots=True)
class Judged:
    """A model's figures, in the terms of an answer.

    Attributes:
        groups: label -> figures; groups without values are absent.
        letters: label -> the letters of its lines.
        display: "lines", "letters", "matrix" or "control".
        pairs, components, cautions, test, critical_value: as in `sameline.records.answers.Answer`.
        engine: the versions that computed it.
        guarantee, looks_state: as in `sameline.records.answers.Answer`.
    """

    groups: Mapping[str, GroupFigures]
    letters: Mapping[str, str]
    display: str
    pairs: tuple[PairAnswer, ...]
    engine: str
    components: tuple[ComponentAnswer, ...] = ()
    cautions: tuple[CautionAnswer, ...] = ()
    test: GlobalTest | None = None
    critical_value: float | None = None
    guarantee: str | None = None
    looks_state: str | None = None


def finite(figure: float | None) -> float | None:
    """The figure as it is kept: an open end of an interval is no figure."""
    return None if figure is None or math.isinf(figure) else float(figure)


def sd(values: Iterable[float]) -> float | None:
    """Standard deviation, None for fewer than two values; the sum is exact, so the order does not matter."""
    known = list(values)
    if len(known) < 2:
        return None
    mean = math.fsum(known) / len(known)
    return math.sqrt(math.fsum((x - mean) ** 2 for x in known) / (len(known) - 1))
