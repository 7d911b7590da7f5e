"""Plans: powers against reference values, the cheapest plan against a search of all, powers against simulation."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from sameline.errors import StatsError
from sameline.stats.nested import fit_nested
from sameline.stats.plans import Costs, Family, plan

CASES = Path(__file__).parents[1] / "reference" / "cases"


@pytest.mark.parametrize("name", ["tukey80_90", "tukey_a01_sigma"])
def test_power_of_tukey_pairs(name: str):
    """Reference kind `power`: smallest n a group, its power and that of n - 1."""
    grid = json.loads((CASES / f"open_power_{name}.json").read_text("utf-8"))["expect"]["grid"]
    for row in zip(*grid.values(), strict=True):
        case = dict(zip(grid, row, strict=True))
        k, n, delta, sigma = case["k"], case["n_per_group"], case["delta"], case["sigma"]
        found = plan({"run": sigma**2}, delta, groups=k, power=case["power"], alpha=case["alpha"]).best
        assert (found.runs, found.batches, found.replicates, found.df) == (n, None, 1, case["df"])
        assert found.power == pytest.approx(case["power_at_n"], abs=1e-8)
        family = Family(k, case["alpha"], "tukey")
        before = family.power(delta, sigma * (2 / (n - 1)) ** 0.5, k * (n - 2))
        assert before == pytest.approx(case["power_at_n_minus_1"], abs=1e-8)


@pytest.mark.parametrize("costs", [Costs(50, 20, 3), Costs(0, 0, 1), Costs(300, 1, 1)])
def test_nothing_is_cheaper(costs: Costs):
    """All plans of up to 25 batches, 12 runs and 12 replicates, one by one."""
    spreads = {"batch": 0.3, "run": 0.4, "replicate": 1.2}
    best = plan(spreads, 1.5, groups=3, costs=costs, power=0.85).best
    family = Family(3, 0.05, "tukey")
    cheapest = min(
        3 * b * (costs.batch + r * (costs.run + n * costs.replicate))
        for b in range(2, 26)
        for r in range(1, 13)
        for n in range(1, 13)
        if family.power(1.5, (2 * (0.3 + (0.4 + 1.2 / n) / r) / b) ** 0.5, 3 * (b - 1)) >= 0.85
    )
    assert best.cost == cheapest
    assert best.power >= 0.85
    assert best.measurements == 3 * best.batches * best.runs * best.replicates


def test_replicates_cannot_stand_in_for_runs():
    """Expensive runs and free replicates: the number of runs is bounded below by their own spread."""
    table = plan({"run": 1.0, "replicate": 1.0}, 1.5, groups=4, costs=Costs(0, 100, 0))
    alone = plan({"run": 1.0}, 1.5, groups=4).best
    assert table.best.runs >= alone.runs


def test_the_curve_and_the_frame():
    table = plan({"run": 0.3, "replicate": 1.0}, 1.5, groups=4, costs=Costs(0, 20, 3))
    differences, powers = np.array(table.curve).T
    assert powers[0] < 0.05
    assert powers[20] == pytest.approx(table.best.power, rel=1e-12)
    assert differences[20] == pytest.approx(1.5)
    assert np.all(np.diff(powers) > 0)
    frame = table.frame()
    assert len(frame) == 9
    assert frame["cost"].is_monotonic_increasing
    assert (frame["power"] >= 0.8).all()


@pytest.mark.parametrize("procedure", ["tukey", "dunnett", "bonferroni", "none"])
def test_two_groups_need_no_adjustment(procedure: str):
    assert plan({"run": 1.0}, 1.0, groups=2, procedure=procedure).best == plan({"run": 1.0}, 1.0, groups=2).best


def test_fewer_questions_need_fewer_runs():
    runs = [plan({"run": 1.0}, 1.0, groups=5, procedure=name).best.runs for name in ("none", "dunnett", "tukey")]
    assert runs == sorted(runs)
    assert runs[0] < runs[2]
    assert plan({"run": 1.0}, 1.0, groups=5, procedure="bonferroni").best.runs >= runs[2]


def test_simulated_power_of_a_plan():
    """400 repeats of a planned experiment through the whole engine, within 3 Monte-Carlo standard errors.

    Kenward-Roger's degrees of freedom are exact in balanced data with the topmost component above zero.
    """
    found = plan({"run": 0.5, "replicate": 1.0}, 2.0, groups=3, costs=Costs(0, 10, 1)).best
    group = np.repeat(np.arange(3), found.runs * found.replicates)
    run = np.tile(np.repeat(np.arange(found.runs), found.replicates), 3)
    rng, hits = np.random.default_rng(6), 0
    for _ in range(400):
        y = 2.0 * (group == 1) + rng.normal(0, 0.5**0.5, 3 * found.runs)[group * found.runs + run]
        hits += fit_nested(y + rng.normal(size=y.size), group, runs=run).pairs().pairs[0].differs
    assert abs(hits / 400 - found.power) < 3 * (found.power * (1 - found.power) / 400) ** 0.5


@pytest.mark.parametrize(
    "change",
    [
        {"components": {"day": 1.0}},
        {"components": {}},
        {"components": {"run": -1.0}},
        {"difference": 0.0},
        {"groups": 1},
        {"power": 1.0},
        {"alpha": 0.0},
        {"procedure": "scheffe"},
        {"costs": Costs(0, 0, 0)},
        {"difference": 1e-6},
    ],
)
def test_refusals(change: dict[str, Any]):
    call = {"components": {"run": 1.0}, "difference": 1.0, "groups": 3} | change
    with pytest.raises(StatsError) as refused:
        plan(call.pop("components"), call.pop("difference"), **call)
    assert refused.value.advice
