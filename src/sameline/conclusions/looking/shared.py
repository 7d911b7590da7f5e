"""Any procedure, any number of looks: each judged look has a share of the error rate of its own."""

from __future__ import annotations

from typing import TYPE_CHECKING

from sameline.conclusions.looking.telling import told
from sameline.conclusions.looking.view import Looking, kept_reserve, remembered, state_before

if TYPE_CHECKING:
    from sameline.conclusions.judged import Judged
    from sameline.records.answers import PairAnswer
    from sameline.stats.looks import Contrasts, LooksState


def judge_by_shares(looking: Looking) -> Judged:
    """The verdicts of a comparison that has no exact form for looks without end."""
    from sameline.stats.looks import judge_union, union

    revision = looking.revision
    usable = [p for p in looking.alone.pairs if p.standard_error and p.df and None not in (p.difference, p.p_value)]
    procedure = "studentized range"
    if revision.procedure not in _STUDENTIZED_RANGE:
        procedure = f"{revision.procedure} on the {revision.model} model"
    reserve = kept_reserve(looking, remembered(looking.past.state))
    state = state_before(
        remembered(looking.past.state).get("state"), "union", union.rule_of(reserve=reserve, procedure=procedure), None
    )
    own = {} if procedure == "studentized range" else _own_figures(looking, usable, state, reserve)
    result = judge_union(
        _contrasts(looking, usable),
        alpha=revision.alpha,
        margin=looking.inputs.margin,
        procedure=procedure,
        reserve=reserve,
        amended=[label for label in looking.past.amended if label in looking.alone.groups],
        state=state,
        p_values=own.get("p_values"),
        half_widths=own.get("half_widths"),
    )
    return told(looking, result, {"reserve": reserve})


_STUDENTIZED_RANGE = ("tukey-kramer", "games-howell")  # both refer each pair's own t and df to the studentized range


def _contrasts(looking: Looking, usable: list[PairAnswer]) -> Contrasts:
    from sameline.stats.looks import Contrasts

    return Contrasts(
        labels=tuple(label for _, label in looking.inputs.groups if label in looking.alone.groups),
        pairs=tuple((p.a, p.b) for p in usable),
        estimates=tuple(p.difference or 0.0 for p in usable),
        standard_errors=tuple(p.standard_error or 0.0 for p in usable),
        dfs=tuple(p.df or 0.0 for p in usable),
        units=len(looking.units),
    )


def _own_figures(
    looking: Looking, usable: list[PairAnswer], state: LooksState | None, reserve: float
) -> dict[str, list[float]]:
    """Another procedure's p-values, and its intervals at the error rate that this look may spend."""
    from sameline.stats.looks import rate_of_look

    rate = rate_of_look(len(looking.units), looking.revision.alpha, state, reserve=reserve)
    at_rate = {(p.a, p.b): p for p in (looking.alone if rate is None else looking.again(rate)).pairs}
    return {
        "p_values": [p.p_value or 0.0 for p in usable],
        "half_widths": [_half_width(at_rate[p.a, p.b]) for p in usable],
    }


def _half_width(pair: PairAnswer) -> float:
    if pair.lower is None or pair.upper is None:
        return float("inf")
    return (pair.upper - pair.lower) / 2
