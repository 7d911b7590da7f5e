"""Values and labels as they come in, put into one canonical order, so that the order of rows moves no digit.

Rows are sorted by their labels as text and, within the finest unit, by value; the origin of all later sums is one of
the values (the lower median), so that a large common offset costs nothing.
"""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass
from itertools import count
from typing import TYPE_CHECKING, Any

import numpy as np

from sameline.errors import StatsError
from sameline.stats.labels import encode
from sameline.stats.values import read_values

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping

    from numpy.typing import NDArray

MOST_GROUPS = 100_000


@dataclass(frozen=True, slots=True)
class Rows:
    """n values in canonical order, centred, with the unit of each level they belong to.

    Args:
        y: values minus `origin`, shape (n,).
        origin: one of the values, or 0.
        units: level name -> unit of each value, shape (n,), 0-based and non-decreasing except for "session". The
            levels run from "group" through "batch" and "run" where given to "replicate" (each value its own unit).
        groups: group labels in order of first appearance, length k.
        place: canonical code of each of `groups`, shape (k,).
        batches: label of each batch unit, or () when no batches were given.
        sessions: session labels in canonical order, or ().
        reused: batch labels that stand in more than one group.
    """

    y: NDArray[np.float64]
    origin: float
    units: Mapping[str, NDArray[np.intp]]
    groups: tuple[str, ...]
    place: NDArray[np.intp]
    batches: tuple[str, ...]
    sessions: tuple[str, ...]
    reused: tuple[str, ...]

    def count(self, level: str) -> int:
        """How many units a level has."""
        return int(self.units[level].max()) + 1


def read_rows(
    values: Iterable[Any],
    groups: Iterable[Any] | None,
    batches: Iterable[Any] | None,
    runs: Iterable[Any] | None,
    sessions: Iterable[Any] | None,
) -> Rows:
    """Checks values and labels and orders them.

    Raises:
        StatsError: values are not finite numbers, there are none, or a label is missing or of another length.
    """
    given = read_values(values)
    y = given.centred
    n = y.size
    if n == 0:
        raise StatsError("there are no values", where="values", advice="give one number a row")
    codes = [_codes(name, given, n) for name, given in zip(_LEVELS, (groups, batches, runs, sessions), strict=True)]
    (group_labels, g, place), (batch_labels, b, _), (_, r, _), (session_labels, s, _) = codes
    batch, of_batch = _within(g, b)
    finest = batch if sessions is None else _within(batch, s)[0]
    finest = finest if runs is None else _within(finest, r)[0]
    order = _order(y, finest)
    units = {"group": g[order]}
    if batches is not None:
        units["batch"] = batch[order]
    if runs is not None or sessions is not None:
        units["run"] = finest[order]
    units["replicate"] = np.arange(n)
    if sessions is not None:
        units["session"] = s[order]
    counts = np.bincount(of_batch)
    return Rows(
        y=y[order],
        origin=given.origin,
        units=units,
        groups=tuple(group_labels[at] for at in place),
        place=place,
        batches=tuple(batch_labels[at] for at in of_batch) if batches is not None else (),
        sessions=session_labels if sessions is not None else (),
        reused=tuple(batch_labels[at] for at in np.flatnonzero(counts > 1)) if batches is not None else (),
    )


_LEVELS = ("groups", "batches", "runs", "sessions")


def _codes(
    name: str, given: Iterable[Any] | None, n: int
) -> tuple[tuple[str, ...], NDArray[np.intp], NDArray[np.intp]]:
    """Labels in the order of their text, the code of each row, and the codes in order of first appearance.

    One common label stands in where none was given.
    """
    if given is None:
        return ("all",), np.zeros(n, np.intp), np.zeros(1, np.intp)
    seen, codes = _encoded(name, given)
    if codes.size != n:
        raise StatsError(
            f"{codes.size} labels for {n} values", where=name, advice="give one label a value, in the same order"
        )
    if name == "groups" and len(seen) > MOST_GROUPS:
        raise StatsError(f"{len(seen)} groups", where=name, advice="are these group labels, or the values themselves?")
    order = sorted(range(len(seen)), key=seen.__getitem__)
    rank = np.empty(len(seen), np.intp)
    rank[order] = np.arange(len(seen))
    return tuple(seen[at] for at in order), rank[codes], rank


def _encoded(name: str, given: Iterable[Any]) -> tuple[tuple[str, ...], NDArray[np.intp]]:
    """`encode`, asked only about different labels where one type makes that safe, which is much faster."""
    plain = given.tolist() if isinstance(given, np.ndarray) and given.ndim == 1 else given
    try:
        if type(plain) is list:
            place: defaultdict[Any, int] = defaultdict(count().__next__)
            codes = np.fromiter(map(place.__getitem__, plain), np.intp, len(plain))
            if set(map(type, place)) == {str} or len(set(map(type, plain))) == 1:
                seen, of_different = encode(list(place))
                return seen, of_different[codes]
        return encode(given)
    except StatsError as error:
        raise StatsError(error.message, where=name, advice=error.advice) from error


def _within(outer: NDArray[np.intp], inner: NDArray[np.intp]) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """Unit of each row where `inner` is nested in `outer`, and the inner code of each unit."""
    width = int(inner.max()) + 1
    key = outer * width + inner
    room = (int(outer.max()) + 1) * width
    if room > 8 * key.size + 1024:
        units, unit = np.unique(key, return_inverse=True)
        return unit.astype(np.intp, copy=False), units % width
    present = np.zeros(room, bool)
    present[key] = True
    return (np.cumsum(present) - 1)[key], np.flatnonzero(present) % width


def _order(y: NDArray[np.float64], unit: NDArray[np.intp]) -> NDArray[np.intp]:
    """Rows by unit, then by value; equal rows are alike, so their order does not matter."""
    by_value = np.argsort(y)
    small = unit.astype(np.uint16) if int(unit.max()) < 2**16 else unit  # 16 bits are sorted by counting
    return by_value[np.argsort(small[by_value], kind="stable")]
