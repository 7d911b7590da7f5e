"""Measured values as they come in: numbers, decimal text or `Decimal`, checked and brought to a near origin.

Sums are exact for the values as recorded; `exact_sums` says how an array of doubles is read. Where single values are
needed (ranks, deviations from a median, residuals) they are taken about one of them, the lower median, subtracted
exactly, so that a large common offset costs no digit.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from decimal import Context, Decimal, InvalidOperation
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from sameline.errors import StatsError

Floats: TypeAlias = NDArray[np.float64]

LARGEST = 1e150  # beyond it, and for spreads below its inverse, squares leave the range of double arithmetic
MOST_DIGITS = 60  # of one decimal value: far beyond any measurement, and exact sums stay affordable
_EXACT = Context(prec=400)


@dataclass(frozen=True, slots=True)
class Values:
    """Checked values.

    Args:
        raw: the values as doubles, shape (n,).
        origin: one of the values, or 0 where subtracting it would not be exact.
        centred: value - origin, shape (n,), exact before it was rounded to a double.
        recorded: what exact sums are taken of: `raw` for numbers, the decimals for text and `Decimal`.
    """

    raw: Floats
    origin: float
    centred: Floats
    recorded: Floats | Sequence[Decimal]


def read_values(values: Iterable[Any]) -> Values:
    """Checks values and finds their origin.

    Args:
        values: one-dimensional: an array of numbers, or a sequence of numbers, decimal text or `Decimal`.

    Raises:
        StatsError: a value is missing, not finite, not a number, or beyond 1e150; or the array has several dimensions.
    """
    if isinstance(values, (str, bytes)):
        raise StatsError("the values are one text, not a sequence of values", where="values", advice="give a sequence")
    if isinstance(values, np.ma.MaskedArray):
        _refuse(np.flatnonzero(np.ma.getmaskarray(values)), values.size, "missing")
    given = values if hasattr(values, "__array__") else list(values)
    if isinstance(given, list) and not {bool, np.bool_}.isdisjoint(map(type, given)):
        raise StatsError("a truth value is not a measurement", where="values", advice="give numbers")
    try:
        array = np.asarray(given)
    except ValueError:
        raise StatsError("the values are not one number a row", where="values", advice="give one value a row") from None
    if array.ndim != 1:
        raise StatsError(f"the values have {array.ndim} dimensions", where="values", advice="give one value a row")
    if array.dtype.kind in "fiu":
        return _from_doubles(array.astype(np.float64))
    if array.size and array.dtype.kind not in "OUT":
        raise StatsError(f"values of type {array.dtype} are not measurements", where="values", advice="give numbers")
    given = given if isinstance(given, list) else array.tolist()
    if all(isinstance(value, float) for value in given):
        return _from_doubles(np.asarray(given, dtype=np.float64))
    return _from_decimals([_decimal(value, row) for row, value in enumerate(given)])


def _from_doubles(raw: Floats) -> Values:
    _refuse(np.flatnonzero(~np.isfinite(raw)), raw.size, "not finite")
    _refuse_range(raw)
    if not raw.size:
        return Values(raw, 0.0, raw, raw)
    origin = float(np.partition(raw, (raw.size - 1) // 2)[(raw.size - 1) // 2])
    centred = raw - origin
    if not _subtraction_is_exact(raw, origin, centred):
        origin, centred = 0.0, raw
    return Values(raw, origin, centred, raw)


def _subtraction_is_exact(raw: Floats, origin: float, difference: Floats) -> bool:
    """Whether raw - origin left no rounding error (the error term of Knuth's two-sum is zero throughout)."""
    back = raw - difference
    return bool(np.all((raw - (difference + back)) + (back - origin) == 0.0))


def _from_decimals(decimals: list[Decimal]) -> Values:
    raw = np.asarray([float(value) for value in decimals], dtype=np.float64)
    _refuse_range(raw)
    if not decimals:
        return Values(raw, 0.0, raw, raw)
    origin = sorted(decimals)[(len(decimals) - 1) // 2]
    centred = [float(_EXACT.subtract(value, origin)) for value in decimals]
    return Values(raw, float(origin), np.asarray(centred, dtype=np.float64), decimals)


def _decimal(value: object, row: int) -> Decimal:
    """One value as the decimal it is; a double as exactly that double."""
    if isinstance(value, str):
        try:
            number = Decimal(value.replace("_", "?"))
        except InvalidOperation:
            raise StatsError(
                f"the value {value!r} at position {row} is not a number",
                where="values",
                advice="write it with digits and a decimal point; a result such as '<0.5' has no number to compare",
            ) from None
    elif isinstance(value, (Decimal, int, float)) and not isinstance(value, bool):
        number = Decimal(value)
    elif isinstance(value, (np.integer, np.floating)):
        number = Decimal(value.item())
    else:
        kind = "missing" if value is None or type(value).__name__ in {"NAType", "NaTType"} else "no number"
        raise StatsError(
            f"the value at position {row} is {kind}", where="values", advice="give a number or leave the row out"
        )
    if not number.is_finite():
        raise StatsError(
            f"the value at position {row} is not finite", where="values", advice="give a number or leave the row out"
        )
    if len(number.as_tuple().digits) > MOST_DIGITS and not isinstance(value, (float, np.floating)):
        raise StatsError(f"the value at position {row} has more than {MOST_DIGITS} digits", where="values")
    return number


def _refuse(rows: NDArray[np.intp], size: int, what: str) -> None:
    if rows.size:
        raise StatsError(
            f"{rows.size} of {size} values are {what} (first at position {rows[0]}, counted from 0)",
            where="values",
            advice="give a number or leave the row out; a result that could not be had is not a number",
        )


def _refuse_range(raw: Floats) -> None:
    if not raw.size:
        return
    low, high = float(raw.min()), float(raw.max())
    if max(-low, high) > LARGEST or 0.0 < high / 2 - low / 2 < 1.0 / LARGEST:
        raise StatsError(
            f"values or spreads beyond {LARGEST:g} or below its inverse leave the range of the arithmetic",
            where="values",
            advice="give the values in another unit",
        )
