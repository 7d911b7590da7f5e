"""One look: the procedure as it is, when the stated amount of data is there; nothing new after it."""

from __future__ import annotations

from dataclasses import asdict, replace
from typing import TYPE_CHECKING, Any

from sameline.conclusions.looking.telling import redrawn
from sameline.conclusions.looking.view import Looking, kept_text, remembered
from sameline.records.answers import CautionAnswer, PairAnswer

if TYPE_CHECKING:
    from sameline.conclusions.judged import Judged


def judge_once(looking: Looking) -> Judged:
    """The procedure as it is at the look that reaches the stated amount (the first, where none was stated)."""
    before = remembered(looking.past.state).get("single")
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
        return replace(looking.alone, looks_state=kept_text({"single": made}), cautions=cautions)
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
    return redrawn(
        replace(
            looking.alone,
            pairs=tuple(pairs),
            cautions=(*looking.alone.cautions, CautionAnswer("looks", note)),
            looks_state=kept_text({"single": made}),
        ),
        looking,
    )


_KEPT = ("p_value", "lower", "upper", "differs", "verdict")


def _kept(pair: PairAnswer) -> dict[str, Any]:
    own = asdict(pair)
    return {name: own[name] for name in ("a", "b", *_KEPT)}


def _masked(looking: Looking, state: dict[str, Any], reason: str, caution: CautionAnswer) -> Judged:
    """Estimates and spread, and no verdicts."""
    return redrawn(
        replace(
            looking.alone,
            pairs=tuple(_undecided(p, reason) for p in looking.alone.pairs),
            cautions=(*looking.alone.cautions, caution),
            test=None,
            looks_state=kept_text(state) if state else None,
        ),
        looking,
    )


def _undecided(pair: PairAnswer, reason: str) -> PairAnswer:
    return replace(pair, p_value=None, lower=None, upper=None, differs=None, verdict="undecided", reason=reason)
