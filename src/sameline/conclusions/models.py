"""The models by which a comparison can be judged: which values count as units, and which engine answers.

nested: replicates within runs, runs within batches, batches within groups, each with its own spread.
pooled, unequal, ranks: the units (replicates, run means or batch means) as they are.
"""

from __future__ import annotations

import math
import platform
from dataclasses import dataclass, replace
from functools import cache
from importlib.metadata import version
from typing import TYPE_CHECKING

from sameline.conclusions.judged import GroupFigures, Judged, finite, sd
from sameline.conclusions.looking import Looking, over_all_looks
from sameline.errors import StatsError
from sameline.records.answers import CautionAnswer, ComponentAnswer, GlobalTest, PairAnswer
from sameline.version import __version__

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator

    from sameline.conclusions.inputs import Inputs, Value
    from sameline.conclusions.past import Past
    from sameline.records.comparisons import Revision
    from sameline.stats.nested.known_spread import KnownSpread
    from sameline.stats.nested.pairs import NestedPairs
    from sameline.stats.pairs_result import PairsResult

SPREAD_LEVEL = 0.01  # so rarely does the caution on unequal spreads come up where spreads are equal
_ADJUST = {"tukey-kramer": "tukey"}


@cache
def engine() -> str:
    """The versions whose figures these are."""
    return (
        f"sameline {__version__}, numpy {version('numpy')}, scipy {version('scipy')}, "
        f"Python {platform.python_version()} on {platform.machine()}"
    )


@dataclass(frozen=True, slots=True)
class Unit:
    """One unit of evidence.

    Attributes:
        group: the group it belongs to.
        value: its mean.
        values: how many values the mean is of.
        place: its place in the order of recording, from 0, those set aside counted too.
        tested_at: when its first value was tested (UTC, ISO 8601).
    """

    group: str
    value: float
    values: int
    place: int
    tested_at: str


def judge(revision: Revision, inputs: Inputs, past: Past) -> Judged:
    """What the revision's model and procedure say, with its error rate kept over all looks.

    Raises:
        StatsError: the figures cannot be had from these values.
    """
    model = _nested if revision.model == "nested" else _units

    def again(alpha: float) -> Judged:
        return model(replace(revision, alpha=alpha), inputs)

    looking = Looking(revision, inputs, past, units_of(revision, inputs), again(revision.alpha), again)
    return over_all_looks(looking)


def units_of(revision: Revision, inputs: Inputs) -> tuple[Unit, ...]:
    """The units of evidence, group by group: what the model takes as independent."""
    kind = ("run" if revision.grouping == "batch" else "batch") if revision.model == "nested" else revision.unit
    places = {key: at for at, key in enumerate(dict.fromkeys(_key(kind, v) for v in inputs.values))}
    gathered: dict[UnitKey, list[Value]] = {}
    for v in _in_order(inputs):
        gathered.setdefault(_key(kind, v), []).append(v)
    return tuple(
        Unit(own[0].group, math.fsum(v.value for v in own) / len(own), len(own), places[key], own[0].tested_at)
        for key, own in gathered.items()
    )


UnitKey = tuple[str, str | int, int]


def _key(kind: str, v: Value) -> UnitKey:
    if kind == "replicate":
        return v.group, v.run, v.replicate
    return (v.group, v.batch, 0) if kind == "batch" else (v.group, v.run, 0)


def _in_order(inputs: Inputs) -> list[Value]:
    """The values that enter, group by group in the comparison's order."""
    place = {label: at for at, (_, label) in enumerate(inputs.groups)}
    return sorted(inputs.kept, key=lambda v: place[v.group])


# -- units as they are --------------------------------------------------------------------------------------------


def _units(revision: Revision, inputs: Inputs) -> Judged:
    from sameline.stats import compare_pairs

    units = units_of(revision, inputs)
    result = compare_pairs(
        [unit.value for unit in units],
        [unit.group for unit in units],
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
        cautions=(*_wrong_unit(revision, inputs), *(CautionAnswer(c.code, c.text) for c in result.cautions)),
        test=_test(result),
        critical_value=result.critical_value,
    )


def _wrong_unit(revision: Revision, inputs: Inputs) -> Iterator[CautionAnswer]:
    """What it means to count as evidence what shares an error with its neighbours, measured on these data."""
    from sameline.stats.nested.fit import fit_nested

    if revision.unit == "run" and revision.grouping != "batch":
        text = (
            f"runs of one batch share its own deviation: they are not independent evidence about a {revision.grouping}"
        )
        yield CautionAnswer("runs as units", text)
    if revision.unit != "replicate":
        return
    values = _in_order(inputs)
    batches = None if revision.grouping == "batch" else [v.batch for v in values]
    try:
        fit = fit_nested([v.value for v in values], [v.group for v in values], batches, [v.run for v in values])
        found = fit.replicates_as_units(revision.alpha)
    except StatsError:
        return  # where runs cannot be told apart there is nothing to measure; the fit's own refusal is no answer here
    if found is not None:
        yield CautionAnswer("replicates as units", found.text)


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
    found = result.overall
    if found is None:
        return None
    second = None if found.df2 is None else float(found.df2)
    return GlobalTest(_TESTS[found.name], finite(found.statistic), float(found.df1), second, found.p_value)


_TESTS = {
    "one-way anova": "one-way analysis of variance",
    "welch": "Welch's analysis of variance",
    "kruskal-wallis": "Kruskal-Wallis test",
}


# -- nested -------------------------------------------------------------------------------------------------------


def _nested(revision: Revision, inputs: Inputs) -> Judged:
    from sameline.stats.nested.fit import fit_nested

    values = _in_order(inputs)
    fit = fit_nested(
        [v.value for v in values],
        [v.group for v in values],
        None if revision.grouping == "batch" else [v.batch for v in values],
        [v.run for v in values],
        sessions=[v.session for v in values] if revision.sessions else None,
        known=_known(inputs),
    )
    means = fit.means(revision.alpha)
    pairs = fit.pairs(
        revision.alpha,
        _ADJUST.get(revision.procedure, revision.procedure),
        inputs.control,
        inputs.margin,
        alternative=revision.alternative,
    )
    spread = _unit_spread(units_of(revision, inputs))
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
        components=tuple(
            ComponentAnswer(c.name, c.variance, _square(c.lower), _square(c.upper)) for c in fit.spread().levels
        ),
        cautions=(*(CautionAnswer(c.code, c.text) for c in fit.cautions), *_unequal_spread(revision, inputs)),
    )


def _unequal_spread(revision: Revision, inputs: Inputs) -> Iterator[CautionAnswer]:
    """The nested model gives the units of all groups one spread; where they show otherwise, that is said."""
    from sameline.stats.diagnostics import diagnose
    from sameline.stats.samples import gather

    units = units_of(revision, inputs)
    tests = diagnose(gather([u.value for u in units], [u.group for u in units])).tests
    found = [tests[name] for name in ("levene-median", "bartlett") if name in tests]
    found = [test for test in found if test.p_value < SPREAD_LEVEL]
    if not found:
        return
    evidence = ", ".join(f"{test.name} p = {test.p_value:.2g}" for test in found)
    text = (
        f"the units of the groups scatter unequally ({evidence}), and this model gives them one spread: with one of "
        "five groups scattering three times as widely, looks without end claimed falsely in 13 % of cases at a nominal "
        "5 %; the unequal model does not assume it"
    )
    yield CautionAnswer("unequal-spread", text)


def _known(inputs: Inputs) -> KnownSpread | None:
    """The run-to-run spread of other batches, where the comparison may use it and there is one."""
    from sameline.stats.nested.known_spread import known_spread

    rows = [(value, batch, run) for (batch, run), values in inputs.elsewhere.items() for value in values]
    if not rows:
        return None
    values, batches, runs = zip(*rows, strict=True)
    try:
        return known_spread(values, batches, runs, source=f"the runs of {_few(sorted(set(batches)))}")
    except StatsError:
        return None  # no other batch has two runs; the fit then says that the spread cannot be seen


def _few(codes: list[str], most: int = 6) -> str:
    """Batch codes in a sentence, and how many more there are."""
    rest = len(codes) - most
    return ", ".join(codes[:most]) + (f" and {rest} other batches" if rest > 0 else "")


def _square(deviation: float | None) -> float | None:
    return None if deviation is None else deviation * deviation


def _unit_spread(units: Iterable[Unit]) -> dict[str, tuple[int, float | None]]:
    """For each group, how many units it has and the standard deviation of their means."""
    by_group: dict[str, list[float]] = {}
    for unit in units:
        by_group.setdefault(unit.group, []).append(unit.value)
    return {group: (len(means), sd(means)) for group, means in by_group.items()}
