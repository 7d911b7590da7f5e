"""The error rate over all looks: which way of looking judges which comparison, and what the next look must remember.

open, planned: units of batches (run means) or units as they are -> evidence and boundaries of `sameline.stats.looks`,
exact for independent normal units with one spread. Suppliers and materials on the nested model, unequal spreads and
ranks have no such exact form; there each judged look has its own share of the error rate (`judge_union`).
single: the procedure as it is, once, when the stated amount of data is there.
"""

from __future__ import annotations

import json
from dataclasses import asdict, dataclass, replace
from typing import TYPE_CHECKING, Any

from sameline.conclusions.judged import finite
from sameline.errors import StatsError
from sameline.ledger.canonical import canonical
from sameline.records.answers import CautionAnswer, PairAnswer

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from sameline.conclusions.inputs import Inputs
    from sameline.conclusions.judged import Judged
    from sameline.conclusions.models import Unit
    from sameline.conclusions.past import Past
    from sameline.records.comparisons import Revision
    from sameline.stats.looks import Contrasts, LookResult, LooksState, UnitMeans

_UNEQUAL_RUNS = (
    "approximate: the runs do not all have the same number of replicates, so their means do not spread alike"
)


@dataclass(frozen=True, slots=True)
class Looking:
    """What is looked at.

    Attributes:
        revision, inputs, past: the question, its data, and what earlier looks left.
        units: the units as the model counts them.
        alone: what the model says of this look alone.
        again: judges this look anew at another error rate.
    """

    revision: Revision
    inputs: Inputs
    past: Past
    units: tuple[Unit, ...]
    alone: Judged
    again: Callable[[float], Judged]


def over_all_looks(looking: Looking) -> Judged:
    """The verdicts that keep the stated error rate over all pairs and all looks.

    Raises:
        StatsError: the looks cannot go on as they were stated.
    """
    revision = looking.revision
    if revision.looks == "single":
        return _single(looking)
    if revision.looks == "planned":
        return _planned(looking)
    if revision.model == "pooled" or (
        revision.model == "nested" and revision.grouping == "batch" and not revision.known_spread
    ):
        return _open(looking)
    return _union(looking)


# -- without end, on units ----------------------------------------------------------------------------------------


def _open(looking: Looking) -> Judged:
    from sameline.stats.looks import judge_open, open_looks

    seen = _seen(looking)
    founders = _founders(looking, seen)
    control = looking.inputs.control
    phi = _tuning(looking)
    rule = open_looks.rule_of(phi, founders=None if founders is None else tuple(founders), control=control)
    result = judge_open(
        seen,
        phi=phi,
        alpha=looking.revision.alpha,
        margin=looking.inputs.margin,
        control=control,
        founders=founders,
        amended=looking.past.amended,
        state=_state(looking, "open", rule, seen.labels if founders is None else None),
    )
    return _told(looking, result, {"founders": founders, "phi": phi})


def _tuning(looking: Looking) -> float:
    """What the evidence looks hardest for: differences of the margin, where margin and spread were known beforehand.

    It is fixed at the first look; bounded, so that a spread known badly cannot blind it.
    """
    from sameline.stats.looks import open_looks, phi_from_margin

    kept = _remembered(looking.past.state).get("phi")
    if kept is not None and not looking.past.restated:
        return float(kept)
    if looking.inputs.margin is None or looking.past.unit_sd is None:
        return open_looks.PHI
    return min(max(phi_from_margin(looking.inputs.margin, looking.past.unit_sd), _LEAST_PHI), _MOST_PHI)


_LEAST_PHI, _MOST_PHI = 1 / 64, 4.0


def _seen(looking: Looking) -> UnitMeans:
    """Unit means of all groups; a control first, and groups that join by a filter in the order in which they came."""
    from sameline.stats.looks import unit_means

    labels = [label for _, label in looking.inputs.groups]
    control = looking.inputs.control
    if control is not None:
        labels = [control, *(label for label in labels if label != control)]
    return unit_means([u.value for u in looking.units], [u.group for u in looking.units], labels)


def _founders(looking: Looking, seen: UnitMeans) -> list[str] | None:
    """The groups of the first look, where others may join by a filter; None where all groups were listed."""
    if looking.revision.groups is not None:
        return None
    kept = _remembered(looking.past.state).get("founders")
    return list(seen.labels) if kept is None or looking.past.restated else kept


def _state(looking: Looking, mode: str, rule: str, fixed: Sequence[str] | None) -> LooksState | None:
    """The state to go on from; a restated question over data already seen draws on the reserve."""
    from sameline.stats.looks import LooksState, restate

    stored = _remembered(looking.past.state).get("state")
    if stored is None:
        return None
    state = LooksState.from_plain(stored)
    groups = {name for row in state.pairs for name in (row.a, row.b)}
    if (state.mode, state.rule) == (mode, rule) and (fixed is None or groups == set(fixed)):
        return state
    carried = restate(state, mode, rule)
    return replace(carried, pairs=()) if fixed is not None and groups != set(fixed) else carried


# -- up to a stated amount ----------------------------------------------------------------------------------------


def _planned(looking: Looking) -> Judged:
    from sameline.stats.looks import Plan, judge_planned, planned

    revision = looking.revision
    plan = Plan(units=revision.final_units or 0, spending=revision.spending or "obrien-fleming")  # type: ignore[arg-type]
    seen = _seen(looking)
    result = judge_planned(
        seen,
        plan,
        alpha=revision.alpha,
        margin=looking.inputs.margin,
        amended=looking.past.amended,
        state=_state(looking, "planned", planned.rule_of(plan, revision.alpha), seen.labels),
    )
    return _told(looking, result, {})


# -- any procedure, a share of the error rate for each judged look ------------------------------------------------


def _union(looking: Looking) -> Judged:
    from sameline.stats.looks import judge_union, union

    revision = looking.revision
    usable = [p for p in looking.alone.pairs if p.standard_error and p.df and None not in (p.difference, p.p_value)]
    procedure = "studentized range"
    if revision.procedure not in _STUDENTIZED_RANGE:
        procedure = f"{revision.procedure} on the {revision.model} model"
    state = _state(looking, "union", union.rule_of(procedure=procedure), None)
    own = {} if procedure == "studentized range" else _own_figures(looking, usable, state)
    result = judge_union(
        _contrasts(looking, usable),
        alpha=revision.alpha,
        margin=looking.inputs.margin,
        procedure=procedure,
        amended=[label for label in looking.past.amended if label in looking.alone.groups],
        state=state,
        p_values=own.get("p_values"),
        half_widths=own.get("half_widths"),
    )
    return _told(looking, result, {})


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


def _own_figures(looking: Looking, usable: list[PairAnswer], state: LooksState | None) -> dict[str, list[float]]:
    """Another procedure's p-values, and its intervals at the error rate that this look may spend."""
    from sameline.stats.looks import rate_of_look

    rate = rate_of_look(len(looking.units), looking.revision.alpha, state)
    at_rate = {(p.a, p.b): p for p in (looking.alone if rate is None else looking.again(rate)).pairs}
    return {
        "p_values": [p.p_value or 0.0 for p in usable],
        "half_widths": [_half_width(at_rate[p.a, p.b]) for p in usable],
    }


def _half_width(pair: PairAnswer) -> float:
    if pair.lower is None or pair.upper is None:
        return float("inf")
    return (pair.upper - pair.lower) / 2


# -- once ---------------------------------------------------------------------------------------------------------


def _single(looking: Looking) -> Judged:
    """The procedure as it is at the look that reaches the stated amount (the first, where none was stated)."""
    before = _remembered(looking.past.state).get("single")
    units, wanted = len(looking.units), looking.revision.final_units
    if before is None and wanted is not None and units < wanted:
        reason = f"no verdict before {wanted} units are there; now {units}"
        return _masked(looking, {}, reason, CautionAnswer("looks", reason))
    if before is None and not _can_be_made(looking):
        return replace(looking.alone, looks_state=None)
    if before is None:
        made = {"units": units, "pairs": [_kept(p) for p in looking.alone.pairs]}
        cautions = looking.alone.cautions
        if wanted is not None and units > wanted:
            note = f"the one look was stated at {wanted} units and made at {units}"
            cautions = (*cautions, CautionAnswer("looks", note))
        return replace(looking.alone, looks_state=_canonical({"single": made}), cautions=cautions)
    if looking.past.restated:
        reason = f"the one look at these data was made, at {before['units']} units, before the question was restated"
        return _masked(looking, {"single": before}, reason, CautionAnswer("looks", reason))
    return _after_the_look(looking, before)


def _can_be_made(looking: Looking) -> bool:
    """Whether the one look would judge something: every group has values and, were no amount stated, every pair."""
    judged = [p.differs is not None for p in looking.alone.pairs]
    if looking.revision.final_units is not None:
        return any(judged)
    return all(judged) and len(looking.alone.groups) == len(looking.inputs.groups)


def _after_the_look(looking: Looking, before: dict[str, Any]) -> Judged:
    """Estimates go on; p-values, intervals and verdicts are those of the one look, but for pairs amended since."""
    spoilt = sorted({*before.get("amended", ()), *looking.past.amended})
    kept = {(p["a"], p["b"]): p for p in before["pairs"]}
    pairs = []
    for p in looking.alone.pairs:
        old = kept.get((p.a, p.b))
        if old is None or p.a in spoilt or p.b in spoilt:
            why = (
                "it joined after the one look"
                if old is None
                else "a value that the one look had seen was amended since"
            )
            pairs.append(_undecided(p, why))
        else:
            pairs.append(replace(p, **{name: old[name] for name in _KEPT}))
    note = f"the one look was made at {before['units']} units; figures of later data are descriptive"
    made = {**before, "amended": spoilt} if spoilt else before
    return _redrawn(
        replace(
            looking.alone,
            pairs=tuple(pairs),
            cautions=(*looking.alone.cautions, CautionAnswer("looks", note)),
            looks_state=_canonical({"single": made}),
        ),
        looking,
    )


_KEPT = ("p_value", "lower", "upper", "differs", "verdict")


def _kept(pair: PairAnswer) -> dict[str, Any]:
    own = asdict(pair)
    return {name: own[name] for name in ("a", "b", *_KEPT)}


def _masked(looking: Looking, state: dict[str, Any], reason: str, caution: CautionAnswer) -> Judged:
    """Estimates and spread, and no verdicts."""
    return _redrawn(
        replace(
            looking.alone,
            pairs=tuple(_undecided(p, reason) for p in looking.alone.pairs),
            cautions=(*looking.alone.cautions, caution),
            test=None,
            looks_state=_canonical(state) if state else None,
        ),
        looking,
    )


def _undecided(pair: PairAnswer, reason: str) -> PairAnswer:
    return replace(pair, p_value=None, lower=None, upper=None, differs=None, verdict="undecided", reason=reason)


# -- what a look says, in the terms of an answer ------------------------------------------------------------------


def _told(looking: Looking, result: LookResult, extra: dict[str, Any]) -> Judged:
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
        looks_state=_canonical(state),
    )
    return _redrawn(judged, looking)


def _same_replicates(looking: Looking) -> bool:
    """Whether the units are means of equally many values, or values themselves."""
    return len({unit.values for unit in looking.units}) == 1


def _redrawn(judged: Judged, looking: Looking) -> Judged:
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


def _remembered(state: str | None) -> dict[str, Any]:
    if state is None:
        return {}
    found = json.loads(state)
    if not isinstance(found, dict):
        raise StatsError("the state of the looks so far cannot be read")
    return found


def _canonical(state: dict[str, Any]) -> str:
    return canonical(state).decode()
