"""Conclusions made from invented figures by the statistics themselves, without a store: quick, and of any size."""

from __future__ import annotations

import numpy as np
import pytest

from sameline.records.answers import Answer, CautionAnswer, Conclusion, GroupAnswer, PairAnswer, Turn
from sameline.records.comparisons import Revision
from sameline.reports.pictures.content import DrawnRun, DrawnValue
from sameline.reports.subject import Subject
from sameline.stats import compare_pairs


def invented(labels, *, spread=0.5, step=1.0, runs=3, still=(), seed=7):
    """Run means by label: groups a step apart, those in `still` without spread."""
    random = np.random.default_rng(seed)
    found = {}
    for at, label in enumerate(labels):
        scatter = np.zeros(runs) if label in still else random.normal(0.0, spread, runs)
        found[label] = np.round(20.0 + step * at + scatter, 2)
    return found


def drawn_runs(means, seed=8):
    random = np.random.default_rng(seed)
    return tuple(
        DrawnRun(10 * at + number, label, f"2026-02-{1 + at:02}T09:0{number}:00Z",
                 _values(random, mean))
        for at, (label, own) in enumerate(means.items())
        for number, mean in enumerate(own)
    )  # fmt: skip


def _values(random, mean):
    return tuple(DrawnValue(float(v)) for v in np.round(mean + random.normal(0, 0.15, 3), 2))


def concluded(means, *, name="seal set", margin=2.0, control=None, version=3, cautions=(), turns=()):
    """The conclusion on run means by Tukey and Kramer's procedure (or Dunnett's, with a control)."""
    values = [float(v) for own in means.values() for v in own]
    groups = [label for label, own in means.items() for _ in own]
    procedure = "tukey-kramer" if control is None else "dunnett"
    result = compare_pairs(values, groups, procedure=procedure, margin=margin, control=control)
    display = result.display
    letters = {**dict.fromkeys(means, ""), **display.letters}
    figures = ("difference", "standard_error", "df", "statistic", "p_value", "lower", "upper", "differs", "verdict")
    pairs = [PairAnswer(p.a, p.b, **{f: getattr(p, f) for f in figures}) for p in result.pairs]
    groups = [
        GroupAnswer(at, s.label, s.n, s.n, 3 * s.n, s.mean, s.sd, s.lower, s.upper, letters[s.label])
        for at, s in enumerate(result.groups)
    ]
    answer = Answer(
        inputs=b"", state="answered", reason=None, runs=len(values), replicates=3 * len(values),
        runs_before_statement=0, display=display.kind, groups=tuple(groups), pairs=tuple(pairs),
        components=(), test=None, critical_value=None,
        cautions=tuple(CautionAnswer(*c) for c in cautions), engine="",
    )  # fmt: skip
    return Conclusion(
        id=1, name=name, comparison=1, revision_id=1, revision=1, version=version, look=version, position=41, entry=42,
        at="2026-03-04T08:30:00Z", person="mira", causes=(40,), turns=tuple(Turn(*t) for t in turns), answer=answer,
    )  # fmt: skip


def asked(*, name="Hardness", unit="degree", method="in-house 4", lower=None, upper=None, margin=2.0, control=None,
          critical=False):  # fmt: skip
    stated = {
        "id": 1, "comparison": 1, "revision": 1, "entry": 3, "name": "seal set", "characteristic": 1,
        "grouping": "batch",
        "model": "pooled", "procedure": "tukey-kramer" if control is None else "dunnett", "unit": "run", "alpha": 0.05,
        "alternative": "two-sided", "margin": margin, "looks": "single", "known_spread": False,
    }  # fmt: skip
    revision = Revision(**{field: stated.get(field) for field in Revision.__dataclass_fields__})
    return Subject(revision, "HARD", name, method, unit, lower, upper, margin, 1, critical, "all batches with results")


@pytest.fixture
def scene():
    """Makes a conclusion of so many or such groups, its subject, and its runs."""

    def make(labels, *, lower=None, upper=None, subject=None, name="seal set", control=None, **data):
        labels = [f"B-{n}" for n in range(1, labels + 1)] if isinstance(labels, int) else labels
        means = invented(labels, **data)
        about = asked(lower=lower, upper=upper, control=control, **(subject or {}))
        return concluded(means, name=name, control=control), about, drawn_runs(means)

    return make
