"""Boundaries for the studentized range over looks, unknown variance, by a seeded simulation of the null.

Under equal means the largest studentized difference at each look is a function of the groups' partial sums and of the
residual sum of squares; both are simulated as they grow, with the units each look really had, so unequal group sizes
and few degrees of freedom need no approximation. At look j the boundary is the least value that keeps the simulated
probability of having crossed at looks 1 to j within what the spending function allows until now. At the first look
with equal sizes the tail of the studentized range is exact and is used. Where the simulation has too few crossings to
tell, that tail at the error rate spent now bounds the boundary instead (a union bound, so never too low).
Boundaries are rounded up to 4 decimals and stored; stored ones are never computed again.

Strong control: the largest difference among truly equal pairs is no larger than that of all pairs under equal means,
so the boundary holds whatever the other means are; with it every difference +- boundary * standard error / sqrt(2) is a
repeated confidence interval (Jennison and Turnbull 1989, JRSS B 51:305-361).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from sameline.stats.looks.spending import Spending, spent
from sameline.stats.studentized_range import studentized_range_isf

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from numpy.typing import NDArray

    Floats = NDArray[np.float64]

DRAWS = 2_000_000
"""Simulated histories: at alpha 0.05 the standard error of a boundary is then 0.001 to 0.004 of 4 to 5 (measured over
seeds; 0.007 at an early look), that of the error rate spent until a look 0.00015."""
SEED = 20_240_611
"""Seed unless a comparison states another."""
_CHUNK = 20_000
_FIRM = 400


@dataclass(frozen=True, slots=True)
class History:
    """The units each group had at looks 1 to j, never fewer than before, and what was decided at looks 1 to j - 1.

    Attributes:
        n: one tuple a look, (k,) each.
        boundaries: one row a past look, a boundary for each error rate of `rates`; None where none could be crossed.
        known_spread: whether the variance is known (infinite degrees of freedom).
    """

    n: tuple[tuple[int, ...], ...]
    boundaries: tuple[tuple[float | None, ...], ...]
    known_spread: bool = False


def next_boundaries(
    history: History,
    rates: Sequence[float],
    spending: Spending,
    fractions: tuple[float, float],
    *,
    draws: int = DRAWS,
    seed: int = SEED,
) -> tuple[float | None, ...]:
    """The boundary of the last look of `history` at each overall error rate.

    Args:
        history: the looks so far, this one last.
        rates: overall error rates, each in (0, 1).
        spending: spending function.
        fractions: information fraction until which was spent before, and until which may be spent now, the larger.
        draws: simulated histories.
        seed: of the generator; the same seed gives the same boundary.

    Returns:
        Studentized range values (difference / (standard error / sqrt(2))), rounded up to 4 decimals; None where fewer
        than two groups have units or no degrees of freedom are there.
    """
    if _freedom(history) is None:
        return (None,) * len(rates)
    statistic, crossed = _simulate(history, len(rates), draws, seed)
    return tuple(_edge(history, rate, spending, fractions, statistic, crossed[at]) for at, rate in enumerate(rates))


def foreseen_boundaries(
    n: tuple[tuple[int, ...], ...],
    rate: float,
    spending: Spending,
    fractions: Sequence[float],
    *,
    draws: int = DRAWS,
    seed: int = SEED,
) -> tuple[float | None, ...]:
    """The boundaries of a whole plan if its looks come as foreseen: what `next_boundaries` gives look by look.

    Args:
        n: units a group at each look.
        rate: overall error rate.
        spending: spending function.
        fractions: information fraction at each look, rising.
        draws: simulated histories; all looks are held in memory, 8 bytes a draw and look.
        seed: of the generator.
    """
    statistics = np.empty((len(n), draws))
    for start in range(0, draws, _CHUNK):
        part = slice(start, min(start + _CHUNK, draws))
        for look, value in enumerate(_paths(History(n, ()), _generator(seed, start), part.stop - part.start)):
            statistics[look, part] = value
    crossed = np.zeros(draws, dtype=np.bool_)
    found: list[float | None] = []
    for look, before in enumerate((0.0, *fractions[:-1])):
        history = History(n[: look + 1], ())
        edge = None
        if _freedom(history) is not None:
            edge = _edge(history, rate, spending, (before, fractions[look]), statistics[look], crossed)
        if edge is not None:
            crossed |= statistics[look] > edge
        found.append(edge)
    return tuple(found)


def _freedom(history: History) -> float | None:
    """Degrees of freedom at the last look; None when nothing can be judged."""
    sizes = history.n[-1]
    present = sum(count > 0 for count in sizes)
    df = math.inf if history.known_spread else float(sum(sizes) - present)
    return None if present < 2 or df <= 0 else df


def _edge(
    history: History,
    rate: float,
    spending: Spending,
    fractions: tuple[float, float],
    statistic: Floats,
    crossed: NDArray[np.bool_],
) -> float | None:
    """The boundary at the last look, from its simulated statistic and which histories crossed before."""
    sizes = [count for count in history.n[-1] if count > 0]
    increment = spent(spending, fractions[1], rate) - spent(spending, fractions[0], rate)
    exact = math.inf
    if increment > 1e-290:
        exact = float(studentized_range_isf(increment, len(sizes), _freedom(history) or math.inf))
    allowed = math.floor(spent(spending, fractions[1], rate) * crossed.size) - int(crossed.sum())
    is_known = len(history.n) == 1 and len(set(sizes)) == 1 and math.isfinite(exact)
    simulated = math.inf if is_known or allowed < _FIRM else _quantile(statistic[~crossed], allowed)
    best = min(simulated, exact)
    return None if math.isinf(best) else math.ceil(best * 1e4) / 1e4


def _quantile(open_histories: Floats, allowed: int) -> float:
    """The least value that at most `allowed` of the histories exceed."""
    if allowed >= open_histories.size:
        return 0.0
    place = open_histories.size - allowed - 1
    return float(np.partition(open_histories, place)[place])


def _simulate(history: History, rates: int, draws: int, seed: int) -> tuple[Floats, NDArray[np.bool_]]:
    """The statistic at the last look (draws,); whether each history crossed before, for each rate (rates, draws)."""
    statistic = np.empty(draws)
    crossed = np.zeros((rates, draws), dtype=np.bool_)
    for start in range(0, draws, _CHUNK):
        part = slice(start, min(start + _CHUNK, draws))
        for look, value in enumerate(_paths(history, _generator(seed, start), part.stop - part.start)):
            if look < len(history.boundaries):
                for at, boundary in enumerate(history.boundaries[look]):
                    if boundary is not None:
                        crossed[at, part] |= value > boundary
            else:
                statistic[part] = value
    return statistic, crossed


def _generator(seed: int, start: int) -> np.random.Generator:
    """A generator for the histories from `start` on: each look goes on with the very histories of the look before."""
    return np.random.Generator(np.random.PCG64(np.random.SeedSequence((seed, start))))


def _paths(history: History, generator: np.random.Generator, size: int) -> Iterator[Floats]:
    """The largest studentized difference at each look in turn, (size,); 0 where none can be had."""
    k = len(history.n[0])
    means, within = np.zeros((k, size)), np.zeros(size)
    before = np.zeros(k, dtype=np.int64)
    for counts in history.n:
        now = np.array(counts, dtype=np.int64)
        degrees = 0
        for i in np.flatnonzero(now > before).tolist():
            new = int(now[i] - before[i])
            arrived = generator.standard_normal(size) / math.sqrt(new)
            step = arrived - means[i]
            within += step**2 * (before[i] * new / now[i])
            means[i] += step * (new / now[i])
            degrees += new - 1
        if degrees:
            within += generator.chisquare(degrees, size)
        before = now
        yield _largest(means, within, now, known_spread=history.known_spread)


def _largest(means: Floats, within: Floats, n: NDArray[np.int64], *, known_spread: bool) -> Floats:
    there = np.flatnonzero(n > 0)
    df = int(n.sum()) - there.size
    if there.size < 2 or (df <= 0 and not known_spread):
        return np.zeros(within.size)
    scale = 1.0 if known_spread else np.sqrt(within / df)
    if np.unique(n[there]).size == 1:
        spread = means[there].max(axis=0) - means[there].min(axis=0)
        return np.asarray(spread * math.sqrt(float(n[there[0]])) / scale, dtype=np.float64)
    largest = np.zeros(within.size)
    for place, a in enumerate(there):
        for b in there[place + 1 :]:
            per = math.sqrt(0.5 * (1.0 / n[a] + 1.0 / n[b]))
            np.maximum(largest, np.abs(means[b] - means[a]) / per, out=largest)
    return np.asarray(largest / scale, dtype=np.float64)
