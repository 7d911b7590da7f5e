"""Windows for a supplier that drifts: evidence that starts anew at stated points.

Old data dilute a late change. A comparison may state that its evidence also starts anew every so many units (or at
stated dates): window w = 1, 2, ... holds the data recorded from its start to the next start. Each window is judged by
`judge_open` on its own data as if they were all there are, with its own state; the whole record is judged beside it.
Shares: the whole has the part `WHOLE` of alpha, the w-th window (1 - WHOLE) / (w (w + 1)), which add up to 1 for
any number of windows. By the union bound, the probability that the whole record or any window ever claims a difference
between groups that are equal in it is at most alpha; exact where `judge_open` is. Starts must be stated, or follow a
stated rule that does not look at results: a start chosen for what was seen has no guarantee.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from sameline.errors import StatsError

if TYPE_CHECKING:
    from sameline.stats.looks.results import LookResult
    from sameline.stats.looks.units import Pair

WHOLE = 0.5
"""Part of the error rate of the whole record, when windows are stated beside it."""


def window_part(number: int) -> float:
    """Part of alpha of the `number`-th window (1, 2, ...); 0 is the whole record."""
    if number < 0:
        raise StatsError(f"window {number} cannot be meant", where="number")
    return WHOLE if number == 0 else (1.0 - WHOLE) / (number * (number + 1))


def window_of(unit: int, length: int) -> int:
    """The window (1, 2, ...) of a unit, by its place in the order of recording (0, 1, ...) and a stated length."""
    if length < 1:
        raise StatsError(f"a window of {length} units cannot be meant", where="length")
    return unit // length + 1


@dataclass(frozen=True, slots=True)
class WindowedPair:
    """One pair over the whole record and all windows so far.

    Attributes:
        a: first group.
        b: second group.
        p_value: overall p-value over the whole record and every window.
        window: where it came from: 0 the whole record, else the window's number.
        differs: p_value <= alpha.
    """

    a: str
    b: str
    p_value: float
    window: int
    differs: bool


def window_alpha(alpha: float, number: int) -> float:
    """The error rate to hand to `judge_open` for a window: its intervals and verdicts then keep the window's part."""
    return alpha * window_part(number)


def over_windows(alpha: float, results: dict[int, LookResult]) -> tuple[WindowedPair, ...]:
    """Puts the whole record (0) and the windows (1, 2, ...) together.

    Args:
        alpha: the family error rate over everything.
        results: the latest look of each window, made with `window_alpha`; finished windows keep their last one.

    Returns:
        One entry a pair of the whole record.

    Raises:
        StatsError: the whole record is missing.
    """
    if 0 not in results:
        raise StatsError("the whole record is missing", where="results", advice="give it as window 0")
    least: dict[Pair, tuple[float, int]] = {(row.a, row.b): (1.0, 0) for row in results[0].pairs}
    for number, result in sorted(results.items()):
        for row in result.state.pairs:
            scaled = min(1.0, row.p_value / window_part(number))
            pair = (row.a, row.b)
            if pair in least and scaled < least[pair][0]:
                least[pair] = (scaled, number)
    return tuple(WindowedPair(a, b, p, number, p <= alpha) for (a, b), (p, number) in least.items())
