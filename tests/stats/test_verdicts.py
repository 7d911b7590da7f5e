"""The verdict table, cell by cell."""

import math

import numpy as np
import pytest

from sameline.stats import VERDICTS, compare_pairs, verdict
from sameline.stats.verdicts import verdicts

MATTERS, DIFFERS, EQUIVALENT, UNDECIDED = VERDICTS

TABLE = [
    # lower, upper, margin, differs, verdict
    (-1.0, 1.0, 2.0, False, EQUIVALENT),
    (0.5, 1.0, 2.0, True, EQUIVALENT),  # shown to differ, by less than matters
    (-2.0, 1.0, 2.0, False, UNDECIDED),  # touching the margin is not inside it
    (-3.0, 1.0, 2.0, False, UNDECIDED),
    (1.0, 3.0, 2.0, True, DIFFERS),
    (2.0, 3.0, 2.0, True, MATTERS),  # wholly at or beyond the margin
    (-3.0, -2.0, 2.0, True, MATTERS),
    (-3.0, -1.9, 2.0, True, DIFFERS),
    (1.0, 3.0, None, True, DIFFERS),
    (-1.0, 3.0, None, False, UNDECIDED),
    (None, None, 2.0, True, DIFFERS),
    (None, None, 2.0, False, UNDECIDED),
    (2.5, math.inf, 2.0, True, MATTERS),
    (-math.inf, 1.0, 2.0, False, UNDECIDED),
    (0.1, math.inf, 2.0, True, DIFFERS),
]


@pytest.mark.parametrize(("lower", "upper", "margin", "differs", "want"), TABLE)
def test_each_cell_of_the_table(
    lower: float | None,
    upper: float | None,
    margin: float | None,
    differs: bool,
    want: str,
):
    assert verdict(lower, upper, margin, differs) == want
    ends = [np.array([math.nan if end is None else end]) for end in (lower, upper)]
    assert verdicts(*ends, margin, np.array([differs])) == [want]


def test_a_result_keeps_differs_beside_equivalent():
    values = [10.00, 10.01, 10.02, 10.00, 10.01, 10.10, 10.11, 10.12, 10.10, 10.11]
    (pair,) = compare_pairs(values, ["A"] * 5 + ["B"] * 5, margin=1.0).pairs
    assert (pair.verdict, pair.differs) == (EQUIVALENT, True)


def test_the_verdict_uses_the_simultaneous_interval():
    rng = np.random.default_rng(1)
    values, labels = rng.normal(0, 1, 40).round(3), np.repeat(list("ABCD"), 10)
    for pair in compare_pairs(values, labels, margin=1.3).pairs:
        assert pair.verdict == verdict(pair.lower, pair.upper, 1.3, pair.differs)
