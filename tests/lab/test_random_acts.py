"""Whatever is done in whatever order, the ledger has no gap, everything verifies, and nothing is behind."""

from __future__ import annotations

import random
import shutil
import tempfile
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import laboratory
from sameline.errors import SamelineError
from sameline.lab import Lab, open_lab

BATCHES = st.sampled_from(["B1", "B2", "B3", "B4"])
FIGURES = st.decimals(min_value=60, max_value=80, places=1).map(str) | st.just("<65")
NUMBERS = st.integers(1, 6)
ACTS = st.lists(
    st.one_of(
        st.tuples(st.just("log"), BATCHES, st.integers(1, 40), st.lists(FIGURES, min_size=1, max_size=3)),
        st.tuples(st.just("amend"), NUMBERS, FIGURES),
        st.tuples(st.just("exclude"), st.sampled_from(["run", "measurement", "batch"]), NUMBERS),
        st.tuples(st.just("restore"), st.sampled_from(["run", "measurement", "batch"]), NUMBERS),
        st.tuples(st.just("compare"), st.sampled_from(["one", "two"]), st.sampled_from(["batch", "supplier"])),
        st.tuples(st.just("margin"), st.sampled_from([0.5, 1.0, 4.0])),
        st.tuples(st.just("supplier"), BATCHES, st.sampled_from(["ALDER", "BIRCH"])),
    ),
    min_size=1,
    max_size=12,
)


def do(lab: Lab, act: tuple) -> None:
    match act:
        case ("log", batch, day, texts):
            lab.record([laboratory.run(batch, day, *texts)])
        case ("amend", number, text):
            lab.amend(lab.find_measurements(number, 1)[0], laboratory.replicate(1, text), reason="a slip")
        case ("exclude", kind, number):
            lab.exclude("instrument fault", reason="worn", **{kind: number})
        case ("restore", kind, number):
            lab.restore(reason="not worn", **{kind: number})
        case ("compare", name, grouping):
            lab.compare(laboratory.statement(name, grouping=grouping))
        case ("margin", margin):
            lab.restate("characteristic", "hardness", margin=margin, reason="the drawing")
        case ("supplier", batch, supplier):
            lab.restate("batch", batch, supplier=supplier, reason="the note")


def held(template: Path, acts: list[tuple]) -> None:
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "lab.db"
        shutil.copy(template, path)
        with open_lab(path, by="ana", clock=laboratory.Clock()) as lab:
            lab.compare(laboratory.statement("one"))
            done = 0
            for act in acts:
                before = len(lab.trail())
                try:
                    do(lab, act)
                    done += 1
                except SamelineError:
                    assert len(lab.trail()) == before
            found = lab.verify()
            assert [str(f) for f in found.findings] == []
            assert found.behind == ()
            assert [entry.number for entry in lab.trail()] == list(range(1, found.ledger.entries + 1))


@settings(max_examples=10, deadline=None, derandomize=True, suppress_health_check=list(HealthCheck))
@given(ACTS)
def test_any_acts_in_any_order(bare_template: Path, acts: list[tuple]):
    held(bare_template, acts)


@pytest.mark.slow
@settings(max_examples=300, deadline=None, derandomize=True, suppress_health_check=list(HealthCheck))
@given(ACTS)
def test_many_acts_in_any_order(bare_template: Path, acts: list[tuple]):
    held(bare_template, acts)


def test_the_order_of_a_file_s_rows_changes_no_conclusion(bare_template: Path, tmp_path: Path):
    rng = random.Random(5)  # noqa: S311 - chance, not secrecy
    runs = [laboratory.run(f"B{1 + i % 4}", 1 + i, f"{rng.uniform(69, 73):.2f}", "70.1") for i in range(12)]
    answers = []
    for name in ("as.db", "shuffled.db"):
        shutil.copy(bare_template, tmp_path / name)
        with open_lab(tmp_path / name, by="ana") as lab:
            lab.compare(laboratory.statement("all"))
            lab.record(runs, laboratory.source(name))
            answers.append(lab.conclusion("all").answer)
        rng.shuffle(runs)
    one, other = ({frozenset((p.a, p.b)): (p.p_value, p.verdict) for p in answer.pairs} for answer in answers)
    assert one == other
    one, other = ({g.label: (g.units, g.mean, g.sd, g.lower, g.upper) for g in answer.groups} for answer in answers)
    assert one == other
