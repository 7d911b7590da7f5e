"""Group means and sums of squares without rounding: exact integer arithmetic on the values as recorded.

Laboratory values are decimals. Reading 8.9 as the double nearest to it loses the recorded value's last digits, and no
care afterwards brings them back: with an offset of 1e12 double arithmetic cannot pass about 4 digits of an analysis of
variance (NIST StRD, one-way analysis of variance, sets of higher difficulty). So the values are turned into integers
times a common unit, the sums of values and of squares are exact integers, and each result is rounded once.

How values are read, one rule for the whole array:

* text and `decimal.Decimal` are the decimals they say;
* floats whose shortest decimals all have at most 15 significant digits are those decimals: a double carries every
  decimal of 15 digits faithfully, so such an array is what somebody wrote down;
* if one float of the array needs more than 15 digits, they are results of a computation: then all are taken as the
  doubles stored, exactly (integers times a power of two).

The order of the values cannot matter to any bit of the results.
"""

from __future__ import annotations

from dataclasses import dataclass
from decimal import Decimal, InvalidOperation
from fractions import Fraction
from typing import TYPE_CHECKING, Any

import numpy as np

from sameline.errors import StatsError

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    Array = NDArray[np.float64]
    Whole = NDArray[np.int64]

_LIMB_BITS = 16
# 2^53 / (2^16)^2: more values than this could round a float64 accumulator of limb products.
_MOST_VALUES = 1 << 21
_DIGITS_15 = 1e15


@dataclass(frozen=True, slots=True)
class GroupSums:
    """Exact sums of k groups, each result rounded once to the nearest double.

    Attributes:
        n: shape (k,), values in each group.
        mean: shape (k,), group means.
        deviation: shape (k,), group mean minus grand mean; differences of means are best taken from these,
            because they keep their digits under any offset.
        ss: shape (k,), sum of squared deviations from the group's own mean.
        grand_mean: the mean of all values.
        ss_between: sum over groups of n (mean - grand mean)^2.
        ss_within: sum of `ss`.
    """

    n: NDArray[np.int64]
    mean: Array
    deviation: Array
    ss: Array
    grand_mean: float
    ss_between: float
    ss_within: float


def group_sums(values: Array | Sequence[str | Decimal], codes: NDArray[np.integer], groups: int) -> GroupSums:
    """Return counts, means and sums of squares of each group, exact but for one rounding each.

    Args:
        values: shape (n,), floats, or texts or Decimals; read as the module's text says.
        codes: shape (n,), each value's group, 0 to groups - 1.
        groups: the number of groups k; each must have a value.

    Raises:
        StatsError: a value that is not finite, a text that is no number, an empty group, codes out of range.
    """
    group_of = np.asarray(codes, dtype=np.int64)
    numbers, unit = _as_integers(values)
    if len(numbers) != len(group_of):
        raise StatsError(f"{len(numbers)} values but {len(group_of)} group codes", where="groups")
    if group_of.size and (group_of.min() < 0 or group_of.max() >= groups):
        raise StatsError("a group code lies outside the groups", where="groups")
    n = np.bincount(group_of, minlength=groups)
    if not n.all():
        raise StatsError(f"group {int(np.argmin(n))} has no value", where="groups")
    pivot = min(numbers)
    sums, squares = _integer_sums([v - pivot for v in numbers], group_of.tolist(), groups)
    return _results([int(c) for c in n], sums, squares, pivot, unit)


def _integer_sums(numbers: list[int], codes: list[int], groups: int) -> tuple[list[int], list[int]]:
    sums, squares = [0] * groups, [0] * groups
    for value, code in zip(numbers, codes, strict=True):
        sums[code] += value
        squares[code] += value * value
    return sums, squares


def _results(n: list[int], sums: list[int], squares: list[int], pivot: int, unit: Fraction) -> GroupSums:
    """Round the exact results, each once."""
    total, total_sum = sum(n), sum(sums)
    between = sum(Fraction(s * s, c) for s, c in zip(sums, n, strict=True)) - Fraction(total_sum**2, total)
    ss = [Fraction(c * q - s * s, c) for c, s, q in zip(n, sums, squares, strict=True)]
    return GroupSums(
        n=_frozen(np.array(n, dtype=np.int64)),
        mean=_floats([(pivot + Fraction(s, c)) * unit for s, c in zip(sums, n, strict=True)]),
        deviation=_floats(
            [Fraction(s * total - total_sum * c, c * total) * unit for s, c in zip(sums, n, strict=True)]
        ),
        ss=_floats([one * unit * unit for one in ss]),
        grand_mean=float((pivot + Fraction(total_sum, total)) * unit),
        ss_between=float(between * unit * unit),
        ss_within=float(sum(ss) * unit * unit),
    )


def _floats(exact: list[Fraction]) -> Array:
    return _frozen(np.array([float(one) for one in exact]))


def _frozen(array: NDArray[Any]) -> NDArray[Any]:
    array.flags.writeable = False
    return array


def _as_integers(values: Array | Sequence[str | Decimal]) -> tuple[list[int], Fraction]:
    if (isinstance(values, np.ndarray) and values.dtype.kind in "fiu") or all(isinstance(v, float) for v in values):
        floats = np.asarray(values, dtype=np.float64)
        if not np.isfinite(floats).all():
            raise StatsError("a value is not finite", where=f"value {int(np.argmin(np.isfinite(floats)))}")
        texts = [Decimal(repr(v)) for v in floats.tolist()]
        if any(len(t.normalize().as_tuple().digits) > 15 for t in texts):
            texts = [Decimal(v) for v in floats.tolist()]
    else:
        try:
            texts = [Decimal(v) for v in values]
        except InvalidOperation as error:
            raise StatsError("a value is no number", where="values") from error
        if not all(t.is_finite() for t in texts):
            raise StatsError("a value is not finite", where="values")
    ratios = [t.as_integer_ratio() for t in texts]
    unit = 1
    for _, d in ratios:
        import math

        unit = math.lcm(unit, d)
    return [a * (unit // d) for a, d in ratios], Fraction(1, unit)
