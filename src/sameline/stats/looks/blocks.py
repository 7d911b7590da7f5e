"""Evidence against "these groups all have one mean", for every set of two or more groups at once.

For a block C of groups the null is: the groups of C share a mean, all other groups have their own. The evidence is a
mixture of likelihood ratios of one and the same maximal invariant (see `evidence`), so it is again an exact martingale:

- one group stands apart from the rest of the block (each group in turn);
- two groups stand apart, one above and one below (each pair in turn);
- all groups scatter (independent normal shifts).

A block of two has one form only, the e-value of the pair. Averaging the pairs' own e-values instead would look
simpler, and at one look E[average] = 1 holds; but each pair's e-value is a martingale in its own filtration only
(the others' means are nuisance there), so over many looks nothing is proven for their average. Here all parts of a
mixture share one null density, and Ville's inequality holds for the mixture.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from itertools import combinations
from typing import TYPE_CHECKING

import numpy as np

from sameline.stats.looks.evidence import log_evidence

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Floats = NDArray[np.float64]
    Ints = NDArray[np.int64]

APART, TWO_APART, SCATTER = 0.4, 0.4, 0.2
"""Weights of the three kinds of alternative in a block of three or more; fixed, for they are part of the procedure."""


@dataclass(frozen=True, slots=True)
class BlockParts:
    """The parts of every block's mixture for k groups, as index arrays.

    Attributes:
        masks: (m,) bit masks of the blocks of two or more groups, ascending.
        members: (m, k) whether a group is in a block.
        single: (2, s) block index and group of each "one apart" part.
        double: (3, d) block index and groups a < b of each "two apart" part; blocks of two have just one.
        log_weight: (s + d + m,) log weight of each part in its block, -inf for a part a block does not have.
    """

    masks: Ints
    members: NDArray[np.bool_]
    single: Ints
    double: Ints
    log_weight: Floats


@lru_cache(maxsize=16)
def block_parts(groups: int, *, everyone: bool = False) -> BlockParts:
    """Lists the parts for `groups` groups (2 to about 10; there are 2^k blocks), or of the block of all only."""
    chosen = [(1 << groups) - 1] if everyone else [m for m in range(1 << groups) if m.bit_count() > 1]
    masks = np.array(chosen, dtype=np.int64)
    members = (masks[:, None] >> np.arange(groups)) & 1 == 1
    single, double, weights_single, weights_double = [], [], [], []
    for at, row in enumerate(members):
        inside = np.flatnonzero(row).tolist()
        size = len(inside)
        pairs = list(combinations(inside, 2))
        single += [(at, i) for i in inside if size > 2]
        weights_single += [APART / size] * size if size > 2 else []
        double += [(at, a, b) for a, b in pairs]
        weights_double += [TWO_APART / len(pairs) if size > 2 else 1.0] * len(pairs)
    scatter = np.where(members.sum(axis=1) > 2, SCATTER, 0.0)
    weight = np.concatenate([weights_single, weights_double, scatter])
    return BlockParts(
        masks=masks,
        members=members,
        single=np.array(single, dtype=np.int64).reshape(-1, 2).T,
        double=np.array(double, dtype=np.int64).T,
        log_weight=np.log(weight, out=np.full(weight.shape, -np.inf), where=weight > 0),
    )


def log_block_evidence(
    means: Floats, n: Floats, ss_within: Floats, df: Floats, phi: float, *, everyone: bool = False
) -> Floats:
    """Log E for every block of two or more groups.

    Args:
        means: (..., k) group means of the units; any finite number where a group has no unit yet.
        n: (..., k) units a group, 0 allowed.
        ss_within: (...) pooled sum of squares of units about their group's mean.
        df: (...) its degrees of freedom, total units less groups with units.
        phi: tuning of the contrasts, 1 / variance of the standardised difference.
        everyone: only the block of all groups, m = 1 (no pair can be claimed while this one is not rejected).

    Returns:
        (..., m) in the order of `block_parts(k).masks`.
    """
    parts = block_parts(means.shape[-1], everyone=everyone)
    size = np.where(parts.members, n[..., None, :], 0.0)
    total = size.sum(axis=-1)
    centre = (size * means[..., None, :]).sum(axis=-1) / np.where(total > 0, total, 1.0)
    away = np.where(size > 0, means[..., None, :] - centre[..., None], 0.0)
    between = (size * away**2).sum(axis=-1)
    null_ss = ss_within[..., None] + between
    null_df = df[..., None] + np.maximum((size > 0).sum(axis=-1) - 1, 0)
    logs = np.concatenate(
        [
            _one_apart(parts, size, total, away, null_ss, null_df, phi),
            _two_apart(parts, size, total, away, null_ss, null_df, phi),
            _scatter(size, total, away, null_ss, null_df, phi),
        ],
        axis=-1,
    )
    return _mixture(logs + parts.log_weight, parts)


def _one_apart(
    parts: BlockParts, size: Floats, total: Floats, away: Floats, null_ss: Floats, null_df: Floats, phi: float
) -> Floats:
    """Log E of "group i differs from the rest of its block", (..., s)."""
    block, i = parts.single
    own, whole, shift = size[..., block, i], total[..., block], away[..., block, i]
    rest = np.where(whole > own, whole - own, 1.0)
    units = np.where(whole > own, own * rest / np.where(whole > 0, whole, 1.0), 0.0)
    explained = units * (shift * whole / rest) ** 2
    return log_evidence(explained, null_ss[..., block], null_df[..., block], units, phi)


def _two_apart(
    parts: BlockParts, size: Floats, total: Floats, away: Floats, null_ss: Floats, null_df: Floats, phi: float
) -> Floats:
    """Log E of "b above and a below the rest by half a difference each", (..., d)."""
    block, a, b = parts.double
    n_a, n_b, whole = size[..., block, a], size[..., block, b], total[..., block]
    units = (n_a + n_b) / 4.0 - (n_b - n_a) ** 2 / (4.0 * np.where(whole > 0, whole, 1.0))
    projection = (n_b * away[..., block, b] - n_a * away[..., block, a]) / 2.0
    explained = projection**2 / np.where(units > 0, units, 1.0)
    return log_evidence(explained, null_ss[..., block], null_df[..., block], np.maximum(units, 0.0), phi)


def _scatter(size: Floats, total: Floats, away: Floats, null_ss: Floats, null_df: Floats, phi: float) -> Floats:
    """Log E of "every group of the block is shifted by its own normal amount", variance 1 / (2 phi), (..., m)."""
    own = 2.0 * phi
    shrink = own / (own + size)
    weight = size * shrink
    whole = weight.sum(axis=-1)
    safe = np.where(whole > 0, whole, 1.0)
    centre = (weight * away).sum(axis=-1) / safe
    unexplained = (weight * (away - centre[..., None]) ** 2).sum(axis=-1)
    between = (size * away**2).sum(axis=-1)
    part = np.divide(between - unexplained, null_ss, out=np.zeros_like(null_ss), where=null_ss > 0)
    scale = 0.5 * (np.log(shrink).sum(axis=-1) + np.log(np.where(whole > 0, total / safe, 1.0)))
    return np.where(null_df > 0, scale - 0.5 * null_df * np.log1p(-np.clip(part, 0.0, 1.0 - 1e-15)), 0.0)


def _mixture(logs: Floats, parts: BlockParts) -> Floats:
    """Log of the sum of the weighted parts within each block, (..., m)."""
    count = parts.masks.size
    block = np.concatenate([parts.single[0], parts.double[0], np.arange(count)])
    order = np.argsort(block, kind="stable")
    starts = np.searchsorted(block[order], np.arange(count))
    return np.logaddexp.reduceat(logs[..., order], starts, axis=-1)
