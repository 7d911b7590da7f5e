"""Traps that general statistics libraries fall into, each by its name."""

import math
import warnings
from decimal import Decimal

import numpy as np
import pandas as pd
import pytest
import scipy.stats

from sameline.errors import StatsError
from sameline.stats import (
    PROCEDURES,
    bartlett_test,
    compare_pairs,
    kruskal_wallis,
    levene_test,
    welch_anova,
)

GROUPS = ["A"] * 4 + ["B"] * 4 + ["C"] * 4
VALUES = [5.1, 5.4, 4.9, 5.2, 6.1, 6.3, 5.8, 6.0, 5.5, 5.9, 5.6, 5.3]
NAMES = [procedure.name for procedure in PROCEDURES]


def control_of(name: str) -> str | None:
    return "A" if name == "dunnett" else None


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("bad", [math.nan, math.inf, -math.inf, None, pd.NA, Decimal("NaN"), "inf"], ids=repr)
def test_one_value_that_is_not_finite_is_refused_and_named(name: str, bad: object):
    values = [*VALUES[:7], bad, *VALUES[8:]]
    with pytest.raises(StatsError, match="position 7"):
        compare_pairs(values, GROUPS, name, control=control_of(name))


def test_the_peer_falls_into_the_trap_of_one_value_that_is_not_finite():
    # Why the refusal above is needed: every statistic NaN, every p-value not a number or 1, and no word about it.
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        peer = scipy.stats.dunnett([1.0, 2.0, math.inf], [2.0, 3.0, 4.0], control=[1.0, 2.0, 3.0], rng=1)
    assert np.isnan(peer.statistic).all()


@pytest.mark.parametrize("name", NAMES)
def test_all_identical_data_are_refused_and_not_given_a_p_value_of_one(name: str):
    with pytest.raises(StatsError, match=r"identical|no group has a spread"):
        compare_pairs([7.0] * 12, GROUPS, name, control=control_of(name))


@pytest.mark.parametrize(
    "name", ["tukey-kramer", "bonferroni", "holm", "sidak", "dunnett", "games-howell", "welch-holm"]
)
def test_no_group_with_a_spread_is_refused_though_the_means_differ(name: str):
    with pytest.raises(StatsError, match="no group has a spread"):
        compare_pairs([1.0] * 4 + [2.0] * 4 + [3.0] * 4, GROUPS, name, control=control_of(name))


def test_a_decimal_repeated_is_without_spread_whatever_its_double():
    # 0.1 + 0.1 + 0.1 is not 0.3 in doubles: a mean computed from it invents a spread of 1e-17.
    with pytest.raises(StatsError, match="no group has a spread"):
        compare_pairs([0.1] * 3 + [0.7] * 3, ["A"] * 3 + ["B"] * 3)


def test_a_spread_that_is_only_rounding_carries_a_caution():
    # Means computed from 10.1, 10.2, 10.3 and from 10.2 thrice may differ in their last bit and in nothing else.
    values = [10.2, 10.200000000000001, 10.2, 9.2, 9.200000000000001, 9.2]
    result = compare_pairs(values, list("AAABBB"))
    assert "spread-of-rounding" in {caution.code for caution in result.cautions}
    plain = compare_pairs([1.0, 1.1, 2.0, 2.1], list("AABB"))
    assert "spread-of-rounding" not in {caution.code for caution in plain.cautions}


def test_one_group_without_spread_makes_welch_and_bartlett_say_so():
    values = [5.0] * 4 + VALUES[4:]
    for test in (welch_anova, bartlett_test):
        with pytest.raises(StatsError, match="not estimable: no spread in 'A'"):
            test(values, GROUPS)
    found = compare_pairs(values, GROUPS).diagnostics
    assert "no spread" in found.not_estimable["bartlett"]
    assert found.tests["levene-median"].p_value > 0


def test_one_group_without_spread_is_estimable_for_games_howell():
    result = compare_pairs([5.0] * 4 + VALUES[4:], GROUPS, "games-howell")
    assert not result.not_estimable
    assert result.pairs[0].df == 3
    assert "no-spread" in {caution.code for caution in result.cautions}


@pytest.mark.parametrize("name", ["games-howell", "welch-holm"])
def test_two_groups_without_spread_make_only_their_pair_not_estimable(name: str):
    result = compare_pairs([5.0] * 4 + [6.0] * 4 + VALUES[8:], GROUPS, name, margin=0.5)
    assert dict(result.not_estimable) == {("A", "B"): "neither group has a spread"}
    first, *others = result.pairs
    assert first[2:] == (1.0, None, None, None, None, None, None, "undecided", False)
    assert all(pair.p_value is not None and 0 < pair.p_value < 1 for pair in others)
    assert "not-estimable" in {caution.code for caution in result.cautions}
    assert result.frame()["p_value"][0] is None


def test_levene_on_medians_with_two_values_a_group_is_refused_and_not_an_artefact():
    values, groups = [1.0, 1.3, 2.1, 2.9, 4.0, 4.2], ["A", "A", "B", "B", "C", "C"]
    with pytest.raises(StatsError, match="at most two values a group"):
        levene_test(values, groups)
    assert "two values" in compare_pairs(values, groups).diagnostics.not_estimable["levene-median"]


@pytest.mark.parametrize("center", ["median", "mean"])
def test_levene_does_not_divide_by_the_noise_of_equal_deviations(center: str):
    # Deviations of 0.1 from a centre within A and of 0.2 within B: no spread within groups but for rounding.
    values = [0.3, 0.5, 0.3, 0.5, 10.1, 10.5, 10.1, 10.5]
    with pytest.raises(StatsError, match="not estimable"):
        levene_test(values, ["A"] * 4 + ["B"] * 4, center=center)


def test_games_howell_with_few_values_carries_a_caution_with_its_figure():
    rng = np.random.default_rng(8)
    labels = [f"g{number}" for number in range(10) for _ in range(3)]
    result = compare_pairs(rng.normal(10, 1, 30).round(2), labels, "games-howell")
    (caution,) = [caution for caution in result.cautions if caution.code == "small-groups"]
    assert "n = 3" in caution.text
    assert "10 %" in caution.text
    enough = compare_pairs(rng.normal(10, 1, 60).round(2), labels * 2, "games-howell")
    assert "small-groups" not in {caution.code for caution in enough.cautions}


def test_tukey_kramer_with_unequal_spread_and_size_carries_a_caution():
    rng = np.random.default_rng(4)
    values = np.concatenate([rng.normal(0, 8, 4), *(rng.normal(0, 1, 20) for _ in range(3))]).round(2)
    result = compare_pairs(values, ["A"] * 4 + ["B"] * 20 + ["C"] * 20 + ["D"] * 20)
    assert "unequal-spread-and-size" in {caution.code for caution in result.cautions}
    assert "unequal-spread-and-size" not in {
        caution.code
        for caution in compare_pairs(values, ["A"] * 4 + ["B"] * 20 + ["C"] * 20 + ["D"] * 20, "games-howell").cautions
    }


def test_steel_dwass_says_when_values_are_too_few_to_show_anything():
    result = compare_pairs([1, 2, 3, 11, 12, 13, 21, 22, 23], ["A"] * 3 + ["B"] * 3 + ["C"] * 3, "steel-dwass")
    assert not result.differs.any()
    assert "too-few-for-ranks" in {caution.code for caution in result.cautions}


def test_lines_are_not_swept_over_sorted_means():
    # 12 groups of 3 to 12 values: a sweep is wrong in about two thirds of such sets; every display here is right.
    rng = np.random.default_rng(65)
    kinds = set()
    for _ in range(20):
        sizes = rng.integers(3, 13, 12)
        labels = np.repeat([f"g{number}" for number in range(12)], sizes)
        values = (rng.normal(0, 1, sizes.sum()) + np.repeat(rng.normal(0, 1.2, 12), sizes)).round(3)
        result = compare_pairs(values, labels)
        kinds.add(result.display.kind)
        together = [set(line) for line in result.lines]
        for pair in result.pairs:
            assert any({pair.a, pair.b} <= line for line in together) != pair.differs
    assert kinds == {"lines", "letters"}


@pytest.mark.parametrize(
    "missing", [None, math.nan, pd.NA, pd.NaT, np.datetime64("NaT"), "", "  ", Decimal("NaN")], ids=repr
)
def test_a_missing_label_is_refused_and_never_a_group(missing: object):
    with pytest.raises(StatsError, match="labels are missing"):
        compare_pairs(VALUES, [*GROUPS[:11], missing])


def test_missing_labels_in_pandas_columns_are_refused():
    for column in (pd.Series([*GROUPS[:11], None]), pd.Series([*GROUPS[:11], None], dtype="category")):
        with pytest.raises(StatsError, match="1 of 12 group labels are missing"):
            compare_pairs(VALUES, column)


def test_the_order_of_categories_does_not_matter():
    column = pd.Series(pd.Categorical(GROUPS, categories=["C", "unused", "B", "A"], ordered=True))
    assert compare_pairs(pd.Series(VALUES), column).pairs == compare_pairs(VALUES, GROUPS).pairs


def test_numeric_labels_keep_the_order_of_first_appearance_and_become_text():
    numbers = [10] * 4 + [9] * 4 + [2] * 4
    result = compare_pairs(VALUES, numbers)
    assert result.labels == ("10", "9", "2")
    assert compare_pairs(VALUES, [float(number) for number in numbers]).pairs == result.pairs
    assert compare_pairs(VALUES, np.array(numbers)).pairs == result.pairs
    assert compare_pairs(VALUES, [str(number) for number in numbers]).pairs == result.pairs
    assert compare_pairs(VALUES, numbers, "dunnett", control=9).control == "9"


def test_a_number_and_a_text_that_read_alike_are_refused():
    with pytest.raises(StatsError, match="number and as text"):
        compare_pairs(VALUES, [1] * 4 + ["1"] * 4 + ["2"] * 4)


def test_labels_that_differ_by_case_or_blanks_stay_apart_with_a_caution():
    labels = ["lot 7"] * 4 + ["Lot 7"] * 4 + ["lot7 "] * 4
    result = compare_pairs(VALUES, labels)
    assert result.labels == ("lot 7", "Lot 7", "lot7 ")
    (caution,) = [caution for caution in result.cautions if caution.code == "look-alike-labels"]
    assert all(repr(label) in caution.text for label in result.labels)
    assert [pair[2:] for pair in result.pairs] == [pair[2:] for pair in compare_pairs(VALUES, GROUPS).pairs]


def test_masked_values_are_missing_and_not_their_fill():
    with pytest.raises(StatsError, match="missing"):
        compare_pairs(np.ma.array(VALUES, mask=[False] * 11 + [True]), GROUPS)


def test_ties_everywhere_are_corrected_for():
    values, groups = [1, 1, 2, 2, 2, 3, 3, 3, 3], ["A"] * 3 + ["B"] * 3 + ["C"] * 3
    peer = scipy.stats.kruskal([1, 1, 2], [2, 2, 3], [3, 3, 3])
    assert kruskal_wallis(values, groups).p_value == pytest.approx(peer.pvalue, rel=1e-12)
    result = compare_pairs(values, groups, "steel-dwass")
    assert all(math.isfinite(pair.p_value) for pair in result.pairs)


def test_two_groups_of_one_same_value_are_one_pair_not_estimable_by_ranks():
    result = compare_pairs([1, 1, 1, 1, 1, 1, 2, 3, 4], ["A"] * 3 + ["B"] * 3 + ["C"] * 3, "steel-dwass")
    assert dict(result.not_estimable) == {("A", "B"): "all values of the two groups are identical"}
    assert result.pairs[0].verdict == "undecided"


def test_p_values_keep_their_digits_far_out():
    values = [0.0, 0.1, 0.2, 0.1, 0.0, 9.0, 9.1, 9.2, 9.1, 9.0, 0.1, 0.2, 0.3, 0.2, 0.1]
    result = compare_pairs(values, ["A"] * 5 + ["B"] * 5 + ["C"] * 5)
    assert 0 < result.pairs[0].p_value < 1e-15
    assert result.pairs[0].p_value < result.pairs[2].p_value
