"""A figure far from everything recorded: asked about, and the slip that would explain it is named."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from itertools import pairwise
from math import inf

from sameline.records.drafts import CharacteristicFacts

FAR = 6.0
"""A value further from the mean of all recorded than this many standard deviations is asked about.

Common practice, no source; a normal population has one such value in about five hundred million.
"""
NEAR = 3.0
"""A slip explains a far value when its undoing brings it within this many standard deviations (common practice)."""


class Far:
    """Asks about values far from what is recorded for a characteristic.

    Args:
        facts: the characteristic; without a mean and a spread nothing is far.
    """

    def __init__(self, facts: CharacteristicFacts | None) -> None:
        self._mean = self._spread = 0.0
        self._unit = ""
        self.low, self.high = -inf, inf
        if facts is None or facts.mean is None or facts.spread is None:
            return
        resolution = 0.0 if facts.decimals is None else 10.0**-facts.decimals
        spread = max(facts.spread, resolution)
        if spread > 0:
            self._mean, self._spread, self._unit = facts.mean, spread, facts.unit
            self.low, self.high = facts.mean - FAR * spread, facts.mean + FAR * spread

    def doubt(self, number: str, value: float, to_own: Callable[[str], float]) -> tuple[str, str | None] | None:
        """What is asked about this value, and the likely slip; None when it is not far.

        Args:
            number: the figure as written, with a point as decimal sign.
            value: the same in the characteristic's unit.
            to_own: turns a figure as written into the characteristic's unit.
        """
        if self.low <= value <= self.high:
            return None
        times = abs(value - self._mean) / self._spread
        problem = (
            f"{value:g} is far from all that is recorded "
            f"(mean {self._mean:.6g}, standard deviation {self._spread:.3g} {self._unit}; {times:.0f} of these away)"
        )
        return problem, self._slip(number, to_own)

    def _slip(self, number: str, to_own: Callable[[str], float]) -> str | None:
        for words, guess in _slips(number):
            if abs(to_own(guess) - self._mean) <= NEAR * self._spread:
                return f"{words}: was {guess} meant?"
        return "is it meant?"


def _slips(number: str) -> Iterator[tuple[str, str]]:
    """Figures that a slip of the keyboard may have turned into this one, the likeliest first."""
    if "e" in number.lower():
        return
    for places in (1, -1, 2, -2, 3, -3):
        yield "a slipped decimal point", _shifted(number, places)
    digits = [place for place, sign in enumerate(number) if sign.isdigit()]
    for i, j in pairwise(digits):
        if number[i] != number[j]:
            yield "two digits swapped", number[:i] + number[j] + number[i + 1 : j] + number[i] + number[j + 1 :]
    for i, sign in enumerate(number[1:], 1):
        if sign.isdigit() and sign == number[i - 1]:
            yield "a digit typed twice", number[:i] + number[i + 1 :]


def _shifted(number: str, places: int) -> str:
    """The figure with its decimal point moved so many places to the left (negative: to the right)."""
    sign, digits = (number[0], number[1:]) if number[:1] in "+-" else ("", number)
    whole, _, rest = digits.partition(".")
    point = len(whole) - places
    figures = whole + rest
    if point <= 0:
        figures, point = "0" * (1 - point) + figures, 1
    figures = figures.ljust(point, "0")
    before, after = figures[:point].lstrip("0") or "0", figures[point:]
    return sign + before + (f".{after}" if after else "")
