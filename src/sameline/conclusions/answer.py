"""The answer to a comparison's revision, from its inputs: computed, or the reason why nothing can be."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from sameline.errors import StatsError
from sameline.records.answers import ANSWERED, NOT_COMPUTED, Answer, CautionAnswer, GroupAnswer

if TYPE_CHECKING:
    from sameline.conclusions.inputs import Inputs, Value
    from sameline.conclusions.judged import Judged
    from sameline.conclusions.past import Past
    from sameline.records.comparisons import Revision


def answer(revision: Revision, inputs: Inputs, past: Past) -> Answer:
    """What the revision's procedure says of these inputs, after what came before.

    Never raises for what the data are: a comparison that cannot be answered is answered so, with the reason.
    """
    found = _judge(revision, inputs, past)
    cautions = (*_stated_late(revision, inputs, past), *found.cautions, *_set_aside(revision, inputs, past, found))
    return replace(found, cautions=cautions)


def _judge(revision: Revision, inputs: Inputs, past: Past) -> Answer:
    nothing = replace(_nothing(inputs), looks_state=past.state)
    reason = _refusal(revision, inputs)
    if reason is not None:
        return replace(nothing, reason=reason)
    # the statistics are loaded only when there is something to compute
    from sameline.conclusions.diagnosis import standing_out
    from sameline.conclusions.models import judge

    try:
        judged = judge(revision, inputs, past)
    except StatsError as error:
        return replace(nothing, reason=_said(error))
    return _answered(nothing, replace(judged, cautions=(*judged.cautions, *standing_out(inputs.kept))))


def _said(error: StatsError) -> str:
    return f"{error.message} ({error.advice})" if error.advice else error.message


def _answered(nothing: Answer, judged: Judged) -> Answer:
    groups = tuple(_filled(group, judged) for group in nothing.groups)
    return replace(
        nothing,
        state=ANSWERED,
        reason=None,
        display=judged.display,
        groups=groups,
        pairs=judged.pairs,
        components=judged.components,
        cautions=judged.cautions,
        test=judged.test,
        critical_value=judged.critical_value,
        engine=judged.engine,
        guarantee=judged.guarantee,
        looks_state=judged.looks_state,
    )


def _filled(group: GroupAnswer, judged: Judged) -> GroupAnswer:
    summary = judged.groups.get(group.label)
    if summary is None:
        return group
    return replace(
        group,
        units=summary.units,
        mean=summary.mean,
        sd=summary.sd,
        lower=summary.lower,
        upper=summary.upper,
        letters=judged.letters.get(group.label, ""),
    )


def _nothing(inputs: Inputs) -> Answer:
    """The answer before anything is computed: what there is to compute from."""
    kept = inputs.kept
    return Answer(
        inputs=inputs.digest(),
        state=NOT_COMPUTED,
        reason=None,
        runs=len({v.run for v in kept}),
        replicates=len(kept),
        runs_before_statement=len({v.run for v in kept if v.before}),
        display="matrix",
        groups=tuple(_counted(number, label, kept) for number, label in inputs.groups),
        pairs=(),
        components=(),
        cautions=(),
        test=None,
        critical_value=None,
        engine="",
    )


def _counted(number: int, label: str, kept: tuple[Value, ...]) -> GroupAnswer:
    by_run: dict[int, list[Value]] = {}
    for v in kept:
        if v.group == label:
            by_run.setdefault(v.run, []).append(v)
    own = [v for values in by_run.values() for v in values]
    mean = None
    if own and not any(v.censored for v in own):
        mean = math.fsum(math.fsum(v.value for v in values) / len(values) for values in by_run.values()) / len(by_run)
    return GroupAnswer(number, label, 0, len(by_run), len(own), mean, None, None, None, "")


def _refusal(revision: Revision, inputs: Inputs) -> str | None:
    """Why nothing can be computed, if that is plain before any statistics."""
    kept = inputs.kept
    filled = {v.group for v in kept}
    if not filled:
        return "no results have been recorded in its scope so far"
    if len(filled) == 1:
        return f"only one group has results so far: {filled.pop()}"
    if revision.control is not None and inputs.control not in filled:
        return f"the control {inputs.control or ''} has no results so far"
    censored = sum(v.censored for v in kept)
    if censored and not (revision.model == "ranks" and revision.unit == "replicate"):
        return (
            f"{censored} of {len(kept)} values are only bounds (such as <0.5), so no mean can be formed; "
            "restate it with the ranks model on replicates, or set them aside with a cause"
        )
    return None


@dataclass(frozen=True, slots=True)
class _Turned:
    a: str
    b: str
    now: str
    with_them: str


def _set_aside(revision: Revision, inputs: Inputs, past: Past, found: Answer) -> tuple[CautionAnswer, ...]:
    """What is set aside, and whether any verdict would turn with it put back."""
    aside = [v for v in inputs.values if v.excluded is not None]
    if not aside:
        return ()
    back = replace(inputs, values=tuple(replace(v, excluded=None) for v in inputs.values))
    other = _judge(revision, back, replace(past, amended=()))
    then = {(p.a, p.b): p.verdict for p in other.pairs}
    turned = [
        _Turned(p.a, p.b, p.verdict, then[p.a, p.b])
        for p in found.pairs
        if (p.a, p.b) in then and then[p.a, p.b] != p.verdict
    ]
    runs = len({v.run for v in aside})
    be = "is" if len(aside) == 1 else "are"
    what = f"{len(aside)} {_plural('value', len(aside))} of {runs} {_plural('run', runs)} {be} set aside"
    if other.state != ANSWERED:
        effect = f"put back, it could not be computed{'' if found.state == ANSWERED else ' either'}"
    elif found.state != ANSWERED:
        effect = "put back, it could be computed"
    elif turned:
        effect = "put back, these verdicts would turn: " + "; ".join(
            f"{x.a} and {x.b} from {x.now} to {x.with_them}" for x in turned
        )
    else:
        effect = "put back, no verdict would turn"
    return (CautionAnswer("set aside", f"{what}; {effect}"),)


def _stated_late(revision: Revision, inputs: Inputs, past: Past) -> tuple[CautionAnswer, ...]:
    """A question asked after its answer could be seen says so, with the looks that others had taken by then."""
    early = len({v.run for v in inputs.kept if v.before})
    if not early:
        return ()
    all_runs = len({v.run for v in inputs.kept})
    text = (
        f"{early} of its {all_runs} runs had been recorded before this comparison was stated "
        f"(revision {revision.revision}): a question asked after its answer could be seen"
    )
    if past.elsewhere:
        text += f"; other comparisons of these groups had looked {past.elsewhere} {_plural('time', past.elsewhere)}"
    return (CautionAnswer("stated after data", text),)


def _plural(word: str, count: int) -> str:
    return word if count == 1 else word + "s"
