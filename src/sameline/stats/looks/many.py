"""Closed testing for many groups in polynomial time, by bounding what the partitions can hide.

A partition is rejected when in some block C of size c, with T groups in blocks of two or more,

- a pair of C has E >= T (c - 1) / (2 (1 - lead) alpha)  (for c = 2: T / (2 alpha)), or
- a group i of C has E(i against the plain mean of the rest of C) >= T / (lead alpha), for c >= 3.

The shares of alpha add up to 1 in every partition and depend on nothing else, and every E is a martingale in its own
filtration, so the union bound makes the family error rate over all pairs and looks at most alpha, exactly. A share of a
pair is never below (1 - lead) / (number of pairs): with lead = 0 the procedure dominates Bonferroni's at every look,
with lead > 0 it does so up to that factor and is far quicker to see one group that differs from the others.

The pair {a, b} is claimed when for every size c all blocks C that hold both must hold such evidence. That is not
searched over subsets but bounded: among the c - 2 others at least one has max(E_xa, E_xb) no smaller than the
(c - 2)-th smallest; and the mean of the others lies between that of the c - 2 smallest and of the c - 2 largest group
means. The bound only ever makes p larger. Cost k^2 numbers a size of block, k^3 log k in all.
"""

from __future__ import annotations

from functools import lru_cache
from itertools import combinations
from typing import TYPE_CHECKING

import numpy as np

from sameline.stats.looks.evidence import log_evidence, p_from_log

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Floats = NDArray[np.float64]
    Ints = NDArray[np.int64]

LEAD = 0.2
"""Share of a block's error rate that goes to "one group against the rest"; chosen by simulation, fixed."""


def log_pair_evidence(means: Floats, n: Floats, ss_within: Floats, df: Floats, phi: float) -> Floats:
    """Log E of every pair, (..., k(k-1)/2); arguments as `blocks.log_block_evidence`."""
    a, b = pair_indices(means.shape[-1])
    both = n[..., a] + n[..., b]
    units = n[..., a] * n[..., b] / np.where(both > 0, both, 1.0)
    explained = np.where(units > 0, units * (means[..., b] - means[..., a]) ** 2, 0.0)
    logs = log_evidence(explained, ss_within[..., None] + explained, df[..., None] + 1.0, units, phi)
    return np.where((units > 0) & (df[..., None] > 0), logs, 0.0)


def pair_indices(groups: int) -> tuple[Ints, Ints]:
    """The pairs (0,1), (0,2), ..., (1,2), ... as two index arrays."""
    a, b = np.triu_indices(groups, 1)
    return a.astype(np.int64), b.astype(np.int64)


def closed_p_from_pairs(log_pairs: Floats, groups: int, log_lead: Floats | None = None, lead: float = 0.0) -> Floats:
    """Adjusted p-values from the pairs' evidence, and bounds on that of one group against the rest of a block.

    Args:
        log_pairs: (..., M) log E of every pair; any e-values valid at the same looks will do.
        groups: k, all groups stated for the comparison, also those without data.
        log_lead: (..., M, k-2) lower bounds on log E of the better of a and b against the rest of a block of size
            c = 3, ..., k that holds both; None when there are none.
        lead: share of a block's error rate for those; 0 when `log_lead` is None.

    Returns:
        (..., M) p-values, at most 1.
    """
    a, b = pair_indices(groups)
    least = log_pairs + np.log(2.0 / _spent(2, groups))
    if groups > 2:
        sizes = np.arange(3, groups + 1)
        spent = np.log([_spent(int(c), groups) for c in sizes])
        hidden = np.maximum(_hidden_pairs(log_pairs, a, b, groups), log_pairs[..., None])
        found = hidden + np.log(2.0 * (1.0 - lead) / (sizes - 1)) - spent
        if log_lead is not None and lead > 0:
            found = np.maximum(found, log_lead + np.log(lead) - spent)
        least = np.minimum(least, found.min(axis=-1))
    return p_from_log(least)


def _spent(size: int, groups: int) -> int:
    """Groups that can stand in blocks of two or more when one block has this size: a lone one left over cannot."""
    return groups - 1 if groups - size == 1 else groups


def _hidden_pairs(log_pairs: Floats, a: Ints, b: Ints, groups: int) -> Floats:
    """(..., M, k-2): for each pair the sorted max(log E_xa, log E_xb) over the other groups x."""
    square = np.full((*log_pairs.shape[:-1], groups, groups), np.inf)
    square[..., a, b] = log_pairs
    square[..., b, a] = log_pairs
    either = np.maximum(square[..., a, :], square[..., b, :])
    return np.sort(either, axis=-1)[..., : groups - 2]


def closed_p_many(means: Floats, n: Floats, ss_within: Floats, df: Floats, phi: float, lead: float = LEAD) -> Floats:
    """Adjusted p-values of all pairs at one look, any number of groups.

    Args:
        means: (..., k), n: (..., k), ss_within: (...), df: (...): as `blocks.log_block_evidence`.
        n: units a group; while a stated group has none, only the pairs' own evidence counts.
        ss_within: pooled sum of squares.
        df: its degrees of freedom.
        phi: tuning.
        lead: share of a block's error rate for one group against the rest, in [0, 1).

    Returns:
        (..., k(k-1)/2), each valid at every look together.
    """
    groups = means.shape[-1]
    pairs = log_pair_evidence(means, n, ss_within, df, phi)
    bounds = log_lead_bounds(means, n, ss_within, df, phi) if groups > 2 and lead > 0 else None
    return closed_p_from_pairs(pairs, groups, bounds, lead if bounds is not None else 0.0 if groups == 2 else lead)


def log_lead_bounds(means: Floats, n: Floats, ss_within: Floats, df: Floats, phi: float) -> Floats:
    """Lower bounds for `closed_p_from_pairs`: (..., M, k-2), -inf rows where a group has no unit yet.

    For x_b > x_a and others with sum S the two contrasts are u = x_b - (x_a + S)/(c-1) and v = (x_b + S)/(c-1) - x_a,
    and u + v = (x_b - x_a) c/(c-1) whatever S: only the range of S decides how far the larger can be pushed down.
    """
    groups = means.shape[-1]
    a, b = pair_indices(groups)
    low, high = np.minimum(means[..., a], means[..., b])[..., None], np.maximum(means[..., a], means[..., b])[..., None]
    size = np.arange(3, groups + 1)
    smallest, largest = _sums_of_others(means)
    up_least = high - (low + largest) / (size - 1)
    down_least = (high + smallest) / (size - 1) - low
    half = (high - low) * size / (size - 1) / 2.0
    distance = np.maximum(half, np.maximum(up_least, down_least))
    fewest, most = _units_of_lead(n, a, b)
    shrink_most, shrink_fewest = phi / (phi + most), phi / (phi + fewest)
    explained = fewest * distance**2
    within = ss_within[..., None, None]
    part = np.divide(explained, within + explained, out=np.zeros_like(explained), where=within + explained > 0)
    logs = 0.5 * np.log(shrink_most) - 0.5 * (df[..., None, None] + 1.0) * np.log1p(-(1.0 - shrink_fewest) * part)
    usable = (n > 0).all(axis=-1) & (df > 0)
    return np.where(usable[..., None, None], logs, -np.inf)


def _sums_of_others(values: Floats) -> tuple[Floats, Floats]:
    """Sums of the 1, ..., k-2 smallest, and largest, of the values of the groups other than a and b, (..., M, k-2)."""
    ordered = np.sort(values[..., _others(values.shape[-1])], axis=-1)
    return np.cumsum(ordered, axis=-1), np.cumsum(ordered[..., ::-1], axis=-1)


@lru_cache(maxsize=16)
def _others(groups: int) -> Ints:
    """(M, k-2): the groups that are not in a pair."""
    table = np.broadcast_to(np.arange(groups), (groups * (groups - 1) // 2, groups))
    a, b = pair_indices(groups)
    others: Ints = table[(table != a[:, None]) & (table != b[:, None])].reshape(-1, groups - 2)
    return others


def _units_of_lead(n: Floats, a: Ints, b: Ints) -> tuple[Floats, Floats]:
    """Fewest and most units the contrast of a (or b) with the plain mean of c-1 others can have, (..., M, k-2)."""
    inverse = 1.0 / np.where(n > 0, n, 1.0)
    smallest, largest = _sums_of_others(inverse)
    others = np.arange(3, n.shape[-1] + 1) - 1
    one, two = inverse[..., a][..., None], inverse[..., b][..., None]
    worst = np.maximum(one + (two + largest) / others**2, two + (one + largest) / others**2)
    best = np.minimum(one + (two + smallest) / others**2, two + (one + smallest) / others**2)
    return 1.0 / worst, 1.0 / best


def holm_p_against_control(log_pairs: Floats, groups: int) -> Floats:
    """Adjusted p-values for the pairs with the first group only, (..., k-1): Holm's order on the evidence."""
    logs = log_pairs[..., : groups - 1]
    return holm_from_log(logs)


def holm_from_log(logs: Floats) -> Floats:
    """Holm's adjusted p-values from log evidence, (..., m) to (..., m)."""
    count = logs.shape[-1]
    order = np.argsort(-logs, axis=-1, kind="stable")
    ranked = np.take_along_axis(logs, order, axis=-1) - np.log(np.arange(count, 0, -1))
    stepped = np.minimum.accumulate(ranked, axis=-1)
    back = np.empty_like(stepped)
    np.put_along_axis(back, order, stepped, axis=-1)
    return p_from_log(back)


def all_pairs(groups: int) -> list[tuple[int, int]]:
    """The pairs as a list, in the order every result uses."""
    return list(combinations(range(groups), 2))
