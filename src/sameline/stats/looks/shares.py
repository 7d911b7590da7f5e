"""How groups that join later share the error rate, by a rule stated before they come.

The groups stated at the outset, the founders, have a part of alpha together and are judged by the closed procedure on
it. The m-th group that joins, by order of first appearance, has the part (1 - founders) / (m (m + 1)) of alpha for all
its pairs with the groups before it, by Holm's order on their e-values. The parts add up to at most 1 however many
groups ever come, a group's part depends only on its place in the order, and pairs already judged keep theirs.
So the total over all pairs ever formed stays within alpha, exactly: a false claim needs a false claim among the
founders or within some joiner's pairs, and each of these has its own part (union bound over closed procedures).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from sameline.errors import StatsError
from sameline.stats.looks.many import holm_from_log, pair_indices

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Floats = NDArray[np.float64]

FOUNDERS = 0.5
"""Part of the error rate of the groups stated at the outset, when groups may join."""


def joiner_part(number: int, founders_part: float = FOUNDERS) -> float:
    """Part of alpha of the `number`-th group that joins (1, 2, ...), for all its pairs together."""
    if number < 1:
        raise StatsError(f"the {number}-th group to join cannot be meant", where="number")
    return (1.0 - founders_part) / (number * (number + 1))


def interval_shares(groups: int, founders: int | None, *, control: bool) -> Floats:
    """Share of alpha that each pair's interval spends, in the order of all pairs (or of those with the control).

    Args:
        groups: k so far.
        founders: how many of them were stated at the outset; None when no group may join.
        control: whether only pairs with the first group are asked.
    """
    a, b = pair_indices(groups)
    first = groups if founders is None else founders
    within = float(first - 1 if control else first * (first - 1) // 2)
    part = 1.0 if founders is None else FOUNDERS
    number = np.maximum(b - first + 1, 1)
    joined = (1.0 - part) / (number * (number + 1)) / (np.ones_like(b) if control else b)
    shares: Floats = np.where(b < first, part / within, joined)
    return shares[a == 0] if control else shares


def with_joiners(founders_p: Floats, log_pairs: Floats, groups: int, founders: int, *, control: bool) -> Floats:
    """Overall p-values of all pairs from the founders' closed ones and the joiners' evidence.

    Args:
        founders_p: (..., m0) closed p-values of the founders' pairs.
        log_pairs: (..., m) log E of all pairs asked, in the order of all pairs (or those with the control).
        groups: k so far.
        founders: how many were stated at the outset, at least 2.
        control: whether only pairs with the first group are asked.

    Returns:
        (..., m) p-values on the scale of the whole alpha.
    """
    a, b = pair_indices(groups)
    if control:
        a, b = a[: groups - 1], b[: groups - 1]
    p = np.ones(log_pairs.shape)
    p[..., b < founders] = np.minimum(1.0, founders_p / FOUNDERS)
    for number in range(1, groups - founders + 1):
        column = b == founders + number - 1
        p[..., column] = np.minimum(1.0, holm_from_log(log_pairs[..., column]) / joiner_part(number))
    return p
