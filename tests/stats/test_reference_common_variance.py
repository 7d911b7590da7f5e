"""Analysis of variance, Tukey-Kramer and adjusted t tests against the reference cases.

Tolerances are those of tests/reference/README.md.
"""

import math
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from sameline.stats import PairsResult, anova, compare_pairs

Case = dict[str, Any]
Near = Callable[..., None]

PROCEDURES = {"pairs_bonferroni": "bonferroni", "pairs_sidak": "sidak", "pairs_holm": "holm"}


def compared(case: Case, procedure: str) -> PairsResult:
    data, options = case["data"], case["options"]
    return compare_pairs(data["value"], data["group"], procedure=procedure, alpha=options["alpha"])


def test_anova(anova_case: Case, near: Near, rtol_of: Callable[[Case], float]):
    data, want, rtol = anova_case["data"], anova_case["expect"], rtol_of(anova_case)
    got = anova(data["value"], data["group"])
    assert (got.df_between, got.df_within) == (want["df_between"], want["df_within"])
    for name in ("ss_between", "ss_within", "ms_between", "ms_within", "F"):
        near(getattr(got, name), want[name], rtol=rtol, label=name)
    near(got.p_value, want["p"], rtol=10 * rtol, label="p")
    if "groups" in want:
        near(got.eta_squared, want["eta_squared"], rtol=rtol, label="eta")
        assert [group.label for group in got.groups] == want["groups"]["group"]
        for name in ("n", "mean", "sd"):
            near([getattr(group, name) for group in got.groups], want["groups"][name], rtol=rtol, label=name)


def test_tukey_kramer(tukey_kramer_case: Case, near: Near, rtol_of: Callable[[Case], float]):
    want, rtol = tukey_kramer_case["expect"], rtol_of(tukey_kramer_case)
    got = compared(tukey_kramer_case, "tukey-kramer")
    pairs = want["pairs"]
    assert (list(got.a), list(got.b)) == (pairs["group1"], pairs["group2"])
    frame = got.frame()
    se = np.asarray(pairs["se"])
    near(got.critical_value, want["q_crit"], rtol=1e-9, label="critical")
    near(frame["df"], [want["df"]] * len(frame), label="df")
    near(frame["difference"], pairs["diff"], rtol=rtol, label="difference")
    near(frame["standard_error"], se, rtol=rtol, label="se")
    near(frame["statistic"], pairs["q"], rtol=rtol, label="q")
    near(frame["p_value"], pairs["p"], atol=rtol, label="p")
    near(frame["lower"] / se, np.asarray(pairs["lo"]) / se, atol=10 * rtol, label="lower")
    near(frame["upper"] / se, np.asarray(pairs["hi"]) / se, atol=10 * rtol, label="upper")


def check_adjusted(case: Case, near: Near, rtol: float, *, intervals: bool):
    want, pairs = case["expect"], case["expect"]["pairs"]
    got = compared(case, PROCEDURES[case["kind"]])
    frame = got.frame()
    se = np.asarray(pairs["se"])
    near(frame["difference"], pairs["diff"], rtol=rtol, label="difference")
    near(frame["standard_error"], se, rtol=rtol, label="se")
    near(frame["df"], pairs["df"], rtol=rtol, label="df")
    near(frame["statistic"], pairs["t"], rtol=rtol, label="t")
    near(got.columns.p_raw, pairs["p_raw"], rtol=10 * rtol, label="p_raw")
    near(frame["p_value"], pairs["p"], rtol=10 * rtol, label="p")
    if intervals:
        assert got.critical_value == pytest.approx(want["t_crit"], rel=1e-9)
        near(frame["lower"] / se, np.asarray(pairs["lo"]) / se, atol=10 * rtol, label="lower")
        near(frame["upper"] / se, np.asarray(pairs["hi"]) / se, atol=10 * rtol, label="upper")
    else:
        assert frame["lower"].tolist() == [None] * len(frame)
        assert got.critical_value is None


def test_bonferroni(pairs_bonferroni_case: Case, near: Near, rtol_of: Callable[[Case], float]):
    check_adjusted(pairs_bonferroni_case, near, rtol_of(pairs_bonferroni_case), intervals=True)


def test_sidak(pairs_sidak_case: Case, near: Near, rtol_of: Callable[[Case], float]):
    check_adjusted(pairs_sidak_case, near, rtol_of(pairs_sidak_case), intervals=True)


def test_holm(pairs_holm_case: Case, near: Near, rtol_of: Callable[[Case], float]):
    check_adjusted(pairs_holm_case, near, rtol_of(pairs_holm_case), intervals=False)


def test_five_groups_of_nine_have_the_tabulated_least_significant_range():
    # Common practice, no source: mean square within 0.088, alpha 0.05 give q 4.04 and a least range of 0.40.
    spread = math.sqrt(0.088 * 8 / 60)  # nine values at 4, 3, ... -4 steps have a sum of squares of 60 steps squared
    values = [step * spread + mean for mean in range(5) for step in range(-4, 5)]
    result = compare_pairs(values, [label for label in "ABCDE" for _ in range(9)])
    assert round(result.critical_value, 2) == 4.04
    first = result.pairs[0]
    assert round((first.upper - first.lower) / 2, 2) == 0.40
