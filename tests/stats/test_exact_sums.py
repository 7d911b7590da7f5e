"""Exact group sums against NIST's certified values, rational arithmetic, and under changes that must not matter."""

import json
import math
from collections.abc import Callable
from decimal import Decimal
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.errors import StatsError
from sameline.stats.exact_sums import GroupSums, group_sums

# NIST StRD, analysis of variance; the file says how the sets are laid down.
NIST = Path(__file__).parents[1] / "reference" / "nist_strd_anova.json"
SETS = json.loads(NIST.read_text(encoding="utf-8"))["sets"]


def nist_texts(stored: dict[str, Any]) -> list[list[str]]:
    if "values" in stored:
        return stored["values"]
    steps = [0, *(-1 if j % 2 else 1 for j in range(1, stored["replicates"]))]
    return [[f"{stored['whole']}.{tenth + step}" for step in steps] for tenth in stored["tenths"]]


def as_rows(groups: list[list[Any]]) -> tuple[list[Any], np.ndarray]:
    return [v for group in groups for v in group], np.repeat(np.arange(len(groups)), [len(g) for g in groups])


def correct_digits(got: float, certified: str) -> float:
    """The log relative error NIST uses, at most 15: the certified values have no more digits."""
    off = abs(got - float(certified)) / abs(float(certified))
    return 15.0 if off < 1e-15 else -math.log10(off)


@pytest.mark.parametrize("reading", ["text", "doubles", "decimals"])
@pytest.mark.parametrize("name", SETS)
def test_nist_sets_to_14_digits(name: str, reading: str):
    texts, codes = as_rows(nist_texts(SETS[name]))
    values = {"text": texts, "doubles": np.array([float(t) for t in texts]), "decimals": [Decimal(t) for t in texts]}
    sums = group_sums(values[reading], codes, int(codes.max()) + 1)
    k = int(codes.max()) + 1
    f = (sums.ss_between / (k - 1)) / (sums.ss_within / (len(codes) - k))
    got = {"ss_between": sums.ss_between, "ss_within": sums.ss_within, "F": f}
    digits = {what: correct_digits(figure, SETS[name][what]) for what, figure in got.items()}
    assert min(digits.values()) >= 14, digits


def test_all_eleven_sets_are_here():
    assert len(SETS) == 11
    assert len(as_rows(nist_texts(SETS["SmLs09"]))[0]) == 18009


def rational_sums(groups: list[list[Fraction]]) -> dict[str, Any]:
    """The definitions, literally, in rational arithmetic."""
    every = [v for group in groups for v in group]
    grand = sum(every) / len(every)
    means = [sum(group) / len(group) for group in groups]
    ss = [sum((v - mean) ** 2 for v in group) for group, mean in zip(groups, means, strict=True)]
    return {
        "mean": [float(mean) for mean in means],
        "deviation": [float(mean - grand) for mean in means],
        "ss": [float(one) for one in ss],
        "grand_mean": float(grand),
        "ss_between": float(sum(len(g) * (m - grand) ** 2 for g, m in zip(groups, means, strict=True))),
        "ss_within": float(sum(ss)),
    }


def assert_equals_to_the_last_bit(sums: GroupSums, expected: dict[str, Any]) -> None:
    for name, want in expected.items():
        got = getattr(sums, name)
        assert (got.tolist() if isinstance(got, np.ndarray) else got) == want, name


decimals = st.decimals(min_value=-(10**9), max_value=10**9, places=3, allow_nan=False)
mixed_decimals = st.builds(
    lambda digits, exponent: float(f"{digits}e{exponent}"), st.integers(-(10**12), 10**12), st.integers(-20, 8)
)
doubles = st.floats(min_value=-1e12, max_value=1e12, allow_nan=False, allow_subnormal=False)


@given(st.lists(st.lists(decimals, min_size=1, max_size=5), min_size=1, max_size=5))
@settings(max_examples=60, deadline=None)
def test_decimal_text_is_summed_exactly(groups: list[list[Decimal]]):
    rows, codes = as_rows(groups)
    expected = rational_sums([[Fraction(v) for v in group] for group in groups])
    assert_equals_to_the_last_bit(group_sums(rows, codes, len(groups)), expected)
    assert_equals_to_the_last_bit(group_sums([str(v) for v in rows], codes, len(groups)), expected)
    assert_equals_to_the_last_bit(group_sums(np.array([float(v) for v in rows]), codes, len(groups)), expected)


@given(st.lists(st.lists(mixed_decimals, min_size=1, max_size=5), min_size=1, max_size=4))
@settings(max_examples=60, deadline=None)
def test_short_decimals_of_unlike_sizes_are_read_as_decimals(groups: list[list[float]]):
    rows, codes = as_rows(groups)
    expected = rational_sums([[Fraction(repr(v)) for v in group] for group in groups])
    assert_equals_to_the_last_bit(group_sums(np.array(rows), codes, len(groups)), expected)


@given(st.lists(st.lists(doubles, min_size=1, max_size=6), min_size=1, max_size=5))
@settings(max_examples=60, deadline=None)
def test_one_long_value_makes_all_the_stored_doubles(groups: list[list[float]]):
    groups = [*groups, [0.1 + 0.2, 8.9]]  # 0.30000000000000004 needs 17 digits
    rows, codes = as_rows(groups)
    expected = rational_sums([[Fraction(v) for v in group] for group in groups])
    assert_equals_to_the_last_bit(group_sums(np.array(rows), codes, len(groups)), expected)


def test_as_stored_takes_short_decimals_as_doubles_too():
    groups = [[8.9, 9.1, 8.8], [9.3, 9.2]]
    rows, codes = as_rows(groups)
    stored = rational_sums([[Fraction(v) for v in group] for group in groups])
    recorded = rational_sums([[Fraction(repr(v)) for v in group] for group in groups])
    assert_equals_to_the_last_bit(group_sums(np.array(rows), codes, 2, as_stored=True), stored)
    assert_equals_to_the_last_bit(group_sums(np.array(rows), codes, 2), recorded)
    assert stored != recorded


def test_reference_sums_of_squares(anova_case: dict[str, Any], near: Callable[..., None]):
    labels, expect = anova_case["data"]["group"], anova_case["expect"]
    order = {label: code for code, label in enumerate(dict.fromkeys(labels))}
    codes = np.array([order[label] for label in labels])
    values = np.array(anova_case["data"]["value"], dtype=float)
    # the expectations belong to the stored doubles; R's own arithmetic limits the cases on an offset
    sums = group_sums(values, codes, len(order), as_stored=True)
    near([sums.ss_between, sums.ss_within], [expect["ss_between"], expect["ss_within"]], rtol=5e-14)
    if "groups" in expect:
        near(sums.mean, expect["groups"]["mean"], rtol=5e-15)
    # read as recorded, they move by no more than storing short decimals moved the values
    recorded = group_sums(values, codes, len(order))
    near([recorded.ss_between, recorded.ss_within], [expect["ss_between"], expect["ss_within"]], rtol=1e-8)


@given(st.lists(st.tuples(doubles, st.integers(0, 3)), min_size=8, max_size=30), st.randoms(use_true_random=False))
@settings(max_examples=40, deadline=None)
def test_row_order_does_not_matter_to_the_last_bit(rows: list[tuple[float, int]], random: Any):  # noqa: ANN401 - hypothesis' own
    rows = [*rows, *((float(g), g) for g in range(4))]
    shuffled = random.sample(rows, len(rows))
    one, two = (
        group_sums(np.array([r[0] for r in part]), np.array([r[1] for r in part]), 4) for part in (rows, shuffled)
    )
    for name in GroupSums.__dataclass_fields__:
        assert np.array_equal(getattr(one, name), getattr(two, name)), name


@given(st.lists(st.lists(decimals, min_size=1, max_size=4), min_size=2, max_size=4), st.integers(-(10**12), 10**12))
@settings(max_examples=40, deadline=None)
def test_an_offset_moves_means_only(groups: list[list[Decimal]], offset: int):
    rows, codes = as_rows(groups)
    here, there = group_sums(rows, codes, len(groups)), group_sums([v + offset for v in rows], codes, len(groups))
    assert here.ss.tolist() == there.ss.tolist()
    assert here.deviation.tolist() == there.deviation.tolist()
    assert (here.ss_between, here.ss_within) == (there.ss_between, there.ss_within)


@pytest.mark.parametrize("scale", [1e-140, 1e-9, 1.0, 1e18, 1e140])
def test_any_size_of_unit(scale: float):
    values = np.array([1.25, 2.5, 3.75, 5.0, 1e-3]) * scale
    codes = np.array([0, 0, 1, 1, 1])
    short = all(len(Decimal(repr(v)).normalize().as_tuple().digits) <= 15 for v in values.tolist())
    exact = [Fraction(repr(v)) if short else Fraction(v) for v in values.tolist()]
    assert_equals_to_the_last_bit(group_sums(values, codes, 2), rational_sums([exact[:2], exact[2:]]))


def test_many_rows_of_wide_integers():
    rng = np.random.default_rng(11)
    values = rng.integers(-(10**15) + 1, 10**15, 5000).astype(float)
    codes = rng.integers(0, 7, 5000)
    groups = [[Fraction(v) for v in values[codes == g].tolist()] for g in range(7)]
    assert_equals_to_the_last_bit(group_sums(values, codes, 7), rational_sums(groups))


def test_identical_values_have_no_spread_at_all():
    sums = group_sums(np.array([0.1] * 6), np.array([0, 0, 0, 1, 1, 1]), 2)
    assert sums.ss.tolist() == [0.0, 0.0]
    assert (sums.ss_between, sums.ss_within) == (0.0, 0.0)


def test_results_are_read_only():
    sums = group_sums(np.array([1.0, 2.0]), np.array([0, 1]), 2)
    with pytest.raises(ValueError, match="read-only"):
        sums.mean[0] = 5.0


@pytest.mark.parametrize(
    ("values", "codes", "word"),
    [
        (np.array([1.0, math.nan]), [0, 1], "not finite"),
        (["1.0", "NaN"], [0, 1], "not finite"),
        (["1.0", "one"], [0, 1], "no number"),
        (np.array([]), [], "no value"),
        (np.array([1.0, 2.0]), [0, 2], "outside"),
        (np.array([1.0, 2.0]), [0, -1], "outside"),
        (np.array([1.0, 2.0]), [0, 0], "no value"),
        (np.array([1.0, 2.0]), [0], "codes"),
        (np.array([1e308, -1e308]), [0, 1], "range of doubles"),
    ],
)
def test_refusals_say_what_is_wrong(values: Any, codes: list[int], word: str):  # noqa: ANN401 - arrays and lists
    with pytest.raises(StatsError, match=word):
        group_sums(values, np.array(codes), 2)
