"""The vectorised columns against slow, literal ones: one pair at a time, by the formula as published."""

import itertools
import math
from fractions import Fraction
from statistics import fmean, median

import numpy as np
import pytest
import scipy.stats
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from sameline.errors import StatsError
from sameline.stats import compare_pairs, kruskal_wallis, levene_test

Groups = dict[str, list[float]]


def groups_of(low: int, high: int, values: int = 12) -> st.SearchStrategy[Groups]:
    cell = st.lists(st.integers(0, values).map(float), min_size=low, max_size=high)
    return st.lists(cell, min_size=2, max_size=5).map(lambda cells: dict(zip("ABCDE", cells, strict=False)))


def flat(groups: Groups) -> tuple[list[float], list[str]]:
    return [value for cell in groups.values() for value in cell], [
        label for label, cell in groups.items() for _ in cell
    ]


def tie_sum(values: list[float]) -> int:
    return sum(values.count(value) ** 3 - values.count(value) for value in set(values))


def midrank(value: float, values: list[float]) -> Fraction:
    return Fraction(2 * sum(other < value for other in values) + values.count(value) + 1, 2)


@settings(max_examples=80)
@given(groups=groups_of(1, 6))
def test_steel_dwass_pair_by_pair(groups: Groups):
    assume(len(set(flat(groups)[0])) > 1)
    result = compare_pairs(*flat(groups), "steel-dwass")
    z = result.columns.details["z"]
    for at, (a, b) in enumerate(itertools.combinations(groups, 2)):
        both = groups[a] + groups[b]
        total, product = len(both), len(groups[a]) * len(groups[b])
        if len(set(both)) == 1:
            assert (a, b) in result.not_estimable
            continue
        u = sum((x < y) + Fraction(x == y, 2) for x in groups[a] for y in groups[b])
        variance = Fraction(product, 12) * (total + 1 - Fraction(tie_sum(both), total * (total - 1)))
        assert z[at] == pytest.approx(float(u - Fraction(product, 2)) / math.sqrt(variance), rel=1e-12, abs=1e-14)


@settings(max_examples=60)
@given(groups=groups_of(2, 5, values=40), alpha=st.sampled_from([0.05, 0.3, 0.6]))
def test_steel_dwass_intervals_hold_every_shift_that_is_not_rejected(groups: Groups, alpha: float):
    assume(len(set(flat(groups)[0])) > 1)
    result = compare_pairs(*flat(groups), "steel-dwass", alpha=alpha)
    critical = result.critical_value
    for pair in result.pairs:
        both = groups[pair.a] + groups[pair.b]
        total, product = len(both), len(groups[pair.a]) * len(groups[pair.b])
        if pair.lower is None:
            continue
        sd = math.sqrt(Fraction(product, 12) * (total + 1 - Fraction(tie_sum(both), total * (total - 1))))
        for shift in np.arange(-40.25, 41, 0.5):  # between whole numbers: on no difference of two values
            u = sum(y - shift > x for x in groups[pair.a] for y in groups[pair.b])
            accepted = math.sqrt(2) * abs(u - product / 2) / sd <= critical
            assert accepted == (pair.lower < shift < pair.upper)


@settings(max_examples=80)
@given(groups=groups_of(1, 6))
def test_dunn_pair_by_pair(groups: Groups):
    values, labels = flat(groups)
    assume(len(set(values)) > 1)
    result = compare_pairs(values, labels, "dunn")
    total = len(values)
    rank = {label: sum(midrank(value, values) for value in cell) / len(cell) for label, cell in groups.items()}
    variance = Fraction(total * (total + 1), 12) - Fraction(tie_sum(values), 12 * (total - 1))
    raw = []
    for at, (a, b) in enumerate(itertools.combinations(groups, 2)):
        by = math.sqrt(variance * (Fraction(1, len(groups[a])) + Fraction(1, len(groups[b]))))
        z = float(rank[b] - rank[a]) / by
        assert result.columns.statistic[at] == pytest.approx(z, rel=1e-12, abs=1e-14)
        raw.append(2 * scipy.stats.norm.sf(abs(z)))
    ordered = sorted(range(len(raw)), key=raw.__getitem__)
    running = 0.0
    for step, at in enumerate(ordered):
        running = max(running, min(1.0, (len(raw) - step) * raw[at]))
        assert result.columns.p_value[at] == pytest.approx(running, rel=1e-10)


@settings(max_examples=60)
@given(groups=groups_of(1, 6))
def test_kruskal_by_its_first_formula(groups: Groups):
    values, labels = flat(groups)
    assume(len(set(values)) > 1)
    total = len(values)
    squares = sum(sum(midrank(value, values) for value in cell) ** 2 / len(cell) for cell in groups.values())
    raw = Fraction(12, total * (total + 1)) * squares - 3 * (total + 1)
    H = raw / (1 - Fraction(tie_sum(values), total**3 - total))
    assert pytest.approx(float(H), rel=1e-12, abs=1e-12) == kruskal_wallis(values, labels).H


@settings(max_examples=60)
@given(groups=groups_of(2, 6))
def test_welch_pairs_pair_by_pair(groups: Groups):
    try:
        result = compare_pairs(*flat(groups), "games-howell")
    except StatsError:
        assume(False)  # noqa: FBT003 - hypothesis's own signature
        raise
    mean = {label: Fraction(int(sum(cell)), len(cell)) for label, cell in groups.items()}
    share = {
        label: sum((Fraction(value) - mean[label]) ** 2 for value in cell) / (len(cell) - 1) / len(cell)
        for label, cell in groups.items()
    }
    for at, (a, b) in enumerate(itertools.combinations(groups, 2)):
        both = share[a] + share[b]
        if both == 0:
            assert (a, b) in result.not_estimable
            continue
        df = both**2 / (share[a] ** 2 / (len(groups[a]) - 1) + share[b] ** 2 / (len(groups[b]) - 1))
        q = abs(mean[b] - mean[a]) / Fraction(math.sqrt(both / 2))
        assert result.columns.df[at] == pytest.approx(float(df), rel=1e-12)
        assert result.columns.statistic[at] == pytest.approx(float(q), rel=1e-12)


@settings(max_examples=60)
@given(groups=groups_of(1, 6))
def test_levene_by_its_definition(groups: Groups):
    assume(max(map(len, groups.values())) > 2)
    assume(any(len(set(cell)) > 1 for cell in groups.values()))
    deviations = {label: [abs(value - median(cell)) for value in cell] for label, cell in groups.items()}
    everything = [z for cell in deviations.values() for z in cell]
    within = sum((z - fmean(cell)) ** 2 for cell in deviations.values() for z in cell)
    assume(within > 1e-9)
    between = sum(len(cell) * (fmean(cell) - fmean(everything)) ** 2 for cell in deviations.values())
    F = (between / (len(groups) - 1)) / (within / (len(everything) - len(groups)))
    assert levene_test(*flat(groups)).statistic == pytest.approx(F, rel=1e-9, abs=1e-12)


def test_many_pairs_are_the_pairs_of_few():
    # A pair's own columns do not depend on how many others are asked, only its adjusted ones do.
    rng = np.random.default_rng(2)
    labels = np.repeat([f"g{number}" for number in range(30)], 4)
    values = rng.normal(0, 1, 120).round(2)
    many = compare_pairs(values, labels, "welch-holm")
    keep = np.isin(labels, ["g3", "g17"])
    few = compare_pairs(values[keep], labels[keep], "welch-holm").columns
    at = [(pair.a, pair.b) for pair in many.pairs].index(("g3", "g17"))
    for name in ("difference", "standard_error", "df", "statistic", "p_raw"):
        assert getattr(many.columns, name)[at] == pytest.approx(getattr(few, name)[0], rel=1e-13)
