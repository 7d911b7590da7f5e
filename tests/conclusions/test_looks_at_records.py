"""An answer at each look: what cannot be computed and why, looks counted, verdicts turned, values set aside."""

from __future__ import annotations

from dataclasses import replace

import pytest

from laboratory import moment, replicate, run, source, statement
from sameline.conclusions.conclude import answer_as_of
from sameline.conclusions.recompute import TOLERANCE, differences
from sameline.lab import Lab
from sameline.records import comparisons
from sameline.records.answers import Answer, Conclusion


def latest(lab: Lab, name: str = "all") -> Conclusion:
    return lab.conclusion(name)


def reason(lab: Lab, name: str = "all") -> str:
    answer = latest(lab, name).answer
    assert (answer.state, answer.pairs, answer.engine) == ("not computed", (), "")
    return answer.reason


def caution(answer: Answer, code: str) -> str | None:
    return next((c.text for c in answer.cautions if c.code == code), None)


# -- an answer that cannot be computed is a recorded answer with its reason -----------------------------------------


def test_no_data(lab: Lab):
    lab.compare(statement("all"))
    assert "no results" in reason(lab)
    assert (latest(lab).version, latest(lab).look) == (1, 0)


def test_one_group(lab: Lab):
    lab.compare(statement("all"))
    lab.record([run("B1", 1, "70.1", "70.2"), run("B1", 2, "70.1", "70.2")])
    assert "only one group has results so far: B1" in reason(lab)


def test_no_results_of_the_control(lab: Lab):
    lab.compare(statement("all", procedure="dunnett", control="B4"))
    lab.record([run("B1", 1, "70.1", "70.2"), run("B2", 1, "70.1", "70.2")])
    assert "control B4 has no results" in reason(lab)


def test_censored_values(lab: Lab):
    lab.compare(statement("all"))
    lab.compare(statement("ranks", model="ranks", procedure="steel-dwass"))
    lab.record([run("B1", 1, "<65", "70.2", "70.3"), run("B2", 1, "70.1", "70.2", "70.4")])
    assert "1 of 6 values are only bounds" in reason(lab)
    assert latest(lab, "ranks").answer.state == "answered"


def test_single_values(lab: Lab):
    lab.compare(statement("all"))
    lab.record([run("B1", 1, "70.1"), run("B2", 1, "70.9")])
    assert reason(lab)


@pytest.mark.parametrize("model", ["pooled", "unequal", "nested"])
def test_no_spread_at_all(lab: Lab, model: str):
    """Values without any spread give a refusal or a verdict without a figure that is none; never an error."""
    procedure = {"unequal": "games-howell"}.get(model, "tukey-kramer")
    lab.compare(statement("all", model=model, procedure=procedure))
    outcome = lab.record([run(batch, day, "70.0", "70.0") for batch in ("B1", "B2") for day in (1, 2)])
    assert outcome.behind == ()
    answer = latest(lab).answer
    assert answer.state == "answered" or answer.reason
    assert lab.verify().findings == ()


# -- looks, versions, causes ----------------------------------------------------------------------------------------


def test_a_look_is_a_version_on_other_data(lab: Lab):
    lab.compare(statement("all"))
    lab.record([run("B1", 1, "70.1", "70.3"), run("B2", 1, "70.9", "71.3")])
    lab.restate("characteristic", "hardness", margin=1.0, reason="the drawing")
    lab.compare(statement("all", alpha=0.01))
    lab.record([run("B1", 2, "70.2", "70.3")])
    lab.exclude("specimen damaged", run=3, reason="cut")
    assert [(c.version, c.look) for c in lab.history("all")] == [(1, 0), (2, 1), (3, 1), (4, 1), (5, 2), (6, 3)]
    assert [c.revision for c in lab.history("all")] == [1, 1, 1, 2, 2, 2]


def test_a_run_out_of_scope_is_no_look(lab: Lab):
    lab.compare(statement("all", groups=("B1", "B2")))
    lab.record([run("B1", 1, "70.1", "70.3"), run("B2", 1, "70.9", "71.3")])
    lab.record([run("B3", 1, "70.1", "70.3")])
    assert latest(lab).look == 1


def test_a_verdict_turns_by_new_runs_and_back_by_an_amendment(lab: Lab):
    lab.compare(statement("all", looks="single", final_units=6, margin=0.5))
    lab.record([run("B1", 1, "70.0", "70.1", "70.2", "70.0", "70.1", "70.2")])
    lab.record([run("B2", 1, "74.0", "74.1", "74.2", "74.0", "74.1", "74.2")])
    turned = latest(lab)
    assert [(t.a, t.b, t.before, t.after, t.because) for t in turned.turns] == [
        ("B1", "B2", None, "differs and matters", "new runs")
    ]
    lab.restate("characteristic", "hardness", margin=9.0, reason="irrelevant: the comparison has its own margin")
    assert latest(lab).version == turned.version


def test_runs_recorded_before_the_question_are_counted(lab: Lab):
    lab.record([run("B1", 1, "70.1", "70.3")])
    lab.compare(statement("all"))
    lab.record([run("B2", 1, "70.9", "71.3")])
    answer = latest(lab).answer
    assert (answer.runs, answer.runs_before_statement) == (2, 1)
    assert "1 of its 2 runs" in caution(answer, "stated after data")


def test_filters_and_lists(lab: Lab):
    lab.compare(statement("all", tested_from=moment(2)))
    lab.compare(statement("listed", groups=("B4", "B1")))
    lab.record([run("B1", 1, "70.1"), run("B1", 2, "70.2"), run("B3", 3, "70.3"), run("B4", 3, "70.1")])
    assert [g.label for g in latest(lab).answer.groups] == ["B1", "B3", "B4"]
    assert latest(lab).answer.runs == 3
    assert [g.label for g in latest(lab, "listed").answer.groups] == ["B4", "B1"]
    lab.restate("batch", "B3", supplier="ALDER", reason="the note")
    assert latest(lab).version == 3


# -- what is set aside ----------------------------------------------------------------------------------------------


def test_without_exclusions_there_is_no_caution(lab: Lab):
    lab.compare(statement("all"))
    lab.record([run("B1", 1, "70.1", "70.3"), run("B2", 1, "70.9", "71.3")])
    assert caution(latest(lab).answer, "set aside") is None


def test_a_verdict_would_turn_with_the_excluded_values_put_back(lab: Lab):
    lab.compare(statement("all", looks="single", final_units=4, margin=0.5))
    lab.record([run("B1", 1, "70.0", "70.1", "70.2", "70.1", "76.0"), run("B2", 1, "72.0", "72.1", "72.2", "72.1")])
    assert latest(lab).answer.pairs[0].verdict == "undecided"
    lab.exclude("specimen damaged", measurement=5, reason="a nick")
    answer = latest(lab).answer
    assert answer.replicates == 8
    text = caution(answer, "set aside")
    assert "1 value of 1 run is set aside" in text
    assert "would turn" in text or "no verdict would turn" in text


def test_what_cannot_be_computed_without_the_excluded_says_so(lab: Lab):
    lab.compare(statement("all"))
    lab.record([run("B1", 1, "70.0", "70.1"), run("B2", 1, "72.0", "72.1")])
    lab.exclude("wrong specimen", batch=2, reason="not B2")
    assert "only one group" in reason(lab)
    assert "put back, it could be computed" in caution(latest(lab).answer, "set aside")
    lab.exclude("wrong specimen", batch=1, reason="not B1")
    assert "no results" in reason(lab)


# -- recomputation --------------------------------------------------------------------------------------------------


def test_a_conclusion_comes_out_the_same_to_the_last_bit(lab: Lab):
    lab.compare(statement("all", grouping="supplier", model="nested", unit="run"))
    lab.record([run(f"B{1 + i % 4}", i + 1, f"{70 + i % 5}.3", f"{70 + i % 3}.7") for i in range(12)], source("x"))
    recorded = latest(lab)
    with lab.reading(recorded.position) as then:
        again = answer_as_of(then, comparisons.read_revision(then, recorded.comparison))
    assert list(differences(recorded.answer, again, 0.0)) == []
    assert recorded.answer == again


def test_differences_name_the_figure(lab: Lab):
    lab.compare(statement("all"))
    lab.record([run("B1", 1, "70.0", "70.1"), run("B2", 1, "72.0", "72.1")])
    answer = latest(lab).answer
    moved = replace(answer.pairs[0], difference=answer.pairs[0].difference * (1 + 1e-12))
    other = replace(answer, pairs=(moved,), engine="another")
    assert [text.split(":")[0] for text in differences(answer, other, 0.0)] == ["pairs 1 difference"]
    assert list(differences(answer, other, TOLERANCE)) == []
    assert next(differences(answer, replace(other, pairs=()), TOLERANCE)).startswith("pairs")
    turned = replace(answer, pairs=(replace(answer.pairs[0], verdict="differs"),))
    assert len(list(differences(answer, turned, TOLERANCE))) == 1


def test_an_amended_value_is_told_from_new_runs(lab: Lab):
    lab.compare(statement("all"))
    lab.record([run("B1", 1, "70.0", "70.1"), run("B2", 1, "72.0", "72.1")])
    entry = lab.amend(lab.find_measurements(1, 1)[0], replicate(1, "70.2"), reason="a slip").entry
    assert latest(lab).causes == (entry,)
    assert latest(lab).answer.groups[0].mean == pytest.approx(70.15)
