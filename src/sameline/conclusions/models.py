"""The models by which a comparison can be judged: which values count as units, and which engine answers.

nested: replicates within runs, runs within batches, batches within groups, each with its own spread.
pooled, unequal, ranks: the units (replicates, run means or batch means) as they are.
"""

from __future__ import annotations

import platform
from functools import cache
from importlib.metadata import version
from typing import TYPE_CHECKING

from sameline import __version__
from sameline.conclusions.judged import GroupFigures, Judged, finite, means_of, sd
from sameline.records.answers import CautionAnswer, ComponentAnswer, GlobalTest, PairAnswer

if TYPE_CHECKING:
    from collections.abc import Iterable

    from sameline.conclusions.inputs import Inputs, Value
    from sameline.records.comparisons import Revision
    from sameline.stats.nested.pairs import NestedPairs
    from sameline.stats.pairs_result import PairsResult

_ADJUST = {"tukey-kramer": "tukey"}


@cache
def engine() -> str:
    """The versions whose figures these are."""
    return (
        f"sameline {__version__}, numpy {version('numpy')}, scipy {version('scipy')}, "
        f"Python {platform.python_version()} on {platform.machine()}"
    )


def judge(revision: Revision, inputs: Inputs) -> Judged:
    """What the revision's model and procedure say.

    Raises:
        StatsError: the figures cannot be had from these values.
    """
    return _nested(revision, inputs) if revision.model == "nested" else _units(revision, inputs)


def _in_order(inputs: Inputs) -> list[Value]:
    """The values that enter, group by group in the comparison's order."""
    place = {label: at for at, (_, label) in enumerate(inputs.groups)}
    return sorted(inputs.kept, key=lambda v: place[v.group])


# -- units as they are --------------------------------------------------------------------------------------------


def _units(revision: Revision, inputs: Inputs) -> Judged:
    from sameline.stats import compare_pairs

    values, groups = _unit_values(revision.unit, _in_order(inputs))
    result = compare_pairs(
        values,
        groups,
        procedure=revision.procedure,
        alpha=revision.alpha,
        control=inputs.control,
        alternative=revision.alternative,
        margin=inputs.margin,
    )
    return Judged(
        groups={g.label: GroupFigures(g.n, g.mean, g.sd, g.lower, g.upper) for g in result.groups},
        letters=dict(result.display.letters),
        display=result.display.kind,
        pairs=_pairs(result),
        engine=engine(),
        cautions=tuple(CautionAnswer(c.code, c.text) for c in result.cautions),
        test=_test(result),
        critical_value=result.critical_value,
    )


def _unit_values(unit: str, values: list[Value]) -> tuple[list[float], list[str]]:
    if unit == "replicate":
        return [v.value for v in values], [v.group for v in values]
    means = means_of(((v.group, v.batch if unit == "batch" else v.run), v.value) for v in values)
    return list(means.values()), [group for group, _ in means]


def _pairs(result: PairsResult | NestedPairs) -> tuple[PairAnswer, ...]:
    why = result.not_estimable
    return tuple(
        PairAnswer(
            a=p.a,
            b=p.b,
            difference=finite(p.difference),
            standard_error=finite(p.standard_error),
            df=finite(p.df),
            statistic=finite(p.statistic),
            p_value=finite(p.p_value),
            lower=finite(p.lower),
            upper=finite(p.upper),
            differs=None if (p.a, p.b) in why else p.differs,
            verdict=p.verdict,
            reason=why.get((p.a, p.b)),
        )
        for p in result.pairs
    )


def _test(result: PairsResult) -> GlobalTest | None:
    table = result.anova
    if table is None:
        return None
    return GlobalTest(
        "one-way analysis of variance", finite(table.F), float(table.df_between), float(table.df_within), table.p_value
    )


# -- nested -------------------------------------------------------------------------------------------------------


def _nested(revision: Revision, inputs: Inputs) -> Judged:
    from sameline.stats.nested.fit import fit_nested

    values = _in_order(inputs)
    fit = fit_nested(
        [v.value for v in values],
        [v.group for v in values],
        None if revision.grouping == "batch" else [v.batch for v in values],
        [v.run for v in values],
    )
    means = fit.means(revision.alpha)
    pairs = fit.pairs(
        revision.alpha,
        _ADJUST.get(revision.procedure, revision.procedure),
        inputs.control,
        inputs.margin,
        alternative=revision.alternative,
    )
    spread = _unit_spread("run" if revision.grouping == "batch" else "batch", values)
    figures = zip(means.group, means.mean, means.lower, means.upper, strict=True)
    return Judged(
        groups={
            label: GroupFigures(spread[label][0], mean, spread[label][1], finite(lower), finite(upper))
            for label, mean, lower, upper in figures
        },
        letters=dict(pairs.display.letters),
        display=pairs.display.kind,
        pairs=_pairs(pairs),
        engine=engine(),
        components=tuple(ComponentAnswer(level, v, None, None) for level, v in fit.components.items()),
        cautions=tuple(CautionAnswer(c.code, c.text) for c in fit.cautions),
    )


def _unit_spread(unit: str, values: Iterable[Value]) -> dict[str, tuple[int, float | None]]:
    """For each group, how many units it has and the standard deviation of their means."""
    means = means_of(((v.group, v.batch if unit == "batch" else v.run), v.value) for v in values)
    by_group: dict[str, list[float]] = {}
    for (group, _), mean in means.items():
        by_group.setdefault(group, []).append(mean)
    return {group: (len(units), sd(units)) for group, units in by_group.items()}
