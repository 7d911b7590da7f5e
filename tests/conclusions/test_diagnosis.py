"""A second look at the data behind a conclusion, and the caution on what stands out."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.stats

from laboratory import bare, run, statement
from sameline.records.drafts import DraftMeasurement

MEANS = np.random.default_rng(20).normal(70.0, 0.5, (6, 3)).round(2)


@pytest.fixture
def lab(tmp_path):
    with bare(str(tmp_path / "lab.db")) as made:
        made.compare(statement("three", groups=("B1", "B2", "B3"), model="nested", unit="run"))
        for day, row in enumerate(MEANS, 1):
            made.record(
                [run(b, day, f"{m - 0.1:.2f}", f"{m + 0.1:.2f}") for b, m in zip(("B1", "B2", "B3"), row, strict=True)]
            )
        yield made


def test_tests_are_those_of_a_reference_library_on_run_means(lab):
    found = lab.diagnose(lab.conclusion("three"))
    tests = {test.name: test for test in (*found.overall, *found.diagnostics)}
    assert found.unit == "run means"
    assert tests["one-way anova"].p_value == pytest.approx(scipy.stats.f_oneway(*MEANS.T).pvalue, rel=1e-9)
    assert tests["kruskal-wallis"].p_value == pytest.approx(scipy.stats.kruskal(*MEANS.T).pvalue, rel=1e-9)
    assert tests["levene-median"].p_value == pytest.approx(scipy.stats.levene(*MEANS.T).pvalue, rel=1e-9)
    assert tests["bartlett"].p_value == pytest.approx(scipy.stats.bartlett(*MEANS.T).pvalue, rel=1e-9)
    assert len(found.equivalence.pairs) == 3


def test_nothing_stands_out_in_quiet_data(lab):
    assert lab.diagnose(lab.conclusion("three")).suspects == ()
    assert not any(c.code == "stands out" for c in lab.conclusion("three").answer.cautions)


def test_a_slip_is_flagged_in_the_conclusion_and_named_by_the_second_look(lab):
    lab.record([run("B1", 8, "70.1", "17.9", "70.2")])
    cautions = [c.text for c in lab.conclusion("three").answer.cautions if c.code == "stands out"]
    assert len(cautions) == 1
    assert "run 19" in cautions[0]
    suspects = lab.diagnose(lab.conclusion("three")).suspects
    assert any((s.run, s.replicate) == (19, 2) for s in suspects)
    lab.amend(lab.find_measurements(19, 2)[0], DraftMeasurement(2, "70.19", 70.19), reason="digits swapped")
    assert not any(c.code == "stands out" for c in lab.conclusion("three").answer.cautions)
    assert not lab.verify().findings
