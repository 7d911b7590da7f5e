"""Group labels: how what was given becomes text, what is missing, and which labels only look alike.

Labels are compared as text, exactly as given: no trimming, no folding of case. A whole number given as a number
becomes its digits (7, 7.0 and numpy's 7 are "7"), any other number its shortest decimal, a truth value "True" or
"False". A number and a text that would read alike are refused, because nobody can tell whether they are one group.
Groups keep the order of first appearance.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from decimal import Decimal
from numbers import Integral, Real
from typing import Any

import numpy as np
from numpy.typing import NDArray

from sameline.errors import StatsError
from sameline.stats.cautions import Caution


def encode(groups: Iterable[Any]) -> tuple[tuple[str, ...], NDArray[np.intp]]:
    """Turns one label a row into (labels in order of first appearance, code of each row, shape (n,)).

    Raises:
        StatsError: a label is missing, is not text or a number, or a number and a text read alike.
    """
    given = _listed(groups)
    kinds = set(map(type, given))
    if kinds == {int}:
        given = list(map(str, given))
    elif kinds != {str}:
        given = _as_text(given)
    _refuse_missing(given)
    code: dict[str, int] = {}
    codes = [code.setdefault(label, len(code)) for label in given]
    return tuple(code), np.asarray(codes, dtype=np.intp)


def as_text(label: object) -> str:
    """The text of one label by the rule above; "" for a missing one."""
    if isinstance(label, str):
        return str(label)
    if isinstance(label, (bool, np.bool_)):
        return str(bool(label))
    if isinstance(label, Integral):
        return str(int(label))
    if isinstance(label, Decimal):
        return "" if label.is_nan() else _number_text(label)
    if isinstance(label, Real):
        number = float(label)
        return "" if number != number else _number_text(number)  # noqa: PLR0124 - the test for NaN
    if label is None or _is_missing_marker(label):
        return ""
    raise StatsError(
        f"a group label of type {type(label).__name__} has no stated text",
        where="groups",
        advice="give text or numbers",
    )


def look_alikes(labels: Sequence[str]) -> tuple[Caution, ...]:
    """Cautions for labels that differ only by case or blanks; they stay different groups."""
    alike: dict[str, list[str]] = {}
    for label in labels:
        alike.setdefault("".join(label.split()).casefold(), []).append(label)
    return tuple(
        Caution("look-alike-labels", f"{_listing(some)} differ only by case or blanks and are kept as different groups")
        for some in alike.values()
        if len(some) > 1
    )


def _listing(labels: Sequence[str]) -> str:
    quoted = [repr(label) for label in labels]
    return ", ".join(quoted[:-1]) + " and " + quoted[-1]


def _listed(groups: Iterable[Any]) -> list[Any]:
    if isinstance(groups, (str, bytes)):
        raise StatsError("the groups are one text, not one label a value", where="groups", advice="give a sequence")
    if isinstance(groups, np.ma.MaskedArray):
        return [
            None if hidden else label
            for label, hidden in zip(groups.data.tolist(), np.ma.getmaskarray(groups), strict=True)
        ]
    array = groups if isinstance(groups, np.ndarray) else None
    if array is not None and array.ndim != 1:
        raise StatsError(f"the groups have {array.ndim} dimensions", where="groups", advice="give one label a value")
    return list(array.tolist()) if array is not None else list(groups)


def _as_text(given: list[Any]) -> list[str]:
    texts = [as_text(label) for label in given]
    kinds: dict[str, bool] = {}
    for label, text in zip(given, texts, strict=True):
        written = isinstance(label, str)
        if kinds.setdefault(text, written) != written and text:
            raise StatsError(
                f"the label {text!r} is given as a number and as text",
                where="groups",
                advice="give all labels as text, so that it is plain whether they are one group",
            )
    return texts


def _refuse_missing(texts: list[str]) -> None:
    if all(text and not text.isspace() for text in dict.fromkeys(texts)):
        return
    rows = [row for row, text in enumerate(texts) if not text.strip()]
    raise StatsError(
        f"{len(rows)} of {len(texts)} group labels are missing (first at position {rows[0]}, counted from 0)",
        where="groups",
        advice="name the group of every value or leave the value out",
    )


def _number_text(number: float | Decimal) -> str:
    whole = number == number.to_integral_value() if isinstance(number, Decimal) else number.is_integer()
    return str(int(number)) if whole else str(number)


def _is_missing_marker(label: object) -> bool:
    """Whether it is the not-a-time or not-available object of numpy or pandas, without importing pandas."""
    return type(label).__name__ in {"NAType", "NaTType"} or (isinstance(label, np.datetime64) and bool(np.isnat(label)))
