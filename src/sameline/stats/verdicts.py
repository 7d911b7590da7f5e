"""The verdict on one pair, from its simultaneous interval and the margin.

The margin is the smallest difference that matters in use. "Not shown to differ" and "equivalent" are different words:
the first says that the evidence was not enough, the second that it was enough to say the difference is too small to
matter. The idea of judging an interval against a margin is that of two one-sided tests (Schuirmann 1987,
J. Pharmacokinet. Biopharm. 15:657-680; ASTM E2935 for laboratories).
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from sameline.errors import StatsError

if TYPE_CHECKING:
    from numpy.typing import NDArray

VERDICTS = ("differs and matters", "differs", "equivalent", "undecided")
MATTERS, DIFFERS, EQUIVALENT, UNDECIDED = VERDICTS


def verdict(lower: float | None, upper: float | None, margin: float | None, differs: bool) -> str:
    """Says in one of the four words of `VERDICTS` what one interval shows.

    Args:
        lower: lower end of the interval for the difference; None or infinite where the procedure has none.
        upper: upper end, likewise.
        margin: smallest difference that matters, > 0, in the unit of the difference; None for no margin.
        differs: whether the procedure shows the pair to differ.

    Returns:
        "equivalent" when the interval lies strictly inside (-margin, margin), also when it leaves out 0 (shown to
        differ, by less than matters); "differs and matters" when the pair differs and the whole interval lies at or
        beyond a margin; "differs" when it differs otherwise; else "undecided".
    """
    if margin is not None and lower is not None and upper is not None:
        if -margin < lower and upper < margin:
            return EQUIVALENT
        if differs and (lower >= margin or upper <= -margin):
            return MATTERS
    return DIFFERS if differs else UNDECIDED


def verdicts(
    lower: NDArray[np.float64], upper: NDArray[np.float64], margin: float | None, differs: NDArray[np.bool_]
) -> list[str]:
    """`verdict` for arrays of pairs at once, shape (m,) each; NaN ends stand for no interval."""
    code = np.where(differs, 1, 3)
    if margin is not None:
        code = np.where(differs & ((lower >= margin) | (upper <= -margin)), 0, code)
        code = np.where((lower > -margin) & (upper < margin), 2, code)
    return [VERDICTS[at] for at in code.tolist()]


def check_margin(margin: float | None) -> float | None:
    """Refuses a margin that is not a finite number above zero; returns it as a float.

    Raises:
        StatsError: the margin is zero, negative, not finite or not a number.
    """
    if margin is None:
        return None
    if isinstance(margin, bool) or not _is_number(margin) or not math.isfinite(margin) or margin <= 0:
        raise StatsError(
            f"a margin of {margin!r} cannot be meant",
            where="margin",
            advice="give the smallest difference that matters, above 0, in the unit of the values; or none",
        )
    return float(margin)


def check_alpha(alpha: float) -> float:
    """Refuses an error rate outside (0, 1); returns it as a float.

    Raises:
        StatsError: alpha is not a number strictly between 0 and 1.
    """
    if isinstance(alpha, bool) or not _is_number(alpha) or not 0 < alpha < 1:
        raise StatsError(
            f"an error rate of {alpha!r} cannot be meant",
            where="alpha",
            advice="give a number between 0 and 1, such as 0.05",
        )
    return float(alpha)


def _is_number(value: object) -> bool:
    return hasattr(value, "__float__") and not isinstance(value, (str, bytes, np.ndarray))
