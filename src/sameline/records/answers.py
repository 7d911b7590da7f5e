"""Conclusions as values: the recorded answer to a comparison at one look, and how one differs from the one before."""

from __future__ import annotations

from dataclasses import dataclass

ANSWERED = "answered"
NOT_COMPUTED = "not computed"


@dataclass(frozen=True, slots=True)
class GroupAnswer:
    """One group at one look.

    Attributes:
        id: of the batch, material or supplier.
        label: its code.
        units, runs, replicates: how many of each.
        mean, sd: of the units, in the characteristic's unit; None where there is none.
        lower, upper: confidence interval of the mean, or None.
        letters: the lines that it stands on, a letter each.
    """

    id: int
    label: str
    units: int
    runs: int
    replicates: int
    mean: float | None
    sd: float | None
    lower: float | None
    upper: float | None
    letters: str


@dataclass(frozen=True, slots=True)
class PairAnswer:
    """One pair at one look: the later group's mean minus the earlier's, or minus the control's.

    Attributes:
        a, b: labels.
        difference, standard_error, df, statistic, p_value, lower, upper: None where the procedure has none, or
            where the pair cannot be judged.
        differs: whether the pair is shown to differ; None where it cannot be judged.
        verdict: "differs and matters", "differs", "equivalent" or "undecided".
        reason: why the pair cannot be judged, if it cannot.
        single_look_p: the p-value that this look alone would have had, where looks are counted.
        p_now: the overall p-value of this look's data alone, without what earlier looks had shown.
        log_evidence: natural log of the pair's e-value, where there is one.
        share: share of the error rate that the pair's interval spends.
    """

    a: str
    b: str
    difference: float | None
    standard_error: float | None
    df: float | None
    statistic: float | None
    p_value: float | None
    lower: float | None
    upper: float | None
    differs: bool | None
    verdict: str
    reason: str | None = None
    single_look_p: float | None = None
    p_now: float | None = None
    log_evidence: float | None = None
    share: float | None = None

    @property
    def receded(self) -> bool:
        """Claimed at an earlier look, while the data of this look alone would not claim it."""
        return bool(self.differs) and None not in (self.p_now, self.p_value) and self.p_now > self.p_value  # type: ignore[operator]


@dataclass(frozen=True, slots=True)
class ComponentAnswer:
    """One variance component: its level ("batch", "run", "replicate"), variance and interval."""

    level: str
    variance: float
    lower: float | None
    upper: float | None


@dataclass(frozen=True, slots=True)
class CautionAnswer:
    """Something the reader must know beside the answer: a stable code, and a sentence."""

    code: str
    text: str


@dataclass(frozen=True, slots=True)
class GlobalTest:
    """The test of "all groups alike": its name, statistic, degrees of freedom and p-value."""

    name: str
    statistic: float | None
    df_between: float | None
    df_within: float | None
    p_value: float | None


@dataclass(frozen=True, slots=True)
class Answer:
    """What was computed at one look, or why nothing could be.

    Attributes:
        inputs: SHA-256 over the values it was computed from.
        state: "answered" or "not computed".
        reason: why not, if not.
        runs, replicates: how many entered.
        runs_before_statement: how many of the runs were recorded before the comparison's revision was stated.
        display: "lines", "letters" or "matrix": how the groups not shown to differ can be drawn.
        groups, pairs, components, cautions: see their types; groups in the comparison's order.
        test: of all groups alike, if there is one.
        critical_value: of the simultaneous procedure, if it has one.
        engine: the versions that computed it.
        guarantee: what the error rate over all looks rests on, where looks are counted.
        looks_state: what the next look must remember, as canonical JSON.
    """

    inputs: bytes
    state: str
    reason: str | None
    runs: int
    replicates: int
    runs_before_statement: int
    display: str
    groups: tuple[GroupAnswer, ...]
    pairs: tuple[PairAnswer, ...]
    components: tuple[ComponentAnswer, ...]
    cautions: tuple[CautionAnswer, ...]
    test: GlobalTest | None
    critical_value: float | None
    engine: str
    guarantee: str | None = None
    looks_state: str | None = None


@dataclass(frozen=True, slots=True)
class Turn:
    """A verdict that changed: the pair, the verdict before (None where the pair is new), the verdict now, and why."""

    a: str
    b: str
    before: str | None
    after: str
    because: str


@dataclass(frozen=True, slots=True)
class Conclusion:
    """A recorded answer.

    Attributes:
        id: of the row.
        name: the comparison's.
        comparison, revision_id: ids.
        revision: number of the comparison's revision that it answers.
        version, look: of this comparison; a look is a version computed on other data than the one before.
        position: the ledger entry up to which it read the records.
        entry, at, person: the entry that recorded it, when, and the code of the person whose act led to it.
        causes: the entries that touched the comparison since the version before.
        turns: verdicts that changed against the version before.
        answer: what was computed.
    """

    id: int
    name: str
    comparison: int
    revision_id: int
    revision: int
    version: int
    look: int
    position: int
    entry: int
    at: str
    person: str
    causes: tuple[int, ...]
    turns: tuple[Turn, ...]
    answer: Answer
