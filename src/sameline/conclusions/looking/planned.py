"""Any number of looks on the way to a stated amount of data."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from sameline.conclusions.looking.telling import told
from sameline.conclusions.looking.view import Looking, kept_reserve, remembered, state_before, unit_means_seen

if TYPE_CHECKING:
    from sameline.conclusions.judged import Judged


def judge_up_to_plan(looking: Looking) -> Judged:
    """The verdicts of a comparison whose final amount of data was stated."""
    from sameline.stats.looks import Plan, judge_planned, planned

    revision = looking.revision
    reserve = kept_reserve(looking, remembered(looking.past.state))
    spending: Any = revision.spending or "obrien-fleming"
    plan = Plan(units=revision.final_units or 0, spending=spending, reserve=reserve)
    seen = unit_means_seen(looking, looking.units)
    result = judge_planned(
        seen,
        plan,
        alpha=revision.alpha,
        margin=looking.inputs.margin,
        amended=looking.past.amended,
        state=state_before(
            remembered(looking.past.state).get("state"),
            "planned",
            planned.rule_of(plan, revision.alpha),
            seen.labels,
        ),
    )
    return told(looking, result, {"reserve": reserve})
