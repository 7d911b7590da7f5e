"""Sizes and power against reference cases, scipy's noncentral t, simulation and what must hold between them.

The definition of power and its reference values: kind `power` in tests/reference/cases.
"""

import math
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
import scipy.stats
from hypothesis import given, settings
from hypothesis import strategies as st

from sameline.errors import StatsError
from sameline.stats.noncentral_t import exceedance, noncentrality
from sameline.stats.sizes import Design, detectable_differences, power_curve, run_mean_sd, size_curve, size_for
from sameline.stats.studentized_range import studentized_range_isf


def test_reference_sizes_and_powers(power_case: dict[str, Any], near: Callable[..., None]):
    grid = power_case["expect"]["grid"]
    for row in range(len(grid["k"])):
        case = {name: column[row] for name, column in grid.items()}
        found = size_for(Design(case["k"], alpha=case["alpha"]), case["delta"], case["sigma"], case["power"])
        assert (found.n, found.df) == (case["n_per_group"], case["df"])
        near(found.critical * math.sqrt(2), case["q_crit"], rtol=1e-11)
        near([found.power, found.power_below], [case["power_at_n"], case["power_at_n_minus_1"]], atol=1e-11)


@pytest.mark.parametrize("df", [2.0, 9.0, 40.0, 600.0])
@pytest.mark.parametrize("ncp", [0.0, 0.7, 3.0, 9.0])
def test_exceedance_is_scipys_noncentral_t(df: float, ncp: float):
    for critical in (0.5, 2.2, 4.0):
        upper = scipy.stats.nct.sf(critical, df, ncp) if ncp else scipy.stats.t.sf(critical, df)
        # scipy gives NaN for the far tail at large noncentrality, where it is below 1e-20
        lower = np.nan_to_num(scipy.stats.nct.cdf(-critical, df, ncp)) if ncp else scipy.stats.t.sf(critical, df)
        assert exceedance(critical, df, ncp, two_sided=False) == pytest.approx(upper, rel=1e-9)
        assert exceedance(critical, df, ncp, two_sided=True) == pytest.approx(upper + lower, rel=1e-9)


def test_exceedance_at_known_scale_is_normal():
    expected = scipy.stats.norm.sf(2.0 - 0.5) + scipy.stats.norm.cdf(-2.0 - 0.5)
    assert exceedance(2.0, math.inf, 0.5, two_sided=True) == pytest.approx(expected, rel=1e-14)


@given(st.floats(1.0, 6.0), st.floats(2, 500), st.floats(0.3, 0.9999), st.booleans())
@settings(max_examples=30, deadline=None)
def test_noncentrality_undoes_exceedance(critical: float, df: float, power: float, two_sided: bool):
    ncp = noncentrality(critical, df, power, two_sided=two_sided)
    assert ncp == 0.0 or exceedance(critical, df, ncp, two_sided=two_sided) == pytest.approx(power, abs=1e-11)


def test_two_groups_are_the_t_test_and_dunnett_with_one_treatment():
    pairs, control = size_for(Design(2), 1.0, 1.0, 0.9), size_for(Design(2, "dunnett"), 1.0, 1.0, 0.9)
    # J. Cohen, Statistical Power Analysis, 2nd ed. 1988, table 2.4.1 (from memory): 22 for d = 1, two-sided 5 %, power
    # 0.90, by his approximation; the exact noncentral t gives 23 at power 0.9125
    assert pairs.n == control.n == 23
    assert pairs.power == pytest.approx(control.power, rel=1e-10)
    t = scipy.stats.t.isf(0.025, 44)
    assert pairs.critical == pytest.approx(t, rel=1e-10)
    assert pairs.power == pytest.approx(scipy.stats.nct.sf(t, 44, math.sqrt(23 / 2)), rel=2e-7)  # the other tail: 6e-8


def test_a_simulation_finds_the_pair_as_often_as_said():
    rng = np.random.default_rng(20)
    k, n, difference, rounds = 4, 6, 2.0, 4000
    values = rng.normal(size=(rounds, k, n))
    values[:, 1] += difference
    means, ms = values.mean(axis=2), values.var(axis=2, ddof=1).mean(axis=1)
    q = (means[:, 1] - means[:, 0]) / np.sqrt(ms / n)
    found = float((np.abs(q) > studentized_range_isf(0.05, k, k * (n - 1))).mean())
    said = power_curve(Design(k), n, [difference], 1.0)[0]
    assert abs(found - said) < 4 * math.sqrt(said * (1 - said) / rounds)


@pytest.mark.parametrize("design", [Design(5), Design(5, "dunnett"), Design(5, "dunnett", alternative="less"),
                                    Design(5, "dunnett", control_ratio=2.0), Design(3, alpha=0.01)])  # fmt: skip
def test_size_is_the_smallest(design: Design):
    found = size_for(design, 1.3, 1.0, 0.85)
    assert found.power >= 0.85 > found.power_below
    assert found.total == found.n_control + (design.groups - 1) * found.n
    powers = size_curve(design, [found.n - 1, found.n], 1.3, 1.0)
    assert powers.tolist() == [found.power_below, found.power]


def test_one_side_and_more_control_need_less():
    both = size_for(Design(6, "dunnett"), 1.0, 1.0)
    assert size_for(Design(6, "dunnett", alternative="greater"), 1.0, 1.0).n < both.n
    weighted = size_for(Design(6, "dunnett", control_ratio=math.sqrt(5)), 1.0, 1.0)
    assert weighted.total < both.total
    assert size_for(Design(6), 1.0, 1.0).n > both.n


def test_power_grows_with_the_difference_from_the_error_rate_of_one_pair():
    curve = power_curve(Design(4), 8, np.linspace(0, 4, 40), 1.0)
    assert (np.diff(curve) > 0).all()
    assert curve[0] < 0.05
    assert curve[-1] > 0.999


def test_size_depends_on_the_ratio_only():
    assert size_for(Design(4), 0.02, 0.01).n == size_for(Design(4), 2000.0, 1000.0).n


def test_more_replicates_cannot_replace_runs():
    assert run_mean_sd(0.3, 0.4, 1) == pytest.approx(0.5)
    assert run_mean_sd(0.0, 0.4, 4) == pytest.approx(0.2)
    runs = [size_for(Design(4), 1.0, run_mean_sd(0.6, 0.5, m)).n for m in (1, 2, 5, 1000)]
    assert runs == sorted(runs, reverse=True)
    assert runs[-1] == size_for(Design(4), 1.0, 0.6).n


@pytest.mark.parametrize("design", [Design(4), Design(4, "dunnett"), Design(4, "dunnett", alternative="greater")])
def test_detectable_difference_has_the_wanted_power(design: Design):
    found = detectable_differences(design, [7, 7, 7, 7], 0.5, power=0.9)
    one = found[1] if design.procedure == "dunnett" else found[0, 1]
    assert power_curve(design, 7, [one], 0.5)[0] == pytest.approx(0.9, abs=1e-10)


def test_detectable_difference_is_smaller_between_larger_groups():
    found = detectable_differences(Design(3), [3, 10, 30], 1.0)
    assert np.array_equal(found, found.T)
    assert found[1, 2] < found[0, 2] < found[0, 1]
    assert found.diagonal().tolist() == [0.0, 0.0, 0.0]
    against = detectable_differences(Design(3, "dunnett"), [3, 10, 30], 1.0, control=1)
    assert against[1] == 0.0
    assert against[2] < against[0]


@pytest.mark.parametrize(
    ("call", "word"),
    [
        (lambda: Design(1), "2 groups"),
        (lambda: Design(3, "games-howell"), "procedure"),
        (lambda: Design(3, alpha=0.0), "error rate"),
        (lambda: Design(3, "dunnett", control_ratio=0.0), "share"),
        (lambda: Design(3, alternative="less"), "two sides"),
        (lambda: size_for(Design(3), 0.0, 1.0), "difference"),
        (lambda: size_for(Design(3), 1.0, math.nan), "sd"),
        (lambda: size_for(Design(3), 1.0, 1.0, power=0.04), "power"),
        (lambda: size_for(Design(3), 1.0, 1.0, power=1.0), "power"),
        (lambda: size_for(Design(3), 1e-6, 1.0), "more than"),
        (lambda: run_mean_sd(-0.1, 0.5, 2), "at least 0"),
        (lambda: run_mean_sd(0.1, 0.5, 0), "replicate"),
        (lambda: run_mean_sd(0.0, 0.0, 2), "above 0"),
        (lambda: power_curve(Design(3), 1, [1.0], 1.0), "degrees of freedom"),
        (lambda: power_curve(Design(3), 5, [-1.0], 1.0), "at least 0"),
        (lambda: detectable_differences(Design(3), [1, 1, 1], 1.0), "degrees of freedom"),
        (lambda: detectable_differences(Design(3), [4, 4], 1.0), "groups"),
        (lambda: detectable_differences(Design(3, "dunnett"), [4, 4, 4], 1.0, control=3), "no group"),
    ],
)
def test_refusals_say_what_is_wrong(call: Callable[[], Any], word: str):
    with pytest.raises(StatsError, match=word):
        call()
