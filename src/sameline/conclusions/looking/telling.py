"""What a look says, in the terms of an answer."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Any

from sameline.conclusions.judged import Judged, finite
from sameline.conclusions.looking.view import Looking, kept_text
from sameline.records.answers import CautionAnswer, PairAnswer

if TYPE_CHECKING:
    from sameline.stats.looks import LookResult

_UNEQUAL_RUNS = "approximate: runs have different numbers of replicates, so their means do not all spread alike"


def told(looking: Looking, result: LookResult, extra: dict[str, Any]) -> Judged:
    """The answer of a look; `extra` is kept with the state for the next."""
    control = looking.inputs.control
    alone = {(p.a, p.b): p for p in looking.alone.pairs}
    reasons = result.not_estimable
    pairs = []
    for row in result.pairs:
        if control is not None and control not in (row.a, row.b):
            continue
        own = alone.get((row.a, row.b))
        pairs.append(
            PairAnswer(
                a=row.a,
                b=row.b,
                difference=finite(row.difference),
                standard_error=finite(row.standard_error),
                df=finite(row.df),
                statistic=finite(row.statistic),
                p_value=finite(row.p_value),
                lower=finite(row.lower),
                upper=finite(row.upper),
                differs=None if (row.a, row.b) in reasons else row.differs,
                verdict=row.verdict,
                reason=reasons.get((row.a, row.b)),
                single_look_p=finite(own.p_value if own is not None else row.p_single),
                p_now=finite(row.p_now),
                log_evidence=finite(row.log_evidence),
                share=finite(row.share),
            )
        )
    state = {name: value for name, value in {**extra, "state": result.state.to_plain()}.items() if value is not None}
    exact = _same_replicates(looking) or looking.revision.looks == "single"
    judged = replace(
        looking.alone,
        pairs=tuple(pairs),
        critical_value=None,
        cautions=(*looking.alone.cautions, *(CautionAnswer("looks", note) for note in result.notes)),
        guarantee=result.guarantee if exact or not result.guarantee.startswith("exact for") else _UNEQUAL_RUNS,
        looks_state=kept_text(state),
    )
    return redrawn(judged, looking)


def _same_replicates(looking: Looking) -> bool:
    """Whether the units are means of equally many values, or values themselves."""
    return len({unit.values for unit in looking.units}) == 1


def redrawn(judged: Judged, looking: Looking) -> Judged:
    """Lines and letters for the verdicts as they are now."""
    from sameline.stats.lines import control_display, lines

    labels = [label for _, label in looking.inputs.groups if label in judged.groups]
    place = {label: at for at, label in enumerate(labels)}
    differs = [[False] * len(labels) for _ in labels]
    for p in judged.pairs:
        if p.differs and p.a in place and p.b in place:
            differs[place[p.a]][place[p.b]] = differs[place[p.b]][place[p.a]] = True
    draw = lines if looking.inputs.control is None else control_display
    display = draw(labels, [judged.groups[label].mean for label in labels], differs)
    return replace(judged, letters=dict(display.letters), display=display.kind)
