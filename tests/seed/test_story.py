"""The story that the tour tells is true of the data; scipy is the judge, and Sameline's own nested fit agrees.

The unit of evidence is the run where groups are batches, and the batch where groups are materials or suppliers. At
the looks at which it is the judge, the design is balanced, so that the analysis of the units' means is the nested one.
"""

from __future__ import annotations

import itertools
import math
from typing import TYPE_CHECKING

import numpy as np
import pandas as pd
import pytest
from scipy import optimize, stats

from sameline.stats.nested import fit_nested

if TYPE_CHECKING:
    from tests.seed.conftest import Recorded

ALPHA = 0.05


def unit_means(rows: pd.DataFrame, unit: str) -> dict[str, np.ndarray]:
    """The values or means that stand for each group: unit "replicate", "run" or "batch"."""
    if unit == "replicate":
        return {group: part.to_numpy() for group, part in rows.groupby("group", sort=False)["value"]}
    means = rows.groupby(["group", "batch", "tested_at"], sort=False)["value"].mean()
    if unit == "batch":
        means = means.groupby(level=["group", "batch"], sort=False).mean()
    return {group: part.to_numpy() for group, part in means.groupby(level="group", sort=False)}


def tukey(units: dict[str, np.ndarray], level: float = 1 - ALPHA) -> dict[tuple[str, str], tuple[float, float, float]]:
    """(p, lower, upper) of mean b - mean a for each pair (Tukey-Kramer, by scipy)."""
    result = stats.tukey_hsd(*units.values())
    interval = result.confidence_interval(level)
    return {
        (a, b): (result.pvalue[i, j], -interval.high[i, j], -interval.low[i, j])
        for (i, a), (j, b) in itertools.combinations(enumerate(units), 2)
    }


def smallest_p(units: dict[str, np.ndarray]) -> float:
    return min(p for p, _, _ in tukey(units).values())


def share(look: int) -> float:
    """The part of alpha that look 1, 2, 3 ... may spend; the parts add up to alpha (1/1 + 1/4 + 1/9 + ... = pi²/6)."""
    return ALPHA * 6 / (math.pi**2 * look**2)


def evidence(t: float, df: float, n: float, phi: float = 0.25) -> float:
    """Log of the e-value of a mean difference, a normal mixture over effect sizes (Wang and Ramdas 2023).

    n is n_a n_b / (n_a + n_b); its expectation under no difference is 1 at every look, so over all looks together it
    exceeds 1/alpha with probability at most alpha (Ville's inequality).
    """
    r = phi / (phi + n)
    return 0.5 * math.log(r) - (df + 1) / 2 * (math.log1p(r * t * t / df) - math.log1p(t * t / df))


def anytime(units: dict[str, np.ndarray]) -> dict[tuple[str, str], tuple[bool, float, float]]:
    """(claimed, lower, upper) for each pair: e-values with pooled variance and Bonferroni over the pairs."""
    df = sum(len(values) - 1 for values in units.values())
    variance = sum(((values - values.mean()) ** 2).sum() for values in units.values()) / df
    pairs = list(itertools.combinations(units, 2))
    needed = math.log(len(pairs) / ALPHA)
    answers = {}
    for a, b in pairs:
        n = len(units[a]) * len(units[b]) / (len(units[a]) + len(units[b]))
        error = math.sqrt(variance / n)
        difference = units[b].mean() - units[a].mean()
        limit = math.inf
        if evidence(1e6, df, n) > needed:
            limit = optimize.brentq(lambda t, n=n: evidence(t, df, n) - needed, 0, 1e6)
        answers[a, b] = (abs(difference) > limit * error, difference - limit * error, difference + limit * error)
    return answers


def nested(rows: pd.DataFrame) -> dict[tuple[str, str], tuple[float, float, float]]:
    """(p, lower, upper) for each pair by Sameline's nested fit, Kenward-Roger with Tukey's adjustment."""
    fit = fit_nested(rows["value"], rows["group"], rows["batch"], rows["batch"] + rows["tested_at"])
    frame = fit.pairs(alpha=ALPHA, adjust="tukey").frame()
    return {(pair.a, pair.b): (pair.p_value, pair.lower, pair.upper) for pair in frame.itertuples()}


def step_index(recorded: Recorded, **wanted: str):
    (found,) = (i for i, s in enumerate(recorded.steps) if all(s.get(key) == value for key, value in wanted.items()))
    return found


def as_known_at(recorded: Recorded, comparison: str, **wanted: str):
    return recorded.scope(comparison, recorded.after(step_index(recorded, **wanted)))


@pytest.fixture(scope="module")
def final(recorded: Recorded):
    return recorded.after(len(recorded.steps) - 1)


@pytest.mark.parametrize("characteristic", ["CS", "HARD", "TS"])
def test_replicates_of_a_run_agree_and_runs_of_a_batch_differ(final: pd.DataFrame, characteristic: str):
    rows = final[final["characteristic"] == characteristic]
    runs = rows.groupby(["batch", "tested_at"])["value"]
    batches = runs.mean().groupby("batch")
    within, within_df = runs.var() @ (runs.size() - 1), (runs.size() - 1).sum()
    between = (runs.size() * (runs.mean() - rows.groupby("batch")["value"].mean()) ** 2).sum()
    between_df = (batches.size() - 1).sum()
    f = (between / between_df) / (within / within_df)
    run_sd = math.sqrt((batches.var() @ (batches.size() - 1)) / between_df - within / within_df / runs.size().mean())
    assert stats.f.sf(f, between_df, within_df) < 1e-6
    assert run_sd > 1.8 * math.sqrt(within / within_df)


def test_already_in_the_first_session_runs_agree_less_than_replicates(recorded: Recorded):
    (first, *_) = recorded.looks("shelf trial").values()
    runs = first.groupby(["batch", "tested_at"])["value"]
    assert math.sqrt(runs.mean().groupby("batch").var().mean()) > 1.5 * math.sqrt(runs.var().mean())


def test_incoming_pair_differs_on_replicates_and_not_on_runs(recorded: Recorded):
    rows = as_known_at(recorded, "incoming pair", act="differ", name="incoming pair")
    assert len(rows) == 48
    assert rows.groupby("batch")["tested_at"].nunique().tolist() == [4, 4]
    (naive,) = tukey(unit_means(rows, "replicate")).values()
    (right,) = tukey(unit_means(rows, "run")).values()
    margin = 2.0
    assert 0.001 < naive[0] < 0.01
    assert right[0] > 0.2
    assert right[1] < 0 < margin < right[2]


def test_incoming_pair_is_never_claimed_on_runs(recorded: Recorded):
    for look, rows in enumerate(recorded.looks("incoming pair").values(), start=1):
        units = unit_means(rows, "run")
        assert smallest_p(units) > share(look)
        assert not any(claimed for claimed, _, _ in anytime(units).values())


def test_shelf_trial_is_claimed_by_naive_rerunning_and_the_final_data_do_not_show_it(recorded: Recorded):
    looks = [rows for day, rows in recorded.looks("shelf trial").items() if day < "2025-06-05"]
    on_runs = [smallest_p(unit_means(rows, "run")) for rows in looks]
    on_replicates = [smallest_p(unit_means(rows, "replicate")) for rows in looks]
    last = list(recorded.looks("shelf trial").values())[-1]
    assert [look for look, p in enumerate(on_runs, start=1) if p < ALPHA] == [4, 5]
    assert [look for look, p in enumerate(on_replicates, start=1) if p < ALPHA] == [1, 2, 3, 4, 5]
    assert smallest_p(unit_means(last, "run")) > 0.5
    assert smallest_p(unit_means(last, "replicate")) > 0.5


def test_shelf_trial_is_never_claimed_by_an_honest_procedure(recorded: Recorded):
    looks = recorded.looks("shelf trial")
    assert len(looks) == 10
    for look, rows in enumerate(looks.values(), start=1):
        units = unit_means(rows, "run")
        assert smallest_p(units) > share(look)
        assert not any(claimed for claimed, _, _ in anytime(units).values())


def test_quellimara_climbs_and_no_limit_notices(recorded: Recorded, final: pd.DataFrame):
    rows = recorded.scope("quellimara set", final)
    means = [values.mean() for values in unit_means(rows, "run").values()]
    assert means == sorted(means)
    assert means[-1] - means[0] > 8
    compression_set = final[final["characteristic"] == "CS"]
    assert compression_set["value"].max() < float(recorded.registered("characteristics").loc["CS", "upper"])


def test_quellimara_early_looks_show_nothing_even_naively(recorded: Recorded):
    looks = [rows for day, rows in recorded.looks("quellimara set").items() if day < "2025-05-08"]
    assert [rows["batch"].nunique() for rows in looks] == [2, 2, 3]
    assert all(smallest_p(unit_means(rows, "run")) > 0.15 for rows in looks)


def test_quellimara_is_found_by_honest_procedures_at_the_last_looks(recorded: Recorded):
    margin = 2.0
    looks = list(recorded.looks("quellimara set").values())
    for look in (len(looks) - 1, len(looks)):
        units = unit_means(looks[look - 1], "run")
        spent = tukey(units, 1 - share(look))
        for old in ("QM-301", "QM-302", "QM-303"):
            p, lower, _ = spent[old, "QM-306"]
            assert p < share(look) / 10
            assert lower > margin
        claimed, lower, _ = anytime(units)["QM-301", "QM-306"]
        assert claimed
        assert lower > margin


def test_tensile_by_supplier_finds_the_stronger_one_beyond_the_margin(recorded: Recorded, final: pd.DataFrame):
    margin = 2.0
    looks = list(recorded.looks("tensile by supplier").values())
    rows = recorded.scope("tensile by supplier", final)
    assert rows.equals(looks[-1])
    units = unit_means(rows, "batch")
    assert {len(values) for values in units.values()} == {5}
    spent = tukey(units, 1 - share(len(looks)))
    for answers in (spent, anytime(units)):
        assert answers["OV", "TK"][1] > margin
        assert answers["TK", "QM"][2] < -margin
        assert -margin < answers["OV", "QM"][1] < 0 < answers["OV", "QM"][2] < margin


@pytest.mark.parametrize("unit", ["replicate", "run", "batch"])
def test_the_slip_hides_the_difference_and_the_amendment_brings_it_back(recorded: Recorded, unit: str):
    before, with_slip, amended = (
        tukey(unit_means(as_known_at(recorded, "tensile by supplier", at=at), unit))
        for at in ("2025-08-07T09:00:00+01:00", "2025-10-02T09:00:00+01:00", "2025-10-03T14:30:00+01:00")
    )
    assert all(p > (0.4 if unit == "batch" else ALPHA) for p, _, _ in with_slip.values())
    for answers in (before, amended):
        assert answers["OV", "TK"][1] > 2.0
        assert answers["TK", "QM"][2] < -2.0
        assert answers["OV", "QM"][0] > 0.2


def test_before_the_slip_the_difference_is_already_shown_honestly(recorded: Recorded):
    rows = as_known_at(recorded, "tensile by supplier", at="2025-08-07T09:00:00+01:00")
    answers = anytime(unit_means(rows, "batch"))
    assert answers["OV", "TK"][1] > 2.0
    assert answers["TK", "QM"][2] < -2.0
    assert not answers["OV", "QM"][0]


def test_the_slip_passes_every_specification_limit(recorded: Recorded):
    facts = recorded.registered("characteristics").loc["TS"]
    rows = as_known_at(recorded, "tensile by supplier", at="2025-10-02T09:00:00+01:00")
    assert pd.isna(facts["upper"])
    assert rows["value"].max() == 81.2
    assert rows["value"].min() > float(facts["lower"])


def test_materials_are_equivalent_in_hardness(recorded: Recorded, final: pd.DataFrame):
    margin = 2.0
    looks = recorded.looks("hardness by material")
    units = unit_means(recorded.scope("hardness by material", final), "batch")
    assert {len(values) for values in units.values()} == {4}
    for answers in (tukey(units, 1 - share(len(looks))), anytime(units)):
        ((_, lower, upper),) = answers.values()
        assert -margin < lower < 0 < upper < margin


@pytest.mark.parametrize(
    ("name", "unit"),
    [
        ("incoming pair", "run"),
        ("shelf trial", "run"),
        ("tensile by supplier", "batch"),
        ("hardness by material", "batch"),
    ],
)
def test_the_nested_fit_gives_the_balanced_answer_on_the_final_data(
    recorded: Recorded, final: pd.DataFrame, name: str, unit: str
):
    rows = recorded.scope(name, final)
    expected = tukey(unit_means(rows, unit))
    for pair, answer in nested(rows).items():
        # scipy finds the limits by root search to about six digits
        np.testing.assert_allclose(answer, expected[pair], rtol=1e-5, atol=1e-6)


def test_the_nested_fit_tells_the_unbalanced_part_of_the_story_too(recorded: Recorded, final: pd.DataFrame):
    with_slip, amended = (
        nested(as_known_at(recorded, "tensile by supplier", at=at))
        for at in ("2025-10-02T09:00:00+01:00", "2025-10-03T14:30:00+01:00")
    )
    drift = nested(recorded.scope("quellimara set", final))
    assert all(p > 0.2 for p, _, _ in with_slip.values())
    assert amended["OV", "TK"][1] > 2.0
    assert amended["TK", "QM"][2] < -2.0
    assert drift["QM-301", "QM-306"][1] > 5.0
