"""Compares several groups pair by pair under one family error rate: the front door to every pair procedure."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np

from sameline.errors import StatsError
from sameline.stats.columns import Places, Question
from sameline.stats.labels import as_text
from sameline.stats.pairs_result import PairsResult
from sameline.stats.procedures import ALTERNATIVES, Procedure, find_procedure
from sameline.stats.samples import Samples, gather
from sameline.stats.verdicts import check_alpha, check_margin

MOST_GROUPS = 2000  # almost two million pairs; more is a slip in the choice of groups, and would fill the memory


def compare_pairs(
    values: Iterable[Any],
    groups: Iterable[Any],
    procedure: str = "tukey-kramer",
    alpha: float = 0.05,
    control: object = None,
    alternative: str = "two-sided",
    margin: float | None = None,
) -> PairsResult:
    """Compares all pairs of groups, or all groups with a control.

    Groups keep the order of first appearance; a pair is (earlier, later) and its difference mean(later) -
    mean(earlier). With a control, a is the control.

    Args:
        values: n values: numbers, decimal text or `Decimal`, in the characteristic's unit.
        groups: n group labels: text, or numbers (see `labels` for their text).
        procedure: a name from `procedures.PROCEDURES`; each procedure's module states formula, assumptions, refusals
            and reference.
        alpha: family error rate, between 0 and 1.
        control: label of the control group, for procedures that compare with one.
        alternative: "two-sided"; with a control also "less" or "greater": the group's mean against the control's.
        margin: smallest difference that matters, above 0, in the unit of the values; None for no margin.

    Returns:
        The result; its `frame()` has one row a pair.

    Raises:
        StatsError: a value, label or option is refused, or the procedure cannot be computed from these data.
    """
    chosen = find_procedure(procedure)
    alpha, margin = check_alpha(alpha), check_margin(margin)
    _check_direction(chosen, control, alternative)
    samples = gather(values, groups)
    first, second, place = _places(samples, control)
    question = Question(samples, alpha, first, second, place, alternative)
    return PairsResult(chosen, question, margin, chosen.compute(question))


def _check_direction(procedure: Procedure, control: object, alternative: str) -> None:
    if alternative not in ALTERNATIVES:
        raise StatsError(
            f"there is no alternative {alternative!r}",
            where="alternative",
            advice="choose one of " + ", ".join(ALTERNATIVES),
        )
    if procedure.control == "needed" and control is None:
        raise StatsError(
            f"{procedure.name} compares with a control and none is named",
            where="control",
            advice="name the control group, or choose tukey-kramer for all pairs",
        )
    if procedure.control == "none" and control is not None:
        raise StatsError(
            f"{procedure.name} compares all pairs and takes no control",
            where="control",
            advice="choose dunnett, or another procedure that compares with a control",
        )
    if control is None and alternative != "two-sided":
        raise StatsError(
            "a one-sided alternative needs a control to be less or greater than",
            where="alternative",
            advice="name the control group, or ask two-sided",
        )


def _places(samples: Samples, control: object) -> tuple[Places, Places, int | None]:
    if control is not None:
        label = as_text(control)
        if label not in samples.labels:
            raise StatsError(
                f"the control {label!r} is not among the groups",
                where="control",
                advice="name one of the groups exactly as given: " + samples.named(np.ones(samples.k, bool)),
            )
        place = samples.labels.index(label)
        others = np.delete(np.arange(samples.k), place)
        return np.full(others.size, place), others, place
    if samples.k > MOST_GROUPS:
        raise StatsError(
            f"{samples.k} groups have {samples.k * (samples.k - 1) // 2} pairs, more than is compared at once",
            where="groups",
            advice=f"choose at most {MOST_GROUPS} groups, or compare them with a control",
        )
    first, second = np.triu_indices(samples.k, 1)
    return first, second, None
