"""Measured values as integers times a common unit, without a rounding error: what exact sums are taken of.

How values are read, one rule for the whole array:

* `decimal.Decimal` and text are the decimals they say;
* floats whose shortest decimals all have at most 15 significant digits are those decimals: a double carries every
  decimal of 15 digits faithfully, so such an array is what somebody wrote down (8.9 is 89/10, not the double nearest
  to it);
* if one float of the array needs more digits, the array is the result of a computation: then all its values are taken
  as the doubles stored, exactly (integers times a power of two).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from decimal import Decimal, InvalidOperation
from fractions import Fraction
from typing import TYPE_CHECKING

import numpy as np

from sameline.errors import StatsError

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from numpy.typing import NDArray

    Array = NDArray[np.float64]
    Whole = NDArray[np.int64]

# Decimals of up to 15 significant digits survive the way to a double and back (IEEE 754, DBL_DIG).
_DIGITS = 15
_BOUND = 10.0**_DIGITS
# 10^22 is the largest power of ten that is a double: up to it one correctly rounded division settles a decimal.
_POWERS = tuple(float(10**power) for power in range(23))
_INT64_BITS = 62
_MANTISSA_BITS = 53


@dataclass(frozen=True, slots=True)
class Integers:
    """Values as integers: value i is numbers[i] · factors[classes[i]] · unit.

    Attributes:
        numbers: int64 array where the integers fit, below 2^62 in size, else a list of Python's.
        classes: each value's factor; None where there is one factor, 1.
        factors: the factors, integers.
        unit: the common unit.
    """

    numbers: Whole | list[int]
    unit: Fraction
    classes: NDArray[np.intp] | None = None
    factors: tuple[int, ...] = (1,)


def as_integers(values: Array | Sequence[str | Decimal], *, as_stored: bool = False) -> Integers:
    """Return the values as integers times a unit, exactly, read as the module's text says.

    Args:
        values: shape (n,), an array of numbers, or floats, texts or Decimals; n at least 1.
        as_stored: take every float as the double stored, also where all are short decimals.

    Raises:
        StatsError: no value, a value that is not finite, or a text that is no number.
    """
    if not len(values):
        raise StatsError("there is no value", where="values", advice="give at least one value a group")
    if not isinstance(values, np.ndarray) and not all(isinstance(value, float) for value in values):
        return _from_decimals(_decimal(value, row) for row, value in enumerate(values))
    floats = np.asarray(values, dtype=np.float64)
    if not np.isfinite(floats).all():
        row = int(np.argmin(np.isfinite(floats)))
        raise StatsError("a value is not finite", where=f"value at position {row}", advice="leave it out")
    if as_stored:
        return _doubles(floats)
    return _short_decimals(floats) or _mixed_decimals(floats) or _doubles(floats)


def _decimal(value: str | Decimal, row: int) -> Decimal:
    """Return one recorded decimal, checked."""
    try:
        number = Decimal(value)
    except InvalidOperation:
        raise StatsError(f"{value!r} is no number", where=f"value at position {row}") from None
    if not number.is_finite():
        raise StatsError("a value is not finite", where=f"value at position {row}", advice="leave it out")
    return number


def _from_decimals(decimals: Iterable[Decimal]) -> Integers:
    """Return decimals over their smallest common power of ten."""
    ratios = [number.as_integer_ratio() for number in decimals]
    denominator = math.lcm(*{bottom for _, bottom in ratios})
    return _fitted([top * (denominator // bottom) for top, bottom in ratios], Fraction(1, denominator))


def _fitted(numbers: list[int], unit: Fraction) -> Integers:
    """Return the integers as int64 where they fit."""
    if max(map(abs, numbers)).bit_length() <= _INT64_BITS:
        return Integers(np.array(numbers, dtype=np.int64), unit)
    return Integers(numbers, unit)


def _short_decimals(floats: Array) -> Integers | None:
    """Read floats as decimals with one number of places and at most 15 digits, the ordinary case; None if they are not.

    The integer r nearest to value·10^places has at most 15 digits, and r/10^places, rounded correctly by IEEE 754,
    gives the value back: so r/10^places is the value's shortest decimal.
    """
    sample = floats[:: max(1, floats.size // 64)]
    for places in range(len(_POWERS)):
        if _fits(sample, places) and _fits(floats, places):
            return Integers(np.rint(floats * _POWERS[places]).astype(np.int64), Fraction(1, 10**places))
        if np.abs(sample).max() * _POWERS[places] >= _BOUND:
            return None
    return None


def _fits(floats: Array, places: int) -> bool:
    """Return whether all are decimals of so many places and at most 15 digits."""
    if np.abs(floats).max() >= _BOUND / _POWERS[places]:
        return False
    return bool((np.rint(floats * _POWERS[places]) / _POWERS[places] == floats).all())


def _mixed_decimals(floats: Array) -> Integers | None:
    """Read floats of unlike sizes as decimals of at most 15 digits each; None if one needs more."""
    middle = (np.abs(floats) >= 1e-7) & (np.abs(floats) < _BOUND)
    ordinary = floats[middle]
    places = _DIGITS - 1 - np.floor(np.log10(np.abs(ordinary))).astype(np.intp)
    for shift in (0, 1):  # log10 may err by one next to a power of ten
        scale = np.array(_POWERS)[np.clip(places - shift, 0, 22)]
        whole = np.rint(ordinary * scale)
        same = (whole / scale == ordinary) & (np.abs(whole) < _BOUND)
        ordinary, places = ordinary[~same], places[~same]
    if ordinary.size:
        return None
    odd = [Decimal(repr(value)) for value in floats[~middle].tolist()]
    if any(len(number.normalize().as_tuple().digits) > _DIGITS for number in odd):
        return None
    return _from_decimals(Decimal(repr(value)) for value in floats.tolist())


def _doubles(floats: Array) -> Integers:
    """Read floats as the doubles stored: 53-bit integers times powers of two."""
    fraction, exponent = np.frexp(floats)
    numbers = np.ldexp(fraction, _MANTISSA_BITS).astype(np.int64)
    exponent = np.where(numbers == 0, exponent.max(), exponent).astype(np.int64) - _MANTISSA_BITS
    lowest = int(exponent.min())
    unit = Fraction(2) ** lowest
    if int(exponent.max()) - lowest <= _INT64_BITS - _MANTISSA_BITS:
        return Integers(numbers << (exponent - lowest), unit)
    powers, classes = np.unique(exponent, return_inverse=True)
    return Integers(numbers, unit, classes, tuple(1 << (int(power) - lowest) for power in powers))
