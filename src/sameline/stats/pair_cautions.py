"""The cautions that a comparison of pairs raises, from its data and its options. They change no figure."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np

from sameline.stats.cautions import Caution
from sameline.stats.procedures import COMMON, RANKS

if TYPE_CHECKING:
    from sameline.stats.pairs_result import PairsResult

DIAGNOSTIC_LEVEL = 0.05  # common practice, no source
ENOUGH_FOR_GAMES_HOWELL = 6
ROUNDING = 4 * 2.0**-52  # of the largest value: what a computed mean may be off

# Share of families of ten groups, of equal spread and equal means, in which Games-Howell at a nominal 5 % claims some
# difference, by values a group: simulated 20 000 times each (tests/stats/test_error_rates.py does it again).
GAMES_HOWELL_RATES = {2: 0.14, 3: 0.10, 4: 0.083, 5: 0.075}
# The same for Tukey-Kramer on groups of 4, 20, 20 and 20 values whose smallest scatters four times as much.
TUKEY_KRAMER_RATE = 0.41


def pair_cautions(result: PairsResult) -> tuple[Caution, ...]:
    """Every caution of one comparison, in a fixed order."""
    found = [*result.question.samples.cautions]
    for rule in (_not_estimable, _margin, _sizes, _flat, _spread, _shape, _ranks):
        found.extend(rule(result))
    return tuple(found)


def _not_estimable(result: PairsResult) -> Iterator[Caution]:
    if result.not_estimable:
        (a, b), reason = next(iter(result.not_estimable.items()))
        count = len(result.not_estimable)
        yield Caution(
            "not-estimable",
            f"{count} of {result.question.m} pairs could not be computed and stand as undecided; "
            f"{a!r} and {b!r}: {reason}",
        )


def _margin(result: PairsResult) -> Iterator[Caution]:
    if result.margin is not None and not result.method.intervals:
        yield Caution(
            "margin-not-judged",
            f"{result.procedure} gives no intervals, so no verdict is made against the margin of {result.margin:g}",
        )


def _sizes(result: PairsResult) -> Iterator[Caution]:
    samples = result.question.samples
    smallest = int(samples.n.min())
    if result.procedure == "games-howell" and smallest < ENOUGH_FOR_GAMES_HOWELL:
        rate = GAMES_HOWELL_RATES[max(smallest, 2)]
        yield Caution(
            "small-groups",
            f"the smallest group has n = {smallest}: with ten groups of {max(smallest, 2)} and equal spread "
            f"Games-Howell claims some difference falsely in {100 * rate:.2g} % of cases at a nominal 5 %",
        )
    if result.method.family == COMMON and smallest == 1:
        yield Caution(
            "single-values",
            f"one value only in {samples.named(samples.n == 1)}: judged wholly by the spread of the other groups",
        )


def _flat(result: PairsResult) -> Iterator[Caution]:
    samples = result.question.samples
    flat = (samples.ss == 0) & (samples.n > 1)
    if flat.any() and result.method.family != RANKS:
        yield Caution(
            "no-spread", f"all values are identical in {samples.named(flat)}: check that they are measurements"
        )
    rounding = ROUNDING * float(np.abs(samples.values.raw).max())
    noise = (samples.ss > 0) & (samples.variance < rounding**2)
    if noise.any() and result.method.family != RANKS:
        yield Caution(
            "spread-of-rounding",
            f"the spread in {samples.named(noise)} is no larger than the rounding of the values: it may be none at all",
        )


def _spread(result: PairsResult) -> Iterator[Caution]:
    tests = result.diagnostics.tests
    found = [tests[name] for name in ("levene-median", "bartlett") if name in tests]
    found = [test for test in found if test.p_value < DIAGNOSTIC_LEVEL]
    if not found or result.method.family not in {COMMON, RANKS}:
        return
    evidence = ", ".join(f"{test.name} p = {test.p_value:.2g}" for test in found)
    n = result.question.samples.n
    if result.method.family == RANKS:
        yield Caution(
            "unequal-spread",
            f"the groups scatter unequally ({evidence}): a difference of ranks need not be one of location",
        )
    elif np.unique(n).size > 1:
        yield Caution(
            "unequal-spread-and-size",
            f"the groups scatter unequally ({evidence}) and have {n.min()} to {n.max()} values: the stated error rate "
            "does not hold (Tukey-Kramer on 4, 20, 20 and 20 values, the smallest group scattering four times as much, "
            f"claims falsely in {100 * TUKEY_KRAMER_RATE:.0f} % of cases at a nominal 5 %); "
            "games-howell does not assume one variance",
        )
    else:
        yield Caution(
            "unequal-spread",
            f"the groups scatter unequally ({evidence}), and {result.procedure} assumes one variance; "
            "games-howell does not",
        )


def _shape(result: PairsResult) -> Iterator[Caution]:
    test = result.diagnostics.tests.get("shapiro-wilk")
    if test is not None and test.p_value < DIAGNOSTIC_LEVEL and result.method.family != RANKS:
        yield Caution(
            "not-normal",
            f"the residuals do not look normal (Shapiro-Wilk W = {test.statistic:.3f}, p = {test.p_value:.2g}): "
            "look at them before leaning on small p-values",
        )


def _ranks(result: PairsResult) -> Iterator[Caution]:
    if result.procedure != "steel-dwass" or result.critical_value is None:
        return
    n = result.question.samples.n.astype(float)
    a, b = n[result.question.first], n[result.question.second]
    largest = np.sqrt(6.0 * a * b / (a + b + 1.0))  # q when every value of one group lies above the other
    hopeless = int(np.count_nonzero(largest <= result.critical_value))
    if hopeless:
        yield Caution(
            "too-few-for-ranks",
            f"{hopeless} of {result.question.m} pairs have too few values to be shown to differ by ranks, "
            "whatever the values are",
        )
