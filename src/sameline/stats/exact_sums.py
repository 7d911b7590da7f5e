"""Group means and sums of squares without rounding: exact integer arithmetic on the values as recorded.

Laboratory values are decimals. Reading 8.9 as the double nearest to it loses the recorded value's last digits, and no
care afterwards brings them back: with an offset of 1e12 double arithmetic cannot pass about 4 digits of an analysis of
variance (NIST StRD, analysis of variance, SmLs07 to SmLs09). So the values are turned into integers times a common
unit (`recorded_integers` says how a float is read), the sums of values and of squares are exact integers, and each
result is rounded once.

Speed: integers are cut into limbs of 16 bits whose sums and products a float64 accumulator holds exactly, so numpy
does the summing; Python's integers only put the limbs together, once a group. Exact sums do not depend on the order
of their terms: no order of rows can move a bit.
"""

from __future__ import annotations

import math
from collections import Counter
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, TypeVar

import numpy as np

from sameline.errors import StatsError
from sameline.stats.recorded_integers import Integers, as_integers

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence
    from decimal import Decimal

    from numpy.typing import NDArray

    Array = NDArray[np.float64]
    Whole = NDArray[np.int64]

_LIMB_BITS = 16
# 2^53 / (2^16)^2: of more values the sum of limb products could leave the exact range of a double.
_ROWS_AT_ONCE = 1 << 21

_AnyArray = TypeVar("_AnyArray", bound="NDArray[Any]")


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
        ss_within: sum of `ss` before it was rounded.
    """

    n: NDArray[np.int64]
    mean: Array
    deviation: Array
    ss: Array
    grand_mean: float
    ss_between: float
    ss_within: float


def group_sums(
    values: Array | Sequence[str | Decimal],
    codes: NDArray[np.integer[Any]],
    groups: int,
    *,
    as_stored: bool = False,
) -> GroupSums:
    """Return counts, means and sums of squares of each group, exact but for one rounding each.

    Args:
        values: shape (n,), floats, or texts or Decimals; read as `recorded_integers` says.
        codes: shape (n,), each value's group, 0 to groups - 1.
        groups: the number of groups k; each must have a value.
        as_stored: take every float as the double stored, also where all are short decimals.

    Raises:
        StatsError: a value that is not finite, a text that is no number, an empty group, codes out of range, or
            results beyond the range of doubles.
    """
    integers = as_integers(values, as_stored=as_stored)
    group_of = np.asarray(codes, dtype=np.intp)
    if group_of.shape != (len(integers.numbers),):
        raise StatsError(f"{len(integers.numbers)} values but codes of shape {group_of.shape}", where="groups")
    if group_of.min() < 0 or group_of.max() >= groups:
        raise StatsError("a group code lies outside the groups", where="groups")
    n = np.bincount(group_of, minlength=groups)
    if not n.all():
        raise StatsError(f"group {int(np.argmin(n))} has no value", where="groups")
    try:
        return _results(n.tolist(), *_sums(integers, group_of, groups), integers)
    except OverflowError:
        raise StatsError("the sums leave the range of doubles", where="values", advice="use another unit") from None


def _sums(integers: Integers, group_of: NDArray[np.intp], groups: int) -> tuple[list[int], list[int], int]:
    """Return each group's exact sum and sum of squares of (number - pivot), and the pivot."""
    numbers = integers.numbers
    if isinstance(numbers, list):
        return *_python_sums(numbers, group_of.tolist(), groups), 0
    if integers.classes is None:
        pivot = int(numbers.min())
        sums, squares = _limb_sums(numbers - pivot, group_of, groups)
        return sums, squares, pivot
    return *_class_sums(numbers, integers.classes, integers.factors, group_of, groups), 0


def _python_sums(numbers: list[int], codes: list[int], groups: int) -> tuple[list[int], list[int]]:
    """Sum integers of any size, the slow and literal way."""
    sums, squares = [0] * groups, [0] * groups
    for number, code in zip(numbers, codes, strict=True):
        sums[code] += number
        squares[code] += number * number
    return sums, squares


def _class_sums(
    numbers: Whole, classes: NDArray[np.intp], factors: tuple[int, ...], group_of: NDArray[np.intp], groups: int
) -> tuple[list[int], list[int]]:
    """Sum integers that stand for number·factor: by group and class first, then over the classes of a group."""
    cells, cell_of = np.unique(group_of * len(factors) + classes, return_inverse=True)
    sums, squares = [0] * groups, [0] * groups
    for cell, one, square in zip(cells.tolist(), *_limb_sums(numbers, cell_of, cells.size), strict=True):
        group, kind = divmod(cell, len(factors))
        sums[group] += one * factors[kind]
        squares[group] += square * factors[kind] ** 2
    return sums, squares


def _limb_sums(numbers: Whole, cell_of: NDArray[np.intp], cells: int) -> tuple[list[int], list[int]]:
    """Return each cell's exact sum and sum of squares of int64 numbers, |number| < 2^63."""
    sums, squares = [0] * cells, [0] * cells
    for begin in range(0, numbers.size, _ROWS_AT_ONCE):
        part, where = numbers[begin : begin + _ROWS_AT_ONCE], cell_of[begin : begin + _ROWS_AT_ONCE]
        limbs = list(_limbs(np.abs(part)))
        sign = np.sign(part).astype(np.float64)
        for i, limb in enumerate(limbs):
            _add(sums, np.bincount(where, limb * sign, minlength=cells), i * _LIMB_BITS)
            for j, other in enumerate(limbs[: i + 1]):
                twice = 0 if i == j else 1
                _add(squares, np.bincount(where, limb * other, minlength=cells), (i + j) * _LIMB_BITS + twice)
    return sums, squares


def _limbs(sizes: Whole) -> Iterator[Array]:
    """Yield the 16-bit limbs of non-negative numbers, lowest first, as many as the largest needs."""
    for shift in range(0, max(int(sizes.max()).bit_length(), 1), _LIMB_BITS):
        yield ((sizes >> shift) & ((1 << _LIMB_BITS) - 1)).astype(np.float64)


def _add(totals: list[int], exact: NDArray[Any], shift: int) -> None:
    """Add whole doubles times 2^shift to the totals."""
    for cell, number in enumerate(exact.tolist()):
        totals[cell] += int(number) << shift


def _results(n: list[int], sums: list[int], squares: list[int], pivot: int, integers: Integers) -> GroupSums:
    """Round the exact results, each once: a quotient of Python's integers is correctly rounded."""
    up, down = integers.unit.as_integer_ratio()
    up2, down2 = up * up, down * down
    total, total_sum = sum(n), sum(sums)
    triples = list(zip(n, sums, squares, strict=True))
    # sum over groups of s²/c and over all of S²/N, on one denominator
    by_size: Counter[int] = Counter()
    for c, s, _ in triples:
        by_size[c] += s * s
    common = math.lcm(total, *by_size)
    of_groups = sum(square * (common // c) for c, square in by_size.items())
    of_all = total_sum * total_sum * (common // total)
    return GroupSums(
        n=_frozen(np.array(n, dtype=np.int64)),
        mean=_frozen(np.array([(pivot * c + s) * up / (c * down) for c, s, _ in triples])),
        deviation=_frozen(np.array([(s * total - total_sum * c) * up / (c * total * down) for c, s, _ in triples])),
        ss=_frozen(np.array([(c * q - s * s) * up2 / (c * down2) for c, s, q in triples])),
        grand_mean=(pivot * total + total_sum) * up / (total * down),
        ss_between=(of_groups - of_all) * up2 / (common * down2),
        ss_within=(common * sum(squares) - of_groups) * up2 / (common * down2),
    )


def _frozen(array: _AnyArray) -> _AnyArray:
    """Return the array made read-only."""
    array.flags.writeable = False
    return array
