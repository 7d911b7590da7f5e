"""The table's fast simulations claim at the very looks at which the functions people call do."""

from __future__ import annotations

from itertools import combinations
from pathlib import Path

import numpy as np
import pytest

from sameline.stats.looks import Contrasts, Plan, UnitMeans, judge_open, judge_planned, judge_union
from sameline.stats.looks.boundaries import foreseen_boundaries

BENCHMARKS = Path(__file__).parents[2] / "benchmarks"


@pytest.fixture
def paths(monkeypatch):
    monkeypatch.syspath_prepend(str(BENCHMARKS))
    import looks_paths

    return looks_paths


def unit_means(p, path, look):
    k = p.n.shape[-1]
    return UnitMeans(
        tuple("ABCDEFGHIJKLMN"[:k]),
        tuple(int(count) for count in p.n[path, look]),
        tuple(p.means[path, look].tolist()),
        float(p.ss[path, look] / max(p.df[path, look], 1.0)),
        float(p.df[path, look]),
    )


def welch(p, path, look):
    seen = unit_means(p, path, look)
    t, df, squared_error, there = (column[path, look] for column in p.welch)
    pairs = list(combinations(seen.labels, 2))
    sign = [np.sign(b - a) for a, b in combinations(seen.means, 2)]
    kept = [at for at in range(len(pairs)) if there[at]]
    se = np.sqrt(squared_error)
    return Contrasts(
        seen.labels,
        tuple(pairs[at] for at in kept),
        tuple(float(sign[at] * t[at] * se[at]) for at in kept),
        tuple(float(se[at]) for at in kept),
        tuple(float(min(np.floor(df[at]), 400.0)) for at in kept),
        sum(seen.n),
    )


def first_claims(p, judge):
    found = []
    for path in range(p.n.shape[0]):
        state, first = None, np.inf
        for look in range(p.n.shape[1]):
            result = judge(p, path, look, state)
            state = result.state
            if any(row.differs for row in result.pairs):
                first = min(first, look + 1)
        found.append(first)
    return found


@pytest.mark.parametrize(("groups", "arrivals"), [(4, "units"), (5, "unbalanced"), (12, "runs")])
def test_open(paths, groups, arrivals):
    p = paths.simulate(paths.Scene(groups, 10, arrivals, 0.7, shift=2.0), 6, 5)
    fast = paths.first_open(p, 0.05 * 0.95, np.ones(groups * (groups - 1) // 2, dtype=bool))
    slow = first_claims(p, lambda p, i, j, state: judge_open(unit_means(p, i, j), state=state))
    assert fast.tolist() == slow
    assert np.isfinite(fast).any()


def test_union(paths):
    p = paths.simulate(paths.Scene(3, 12, "unbalanced", 0.7, shift=3.0), 8, 6)
    fast = paths.first_union(p, 0.05 * 0.95, 1.25, own_spreads=True)
    slow = first_claims(p, lambda p, i, j, state: judge_union(welch(p, i, j), state=state))
    assert fast.tolist() == slow
    assert np.isfinite(fast).any()


def test_planned(paths):
    p = paths.simulate(paths.Scene(3, 4, "units", shift=1.5), 5, 7)
    counts = tuple((3 * (look + 1),) * 3 for look in range(4))
    edges = foreseen_boundaries(counts, 0.05 * 0.95, "pocock", (0.25, 0.5, 0.75, 1.0), draws=20_000, seed=4)
    fast = paths.first_true(paths.largest_q(p.n, p.means, p.ss, p.df) > np.array(edges))
    plan = Plan(36, "pocock", draws=20_000, seed=4)
    slow = first_claims(p, lambda p, i, j, state: judge_planned(unit_means(p, i, j), plan, state=state))
    assert fast.tolist() == slow
    assert np.isfinite(fast).any()
