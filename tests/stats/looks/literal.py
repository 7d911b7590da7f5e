"""Slow, literal forms of what the package computes fast: the definition, written down."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


def log_ratio(values: Floats, design: Floats, extra: Floats) -> float:
    """Log density ratio of the maximal invariant of `values` under shifts along `design` and changes of scale.

    Numerator: covariance sigma^2 (I + extra); denominator: sigma^2 I. With a flat prior on the coefficients and
    d sigma / sigma on the scale the marginal density is proportional to
    |V|^(-1/2) |X'V^-1 X|^(-1/2) RSS(V)^(-(N - p) / 2).
    """

    def marginal(covariance: Floats) -> float:
        inverse = np.linalg.inv(covariance)
        information = design.T @ inverse @ design
        fitted = np.linalg.solve(information, design.T @ inverse @ values)
        rest = values - design @ fitted
        freedom = len(values) - design.shape[1]
        logs = np.linalg.slogdet(covariance)[1] + np.linalg.slogdet(information)[1]
        return float(-0.5 * logs - 0.5 * freedom * math.log(rest @ inverse @ rest))

    identity = np.eye(len(values))
    return marginal(identity + extra) - marginal(identity)


def log_block(values: Floats, groups: NDArray[np.int64], block: Sequence[int], phi: float) -> float:
    """Log of the mixture `blocks.log_block_evidence` states, from the units themselves."""
    k = int(groups.max()) + 1
    columns = [np.isin(groups, block)] + [groups == g for g in range(k) if g not in block]
    design = np.array([c for c in columns if c.any()], dtype=float).T
    member = np.array([groups == g for g in range(k)], dtype=float).T

    def shifted(direction: Floats, variance: float) -> float:
        along = member @ direction
        return log_ratio(values, design, variance * np.outer(along, along))

    unit = np.eye(k)
    pairs = [shifted((unit[b] - unit[a]) / 2, 1 / phi) for a, b in combinations(block, 2)]
    if len(block) == 2:
        return pairs[0]
    single = [shifted(unit[i], 1 / phi) for i in block]
    inside = member[:, list(block)]
    scatter = log_ratio(values, design, inside @ inside.T / (2 * phi))
    return math.log(0.4 * np.mean(np.exp(single)) + 0.4 * np.mean(np.exp(pairs)) + 0.2 * math.exp(scatter))


def partitions(items: Sequence[int]) -> Iterator[list[list[int]]]:
    """All partitions of the items into blocks."""
    if not items:
        yield []
        return
    first, *rest = items
    for found in partitions(rest):
        yield [[first], *found]
        for i, block in enumerate(found):
            yield [*found[:i], [first, *block], *found[i + 1 :]]


def closed_p(evidence: dict[tuple[int, ...], float], groups: int) -> list[float]:
    """Adjusted p of every pair by writing out every partition; `evidence` of each block times its size."""
    p = dict.fromkeys(combinations(range(groups), 2), 0.0)
    for partition in partitions(list(range(groups))):
        blocks = [tuple(sorted(block)) for block in partition if len(block) > 1]
        if not blocks:
            continue
        total = sum(map(len, blocks))
        rejects_at = total / max(evidence[block] for block in blocks)
        for block in blocks:
            for pair in combinations(block, 2):
                p[pair] = max(p[pair], rejects_at)
    return [min(1.0, value) for value in p.values()]
