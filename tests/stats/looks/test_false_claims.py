"""The promise itself, by simulation: null rows and goals of the table that `looks_false_claims` prints. Slow."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest

pytestmark = pytest.mark.slow

BENCHMARKS = Path(__file__).parents[2] / "benchmarks"
REPEATS = 10_000
ALLOWED = 0.05 + 3 * math.sqrt(0.05 * 0.95 / REPEATS)


@pytest.fixture
def table(monkeypatch):
    monkeypatch.syspath_prepend(str(BENCHMARKS))
    import looks_false_claims

    return looks_false_claims


def rates(table, scene, columns, repeats=REPEATS):
    return {name: np.isfinite(first).mean() for name, first in table.run(scene, repeats, columns).items()}


@pytest.mark.parametrize("groups", [3, 5, 10])
@pytest.mark.parametrize("arrivals", ["units", "runs", "unbalanced"])
def test_when_nothing_differs_no_more_than_alpha_is_claimed_over_all_looks(table, groups, arrivals):
    scene = table.Scene(groups, 30, arrivals, 0.7 if arrivals != "units" else 0.0)
    found = rates(table, scene, ("open", "intervals", "union", "union, every look", "naive, units"))
    naive = found.pop("naive, units")
    assert all(rate <= ALLOWED for rate in found.values()), found
    assert naive > 0.15


@pytest.mark.parametrize("groups", [3, 5])
def test_a_plan_spends_what_it_states(table, groups):
    found = rates(table, table.Scene(groups, 10, "units"), ("planned",))["planned"]
    assert found == pytest.approx(table.MAIN, abs=3.5 * math.sqrt(0.05 * 0.95 / REPEATS))


def test_equal_groups_are_not_claimed_while_another_differs(table):
    scene = table.Scene(5, 30, "units", shift=1.0)
    _, b = table.pair_indices(5)
    found = [table.first_open(table.simulate(scene, *part), table.MAIN, b < 4) for part in table.chunks(scene, REPEATS)]
    assert np.isfinite(np.concatenate(found)).mean() <= ALLOWED


def test_forty_groups_stay_within_alpha(table):
    assert rates(table, table.Scene(40, 30, "runs", 0.7), ("open",))["open"] <= ALLOWED


def test_a_shift_of_one_spread_is_found_by_the_sixth_look_and_a_late_one_by_the_thirtieth(table):
    # the goals stated for 5 groups, 30 looks, three independent values a group and look
    first = table.run(table.Scene(5, 30, "units", shift=1.0), REPEATS, ("open",))["open"]
    assert np.median(first) <= 6
    late = table.run(table.Scene(5, 30, "units", shift=1.0, start=10), REPEATS, ("open",))["open"]
    assert np.isfinite(late).mean() >= 0.95
