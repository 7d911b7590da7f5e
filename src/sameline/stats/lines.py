"""Lines under ordered means, letters where lines would lie, a matrix where letters would drown the reader.

Groups on one line (or sharing a letter) are not shown to differ; groups that share none are. Lines can be drawn under
the means in order only where the groups not shown to differ form contiguous stretches, which unequal group sizes or
unequal spreads often break; a sweep over sorted means then draws wrong lines. So the stretches are checked first, and
letters (`letters`) take over where they fail. Every display is checked against the pair matrix before it is returned.

Reference: Piepho, H.-P. (2004), An algorithm for a letter-based representation of all-pairwise comparisons, J. Comput.
Graph. Stat. 13:456-466.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from sameline.errors import StatsError
from sameline.stats.letters import cover, letter_name

MOST_LETTERS = 260  # five alphabets of 52; more sets than that fall back to the matrix

Bools = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Display:
    """Which groups are not shown to differ.

    Args:
        kind: "lines" (each set is a contiguous stretch of the ordered means), "letters" (it is not), "matrix" (more
            than `MOST_LETTERS` letters would be needed: read `differs`), or "control" (only pairs with a control were
            asked, so no lines are drawn).
        order: labels in order of mean, lowest first; equal means in order of label.
        sets: maximal sets of labels none shown to differ from another, each in order of mean; () for matrix, control.
        letters: letters of each label, such as {"A": "a", "B": "ab"}; the first set is "a"; empty where sets is ().
        fewest: whether the number of sets is proven to be the smallest possible.
        differs: the pair matrix in the order of `order`, shape (k, k), read-only.
    """

    kind: str
    order: tuple[str, ...]
    sets: tuple[tuple[str, ...], ...]
    letters: Mapping[str, str]
    fewest: bool
    differs: Bools


def lines(labels: Sequence[str], means: ArrayLike, differs: ArrayLike) -> Display:
    """Draws the lines, or the letters, for a matrix of pairs.

    Args:
        labels: k different labels.
        means: their means, shape (k,), finite.
        differs: symmetric, shape (k, k), True where a pair is shown to differ; the diagonal is not read.

    Raises:
        StatsError: shapes do not fit, labels repeat, a mean is not finite or the matrix is not symmetric.
    """
    labels = tuple(labels)
    mean, matrix = np.asarray(means, float), np.array(differs, bool)
    _check(labels, mean, matrix)
    at = _by_mean(labels, mean)
    matrix = matrix[np.ix_(at, at)]
    np.fill_diagonal(matrix, val=False)
    order = tuple(labels[i] for i in at)
    stretches = _stretches(~matrix)
    if stretches is not None:
        return _display("lines", order, stretches, matrix, fewest=True)
    found = cover(~matrix, most=MOST_LETTERS)
    if found is None:
        return _display("matrix", order, [], matrix, fewest=False)
    return _display("letters", order, found.sets, matrix, fewest=found.fewest)


def control_display(labels: Sequence[str], means: ArrayLike, differs: ArrayLike) -> Display:
    """The display of comparisons with a control: groups in order of mean, and no lines: most pairs were not asked."""
    at = _by_mean(labels, np.asarray(means, float))
    matrix = np.array(differs, bool)[np.ix_(at, at)]
    return _display("control", tuple(labels[i] for i in at), [], matrix, fewest=False)


def _by_mean(labels: Sequence[str], means: NDArray[np.float64]) -> list[int]:
    """Places in order of mean; equal means in order of label, so that the order of rows moves nothing."""
    return sorted(range(len(labels)), key=lambda at: (means[at], labels[at]))


def _stretches(alike: Bools) -> list[list[int]] | None:
    """The maximal contiguous stretches of a matrix in order of mean, or None where stretches cannot tell its truth.

    With r(i) the last group not shown to differ from i, stretches do exactly if r never falls and every group between
    i and r(i) is alike with i.
    """
    k = len(alike)
    last = k - 1 - np.argmax(alike[:, ::-1], axis=1)
    wanted = np.arange(k)[None, :] <= last[:, None]
    upper = np.triu(np.ones((k, k), bool))
    if np.any(np.diff(last) < 0) or np.any((alike != wanted) & upper):
        return None
    starts = [i for i in range(k) if i == 0 or last[i] > last[i - 1]]
    return [list(range(i, int(last[i]) + 1)) for i in starts]


def _display(kind: str, order: tuple[str, ...], sets: list[list[int]], differs: Bools, *, fewest: bool) -> Display:
    if sets:
        _check_display(sets, differs)
    letters: dict[str, str] = dict.fromkeys(order, "") if sets else {}
    for number, members in enumerate(sets):
        for member in members:
            letters[order[member]] += letter_name(number)
    differs.setflags(write=False)
    labelled = tuple(tuple(order[member] for member in members) for members in sets)
    return Display(kind, order, labelled, MappingProxyType(letters), fewest, differs)


def _check_display(sets: list[list[int]], differs: Bools) -> None:
    """Two groups share a set exactly if their pair is not shown to differ; every group is in a set."""
    member = np.zeros((len(differs), len(sets)), np.float32)
    for number, members in enumerate(sets):
        member[members, number] = 1.0
    share = member @ member.T > 0.5
    if not np.array_equal(share, ~differs):
        raise StatsError("the lines do not reproduce the pairs: this is a fault of the program, not of the data")


def _check(labels: tuple[str, ...], mean: NDArray[np.float64], matrix: Bools) -> None:
    k = len(labels)
    if k < 1 or mean.shape != (k,) or matrix.shape != (k, k):
        raise StatsError(f"{k} labels, means of shape {mean.shape} and pairs of shape {matrix.shape} do not fit")
    if len(set(labels)) != k:
        raise StatsError("labels repeat", where="labels", advice="give each group its own label")
    if not np.isfinite(mean).all():
        raise StatsError("a mean is not finite", where="means")
    if not np.array_equal(matrix | np.eye(k, dtype=bool), matrix.T | np.eye(k, dtype=bool)):
        raise StatsError("the matrix of pairs is not symmetric", where="differs")
