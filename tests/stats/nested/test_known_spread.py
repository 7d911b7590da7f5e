"""Batches with one run each, judged with a run-to-run spread from outside."""

from __future__ import annotations

import numpy as np
import pytest

from sameline.errors import StatsError
from sameline.stats.distributions import t_isf
from sameline.stats.nested import KnownSpread, fit_nested, known_spread

Y = [10.0, 10.2, 11.0, 11.3, 12.0, 11.8]
GROUPS = list("AABBCC")
RUNS = ["r"] * 6


def history(seed: int = 3) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    batch, run = np.repeat(np.arange(5), 6), np.tile(np.repeat(np.arange(3), 2), 5)
    return rng.normal(0, 0.4, 15)[batch * 3 + run] + rng.normal(0, 0.15, 30), batch, run


def test_stated_spread_is_satterthwaite_combined():
    """Var = 2 (θ_run + MS_e/2), ν = V² / (Σ part²/ν) over the run and replicate parts, by hand."""
    fit = fit_nested(Y, GROUPS, runs=RUNS, known=KnownSpread.stated(0.5, 12, "method validation"))
    run, replicate = 2 * 0.25, (0.02 + 0.045 + 0.02) / 3
    variance = run + replicate
    df = variance**2 / (run**2 / 12 + replicate**2 / 3)
    pair = fit.pairs(adjust="none").pairs[1]
    assert pair.standard_error == pytest.approx(variance**0.5, rel=1e-12)
    assert pair.df == pytest.approx(df, rel=1e-12)
    assert pair.upper - pair.difference == pytest.approx(float(t_isf(0.025, df)) * variance**0.5, rel=1e-12)
    assert any("method validation" in caution.text and "12 degrees" in caution.text for caution in fit.cautions)


def test_spread_from_other_batches_names_them_and_its_degrees_of_freedom():
    known = known_spread(*history())
    assert known.batches == tuple("01234")
    source = fit_nested(history()[0], history()[1], runs=history()[2])
    assert known.run == pytest.approx(source.components["run"], rel=1e-12)
    # Balanced: θ_run = (MS_run - MS_e)/2 with 10 and 15 degrees of freedom.
    ms_run, ms_e = 2 * known.run + known.replicate, known.replicate
    assert known.df == pytest.approx((ms_run - ms_e) ** 2 / (ms_run**2 / 10 + ms_e**2 / 15), rel=1e-9)
    fit = fit_nested(Y, GROUPS, runs=RUNS, known=known)
    assert fit.unseen is None
    assert any("5 batches" in caution.text for caution in fit.cautions)


@pytest.mark.parametrize("take", [slice(None), slice(None, None, 2)])
def test_the_source_joins_the_fit_as_batches_that_are_not_compared(take: slice):
    """Written out: one fit of all batches and the pairs of the three compared picked from it."""
    y, batch, run = history()
    fit = fit_nested(Y[take], GROUPS[take], runs=RUNS[take], known=known_spread(y, batch, run))
    whole = fit_nested([*Y[take], *y], [*GROUPS[take], *map(str, batch)], runs=[*RUNS[take], *map(str, run)])
    assert fit.components == pytest.approx(dict(whole.components), rel=1e-10)
    picked = {(pair.a, pair.b): pair for pair in whole.pairs(adjust="none").pairs}
    for pair in fit.pairs(adjust="none").pairs:
        wanted = picked[pair.a, pair.b]
        for name in ("difference", "standard_error", "df", "p_value", "lower"):
            assert getattr(pair, name) == pytest.approx(getattr(wanted, name), rel=1e-9)
    tukey = fit.pairs().pairs
    assert all(left.p_value >= picked[left.a, left.b].p_value for left in tukey)
    for left, right in zip(fit.means().mean, whole.means().mean, strict=False):
        assert left == pytest.approx(right, rel=1e-12)


def test_single_values_against_an_intermediate_precision():
    known = KnownSpread.stated(0.5, 12, "control chart", includes_replicate=True)
    pair = fit_nested([10.0, 11.0], ["A", "B"], runs=["1", "1"], known=known).pairs().pairs[0]
    assert (pair.standard_error, pair.df) == pytest.approx((0.5**0.5, 12.0), rel=1e-12)


def test_a_spread_that_is_not_needed_is_not_used():
    y, group, run = [1.0, 1.2, 2.0, 2.3], list("AABB"), list("1212")
    fit = fit_nested(y, group, runs=run, known=KnownSpread.stated(0.5, 12, "validation"))
    assert fit.known is None
    assert "known-spread-unused" in {caution.code for caution in fit.cautions}
    assert fit.pairs().pairs == fit_nested(y, group, runs=run).pairs().pairs


def test_a_component_at_zero_keeps_its_uncertainty():
    """A source whose runs happen not to differ still says how little it knows of their spread."""
    y, batch, run = history()
    y = y - np.repeat(y.reshape(15, 2).mean(axis=1), 2)
    known = known_spread(y, batch, run)
    assert known.run == 0.0
    assert known.run_error > 0.0
    assert known.df == 0.0


@pytest.mark.slow
def test_false_claims_with_a_borrowed_spread():
    """One run each, spread from 20 other batches: 1000 null pairs at 5 % within 3 Monte-Carlo standard errors."""
    rng = np.random.default_rng(17)
    batch, run = np.repeat(np.arange(20), 6), np.tile(np.repeat(np.arange(3), 2), 20)
    hits = 0
    for _ in range(1000):
        y = rng.normal(0, 0.7, 60)[batch * 3 + run] + rng.normal(size=120)
        new = np.repeat(rng.normal(0, 0.7, 2), 3) + rng.normal(size=6)
        hits += (
            fit_nested(new, list("AAABBB"), runs=["r"] * 6, known=known_spread(y, batch, run)).pairs().pairs[0].differs
        )
    assert abs(hits / 1000 - 0.05) < 3 * (0.05 * 0.95 / 1000) ** 0.5


def test_refusals():
    with pytest.raises(StatsError, match="no batch here has a second run"):
        known_spread([1.0, 1.1, 2.0, 2.2], list("AABB"), ["1"] * 4)
    with pytest.raises(StatsError, match="cannot be meant"):
        KnownSpread.stated(0.0, 5, "x")
    with pytest.raises(StatsError, match="no known spread between replicates"):
        fit_nested([1.0, 2.0], ["A", "B"], runs=["1", "1"], known=KnownSpread.stated(0.5, 12, "x"))
