"""Simulated error rates: those that the cautions state, and those that the procedures promise."""

import numpy as np
import pytest

from sameline.stats import compare_pairs, studentized_range_isf
from sameline.stats.pair_cautions import GAMES_HOWELL_RATES, TUKEY_KRAMER_RATE

pytestmark = pytest.mark.slow
TIMES = 20_000


def normal_families(sizes: list[int], sds: list[float], seed: int) -> tuple[np.ndarray, np.ndarray]:
    """Means and variances of many families of equal true means, shape (TIMES, k) each."""
    rng, n, sd = np.random.default_rng(seed), np.array(sizes), np.array(sds)
    means = rng.standard_normal((TIMES, n.size)) * sd / np.sqrt(n)
    return means, rng.chisquare(n - 1, (TIMES, n.size)) / (n - 1) * sd**2


@pytest.mark.parametrize("n", GAMES_HOWELL_RATES)
def test_games_howell_claims_falsely_as_often_as_its_caution_says(n: int):
    means, variances = normal_families([n] * 10, [1.0] * 10, seed=n)
    a, b = np.triu_indices(10, 1)
    share = variances / n
    both = share[:, a] + share[:, b]
    df = both**2 / ((share[:, a] ** 2 + share[:, b] ** 2) / (n - 1))
    q = np.abs(means[:, a] - means[:, b]) / np.sqrt(both / 2)
    grid = np.linspace(n - 1, 2 * (n - 1), 2000)
    critical = np.interp(df, grid, studentized_range_isf(0.05, 10, grid))
    rate = GAMES_HOWELL_RATES[n]
    error = np.sqrt(rate * (1 - rate) / TIMES)
    assert (q > critical).any(1).mean() == pytest.approx(rate, abs=4 * error + 0.0025)  # the figure is rounded


def test_tukey_kramer_claims_falsely_as_often_as_its_caution_says():
    n = np.array([4, 20, 20, 20])
    means, variances = normal_families(n.tolist(), [4.0, 1.0, 1.0, 1.0], seed=1)
    a, b = np.triu_indices(4, 1)
    within = (variances * (n - 1)).sum(1, keepdims=True) / (n.sum() - 4)
    q = np.abs(means[:, a] - means[:, b]) / np.sqrt(within / 2 * (1 / n[a] + 1 / n[b]))
    rate = (q > studentized_range_isf(0.05, 4, 60.0)).any(1).mean()
    error = np.sqrt(TUKEY_KRAMER_RATE * (1 - TUKEY_KRAMER_RATE) / TIMES)
    assert rate == pytest.approx(TUKEY_KRAMER_RATE, abs=4 * error + 0.005)


@pytest.mark.parametrize("name", ["tukey-kramer", "dunnett", "sidak", "bonferroni", "holm"])
def test_the_promised_error_rate_is_kept(name: str):
    rng, times = np.random.default_rng(9), 2000
    labels, control = np.repeat(list("ABCD"), 5), "A" if name == "dunnett" else None
    false = sum(
        compare_pairs(rng.standard_normal(20), labels, name, control=control, alpha=0.1).differs.any()
        for _ in range(times)
    )
    error = np.sqrt(0.1 * 0.9 / times)
    assert false / times <= 0.1 + 4 * error
    if name in {"tukey-kramer", "dunnett"}:
        assert false / times >= 0.1 - 4 * error
