"""The e-value: expectation 1, Ville's inequality, its inversion, and published forms of it."""

import numpy as np
import pytest
from scipy import integrate, stats

from sameline.errors import StatsError
from sameline.stats.looks.evidence import critical_t, log_e_value, log_evidence, p_from_log, phi_from_margin


@pytest.mark.parametrize("df", [1, 2, 5, 40, np.inf])
@pytest.mark.parametrize("n", [0.5, 3.0, 60.0])
@pytest.mark.parametrize("phi", [0.25, 1.0, 4.0])
def test_expectation_is_one_when_nothing_differs(df, n, phi):
    log_density = stats.norm.logpdf if np.isinf(df) else lambda t: stats.t.logpdf(t, df)
    reach = np.sqrt((1.0 if np.isinf(df) else df) * (phi + n) / phi)

    def weighted(angle):  # t = reach tan(angle) covers the whole line
        t = reach * np.tan(angle)
        return np.exp(log_density(t) + log_e_value(t, df, n, phi)) * reach / np.cos(angle) ** 2

    half = integrate.quad(weighted, 0, np.pi / 2 - 1e-12, epsabs=1e-12, epsrel=1e-12, limit=400)[0]
    assert 2 * half == pytest.approx(1.0, abs=1e-8)


@pytest.mark.parametrize(("t", "df", "n", "phi"), [(1.6, 19, 5.2, 3.0), (3.1, 8, 2.5, 0.5), (-2.2, 40, 30.0, 1.0)])
def test_is_the_ratio_of_the_two_densities_of_t(t, df, n, phi):
    # Goenen, Johnson, Lu and Westfall 2005, Am. Stat. 59:252-257: noncentral t averaged over a normal effect size
    def mixed(delta):
        return stats.nct.pdf(t, df, delta * np.sqrt(n)) * stats.norm.pdf(delta, 0, 1 / np.sqrt(phi))

    numerator = integrate.quad(mixed, -12 / np.sqrt(phi), 12 / np.sqrt(phi), epsabs=1e-14, limit=400)[0]
    assert np.exp(log_e_value(t, df, n, phi)) == pytest.approx(numerator / stats.t.pdf(t, df), rel=1e-7)


@pytest.mark.parametrize(("n", "m", "a"), [(5, 2, 9.0), (12, 5, 4.0), (400, 2, 9.0)])
def test_a_flat_prior_gives_lais_confidence_sequence(n, m, a):
    # Lai 1976, Ann. Statist. 4:265-280, theorem 2 (from memory): mean +- s_n sqrt((b n)^(1/n) - 1), s_n with divisor n,
    # b = (1 + a^2 / (m - 1))^m / m. It is the limit of E / sqrt(phi) at threshold sqrt(b).
    b = (1 + a**2 / (m - 1)) ** m / m
    phi = 1e-12
    t = critical_t(n - 1, n, phi, 1 / np.sqrt(b * phi))
    # in units of the unbiased s: half length = t s / sqrt(n), s_n = s sqrt((n - 1) / n)
    assert t / np.sqrt(n) == pytest.approx(np.sqrt((n - 1) / n) * np.sqrt((b * n) ** (1 / n) - 1), rel=1e-9)


def test_ville_holds_over_two_hundred_looks():
    rng = np.random.default_rng(20240)
    paths, looks = 4000, 200
    a, b = rng.standard_normal((2, paths, looks))
    n = np.arange(1, looks + 1)
    mean_a, mean_b = np.cumsum(a, 1) / n, np.cumsum(b, 1) / n
    ss = np.cumsum(a**2 + b**2, 1) - n * (mean_a**2 + mean_b**2)
    explained = n / 2 * (mean_b - mean_a) ** 2
    logs = log_evidence(explained, ss + explained, 2 * n - 1, n / 2, 1.0)
    for alpha in (0.2, 0.1, 0.05, 0.01):
        rate = np.mean(logs.max(axis=1) >= -np.log(alpha))
        assert rate <= alpha + 3 * np.sqrt(alpha * (1 - alpha) / paths)
    assert np.mean(logs.max(axis=1) >= -np.log(0.2)) > 0.05  # the bound is not met by never claiming


@pytest.mark.parametrize("df", [1.0, 3.0, 20.0, 500.0, np.inf])
def test_the_interval_ends_where_the_evidence_reaches_the_share(df):
    t = critical_t(df, 40.0, 1.0, 0.004)
    assert np.isfinite(t) == (df > 1)
    if np.isfinite(t):
        assert log_e_value(t, df, 40.0, 1.0) == pytest.approx(-np.log(0.004), rel=1e-9)
        assert log_e_value(0.999 * t, df, 40.0, 1.0) < -np.log(0.004)


def test_too_few_units_bound_nothing_and_no_units_say_nothing():
    assert critical_t(1, 0.5, 1.0, 0.01) == np.inf
    assert critical_t(0, 0.5, 1.0, 0.01) == np.inf
    assert critical_t(10, 0.0, 1.0, 0.01) == np.inf
    assert log_e_value(5.0, 0, 3.0, 1.0) == 0.0
    assert log_evidence(0.0, 0.0, 4, 2.0, 1.0) < 0  # all values equal: no evidence, no error


def test_with_n_growing_known_spread_is_the_limit():
    assert log_e_value(3.0, 1e9, 12.0, 0.5) == pytest.approx(float(log_e_value(3.0, np.inf, 12.0, 0.5)), rel=1e-7)


def test_p_is_never_stated_as_zero():
    assert p_from_log(5000.0) == 1e-300
    assert p_from_log(-3.0) == 1.0


def test_phi_from_margin():
    assert phi_from_margin(2.0, 1.0) == 0.25
    for margin, sd in ((0, 1), (1, -1), (np.nan, 1)):
        with pytest.raises(StatsError):
            phi_from_margin(margin, sd)
