"""How much to test, and what the present data could have shown."""

from __future__ import annotations

import numpy as np
import pytest

from laboratory import bare, run, statement
from sameline.errors import CallError
from sameline.stats.sizes import Design, detectable_differences

MEANS = np.random.default_rng(30).normal(70.0, 0.5, (5, 3)).round(2)


@pytest.fixture
def lab(tmp_path):
    with bare(str(tmp_path / "lab.db")) as made:
        made.compare(statement("three", groups=("B1", "B2", "B3"), model="nested", unit="run"))
        for day, row in enumerate(MEANS, 1):
            made.record([run(b, day, f"{m:.2f}") for b, m in zip(("B1", "B2", "B3"), row, strict=True)])
        yield made


def test_what_the_data_could_have_shown_is_the_textbook_s_where_runs_have_one_value(lab):
    found = lab.sizes("three", power=0.9)
    sd = float(np.sqrt(MEANS.var(axis=0, ddof=1).mean()))
    expected = detectable_differences(Design(3), [5, 5, 5], sd, power=0.9)
    assert [(a, b) for a, b, _ in found.detectable] == [("B1", "B2"), ("B1", "B3"), ("B2", "B3")]
    assert [d for _, _, d in found.detectable] == pytest.approx([expected[0, 1]] * 3, rel=1e-8)


def test_plans_and_the_price_of_looking_rest_on_the_comparison_s_margin(lab):
    found = lab.sizes("three")
    assert found.plans.difference == 2.0
    assert found.plans.best.power >= 0.8
    assert found.price.always > found.price.single
    assert {(s.a, s.b) for s in found.settling} == {
        (p.a, p.b) for p in lab.conclusion("three").answer.pairs if p.verdict == "undecided"
    }


def test_without_an_answer_there_is_nothing_to_plan_from(lab):
    lab.compare(statement("empty", groups=("B3", "B4"), model="nested", unit="run"))
    with pytest.raises(CallError, match="no answer"):
        lab.sizes("empty")
