"""The integral over the estimated scale against mixtures that have a closed form.

If s² is chi-squared over its degrees of freedom, E exp(-r q² s²) = (1 + 2 r q²/df)^(-df/2): the chi-squared moment
generating function (N. L. Johnson and S. Kotz, Continuous Univariate Distributions 1, 1970, chapter 17).
"""

import numpy as np
import pytest
from scipy.special import log_ndtr

from sameline.stats.scale_mixture import KnownScaleTail, log_mixture, log_mixture_and_slope, reach

FREEDOMS = [1.0, 1.7, 2.0, 5.0, 30.0, 99.9, 100.1, 1e3, 1e6, 1e12]


@pytest.mark.parametrize("df", FREEDOMS)
@pytest.mark.parametrize("rate", [0.25, 0.5])
def test_a_normal_tail_mixes_to_an_algebraic_one(df: float, rate: float):
    tail = KnownScaleTail(lambda w: -rate * w * w, rate, 1.0)
    q = 10.0 ** np.linspace(-2, 1.5, 40)
    freedom = np.full_like(q, df)
    exact = -0.5 * df * np.log1p(2 * rate * q * q / df)
    exact_slope = -2 * rate * q * q / (1 + 2 * rate * q * q / df)
    value, slope = log_mixture_and_slope(tail, q, freedom)
    # a logarithm's absolute error is the tail's relative error
    assert np.abs(value - exact).max() < 1e-12
    assert np.allclose(slope, exact_slope, rtol=1e-8, atol=1e-9)
    assert value.tolist() == log_mixture(tail, q, freedom).tolist()


@pytest.mark.parametrize("df", FREEDOMS)
def test_a_sure_event_stays_sure(df: float):
    tail = KnownScaleTail(np.zeros_like, 0.5, 1.0)
    q = np.array([-3.0, -1e-9, 1e-9])
    assert np.abs(log_mixture(tail, q, np.full_like(q, df))).max() < 1e-13


@pytest.mark.parametrize("df", FREEDOMS)
def test_a_statistic_below_zero_is_mixed_as_well(df: float):
    # E Φ(c s) + E Φ(-c s) = 1 for a one-sided normal tail
    tail = KnownScaleTail(lambda w: log_ndtr(-w), 0.5, 1.0)
    t = np.array([0.1, 1.0, 4.0, 20.0])
    freedom = np.full_like(t, df)
    total = np.exp(log_mixture(tail, -t, freedom)) + np.exp(log_mixture(tail, t, freedom))
    assert np.allclose(total, 1.0, rtol=0, atol=1e-13)


def test_the_derivative_is_the_difference_quotient():
    tail = KnownScaleTail(lambda w: log_ndtr(-w), 0.5, 1.0)
    q, df, h = np.array([0.5, 2.0, 9.0]), np.array([1.0, 40.0, 400.0]), 1e-6
    slope = log_mixture_and_slope(tail, q, df)[1]
    quotient = (log_mixture(tail, q * np.exp(h), df) - log_mixture(tail, q * np.exp(-h), df)) / (2 * h)
    assert np.allclose(slope, quotient, rtol=1e-7)


@pytest.mark.parametrize("df", FREEDOMS)
def test_the_nodes_reach_far_enough(df: float):
    left, right = (float(side[0]) for side in reach(np.array([df])))
    for x in (-left, right):
        # log of the density of x against its mode at 0, written so that nothing cancels at many degrees of freedom
        series = -x * x * (1 + 2 * x / 3 + x * x / 3) if abs(x) < 1e-3 else x - 0.5 * np.expm1(2 * x)
        assert df * series <= -38.9
