"""Outlier tests against published examples, and what they do at their edges."""

import numpy as np
import pytest
import scipy.stats

from sameline.stats import (
    cochran_critical,
    cochran_test,
    esd_test,
    grubbs_test,
    mandel_statistics,
    screen_outliers,
)

URANIUM = [199.31, 199.53, 200.19, 200.82, 201.92, 201.95, 202.18, 245.57]


def test_grubbs_published_example():
    # NIST/SEMATECH e-Handbook of Statistical Methods, 1.3.5.17.1 (data of Tietjen & Moore 1972): G = 2.4687 and the
    # critical value 2.032 of the upper one-tailed test at 5 %.
    got = grubbs_test(URANIUM, alternative="greater")
    assert (got.index, got.value, got.outlier) == (7, 245.57, True)
    assert round(got.critical, 3) == 2.032
    assert pytest.approx(2.4687, abs=1e-4) == got.G


def test_grubbs_smallest_is_the_mirror_of_largest():
    low = grubbs_test([-value for value in URANIUM], alternative="less")
    high = grubbs_test(URANIUM, alternative="greater")
    assert (low.G, low.index, low.p_value) == (high.G, high.index, high.p_value)


def test_grubbs_of_two_equally_far_values_names_the_same_one_in_any_order():
    values = [1.0, 5.0, 5.0, 5.0, 9.0]
    assert grubbs_test(values).value == grubbs_test(values[::-1]).value == 9.0


def test_grubbs_critical_value_holds_its_error_rate_for_few_values():
    # Among four values no two can lie so far out together, so that Bonferroni's bound is exact.
    rng = np.random.default_rng(12)
    draws = rng.normal(size=(40_000, 4))
    z = np.abs(draws - draws.mean(1, keepdims=True)).max(1) / draws.std(1, ddof=1)
    critical = grubbs_test([1.0, 2.0, 4.0, 8.0]).critical
    error = np.sqrt(0.05 * 0.95 / 40_000)
    assert np.mean(z > critical) == pytest.approx(0.05, abs=4 * error)


def test_esd_finds_outliers_that_mask_each_other():
    rng = np.random.default_rng(7)
    values = [*rng.normal(10, 0.1, 25).round(2), 12.0, 12.01, 12.02]
    assert not any(grubbs_test(values).index == at for at in esd_test(values, 5).outlier_index[1:])
    assert sorted(esd_test(values, 5).outlier_index) == [25, 26, 27]


def test_esd_of_few_values_carries_a_caution():
    assert [caution.code for caution in esd_test(URANIUM, 2).cautions] == ["few-values"]
    assert esd_test(URANIUM * 2, 2).cautions == ()


@pytest.mark.parametrize(
    ("k", "n", "alpha", "published"),
    # ISO 5725-2:1994, table 4, from memory: critical values of Cochran's test, 5 % and 1 %.
    [(3, 2, 0.05, 0.967), (5, 3, 0.05, 0.684), (10, 2, 0.05, 0.602), (5, 3, 0.01, 0.788), (10, 2, 0.01, 0.718)],
)
def test_cochran_critical_values(k: int, n: int, alpha: float, published: float):
    assert cochran_critical(alpha, k, n) == pytest.approx(published, abs=1.5e-3)


def test_cochran_with_unequal_sizes_is_the_test_of_one_variance_against_the_rest():
    values = [1.0, 2.0, 1.5, 3.0, 9.0, 4.0, 1.0, 1.2, 7.0, 7.1]
    got = cochran_test(values, list("AAABBBCCDD"))
    rest = [np.array([1.0, 2.0, 1.5]), np.array([1.0, 1.2]), np.array([7.0, 7.1])]
    pooled = sum(((part - part.mean()) ** 2).sum() for part in rest) / 4
    F = np.var([3.0, 9.0, 4.0], ddof=1) / pooled
    assert (got.group, got.k) == ("B", 4)
    assert got.p_value == pytest.approx(4 * scipy.stats.f.sf(F, 2, 4), rel=1e-12)
    assert got.outlier == (got.p_value < 0.05)


def test_cochran_leaves_groups_of_one_value_out():
    values = [1.0, 2.0, 1.5, 3.0, 9.0, 4.0, 8.0]
    assert cochran_test(values, list("AAABBBC")) == cochran_test(values[:6], list("AAABBB"))


def test_mandel_names_the_groups_beyond():
    rng = np.random.default_rng(3)
    values = rng.normal(10, 0.1, (8, 4)).round(3)
    values[2] += 2.0
    values[5] = 10 + 10 * (values[5] - 10)
    got = mandel_statistics(values.ravel(), np.repeat(list("ABCDEFGH"), 4))
    assert got.h_beyond == ("C",)
    assert got.k_beyond == ("F",)
    assert sum(got.h) == pytest.approx(0, abs=1e-12)
    assert np.mean(np.square(got.k)) == pytest.approx(1)


def test_screening_names_suspects_by_their_row_and_says_what_it_could_not_test():
    values = [10.0, 10.1, 9.9, 10.05, 14.0, 10.2, 10.1, 10.0, 10.15, 10.05, 9.0, 9.0]
    labels = list("AAAAABBBBBCC")
    got = screen_outliers(values, labels)
    grubbs = [flag for flag in got.flags if flag.test == "grubbs"]
    assert [(flag.group, flag.row, flag.value) for flag in grubbs] == [("A", 4, 14.0)]
    assert [flag.group for flag in got.flags if flag.test == "cochran"] == ["A"]
    assert set(got.not_estimable) == {"grubbs in 'C'", "mandel"}


def test_screening_gives_mandel_both_ways():
    rng = np.random.default_rng(3)
    values = rng.normal(10, 0.1, (8, 4)).round(3)
    values[2] += 2.0
    values[5] = 10 + 10 * (values[5] - 10)
    got = screen_outliers(values.ravel(), np.repeat(list("ABCDEFGH"), 4))
    assert {(flag.test, flag.group) for flag in got.flags} >= {("mandel-h", "C"), ("mandel-k", "F"), ("cochran", "F")}
