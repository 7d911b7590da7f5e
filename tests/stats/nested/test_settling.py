"""How many more runs would settle a pair."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import nct

from sameline.errors import StatsError
from sameline.stats.nested import NestedFit, fit_nested
from sameline.stats.plans import Family


def fit(shift: float) -> NestedFit:
    """Two groups of three runs whose means are exactly -1, 0, 1 about theirs: MS_run is 2 with n = 2."""
    run = np.array([-1.0, 0.0, 1.0])
    y = np.concatenate([np.repeat(run, 2), np.repeat(run + shift, 2)]) + np.tile([0.01, -0.01], 6)
    return fit_nested(y, np.repeat(["A", "B"], 6), runs=np.tile(np.repeat([1, 2, 3], 2), 2))


def chance(shift: float, more: int) -> float:
    error, df = (1.0 * 2 / (3 + more)) ** 0.5, 4 + 2 * more
    c = Family(2, 0.05, "tukey").critical(df)
    return nct.sf(c, df, shift / error) + nct.cdf(-c, df, shift / error)


def test_the_first_number_that_reaches_the_power():
    found = fit(1.2).to_settle("A", "B")
    assert found.unit == "run"
    assert found.towards == "differs"
    assert chance(1.2, found.more) >= 0.8 > chance(1.2, found.more - 1)
    assert found.power == pytest.approx(chance(1.2, found.more), rel=1e-9)
    assert found.text.startswith(f"{found.more} more runs in each of A and B")


def test_equivalence_where_the_margin_is_the_shorter_way():
    found = fit(0.1).to_settle("A", "B", margin=2.0)
    assert found.towards == "equivalent"
    error, df = (2 / (3 + found.more)) ** 0.5, 4 + 2 * found.more
    c = Family(2, 0.05, "tukey").critical(df)
    power = nct.sf(c, df, 1.9 / error) + nct.sf(c, df, 2.1 / error) - 1
    assert found.power == pytest.approx(power, rel=1e-9)
    assert found.power >= 0.8


def test_a_difference_too_small_to_settle():
    found = fit(0.001).to_settle("A", "B")
    assert found.more is None
    assert "would not settle" in found.text


def test_simulated_chance_matches():
    """3000 repeats of the enlarged design: the share shown to differ within 3 Monte-Carlo standard errors."""
    found = fit(1.2).to_settle("A", "B", power=0.5)
    rng = np.random.default_rng(1)
    runs = 3 + found.more
    y = rng.normal(size=(3000, 2, runs)) + np.array([0.0, 1.2])[:, None]
    spread = y.var(axis=2, ddof=1).mean(axis=1)
    t = np.diff(y.mean(axis=2), axis=1)[:, 0] / np.sqrt(2 * spread / runs)
    share = np.mean(np.abs(t) > Family(2, 0.05, "tukey").critical(2 * (runs - 1)))
    assert abs(share - found.power) < 3 * (0.25 / 3000) ** 0.5


def test_refusals():
    with pytest.raises(StatsError, match="not among the groups"):
        fit(1.0).to_settle("A", "Z")
    with pytest.raises(StatsError, match="two groups"):
        fit(1.0).to_settle("A", "A")
    blind = fit_nested([1.0, 1.2, 2.0, 2.3], list("AABB"), runs=["r"] * 4)
    with pytest.raises(StatsError, match="one run"):
        blind.to_settle("A", "B")
