"""Shifts between two groups: the differences between their values, and those of them that bound an interval.

With d_(1) <= ... <= d_(nm) the differences of each value of b less each value of a, the test of a shift counts those
above it; the shifts it does not reject lie between d_(j) and d_(nm - j + 1), j = nm - floor(nm/2 + c), where c is what
the count may be off its half. References as in `steel_dwass`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from sameline.stats.columns import Question
from sameline.stats.values import Floats

_AT_ONCE = 1 << 20  # differences held in memory at a time


@dataclass(frozen=True, slots=True)
class Shifts:
    """Bounds of each pair's interval, infinite where open, and the median difference; shape (m,) each."""

    lower: Floats
    upper: Floats
    median: Floats


def shifts(question: Question, allowance: Floats) -> Shifts:
    """The interval of shifts for each pair.

    Args:
        question: which pairs.
        allowance: c of each pair, at least 0, shape (m,).
    """
    n = question.samples.n
    found = Shifts(*(np.empty(question.m) for _ in range(3)))
    own = _by_group(question)
    sizes = n[question.first] * (int(n.max()) + 1) + n[question.second]
    for size in np.unique(sizes):
        pairs = np.flatnonzero(sizes == size)
        count = int(n[question.first[pairs[0]]] * n[question.second[pairs[0]]])
        step = max(1, _AT_ONCE // count)
        for start in range(0, pairs.size, step):
            _fill(found, question, own, pairs[start : start + step], allowance)
    return found


def _by_group(question: Question) -> list[Floats]:
    """The values of each group."""
    samples = question.samples
    ordered = samples.values.centred[np.argsort(samples.codes, kind="stable")]
    return np.split(ordered, np.cumsum(samples.n)[:-1])


def _fill(found: Shifts, question: Question, own: list[Floats], pairs: NDArray[np.intp], allowance: Floats) -> None:
    """Fills in pairs that have the same sizes."""
    a = np.stack([own[at] for at in question.first[pairs]])
    b = np.stack([own[at] for at in question.second[pairs]])
    d = np.sort((b[:, :, None] - a[:, None, :]).reshape(pairs.size, -1), axis=1)
    count = d.shape[1]
    j = count - np.floor(count / 2.0 + allowance[pairs]).astype(int)
    row = np.arange(pairs.size)
    found.lower[pairs] = np.where(j >= 1, d[row, np.maximum(j - 1, 0)], -np.inf)
    found.upper[pairs] = np.where(j >= 1, d[row, np.minimum(count - j, count - 1)], np.inf)
    found.median[pairs] = (d[:, (count - 1) // 2] + d[:, count // 2]) / 2.0
