"""Global tests, diagnostics and outlier tests against the reference cases.

Tolerances are those of tests/reference/README.md.
"""

from collections.abc import Callable
from typing import Any

import pytest

from sameline.stats import (
    bartlett_test,
    cochran_critical,
    cochran_test,
    esd_test,
    grubbs_test,
    kruskal_wallis,
    levene_test,
    mandel_critical,
    mandel_statistics,
    shapiro_test,
    welch_anova,
)

Case = dict[str, Any]
Near = Callable[..., None]


def columns(case: Case) -> tuple[list[float], list[str]]:
    return case["data"]["value"], case["data"]["group"]


def test_welch(welch_anova_case: Case, near: Near, rtol_of: Callable[[Case], float]):
    want, got = welch_anova_case["expect"], welch_anova(*columns(welch_anova_case))
    rtol = rtol_of(welch_anova_case)
    near([got.F, got.df1, got.df2], [want["F"], want["df1"], want["df2"]], rtol=rtol)
    near(got.p_value, want["p"], rtol=10 * rtol)


def check_levene(case: Case, center: str, near: Near, rtol: float):
    want, got = case["expect"], levene_test(*columns(case), center=center)
    near([got.statistic, got.df1, got.df2], [want["F"], want["df1"], want["df2"]], rtol=rtol)
    near(got.p_value, want["p"], rtol=10 * rtol)


def test_levene_on_medians(levene_median_case: Case, near: Near, rtol_of: Callable[[Case], float]):
    check_levene(levene_median_case, "median", near, rtol_of(levene_median_case))


def test_levene_on_means(levene_mean_case: Case, near: Near, rtol_of: Callable[[Case], float]):
    check_levene(levene_mean_case, "mean", near, rtol_of(levene_mean_case))


def test_bartlett(bartlett_case: Case, near: Near, rtol_of: Callable[[Case], float]):
    want, got = bartlett_case["expect"], bartlett_test(*columns(bartlett_case))
    near([got.statistic, got.df1], [want["K2"], want["df"]], rtol=rtol_of(bartlett_case))
    near(got.p_value, want["p"], rtol=10 * rtol_of(bartlett_case))


def test_kruskal(kruskal_case: Case, near: Near):
    want, got = kruskal_case["expect"], kruskal_wallis(*columns(kruskal_case))
    near([got.H, got.df, got.p_value], [want["H"], want["df"], want["p"]], rtol=1e-10)
    assert list(got.labels) == want["mean_ranks"]["group"]
    near(got.mean_ranks, want["mean_ranks"]["mean_rank"], rtol=1e-10)


def test_shapiro(shapiro_residuals_case: Case, near: Near):
    want, got = shapiro_residuals_case["expect"], shapiro_test(*columns(shapiro_residuals_case))
    near(got.statistic, want["W"], atol=1e-8)
    near(got.p_value, want["p"], atol=1e-7)


def test_grubbs(grubbs_case: Case, near: Near):
    values, alpha, want = grubbs_case["data"]["value"], grubbs_case["options"]["alpha"], grubbs_case["expect"]
    both, high = grubbs_test(values, alpha=alpha), grubbs_test(values, alpha=alpha, alternative="greater")
    two, one = want["two_sided"], want["one_sided_max"]
    assert (both.n, both.index, both.value, both.outlier) == (want["n"], two["index0"], two["value"], two["outlier"])
    near([both.G, both.critical, both.p_value], [two["G"], two["critical"], two["p"]], rtol=1e-9)
    near([high.G, high.critical, high.p_value], [one["G"], one["critical"], one["p"]], rtol=1e-9)


def test_esd(gesd_case: Case, near: Near):
    options, want = gesd_case["options"], gesd_case["expect"]
    got = esd_test(gesd_case["data"]["value"], options["max_outliers"], alpha=options["alpha"])
    near(got.R, want["R"], rtol=1e-9)
    near(got.critical, want["lambda"], rtol=1e-9)
    assert list(got.value) == want["removed_value"]
    assert got.outliers == want["n_outliers"]
    assert list(got.index) == want["removed_index0"]
    published = want.get("published", {"R": got.R, "lambda": got.critical})
    near(got.R, published["R"], atol=1.1e-3)
    near(got.critical, published["lambda"], atol=1.1e-3)


def test_cochran(cochran_c_case: Case, near: Near):
    want = cochran_c_case["expect"]
    if "grid" in want:
        rows = zip(*(want["grid"][name] for name in ("alpha", "k", "n", "critical")), strict=True)
        for alpha, k, n, critical in rows:
            assert cochran_critical(alpha, k, n) == pytest.approx(critical, rel=1e-9)
        return
    got = cochran_test(*columns(cochran_c_case), alpha=cochran_c_case["options"]["alpha"])
    near([got.k, got.C, got.critical, got.p_value], [want["k"], want["C"], want["critical"], want["p"]], rtol=1e-8)
    assert (got.group, got.outlier) == (want["group_of_max"], want["outlier"])


def test_mandel(mandel_case: Case, near: Near):
    want = mandel_case["expect"]
    got = mandel_statistics(*columns(mandel_case))
    assert (list(got.labels), got.n) == (want["groups"]["group"], want["n"])
    near(got.h, want["groups"]["h"], atol=1e-10)
    near(got.k, want["groups"]["k"], rtol=1e-9)
    for alpha, h, k in zip(mandel_case["options"]["alpha"], want["h_critical"], want["k_critical"], strict=True):
        near(mandel_critical(alpha, want["p"], want["n"]), [h, k], rtol=1e-9)
