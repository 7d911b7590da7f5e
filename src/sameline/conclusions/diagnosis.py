"""A second look at the data behind a conclusion: are spreads alike, is the shape normal, does a value stand out?

Nothing here is recorded and nothing switches a procedure: diagnostics inform, outlier tests flag, and only a person
sets anything aside, with an assignable cause.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

from sameline.conclusions.inputs import gather
from sameline.conclusions.models import units_of
from sameline.errors import StatsError
from sameline.records.answers import CautionAnswer
from sameline.records.comparisons import read_revision

if TYPE_CHECKING:
    from collections.abc import Sequence

    from sameline.conclusions.inputs import Value
    from sameline.records.answers import Conclusion
    from sameline.records.store import Reading
    from sameline.stats import DiagnosticTest, Equivalence, Flag, OverallTest

OUTLIER_ALPHA = 0.01
MOST_OUTLIERS = 5
FEWEST_RUNS = 4  # with fewer means, Grubbs' test can flag little else than chance


@dataclass(frozen=True, slots=True)
class Suspect:
    """A value, or a whole run or group, that stands out.

    Attributes:
        test: the test that flags it.
        what: which it is, in words.
        run, replicate: if it is one value or one run.
        statistic, critical: of the test.
        p_value: if the test has one.
    """

    test: str
    what: str
    run: int | None
    replicate: int | None
    statistic: float
    critical: float
    p_value: float | None


@dataclass(frozen=True, slots=True)
class Diagnosis:
    """What a second look at the data finds.

    Attributes:
        unit: what the tests of spread, shape and equivalence take as one value, in words.
        overall: tests of all groups alike, under each assumption.
        diagnostics: tests of equal spread and of shape.
        equivalence: two one-sided tests of each pair against the margin; None without a margin.
        suspects: what the outlier tests flag.
        not_computed: test -> why it could not be computed.
    """

    unit: str
    overall: tuple[OverallTest, ...]
    diagnostics: tuple[DiagnosticTest, ...]
    equivalence: Equivalence | None
    suspects: tuple[Suspect, ...]
    not_computed: dict[str, str]


def diagnose(reading: Reading, conclusion: Conclusion) -> Diagnosis:
    """Look again at the data that a conclusion rests on.

    Raises:
        StatsError: there are fewer than two groups with values.
    """
    from sameline.stats import compare_pairs, equivalent_pairs
    from sameline.stats.overall import overall_test
    from sameline.stats.procedures import COMMON, RANKS, UNEQUAL

    revision = read_revision(reading, conclusion.comparison, revision_id=conclusion.revision_id)
    inputs = gather(reading, revision)
    units = units_of(revision, inputs)
    values, groups = [u.value for u in units], [u.group for u in units]
    result = compare_pairs(values, groups, procedure="steel-dwass", alpha=revision.alpha)
    not_computed = dict(result.diagnostics.not_estimable)
    overall = []
    for family in (COMMON, UNEQUAL, RANKS):
        try:
            overall.append(overall_test(result.question.samples, family))
        except StatsError as refusal:
            not_computed[f"all groups alike, {family}"] = refusal.message
    equivalence = None
    try:
        if inputs.margin is not None:
            equivalence = equivalent_pairs(values, groups, inputs.margin, alpha=revision.alpha)
    except StatsError as refusal:
        not_computed["equivalence"] = refusal.message
    suspects = _suspects(inputs.kept, not_computed)
    return Diagnosis(
        unit=_word(revision.model, revision.grouping, revision.unit),
        overall=tuple(overall),
        diagnostics=tuple(result.diagnostics.tests.values()),
        equivalence=equivalence,
        suspects=tuple(suspects),
        not_computed=not_computed,
    )


def standing_out(values: Sequence[Value]) -> tuple[CautionAnswer, ...]:
    """The caution on runs that stand out: by the spread of their replicates, or by their mean among their group's."""
    from sameline.stats import cochran_test, grubbs_test

    by_run: dict[int, list[Value]] = {}
    for v in values:
        by_run.setdefault(v.run, []).append(v)
    found = []
    try:
        spread = cochran_test([v.value for v in values], [str(v.run) for v in values], alpha=OUTLIER_ALPHA)
        if spread.outlier:
            found.append(f"the replicates of run {spread.group} spread far more than those of other runs (Cochran's C)")
    except StatsError:
        pass  # where runs have no replicates there is no such spread to judge
    by_group: dict[str, list[tuple[int, float]]] = {}
    for run, own in by_run.items():
        by_group.setdefault(own[0].group, []).append((run, math.fsum(v.value for v in own) / len(own)))
    for group, means in by_group.items():
        if len(means) < FEWEST_RUNS:
            continue
        try:
            far = grubbs_test([mean for _, mean in means], alpha=OUTLIER_ALPHA)
        except StatsError:
            continue  # all means alike: none stands out
        if far.outlier:
            found.append(f"the mean of run {means[far.index][0]} lies far from the others of {group} (Grubbs)")
    if not found:
        return ()
    text = f"at 1 % a test stands out: {'; '.join(found)}. Nothing is left out; `sameline diagnose` shows more"
    return (CautionAnswer("stands out", text),)


def _word(model: str, grouping: str, unit: str) -> str:
    if model == "nested":
        unit = "run" if grouping == "batch" else "batch"
    return {"run": "run means", "batch": "batch means", "replicate": "replicates"}[unit]


def _suspects(values: Sequence[Value], not_computed: dict[str, str]) -> list[Suspect]:
    """Replicates within their runs, runs by their spread, and run means within their groups."""
    from sameline.stats import screen_outliers

    found: list[Suspect] = []
    by_run: dict[int, list[Value]] = {}
    for v in values:
        by_run.setdefault(v.run, []).append(v)
    within = screen_outliers([v.value for v in values], [f"run {v.run}" for v in values], alpha=OUTLIER_ALPHA)
    for flag in within.flags:
        at = None if flag.row is None else values[flag.row]
        run = int(flag.group.removeprefix("run ")) if at is None else at.run
        what = f"the replicates of run {run}"
        if at is not None:
            what = f"run {run}, replicate {at.replicate}: {at.value:g} among its run"
        found.append(_suspect(flag, what, run, None if at is None else at.replicate))
    runs = list(by_run.values())
    means = [math.fsum(v.value for v in own) / len(own) for own in runs]
    between = screen_outliers(means, [own[0].group for own in runs], alpha=OUTLIER_ALPHA)
    for flag in between.flags:
        own_run = None if flag.row is None else runs[flag.row][0].run
        what = (
            f"the runs of {flag.group}" if own_run is None else f"the mean of run {own_run} among those of {flag.group}"
        )
        found.append(_suspect(flag, what, own_run, None))
    found += _extreme(runs, means, not_computed)
    return found


def _suspect(flag: Flag, what: str, run: int | None, replicate: int | None) -> Suspect:
    return Suspect(flag.test, what, run, replicate, flag.statistic, flag.critical, flag.p_value)


def _extreme(runs: Sequence[Sequence[Value]], means: Sequence[float], not_computed: dict[str, str]) -> list[Suspect]:
    """The generalized extreme Studentized deviate on what replicates deviate from their run's mean."""
    from sameline.stats import esd_test

    rows = [(v, v.value - mean) for own, mean in zip(runs, means, strict=True) for v in own if len(own) > 1]
    try:
        result = esd_test([deviation for _, deviation in rows], MOST_OUTLIERS, alpha=OUTLIER_ALPHA)
    except StatsError as refusal:
        not_computed["extreme Studentized deviate"] = refusal.message
        return []
    return [
        Suspect(
            "extreme Studentized deviate",
            f"run {rows[at][0].run}, replicate {rows[at][0].replicate}: {rows[at][0].value:g} from its run's mean",
            rows[at][0].run,
            rows[at][0].replicate,
            result.R[step],
            result.critical[step],
            None,
        )
        for step, at in enumerate(result.outlier_index)
    ]
