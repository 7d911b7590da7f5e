"""Performance indices against the worked example of the NIST/SEMATECH e-Handbook, 6.1.6."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import stats as peer

from sameline.errors import StatsError
from sameline.stats.capability import Process, performance, spread_df

N = 50


def process(mean=16.0, s=2.0, n=N):
    return Process(mean, s, n - 1.0, s / math.sqrt(n))


def indices(found):
    return {index.name: index for index in found}


def test_the_example_of_the_handbook():
    """NIST/SEMATECH e-Handbook of Statistical Methods, 6.1.6 (from memory): limits 8 and 20, mean 16, s = 2."""
    found = indices(performance(process(), 8.0, 20.0))
    assert found["Pp"].value == pytest.approx(1.0)
    assert found["PpkL"].value == pytest.approx(1.3333, abs=5e-5)
    assert found["PpkU"].value == pytest.approx(0.6667, abs=5e-5)
    assert found["Ppk"].value == pytest.approx(0.6667, abs=5e-5)
    k = abs((20 + 8) / 2 - 16) / ((20 - 8) / 2)
    assert found["Ppk"].value == pytest.approx(found["Pp"].value * (1 - k))


def test_the_intervals_are_the_handbooks_formulas():
    """6.1.6: Cp sqrt(chi-squared/nu), and Cpk +- z sqrt(1/(9 n) + Cpk^2/(2 (n - 1)))."""
    found = indices(performance(process(), 8.0, 20.0, alpha=0.1))
    ends = np.sqrt(peer.chi2.ppf([0.05, 0.95], N - 1) / (N - 1))
    assert (found["Pp"].lower, found["Pp"].upper) == pytest.approx(tuple(ends))
    half = peer.norm.ppf(0.95) * math.sqrt(1 / (9 * N) + (2 / 3) ** 2 / (2 * (N - 1)))
    assert (found["Ppk"].lower, found["Ppk"].upper) == pytest.approx((2 / 3 - half, 2 / 3 + half))


def test_one_limit_has_no_potential():
    assert [index.name for index in performance(process(), None, 20.0)] == ["PpkU", "Ppk"]
    assert [index.name for index in performance(process(), 8.0, None)] == ["PpkL", "Ppk"]


def test_the_interval_of_the_lesser_index_covers_as_often_as_it_says():
    """4000 samples of 30 of a normal process with Ppk = 1: within 4 Monte-Carlo errors of 95 % and of its own bias."""
    random = np.random.default_rng(4)
    many, n = 4000, 30
    held = 0
    for values in random.normal(0.0, 1.0, (many, n)):
        s = float(values.std(ddof=1))
        (_, index) = performance(Process(float(values.mean()), s, n - 1.0, s / math.sqrt(n)), None, 3.0)
        held += index.lower <= 1.0 <= index.upper
    assert held / many == pytest.approx(0.95, abs=0.01 + 4 * math.sqrt(0.95 * 0.05 / many))


def test_the_degrees_of_freedom_of_a_spread_are_found_back():
    for df in (1.5, 4.0, 20.0, 3000.0):
        upper = math.sqrt(df / peer.chi2.ppf(0.025, df))
        assert spread_df(1.0, upper) == pytest.approx(df, rel=1e-6)


@pytest.mark.parametrize(
    ("who", "lower", "upper"),
    [(process(), None, None), (process(), 20.0, 8.0), (process(s=0.0), 8.0, 20.0)],
)
def test_what_has_no_index_is_refused(who, lower, upper):
    with pytest.raises(StatsError):
        performance(who, lower, upper)


def test_an_upper_end_below_the_deviation_is_refused():
    with pytest.raises(StatsError):
        spread_df(2.0, 1.9)
