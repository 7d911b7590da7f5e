"""Closed testing over the partitions of the groups: which pairs may be claimed at a family error rate.

Equalities of means are logically linked (Shaffer 1986, JASA 81:826-831): what can be true together is a partition of
the groups into blocks of equal means. A pair is claimed when every partition that puts the two into one block is
rejected (closed testing, Marcus, Peritz and Gabriel 1976). A partition with blocks C1, C2, ... of two or more groups is
rejected when some block has E(C) >= T / (|C| alpha), T = |C1| + |C2| + ...: each block spends a share |C| / T of alpha
(the shares of Ryan, Einot, Gabriel and Welsch). The blocks' martingales live in different filtrations, and their union
bound needs no common one; the shares depend only on the partition, never on the look. So the family error rate over all
pairs and all looks is at most alpha, exactly under the model of `evidence`.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from itertools import combinations
from typing import TYPE_CHECKING

import numpy as np

from sameline.stats.looks.blocks import block_parts, log_block_evidence
from sameline.stats.looks.evidence import p_from_log

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Floats = NDArray[np.float64]
    Ints = NDArray[np.int64]

FEW = 10
"""Up to this many groups all partitions are searched; above, `many` bounds the search in polynomial time."""


@dataclass(frozen=True, slots=True)
class _Search:
    """Index arrays of the search for k groups.

    Attributes:
        steps: for each size of set, (3, e): the set, a block holding its lowest group, the rest of the set; and the
            starts of each set's run.
        sizes: (2^k,) number of groups in a mask.
    """

    steps: tuple[tuple[Ints, Ints], ...]
    sizes: Ints


@lru_cache(maxsize=16)
def _search(groups: int) -> _Search:
    sizes = np.array([m.bit_count() for m in range(1 << groups)], dtype=np.int64)
    steps = []
    for size in range(2, groups + 1):
        rows = [
            (whole, block, whole ^ block)
            for whole in range(1 << groups)
            if sizes[whole] == size
            for block in _blocks_with_lowest(whole)
            if sizes[whole ^ block] != 1
        ]
        table = np.array(rows, dtype=np.int64).T
        steps.append((table, np.flatnonzero(np.r_[True, np.diff(table[0]) != 0])))
    return _Search(tuple(steps), sizes)


def _blocks_with_lowest(whole: int) -> list[int]:
    """The subsets of `whole`, of two or more, that hold its lowest group."""
    lowest = whole & -whole
    rest = whole ^ lowest
    found, part = [], rest
    while part:
        found.append(lowest | part)
        part = (part - 1) & rest
    return found


def close_over_partitions(log_blocks: Floats, groups: int) -> Floats:
    """Log of 1 / adjusted p for every pair, over all partitions, by dynamic programming over sets of groups.

    Args:
        log_blocks: (..., m) log E of every block, in the order of `block_parts(groups).masks`.
        groups: k.

    Returns:
        (..., k(k-1)/2), pairs (0,1), (0,2), ...: the least over partitions P that join the pair of
        max over blocks C of P of log(E(C) |C| / T).
    """
    search = _search(groups)
    masks = block_parts(groups).masks
    reach = np.full((*log_blocks.shape[:-1], 1 << groups), -np.inf)
    reach[..., masks] = log_blocks + np.log(search.sizes[masks])
    weakest = _weakest_partition(reach, search)
    companions = _weakest_companions(weakest, search, groups)
    everyone = (1 << groups) - 1
    own = reach[..., masks, None]
    totals = search.sizes[masks][:, None] + np.arange(groups + 1)
    least = (np.maximum(own, companions[..., everyone ^ masks, :]) - np.log(totals)).min(axis=-1)
    return np.stack(
        [least[..., (masks >> a) & (masks >> b) & 1 == 1].min(axis=-1) for a, b in combinations(range(groups), 2)],
        axis=-1,
    )


def _weakest_partition(reach: Floats, search: _Search) -> Floats:
    """For each set: the partition into blocks of two or more whose strongest block is weakest; +inf if none."""
    weakest = np.full(reach.shape, np.inf)
    weakest[..., 0] = -np.inf
    for (whole, block, rest), starts in search.steps:
        choices = np.maximum(reach[..., block], weakest[..., rest])
        weakest[..., whole[starts]] = np.minimum.reduceat(choices, starts, axis=-1)
    return weakest


def _weakest_companions(weakest: Floats, search: _Search, groups: int) -> Floats:
    """(..., 2^k, k+1): for each set S and size t, the least of `weakest` over subsets of S of size t."""
    table = np.full((*weakest.shape, groups + 1), np.inf)
    every = np.arange(1 << groups)
    table[..., every, search.sizes] = weakest
    for i in range(groups):
        with_i = every[(every >> i) & 1 == 1]
        table[..., with_i, :] = np.minimum(table[..., with_i, :], table[..., with_i ^ (1 << i), :])
    return table


def close_against_control(log_blocks: Floats, groups: int) -> Floats:
    """As `close_over_partitions` for the pairs with the first group only, (..., k-1).

    What can be true together is one block that holds the control; it has all of alpha.
    """
    masks = block_parts(groups).masks
    return np.stack(
        [log_blocks[..., (masks & 1 == 1) & (masks >> j & 1 == 1)].min(axis=-1) for j in range(1, groups)], axis=-1
    )


def closed_p_few(
    means: Floats, n: Floats, ss_within: Floats, df: Floats, phi: float, *, control: bool = False
) -> Floats:
    """Adjusted p-values of all pairs at one look, for up to `FEW` groups.

    Args:
        means: (..., k), n: (..., k), ss_within: (...), df: (...): as `log_block_evidence`.
        n: units a group.
        ss_within: pooled sum of squares.
        df: its degrees of freedom.
        phi: tuning.
        control: whether only pairs with the first group are asked for.

    Returns:
        (..., pairs) in the order (0,1), (0,2), ..., (1,2), ...; each valid at every look together.
    """
    logs = log_block_evidence(means, n, ss_within, df, phi)
    close = close_against_control if control else close_over_partitions
    return p_from_log(close(logs, means.shape[-1]))
